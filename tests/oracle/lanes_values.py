"""Values of elementary functions in 60 digits, for tests/lanes/.

Run: python3 tests/oracle/lanes_values.py > tests/data/lanes_values.json        (needs mpmath; 1.3.0 was used)

A row is [x, y, high, low]: the arguments (y is 0 for functions of one) and the value, as the double nearest to it
and the double nearest to what is left. Values come from mpmath's function of that name (sin, cos, tan, atan, asin,
acos, atan2, hypot, exp, log, log10, tanh, power) at 60 digits, 1200 for angles beyond 1e5.
"""

import json
import math
import random

from mpmath import mp, mpf

random.seed(20260307)

ANGLES = [1e-300, 1e-9, 0.5, 0.785398163397448, 1.0, 1.5707963267948966, 3.141592653589793, 6.283185307179586]
ANGLES += [22.0, 355.0, 11.0, 103993.0, 823549.0, 823550.0, 1e6, 1e15, 1e22, 1e100, 1.7e308]
ANGLES += [float(round(k * mp.pi / 2)) for k in (33, 100001, 10**7, 10**12)]
ANGLES += [float(k * mp.pi / 2) for k in (1, 2, 3, 7, 100, 9999, 500001, 524287, 524289, 10**8, 10**14)]
# The double nearest to a multiple of pi/2, relative to its size: Muller, Elementary Functions, 3rd ed. (2016),
# sec. 11.3.2 (section from memory). glibc 2.36's cosine is 8 units off here.
ANGLES += [6381956970095103.0 * 2.0**797]
UNIT = [1e-300, 1e-9, 0.1, 0.49999999999999994, 0.5, 0.5000000000000001, 0.7071067811865475, 0.9, 0.9999999999999999, 1.0]
SIZES = [5e-324, 1e-310, 2.2250738585072014e-308, 1e-300, 1e-100, 1e-9, 0.1, 0.7071067811865475, 0.7071067811865476]
SIZES += [0.9999999999999999, 1.0000000000000002, 1.4142135623730951, 2.0, 2.718281828459045, 10.0, 1000.0, 1e22, 1e300]
SIZES += [1.7976931348623157e308]


def both(values):
    return values + [-v for v in values]


def uniform(low, high, count=40):
    return [random.uniform(low, high) for _ in range(count)]


def logarithmic(low, high, count=40):
    return [math.exp(random.uniform(math.log(low), math.log(high))) for _ in range(count)]


def one(values):
    return [(v, 0.0) for v in values]


def pairs():
    some = [1e-310, 1e-300, 1e-5, 0.5, 1.0, 2.0, 3.0, 1e5, 1e160, 1e300, 1.7e308]
    rows = [(sx * x, sy * y) for x in some for y in some for sx in (1, -1) for sy in (1, -1)]
    return random.sample(rows, 120) + list(zip(uniform(-5, 5), uniform(-5, 5)))


def powers():
    rows = list(zip(logarithmic(1e-3, 1e3, 60), uniform(-30, 30, 60)))
    rows += [(1 + 1e-8, 1e9), (1 - 1e-12, 1e14), (1.0000000000000002, 3e18), (0.9999999999999999, 6e18)]
    rows += [(5e-324, 0.5), (1e-310, -0.9), (1.7e308, 0.99), (2.0, -1074.0), (2.0, -1022.5), (10.0, 308.0), (10.0, -323.0)]
    rows += [(-2.0, 3.0), (-3.0, -5.0), (-1.5, 40.0), (0.5, 1e-320), (math.e, 709.0)]
    return rows


FUNCTIONS = {
    "Sin": (lambda x, y: mp.sin(x), one(both(ANGLES) + uniform(-10, 10) + logarithmic(1e5, 1e300))),
    "Cos": (lambda x, y: mp.cos(x), one(ANGLES + uniform(-10, 10) + logarithmic(1e5, 1e300))),
    "Tan": (lambda x, y: mp.tan(x), one(both(ANGLES) + uniform(-10, 10) + logarithmic(1e5, 1e300))),
    "Atan": (lambda x, y: mp.atan(x), one(both(UNIT + SIZES) + uniform(-5, 5) + logarithmic(1e-8, 1e8))),
    "Asin": (lambda x, y: mp.asin(x), one(both(UNIT) + uniform(-1, 1, 80))),
    "Acos": (lambda x, y: mp.acos(x), one(both(UNIT) + uniform(-1, 1, 80))),
    "Atan2": (lambda x, y: mp.atan2(x, y), pairs()),
    "Hypot": (lambda x, y: mp.hypot(x, y), pairs()),
    "Exp": (lambda x, y: mp.exp(x), one([1e-300, -1e-300, 1e-9, 709.7, -708.3, -708.5, -740.0, -745.1] + uniform(-700, 700) + uniform(-3, 3))),
    "Ln": (lambda x, y: mp.log(x), one(SIZES + uniform(0.1, 4) + logarithmic(1e-300, 1e300))),
    "Log10": (lambda x, y: mp.log10(x), one(SIZES + uniform(0.1, 4) + logarithmic(1e-300, 1e300))),
    "Tanh": (lambda x, y: mp.tanh(x), one(both(UNIT + [19.0, 20.0, 22.0, 300.0]) + uniform(-4, 4) + uniform(-0.6, 0.6))),
    "Powf": (lambda x, y: mp.power(x, y), powers()),
}


def nearest(value):
    """float() of an mpf rounds twice below the normal range; Fraction does not."""
    if value == 0:
        return 0.0
    sign, mantissa, exponent, _ = value._mpf_
    from fractions import Fraction

    size = Fraction(int(mantissa)) * Fraction(2) ** int(exponent)
    return float(-size if sign else size)


def row(function, x, y):
    mp.dps = 1200 if abs(x) > 1e5 and y == 0.0 else 60
    if abs(x) < 1e-150 or abs(x) > 1e150 or abs(y) > 1e150 or 0 < abs(y) < 1e-150:
        mp.dps = 1200
    value = function(mpf(x), mpf(y))
    try:
        high = nearest(value)
    except OverflowError:
        return None
    return [x, y, high, nearest(value - mpf(high))]


if __name__ == "__main__":
    print("{")
    for i, (name, (function, arguments)) in enumerate(FUNCTIONS.items()):
        rows = [r for r in (row(function, x, y) for x, y in arguments) if r is not None]
        body = ",\n".join("  " + json.dumps(r) for r in rows)
        print(f'"{name}": [\n{body}\n]' + ("," if i + 1 < len(FUNCTIONS) else ""))
    print("}")
