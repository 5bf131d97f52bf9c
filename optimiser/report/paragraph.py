"""Sentences laid out for the terminal's width."""

from collections.abc import Iterable
from textwrap import wrap

from rich.text import Text

from optimiser.report.look import Look

_HELD = "\u00a0"


def paragraph(text: str, look: Look, style: str = "") -> Iterable[Text]:
    """Lines of a sentence, the further ones indented; names and what ``kept`` holds stay whole."""
    width = look.console.width - 1
    for line in wrap(text, width, subsequent_indent="  ", break_on_hyphens=False):
        yield Text(line.replace(_HELD, " "), style=style)


def kept(text: str) -> str:
    """Text that no line break goes through."""
    return text.replace(" ", _HELD)
