"""From options to domain objects. Imports the model: commands import this inside their function."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from math import isfinite
from pathlib import Path

from optimiser.damper import Damper, Direction
from optimiser.faults import BadInput
from optimiser.files import (
    Kind,
    find_data,
    fingerprint,
    is_path,
    read_damper,
    read_oil,
    read_stack,
    read_steel,
)
from optimiser.materials import Oil, Steel
from optimiser.prediction import Setup
from optimiser.stack import Stack

DIRECTIONS: tuple[Direction, Direction] = ("compression", "rebound")
#: Shaft velocities of a table, m/s: a damper extends slower than a bump compresses it.
USUAL_VELOCITIES: dict[Direction, tuple[float, ...]] = {
    "compression": (0.02, 0.05, 0.1, 0.2, 0.3, 0.5, 0.75, 1.0, 1.5, 2.0),
    "rebound": (0.02, 0.05, 0.1, 0.15, 0.2, 0.3, 0.4, 0.6, 0.8, 1.0),
}
FASTEST_M_S = 20.0
COLDEST_C, HOTTEST_C = -30.0, 150.0


@dataclass(frozen=True)
class InputFile:
    """One file a result was made from, so that the result can be reproduced."""

    kind: str
    name: str
    fingerprint: str


@dataclass
class Given:
    """Everything read for one command, with the fingerprint of every file."""

    damper: Damper
    steel: Steel
    oil: Oil
    oil_temp_c: float
    files: list[InputFile] = field(default_factory=list)

    def setup(self, direction: Direction) -> Setup:
        """One direction of the damper. Raises BadInput when it has no such circuit."""
        if getattr(self.damper, direction) is None:
            other = next(d for d in DIRECTIONS if d != direction)
            raise BadInput(
                f"damper {self.damper.name} has no {direction} circuit; allowed: --circuit {other}"
            )
        return Setup(self.damper, direction, self.steel, self.oil, self.oil_temp_c)

    def directions(self) -> list[Direction]:
        """Directions the damper has a circuit for."""
        return [d for d in DIRECTIONS if getattr(self.damper, d) is not None]

    def add_file(self, kind: Kind, name: str) -> None:
        """Remember a file the result depends on."""
        self.files.append(InputFile(kind, name, fingerprint(find_data(kind, name))))


def read_given(
    damper: str, steel: str | None = None, oil: str | None = None, oil_temp_c: float | None = None
) -> Given:
    """Damper, steel, oil and temperature. Raises BadInput with all faults at once."""
    faults: list[str] = []
    if oil_temp_c is not None and not COLDEST_C <= oil_temp_c <= HOTTEST_C:
        faults.append(f"--oil-temp-c is {oil_temp_c:g}; allowed: {COLDEST_C:g} to {HOTTEST_C:g} C")
    for name, read in ((steel, read_steel), (oil, read_oil)):
        try:
            if name is not None:
                read(name)
        except BadInput as error:
            faults += error.faults
    try:
        body = read_damper(damper)
    except BadInput as error:
        raise BadInput([*error.faults, *faults]) from None
    if faults:
        raise BadInput(faults)
    steel_name, oil_name = steel or body.steel, oil or body.oil
    temperature = body.oil_temp_c if oil_temp_c is None else oil_temp_c
    given = Given(body, read_steel(steel_name), read_oil(oil_name), temperature)
    given.add_file("damper", damper)
    given.add_file("steel", steel_name)
    given.add_file("oil", oil_name)
    return given


def parse_velocities(text: str) -> list[float]:
    """Velocities, m/s, of a text like ``0.05,0.1``, slowest first. Raises BadInput."""
    faults: list[str] = []
    velocities: list[float] = []
    for part in text.split(","):
        try:
            value = float(part)
        except ValueError:
            faults.append(
                f"--velocities: '{part.strip()}' is not a number; allowed: numbers with commas "
                "between them and a decimal point, such as 0.05,0.1,0.2"
            )
            continue
        if not (isfinite(value) and 0.0 < value <= FASTEST_M_S):
            faults.append(
                f"--velocities: {value:g}; allowed: above 0 up to {FASTEST_M_S:g} m/s "
                "(is it in mm/s?)"
            )
        elif value in velocities:
            faults.append(f"--velocities: {value:g} is given twice; allowed: once")
        velocities.append(value)
    if faults:
        raise BadInput(faults)
    return sorted(velocities)


def check_clicks(setups: Sequence[Setup], clicks: int | None) -> None:
    """Raise BadInput unless every circuit's adjuster has that click."""
    faults = []
    for setup in setups:
        if clicks is None or 0 <= clicks <= setup.clicks_range:
            continue
        if setup.clicks_range:
            allowed = f"allowed: 0 (closed) to {setup.clicks_range} (open)"
        else:
            allowed = "this valve has no adjuster: leave --clicks out, or name one --circuit"
        faults.append(f"--clicks is {clicks} for {setup.direction}; {allowed}")
    if faults:
        raise BadInput(faults)


def check_reaches(setup: Setup, stack: Stack, label: str) -> None:
    """Raise BadInput for a stack that cannot work in the valve, so that nothing is computed."""
    valve = setup.valve
    face, clamp = stack.groups[0].shim.outer_mm, stack.clamp_mm
    faults = []
    if valve.seat is not None and face < valve.seat.seat_mm:
        faults.append(
            f"{label}: the face shim ({face:g} mm) does not reach the seat of {valve.name}; "
            f"allowed: {valve.seat.seat_mm:g} mm or more, {valve.seat.cover_mm:g} mm to cover it"
        )
    if valve.ports is not None and clamp >= valve.ports.inner_mm:
        faults.append(
            f"{label}: the clamp shim ({clamp:g} mm) reaches over the ports of {valve.name}; "
            f"allowed: less than {valve.ports.inner_mm:g} mm"
        )
    spring = valve.back_spring
    if spring is not None and not clamp < spring.ring_mm <= face:
        faults.append(
            f"{label}: the back spring of {valve.name} presses at {spring.ring_mm:g} mm; allowed: "
            f"a stack that reaches from below to beyond that, not {clamp:g} to {face:g} mm"
        )
    if faults:
        raise BadInput(faults)


def parse_shims(lines: Sequence[str]) -> Stack:
    """The stack of repeated ``--shim`` options, face first. Raises BadInput."""
    try:
        return Stack.parse(lines)
    except BadInput as error:
        raise BadInput(f"--shim: {fault}" for fault in error.faults) from None


def short_name(name: str) -> str:
    """A name for tables: a file's own name without its folders."""
    return Path(name).name if is_path(name) else name


__all__ = [
    "DIRECTIONS",
    "USUAL_VELOCITIES",
    "Given",
    "InputFile",
    "check_clicks",
    "check_reaches",
    "parse_shims",
    "parse_velocities",
    "read_given",
    "read_stack",
    "short_name",
]
