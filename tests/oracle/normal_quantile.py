#!/usr/bin/env python3
"""Writes tests/data/normal_quantile.json: upper-tail points of the normal law to 30 digits.

    python3 tests/oracle/normal_quantile.py > tests/data/normal_quantile.json

Run with mpmath 1.3.0, NumPy 2.4.6, 60 digits of work. z solves erfc(z / sqrt 2) / 2 = q for q exactly the
double given (its bits in hexadecimal) or exactly the dyadic (k + 1/2) 2^-53.
"""
import json
import struct

import mpmath
import numpy as np

mpmath.mp.dps = 60
SEAM = 5 << 47  # q = 5/64 lies between k = SEAM - 1 and SEAM
FAR = int(mpmath.floor(mpmath.exp(-25) * 2**53))  # q = e^-25 lies near


def upper_quantile(q):
    """Newton's method on ln(erfc(z / sqrt 2) / 2) = ln q, from an asymptotic start; checked at the end."""
    if q == mpmath.mpf(1) / 2:
        return mpmath.mpf(0)
    tail = lambda z: mpmath.erfc(z / mpmath.sqrt(2)) / 2
    z = mpmath.sqrt(-2 * mpmath.log(2 * q))
    for _ in range(200):
        step = mpmath.log(tail(z) / q) * tail(z) / mpmath.npdf(z)
        z += step
        if abs(step) < mpmath.mpf(10) ** -50 * z:
            break
    assert abs(tail(z) / q - 1) < mpmath.mpf(10) ** -40, q
    return z


def bits(q):
    return struct.pack(">d", q).hex()


def text(z):
    return mpmath.nstr(z, 30, min_fixed=0, max_fixed=0)


def main():
    rng = np.random.default_rng(20260214)
    grid = np.concatenate([
        10.0 ** np.linspace(-300, -12, 145),
        10.0 ** rng.uniform(-12, np.log10(5 / 64), 150),
        rng.uniform(5 / 64, 0.5, 200),
        np.linspace(0.07, 0.09, 41),
        [5 / 64, np.nextafter(5 / 64, 0), 0.075, 0.425, 0.5, np.nextafter(0.5, 0), 2.2250738585072014e-308],
        [float(mpmath.exp(-25)) * f for f in (0.9, 0.999999, 1.0, 1.000001, 1.1)],
        0.5 - 10.0 ** np.linspace(-16, -2, 57),
    ])
    near = lambda k: [k + d for d in (-1000, -2, -1, 0, 1, 1000)]
    dyadics = sorted({
        *range(8), *(1 << j for j in range(3, 52)), *near(SEAM), *near(FAR), *(2**52 - 1 - d for d in range(8)),
        *(int(k) for k in rng.integers(0, SEAM, 100)), *(int(k) for k in rng.integers(SEAM, 2**52, 200)),
    })
    print(json.dumps({
        "source": f"mpmath {mpmath.__version__}, {mpmath.mp.dps} digits of work, 30 kept",
        "call": "z such that mpmath.erfc(z / mpmath.sqrt(2)) / 2 == q",
        "grid": [f"{bits(q)} {text(upper_quantile(mpmath.mpf(float(q))))}" for q in grid],
        "dyadics": [f"{k} {text(upper_quantile((k + mpmath.mpf(1) / 2) / 2**53))}" for k in dyadics],
    }, indent=0))


if __name__ == "__main__":
    main()
