"""How many stacks a second the model gets through on one core: ``python -m tests.bench.model``.

Every stack is asked for a whole curve of eight pressures with the peak stress at each. Times are
the least process time of several repeats, after compilation. The parts of the `search` fidelity
are found by leaving work out: laying out only; one round a pressure (linear plates with contact);
all rounds (stretching and contact until they settle); and everything (with stress)."""

import platform
import time
from collections.abc import Callable
from functools import partial
from typing import Any, NamedTuple

import numpy as np
from numpy.random import Generator

from optimiser.compiled import kernel
from optimiser.mechanics import deflect
from optimiser.mechanics.layout import Floats, Ints, group_shims
from optimiser.mechanics.quick import (
    Bench,
    Layers,
    Setting,
    advance,
    bench,
    follow,
    lay_out,
    layers_of,
)
from optimiser.mechanics.reference import reference_deflect
from optimiser.mechanics.tables import Tables, tables_for

from ..mechanics.stacks import CLAMP, EDGE, PORT, SEAT, THICKNESSES, Question, opening_pressure

KINDS = ("taper", "two stages", "preloaded seat")
LEVELS = np.geomspace(0.08, 1.5, 8)
YOUNGS, POISSON, SETTLED = 206e9, 0.3, 1e-3
MANY, SOME, FEW = 1000, 100, 8
REPEATS = 7
LAYOUT, SHAPES, ALL = 0, 1, 2


def _sizes(rng: Generator, count: int) -> list[tuple[float, ...]]:
    sizes = np.sort(rng.choice(np.arange(14.0, EDGE), size=count, replace=False))[::-1]
    return [(float(size), float(rng.choice(THICKNESSES))) for size in sizes]


def _faces(rng: Generator, least: int) -> list[tuple[float, ...]]:
    count = int(rng.integers(least, least + 3))
    return [(EDGE, float(t)) for t in rng.choice(THICKNESSES, count)]


def _question(rng: Generator, kind: str) -> Question:
    """A workshop's stack: 6 to 10 shims in a taper, 8 to 15 in two stages."""
    options: dict[str, Any] = {"seat_mm": SEAT}
    shims = _faces(rng, 2)
    if kind == "two stages":
        crossover = (float(rng.choice([16.0, 18.0, 20.0])), float(rng.choice([0.1, 0.15])))
        shims += [*_sizes(rng, int(rng.integers(0, 3))), crossover, *_faces(rng, 1)]
    shims += _sizes(rng, int(rng.integers(4, 7)))
    if kind == "preloaded seat":
        options["seat_height_mm"] = float(rng.uniform(0.02, 0.12))
    return Question(tuple(shims), options, opening_pressure(shims))


class Packed(NamedTuple):
    """Many stacks in flat arrays: stack k owns the groups start[k]:start[k + 1]. SI."""

    start: Ints
    plate: Ints
    hole: Ints
    rim: Ints
    thick: Floats
    cubed: Floats
    thickest: Floats
    height: Floats  # (stacks,) of the seat
    pressures: Floats  # (stacks, 8)


@kernel
def _run(
    tables: Tables, packed: Packed, b: Bench, tolerance: float, part: int, stress: Floats
) -> tuple[int, int]:
    """Follow every stack; rounds in all, and stacks that did not settle.

    ``part`` says where to stop (LAYOUT, SHAPES, ALL)."""
    size = packed.pressures.shape[1]
    edge, seat, force = np.empty(size), np.empty(size), np.empty(size)
    rounds = failed = 0
    for k in range(packed.height.size):
        low, high = packed.start[k], packed.start[k + 1]
        layers = Layers(
            packed.plate[low:high],
            packed.hole[low:high],
            packed.rim[low:high],
            packed.thick[low:high],
            packed.cubed[low:high],
            packed.thickest[low:high],
        )
        setting = Setting(YOUNGS, packed.height[k], 0.0, 0.0, tolerance, True)
        pressures = packed.pressures[k]
        taken = 0
        if part == ALL:
            taken = follow(tables, layers, setting, pressures, b, edge, seat, stress[k], force)
            rounds += taken
        else:
            lay_out(tables, layers, setting, b)
            ahead = 1.0
            for p in range(size if part == SHAPES else 0):
                taken, ahead = advance(tables, layers, setting, pressures, p, ahead, b)
                rounds += taken
        failed += taken < 0
    return rounds, failed


