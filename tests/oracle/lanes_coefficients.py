"""Polynomials of src/lanes/: weighted minimax fits by the Remez exchange, in 60 digits.

Run: python3 tests/oracle/lanes_coefficients.py        (needs mpmath; 1.3.0 was used)

Each fit prints the coefficients, lowest power first and rounded to double precision, and the greatest weighted
error of the *rounded* polynomial as a power of two. Method: E. Ya. Remez (1934) as in J.-M. Muller, Elementary
Functions, 3rd ed. (Birkhaeuser, 2016), sec. 3.5.
"""

from mpmath import mp, mpf

mp.dps = 60


def remez(function, weight, low, high, terms):
    """Coefficients c that minimise max |weight(x) (function(x) - sum c_i x^i)| on [low, high]."""
    low, high = mpf(low), mpf(high)
    chebyshev = [mp.cos(mp.pi * i / terms) for i in range(terms + 1)]
    nodes = [(low + high) / 2 - (high - low) / 2 * c for c in chebyshev]
    coefficients = None
    for _ in range(12):
        rows = [[x**i for i in range(terms)] + [(-1) ** k / weight(x)] for k, x in enumerate(nodes)]
        solution = mp.lu_solve(mp.matrix(rows), mp.matrix([function(x) for x in nodes]))
        coefficients, level = list(solution)[:terms], abs(solution[terms])

        def error(x):
            return weight(x) * (function(x) - mp.polyval(coefficients[::-1], x))

        extrema = extrema_of(error, low, high, 40 * terms)
        if len(extrema) < terms + 1:
            raise RuntimeError("the error does not alternate often enough")
        while len(extrema) > terms + 1:
            extrema.pop(0 if abs(error(extrema[0])) < abs(error(extrema[-1])) else -1)
        nodes = extrema
        if max(abs(error(x)) for x in nodes) < level * (1 + mpf(10) ** -4):
            break
    return coefficients


def extrema_of(error, low, high, steps):
    """One extremum between each two changes of sign."""
    grid = [(low + high) / 2 - (high - low) / 2 * mp.cos(mp.pi * i / steps) for i in range(steps + 1)]
    values = [error(x) for x in grid]
    found, best = [], 0
    for i in range(1, steps + 1):
        if (values[i] > 0) != (values[best] > 0):
            found.append(best)
            best = i
        elif abs(values[i]) > abs(values[best]):
            best = i
    found.append(best)
    points = []
    for i in found:
        left, right = grid[max(i - 1, 0)], grid[min(i + 1, steps)]
        for _ in range(40):
            a, b = left + (right - left) / 3, right - (right - left) / 3
            if abs(error(a)) < abs(error(b)):
                left = a
            else:
                right = b
        points.append((left + right) / 2)
    return points


def rounded(function, weight, low, high, terms, one_by_one):
    """Rounds the lowest coefficients to double one by one and fits the others to what they leave."""
    kept = []
    while len(kept) < one_by_one:
        first = float(remez(function, weight, low, high, terms - len(kept))[0])
        kept.append(first)
        function, weight = divided(function, weight, first)
    return kept + [float(c) for c in remez(function, weight, low, high, terms - len(kept))]


def divided(function, weight, first):
    return lambda x: (function(x) - mpf(first)) / x, lambda x: weight(x) * abs(x)


def show(name, function, weight, low, high, terms, one_by_one=2, scale=lambda x: mpf(1)):
    coefficients = rounded(function, weight, low, high, terms, one_by_one)
    grid = [low + (high - low) * mpf(i) / 2001 for i in range(2002)]
    worst = max(
        abs(scale(x) * weight(x) * (function(x) - mp.polyval([mpf(c) for c in coefficients[::-1]], x)))
        for x in grid
    )
    print(f"{name}: {terms} terms, rounded error 2^{float(mp.log(worst, 2)):.1f}")
    for c in coefficients:
        print(f"    {c!r},")


