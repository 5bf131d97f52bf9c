"""Random buildable stacks of many kinds, for property tests, comparisons and benches. mm."""

from collections.abc import Iterable
from typing import Any, NamedTuple

import numpy as np
from numpy.random import Generator

from optimiser.mechanics import BackSpringForce

THICKNESSES = np.array([0.1, 0.15, 0.2, 0.25, 0.3])
KINDS = ("single", "taper", "equals", "two stages", "preload", "ring", "spring", "everything")
EDGE, CLAMP, SEAT, PORT = 30.0, 12.0, 28.0, (16.0, 24.0)


class Question(NamedTuple):
    """What :func:`optimiser.mechanics.deflect` is asked, and a pressure that opens the stack well.

    ``bend_mpa`` lifts the face edge by about the face shim's thickness.
    """

    shims: tuple[tuple[float, ...], ...]
    options: dict[str, Any]
    bend_mpa: float

    @property
    def place(self) -> dict[str, Any]:
        """Clamp and port as keyword arguments."""
        return {"clamp_mm": CLAMP, "port_inner_mm": PORT[0], "port_outer_mm": PORT[1]}


def _taper(rng: Generator, start: float, count: int) -> list[tuple[float, ...]]:
    """Shims that get smaller behind each other, down to at least 14 mm."""
    sizes = np.sort(rng.choice(np.arange(14.0, start), size=count, replace=False))[::-1]
    return [(float(size), float(rng.choice(THICKNESSES))) for size in sizes]


def _equals(rng: Generator, size: float, count: int) -> list[tuple[float, ...]]:
    return [(size, float(rng.choice(THICKNESSES))) for _ in range(count)]


def _stage(rng: Generator) -> list[tuple[float, ...]]:
    return _equals(rng, EDGE, int(rng.integers(1, 4))) + _taper(rng, EDGE, int(rng.integers(0, 5)))


def _crossover(rng: Generator) -> list[tuple[float, ...]]:
    return [(float(rng.choice([14.0, 16.0, 18.0, 20.0])), float(rng.choice([0.1, 0.15, 0.2])))]


def random_question(rng: Generator, kind: str) -> Question:
    """One stack of the given kind (see KINDS)."""
    shims = _equals(rng, EDGE, 1) if kind == "single" else _stage(rng)
    options: dict[str, Any] = {}
    if kind == "equals":
        size = float(rng.choice([22.0, 24.0, 26.0]))
        shims += [
            *_equals(rng, size, 2),
            (16.0, 0.1),
            *_equals(rng, size, 2),
            *_equals(rng, EDGE, 1),
        ]
    if kind in ("two stages", "everything"):
        shims += _crossover(rng) + _stage(rng)
    if kind in ("ring", "everything"):
        hole = float(rng.choice([20.0, 24.0]))
        front = _equals(rng, EDGE, int(rng.integers(1, 3)))
        lift = float(rng.choice([0.1, 0.15, 0.2]))
        shims = [*front, (hole + 4.0, lift, hole), (16.0, 0.1), *_equals(rng, EDGE, 1), *shims]
    if kind in ("preload", "everything"):
        options |= {"seat_mm": SEAT, "seat_height_mm": float(rng.uniform(0.0, 0.12))}
    if kind in ("ring", "spring"):
        options |= {"seat_mm": SEAT, "seat_height_mm": 0.0}
    if kind in ("spring", "everything"):
        spring = rng.uniform([14.0, 10.0, 0.0], [24.0, 300.0, 60.0])
        options["back_spring"] = BackSpringForce(*(float(value) for value in spring))
    return Question(tuple(shims), options, opening_pressure(shims))


def opening_pressure(shims: Iterable[tuple[float, ...]]) -> float:
    """Rough pressure, MPa, that lifts the edge by the face shim's thickness: all shims as one plate
    whose stiffnesses add, each counted by how far it reaches."""
    shims = list(shims)
    reach = [((s[0] - CLAMP) / (EDGE - CLAMP)) * s[1] ** 3 for s in shims if len(s) == 2]
    return 0.12 * sum(reach) / shims[0][1] ** 3 * (shims[0][1] / 0.2) ** 4


def random_questions(seed: int, kinds: Iterable[str], count: int) -> list[Question]:
    """``count`` stacks, the kinds in turn; the same for the same seed."""
    rng = np.random.default_rng(seed)
    names = list(kinds)
    return [random_question(rng, names[k % len(names)]) for k in range(count)]
