#!/usr/bin/env python3
"""Writes tests/data/sobol_points.json: points of SciPy's unscrambled Sobol' sequence.

    python3 tests/oracle/sobol_points.py > tests/data/sobol_points.json

Run with SciPy 1.17.1, NumPy 2.4.6. SciPy walks the points in Gray code order: its n-th point is number
n ^ (n >> 1) in natural order.
"""
import json

import scipy
from scipy.stats import qmc

POINTS = 1024
SHOWN = [0, 1, 2, 3, 6, 20, 63, 127]
DIMENSIONS = 128
# Column k of a generator matrix is the point number 2^k in natural order: SciPy's direction integer k.
COLUMNS = [*range(22), 31, 40, 52, 63]


def main():
    points = qmc.Sobol(DIMENSIONS, scramble=False, bits=64).random(POINTS)
    integers = qmc.Sobol(DIMENSIONS, scramble=False, bits=64)._sv
    shown = [",".join(str(int(v * POINTS)) for v in points[:, d]) for d in SHOWN]
    columns = {str(k): " ".join(f"{int(v):016x}" for v in integers[:, k]) for k in COLUMNS}
    print(json.dumps({
        "source": f"SciPy {scipy.__version__}",
        "points_call": f"qmc.Sobol({DIMENSIONS}, scramble=False, bits=64).random({POINTS})[:, d] * {POINTS}, Gray code order",
        "columns_call": f"qmc.Sobol({DIMENSIONS}, scramble=False, bits=64)._sv[:, k], hexadecimal",
        "dimensions": SHOWN,
        "points": shown,
        "columns": columns,
    }, indent=1))


if __name__ == "__main__":
    main()
