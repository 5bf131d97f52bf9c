"""Small stacks, rows and requests for the tests of this room."""

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from optimiser.stack import Shim, Stack
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.chain import Row

SIZES = (Shim(40, 0.15), Shim(36, 0.2), Shim(32, 0.2), Shim(28, 0.15), Shim(24, 0.1))
CLAMP = Shim(18, 0.3)


def stack_of(counts: Sequence[int]) -> Stack:
    """A taper with so many of each of ``SIZES`` over one clamp shim, and one face shim more."""
    shims = [SIZES[0], *(shim for shim, n in zip(SIZES, counts, strict=True) for _ in range(n))]
    return Stack.of([*shims, CLAMP])


def random_stacks(rng: np.random.Generator, count: int) -> tuple[Stack, ...]:
    return tuple(stack_of(rng.integers(0, 3, len(SIZES))) for _ in range(count))


def random_row(rng: np.random.Generator, circuits: int, most: int) -> Row:
    """A row with up to ``most`` candidates a circuit, of which at least one choice fits."""
    counts = rng.integers(1, most + 1, circuits)
    fits = rng.random(counts) < 0.7
    fits[tuple(rng.integers(0, counts))] = True
    return Row(
        tuple(np.round(rng.uniform(1, 6, n), 1) for n in counts),
        tuple(random_stacks(rng, n) for n in counts),
        fits,
    )


def candidate(stack: Stack, error_percent: float = 2.0, utilisation: float = 0.8) -> Candidate:
    return Candidate(stack, 11, error_percent, -3.0, 0.5, utilisation, 1.0, (100.0, 200.0))


TINY = """
name = "tiny"
frame = "forest-motorcycle"
damper = "rear-monotube"
stock = "small-shop"
rider_masses_kg = [74, 82]
feels = ["balanced"]
circuits = ["compression"]
clicks = 11
parts = 8
evaluations = 50
tolerance_percent = 30
"""


def write_request(folder: Path, text: str = TINY) -> Path:
    path = folder / "request.toml"
    path.write_text(text, encoding="utf-8")
    return path
