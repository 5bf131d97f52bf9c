"""Sentences laid out for the terminal's width."""

from collections.abc import Iterable
from textwrap import wrap

from rich.text import Text

from optimiser.report.look import Look


def paragraph(text: str, look: Look, style: str = "") -> Iterable[Text]:
    """Lines of a sentence, the further ones indented."""
    for line in wrap(text, look.console.width - 1, subsequent_indent="  "):
        yield Text(line, style=style)
