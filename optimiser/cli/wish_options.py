"""Options that say what is wanted, shared by ``target`` and ``find``, and stock options."""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from optimiser.cli.options import CircuitChoice
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from collections.abc import Sequence

    from optimiser.cli.inputs import Given
    from optimiser.damper import Direction
    from optimiser.prediction import Setup
    from optimiser.stack import Stack
    from optimiser.wanted.said import Said
    from optimiser.wish import Wished

DEFAULT_STOCK = "workshop"
#: The word for the stack in the damper file.
FITTED = "fitted"

TargetOption = Annotated[
    list[str] | None,
    typer.Option(
        "--target",
        metavar="NAME|FILE",
        help="Wanted curve: a CSV of points. For both directions give it twice, compression first.",
    ),
]
CopyOption = Annotated[
    list[str] | None,
    typer.Option(
        "--copy",
        metavar="FILE",
        help="Copy a measured damper: a CSV of its velocities and forces, in any order.",
    ),
]
CopyStaticOption = Annotated[
    float | None,
    typer.Option(
        "--copy-static-n",
        metavar="N",
        help="Gas and friction force, N, to take off the forces of --copy.",
    ),
]
FittedOption = Annotated[
    list[str] | None,
    typer.Option(
        "--fitted",
        metavar="NAME|FILE",
        help="Stack CSV of what is fitted now, instead of the damper's own; per direction like "
        "--target. The word fitted is the damper's own.",
    ),
]
LowOption = Annotated[
    float | None,
    typer.Option(
        "--low", metavar="PERCENT", help="Change of the fitted force at low speed, such as 10."
    ),
]
MidOption = Annotated[
    float | None, typer.Option("--mid", metavar="PERCENT", help="The same at mid speed.")
]
HighOption = Annotated[
    float | None, typer.Option("--high", metavar="PERCENT", help="The same at high speed.")
]
KneeOption = Annotated[
    float | None,
    typer.Option(
        "--knee", metavar="PERCENT", help="Open later (above 0) or earlier: change of knee speed."
    ),
]
FittedClicksOption = Annotated[
    int | None,
    typer.Option(
        "--clicks", metavar="N", help="Clicks out from closed at which the fitted stack is taken."
    ),
]
RiderKgOption = Annotated[
    float | None,
    typer.Option("--rider-kg", metavar="KG", help="Mass of the rider with kit, kg."),
]
RiderOption = Annotated[
    str | None,
    typer.Option("--rider", metavar="NAME|FILE", help="Rider TOML, instead of --rider-kg."),
]
FrameOption = Annotated[
    str | None,
    typer.Option("--frame", metavar="NAME|FILE", help="Frame TOML: travel, leverage, spring."),
]
FeelOption = Annotated[
    str | None,
    typer.Option("--feel", metavar="NAME|FILE", help="Feel TOML: damping ratios, knee speed."),
]
SagOption = Annotated[
    float | None,
    typer.Option("--sag", metavar="PERCENT", help="Sag with rider, instead of the frame's usual."),
]
ResampleOption = Annotated[
    int | None,
    typer.Option("--resample", metavar="N", help="Give the target N points, even in log velocity."),
]
WantedCircuitOption = Annotated[
    CircuitChoice | None,
    typer.Option(
        "--circuit", help="Direction; both unless a single --target, --copy or --fitted is given."
    ),
]
StockOption = Annotated[
    str,
    typer.Option("--stock", metavar="NAME|FILE", help="Stock list: a bundled name or a CSV file."),
]
OutFileOption = Annotated[
    Path | None,
    typer.Option(
        "--out",
        metavar="FILE.csv",
        help="Save as target CSV; for both directions FILE-compression.csv and FILE-rebound.csv.",
    ),
]


def asked_directions(circuit: CircuitChoice | None) -> "list[Direction] | None":
    """Directions of ``--circuit``; None where it is not given."""
    if circuit is None:
        return None
    if circuit is CircuitChoice.both:
        return ["compression", "rebound"]
    return ["compression" if circuit is CircuitChoice.compression else "rebound"]


def wanted_from(
    said: "Said", given: "Given", circuit: CircuitChoice | None
) -> "tuple[list[Setup], Wished]":
    """Setups and what is wanted of each; the files are added to ``given``. Raises BadInput."""
    from optimiser.cli.inputs import check_clicks
    from optimiser.wanted.said import directions_of, way_of
    from optimiser.wish import wish

    way_of(said)
    directions = directions_of(said, asked_directions(circuit), given.directions())
    setups = [given.setup(direction) for direction in directions]
    check_clicks(setups, said.clicks)
    stacks = _fitted_stacks(said.fitted, setups, given)
    wished = wish(said, setups, stacks)
    for kind, name in wished.files:
        given.add_file(kind, name)
    return setups, wished


def _fitted_stacks(
    names: "Sequence[str]", setups: "list[Setup]", given: "Given"
) -> "dict[Direction, Stack]":
    from optimiser.cli.inputs import check_reaches, read_stack

    stacks: dict[Direction, Stack] = {}
    faults: list[str] = []
    for name, setup in zip(names, setups, strict=False):
        if name == FITTED:
            continue
        try:
            stack = read_stack(name)
            check_reaches(setup, stack, name)
        except BadInput as error:
            faults += error.faults
            continue
        stacks[setup.direction] = stack
        given.add_file("stack", name)
    if faults:
        raise BadInput(faults)
    return stacks
