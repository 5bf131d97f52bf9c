"""The note before the solver is compiled for the first time."""

import os
from pathlib import Path
from types import ModuleType

import pytest

from optimiser.cli import notes


class _Kernel:
    def __init__(self, module: str, cache: Path) -> None:
        def py_func() -> None:
            """A function as a compiled kernel keeps it."""

        py_func.__module__ = module
        self.py_func = py_func
        self.stats = type("Stats", (), {"cache_path": str(cache)})()


@pytest.fixture
def module(tmp_path: Path) -> ModuleType:
    """A module with one kernel whose cache folder is empty."""
    made = ModuleType("optimiser.made_up")
    made.__file__ = str(tmp_path / "made_up.py")
    Path(made.__file__).write_text("", encoding="utf-8")
    made.solve = _Kernel(made.__name__, tmp_path)  # type: ignore[attr-defined]  # set on the fly
    return made


def test_nothing_compiled_has_no_age(module: ModuleType) -> None:
    assert notes._ages(module) == []


@pytest.mark.parametrize(("seconds", "fresh"), [(10.0, True), (-10.0, False)])
def test_age_of_a_compiled_kernel(module: ModuleType, seconds: float, fresh: bool) -> None:
    source = Path(str(module.__file__))
    compiled = source.with_name("made_up.solve-1.py311.nbi")
    compiled.write_bytes(b"")
    then = source.stat().st_mtime + seconds
    os.utime(compiled, (then, then))
    ages = notes._ages(module)
    assert len(ages) == 1
    assert (ages[0] >= 0.0) is fresh


def test_note_goes_to_stderr_unless_quiet(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(notes, "solver_is_prepared", lambda: False)
    notes.note_when_preparing(quiet=True)
    assert capsys.readouterr() == ("", "")
    notes.note_when_preparing()
    assert capsys.readouterr() == ("", notes.PREPARING + "\n")
