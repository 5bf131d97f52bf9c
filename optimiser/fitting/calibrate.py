"""From runs to a calibrated damper: what is free, the fit, its doubts and its honest error."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from optimiser.damper import Damper, Direction
from optimiser.faults import BadInput
from optimiser.fitting.estimate import Estimate, estimate, weight_of, without
from optimiser.fitting.identify import Confusion, confused_names, confusions
from optimiser.fitting.model import Model, Seen
from optimiser.fitting.parameters import (
    BLEED,
    CURTAIN,
    FRICTION,
    GAS,
    KEYS,
    PORTS,
    PRELOAD,
    Parameter,
    named_directions,
    parameter,
    value_of,
    with_values,
)
from optimiser.fitting.runs import Run, check_runs
from optimiser.fitting.strokes import Curve, force_at_rest
from optimiser.fitting.units import UNITS
from optimiser.hydraulics.gas import gas_force_n
from optimiser.hydraulics.lift import Floats
from optimiser.materials import Oil, Steel
from optimiser.mechanics.deflect import Fidelity

#: Without a list, the numbers of this order are free as far as the runs can tell them.
USUAL = (CURTAIN, BLEED, FRICTION, GAS, PRELOAD, PORTS)
#: Forces further than this factor from the prediction are questioned.
DOUBTFUL = 3.0
#: A bleed of nothing has no slope to start from, mm2.
_TRACE_MM2 = 0.05
#: Second start: a slit, a short tube (published-values of the hydraulics' own defaults).
_PHYSICS = {CURTAIN: 0.61, PORTS: 0.72}


@dataclass(frozen=True)
class RunError:
    """How well one run is met: r.m.s. error of force over measured force, %, over its points.

    ``before_percent`` with the damper file's own numbers, ``fitted_percent`` with all runs in the
    fit, ``left_out_percent`` fitted without this run (None: the other runs say nothing about this
    direction), ``middle_percent`` signed median of the fit. The worst twentieth of the points does
    not count.
    """

    label: str
    direction: Direction
    clicks: int
    oil_temp_c: float
    points: int
    outliers: int
    before_percent: float
    fitted_percent: float
    middle_percent: float
    left_out_percent: float | None


@dataclass(frozen=True, eq=False)
class Calibration:
    """The result of a fit.

    ``damper`` is ``original`` with the values in; ``found`` the estimate; ``runs`` their errors;
    ``held`` numbers kept as they were because the runs cannot tell them; ``steady_n`` gas force in
    the runs; ``scatter_percent`` robust scatter of the points; ``left_out_percent`` r.m.s. over
    the runs that could be left out (None: no run could), ``new_stack_percent`` over those of them
    whose stack no other run has: what to expect of a stack never measured.
    """

    original: Damper
    damper: Damper
    found: Estimate
    runs: tuple[RunError, ...]
    measured: tuple[Run, ...]
    predicted_n: tuple[Floats, ...]
    doubts: tuple[Confusion, ...]
    held: tuple[Confusion, ...]
    steady_n: float
    scatter_percent: float
    left_out_percent: float | None
    new_stack_percent: float | None
    notes: tuple[str, ...]


def calibrate(
    damper: Damper,
    steel: Steel,
    oil: Oil,
    runs: Sequence[Run],
    free: Sequence[str] | None = None,
    steady_n: float | None = None,
    fidelity: Fidelity = "reported",
    leave_out: bool = True,
) -> Calibration:
    """Fit a damper's numbers to dyno runs of known stacks.

    ``free``: names of :data:`parameters.KEYS`, with or without ``compression.``/``rebound.``; None:
    the usual ones, less those the runs cannot tell. ``steady_n``: gas force in the runs, N, where
    it is known (0: taken off at the dyno). ``leave_out``: also fit without each run in turn. Raises
    BadInput for runs that do not fit the damper, are too few or look like another unit.
    """
    check_runs(damper, runs)
    notes: list[str] = []
    parameters = _free(damper, runs, free, steady_n)
    gas_n = _gas_to_begin_with(damper, runs) if steady_n is None else steady_n
    model = Model(damper, steel, oil, tuple(parameters), fidelity, gas_n)
    seen = [model.prepare(run) for run in runs]
    model = model.with_parameters(_started(model, runs), gas_n)
    _question_units(model, seen)
    found = estimate(model, seen, _starts(model))
    held: list[Confusion] = []
    while free is None and len(model.parameters) > 1:
        model, found, doubt = _hold_one(model, seen, found)
        if doubt is None:
            break
        held.append(doubt)
    doubts = confusions(model, seen, found)
    return _conclude(damper, model, seen, found, held, doubts, notes, leave_out)


def _free(
    damper: Damper, runs: Sequence[Run], free: Sequence[str] | None, steady_n: float | None
) -> list[Parameter]:
    """The free numbers, in their order. Raises BadInput for those the damper does not have."""
    used = [d for d in ("compression", "rebound") if any(run.direction == d for run in runs)]
    names = list(USUAL) if free is None else list(free)
    wanted: dict[str, Parameter] = {}
    faults: list[str] = []
    for name in names:
        key, directions = named_directions(name)
        if key not in KEYS:
            faults.append(f'free: "{name}" is not known; allowed: {", ".join(KEYS)}')
            continue
        for direction in directions:
            if direction not in used:
                if name != key:
                    faults.append(f"free: {name}: no run is of that direction")
                continue
            try:
                item = parameter(damper, key, direction)
            except KeyError:
                if free is not None:
                    faults.append(f"free: {name}: the {direction} valve has no needle")
                continue
            fault = _unfit(damper, item, free is None, steady_n)
            faults += [fault] if fault and free is not None else []
            if not fault:
                wanted[item.name] = item
    if faults:
        raise BadInput(dict.fromkeys(faults))
    return sorted(wanted.values(), key=lambda item: list(KEYS).index(item.key))


def _unfit(damper: Damper, item: Parameter, usual: bool, steady_n: float | None) -> str:
    """Why a number cannot be free, or, when it is one of the usual ones, why it need not be."""
    if item.key == GAS and steady_n is not None:
        return "free: gas_offset_n: the request states it; allowed: one of both"
    if item.key == PRELOAD:
        height = value_of(damper, PRELOAD, item.direction)
        if height < 0.0:
            return (
                f"free: {item.name}: the seat is lower than the clamp face (a gap), nothing to fit"
            )
        if usual and height == 0.0:
            return "a flat seat stays flat"
    return ""


def _started(model: Model, runs: Sequence[Run]) -> list[Parameter]:
    """Friction and gas begin at what both strokes show at rest, the bleed at least at a trace."""
    frictions = [run.friction_n for run in runs if run.friction_n is not None]
    started = []
    for item in model.parameters:
        value = item.start
        if item.key == FRICTION and frictions:
            value = float(np.median(frictions))
        elif item.key == GAS:
            value = model.steady_n
        elif item.key == BLEED:
            value = max(item.start, _TRACE_MM2)
        started.append(item.starting_at(value))
    return started


def _gas_to_begin_with(damper: Damper, runs: Sequence[Run]) -> float:
    """Gas force in the runs, N: as files with both strokes show it; else the damper's own, if the
    force at rest leaves room for it, or none."""
    shown = [run.gas_n for run in runs if run.gas_n is not None]
    if shown:
        return float(np.median(shown))
    expected = gas_force_n(damper.gas, damper.body, "compression")
    rests = []
    for run in runs:
        order = np.argsort(run.velocity_m_s)
        curve = Curve(run.velocity_m_s[order], run.force_n[order], run.force_n)
        sign = 1.0 if run.direction == "compression" else -1.0
        rests.append(sign * force_at_rest(curve))
    return expected if float(np.median(rests)) > 0.5 * expected else 0.0


def _starts(model: Model) -> list[Floats]:
    """The damper's own numbers, and those of plain physics where they differ."""
    own = np.array([item.start for item in model.parameters])
    plain = np.array([_PHYSICS.get(item.key, item.start) for item in model.parameters])
    return [own] if np.allclose(own, plain) else [own, plain]