def _pack(questions: list[Question]) -> tuple[Tables, Packed, Bench]:
    sizes = np.arange(14.0, EDGE + 1) * 0.5e-3  # one drawer's tables serve all stacks
    tables = tables_for(
        sizes, np.empty(0), CLAMP * 0.5e-3, (PORT[0] * 0.5e-3, PORT[1] * 0.5e-3), SEAT * 0.5e-3,
        0.0, POISSON,
    )  # fmt: skip
    layers = []
    for question in questions:
        outer, thickness = np.array(question.shims).T
        groups, _ = group_shims(outer * 0.5e-3, thickness * 1e-3, np.zeros(outer.size))
        layers.append(layers_of(tables, groups))
    counts = [layer.plate.size for layer in layers]
    packed = Packed(
        np.cumsum([0, *counts]),
        *(np.concatenate(column) for column in zip(*layers, strict=True)),
        np.array([q.options.get("seat_height_mm", 0.0) for q in questions]) * 1e-3,
        np.array([q.bend_mpa * LEVELS for q in questions]) * 1e6,
    )
    return tables, packed, bench(max(counts), tables.nodes.size)


def _seconds(work: Callable[[], object], repeats: int = REPEATS) -> float:
    """Least process time of ``work``, s, after one run that may compile."""
    work()
    times = []
    for _ in range(repeats):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)


def _search(questions: list[Question]) -> tuple[float, str]:
    """Seconds a stack, and where they go."""
    tables, packed, b = _pack(questions)
    stress = np.empty_like(packed.pressures)
    parts = [
        _seconds(partial(_run, tables, packed, b, tolerance, part, stress))
        for part, tolerance in (
            (LAYOUT, SETTLED),
            (SHAPES, np.inf),
            (SHAPES, SETTLED),
            (ALL, SETTLED),
        )
    ]
    rounds, failed = _run(tables, packed, b, SETTLED, ALL, stress)
    layout, linear, stretching, peak = 100 * np.diff([0.0, *parts]) / parts[-1]
    shares = (
        f"layout {layout:.0f} %, contact {linear:.0f} %, stretching {stretching:.0f} %, "
        f"stress {peak:.0f} %; {rounds / packed.pressures.size:.1f} rounds a pressure, "
        f"{failed} stacks did not settle"
    )
    return parts[-1] / len(questions), shares


def _public(questions: list[Question], fidelity: Any) -> float:
    def work() -> None:
        for q in questions:
            levels = q.bend_mpa * LEVELS
            deflect(q.shims, pressures_mpa=levels, fidelity=fidelity, **q.place, **q.options)

    return _seconds(work, 3) / len(questions)


def _reference(questions: list[Question]) -> float:
    def work() -> None:
        for q in questions:
            levels = q.bend_mpa * LEVELS
            reference_deflect(q.shims, pressures_mpa=levels, **q.place, **q.options)

    return _seconds(work, 2) / len(questions)


def main() -> None:
    """Print the table."""
    print(f"whole curves of {LEVELS.size} pressures with stress, one core, {platform.machine()}")
    print(f"stacks: search {MANY}, reported {SOME}, reference {FEW} different ones a line\n")
    header = ("stack", "shims", "search/s", "reported/s", "reference/s", "ratio to reference")
    print("{:<15}{:>6}{:>11}{:>12}{:>13}{:>22}".format(*header))
    notes = []
    for kind in KINDS:
        rng = np.random.default_rng(7)
        questions = [_question(rng, kind) for _ in range(MANY)]
        quick, shares = _search(questions)
        fine = _public(questions[:SOME], "reported")
        readable = _reference(questions[:FEW])
        shims = np.mean([len(q.shims) for q in questions])
        ratios = f"{readable / quick:,.0f} and {readable / fine:,.0f}"
        print(
            f"{kind:<15}{shims:>6.1f}{1 / quick:>11,.0f}{1 / fine:>12,.0f}{1 / readable:>13,.1f}"
            f"{ratios:>22}"
        )
        door = 1 / _public(questions[:SOME], "search")
        notes.append(f"{kind}: {shares}; {door:,.0f} stacks/s through deflect()")
    print("\nwhere the time of `search` goes\n" + "\n".join(notes))


if __name__ == "__main__":
    main()
