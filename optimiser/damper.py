"""Damper, Circuit, Valve: a validated description, as read from a damper's TOML file.

The parts of a valve and the rules within each are in parts.py; here are the rules between them.
"""

from collections.abc import Iterable
from math import pi
from typing import Annotated, Any, Literal

from pydantic import (
    Field,
    ValidationError,
    ValidatorFunctionWrapHandler,
    field_serializer,
    field_validator,
)
from pydantic_core import InitErrorDetails, PydanticCustomError
from pydantic_core.core_schema import ValidationInfo

from optimiser.faults import BadInput
from optimiser.parts import (
    Area,
    BackSpring,
    Bleed,
    Coefficient,
    Length,
    Needle,
    Number,
    Part,
    Ports,
    Post,
    Seat,
    Series,
)
from optimiser.stack import Shim, Stack

__all__ = [
    "BackSpring",
    "Bleed",
    "Body",
    "Circuit",
    "Damper",
    "Direction",
    "Displacement",
    "Gas",
    "Needle",
    "Ports",
    "Post",
    "Seat",
    "Series",
    "Valve",
    "warnings_for",
]

Direction = Literal["compression", "rebound"]
Displacement = Literal["piston", "piston_less_shaft", "shaft"]


def _raise_any(faults: list[str]) -> None:
    if faults:
        raise BadInput(faults)


class Valve(Part):
    """A shim valve, or (``kind = "check"``) a plain check valve without a stack."""

    name: str = Field(min_length=1, max_length=60)
    kind: Literal["shim", "check"] = "shim"
    displacement: Displacement = Field(description="area that pushes oil through this valve")
    low_side: Literal["lowers", "raises", "no_effect"] = Field(
        description="what its pressure drop does to the low-pressure side of the piston"
    )
    searched: bool = Field(
        default=False, strict=True, description="its stack is the one that is looked for"
    )
    ports: Ports | None = Field(default=None, validate_default=True)
    seat: Seat | None = Field(default=None, validate_default=True)
    post: Post | None = Field(default=None, validate_default=True)
    bleed: Bleed = Bleed()
    back_spring: BackSpring | None = None
    series: Series | None = None
    fitted: Stack | None = Field(
        default=None, validate_default=True, description="the stack fitted now, face first"
    )
    fitted_clicks: Annotated[int, Field(ge=0, le=60, strict=True)] | None = Field(
        default=None, description="clicks out from closed, as fitted now"
    )
    check_area_mm2: Area | None = Field(
        default=None, validate_default=True, description="check valve: open area"
    )
    check_cracking_mpa: Number = Field(default=0.0, ge=0, le=5)
    check_discharge: Coefficient = 0.65

    @field_validator("searched")
    @classmethod
    def _has_a_stack(cls, value: bool, info: ValidationInfo) -> bool:
        if value and info.data.get("kind") == "check":
            raise BadInput("a check valve has no stack to search: allowed: false")
        return value

    @field_validator("fitted", mode="before")
    @classmethod
    def _parse_stack(cls, value: object) -> object:
        if value is None or isinstance(value, Stack):
            return value
        if isinstance(value, list) and all(isinstance(line, str) for line in value):
            return Stack.parse(value)
        raise BadInput('must be a list of shim groups, face first, such as ["3 x 24 x 0.15"]')

    @field_validator("ports", "seat", "post", "fitted")
    @classmethod
    def _belongs_to_shims(cls, value: object, info: ValidationInfo) -> object:
        kind = info.data.get("kind")
        if kind == "shim" and value is None:
            raise BadInput('is missing: a valve of kind "shim" needs it')
        if kind == "check" and value is not None:
            raise BadInput('a valve of kind "check" has none: leave it out')
        return value

    @field_validator("seat")
    @classmethod
    def _seat_around_ports(cls, seat: Seat | None, info: ValidationInfo) -> Seat | None:
        ports = info.data.get("ports")
        if seat and ports and seat.seat_mm < ports.outer_mm:
            raise BadInput(
                f"seat_mm {seat.seat_mm:g}: must be at least ports.outer_mm {ports.outer_mm:g}: "
                "the ports lie inside the seat"
            )
        return seat

    @field_validator("post")
    @classmethod
    def _post_inside_ports(cls, post: Post | None, info: ValidationInfo) -> Post | None:
        faults = []
        ports, seat = info.data.get("ports"), info.data.get("seat")
        if post and ports and post.post_mm >= ports.inner_mm:
            faults.append(
                f"post_mm {post.post_mm:g}: must be less than ports.inner_mm {ports.inner_mm:g}"
            )
        if post and seat and post.clearance_mm < seat.cover_mm:
            faults.append(
                f"clearance_mm {post.clearance_mm:g}: must be at least {seat.cover_mm:g}, or no "
                "shim that covers the seat goes in"
            )
        _raise_any(faults)
        return post

    @field_validator("fitted")
    @classmethod
    def _fitted_fits(cls, stack: Stack | None, info: ValidationInfo) -> Stack | None:
        if stack is not None:
            parts = (info.data.get(key) for key in ("ports", "seat", "post", "back_spring"))
            _raise_any(_misfits(stack, *parts))
        return stack

    @field_validator("fitted_clicks")
    @classmethod
    def _clicks_of_needle(cls, value: int | None, info: ValidationInfo) -> int | None:
        bleed = info.data.get("bleed")
        if value is None or bleed is None:
            return value
        if bleed.needle is None:
            raise BadInput(f"{value}: the valve's bleed has no needle: leave it out")
        if value > bleed.needle.clicks:
            raise BadInput(f"{value}: allowed: 0 to bleed.needle.clicks {bleed.needle.clicks}")
        return value

    @field_validator("check_area_mm2")
    @classmethod
    def _area_of_check(cls, value: float | None, info: ValidationInfo) -> float | None:
        if value is None and info.data.get("kind") == "check":
            raise BadInput('is missing: a valve of kind "check" needs it')
        if value is not None and info.data.get("kind") == "shim":
            raise BadInput('a valve of kind "shim" has none: leave it out')
        return value

    @field_serializer("fitted")
    def _stack_as_lines(self, stack: Stack | None) -> list[str] | None:
        return None if stack is None else stack.lines()


