#!/usr/bin/env python3
"""Writes tests/data/position_moments.json: moments of the sensors of a position by numerical quadrature.

    python3 tests/oracle/position_moments.py > tests/data/position_moments.json

Run with NumPy 2.4 on double precision. Every case is integrated by a tensor grid of Gauss-Hermite nodes
(numpy.polynomial.hermite_e) in the whitened components that the sensor reads, at two sizes; the larger one is
written, and the script fails unless both agree to 1e-9 of the natural scale of every entry (sd_j for the mean,
sd_i sd_j for the covariance, sd(x_k) sd_j for the cross-covariance). The cases lie far from singularities
(stations at least six standard deviations away), without which such a grid would not converge.

The formulas are written down here once more, from the definitions. Where ours expand a square or a logarithm,
these do not.
"""
import json
import sys

import numpy as np

np.seterr(all="raise", under="ignore")


def separation(position, station):
    """|p - s| and the unit vector from the station."""
    offset = position - np.asarray(station, float)[:, None]
    distance = np.linalg.norm(offset, axis=0)
    return distance, offset / distance


def range_only(position, _, p):
    return [separation(position, s)[0] for s in p["stations"]]


def range_doppler(position, velocity, p):
    rows = []
    for s in p["stations"]:
        distance, unit = separation(position, s)
        rows += [distance, np.sum(unit * velocity, axis=0)]
    return rows


def angles(position, station):
    """Azimuth by the complex argument, elevation by the arcsine of the unit vector."""
    _, unit = separation(position, station)
    return np.angle(unit[0] + 1j * unit[1]), np.arcsin(unit[2])


def range_azimuth_elevation(position, _, p):
    rows = []
    for s in p["stations"]:
        rows += [separation(position, s)[0], *angles(position, s)]
    return rows


def azimuth_elevation(position, _, p):
    return [row for s in p["stations"] for row in angles(position, s)]


def bearing_rate(position, velocity, p):
    """The rate is the velocity across the line of sight over the distance."""
    rows = []
    for s in p["stations"]:
        distance, unit = separation(position, s)
        across = -unit[1] * velocity[0] + unit[0] * velocity[1]
        rows += [np.angle(unit[0] + 1j * unit[1]), across / distance]
    return rows


def time_difference(position, _, p):
    arrivals = [separation(position, s)[0] / p["wave_speed"] for s in p["stations"]]
    return [arrival - arrivals[0] for arrival in arrivals[1:]]


def frequency_difference(position, velocity, p):
    heard = []
    for s in p["stations"]:
        _, unit = separation(position, s)
        heard.append(-p["carrier"] * np.sum(unit * velocity, axis=0) / p["wave_speed"])
    return [frequency - heard[0] for frequency in heard[1:]]


def received_strength(position, _, p):
    return [
        p["strength"] - 10 * p["exponent"] * np.log10(separation(position, s)[0] / p["reference_distance"])
        for s in p["stations"]
    ]


FORMULAS = {
    "range-only": (range_only, ()),
    "range-doppler": (range_doppler, ()),
    "range-azimuth-elevation": (range_azimuth_elevation, (1,)),
    "azimuth-elevation": (azimuth_elevation, (0,)),
    "bearing-rate": (bearing_rate, (0,)),
    "time-difference": (time_difference, ()),
    "frequency-difference": (frequency_difference, ()),
    "received-strength": (received_strength, ()),
}
PERIOD = {"range-azimuth-elevation": 3, "azimuth-elevation": 2, "bearing-rate": 2}


def grid(dimension, order):
    nodes, weights = np.polynomial.hermite_e.hermegauss(order)
    weights = weights / weights.sum()
    points = np.stack([axis.ravel() for axis in np.meshgrid(*[nodes] * dimension, indexing="ij")])
    products = np.ones(1)
    for _ in range(dimension):
        products = np.outer(products, weights).ravel()
    return points, products


def moments(kind, parameters, mean, covariance, order):
    """E y, Cov y and Cov(x, y), angles in the chart at their circular mean direction."""
    formula, angular = FORMULAS[kind]
    position, velocity = parameters["position"], parameters.get("velocity", [])
    reads = position + velocity
    z, w = grid(len(reads), order)
    m, covariance = np.asarray(mean, float), np.asarray(covariance, float)
    read = covariance[np.ix_(reads, reads)]
    x = m[reads][:, None] + np.linalg.cholesky(read) @ z
    y = np.array(formula(x[: len(position)], x[len(position) :], parameters))
    period = PERIOD.get(kind, len(y) or 1)
    centre = np.zeros(len(y))
    for j in range(len(y)):
        if j % period in angular:
            centre[j] = np.angle(np.sum(w * np.exp(1j * y[j])))
            y[j] = np.mod(y[j] - centre[j] + np.pi, 2 * np.pi) - np.pi
    shift = y @ w
    deviation = y - shift[:, None]
    s = (deviation * w) @ deviation.T
    c_read = ((x - m[reads][:, None]) * w) @ deviation.T
    # Components that are not read follow by regression: exact for a Gaussian prior.
    c = covariance[:, reads] @ np.linalg.solve(read, c_read)
    return centre + shift, s, c


def difference(a, b, prior_sd):
    sd = np.sqrt(np.diag(b[1]))
    return max(
        np.max(np.abs(a[0] - b[0]) / sd),
        np.max(np.abs(a[1] - b[1]) / np.outer(sd, sd)),
        np.max(np.abs(a[2] - b[2]) / np.outer(prior_sd, sd)),
    )


