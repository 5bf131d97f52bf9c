"""What holds for every command: help, documentation, light imports, exit codes."""

import subprocess
import sys
from pathlib import Path

import pytest

from optimiser.cli import inputs, main
from optimiser.cli.main import COMMANDS
from optimiser.faults import BadInput, NothingBuildable
from tests.cli.calling import call, lines_wider_than

REPOSITORY = Path(__file__).resolve().parents[2]
#: Packages that take long to import (pydantic is not one of them: typer itself may use it).
HEAVY = {"numpy", "scipy", "numba", "pymoo", "matplotlib", "jinja2"}


def test_top_help_names_every_command() -> None:
    called = call("--help")
    assert called.code == 0
    for name in COMMANDS:
        assert f"\n  {name} " in called.out


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help_for_every_option(name: str) -> None:
    called = call(name, "--help")
    assert called.code == 0
    assert not lines_wider_than(called.out, 80)
    options = called.out.split("Options:")[1].splitlines()
    starts = [i for i, line in enumerate(options) if line.startswith("  -")]
    for start, end in zip(starts, [*starts[1:], len(options)], strict=True):
        words = " ".join(options[start:end]).split("  ")
        assert len([word for word in words if word.strip()]) >= 2, options[start]


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_takes_json_and_quiet(name: str) -> None:
    text = call(name, "--help").out
    assert "--json" in text
    assert "--quiet" in text


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_is_documented(name: str) -> None:
    assert f"shimwright {name}" in (REPOSITORY / "README.md").read_text(encoding="utf-8")


def test_no_command_lists_the_commands() -> None:
    called = call()
    assert "Commands:" in called.out + called.err


@pytest.mark.parametrize("arguments", [["--help"], *([name, "--help"] for name in COMMANDS)])
def test_help_imports_nothing_heavy(arguments: list[str]) -> None:
    program = (
        "import sys\n"
        "from optimiser.cli.main import build_app\n"
        f"try:\n    build_app()({arguments!r})\n"
        "except SystemExit:\n    pass\n"
        "print('MODULES', *sys.modules)"
    )
    ran = subprocess.run(
        [sys.executable, "-c", program], cwd=REPOSITORY, capture_output=True, text=True, check=True
    )
    modules = set(ran.stdout.rsplit("MODULES", 1)[1].split())
    assert "optimiser.cli.main" in modules
    assert modules & HEAVY == set()


def test_unknown_command_and_option_exit_2() -> None:
    for arguments in (["curves"], ["curve", "--chrat", "x.svg"], ["curve", "--clicks", "many"]):
        called = call(*arguments)
        assert called.code == 2
        assert called.out == ""
        assert "Error:" in called.err


@pytest.mark.parametrize(
    ("error", "code", "text"),
    [
        (BadInput(["first fault", "second fault"]), 2, "first fault\nsecond fault\n"),
        (NothingBuildable("no shim covers the seat"), 1, "no shim covers the seat\n"),
        (KeyboardInterrupt(), 130, "stopped\n"),
    ],
)
def test_errors_become_sentences_and_exit_codes(
    error: BaseException, code: int, text: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*_arguments: object) -> None:
        raise error

    monkeypatch.setattr(inputs, "read_given", fail)
    called = call("curve")
    assert (called.code, called.out, called.err) == (code, "", text)


def test_a_bug_keeps_its_traceback(monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*_arguments: object) -> None:
        raise ZeroDivisionError("a bug")

    monkeypatch.setattr(inputs, "read_given", fail)
    with pytest.raises(ZeroDivisionError, match="a bug"):
        call("curve")


def test_run_answers_on_a_stream_that_shows_few_characters(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(sys, "argv", ["shimwright", "curve", "--damper", "größe"])
    with pytest.raises(SystemExit) as left:
        main.run()
    assert left.value.code == 2