def _misfits(
    stack: Stack,
    ports: Ports | None,
    seat: Seat | None,
    post: Post | None,
    back_spring: BackSpring | None,
) -> list[str]:
    """Why a stack cannot work in a valve, one sentence each."""
    face = stack.groups[0].shim.outer_mm
    faults = []
    if seat and face < seat.cover_mm - 1e-6:
        faults.append(
            f"the face shim ({face:g} mm) does not cover the seat: it needs {seat.cover_mm:g} mm "
            "or more (seat_mm + land_mm)"
        )
    if ports and stack.clamp_mm >= ports.inner_mm:
        faults.append(
            f"the clamp shim ({stack.clamp_mm:g} mm) reaches over the ports: allowed: less than "
            f"ports.inner_mm {ports.inner_mm:g}"
        )
    if post:
        faults += _off_post(stack, post)
    if back_spring and not stack.clamp_mm < back_spring.ring_mm <= face:
        faults.append(
            f"the back spring presses at {back_spring.ring_mm:g} mm, which is not on the stack: it "
            f"reaches from {stack.clamp_mm:g} mm (clamp shim) to {face:g} mm"
        )
    return faults


def _off_post(stack: Stack, post: Post) -> list[str]:
    faults = []
    widest = max(group.shim.outer_mm for group in stack.groups)
    if widest > post.clearance_mm:
        faults.append(
            f"the widest shim ({widest:g} mm) does not go in: clearance_mm is {post.clearance_mm:g}"
        )
    if stack.clamp_mm <= post.post_mm:
        faults.append(
            f"the clamp shim ({stack.clamp_mm:g} mm) must be wider than post_mm {post.post_mm:g}"
        )
    if stack.height_mm > post.height_max_mm + 1e-6:
        faults.append(
            f"the stack is {stack.height_mm:.2f} mm high: the post takes at most "
            f"{post.height_max_mm:g} mm (height_max_mm)"
        )
    if stack.height_mm < post.height_min_mm - 1e-6:
        faults.append(
            f"the stack is {stack.height_mm:.2f} mm high: the nut clamps only from "
            f"{post.height_min_mm:g} mm on (height_min_mm): add clamp shims"
        )
    return faults


def warnings_for(valve: Valve, stack: Stack) -> list[str]:
    """What a tuner should know before building ``stack`` on this valve, one plain sentence each.

    Empty when nothing is odd: the face shim covers the seat, everything goes in and is clamped, and
    the stack tapers away from the face except behind a crossover shim.
    """
    faults = _misfits(stack, valve.ports, valve.seat, valve.post, valve.back_spring)
    return faults + _odd_tapers([g.shim for g in stack.groups[:-1] if g.shim.inner_mm is None])


def _odd_tapers(shims: list[Shim]) -> list[str]:
    """A stack may widen once, behind a crossover: a shim smaller than both its neighbours."""
    notes = []
    crossovers = 0
    for place in range(1, len(shims)):
        before, shim = shims[place - 1], shims[place]
        if shim.outer_mm <= before.outer_mm:
            continue
        if shim.outer_mm > shims[0].outer_mm:
            notes.append(
                f"a shim of {shim.outer_mm:g} mm lies behind a smaller face shim "
                f"({shims[0].outer_mm:g} mm): the face shim should be the widest"
            )
        elif crossovers:
            notes.append(
                f"the stack widens again from {before.outer_mm:g} to {shim.outer_mm:g} mm: one "
                "crossover is usual"
            )
        crossovers += 1
    return notes


