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
    """Seconds and worst error of `samples` in all replicates together."""
    start = time.perf_counter()
    replicates = []
    for stream in np.random.SeedSequence(seed).spawn(REPLICATES):
        points = qmc.Sobol(model.n, scramble=True, rng=np.random.default_rng(stream))
        model.start()
        for _ in range(samples // REPLICATES // CHUNK):
            z = points.random(CHUNK)
            # The middle of the cell: a coordinate of 0 would be an infinite normal.
            z += 2.0**-31
            ndtri(z, out=z)
            model.add(z.T)
        replicates.append(model.moments())
    return time.perf_counter() - start, model.worst_error(replicates)


def main():
    options = arguments(__doc__)
    for name in options.models:
        model = Model(name)
        run(model, REPLICATES * CHUNK, 0)
        samples = 1 << options.log2
        seconds, worst = run(model, samples, options.seed)
        reached = interpolated = None
        before = None
        size = REPLICATES * CHUNK
        while size <= 1 << MOST_LOG2:
            now = run(model, size, options.seed)
            if now[1] <= options.target:
                reached = interpolated = now[0]
                if before:
                    share = math.log(before[1] / options.target) / math.log(before[1] / now[1])
                    interpolated = before[0] * (now[0] / before[0]) ** share
                break
            before, size = now, 2 * size
        report("SciPy Sobol'", name, samples, seconds, worst, reached, interpolated, size)


main()
