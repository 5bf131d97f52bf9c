"""What the runs cannot tell, in plain sentences, and which further run would.

Two numbers are confused when an error of one can be made up by the other: a correlation of their
estimates near 1, or a spread wider than dampers differ. Which run would part them is not a
rule of thumb but worked out: the sensitivities of each candidate run are added to those of the runs
at hand, and the one that narrows the estimates most is named (V. V. Fedorov, *Theory of Optimal
Experiments* (Academic Press 1972) [from memory]).
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from optimiser.damper import Direction
from optimiser.fitting.estimate import FLAT_SCALES, Estimate, weight_of
from optimiser.fitting.model import Model, Seen, sensitivity
from optimiser.fitting.parameters import KEYS, Parameter
from optimiser.fitting.runs import Run
from optimiser.hydraulics.lift import Floats
from optimiser.stack import Group, Stack

#: Estimates more correlated than this are confused, whatever their spread.
CONFUSED = 0.985
#: The partner of a number that is spread too widely is at least this correlated.
PARTNER = 0.9
#: A standard error above this many scales tells nothing about a number.
WIDE_SCALES = 1.5
#: A run worth naming narrows a spread to this share or less.
WORTH = 0.7
_POINTS = 12
_DIRECTIONS: tuple[Direction, Direction] = ("compression", "rebound")


@dataclass(frozen=True)
class Confusion:
    """One thing the runs cannot tell.

    ``names``: one number, or two that go together; ``sentence`` says so; ``extra_run``: what would
    help, in words (empty: nothing tried does); ``before`` and ``after``: standard error of the
    wider number without and with that run, in its unit.
    """

    names: tuple[str, ...]
    sentence: str
    extra_run: str
    before: float
    after: float


@dataclass(frozen=True, eq=False)
class Candidate:
    """A run that could be made: in words, and as points for the model."""

    words: str
    run: Run
    stackless: bool = False


def confusions(model: Model, seen: Sequence[Seen], found: Estimate) -> list[Confusion]:
    """Everything the runs cannot tell, the most confused first."""
    pairs = confused_names(found)
    if not pairs:
        return []
    candidates = _with_slopes(model, candidate_runs(model, seen), found)
    return [_describe(found, names, candidates) for names in pairs]


def confused_names(found: Estimate) -> list[tuple[str, ...]]:
    """Names of the numbers that cannot be told, alone or in pairs, each number once."""
    scale = np.array([item.scale for item in found.parameters])
    wide = found.errors > WIDE_SCALES * scale
    correlation = np.abs(found.correlation - np.eye(scale.size))
    taken: set[int] = set()
    names: list[tuple[str, ...]] = []
    for first in np.argsort(-correlation.max(axis=1) - wide).tolist():
        if first in taken:
            continue
        second = int(np.argmax(correlation[first]))
        enough = PARTNER if wide[first] else CONFUSED
        if correlation[first, second] > enough and second not in taken:
            pair = sorted((first, second), key=lambda k: _rank(found.parameters[k]))
            names.append(tuple(found.parameters[k].name for k in pair))
            taken |= {first, second}
        elif wide[first]:
            names.append((found.parameters[first].name,))
            taken.add(first)
    return names


def _rank(item: Parameter) -> int:
    return list(KEYS).index(item.key)


def candidate_runs(model: Model, seen: Sequence[Seen]) -> list[Candidate]:
    """Runs a workshop could add to those at hand."""
    candidates: list[Candidate] = []
    for direction in _DIRECTIONS:
        runs = [item.run for item in seen if item.run.direction == direction]
        if runs:
            candidates += _variations(model, runs)
        elif getattr(model.damper, direction) is not None:
            candidates += _other_direction(model, seen[0].run, direction)
    return candidates


def _variations(model: Model, runs: list[Run]) -> Iterable[Candidate]:
    """The first run of a direction, varied one thing at a time."""
    base = runs[0]
    direction = base.direction
    slow = min(float(run.velocity_m_s.min()) for run in runs)
    fast = max(float(run.velocity_m_s.max()) for run in runs)
    points = np.geomspace(slow, fast, _POINTS)
    same = f"{direction} run of the same stack"
    needle = model.damper.circuit(direction).searched.bleed.needle
    used = {run.clicks for run in runs}
    if needle and 0 not in used:
        yield Candidate(f"a {same} with the adjuster closed", _at(base, points, clicks=0))
    if needle and needle.clicks not in used:
        wide_open = _at(base, points, clicks=needle.clicks)
        yield Candidate(f"a {same} with the adjuster wide open", wide_open)
    yield Candidate(
        f"a slow {same}, from {0.2 * slow:.2g} m/s",
        _at(base, np.geomspace(0.2 * slow, slow, _POINTS)),
    )
    yield Candidate(
        f"a {same} up to {2.0 * fast:.2g} m/s",
        _at(base, np.geomspace(fast, 2.0 * fast, _POINTS)),
    )
    yield Candidate(f"a {direction} run with no stack at all", _at(base, points), stackless=True)
    for factor, word in ((2.0, "twice the face shims"), (0.5, "half the face shims")):
        stack = _with_faces(base.stack, factor)
        if stack is not None:
            changed = replace(_at(base, points), stack=stack)
            yield Candidate(f"a {direction} run of a stack with {word}", changed)


def _at(base: Run, points: Floats, clicks: int | None = None) -> Run:
    """``base`` at other velocities (n,); its forces only keep their size."""
    return replace(
        base,
        velocity_m_s=points,
        force_n=np.full(points.size, base.largest_n),
        clicks=base.clicks if clicks is None else clicks,
    )


def _with_faces(stack: Stack, factor: float) -> Stack | None:
    face = stack.groups[0]
    quantity = max(1, round(face.quantity * factor))
    if quantity == face.quantity:
        return None
    return Stack((Group(quantity, face.shim), *stack.groups[1:]))


def _other_direction(model: Model, like: Run, direction: Direction) -> Iterable[Candidate]:
    valve = model.damper.circuit(direction).searched
    if valve.fitted is None:
        return
    needle = valve.bleed.needle
    clicks = valve.fitted_clicks
    if clicks is None:
        clicks = needle.clicks // 2 if needle else 0
    slow, fast = float(like.velocity_m_s.min()), float(like.velocity_m_s.max())
    run = _at(like, np.geomspace(slow, fast, _POINTS), clicks)
    yield Candidate(
        f"a {direction} run of the fitted stack",
        replace(run, direction=direction, stack=valve.fitted),
    )


def _with_slopes(
    model: Model, candidates: list[Candidate], found: Estimate
) -> list[tuple[Candidate, Floats]]:
    """Each candidate with its relative sensitivities (m, p), per scale of each number."""
    scale = np.array([item.scale for item in found.parameters])
    made = []
    for candidate in candidates:
        seen = model.prepare(candidate.run, candidate.stackless)
        steady = model.steady_of(candidate.run, found.values)
        weight = weight_of(model.force_n(seen, found.values), steady)
        made.append((candidate, sensitivity(model, seen, found.values) * scale / weight[:, None]))
    return made


def _describe(
    found: Estimate, names: tuple[str, ...], candidates: list[tuple[Candidate, Floats]]
) -> Confusion:
    chosen = [k for k, item in enumerate(found.parameters) if item.name in names]
    before = _spreads(found, None)
    best, after = "", before
    for candidate, slopes in candidates:
        spread = _spreads(found, slopes)
        if np.prod(spread[chosen]) < np.prod(after[chosen]):
            best, after = candidate.words, spread
    scale = np.array([item.scale for item in found.parameters])
    widest = max(chosen, key=lambda k: before[k])
    if after[widest] > WORTH * before[widest]:
        best = ""
    ranked = sorted(chosen, key=lambda k: _rank(found.parameters[k]))
    words = " and ".join(found.parameters[k].words for k in ranked)
    if len(chosen) == 2:
        sentence = f"{words} cannot be told apart from these runs"
    else:
        sentence = f"{words} cannot be told from these runs"
    return Confusion(
        names,
        sentence,
        best,
        float(before[widest] * scale[widest]),
        float(after[widest] * scale[widest]),
    )


def _spreads(found: Estimate, extra: Floats | None) -> Floats:
    """Standard errors (p,) in scales, with the sensitivities of a further run added."""
    scale = np.array([item.scale for item in found.parameters])
    inverse = np.linalg.inv(found.covariance / np.outer(scale, scale))
    if extra is not None:
        inverse = inverse + extra.T @ extra / max(found.scatter, 1e-4) ** 2
    inverse = inverse + 1e-12 * np.eye(scale.size) / FLAT_SCALES**2
    return np.sqrt(np.diag(np.linalg.inv(inverse)))
