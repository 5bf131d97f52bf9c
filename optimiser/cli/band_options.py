"""``--bands`` and what goes with it, for the commands that predict."""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from optimiser.cli.notes import is_compiled, note
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from optimiser.cli.inputs import Given

MOST_SEED = 2**32 - 1
PREPARING = "preparing the bands: this happens once and takes about ten seconds ..."

BandsOption = Annotated[
    bool,
    typer.Option(
        "--bands",
        help="Also the 5 to 95 % band of every force: errors of the damper's numbers (from the "
        ".fit.json beside its file, see fit), of shim thickness, clicks and oil temperature.",
    ),
]
WithinOption = Annotated[
    float | None,
    typer.Option(
        "--within",
        metavar="PERCENT",
        help="With --bands: list the chance that the real error, r.m.s., is at most this; 5 by "
        "default.",
    ),
]


def check_seed(seed: int, bands: bool) -> None:
    """Raise BadInput for a seed that is out of range, or that nothing would be drawn from."""
    if not 0 <= seed <= MOST_SEED:
        raise BadInput(f"--seed is {seed}; allowed: 0 to {MOST_SEED}")
    if seed and not bands:
        raise BadInput(f"--seed is {seed}, but nothing is drawn; allowed: beside --bands")


def record_for(given: "Given", damper: str) -> Path | None:
    """The fit's record beside the damper's file, noted among the inputs; None without one."""
    from optimiser.cli.inputs import InputFile
    from optimiser.files import fingerprint
    from optimiser.fit_records import record_beside

    record = record_beside(damper)
    if record is not None:
        given.files.append(InputFile("fit record", str(record), fingerprint(record)))
    return record


def note_when_preparing_bands(quiet: bool = False) -> None:
    """Say so when the bands' kernel will be compiled first, once per installation."""
    from optimiser.fitting import bands

    if not is_compiled(bands, "sample_drops"):
        note(PREPARING, quiet)
