#!/usr/bin/env python3
"""Writes tests/data/sensor_moments.json: moments of sensors under Gaussian priors by numerical quadrature.

    python3 tests/oracle/sensor_moments.py > tests/data/sensor_moments.json

Run with NumPy 2.4.6. mu = E[h(x)], S = Cov(h(x)) without noise, C = Cov(x, h(x)) on a Gauss-Hermite product grid in
z ~ N(0, I), x = m + L z, of two sizes: written are the values of the finer one, and how far the two differ in units of the
standard deviations involved, which must be under 1e-10. The formulas are written here a second time, in other words than
in src/sensor/: scalar products and cross products of numpy, the rotation by its matrix exponential.

Sensors with a pole (pinhole, stereo-disparity, dipole-field) have no moments in the strict sense. Their priors lie 12 and
more standard deviations from the pole: all mass beyond is under 1e-32, and the grid stays on this side of it, so that the
two sizes agree.
"""
import json

import numpy as np


def grid(order, a):
    z, w = np.polynomial.hermite_e.hermegauss(order)
    w = w / w.sum()
    zs = np.stack([g.ravel() for g in np.meshgrid(*[z] * a, indexing="ij")])
    ws = np.prod(np.stack([g.ravel() for g in np.meshgrid(*[w] * a, indexing="ij")]), axis=0)
    return zs, ws


def moments(h, m, p, order):
    m, p = np.array(m, float), np.array(p, float)
    z, w = grid(order, len(m))
    dx = np.linalg.cholesky(p) @ z
    y = h(m[:, None] + dx)
    mu = y @ w
    dy = y - mu[:, None]
    return mu, (dy * w) @ dy.T, (dx * w) @ dy.T


def polar_to_cartesian(x):
    return np.stack([(x[0] * np.exp(1j * x[1])).real, (x[0] * np.exp(1j * x[1])).imag])


def line_offset(through):
    (x0, y0), (x1, y1) = through

    def h(x):
        # Twice the area of the triangle p0, p1, p over its base: positive to the left of the way.
        return ((x1 - x0) * (x[1] - y0) - (y1 - y0) * (x[0] - x0))[None] / np.sqrt((x1 - x0) ** 2 + (y1 - y0) ** 2)

    return h


def line_feature(x):
    return ((x[0] + 1j * x[1]) * np.exp(-1j * x[3])).real[None] - x[2]


def pinhole(f, centre):
    return lambda x: f * x[:2] / x[2] + np.array(centre)[:, None]


def stereo(f, b, centre):
    def h(x):
        left = f * x[:2] / x[2] + np.array(centre)[:, None]
        right = f * (x[0] - b) / x[2] + centre[0]
        return np.stack([left[0], left[1], left[0] - right])

    return h


def attitude_vector(direction):
    d = np.array(direction) / np.linalg.norm(direction)

    def h(x):
        # exp of the cross-product matrix by its spectrum: eigenvalues of -i K are real.
        k = np.zeros((x.shape[1], 3, 3))
        k[:, 2, 1], k[:, 0, 2], k[:, 1, 0] = x
        k -= np.swapaxes(k, 1, 2).copy()
        values, vectors = np.linalg.eigh(1j * k)
        inner = np.einsum("nji,j->ni", vectors.conj(), d.astype(complex))
        return np.einsum("nij,nj->in", vectors, np.exp(-1j * values) * inner).real

    return h


def dipole_field(moment, place, background):
    m, b0 = np.array(moment, float)[:, None], np.array(background, float)[:, None]

    def h(x):
        r = x - np.array(place, float)[:, None]
        length = np.linalg.norm(r, axis=0)
        unit = r / length
        tesla = 1e-7 * (3 * unit * (m * unit).sum(axis=0) - m) / length**3
        return np.linalg.norm(1e9 * tesla + b0, axis=0)[None]

    return h


def exponential_decay(amplitude, scale, offset):
    return lambda x: amplitude * 2 ** (-x[:1] / (scale * np.log(2))) + offset


def saturating(limit, gain, offset):
    # tanh u = 1 - 2 / (exp(2u) + 1)
    return lambda x: limit * (1 - 2 / (np.exp(2 * gain * (x[:1] - offset) / limit) + 1))


def phase_sine(amplitude, frequency, phase, offset):
    return lambda x: amplitude * np.exp(1j * (frequency * x[:1] + phase)).imag + offset


def case(name, sensor, h, m, p, orders):
    coarse, fine = (moments(h, m, p, order) for order in orders)
    mu, s, c = fine
    sx, sy = np.sqrt(np.diag(p)), np.sqrt(np.diag(s))
    scales = [sy, np.outer(sy, sy), np.outer(sx, sy)]
    apart = max(float(np.max(np.abs(a - b) / scale)) for a, b, scale in zip(coarse, fine, scales))
    assert apart < 1e-10, f"{name}: orders {orders} differ by {apart:.1e}"
    return {
        "id": name,
        "sensor": sensor,
        "m": m,
        "P": p,
        "mu": mu.tolist(),
        "S": ((s + s.T) / 2).tolist(),
        "C": c.tolist(),
        "orders": orders,
        "apart": apart,
        "source": f"NumPy {np.__version__}, Gauss-Hermite product grid of {orders[1]} nodes an axis",
    }


