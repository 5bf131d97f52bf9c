"""What a long search shows, and what Ctrl-C does to it."""

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from optimiser.cli.progress import STOPPING, Interrupts, ProgressLine, progress_text
from optimiser.search.budget import Progress

REPOSITORY = Path(__file__).resolve().parents[2]
PROGRAM = "from optimiser.cli.main import run; run()"
#: Far more than is ever spent here: the search does not end by itself while it is watched.
LONG = ("find", "--evaluations", "50000000", "--stock", "workshop", "--workers", "2")
PATIENCE_S = 240.0


class Watched:
    """The program in a process of its own, its stderr on a terminal."""

    def __init__(self, *arguments: str) -> None:
        pty = pytest.importorskip("pty", reason="this system has no pseudo-terminals")
        self._terminal, other = pty.openpty()
        self.process = subprocess.Popen(
            [sys.executable, "-c", PROGRAM, *arguments],
            cwd=REPOSITORY,
            stdout=subprocess.PIPE,
            stderr=other,
            env={**os.environ, "TERM": "xterm", "COLUMNS": "80"},
        )
        os.close(other)
        self.shown = ""

    def wait_for(self, words: str) -> None:
        """Read the terminal until it shows ``words``."""
        end = time.monotonic() + PATIENCE_S
        while words not in self.shown:
            assert time.monotonic() < end, self.shown[-500:]
            assert self._read(), f"ended before '{words}': {self.shown[-500:]}"

    def interrupt(self) -> None:
        """What Ctrl-C sends."""
        self.process.send_signal(signal.SIGINT)

    def end(self) -> tuple[int, str]:
        """Exit code and stdout."""
        out, _ = self.process.communicate(timeout=PATIENCE_S)
        while self._read():
            pass
        os.close(self._terminal)
        return self.process.returncode, out.decode("utf-8")

    def _read(self) -> bool:
        try:
            read = os.read(self._terminal, 4096)
        except OSError:  # the other end is closed
            return False
        self.shown += read.decode("utf-8", errors="replace")
        return bool(read)


def test_ctrl_c_ends_the_search_and_shows_the_best_so_far() -> None:
    watched = Watched(*LONG, "--rows", "2")
    watched.wait_for("stacks tried, up to")
    watched.interrupt()
    code, out = watched.end()
    assert code == 0
    assert out.startswith("cut short by Ctrl-C")
    assert "stack 1" in out
    assert "best error" in watched.shown
    assert "stopping; the best so far follows" in watched.shown
    assert watched.shown.rindex("\x1b[?25h") > watched.shown.rindex("\x1b[?25l")


def test_a_second_ctrl_c_leaves_at_once() -> None:
    watched = Watched(*LONG)
    watched.wait_for("stacks tried")
    watched.interrupt()
    watched.wait_for("stopping")
    watched.interrupt()
    code, out = watched.end()
    assert code == 130
    assert out == ""
    assert "Traceback" not in watched.shown
    assert watched.shown.rindex("\x1b[?25h") > watched.shown.rindex("\x1b[?25l")


def _told(tried: int, stage: str = "generations", best: float = 0.0234) -> Progress:
    return Progress(stage, 7, tried, best, 0.1, 1.0)  # type: ignore[arg-type]  # one of its words


def test_the_search_ends_only_when_there_is_a_best_so_far() -> None:
    with Interrupts() as interrupts:
        interrupts.saw(_told(0, "counting"))
        os.kill(os.getpid(), signal.SIGINT)
        assert interrupts.asked
        assert not interrupts.stop()
        interrupts.saw(_told(200))
        assert interrupts.stop()
        assert interrupts.heeded
        with pytest.raises(KeyboardInterrupt):
            os.kill(os.getpid(), signal.SIGINT)


def test_the_handler_is_put_back() -> None:
    before = signal.getsignal(signal.SIGINT)
    with Interrupts():
        assert signal.getsignal(signal.SIGINT) != before
    assert signal.getsignal(signal.SIGINT) == before


@pytest.mark.parametrize("quiet", [True, False])
def test_off_a_terminal_only_stopping_is_said(
    quiet: bool, capfd: pytest.CaptureFixture[str]
) -> None:
    with Interrupts() as interrupts, ProgressLine(interrupts, 1000, quiet) as line:
        line(_told(200))
        os.kill(os.getpid(), signal.SIGINT)
        line(_told(400))
        line(_told(600))
    assert capfd.readouterr().err == ("" if quiet else f"{STOPPING}\n")


def test_progress_in_words() -> None:
    assert progress_text(_told(800), 4.4) == (
        "generation 7, best error 2.34 %, 800 stacks tried, up to 4 s left"
    )
    assert progress_text(_told(0, "counting", float("inf")), None) == "looking into the drawer"
    assert progress_text(_told(9, "polish", float("inf")), 0.2) == (
        "polishing the best, 9 stacks tried, up to 1 s left"
    )