def _question_units(model: Model, seen: Sequence[Seen]) -> None:
    """Raise BadInput for runs whose forces are far from any that this damper could give."""
    start = np.array([item.start for item in model.parameters])
    faults = []
    for item in seen:
        predicted = model.force_n(item, start)
        upper = item.run.velocity_m_s >= np.median(item.run.velocity_m_s)
        ratio = float(np.median(np.abs(item.run.force_n[upper]) / np.abs(predicted[upper])))
        if 1.0 / DOUBTFUL <= ratio <= DOUBTFUL or item.run.trusted:
            continue
        units = UNITS["force"].items()
        near = [unit for unit, factor in units if unit != "N" and 0.5 < ratio * factor < 2.0]
        asked = f"force in {' or '.join(near)}, " if near else ""
        faults.append(
            f"{item.run.label}: the forces are {ratio:.2g} times what this damper would give with "
            f"that stack (is it {asked}velocity in another unit, or another stack?); allowed: "
            "within 3 times, or units_are_right = true"
        )
    if faults:
        raise BadInput(faults)


def _hold_one(
    model: Model, seen: Sequence[Seen], found: Estimate
) -> tuple[Model, Estimate, Confusion | None]:
    """Fix the least important number of the first confusion where it began, and fit again."""
    names = confused_names(found)
    if not names:
        return model, found, None
    doubt = confusions(model, seen, found)[0]
    ranks = {item.name: list(USUAL).index(item.key) for item in found.parameters}
    last = max(doubt.names, key=lambda name: ranks[name])
    start = next(item.start for item in model.parameters if item.name == last)
    smaller = without(model, found, last, start)
    again = estimate(smaller, seen, _starts(smaller))
    words = next(item.words for item in found.parameters if item.name == last)
    sentence = f"{doubt.sentence}: {words} is kept at {start:.4g}"
    return smaller, again, replace(doubt, names=(last,), sentence=sentence)