def covariance(sd, correlations=()):
    """Products of decimals, symmetric to the bit."""
    p = [[float(f"{a * b if i == j else 0.0:.12g}") for j, b in enumerate(sd)] for i, a in enumerate(sd)]
    for i, j, rho in correlations:
        p[i][j] = p[j][i] = float(f"{rho * sd[i] * sd[j]:.12g}")
    return p


def records():
    kind = lambda name, **parameters: {"kind": name, **parameters}
    yield case("polar-near", kind("polar-to-cartesian"), polar_to_cartesian,
               [400.0, 0.8], covariance([15, 0.3], [(0, 1, 0.4)]), [40, 60])
    yield case("polar-wide", kind("polar-to-cartesian"), polar_to_cartesian,
               [400.0, -2.6], covariance([15, 1.0]), [40, 60])
    through = [[100, 50], [900, 350]]
    yield case("line-fixed", kind("line-offset", through=through), line_offset(through),
               [500.0, 250.0], covariance([20, 30], [(0, 1, -0.5)]), [10, 20])
    correlated = [(0, 1, 0.5), (2, 3, 0.6), (0, 3, -0.3), (1, 2, 0.2)]
    yield case("line-mapped", kind("line-feature"), line_feature,
               [30.0, 10.0, 25.0, 0.6], covariance([2, 2, 0.5, 0.15], correlated), [14, 20])
    yield case("line-far", kind("line-feature"), line_feature,
               [300.0, -80.0, 25.0, 2.1], covariance([2, 5, 1, 0.4], correlated), [20, 28])
    for depth, label in [(20.0, "far"), (12.0, "near")]:
        # Standard deviation of z is 1: 20 and 12 of them to the lens.
        prior = covariance([0.5, 0.4, 1], [(0, 2, 0.6), (1, 2, -0.3)])
        yield case(f"pinhole-{label}", kind("pinhole", focal_length=800, centre=[640, 360]),
                   pinhole(800, [640, 360]), [3.0, -1.0, depth], prior, [24, 34])
        yield case(f"stereo-{label}", kind("stereo-disparity", focal_length=800, baseline=0.6, centre=[640, 360]),
                   stereo(800, 0.6, [640, 360]), [3.0, -1.0, depth], prior, [24, 34])
    direction = [0.5, 0.2, 0.8]
    yield case("attitude-small", kind("attitude-vector", direction=direction), attitude_vector(direction),
               [0.0, 0.0, 0.0], covariance([0.1, 0.1, 0.2]), [14, 20])
    yield case("attitude-wide", kind("attitude-vector", direction=direction), attitude_vector(direction),
               [0.5, -0.8, 1.2], covariance([0.6, 0.4, 0.8], [(0, 1, 0.5), (1, 2, -0.4)]), [36, 48])
    moment, place, background = [20000, 5000, -40000], [0, 0, -8], [18000, 1000, -45000]
    hull = kind("dipole-field", moment=moment, place=place, background=background)
    yield case("dipole-far", hull, dipole_field(moment, place, background),
               [40.0, 10.0, 2.0], covariance([3, 2, 0.5], [(0, 1, 0.5)]), [24, 34])
    yield case("dipole-near", hull, dipole_field(moment, place, background),
               [14.0, 6.0, 2.0], covariance([1.2, 1.2, 0.5]), [40, 52])
    bare = kind("dipole-field", moment=moment, place=place)
    yield case("dipole-bare", bare, dipole_field(moment, place, [0, 0, 0]),
               [14.0, 6.0, 2.0], covariance([1.0, 1.2, 0.5]), [40, 52])
    yield case("decay", kind("exponential-decay", amplitude=900, scale=3.5, offset=20),
               exponential_decay(900, 3.5, 20), [5.0], covariance([1.2]), [40, 60])
    yield case("decay-wide", kind("exponential-decay", amplitude=900, scale=3.5),
               exponential_decay(900, 3.5, 0), [5.0], covariance([3.5]), [40, 60])
    yield case("saturating", kind("saturating", limit=2, gain=1.2, offset=0.1), saturating(2, 1.2, 0.1),
               [1.5], covariance([0.6]), [160, 220])
    yield case("saturating-hard", kind("saturating", limit=1, gain=2), saturating(1, 2, 0),
               [0.3], covariance([0.7]), [220, 250])
    yield case("tide", kind("phase-sine", amplitude=1.8, frequency=0.506, phase=0.4, offset=3.1),
               phase_sine(1.8, 0.506, 0.4, 3.1), [2.0], covariance([0.8]), [40, 60])
    yield case("tide-lost", kind("phase-sine", amplitude=1.8, frequency=0.506, phase=0.4, offset=3.1),
               phase_sine(1.8, 0.506, 0.4, 3.1), [2.0], covariance([4.0]), [60, 90])


def main():
    lines = ",\n".join("  " + json.dumps(record) for record in records())
    print(f'{{\n "generated_by": "tests/oracle/sensor_moments.py",\n "records": [\n{lines}\n ]\n}}')


if __name__ == "__main__":
    main()
