"""How often the stated 95 % intervals of a fit hold the truth: 200 fits to runs with fresh noise.

Run: ``python -m tests.bench.fit_coverage [repetitions]``. Prints, for every number, the share of
fits whose interval holds it, and the mean and spread of the estimates in standard errors.
"""

import sys
from time import perf_counter

import numpy as np

from optimiser.fitting.estimate import estimate
from tests.fitting.invented import prepared, repeated

REPETITIONS = 200


def coverage(repetitions: int, seed: int = 5) -> tuple[list[str], np.ndarray, np.ndarray]:
    """Names (p,), which intervals hold the truth (repetitions, p), errors over standard errors."""
    model, seen, truth = prepared()
    start = np.array([item.start for item in model.parameters])
    random = np.random.default_rng(seed)
    held, scaled = [], []
    for _ in range(repetitions):
        found = estimate(model, repeated(seen, random), [start])
        held.append(np.abs(found.values - truth) <= found.half_width)
        scaled.append((found.values - truth) / found.errors)
    return [item.name for item in model.parameters], np.array(held), np.array(scaled)


def main() -> None:
    """Measure and print."""
    repetitions = int(sys.argv[1]) if len(sys.argv) > 1 else REPETITIONS
    began = perf_counter()
    names, held, scaled = coverage(repetitions)
    for place, name in enumerate(names):
        print(
            f"{name:28s} {100.0 * held[:, place].mean():5.1f} %   mean "
            f"{scaled[:, place].mean():+.2f}   spread {scaled[:, place].std():.2f}"
        )
    print(f"{repetitions} fits in {perf_counter() - began:.1f} s")


if __name__ == "__main__":
    main()
