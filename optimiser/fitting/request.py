"""The request of a fit: which damper, which numbers are free, and what each dyno run was.

One TOML file; every run is a table ``[[runs]]``. File names count from the request's own folder.
"""

from typing import Literal

from pydantic import Field, field_validator

from optimiser.fitting.parameters import KEYS, named_directions
from optimiser.fitting.units import UNITS, Quantity
from optimiser.parsing import nearest
from optimiser.parts import Number, Part, Whole

#: The stack as the damper file has it.
FITTED = "fitted"


class Columns(Part):
    """Names of a dyno file's columns, where they are not like ``velocity_m_s``."""

    velocity: str | None = None
    force: str | None = None
    time: str | None = None
    displacement: str | None = None


class Units(Part):
    """Units of a dyno file's columns, where their names do not end in them."""

    velocity: str | None = None
    force: str | None = None
    time: str | None = None
    displacement: str | None = None

    @field_validator("velocity", "force", "time", "displacement")
    @classmethod
    def _known(cls, unit: str | None, info: object) -> str | None:
        quantity: Quantity = getattr(info, "field_name", "force")
        if unit is not None and unit not in UNITS[quantity]:
            raise ValueError(f'"{unit}" is not known; allowed: {", ".join(UNITS[quantity])}')
        return unit


class RunRequest(Part):
    """One dyno run: its file, and what was in the damper and set on it."""

    file: str = Field(min_length=1, description="CSV of the run")
    circuit: Literal["compression", "rebound", "both"] = Field(
        description="stroke to use; both: the file holds both strokes, of the fitted stacks"
    )
    stack: tuple[str, ...] | str = Field(
        default=FITTED,
        description='"fitted", a stack CSV, or shim groups such as ["3 x 24 x 0.15", ...]',
    )
    clicks: Whole | None = Field(default=None, ge=0, le=60, description="out from closed")
    oil_temp_c: Number = Field(ge=-30, le=150, description="of the oil during the run")
    positive: Literal["compression", "rebound"] | None = Field(
        default=None, description="stroke in which velocity or displacement counts positive"
    )
    columns: Columns = Columns()
    units: Units = Units()
    smoothing_s: Number | None = Field(
        default=None, gt=0, le=10, description="window the velocity is smoothed over, time series"
    )
    units_are_right: bool = Field(
        default=False, strict=True, description="true: do not question the size of the forces"
    )

    @field_validator("stack", mode="before")
    @classmethod
    def _name_or_groups(cls, value: object) -> object:
        listed = isinstance(value, list) and all(isinstance(line, str) for line in value)
        if not (listed or (isinstance(value, str) and value)):
            raise ValueError(
                'must be "fitted", a stack CSV, or a list of shim groups such as ["3 x 24 x 0.15"]'
            )
        return tuple(value) if isinstance(value, list) else value


class FitRequest(Part):
    """A damper, the numbers to fit and the runs to fit them to."""

    damper: str = Field(min_length=1, description="a bundled name or a damper TOML")
    free: tuple[str, ...] | None = Field(
        default=None, description="numbers to fit; left out: those the runs can tell"
    )
    gas_offset_n: Number | None = Field(
        default=None,
        ge=-20000,
        le=20000,
        description="steady force in the runs where it is known; 0: taken off at the dyno",
    )
    runs: tuple[RunRequest, ...] = Field(min_length=1, description="one table [[runs]] a run")

    @field_validator("free")
    @classmethod
    def _calibratable(cls, names: tuple[str, ...] | None) -> tuple[str, ...] | None:
        if names is None:
            return None
        faults = []
        if not names:
            faults.append("is empty; allowed: one name or more, or leave it out")
        for name in names:
            key = named_directions(name)[0]
            if key not in KEYS:
                faults.append(
                    f'"{name}" is not known{nearest(key, KEYS)}; allowed: {", ".join(KEYS)}, also '
                    'with "compression." or "rebound." in front of a valve\'s'
                )
        if len(set(names)) < len(names):
            faults.append("names one number twice; allowed: once")
        if faults:
            raise ValueError("\n".join(faults))
        return names
