"""From what the tuner said to targets, one a direction.

The ways: points of a curve, a copy of a measured damper, a change of what is fitted, or a rider on
a frame with a feel; with nothing said, the bundled example.

A change starts from the model's own prediction of the fitted stack. What the model gets wrong for
every stack alike (a loss coefficient, an area) is then in the target as well as in the curve of
every stack held against it, and cancels: the change comes out right, though the forces may not.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np

from optimiser.copy_files import read_copy
from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.files import Kind
from optimiser.hydraulics.gas import gas_force_n
from optimiser.mechanics.deflect import RISE_LIMIT
from optimiser.prediction import Prediction, Setup, predict
from optimiser.stack import Stack
from optimiser.wanted.change import changed
from optimiser.wanted.derive import Derived, derive, stroke_notes
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
USUAL_FEEL = "balanced"
#: The usual velocities end where the fitted stack leaves the model, if so many of them are left.
LEAST_POINTS = 5

Stacks = Mapping[Direction, Stack]
Files = tuple[tuple[Kind, str], ...]
ReadTarget = Callable[[str, Direction], Target]
Record = TypeVar("Record", Rider, Frame, Feel)


@dataclass(frozen=True)
class RideWish:
    """Rider, frame and feel, what follows from them, and what the targets would do on the road.

    ``usual_feel`` is the bundled one to start from, which the feel can be held against.
    """

    rider: Rider
    frame: Frame
    feel: Feel
    usual_feel: Feel
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


def _of_files(way: Way, names: Sequence[str], read: ReadTarget, setups: Sequence[Setup]) -> Wished:
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
        stack = fitted_stack(setup, stacks)
        seen = predict(setup, stack, velocity, said.clicks)
        known = velocity[seen.rise_thicknesses <= RISE_LIMIT]
        notes = []
        if not said.velocity_m_s and LEAST_POINTS <= known.size < velocity.size:
            seen = predict(setup, stack, known, said.clicks)
            notes.append(
                f"the target ends at {known[-1]:g} m/s: beyond, the fitted stack lies outside the "
                "model (--velocities to choose otherwise)"
            )
        target = _changed(said, seen)
        notes += [f"fitted stack: {warning}" for warning in seen.warnings]
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
        RideWish(
            rider, frame, feel, read_feel(USUAL_FEEL), derived, vehicle, corner(vehicle, force)
        ),
    )


def _read_ride(said: Said) -> tuple[Rider, Frame, Feel]:
    """Rider, frame and feel. Raises BadInput with the faults of all three files."""
    faults: list[str] = []
    if said.rider_kg is None:
        rider = _tried(read_rider, said.rider, faults)
    else:
        rider = Rider(mass_kg=said.rider_kg)
    frame = _tried(read_frame, said.frame, faults)
    feel = _tried(read_feel, said.feel, faults)
    if rider is None or frame is None or feel is None:
        raise BadInput(faults)
    return rider, frame, feel


def _tried(read: Callable[[str], Record], name: str | None, faults: list[str]) -> Record | None:
    """What ``read`` returns, or None with its faults added."""
    try:
        return read(name or "")
    except BadInput as error:
        faults += error.faults
        return None