def _conclude(
    damper: Damper,
    model: Model,
    seen: Sequence[Seen],
    found: Estimate,
    held: Sequence[Confusion],
    doubts: Sequence[Confusion],
    notes: list[str],
    leave_out: bool,
) -> Calibration:
    values = {
        (item.key, item.direction): float(value)
        for item, value in zip(found.parameters, found.values, strict=True)
    }
    steady = values.get((GAS, None), model.steady_n)
    predicted = tuple(model.force_n(item, found.values) for item in seen)
    left = [_left_out(model, seen, k, found) if leave_out else None for k in range(len(seen))]
    errors = tuple(
        _run_error(model, seen[k], predicted[k], found, _marks(seen, found, k), left[k])
        for k in range(len(seen))
    )
    calibrated = with_values(with_values(damper, _held_values(held, model)), values)
    return Calibration(
        original=damper,
        damper=calibrated,
        found=found,
        runs=errors,
        measured=tuple(item.run for item in seen),
        predicted_n=predicted,
        doubts=tuple(doubts),
        held=tuple(held),
        steady_n=steady,
        scatter_percent=100.0 * found.scatter,
        left_out_percent=_together(left),
        new_stack_percent=_together(
            [p for p, s in zip(left, seen, strict=True) if _alone(s, seen)]
        ),
        notes=tuple(notes + _limit_notes(found)),
    )


def _together(percents: Sequence[float | None]) -> float | None:
    """Root of the mean square of the known ones."""
    known = [percent for percent in percents if percent is not None]
    return float(np.sqrt(np.mean(np.square(known)))) if known else None


