"""What the peers share: arguments, and the line that each prints."""

import argparse
import json


def arguments(description):
    parser = argparse.ArgumentParser(description=description)
    parser.add_argument("models", nargs="+", choices="ABCD", metavar="A|B|C|D")
    parser.add_argument("--log2", type=int, default=20, help="binary logarithm of the samples that are timed (20)")
    parser.add_argument("--target", type=float, default=1e-5, help="worst standardised standard error (1e-5)")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--repeats", type=int, default=3, help="times that each is done; the least counts (3)")
    return parser.parse_args()


def report(program, model, samples, seconds, worst, reached, interpolated=None, points=None):
    print(
        json.dumps({
            "program": program,
            "model": model,
            "ns": seconds / samples * 1e9,
            "worst_error": worst,
            "seconds": reached,
            "seconds_interpolated": reached if interpolated is None else interpolated,
            "points": points,
        }),
        flush=True,
    )
