"""NumPy, plain Monte Carlo: ns a sample and the worst standardised standard error at a number of samples.

Prints a line of JSON a model. The time to a target is extrapolated by 1/sqrt(N): it is hours.
"""

import time

import numpy as np
from models import CHUNK, REPLICATES, Model
from peer import arguments, report


def run(model, samples, seed):
    """Seconds and worst error of `samples` in all replicates together."""
    start = time.perf_counter()
    z = np.empty((model.n, CHUNK))
    replicates = []
    for stream in np.random.SeedSequence(seed).spawn(REPLICATES):
        normal = np.random.Generator(np.random.SFC64(stream)).standard_normal
        model.start()
        for _ in range(samples // REPLICATES // CHUNK):
            normal(out=z)
            model.add(z)
        replicates.append(model.moments())
    return time.perf_counter() - start, model.worst_error(replicates)


def main():
    options = arguments(__doc__)
    for name in options.models:
        model = Model(name)
        run(model, REPLICATES * CHUNK, 0)
        samples = 1 << options.log2
        runs = [run(model, samples, options.seed) for _ in range(options.repeats)]
        seconds, worst = min(runs)
        report("NumPy plain", name, samples, seconds, worst, seconds * (worst / options.target) ** 2)


main()
