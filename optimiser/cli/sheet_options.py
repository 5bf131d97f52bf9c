"""``--sheet`` of other commands, and what they share with ``sheet``: checking and writing."""

from collections.abc import Iterator, Sequence
from pathlib import Path
from shlex import quote
from typing import TYPE_CHECKING, Annotated, Any

import typer

from optimiser.faults import BadInput

if TYPE_CHECKING:
    from optimiser.report.sheet import Sheet

SheetOption = Annotated[
    Path | None,
    typer.Option(
        "--sheet", metavar="FILE.html", help="Also write bench sheets to print: a page a stack."
    ),
]
_ENDINGS = (".html", ".htm")
#: Options that say where output goes, not what it is made from.
_OUTPUT = {"out", "sheet", "chart", "json", "quiet"}


def check_page_path(path: Path, option: str) -> None:
    """Raise BadInput unless a page can go there by its name."""
    if path.suffix.lower() not in _ENDINGS:
        raise BadInput(
            f"{option}: '{path}' ends in '{path.suffix or 'nothing'}'; allowed: .html or .htm"
        )


def write_page(path: Path, sheets: "Sequence[Sheet]") -> None:
    """Write the page whole or not at all. Raises BadInput."""
    from optimiser.files import atomic_write_text
    from optimiser.report.sheet_page import sheet_html

    atomic_write_text(path, sheet_html(sheets))


def command_of(context: typer.Context) -> str:
    """The command as it was given, without where its output goes, to make the result again."""
    words = ["shimwright", context.info_name or ""]
    for parameter in context.command.params:
        name = parameter.name or ""
        source = context.get_parameter_source(name)
        if name not in _OUTPUT and source is not None and source.name == "COMMANDLINE":
            option = "" if parameter.param_type_name == "argument" else parameter.opts[0]
            words += _said(option, context.params[name])
    return " ".join(words)


def _said(option: str, value: Any) -> Iterator[str]:
    if isinstance(value, list | tuple):
        for one in value:
            yield from _said(option, one)
        return
    if option:
        yield option
    if value is not True:
        yield quote(str(value))
