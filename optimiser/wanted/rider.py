"""The rider, as far as the springs feel them."""

from typing import Annotated

from pydantic import Field

from optimiser.wanted.bounds import Described, between

LEAST_RIDER_KG, MOST_RIDER_KG = 20.0, 250.0


class Rider(Described):
    """A rider with everything they wear and carry."""

    name: str = Field(default="rider", min_length=1, max_length=60)
    summary: str = ""
    mass_kg: Annotated[
        float, between(LEAST_RIDER_KG, MOST_RIDER_KG, "rider mass with kit", "kg")
    ] = Field(description="mass with kit, kg")
