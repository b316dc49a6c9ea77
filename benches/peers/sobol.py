"""SciPy, scrambled Sobol' points and ndtri: ns a sample, and the time to a target worst standardised standard error.

Prints a line of JSON a model. Sizes are doubled until the target is met, each from scratch; only the size that meets it
is counted, as if it had been known, and beside it the time interpolated between the last two sizes.
"""

import math
import time

import numpy as np
from models import CHUNK, REPLICATES, Model
from peer import arguments, report
from scipy.special import ndtri
from scipy.stats import qmc

# Most samples of a search for the target.
MOST_LOG2 = 27


def run(model, samples, seed):
    """Worst error of `samples` in all replicates together, seconds, and how many of these went into scrambling."""
    start = time.perf_counter()
    scrambling = 0.0
    replicates = []
    for stream in np.random.SeedSequence(seed).spawn(REPLICATES):
        before = time.perf_counter()
        points = qmc.Sobol(model.n, scramble=True, rng=np.random.default_rng(stream))
        scrambling += time.perf_counter() - before
        model.start()
        for _ in range(samples // REPLICATES // CHUNK):
            z = points.random(CHUNK)
            # The middle of the cell: a coordinate of 0 would be an infinite normal.
            z += 2.0**-31
            ndtri(z, out=z)
            model.add(z.T)
        replicates.append(model.moments())
    worst = model.worst_error(replicates)
    return worst, time.perf_counter() - start, scrambling


def least(model, samples, options):
    """Least of some repeats: seconds, and seconds without the scrambling, which a longer run would not notice."""
    runs = [run(model, samples, options.seed) for _ in range(options.repeats)]
    return min(r[1] for r in runs), min(r[1] - r[2] for r in runs)


def main():
    options = arguments(__doc__)
    for name in options.models:
        model = Model(name)
        run(model, REPLICATES * CHUNK, 0)
        samples = 1 << options.log2
        _, seconds = least(model, samples, options)
        worst, *_ = run(model, samples, options.seed)
        reached = interpolated = None
        before = None
        size = REPLICATES * CHUNK
        while size <= 1 << MOST_LOG2:
            error, *_ = run(model, size, options.seed)
            if error <= options.target:
                reached, _ = least(model, size, options)
                interpolated = reached
                if before:
                    share = math.log(before / options.target) / math.log(before / error)
                    then, _ = least(model, size // 2, options)
                    interpolated = then * (reached / then) ** share
                break
            before, size = error, 2 * size
        report("SciPy Sobol'", name, samples, seconds, worst, reached, interpolated, size)


main()
