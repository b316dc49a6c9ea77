"""First-order Taylor and the unscented transform in Python, to be scored by Gaussworthy.

    python3 predict.py taylor-1 < cases.jsonl > answers.jsonl
    python3 predict.py unscented < cases.jsonl > answers.jsonl

Reads case records, writes moments records, one JSON object a line. Needs NumPy. Nothing here is shared with
Gaussworthy: formulas are written anew, Jacobians come by the complex step (W. Squire, G. Trapp, "Using complex
variables to estimate derivatives of real functions", SIAM Review 40 (1998) 110-112).
"""

import ast
import json
import operator
import sys

import numpy as np

STEP = 1e-30  # of the complex step: it squares to nothing, so no digits are lost


# Elementary functions that carry the imaginary part of a complex step as a derivative.


def angle(y, x):
    """atan2(y, x)."""
    a, b = np.real(x), np.real(y)
    return np.arctan2(b, a) + 1j * (a * np.imag(y) - b * np.imag(x)) / (a * a + b * b)


def length(*sides):
    return np.sqrt(sum(side * side for side in sides))


def wrap(a):
    """To (-pi, pi]."""
    a = np.remainder(a, 2 * np.pi)
    return np.where(a > np.pi, a - 2 * np.pi, a)


# Sensors: which components are read, in which order, which outputs are angles, and h on the read components.


class Sensor:
    def __init__(self, reads, angular, h):
        self.reads, self.angular, self.h = list(reads), np.array(angular), h


def stations_of(s):
    return s["stations"] if "stations" in s else [s["station"]]


def offsets(x, station):
    return [x[i] - station[i] for i in range(len(station))]


def seen(s, of_one, angular):
    """A sensor that reads a position from every station; `of_one` gives its outputs from the offsets."""
    stations = stations_of(s)

    def h(x):
        return [y for station in stations for y in of_one(*offsets(x, station))]

    return Sensor(s["position"], angular * len(stations), h)


def range_and_rate(x, station):
    d = len(station)
    r = offsets(x, station)
    distance = length(*r)
    return distance, sum(r[i] * x[d + i] for i in range(d)) / distance


def azimuth_and_elevation(x, y, z):
    return angle(y, x), angle(z, length(x, y))


def range_doppler(s):
    stations = stations_of(s)
    return Sensor(
        s["position"] + s["velocity"],
        [False, False] * len(stations),
        lambda x: [y for station in stations for y in range_and_rate(x, station)],
    )


def bearing_rate(s):
    stations = stations_of(s)

    def of_one(x, station):
        east, north = offsets(x, station)
        return angle(north, east), (east * x[3] - north * x[2]) / (east * east + north * north)

    return Sensor(
        s["position"] + s["velocity"],
        [True, False] * len(stations),
        lambda x: [y for station in stations for y in of_one(x, station)],
    )


def time_difference(s):
    first, *others = s["stations"]

    def h(x):
        reference = length(*offsets(x, first))
        return [(length(*offsets(x, other)) - reference) / s["wave_speed"] for other in others]

    return Sensor(s["position"], [False] * len(others), h)


def frequency_difference(s):
    first, *others = s["stations"]

    def h(x):
        _, reference = range_and_rate(x, first)
        return [-s["carrier"] / s["wave_speed"] * (range_and_rate(x, other)[1] - reference) for other in others]

    return Sensor(s["position"] + s["velocity"], [False] * len(others), h)


def received_strength(s):
    def of_one(*r):
        return [s["strength"] - 10 * s["exponent"] * np.log(length(*r) / s["reference_distance"]) / np.log(10)]

    return seen(s, of_one, [False])


def quadratic(s):
    A = np.array(s["A"], dtype=float)
    p, n = A.shape[:2]
    b = np.array(s.get("b", np.zeros((p, n))), dtype=float)
    c = np.array(s.get("c", np.zeros(p)), dtype=float)
    used = A.any(axis=(0, 1)) | A.any(axis=(0, 2)) | b.any(axis=0)
    reads = np.flatnonzero(used) if used.any() else np.array([0])
    A, b = A[:, reads][:, :, reads], b[:, reads]
    return Sensor(reads, [False] * p, lambda x: [x @ A[j] @ x + b[j] @ x + c[j] for j in range(p)])


def linear(s):
    H = np.array(s["H"], dtype=float)
    p = len(H)
    offset = np.array(s.get("offset", np.zeros(p)), dtype=float)
    reads = np.flatnonzero(H.any(axis=0)) if H.any() else np.array([0])
    return Sensor(reads, [False] * p, lambda x: list(H[:, reads] @ x + offset))


def line_offset(s):
    (x0, y0), (x1, y1) = s["through"]
    along = np.array([x1 - x0, y1 - y0]) / np.hypot(x1 - x0, y1 - y0)
    return Sensor(s["position"], [False], lambda x: [along[0] * (x[1] - y0) - along[1] * (x[0] - x0)])


def line_feature(s):
    return Sensor(
        s["position"] + s["line"], [False], lambda x: [x[0] * np.cos(x[3]) + x[1] * np.sin(x[3]) - x[2]]
    )


