"""What a tune table is asked for: the rows, the columns and how good every cell must be."""

from itertools import pairwise
from typing import Annotated

from pydantic import Field, field_validator

from optimiser.damper import Direction
from optimiser.wanted.bounds import Described, between
from optimiser.wanted.frame import LEAST_SAG_PERCENT, MOST_SAG_PERCENT
from optimiser.wanted.rider import LEAST_RIDER_KG, MOST_RIDER_KG

Mass = Annotated[float, between(LEAST_RIDER_KG, MOST_RIDER_KG, "rider mass with kit", "kg")]
Sag = Annotated[float, between(LEAST_SAG_PERCENT, MOST_SAG_PERCENT, "sag", "%")]
Tolerance = Annotated[float, between(0.1, 50, "tolerance_percent", "%")]
Price = Annotated[float, between(0, 20, "change_price_percent", "points")]

MOST_MASSES, MOST_FEELS = 60, 12


class TableRequest(Described):
    """One tune table: rider masses down, feels across, a stack a circuit in every cell."""

    name: str = Field(min_length=1, max_length=80, description="title of the table")
    frame: str = Field(min_length=1, description="name of a frame, or path of its file")
    damper: str = Field(min_length=1, description="name of a damper, or path of its file")
    stock: str = Field(min_length=1, description="name of a stock list, or path of its file")
    rider_masses_kg: tuple[Mass, ...] = Field(
        min_length=1, max_length=MOST_MASSES, description="masses with kit, kg, lightest first"
    )
    feels: tuple[str, ...] = Field(
        min_length=1, max_length=MOST_FEELS, description="names of feels, or paths of their files"
    )
    sag_percent: Sag | None = Field(
        default=None, description="sag with rider, %, instead of the frame's usual"
    )
    circuits: tuple[Direction, ...] = Field(
        default=("compression", "rebound"), min_length=1, description="circuits to fill in"
    )
    tolerance_percent: Tolerance = Field(
        default=5.0, description="r.m.s. error up to which a stack is good enough, %"
    )
    change_price_percent: Price = Field(
        default=0.1,
        description="points of error that one shim taken out or put in between rows is worth",
    )
    clicks: Annotated[int, Field(ge=0, le=60)] | None = Field(
        default=None,
        description="click setting of every cell; left out, each circuit finds its own",
    )
    one_drawer: bool = Field(
        default=False, description="true: build every cell at once from the stock"
    )
    oil_temp_c: Annotated[float, between(-30, 150, "oil_temp_c", "C")] | None = Field(
        default=None, description="oil temperature, C, instead of the damper's"
    )
    parts: Annotated[int, Field(ge=2, le=40)] = Field(
        default=14, description="most shims in a stack, clamp shims included"
    )
    evaluations: Annotated[int, Field(ge=50, le=200_000)] = Field(
        default=2500, description="stacks tried in a cell that begins from its neighbour's stacks"
    )
    seed: Annotated[int, Field(ge=0, le=2**31)] = Field(
        default=0, description="same seed, same table"
    )

    @field_validator("rider_masses_kg")
    @classmethod
    def _rising(cls, masses: tuple[float, ...]) -> tuple[float, ...]:
        faults = [
            f"{after:g} follows {before:g}; allowed: lightest first, each mass once"
            for before, after in pairwise(masses)
            if not after > before
        ]
        if faults:
            raise ValueError("\n".join(faults))
        return masses

    @field_validator("feels", "circuits")
    @classmethod
    def _once(cls, names: tuple[str, ...]) -> tuple[str, ...]:
        faults = [f"{name} is given twice; allowed: once" for name in _repeated(names)]
        if faults:
            raise ValueError("\n".join(faults))
        return names

    @property
    def cells(self) -> int:
        """Number of searches: masses x feels x circuits."""
        return len(self.rider_masses_kg) * len(self.feels) * len(self.circuits)


def _repeated(names: tuple[str, ...]) -> list[str]:
    return [name for place, name in enumerate(names) if name in names[:place]]
