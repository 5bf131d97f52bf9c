"""The parts a valve is made of, each validated by itself, with the rules between its own keys.

All lengths are mm, areas mm2, pressures MPa, forces N; the hydraulics convert to SI.
Diameters are named after what they measure (``seat_mm`` is the seat's diameter).

Rules between keys are checked at the last of the keys they join, so that one faulty key does not
hide the faults of others: every fault of a file comes out at once.
"""

from math import cos, pi, radians, sin, sqrt
from typing import Annotated

from pydantic import BaseModel, ConfigDict, Field, field_validator
from pydantic_core.core_schema import ValidationInfo

from optimiser.faults import BadInput

#: A number, not a text or true/false that could be read as one.
Number = Annotated[float, Field(strict=True)]
Whole = Annotated[int, Field(strict=True)]
Length = Annotated[float, Field(gt=0, le=1000, strict=True)]
Area = Annotated[float, Field(gt=0, le=10000, strict=True)]
AreaOrNone = Annotated[float, Field(ge=0, le=10000, strict=True)]
Coefficient = Annotated[float, Field(ge=0.2, le=1.0, strict=True)]


class Part(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)


class Ports(Part):
    """Passages through the piston or valve body, below the face shim."""

    inner_mm: Length = Field(description="inner diameter of the ring the ports open into")
    outer_mm: Length = Field(description="outer diameter of that ring")
    area_mm2: Area = Field(description="narrowest total area of all ports")
    hydraulic_mm: Length = Field(description="hydraulic diameter of one port, 4 area / perimeter")
    length_mm: Length = Field(description="length of one port")
    discharge: Coefficient = Field(default=0.72, description="discharge coefficient; calibratable")
    loaded_fraction: Number = Field(
        default=1.0,
        gt=0.1,
        le=1.0,
        description="share of the ring on which the pressure really acts; calibratable",
    )

    @field_validator("outer_mm")
    @classmethod
    def _ring(cls, value: float, info: ValidationInfo) -> float:
        inner = info.data.get("inner_mm")
        if inner is not None and value <= inner:
            raise BadInput(f"{value:g}: must be more than inner_mm {inner:g}")
        return value

    @field_validator("area_mm2")
    @classmethod
    def _area_in_ring(cls, value: float, info: ValidationInfo) -> float:
        inner, outer = info.data.get("inner_mm"), info.data.get("outer_mm")
        if inner is not None and outer is not None:
            ring = pi / 4.0 * (outer**2 - inner**2)
            if value > ring:
                raise BadInput(f"{value:g}: must be at most the area of the port ring, {ring:.1f}")
        return value

    @field_validator("hydraulic_mm")
    @classmethod
    def _no_rounder_than_a_circle(cls, value: float, info: ValidationInfo) -> float:
        return _check_hydraulic(value, info)


def _check_hydraulic(value: float, info: ValidationInfo) -> float:
    """4 area / perimeter is greatest for one round passage of the whole area."""
    area = info.data.get("area_mm2")
    if area is not None and value > 2.0 * sqrt(area / pi) + 0.01:
        raise BadInput(
            f"{value:g}: must be at most the diameter of one round hole of area_mm2 {area:g}, "
            f"{2.0 * sqrt(area / pi):.2f}"
        )
    return value


class Seat(Part):
    """The raised rim the face shim closes."""

    seat_mm: Length = Field(description="mean diameter of the sealing land")
    land_mm: Length = Field(description="radial width of the sealing land")
    height_mm: Number = Field(
        default=0.0, ge=-1.0, le=3.0, description="seat above the clamp face; preload; calibratable"
    )
    open_fraction: Number = Field(
        default=1.0, gt=0.05, le=1.0, description="share of the seat's circumference that opens"
    )
    discharge: Coefficient = Field(
        default=0.61, description="curtain discharge coefficient; calibratable"
    )

    @field_validator("land_mm")
    @classmethod
    def _land_on_seat(cls, value: float, info: ValidationInfo) -> float:
        seat = info.data.get("seat_mm")
        if seat is not None and value > seat / 4.0:
            raise BadInput(
                f"{value:g}: must be at most a quarter of seat_mm {seat:g} (it is the width of the "
                "sealing rim)"
            )
        return value

    @property
    def cover_mm(self) -> float:
        """Diameter a face shim needs to cover the sealing land, mm."""
        return self.seat_mm + self.land_mm


