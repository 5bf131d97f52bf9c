"""Damper, Circuit, Valve: a validated description, as read from a damper's TOML file.

All lengths are mm, areas mm2, pressures MPa, forces N; the hydraulics convert to SI.
Diameters are named after what they measure (``seat_mm`` is the seat's diameter).
"""

from typing import Annotated, Literal, Self

from pydantic import BaseModel, ConfigDict, Field, field_validator, model_validator

from optimiser.stack import Stack

Length = Annotated[float, Field(gt=0, le=1000, allow_inf_nan=False)]
Area = Annotated[float, Field(gt=0, le=10000, allow_inf_nan=False)]
AreaOrNone = Annotated[float, Field(ge=0, le=10000, allow_inf_nan=False)]
Coefficient = Annotated[float, Field(ge=0.2, le=1.0, allow_inf_nan=False)]
Direction = Literal["compression", "rebound"]
Displacement = Literal["piston", "piston_less_shaft", "shaft"]


class _Part(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True)


class Ports(_Part):
    """Passages through the piston or valve body, below the face shim."""

    inner_mm: Length = Field(description="inner diameter of the ring the ports open into")
    outer_mm: Length = Field(description="outer diameter of that ring")
    area_mm2: Area = Field(description="narrowest total area of all ports")
    hydraulic_mm: Length = Field(description="hydraulic diameter of one port, 4 area / perimeter")
    length_mm: Length = Field(description="length of one port")
    discharge: Coefficient = Field(default=0.72, description="discharge coefficient; calibratable")
    loaded_fraction: float = Field(
        default=1.0,
        gt=0.1,
        le=1.0,
        description="share of the ring on which the pressure really acts; calibratable",
    )


class Seat(_Part):
    """The raised rim the face shim closes."""

    seat_mm: Length = Field(description="mean diameter of the sealing land")
    land_mm: Length = Field(description="radial width of the sealing land")
    height_mm: float = Field(
        default=0.0, ge=-1.0, le=3.0, description="seat above the clamp face; preload; calibratable"
    )
    open_fraction: float = Field(
        default=1.0, gt=0.05, le=1.0, description="share of the seat's circumference that opens"
    )
    discharge: Coefficient = Field(
        default=0.61, description="curtain discharge coefficient; calibratable"
    )


class Post(_Part):
    """What the shims are threaded on."""

    post_mm: Length = Field(description="post diameter = bore of the shims")
    height_min_mm: float = Field(gt=0, le=50, description="least stack height the nut can clamp")
    height_max_mm: float = Field(gt=0, le=50, description="greatest stack height")
    clearance_mm: Length = Field(
        default=1000.0, description="free diameter around the stack (widest shim that fits)"
    )


class Needle(_Part):
    """A conical needle in a jet: area = pi x sin(h) (d - x sin(h) cos(h)), h = half angle."""

    jet_mm: Length = Field(description="bore of the jet")
    cone_deg: float = Field(gt=1, lt=120, description="included angle of the needle's cone")
    lift_per_click_mm: Length
    clicks: int = Field(ge=1, le=60, description="clicks from closed to fully open")
    offset_mm: float = Field(default=0.0, ge=0, le=2, description="lift at 0 clicks; calibratable")


class Bleed(_Part):
    """Passage that is open beside the closed shims."""

    area_mm2: AreaOrNone = Field(default=0.0, description="always open area; calibratable")
    length_mm: Length = Field(default=2.0, description="length of the bleed passage")
    discharge: Coefficient = Field(default=0.70, description="calibratable")
    needle: Needle | None = None


class BackSpring(_Part):
    """A coil spring that presses the back of the stack at a ring (high-speed adjuster)."""

    ring_mm: Length = Field(description="diameter at which it presses")
    rate_n_mm: float = Field(gt=0, le=2000)
    preload_n: float = Field(ge=0, le=2000)


class Series(_Part):
    """Fixed restriction all of the valve's oil passes (bridge passage, open lockout port)."""

    area_mm2: Area
    length_mm: Length
    hydraulic_mm: Length
    discharge: Coefficient = 0.72


class Valve(_Part):
    """A shim valve, or (``kind = "check"``) a plain check valve without a stack."""

    name: str = Field(min_length=1, max_length=60)
    kind: Literal["shim", "check"] = "shim"
    displacement: Displacement = Field(description="area that pushes oil through this valve")
    low_side: Literal["lowers", "raises", "no_effect"] = Field(
        description="what its pressure drop does to the low-pressure side of the piston"
    )
    searched: bool = Field(default=False, description="its stack is the one that is looked for")
    ports: Ports | None = None
    seat: Seat | None = None
    post: Post | None = None
    bleed: Bleed = Bleed()
    back_spring: BackSpring | None = None
    series: Series | None = None
    fitted: Stack | None = Field(default=None, description="the stack fitted now, face first")
    fitted_clicks: int | None = Field(default=None, ge=0, le=60)
    check_area_mm2: AreaOrNone | None = Field(default=None, description="check valve: open area")
    check_cracking_mpa: float = Field(default=0.0, ge=0, le=5)
    check_discharge: Coefficient = 0.65

    @field_validator("fitted", mode="before")
    @classmethod
    def _parse_stack(cls, value: object) -> object:
        if isinstance(value, list) and all(isinstance(line, str) for line in value):
            return Stack.parse(value)
        return value

    @model_validator(mode="after")
    def _complete(self) -> Self:
        if self.kind == "check":
            if self.check_area_mm2 is None:
                raise ValueError("a check valve needs check_area_mm2")
            if self.searched:
                raise ValueError("a check valve has no stack to search")
            return self
        missing = [key for key in ("ports", "seat", "post", "fitted") if getattr(self, key) is None]
        if missing:
            raise ValueError(f"a shim valve needs {', '.join(missing)}")
        return self


class Circuit(_Part):
    """All valves that act in one direction of travel; exactly one is searched."""

    valves: tuple[Valve, ...] = Field(min_length=1)

    @property
    def searched(self) -> Valve:
        """The valve whose stack is looked for."""
        return next(valve for valve in self.valves if valve.searched)

    @model_validator(mode="after")
    def _one_searched(self) -> Self:
        if sum(valve.searched for valve in self.valves) != 1:
            raise ValueError("exactly one valve of a circuit must have searched = true")
        return self


class Body(_Part):
    """Dimensions of the damper body."""

    piston_mm: Length
    shaft_mm: Length
    stroke_mm: Length


class Gas(_Part):
    """Gas behind the oil."""

    pressure_mpa: float = Field(gt=0, le=10, description="gauge charge pressure, shaft extended")
    volume_cm3: float = Field(gt=0, le=5000, description="gas volume, shaft extended")


class Damper(_Part):
    """A complete damper."""

    name: str = Field(min_length=1, max_length=80)
    summary: str = ""
    oil: str = Field(description="name in the oil catalogue")
    oil_temp_c: float = Field(default=40.0, ge=-30, le=150)
    friction_n: float = Field(default=0.0, ge=0, le=2000, description="calibratable")
    gas_in_force: bool = Field(
        default=False, description="add the gas force on the shaft to the curve, as a raw dyno shows"
    )
    steel: str = Field(default="carbon-strip", description="name in the shim steel catalogue")
    body: Body
    gas: Gas
    compression: Circuit | None = None
    rebound: Circuit | None = None

    def circuit(self, direction: Direction) -> Circuit:
        """The circuit of one direction. Raises KeyError when the damper has none."""
        circuit = self.compression if direction == "compression" else self.rebound
        if circuit is None:
            raise KeyError(direction)
        return circuit
