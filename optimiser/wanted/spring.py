"""Springs: what holds the rider up. Coil by rate and preload, air by measured points."""

from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, Literal, Protocol, Self

import numpy as np
from pydantic import Field, model_validator
from scipy.interpolate import PchipInterpolator

from optimiser.faults import BadInput
from optimiser.wanted.arrays import Floats
from optimiser.wanted.bounds import Described, between


class SpringDescription(Described):
    """A coil spring by rate and preload, or an air spring by points measured on a press.

    Leave a coil's rate out to have it computed from the sag. An air spring's points hold from
    stroke 0 at riding pressure with the damper inside.
    """

    kind: Literal["coil", "air"] = Field(default="coil", description="kind of spring")
    rate_n_mm: Annotated[float | None, between(1, 2000, "coil rate", "N/mm")] = Field(
        default=None, description="rate of the fitted coil, N/mm; left out: computed from sag"
    )
    preload_mm: Annotated[float, between(0, 60, "coil preload", "mm")] = Field(
        default=0.0, description="how much shorter the coil is fitted than its free length, mm"
    )
    stroke_mm: tuple[float, ...] = Field(
        default=(), description="air: shaft strokes, mm, from 0, smallest first"
    )
    force_n: tuple[float, ...] = Field(
        default=(), description="air: force on the shaft at each stroke, N"
    )

    @model_validator(mode="after")
    def _usable(self) -> Self:
        faults = _air_faults(self.stroke_mm, self.force_n) if self.kind == "air" else []
        if self.kind == "air" and (self.rate_n_mm is not None or self.preload_mm):
            faults.append("an air spring has no rate_n_mm and no preload_mm; leave them out")
        if self.kind == "coil" and (self.stroke_mm or self.force_n):
            faults.append('stroke_mm and force_n describe an air spring; set kind = "air"')
        if faults:
            raise ValueError("\n".join(faults))
        return self


def _air_faults(stroke_mm: tuple[float, ...], force_n: tuple[float, ...]) -> list[str]:
    strokes, forces = np.array(stroke_mm), np.array(force_n)
    if len(strokes) != len(forces) or len(strokes) < 3:
        return [
            "an air spring needs 3 or more points, as many stroke_mm as force_n, not "
            f"{len(strokes)} and {len(forces)}"
        ]
    faults = []
    if strokes[0] != 0.0 or not np.all(np.diff(strokes) > 0.0) or not np.isfinite(strokes[-1]):
        faults.append("an air spring's stroke_mm must start at 0 and rise at every point")
    if not (forces[0] >= 0.0 and np.all(np.diff(forces) > 0.0) and np.isfinite(forces[-1])):
        faults.append("an air spring's force_n must be 0 or more and rise at every point")
    return faults


class ShaftSpring(Protocol):
    """Force on the shaft over its stroke."""

    @property
    def full_stroke_mm(self) -> float:
        """Stroke, mm, up to which the spring is known."""
        ...

    @property
    def knots_mm(self) -> Floats:
        """Strokes (k,), mm, where the force's formula changes."""
        ...

    def force_n(self, stroke_mm: float) -> float:
        """Force on the shaft, N, at a stroke, mm."""
        ...

    def rate_n_mm(self, stroke_mm: float) -> float:
        """Slope of that force, N/mm."""
        ...

    def energy_j(self, stroke_mm: float) -> float:
        """Energy, J, stored from stroke 0 to this one, mm."""
        ...


@dataclass(frozen=True)
class CoilSpring:
    """F = k (s + preload) + gas: Hooke's law with a constant gas force of the damper's shaft."""

    coil_n_mm: float
    preload_mm: float = 0.0
    gas_force_n: float = 0.0

    @property
    def full_stroke_mm(self) -> float:
        """A coil is taken to be long enough."""
        return float("inf")

    @property
    def knots_mm(self) -> Floats:
        """None: one formula for the whole stroke."""
        return np.empty(0)

    def force_n(self, stroke_mm: float) -> float:
        """Force on the shaft, N, at a stroke, mm."""
        return self.coil_n_mm * (stroke_mm + self.preload_mm) + self.gas_force_n

    def rate_n_mm(self, stroke_mm: float) -> float:
        """The coil's rate, N/mm, at every stroke."""
        return self.coil_n_mm

    def energy_j(self, stroke_mm: float) -> float:
        """Energy, J, stored from stroke 0 to this one, mm: k ((s+p)^2 - p^2)/2 + F_gas s."""
        end = stroke_mm + self.preload_mm
        coil = 0.5 * self.coil_n_mm * (end * end - self.preload_mm**2)
        return 1e-3 * (coil + self.gas_force_n * stroke_mm)


@dataclass(frozen=True, eq=False)
class AirSpring:
    """Monotone piecewise cubic through measured points (Fritsch and Carlson 1980)."""

    stroke_mm: Floats
    forces_n: Floats

    @cached_property
    def _curve(self) -> PchipInterpolator:
        return PchipInterpolator(self.stroke_mm, self.forces_n)

    @property
    def full_stroke_mm(self) -> float:
        """Last measured stroke, mm."""
        return float(self.stroke_mm[-1])

    @property
    def knots_mm(self) -> Floats:
        """The measured strokes (k,), mm."""
        return self.stroke_mm

    def force_n(self, stroke_mm: float) -> float:
        """Force on the shaft, N, at a stroke, mm."""
        return float(self._curve(stroke_mm))

    def rate_n_mm(self, stroke_mm: float) -> float:
        """Slope of the force, N/mm, at a stroke, mm."""
        return float(self._curve(stroke_mm, 1))

    def energy_j(self, stroke_mm: float) -> float:
        """Energy, J, stored from stroke 0 to this one, mm (exact integral of the cubics)."""
        return 1e-3 * float(self._curve.integrate(0.0, stroke_mm))


def air_spring(description: SpringDescription, full_stroke_mm: float) -> AirSpring:
    """The air spring, known over the frame's whole shaft stroke, mm. Raises BadInput if shorter."""
    if description.stroke_mm[-1] < full_stroke_mm - 1e-6:
        raise BadInput(
            f"the air spring's points end at {description.stroke_mm[-1]:g} mm of stroke, but the "
            f"frame uses {full_stroke_mm:.1f} mm; measure it to full stroke"
        )
    return AirSpring(np.array(description.stroke_mm), np.array(description.force_n))
