"""The program ``shimwright``: gathers the commands and turns bad input into exit codes.

A command is one file of this folder that holds a function of the file's name, and one line in
:data:`COMMANDS`. Command files import nothing heavy at their top, so that ``--help`` is quick.
"""

import sys
from collections.abc import Callable
from functools import wraps
from importlib import import_module
from typing import Annotated, ParamSpec

import typer

from optimiser.faults import BadInput, NothingBuildable

P = ParamSpec("P")

#: Every command, in the order of the help page.
COMMANDS = ("init", "curve", "find", "sheet", "target", "table", "fit", "stock")

EXIT_NOTHING_BUILDABLE = 1
EXIT_BAD_INPUT = 2
EXIT_INTERRUPTED = 130


def guarded(command: Callable[P, None]) -> Callable[P, None]:
    """The one place where errors of input become sentences on stderr and an exit code.

    Any other exception is a bug and keeps its traceback.
    """

    @wraps(command)
    def with_exit_codes(*args: P.args, **kwargs: P.kwargs) -> None:
        try:
            command(*args, **kwargs)
        except BadInput as error:
            _leave(error.faults, EXIT_BAD_INPUT)
        except NothingBuildable as error:
            _leave([str(error)], EXIT_NOTHING_BUILDABLE)
        except KeyboardInterrupt:
            _leave(["stopped"], EXIT_INTERRUPTED)

    return with_exit_codes


def _leave(sentences: list[str], code: int) -> None:
    for sentence in sentences:
        typer.echo(sentence, err=True)
    raise typer.Exit(code) from None


def _show_version(wanted: bool) -> None:
    if wanted:
        from importlib.metadata import version

        typer.echo(f"shimwright {version('shimwright')}")
        raise typer.Exit


def _top(
    version: Annotated[
        bool,
        typer.Option("--version", is_eager=True, callback=_show_version, help="Print the version."),
    ] = False,
) -> None:
    """From a wanted damping curve and a drawer of shims to stacks that can be built."""


def build_app() -> typer.Typer:
    """The whole command line."""
    app = typer.Typer(
        name="shimwright",
        add_completion=False,
        no_args_is_help=True,
        pretty_exceptions_enable=False,
        rich_markup_mode=None,
        context_settings={"help_option_names": ["-h", "--help"]},
    )
    app.callback()(_top)
    for name in COMMANDS:
        module = import_module(f"optimiser.cli.{name}")
        app.command(name)(guarded(getattr(module, name)))
    return app


def run() -> None:
    """Entry point of the installed command."""
    for stream in (sys.stdout, sys.stderr):
        reconfigure = getattr(stream, "reconfigure", None)
        if reconfigure is not None:
            reconfigure(errors="replace")
    build_app()(prog_name="shimwright")
