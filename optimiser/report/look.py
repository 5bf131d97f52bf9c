"""How to print: colour, frame and drawing characters that the terminal can show."""

import os
import sys
from dataclasses import dataclass
from typing import IO

from rich.box import Box
from rich.console import Console

#: Narrowest terminal everything is laid out for.
LEAST_WIDTH = 80

_LINE_UNDER_HEAD = Box("    \n    \n ── \n    \n    \n    \n    \n    \n")
_ASCII_LINE_UNDER_HEAD = Box("    \n    \n -- \n    \n    \n    \n    \n    \n", ascii=True)


@dataclass(frozen=True)
class Look:
    """A console with the characters it can show; ``unicode`` False: plain ASCII only."""

    console: Console
    unicode: bool

    @property
    def frame(self) -> Box:
        """Lines of a table: one below its head."""
        return _LINE_UNDER_HEAD if self.unicode else _ASCII_LINE_UNDER_HEAD


def look_of(file: IO[str] | None = None) -> Look:
    """A look for ``file`` (stdout): no colour with NO_COLOR, ASCII where TERM is dumb or no UTF.

    Tables are laid out for 80 columns and never wrapped; a narrower terminal breaks their lines.
    """
    target = sys.stdout if file is None else file
    console = Console(file=target, markup=False, emoji=False, highlight=False, soft_wrap=False)
    console.width = min(max(console.width, LEAST_WIDTH), 100)
    encoding = (getattr(target, "encoding", None) or "utf-8").lower()
    dumb = os.environ.get("TERM", "") == "dumb"
    return Look(console, encoding.startswith("utf") and not dumb)
