"""Shim steels and oils, as validated records, and how far a strip's thickness may be off.

Stresses and moduli are MPa, viscosities cSt (mm2/s), densities kg/m3, thicknesses mm.
"""

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, field_validator
from pydantic_core.core_schema import ValidationInfo

Tolerance = Literal["normal", "fine", "precision"]
Real = Annotated[float, Field(strict=True)]

#: Permitted deviation (+-mm) of strip narrower than 125 mm by class, each step with its upper end.
#: EN 10140 (cold-rolled narrow strip): the upper end belongs to the step.
_UP_TO: tuple[tuple[float, dict[Tolerance, float]], ...] = (
    (0.10, {"normal": 0.008, "fine": 0.006, "precision": 0.004}),
    (0.15, {"normal": 0.010, "fine": 0.008, "precision": 0.005}),
)
#: EN 10258 / ISO 9445-1 (stainless narrow strip): the upper end belongs to the next step.
_BELOW: tuple[tuple[float, dict[Tolerance, float]], ...] = (
    (0.20, {"normal": 0.015, "fine": 0.010, "precision": 0.008}),
    (0.25, {"normal": 0.015, "fine": 0.012, "precision": 0.008}),
    (0.30, {"normal": 0.017, "fine": 0.012, "precision": 0.009}),
    (0.40, {"normal": 0.020, "fine": 0.015, "precision": 0.010}),
)


class _Record(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)


class Steel(_Record):
    """What shims are stamped from."""

    name: str = Field(min_length=1, max_length=60)
    summary: str = ""
    youngs_mpa: Real = Field(ge=50e3, le=400e3, description="modulus of elasticity")
    poisson: Real = Field(ge=0.1, le=0.45, description="ratio of lateral to axial strain")
    tensile_mpa: Real = Field(ge=200, le=3000, description="tensile strength")
    endurance_mpa: Real = Field(
        ge=50, le=1500, description="stress amplitude endured without end, fully reversed bending"
    )
    thickness_tolerance: Tolerance = Field(
        default="fine", description="tolerance class of the strip"
    )
    source: str = Field(min_length=1, description='where the values come from, or "from memory"')

    @field_validator("endurance_mpa")
    @classmethod
    def _below_strength(cls, value: float, info: ValidationInfo) -> float:
        tensile = info.data.get("tensile_mpa")
        if tensile is not None and value >= tensile:
            raise ValueError(f"{value:g}: must be below tensile_mpa {tensile:g}")
        return value

    def thickness_tolerance_mm(self, thickness_mm: float) -> float:
        """Permitted deviation of a shim's thickness, +-mm, by this steel's tolerance class."""
        return thickness_tolerance_mm(thickness_mm, self.thickness_tolerance)


class Oil(_Record):
    """A damper oil: two viscosities, the density at 15 C and the pressure at which it boils."""

    name: str = Field(min_length=1, max_length=60)
    summary: str = ""
    viscosity_40c_cst: Real = Field(ge=2.5, le=1000, description="kinematic viscosity at 40 C")
    viscosity_100c_cst: Real = Field(ge=0.9, le=100, description="kinematic viscosity at 100 C")
    density_15c_kg_m3: Real = Field(ge=700, le=1100, description="density at 15 C")
    vapour_pressure_mpa: Real = Field(default=0.0, ge=0, le=0.1, description="absolute")
    source: str = Field(min_length=1, description='where the values come from, or "from memory"')

    @field_validator("viscosity_100c_cst")
    @classmethod
    def _thinner_when_hot(cls, value: float, info: ValidationInfo) -> float:
        cold = info.data.get("viscosity_40c_cst")
        if cold is not None and value >= cold:
            raise ValueError(f"{value:g}: must be below viscosity_40c_cst {cold:g}")
        return value


def thickness_tolerance_mm(thickness_mm: float, tolerance_class: Tolerance) -> float:
    """Permitted deviation of strip thickness, +-mm.

    ``thickness_mm`` is the nominal thickness; ``tolerance_class`` one of ``normal``, ``fine``,
    ``precision``. EN 10140 up to 0.15 mm, EN 10258 / ISO 9445-1 above (used for every shim steel),
    strip narrower than 125 mm, both as reproduced by strip suppliers. From 0.40 mm on (no table at
    hand) the deviation grows with the thickness. Raises ValueError for a thickness not above 0.
    """
    if not thickness_mm > 0.0:
        raise ValueError(f"a thickness must be positive, not {thickness_mm}")
    for limit, deviation in _UP_TO:
        if thickness_mm <= limit + 1e-9:
            return deviation[tolerance_class]
    for limit, deviation in _BELOW:
        if thickness_mm < limit - 1e-9:
            return deviation[tolerance_class]
    limit, deviation = _BELOW[-1]
    return deviation[tolerance_class] * thickness_mm / limit
