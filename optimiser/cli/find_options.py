"""Options of ``find`` that no other command has."""

from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from optimiser.cli.options import CircuitChoice

DEFAULT_EVALUATIONS = 30_000
MOST_USUAL_WORKERS = 4


class StageChoice(StrEnum):
    """How many stages a stack may have."""

    one = "1"
    two = "2"
    both = "both"


class Rank(StrEnum):
    """By what the list is sorted."""

    default = "default"
    error = "error"
    parts = "parts"
    stress = "stress"
    chance = "chance"


SearchedCircuitOption = Annotated[
    CircuitChoice | None,
    typer.Option(
        "--circuit",
        help="Direction; compression unless files for both are given. Both: from one drawer.",
    ),
]
RevalveOption = Annotated[
    bool,
    typer.Option(
        "--revalve",
        help="Start from the stack fitted now: its shims count as available, and few changes are "
        "preferred. --fitted does the same.",
    ),
]
FixedClicksOption = Annotated[
    int | None,
    typer.Option("--clicks", metavar="N", help="Fix the adjuster at N clicks out from closed."),
]
ClickRangeOption = Annotated[
    str | None,
    typer.Option(
        "--click-range",
        metavar="A-B",
        help="Clicks the adjuster may be at; the middle half of its range by default.",
    ),
]
TakenAtOption = Annotated[
    int | None,
    typer.Option(
        "--fitted-clicks",
        metavar="N",
        help="Clicks at which the fitted stack is taken for --low, --mid, --high and --knee.",
    ),
]
PartsOption = Annotated[
    int, typer.Option("--parts", metavar="N", help="Most shims, clamp shims included.")
]
HeightMaxOption = Annotated[
    float | None,
    typer.Option("--height-max-mm", metavar="MM", help="Highest stack, instead of the damper's."),
]
HeightMinOption = Annotated[
    float | None,
    typer.Option("--height-min-mm", metavar="MM", help="Lowest stack, instead of the damper's."),
]
FaceMinOption = Annotated[
    int,
    typer.Option("--face-min", metavar="N", help="Fewest shims of the face shim's diameter."),
]
StagesOption = Annotated[
    StageChoice,
    typer.Option("--stages", help="One stage, two with a crossover shim between them, or both."),
]
RankByOption = Annotated[
    Rank,
    typer.Option(
        "--rank-by",
        help="What comes first; the rule is said under the table. chance: to be --within, "
        "which draws --bands.",
    ),
]
RowsOption = Annotated[int, typer.Option("--rows", metavar="N", help="Most stacks in the list.")]
WorkersOption = Annotated[
    int | None,
    typer.Option(
        "--workers", metavar="N", help="Processor cores to use; all, but at most 4, by default."
    ),
]
EvaluationsOption = Annotated[
    int,
    typer.Option("--evaluations", metavar="N", help="About how many stacks are tried at most."),
]
OutFolderOption = Annotated[
    Path | None,
    typer.Option(
        "--out",
        metavar="DIR",
        help="Save result.json, stacks.csv, a stack file to use with curve, and a chart.",
    ),
]
AgainOption = Annotated[
    Path | None,
    typer.Option(
        "--again", metavar="FILE", help="Repeat the search saved in a result.json, inputs and all."
    ),
]
