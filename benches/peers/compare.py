#!/usr/bin/env python3
"""Runs the peers beside ours in turn, round by round, on one thread each, and prints times and ratios with their spread.

    python3 benches/peers/compare.py --rounds 5

A ratio is taken within a round, so that what else the machine does weighs on both sides; what stands in the table is the
median of the rounds and, behind it, the quartiles. Needs cargo, NumPy and SciPy.
"""

import argparse
import json
import os
import statistics
import subprocess
import sys
from pathlib import Path

HERE = Path(__file__).resolve().parent
ROOT = HERE.parent.parent
SCIPY, NUMPY = "SciPy Sobol'", "NumPy plain"


def arguments():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("models", nargs="*", choices=["A", "B", "C", "D", []], default=[], metavar="A|B|C|D")
    parser.add_argument("--rounds", type=int, default=5, help="rounds (5)")
    parser.add_argument("--target", type=float, default=1e-5, help="worst standardised standard error (1e-5)")
    parser.add_argument("--log2", type=int, default=20, help="binary logarithm of the samples that are timed (20)")
    parser.add_argument("--json", type=Path, help="file to which every line measured is added")
    options = parser.parse_args()
    if options.rounds < 1:
        parser.error("--rounds: at least 1")
    options.models = options.models or list("ABCD")
    return options


def check_libraries():
    try:
        import numpy
        import scipy
    except ImportError as missing:
        sys.exit(f"{missing}: install NumPy and SciPy with `{sys.executable} -m pip install numpy scipy`")
    print(f"NumPy {numpy.__version__}, SciPy {scipy.__version__}")


def built_bench():
    """The program that cargo builds from benches/peers.rs."""
    command = ["cargo", "bench", "--bench", "peers", "--no-run", "--locked", "--message-format=json"]
    done = subprocess.run(command, cwd=ROOT, stdout=subprocess.PIPE, text=True)
    if done.returncode != 0:
        sys.exit(f"`{' '.join(command)}` failed")
    for line in done.stdout.splitlines():
        message = json.loads(line)
        if message.get("executable") and message["target"]["name"] == "peers":
            return message["executable"]
    sys.exit("cargo named no program for the bench `peers`")


def environment():
    """One thread, and the linear algebra's own choice of kernels."""
    variables = dict(os.environ)
    for name in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"):
        variables.pop(name, None)
    for name in ("OPENBLAS", "OMP", "MKL", "BLIS"):
        variables[f"{name}_NUM_THREADS"] = "1"
    return variables


def measured(command, options, seed, variables):
    wanted = ["--log2", str(options.log2), "--target", str(options.target), "--seed", str(seed)]
    done = subprocess.run([*command, *wanted], stdout=subprocess.PIPE, text=True, env=variables, cwd=HERE)
    if done.returncode != 0:
        sys.exit(f"`{' '.join(command)}` failed")
    return [json.loads(line) for line in done.stdout.splitlines()]


def spread(values, form):
    """Median and quartiles; a single value stands alone."""
    values = [v for v in values if v is not None]
    if not values:
        return "not reached"
    if len(values) == 1:
        return form(values[0])
    low, middle, high = statistics.quantiles(values, n=4, method="inclusive")
    return f"{form(middle)} ({form(low)} .. {form(high)})"


def seconds(value):
    return f"{value * 1e3:.2f} ms" if value < 1 else f"{value:.1f} s"


def times(value):
    return f"{value:,.0f}x" if value >= 100 else f"{value:.1f}x" if value >= 0.1 else f"{value:.1e}x"


def ratios(rounds, model, peer, program, key):
    """The peer's figure over the program's, round by round."""
    pairs = [(r[model, peer][key], r[model, program][key]) for r in rounds]
    return [a / b for a, b in pairs if a is not None and b is not None]


def show(rounds, models, target):
    programs = list(dict.fromkeys(program for _, program in rounds[0]))
    print(f"\nMedian (quartiles) of {len(rounds)} rounds, one thread; seconds of NumPy plain are extrapolated by 1/sqrt(N).")
    heads = ["", "ns a sample", "against SciPy", f"time to {target:g}", "against SciPy", "interpolated", "against NumPy"]
    for model in models:
        rows = [heads]
        for program in programs:
            of = [r[model, program] for r in rounds]
            ratio = lambda peer, key: spread(ratios(rounds, model, peer, program, key), times)
            rows.append([
                program,
                spread([r["ns"] for r in of], lambda v: f"{v:.1f}"),
                ratio(SCIPY, "ns"),
                spread([r["seconds"] for r in of], seconds),
                ratio(SCIPY, "seconds"),
                ratio(SCIPY, "seconds_interpolated"),
                ratio(NUMPY, "seconds"),
            ])
        widths = [max(len(row[i]) for row in rows) for i in range(len(heads))]
        print(f"\nModel {model}")
        for row in rows:
            print("  ".join(cell.ljust(width) for cell, width in zip(row, widths)).rstrip())


def main():
    options = arguments()
    check_libraries()
    python, variables = [sys.executable], environment()
    commands = [[*python, str(HERE / "plain.py")], [*python, str(HERE / "sobol.py")], [built_bench()]]
    rounds = []
    for number in range(1, options.rounds + 1):
        figures = {}
        for model in options.models:
            for command in commands:
                print(f"\rround {number} of {options.rounds}, model {model}", end="", file=sys.stderr, flush=True)
                for line in measured([*command, model], options, number, variables):
                    figures[model, line["program"]] = line
                    if options.json:
                        with options.json.open("a") as file:
                            file.write(json.dumps({"round": number, **line}) + "\n")
        rounds.append(figures)
    print(file=sys.stderr)
    show(rounds, options.models, options.target)


main()