def polar_to_cartesian(s):
    return Sensor(
        [s["range"], s["bearing"]], [False, False], lambda x: [x[0] * np.cos(x[1]), x[0] * np.sin(x[1])]
    )


def camera(s):
    f, (cu, cv) = s["focal_length"], s["centre"]
    image = lambda x: [f * x[0] / x[2] + cu, f * x[1] / x[2] + cv]
    if s["kind"] == "pinhole":
        return Sensor(s["position"], [False] * 2, image)
    return Sensor(s["position"], [False] * 3, lambda x: [*image(x), f * s["baseline"] / x[2]])


def attitude_vector(s):
    d = np.array(s["direction"], dtype=float)
    d = d / np.sqrt(d @ d)

    def h(phi):
        square = phi @ phi
        if abs(square) < 0.5:  # series: the rotation is smooth where its angle is not
            first, second, term = 0, 0, 1
            for k in range(12):
                first, second = first + term, second + term / (2 * k + 2)
                term = term * -square / ((2 * k + 2) * (2 * k + 3))
            # term_k = (-t^2)^k / (2k + 1)!, and that over 2k + 2 is the term of (1 - cos t) / t^2.
        else:
            t = np.sqrt(square)
            first, second = np.sin(t) / t, 2 * (np.sin(t / 2) / t) ** 2
        once = np.cross(phi, d)
        return list(d + first * once + second * np.cross(phi, once))

    return Sensor(s["attitude"], [False] * 3, h)


def dipole_field(s):
    moment, place, background = (np.array(s[key], dtype=float) for key in ("moment", "place", "background"))

    def h(x):
        r = x - place
        distance = np.sqrt(r @ r)
        field = 100 * (3 * r * (moment @ r) / distance**5 - moment / distance**3) + background
        return [np.sqrt(field @ field)]

    return Sensor(s["position"], [False], h)


def single(formula):
    return lambda s: Sensor([s["component"]], [False], lambda x: [formula(s, x[0]) + s["offset"]])


KINDS = {
    "range-bearing": lambda s: seen(s, lambda x, y: (length(x, y), angle(y, x)), [False, True]),
    "bearing-only": lambda s: seen(s, lambda x, y: (angle(y, x),), [True]),
    "range-only": lambda s: seen(s, lambda *r: (length(*r),), [False]),
    "range-azimuth-elevation": lambda s: seen(
        s, lambda *r: (length(*r), *azimuth_and_elevation(*r)), [False, True, True]
    ),
    "azimuth-elevation": lambda s: seen(s, azimuth_and_elevation, [True, True]),
    "range-doppler": range_doppler,
    "bearing-rate": bearing_rate,
    "time-difference": time_difference,
    "frequency-difference": frequency_difference,
    "received-strength": received_strength,
    "quadratic": quadratic,
    "linear": linear,
    "line-offset": line_offset,
    "line-feature": line_feature,
    "polar-to-cartesian": polar_to_cartesian,
    "pinhole": camera,
    "stereo-disparity": camera,
    "attitude-vector": attitude_vector,
    "dipole-field": dipole_field,
    "exponential-decay": single(lambda s, x: s["amplitude"] * np.exp(-x / s["scale"])),
    "saturating": lambda s: Sensor(
        [s["component"]], [False], lambda x: [s["limit"] * np.tanh(s["gain"] * (x[0] - s["offset"]) / s["limit"])]
    ),
    "phase-sine": single(lambda s, x: s["amplitude"] * np.sin(s["frequency"] * x + s["phase"])),
}


# Sensors that are written out: arithmetic on named components, parameters and definitions.

OPERATORS = {
    ast.Add: operator.add,
    ast.Sub: operator.sub,
    ast.Mult: operator.mul,
    ast.Div: operator.truediv,
    ast.Pow: operator.pow,
    ast.USub: operator.neg,
    ast.UAdd: operator.pos,
}
FUNCTIONS = {
    "hypot": length,
    "atan2": angle,
    "sqrt": np.sqrt,
    "exp": np.exp,
    "ln": np.log,
    "sin": np.sin,
    "cos": np.cos,
    "tan": np.tan,
    "tanh": np.tanh,
}


class Unknown(Exception):
    """What is not known here; Gaussworthy may know it."""


def parsed(formula):
    try:
        return ast.parse(formula.replace("^", "**"), mode="eval").body
    except SyntaxError:
        raise Unknown(f"the formula `{formula}`") from None


def evaluated(node, value_of):
    if isinstance(node, ast.Constant):
        return node.value
    if isinstance(node, ast.Name):
        return value_of(node.id)
    if isinstance(node, ast.BinOp) and type(node.op) in OPERATORS:
        return OPERATORS[type(node.op)](evaluated(node.left, value_of), evaluated(node.right, value_of))
    if isinstance(node, ast.UnaryOp) and type(node.op) in OPERATORS:
        return OPERATORS[type(node.op)](evaluated(node.operand, value_of))
    if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id in FUNCTIONS:
        return FUNCTIONS[node.func.id](*(evaluated(argument, value_of) for argument in node.args))
    raise Unknown(f"`{ast.unparse(node)}` in a formula")


