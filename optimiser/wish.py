"""From what the tuner said to targets, one a direction.

The ways: points of a curve, a copy of a measured damper, a change of what is fitted, or a rider on
a frame with a feel; with nothing said, the bundled example.

A change starts from the model's own prediction of the fitted stack. What the model gets wrong for
every stack alike (a loss coefficient, an area) is then in the target as well as in the curve of
every stack held against it, and cancels: the change comes out right, though the forces may not.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.files import Kind, find_data, read_table
from optimiser.hydraulics.gas import gas_force_n
from optimiser.prediction import Prediction, Setup, predict
from optimiser.stack import Stack
from optimiser.wanted.change import changed
from optimiser.wanted.derive import Derived, derive, stroke_notes
from optimiser.wanted.dyno_copy import copied
from optimiser.wanted.feel import Feel
from optimiser.wanted.frame import Frame
from optimiser.wanted.rebound_rule import rebound_notes
from optimiser.wanted.rider import Rider
from optimiser.wanted.said import Said, Way, way_of
from optimiser.wanted.target import Target, shape_notes
from optimiser.wanted.vehicle import (
    Corner,
    QuarterVehicle,
    corner,
    quarter_vehicle,
    wheel_damper,
)
from optimiser.wanted_files import read_feel, read_frame, read_rider, read_target

#: Shaft velocities, m/s, of a target that changes what is fitted; rebound is slower.
CHANGE_VELOCITIES: dict[Direction, tuple[float, ...]] = {
    "compression": (0.03, 0.05, 0.08, 0.12, 0.2, 0.3, 0.5, 0.75, 1.0, 1.4),
    "rebound": (0.03, 0.05, 0.08, 0.12, 0.2, 0.3, 0.4, 0.55, 0.75),
}
#: The damper that the bundled example targets are made for.
EXAMPLE_DAMPER = "rear-monotube"
FASTEST_M_S = 20.0

Stacks = Mapping[Direction, Stack]
Files = tuple[tuple[Kind, str], ...]
ReadTarget = Callable[[str, Direction], Target]


@dataclass(frozen=True)
class RideWish:
    """Rider, frame and feel, what follows from them, and what the targets would do on the road."""

    rider: Rider
    frame: Frame
    feel: Feel
    derived: Derived
    vehicle: QuarterVehicle
    corner: Corner


@dataclass(frozen=True)
class Wished:
    """What is wanted; ``targets`` and ``now`` in the order of the setups.

    ``now``: what the fitted stack does at the target's velocities, None unless it plays a part.
    ``notes`` are on all targets together, each target has its own besides. ``files`` (kind, name)
    are those it was made from, without the fitted stacks.
    """

    way: Way
    targets: tuple[Target, ...]
    notes: tuple[str, ...] = ()
    files: Files = ()
    ride: RideWish | None = None
    now: tuple[Prediction | None, ...] = ()


def wish(said: Said, setups: Sequence[Setup], stacks: Stacks | None = None) -> Wished:
    """The targets of some setups, one a direction.

    ``stacks`` are the fitted stacks that differ from those of the damper file. Raises BadInput
    with every fault: ways that are mixed, files, numbers out of range.
    """
    way = way_of(said)
    if way == "example" and any(setup.damper.name != EXAMPLE_DAMPER for setup in setups):
        way = "change"
    makers = {
        "example": _of_example,
        "points": _of_points,
        "copy": _of_copy,
        "change": _of_change,
        "ride": _of_ride,
    }
    wished = makers[way](said, setups, stacks or {})
    targets = wished.targets
    if said.resample is not None:
        targets = tuple(target.resampled(said.resample) for target in targets)
    now: tuple[Prediction | None, ...] = (None,) * len(targets)
    if way == "change" or said.fitted:
        pairs = zip(setups, targets, strict=True)
        now = tuple(
            predict(setup, fitted_stack(setup, stacks or {}), target.velocity_m_s, said.clicks)
            for setup, target in pairs
        )
    return replace(wished, targets=targets, now=now)


def fitted_stack(setup: Setup, stacks: Stacks) -> Stack:
    """The stack given for a setup's direction, else the one of the damper file."""
    stack = stacks.get(setup.direction, setup.valve.fitted)
    if stack is None:
        raise TypeError(f"valve '{setup.valve.name}' is searched but has no shims")
    return stack


def _of_example(_said: Said, setups: Sequence[Setup], _stacks: Stacks) -> Wished:
    names = [f"example-{setup.direction}" for setup in setups]
    return _of_files("example", names, read_target, setups)


def _of_points(said: Said, setups: Sequence[Setup], _stacks: Stacks) -> Wished:
    return _of_files("points", said.targets, read_target, setups)


def _of_copy(said: Said, setups: Sequence[Setup], _stacks: Stacks) -> Wished:
    names = said.copies * len(setups) if len(said.copies) == 1 else said.copies
    alone = len(said.copies) == len(setups)

    def read(name: str, direction: Direction) -> Target:
        return read_copy(name, direction, said.copy_static_n or 0.0, alone)

    return _of_files("copy", names, read, setups)