def turned(sds, seed):
    """A covariance with these principal standard deviations along seeded random axes."""
    axes, _ = np.linalg.qr(np.random.default_rng(seed).normal(size=(len(sds), len(sds))))
    p = (axes * np.square(sds)) @ axes.T
    return (p + p.T) / 2


def blocks(*parts):
    n = sum(len(p) for p in parts)
    whole, at = np.zeros((n, n)), 0
    for part in parts:
        whole[at : at + len(part), at : at + len(part)] = part
        at += len(part)
    return whole


def correlated(position, velocity, rho):
    """Position and velocity with these covariances, correlated by rho along each axis of their Cholesky factors."""
    p, v = np.linalg.cholesky(position), np.linalg.cholesky(velocity)
    whole = blocks(position, velocity)
    n = len(position)
    whole[:n, n:] = rho * p @ v.T
    whole[n:, :n] = whole[:n, n:].T
    return whole


def cases():
    plane2, plane4 = [0, 1], {"position": [0, 1], "velocity": [2, 3]}
    yield "range-only", {"stations": [[0, 0], [900, -150]], "position": plane2}, [400, 600], turned([60, 25], 1)
    yield "range-only", {"stations": [[20, -30, 8]], "position": [1, 2, 0]}, [40, 260, 190], turned([30, 12, 20], 2)
    moving = correlated(turned([45, 20], 3), turned([2.5, 1.2], 4), 0.4)
    yield "range-doppler", {"stations": [[0, 0]], **plane4}, [350, -220, -6, 3], moving
    yield "range-doppler", {"stations": [[0, 0], [800, 100]], **plane4}, [420, -380, 5, 4], moving
    # [x, vx, y, vy].
    swapped = moving[np.ix_([0, 2, 1, 3], [0, 2, 1, 3])]
    order = {"position": [0, 2], "velocity": [1, 3]}
    yield "range-doppler", {"stations": [[-50, 40]], **order}, [300, 4, 250, -7], swapped
    space = turned([25, 14, 8], 5)
    yield "range-azimuth-elevation", {"stations": [[0, 0, 25]], "position": [0, 1, 2]}, [180, -150, 110], space
    # West of the station: the azimuth lies on the cut.
    yield "range-azimuth-elevation", {"stations": [[10, 0, -5]], "position": [0, 1, 2]}, [-230, 4, 90], space
    seen = {"stations": [[0, 0, 25], [500, -40, 30]], "position": [0, 1, 2]}
    yield "azimuth-elevation", seen, [230, 260, 140], space
    yield "azimuth-elevation", {"stations": [[0, 0, 25]], "position": [2, 0, 1]}, [200, 70, -240], space
    yield "bearing-rate", {"stations": [[0, 0]], **plane4}, [250, 330, 7, -2], moving
    yield "bearing-rate", {"stations": [[700, 20]], **plane4}, [250, 30, -3, 6], moving
    sound = {"stations": [[0, 0], [1200, 0], [300, 1500]], "position": plane2, "wave_speed": 1490}
    yield "time-difference", sound, [500, 620], turned([80, 45], 6)
    radio = {"stations": [[0, 0, 12], [900, 50, 40], [-100, 800, 25], [600, 700, 5]], "position": [0, 1, 2]}
    yield "time-difference", {**radio, "wave_speed": 299792458}, [350, 330, 160], turned([35, 20, 15], 7)
    heard = {"stations": [[0, 0], [1500, 0], [200, 1400]], "carrier": 1.6e8, "wave_speed": 299792458, **plane4}
    yield "frequency-difference", heard, [600, 500, 6, -4], moving
    hum = {"stations": [[-300, 0], [350, 60]], "carrier": 450, "wave_speed": 1490, **plane4}
    yield "frequency-difference", hum, [20, 420, -8, 3], moving
    law = {"strength": -40, "reference_distance": 1, "exponent": 2.4}
    yield "received-strength", {"stations": [[0, 0], [900, 0]], "position": plane2, **law}, [400, 500], turned([75, 40], 8)
    far = {"strength": 3, "reference_distance": 100, "exponent": 3.1}
    yield "received-strength", {"stations": [[0, 0, 12]], "position": [0, 1, 2], **far}, [120, -90, 140], space


# Nodes along each axis: the smaller grid and the larger one that is written.
ORDERS = {2: (90, 130), 3: (56, 72), 4: (26, 34)}


def main():
    records = []
    for number, (kind, parameters, mean, covariance) in enumerate(cases(), 1):
        covariance = np.asarray(covariance, float)
        dimension = len(parameters["position"]) + len(parameters.get("velocity", []))
        small, large = ORDERS[dimension]
        a = moments(kind, parameters, mean, covariance, small)
        b = moments(kind, parameters, mean, covariance, large)
        apart = difference(a, b, np.sqrt(np.diag(covariance)))
        print(f"{number:2} {kind} in {dimension}: {apart:.1e}", file=sys.stderr)
        assert apart <= 1e-9, "the two grids disagree"
        records.append({
            "id": f"{kind}-{number:02}",
            "sensor": {"kind": kind, **parameters},
            "m": [float(v) for v in mean],
            "P": covariance.tolist(),
            "mu": b[0].tolist(),
            "S": b[1].tolist(),
            "C": b[2].tolist(),
            "grids_apart": float(f"{apart:.1e}"),
            "source": f"Gauss-Hermite tensor grid, {large} nodes an axis in {dimension} dimensions; {small} agree",
        })
    lines = ",\n".join("    " + json.dumps(r) for r in records)
    print('{\n  "generator": "tests/oracle/position_moments.py",\n  "records": [\n' + lines + "\n  ]\n}")


if __name__ == "__main__":
    main()