def _alone(one: Seen, seen: Sequence[Seen]) -> bool:
    """True when no other run has this one's stack in the same direction."""
    key = (one.run.direction, one.run.stack)
    return sum((item.run.direction, item.run.stack) == key for item in seen) == 1


def _held_values(
    held: Sequence[Confusion], model: Model
) -> dict[tuple[str, Direction | None], float]:
    """Held numbers as the last model has them (a held bleed may have begun at a trace)."""
    values: dict[tuple[str, Direction | None], float] = {}
    for doubt in held:
        key, directions = named_directions(doubt.names[0])
        if key in (FRICTION, GAS):
            values[key, None] = model.steady_n if key == GAS else model.damper.friction_n
        else:
            values[key, directions[0]] = value_of(model.damper, key, directions[0])
    return values


def _limit_notes(found: Estimate) -> list[str]:
    notes = []
    for item, value, at_limit in zip(found.parameters, found.values, found.at_limit, strict=True):
        if at_limit:
            notes.append(
                f"{item.words} ended at a limit ({value:.4g}; allowed: {item.low:g} to "
                f"{item.high:g}): another number of the damper file, or a run, may be wrong"
            )
    return notes


def _marks(seen: Sequence[Seen], found: Estimate, place: int) -> int:
    """Outliers among one run's points."""
    sizes = [item.run.velocity_m_s.size for item in seen]
    start = sum(sizes[:place])
    return int(found.outliers[start : start + sizes[place]].sum())


def relative_error(run: Run, predicted_n: Floats, steady_n: float) -> Floats:
    """Predicted less measured force over the measured damping (n,); ``steady_n``: gas force in it,
    positive where it adds."""
    return (predicted_n - run.force_n) / weight_of(run.force_n, steady_n)


def _rms_percent(relative: Floats) -> float:
    """Root of the mean square of relative errors (n,), %; the worst twentieth of points left out,
    so that one bad reading does not stand for the run."""
    errors = np.sort(np.abs(relative))
    kept = errors[: max(1, errors.size - errors.size // 20)]
    return 100.0 * float(np.sqrt(np.mean(kept**2)))


def _run_error(
    model: Model,
    seen: Seen,
    predicted: Floats,
    found: Estimate,
    outliers: int,
    left_out: float | None,
) -> RunError:
    run = seen.run
    steady = model.steady_of(run, found.values)
    before = _own_values(model.damper, found, steady if run.direction == "compression" else -steady)
    return RunError(
        run.label,
        run.direction,
        run.clicks,
        run.oil_temp_c,
        run.velocity_m_s.size,
        outliers,
        _rms_percent(relative_error(run, model.force_n(seen, before), steady)),
        _rms_percent(relative_error(run, predicted, steady)),
        100.0 * float(np.median(relative_error(run, predicted, steady))),
        left_out,
    )


def _own_values(damper: Damper, found: Estimate, gas_n: float) -> Floats:
    """The free numbers as the damper file has them (p,), but the gas force as it is in the runs."""
    return np.array(
        [
            gas_n if item.key == GAS else value_of(damper, item.key, item.direction)
            for item in found.parameters
        ]
    )


def _left_out(model: Model, seen: Sequence[Seen], place: int, found: Estimate) -> float | None:
    """Error, %, of one run predicted by a fit to all others; None when those cannot say."""
    others = [item for k, item in enumerate(seen) if k != place]
    run = seen[place].run
    points = sum(item.run.velocity_m_s.size for item in others)
    if not any(item.run.direction == run.direction for item in others):
        return None
    if points < len(model.parameters) + 2:
        return None
    start = np.array([item.start for item in model.parameters])
    fitted = estimate(model, others, [found.values, start])
    predicted = model.force_n(seen[place], fitted.values)
    return _rms_percent(relative_error(run, predicted, model.steady_of(run, found.values)))
