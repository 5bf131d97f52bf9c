"""Options that several commands share: one name, one meaning, one help text."""

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer


class CircuitChoice(StrEnum):
    """Which direction of travel."""

    compression = "compression"
    rebound = "rebound"
    both = "both"


DEFAULT_DAMPER = "rear-monotube"

DamperOption = Annotated[
    str,
    typer.Option("--damper", metavar="NAME|FILE", help="Damper: a bundled name or a TOML file."),
]
SteelOption = Annotated[
    str | None,
    typer.Option(
        "--steel", metavar="NAME|FILE", help="Shim steel, instead of the one the damper names."
    ),
]
OilOption = Annotated[
    str | None,
    typer.Option("--oil", metavar="NAME|FILE", help="Oil, instead of the one the damper names."),
]
OilTempOption = Annotated[
    float | None,
    typer.Option(
        "--oil-temp-c", metavar="T", help="Oil temperature, C, instead of the damper's own."
    ),
]
ClicksOption = Annotated[
    int | None,
    typer.Option("--clicks", metavar="N", help="Needle position, clicks out from closed."),
]
VelocitiesOption = Annotated[
    str | None,
    typer.Option(
        "--velocities", metavar="V,V,...", help="Shaft velocities, m/s, such as 0.05,0.1,0.2."
    ),
]
SeedOption = Annotated[
    int,
    typer.Option(
        "--seed", metavar="N", help="Start of the random numbers: same seed, same answer."
    ),
]
ChartOption = Annotated[
    Path | None,
    typer.Option("--chart", metavar="FILE", help="Also draw a chart: FILE.svg, .png or .pdf."),
]
JsonOption = Annotated[
    bool, typer.Option("--json", help="Print one JSON document on stdout and nothing else there.")
]
QuietOption = Annotated[
    bool, typer.Option("--quiet", help="Only the results: no notes, small chart or cautions.")
]