class Circuit(Part):
    """All valves that act in one direction of travel; exactly one is searched."""

    valves: tuple[Valve, ...]

    @property
    def searched(self) -> Valve:
        """The valve whose stack is looked for."""
        return next(valve for valve in self.valves if valve.searched)

    @field_validator("valves", mode="wrap")
    @classmethod
    def _whole(cls, value: object, handler: ValidatorFunctionWrapHandler) -> object:
        """Check the valves together even when one of them has faults of its own."""
        faults = _faults_between(value) if isinstance(value, list | tuple) else []
        try:
            valves: object = handler(value)
        except ValidationError as error:
            if not faults:
                raise
            own = [_again(fault) for fault in error.errors(include_url=False)]
            together = PydanticCustomError("value_error", "{text}", {"text": "\n".join(faults)})
            own.append(InitErrorDetails(type=together, loc=(), input=value))
            raise ValidationError.from_exception_data(cls.__name__, own) from None
        _raise_any(faults)
        return valves


def _faults_between(valves: Iterable[object]) -> list[str]:
    given = [
        valve if isinstance(valve, dict) else getattr(valve, "__dict__", {}) for valve in valves
    ]
    searched = sum(valve.get("searched", False) is True for valve in given)
    names = [valve.get("name") for valve in given]
    faults = []
    if searched != 1:
        faults.append(f"{searched} valves have searched = true: allowed: exactly one of a circuit")
    twice = sorted({name for name in names if isinstance(name, str) and names.count(name) > 1})
    faults += [f'the name "{name}" is given twice: allowed: one valve each' for name in twice]
    return faults


def _again(fault: Any) -> InitErrorDetails:
    context = fault.get("ctx", {})
    kind: str | PydanticCustomError = fault["type"]
    if kind == "value_error":
        kind = PydanticCustomError("value_error", "{text}", {"text": str(context.get("error"))})
    return InitErrorDetails(type=kind, loc=fault["loc"], input=fault["input"], ctx=context)


class Body(Part):
    """Dimensions of the damper body."""

    piston_mm: Length = Field(description="bore the piston runs in")
    shaft_mm: Length = Field(description="shaft diameter")
    stroke_mm: Length = Field(description="full travel of the shaft")

    @field_validator("shaft_mm")
    @classmethod
    def _shaft_in_piston(cls, value: float, info: ValidationInfo) -> float:
        piston = info.data.get("piston_mm")
        if piston is not None and value >= piston:
            raise BadInput(f"{value:g}: must be less than piston_mm {piston:g}")
        return value

    @property
    def displaced_cm3(self) -> float:
        """Oil the shaft displaces over the whole stroke, cm3."""
        return pi / 4.0 * self.shaft_mm**2 * self.stroke_mm / 1000.0


class Gas(Part):
    """Gas behind the oil."""

    pressure_mpa: Number = Field(ge=0, le=10, description="gauge charge pressure, shaft extended")
    volume_cm3: Number = Field(gt=0, le=5000, description="gas volume, shaft extended")


class Damper(Part):
    """A complete damper."""

    name: str = Field(min_length=1, max_length=80)
    summary: str = ""
    oil: str = Field(description="name in the oil catalogue")
    oil_temp_c: Number = Field(default=40.0, ge=-30, le=150)
    friction_n: Number = Field(default=0.0, ge=0, le=2000, description="calibratable")
    gas_in_force: bool = Field(
        default=False,
        strict=True,
        description="add the gas force on the shaft to the curve, as a raw dyno shows",
    )
    steel: str = Field(default="carbon-strip", description="name in the shim steel catalogue")
    body: Body
    gas: Gas
    compression: Circuit | None = None
    rebound: Circuit | None = Field(default=None, validate_default=True)

    @field_validator("gas")
    @classmethod
    def _room_for_shaft(cls, gas: Gas, info: ValidationInfo) -> Gas:
        body = info.data.get("body")
        if body is not None and gas.volume_cm3 <= body.displaced_cm3:
            raise BadInput(
                f"volume_cm3 {gas.volume_cm3:g}: must be more than the shaft displaces over its "
                f"stroke, {body.displaced_cm3:.1f}"
            )
        return gas

    @field_validator("rebound")
    @classmethod
    def _any_circuit(cls, rebound: Circuit | None, info: ValidationInfo) -> Circuit | None:
        if rebound is None and info.data.get("compression", "faulty") is None:
            raise BadInput("is missing: a damper needs a compression or a rebound circuit")
        return rebound

    def circuit(self, direction: Direction) -> Circuit:
        """The circuit of one direction. Raises KeyError when the damper has none."""
        circuit = self.compression if direction == "compression" else self.rebound
        if circuit is None:
            raise KeyError(direction)
        return circuit