def written(s):
    parameters = s.get("parameters", {})
    definitions = {name: parsed(formula) for name, formula in s.get("definitions", {}).items()}
    outputs = [parsed(output["formula"]) for output in s["outputs"]]
    names = s["state"] + s.get("noise", [])
    used = set()

    def values(x):
        def value_of(name):
            if name in definitions:
                return evaluated(definitions[name], value_of)
            if name in x:
                used.add(name)
                return x[name]
            if name in parameters:
                return parameters[name]
            raise Unknown(f"the name `{name}` in a formula")

        return [evaluated(output, value_of) for output in outputs]

    with np.errstate(all="ignore"):
        values(dict.fromkeys(names, np.float64(1)))  # only to see which names are used
    reads = [i for i, name in enumerate(names) if name in used] or [0]
    angular = [output.get("angular", False) for output in s["outputs"]]
    return Sensor(reads, angular, lambda x: values({names[i]: x[k] for k, i in enumerate(reads)}))


def sensor_of(s):
    if "kind" not in s:
        return written(s)
    if s["kind"] not in KINDS:
        raise Unknown(f"the sensor `{s['kind']}`")
    return KINDS[s["kind"]](s)


# The two methods, on the read components x ~ N(m, P), a of them.


def taylor_1(sensor, m, P, R):
    """mu = h(m), S = J P J' + R, C = P J'."""
    columns = []
    for k in range(len(m)):
        x = m.astype(complex)
        x[k] += 1j * STEP
        columns.append(np.imag(sensor.h(x)) / STEP)
    J = np.column_stack(columns)
    mu = np.real(sensor.h(m.astype(complex)))
    return mu, J @ P @ J.T + R, P @ J.T


def unscented(sensor, m, P, R):
    """Julier, Uhlmann, Durrant-Whyte 2000, kappa = 3 - a; points along the columns of the Cholesky factor."""
    a = len(m)
    L = np.linalg.cholesky(P)
    reach, kappa = np.sqrt(3.0), 3.0 - a
    steps = [np.zeros(a), *(reach * L.T), *(-reach * L.T)]
    weights = np.array([kappa / 3] + [1 / 6] * (2 * a))
    h_m = np.real(sensor.h(m.astype(complex)))
    # Deviations from h(m): on the circle where an output is an angle, and with all digits elsewhere.
    d = np.array([np.real(sensor.h((m + step).astype(complex))) - h_m for step in steps])
    d = np.where(sensor.angular, wrap(d), d)
    shift = weights @ d
    d = d - shift
    S = (weights * d.T) @ d + R
    C = (weights * np.array(steps).T) @ d
    return h_m + shift, S, C


METHODS = {"taylor-1": taylor_1, "unscented": unscented}


def answer(record, method):
    """The moments record of a case record."""
    s, noise = record["sensor"], record.get("noise") or {}
    sensor = sensor_of(s)
    m, P = np.array(record["prior"]["mean"], dtype=float), np.array(record["prior"]["covariance"], dtype=float)
    n, p = len(m), len(sensor.angular)
    R = np.array(noise.get("covariance", 0.0), dtype=float)
    R = R * np.eye(p) if R.ndim == 0 else R
    if "inside" in noise:  # noise inside h: further components behind the state, independent of it
        V = np.array(noise["inside"]["covariance"], dtype=float)
        V = V * np.eye(len(s["noise"])) if V.ndim == 0 else V
        m = np.concatenate([m, np.zeros(len(V))])
        P = np.block([[P, np.zeros((n, len(V)))], [np.zeros((len(V), n)), V]])
    # The method works on what the sensor reads; what it does not read follows by regression on that.
    reads = sensor.reads
    mu, S, C_read = method(sensor, m[reads], P[np.ix_(reads, reads)], R)
    C = P[:, reads] @ np.linalg.solve(P[np.ix_(reads, reads)], C_read)
    C[reads] = C_read
    mu = np.where(sensor.angular, wrap(mu), mu)
    return {
        "case": record["case"],
        "mean": mu.tolist(),
        "covariance": S.tolist(),
        "cross_covariance": C[:n].tolist(),
    }


def main():
    if len(sys.argv) != 2 or sys.argv[1] not in METHODS:
        sys.exit(f"usage: {sys.argv[0]} {'|'.join(METHODS)}")
    method = METHODS[sys.argv[1]]
    for line in sys.stdin:
        record = json.loads(line)
        try:
            # NaN is not JSON: better no answer than one that nobody can read.
            print(json.dumps(answer(record, method), allow_nan=False), flush=True)
        except Unknown as what:
            print(f"{record['case']}: {what} is not known here; left out", file=sys.stderr)
        except (np.linalg.LinAlgError, ValueError) as why:
            print(f"{record['case']}: {why}; left out", file=sys.stderr)


if __name__ == "__main__":
    main()