def _of_files(
    way: Way, names: Sequence[str], read: ReadTarget, setups: Sequence[Setup]
) -> Wished:
    faults: list[str] = []
    targets: list[Target] = []
    for name, setup in zip(names, setups, strict=True):
        try:
            target = read(name, setup.direction)
        except BadInput as error:
            faults += error.faults
            continue
        targets.append(replace(target, notes=(*target.notes, *shape_notes(target))))
    if faults:
        raise BadInput(faults)
    by_direction = {target.direction: target for target in targets}
    notes: list[str] = []
    if len(by_direction) == 2:
        notes = rebound_notes(by_direction["compression"], by_direction["rebound"])
    files: Files = tuple(("target", name) for name in dict.fromkeys(names))
    return Wished(way, tuple(targets), tuple(notes), files)


def _of_change(said: Said, setups: Sequence[Setup], stacks: Stacks) -> Wished:
    targets = []
    for setup in setups:
        velocity = np.array(said.velocity_m_s or CHANGE_VELOCITIES[setup.direction])
        if velocity.size < 2:
            raise BadInput("--velocities holds one velocity only; allowed: two or more")
        seen = predict(setup, fitted_stack(setup, stacks), velocity, said.clicks)
        if not np.all(np.isfinite(seen.force_n)):
            first = velocity[np.isfinite(seen.force_n)]
            raise BadInput(
                f"the fitted {setup.direction} stack lets no oil through below "
                f"{first.min() if first.size else velocity.max():g} m/s, which cannot be changed by "
                "a share; allowed: --velocities above it, or more --clicks"
            )
        target = _changed(said, seen)
        notes = [f"fitted stack: {warning}" for warning in seen.warnings]
        targets.append(replace(target, notes=(*target.notes, *notes)))
    return Wished("change", tuple(targets))


def _changed(said: Said, seen: Prediction) -> Target:
    change = said.change
    setup = seen.setup
    clicks = f" at {seen.clicks} of {setup.clicks_range} clicks" if setup.clicks_range else ""
    return changed(
        seen.velocity_m_s,
        seen.force_n,
        low_percent=change.low_percent,
        mid_percent=change.mid_percent,
        high_percent=change.high_percent,
        knee_percent=change.knee_percent,
        direction=setup.direction,
        origin=f"fitted stack{clicks}",
    )


def _of_ride(said: Said, setups: Sequence[Setup], _stacks: Stacks) -> Wished:
    rider, frame, feel = _read_ride(said)
    damper = setups[0].damper
    gas = gas_force_n(damper.gas, damper.body, "compression")
    derived = derive(rider, frame, feel, said.sag_percent, gas)
    vehicle = quarter_vehicle(derived.ride, frame)
    force = wheel_damper(derived.compression, derived.rebound, derived.ride.leverage_at_sag)
    named: list[tuple[Kind, str | None]] = [
        ("rider", said.rider),
        ("frame", said.frame),
        ("feel", said.feel),
    ]
    return Wished(
        "ride",
        tuple(derived.target(setup.direction) for setup in setups),
        (*derived.notes, *stroke_notes(frame, damper.body.stroke_mm)),
        tuple((kind, name) for kind, name in named if name is not None),
        RideWish(rider, frame, feel, derived, vehicle, corner(vehicle, force)),
    )


def _read_ride(said: Said) -> tuple[Rider, Frame, Feel]:
    """The three files (or two, and a mass). Raises BadInput with the faults of all."""
    faults: list[str] = []
    rider = Rider(mass_kg=said.rider_kg) if said.rider_kg is not None else None
    frame = feel = None
    try:
        rider = rider or read_rider(said.rider or "")
    except BadInput as error:
        faults += error.faults
    try:
        frame = read_frame(said.frame or "")
    except BadInput as error:
        faults += error.faults
    try:
        feel = read_feel(said.feel or "")
    except BadInput as error:
        faults += error.faults
    if rider is None or frame is None or feel is None:
        raise BadInput(faults)
    return rider, frame, feel


def read_copy(name: str, direction: Direction, static_n: float, alone: bool = True) -> Target:
    """Target of one direction from a measured table: ``velocity_m_s,force_n[,direction]``.

    Rows in any order, repeats allowed. With a ``direction`` column the file may hold both
    strokes; without one it holds one, and is ``alone``. ``static_n``, N, is taken off every
    force. Raises BadInput.
    """
    path = find_data("target", name)
    faults: list[str] = []
    table = read_table(
        path, ["velocity_m_s", "force_n"], ["weight"], texts=["direction"], collect=faults
    )
    velocity, force = table.numbers["velocity_m_s"], table.numbers["force_n"]
    words = [table.text("direction", row) for row in range(len(table.lines))]
    if "direction" not in table.texts and not alone:
        faults.append(f'{path}: has no column "direction"; allowed: one --copy file a direction')
    for row, word in enumerate(words):
        if word not in (None, "compression", "rebound"):
            faults.append(
                f'{table.where(row)}: direction "{word}" is not known; allowed: compression, rebound'
            )
        for what, value, most in (("velocity_m_s", velocity, FASTEST_M_S), ("force_n", force, 1e5)):
            if not 0.0 < value[row] <= most:
                faults.append(
                    f"{table.where(row)}: {what} {value[row]:g}; allowed: above 0 up to {most:g}"
                )
    chosen = [row for row, word in enumerate(words) if word in (None, direction)]
    if not faults and not chosen:
        faults.append(f"{path}: holds no {direction} row; allowed: one or more")
    if faults:
        raise BadInput(faults)
    try:
        return copied(
            velocity[chosen],
            force[chosen],
            direction=direction,
            static_force_n=static_n,
            origin=f"copy of {name}",
        )
    except BadInput as error:
        raise BadInput(f"{path}: {direction}: {fault}" for fault in error.faults) from None
