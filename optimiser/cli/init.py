"""``shimwright init``: starter files to edit."""

from pathlib import Path
from shlex import quote
from typing import Annotated

import typer

from optimiser.cli.notes import print_document
from optimiser.cli.options import JsonOption, QuietOption


def init(
    folder: Annotated[
        Path, typer.Argument(metavar="DIR", help="Folder to write into; made where needed.")
    ],
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Write starter files into a folder: damper, stock, stack, targets, frame, feel and rider.

    Every line is commented. They work as they are; put your own numbers in. Nothing is overwritten.
    """
    from optimiser.starter import write_starter

    written = write_starter(folder)
    if json:
        print_document({"folder": str(folder), "files": [str(path) for path in written]})
        return
    typer.echo(f"written to {folder}:")
    for path in written:
        typer.echo(f"  {path.name}")
    if not quiet:
        place = {name: quote(str(folder / name)) for name in ("damper.toml", "stack.csv")}
        typer.echo(
            "Put your own numbers in: every line says what it is and how to measure it. Then:"
        )
        typer.echo(
            f"  shimwright curve --damper {place['damper.toml']} --stack {place['stack.csv']}"
        )
