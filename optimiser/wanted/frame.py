"""The frame: how one wheel moves its damper and what it carries."""

from functools import cached_property
from itertools import pairwise
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import Field, model_validator

from optimiser.wanted.bounds import Described, between
from optimiser.wanted.leverage import Leverage
from optimiser.wanted.spring import SpringDescription

LEAST_SAG_PERCENT, MOST_SAG_PERCENT = 5.0, 50.0


class LeveragePoints(Described):
    """Leverage ratio (wheel travel per shaft stroke) at points of wheel travel."""

    travel_mm: tuple[float, ...] = Field(description="wheel travel, mm, from 0 to full travel")
    ratio: tuple[float, ...] = Field(description="leverage ratio there, dimensionless")

    @model_validator(mode="after")
    def _usable(self) -> Self:
        travel, ratio = np.array(self.travel_mm), np.array(self.ratio)
        if len(travel) != len(ratio) or len(travel) < 2:
            raise ValueError(
                "leverage needs 2 or more points, as many travel_mm as ratio, not "
                f"{len(travel)} and {len(ratio)}"
            )
        faults = [
            f"leverage travel_mm {after:g} follows {before:g}; travel must rise at every point"
            for before, after in pairwise(travel)
            if not after > before
        ]
        if travel[0] != 0.0:
            faults.append(f"leverage travel_mm must start at 0 (topped out), not {travel[0]:g}")
        faults += [
            f"leverage ratio at travel_mm {x:g} must be above 0 and at most 20, not {r:g}"
            for x, r in zip(travel, ratio, strict=True)
            if not 0.0 < r <= 20.0
        ]
        if faults:
            raise ValueError("\n".join(faults))
        return self


class Frame(Described):
    """One wheel of one machine."""

    name: str = Field(min_length=1, max_length=60)
    summary: str = ""
    wheel_travel_mm: Annotated[float, between(20, 500, "wheel_travel_mm", "mm")] = Field(
        description="whole travel of the wheel axle, mm"
    )
    leverage: LeveragePoints
    share_of_mass: Annotated[float, between(0.1, 1, "share_of_mass")] = Field(
        description="part of rider and sprung machine that this wheel carries, 0.1 to 1"
    )
    sprung_kg: Annotated[float, between(0, 500, "sprung_kg", "kg")] = Field(
        description="mass of the machine above its springs, without the rider, kg"
    )
    unsprung_kg: Annotated[float, between(0.2, 100, "unsprung_kg", "kg")] = Field(
        description="mass that moves with this wheel, kg"
    )
    tyre_n_mm: Annotated[float, between(5, 2000, "tyre_n_mm", "N/mm")] = Field(
        description="vertical rate of the tyre, N/mm"
    )
    sag_percent: Annotated[
        float, between(LEAST_SAG_PERCENT, MOST_SAG_PERCENT, "sag_percent", "%")
    ] = Field(default=30.0, description="usual sag with rider, %, where nothing else is asked")
    sag_of: Literal["wheel_travel", "shaft_stroke"] = Field(
        default="wheel_travel", description="what sag is a part of"
    )
    spring: SpringDescription = SpringDescription()

    @model_validator(mode="after")
    def _leverage_covers_travel(self) -> Self:
        last = self.leverage.travel_mm[-1]
        if abs(last - self.wheel_travel_mm) > 1e-6 * self.wheel_travel_mm:
            raise ValueError(
                f"the leverage points end at travel_mm {last:g}, but must end at "
                f"wheel_travel_mm {self.wheel_travel_mm:g}"
            )
        return self

    @cached_property
    def lever(self) -> Leverage:
        """The leverage over the whole travel."""
        return Leverage(np.array(self.leverage.travel_mm), np.array(self.leverage.ratio))