def constant(name, value, bits):
    """value = high + low with `bits` bits in high."""
    exponent = mp.floor(mp.log(abs(value), 2))
    unit = mpf(2) ** (exponent - bits + 1)
    high = mp.floor(value / unit) * unit
    print(f"{name}: high ({bits} bits) {float(high)!r}, low {float(value - high)!r}")
    return value - high


TINY = mpf(10) ** -9  # where the quotients below are 0 / 0

if __name__ == "__main__":
    quarter = (mp.pi / 4 * mpf("1.0001")) ** 2
    # sin r = r + r^3 S(r^2); the weight makes the error relative to sin r.
    show(
        "sin",
        lambda z: (mp.sin(mp.sqrt(z)) - mp.sqrt(z)) / mp.sqrt(z) ** 3,
        lambda z: mp.sqrt(z) ** 3 / mp.sin(mp.sqrt(z)),
        TINY,
        quarter,
        6,
    )
    # cos r = 1 - r^2 / 2 + r^4 C(r^2).
    show(
        "cos",
        lambda z: (mp.cos(mp.sqrt(z)) - 1 + z / 2) / z**2,
        lambda z: z**2 / mp.cos(mp.sqrt(z)),
        TINY,
        quarter,
        6,
    )
    # exp r = 1 + r + r^2 E(r), with a weight that does not vanish at 0; shown is the error of exp r - 1, relative.
    half = mp.log(2) / 2 * mpf("1.0001")
    show(
        "exp",
        lambda r: (mp.exp(r) - 1 - r) / r**2 if abs(r) > TINY else mpf(1) / 2,
        lambda r: r**2 + mpf("0.005"),
        -half,
        half,
        10,
        one_by_one=0,
        scale=lambda r: r**2 / abs(mp.expm1(r)) / (r**2 + mpf("0.005")),
    )
    # ln((1 + s) / (1 - s)) = 2 s + s z L(z), z = s^2, |s| <= (sqrt 2 - 1) / (sqrt 2 + 1).
    greatest = ((mp.sqrt(2) - 1) / (mp.sqrt(2) + 1) * mpf("1.0001")) ** 2
    logarithm = lambda z: 2 * mp.atanh(mp.sqrt(z)) / mp.sqrt(z)
    show("ln", lambda z: (logarithm(z) - 2) / z, lambda z: z / logarithm(z), TINY, greatest, 7)
    # 3 atanh(s) / s = 3 + z + z^2 G(z).
    show(
        "log2",
        lambda z: (3 * logarithm(z) / 2 - 3 - z) / z**2,
        lambda z: z**2 / 3,
        TINY,
        greatest,
        7,
    )
    # atan t = t + t^3 A(t^2).
    show(
        "atan",
        lambda z: (mp.atan(mp.sqrt(z)) - mp.sqrt(z)) / mp.sqrt(z) ** 3,
        lambda z: mp.sqrt(z) ** 3 / mp.atan(mp.sqrt(z)),
        TINY,
        mpf("0.5001") ** 2,
        12,
    )
    print()
    rest = constant("pi/2, first", mp.pi / 2, 33)
    rest = constant("pi/2, second", rest, 33)
    rest = constant("pi/2, third", rest, 53)
    constant("pi/4", mp.pi / 4, 50)
    constant("ln 2", mp.log(2), 32)
    constant("ln 2 for powers", mp.log(2), 26)
    constant("2 / (3 ln 2)", 2 / (3 * mp.log(2)), 26)
    constant("log10 2", mp.log10(2), 26)
    print("2 / pi, 64 bits a word:")
    with mp.workprec(1500):
        digits = int(mp.floor(2 / mp.pi * mpf(2) ** 1344))
    for i in range(21):
        print(f"    0x{(digits >> (64 * (20 - i))) & (2**64 - 1):016x},")
    print(f"pi/2 in 64 bits: 0x{int(mp.nint(mp.pi / 2 * mpf(2) ** 63)):016x}")