class Post(Part):
    """What the shims are threaded on."""

    post_mm: Length = Field(description="post diameter = bore of the shims")
    height_min_mm: Number = Field(gt=0, le=50, description="least stack height the nut can clamp")
    height_max_mm: Number = Field(gt=0, le=50, description="greatest stack height")
    clearance_mm: Length = Field(
        default=1000.0, description="free diameter around the stack (widest shim that fits)"
    )

    @field_validator("height_max_mm")
    @classmethod
    def _room(cls, value: float, info: ValidationInfo) -> float:
        least = info.data.get("height_min_mm")
        if least is not None and value <= least:
            raise BadInput(f"{value:g}: must be more than height_min_mm {least:g}")
        return value

    @field_validator("clearance_mm")
    @classmethod
    def _around_post(cls, value: float, info: ValidationInfo) -> float:
        post = info.data.get("post_mm")
        if post is not None and value <= post:
            raise BadInput(f"{value:g}: must be more than post_mm {post:g}")
        return value


class Needle(Part):
    """A conical needle in a jet: area = pi x sin(h) (d - x sin(h) cos(h)), h = half angle."""

    jet_mm: Length = Field(description="bore of the jet")
    cone_deg: Number = Field(gt=1, lt=120, description="included angle of the needle's cone")
    lift_per_click_mm: Length = Field(description="thread pitch / clicks a turn")
    clicks: Whole = Field(ge=1, le=60, description="clicks from closed to fully open")
    offset_mm: Number = Field(default=0.0, ge=0, le=2, description="lift at 0 clicks; calibratable")

    @field_validator("clicks")
    @classmethod
    def _clicks_do_something(cls, value: int, info: ValidationInfo) -> int:
        given = info.data
        if not {"jet_mm", "cone_deg", "lift_per_click_mm"} <= given.keys():
            return value
        opened = _lift_of_open_jet(given["jet_mm"], given["cone_deg"])
        lift = value * given["lift_per_click_mm"]
        if lift > 2.0 * opened:
            raise BadInput(
                f"{value} clicks of lift_per_click_mm {given['lift_per_click_mm']:g} lift the "
                f"needle {lift:.2f} mm, but the jet is wide open at {opened:.2f}: allowed: at most "
                "twice that"
            )
        return value


def _lift_of_open_jet(jet_mm: float, cone_deg: float) -> float:
    """Lift (mm) at which the needle leaves the jet's whole area: x s (d - x s c) = d2/4."""
    s, c = sin(radians(cone_deg / 2.0)), cos(radians(cone_deg / 2.0))
    return jet_mm * (1.0 - sqrt(1.0 - c)) / (2.0 * s * c)


class Bleed(Part):
    """Passage that is open beside the closed shims."""

    area_mm2: AreaOrNone = Field(default=0.0, description="always open area; calibratable")
    length_mm: Length = Field(default=2.0, description="length of the bleed passage")
    discharge: Coefficient = Field(default=0.70, description="calibratable")
    needle: Needle | None = None


class BackSpring(Part):
    """A coil spring that presses the back of the stack at a ring (high-speed adjuster)."""

    ring_mm: Length = Field(description="diameter at which it presses")
    rate_n_mm: Number = Field(gt=0, le=2000)
    preload_n: Number = Field(ge=0, le=2000)


class Series(Part):
    """Fixed restriction all of the valve's oil passes (bridge passage, open lockout port)."""

    area_mm2: Area = Field(description="narrowest area")
    length_mm: Length = Field(description="length of the passage")
    hydraulic_mm: Length = Field(description="hydraulic diameter, 4 area / perimeter")
    discharge: Coefficient = 0.72

    @field_validator("hydraulic_mm")
    @classmethod
    def _no_rounder_than_a_circle(cls, value: float, info: ValidationInfo) -> float:
        return _check_hydraulic(value, info)
