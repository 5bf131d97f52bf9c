"""Calling the command line in this process, as tests do it."""

import json
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from typer.testing import CliRunner

from optimiser.cli.main import build_app


@dataclass(frozen=True)
class Called:
    """Exit code and what was printed."""

    code: int
    out: str
    err: str

    @property
    def document(self) -> Any:
        """The JSON document on stdout; NaN and infinities are not JSON."""

        def refuse(word: str) -> None:
            raise AssertionError(f"{word} is not JSON")

        return json.loads(self.out, parse_constant=refuse)


def call(*arguments: str, env: dict[str, str] | None = None) -> Called:
    """Run ``shimwright`` with arguments; a bug (any exception but an exit) is raised again."""
    result = CliRunner().invoke(build_app(), list(arguments), env=env)
    if result.exception is not None and not isinstance(result.exception, SystemExit):
        raise result.exception
    return Called(result.exit_code, result.stdout, result.stderr)


def lines_wider_than(text: str, width: int) -> Sequence[str]:
    """Lines that would wrap."""
    return [line for line in text.splitlines() if len(line.rstrip()) > width]
