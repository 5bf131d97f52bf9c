"""The README's examples run, and the output it shows is the program's."""

import re
import shlex
from pathlib import Path

import pytest

from tests.cli.calling import call

README = (Path(__file__).resolve().parents[2] / "README.md").read_text(encoding="utf-8")
#: Commands in indented blocks; names that begin with my- stand for the reader's own files.
EXAMPLES = re.findall(r"^    shimwright (.+)$", README, re.MULTILINE)
RUNNABLE = [example for example in EXAMPLES if "my-" not in example]
#: A command in backquotes, then the block of its output.
SHOWN = re.findall(r"`shimwright ([^`]+)`:\n\n```text\n(.*?)```", README, re.DOTALL)
#: What a search took, which differs from run to run.
TIMES = re.compile(r"^\d+ stacks tried, .*?Seed \d+\.$", re.MULTILINE | re.DOTALL)
NUMBER = re.compile(r"[-+]?\d+(?:\.\d+)?")


def test_there_are_examples_and_output() -> None:
    assert RUNNABLE
    assert SHOWN


@pytest.mark.parametrize("example", RUNNABLE)
def test_examples_run(example: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    called = call(*shlex.split(example))
    assert called.code == 0, called.err


@pytest.mark.parametrize("example", [example for example in EXAMPLES if "my-" in example])
def test_options_of_the_other_examples_exist(example: str) -> None:
    command, *words = shlex.split(example)
    text = call(command, "--help").out
    for option in (word for word in words if word.startswith("--")):
        assert f"{option} " in text


@pytest.mark.parametrize(("command", "shown"), SHOWN)
def test_shown_output_is_the_programs(
    command: str, shown: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Word for word; numbers within 2 %, so that a better solver does not make the page wrong."""
    monkeypatch.chdir(tmp_path)
    printed = call(*shlex.split(command)).out
    if command.startswith("find"):
        assert _frame(printed) == _frame(shown)
        return
    words = [NUMBER.sub("#", text).split() for text in (_text(shown), _text(printed))]
    assert words[0] == words[1]
    expected, found = ([float(n) for n in NUMBER.findall(_text(text))] for text in (shown, printed))
    assert found == pytest.approx(expected, rel=0.02, abs=0.02)


def _frame(output: str) -> list[str]:
    """The lines that do not depend on which stacks were found.

    A search takes another path where a processor rounds the last digit otherwise, and then ends at
    other stacks of about the same worth: those lines cannot be compared word for word.
    """
    kept = (line.rstrip() for line in output.splitlines())
    return sorted({line for line in kept if not re.search(r"[\d│|─▁-█]|^ *$|stack|more", line)})


def _text(output: str) -> str:
    """Output without the small chart, whose marks may jump by a line, and without times."""
    output = TIMES.sub("", output)
    return "\n".join(line for line in output.splitlines() if not re.search(r"[│|] *[●○]", line))
