"""What a long search shows on a terminal, and what Ctrl-C does to it."""

import os
import signal
import threading
from collections.abc import Callable
from time import perf_counter
from types import FrameType, TracebackType
from typing import Self

from rich.console import Console
from rich.live import Live
from rich.text import Text

from optimiser.cli.notes import is_compiled, note
from optimiser.search.budget import Progress

PREPARING = "preparing the search: this happens once and takes about a minute ..."
STOPPING = "stopping; the best so far follows (Ctrl-C again leaves at once)"
#: Seconds between two changes of the line.
_BETWEEN = 0.2
_STDERR = 2


def note_when_preparing(quiet: bool = False) -> None:
    """Say so when the search's solver will be compiled first, once per installation."""
    from optimiser.search import evaluate

    if not is_compiled(evaluate, "score"):
        note(PREPARING, quiet)


class Interrupts:
    """While it is entered, the first Ctrl-C asks the search to end, the second one leaves.

    The search ends only once it has tried something, so that there is a best so far.
    """

    def __init__(self) -> None:
        self.asked = False
        self.heeded = False
        self.announce: Callable[[], None] = _silently
        self._tried = 0
        self._before: object = None

    def __enter__(self) -> Self:
        if threading.current_thread() is threading.main_thread():
            self._before = signal.signal(signal.SIGINT, self._first)
        return self

    def __exit__(self, *_error: object) -> None:
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)  # type: ignore[arg-type]  # as it was given

    def _first(self, _number: int, _frame: FrameType | None) -> None:
        self.asked = True
        signal.signal(signal.SIGINT, signal.default_int_handler)
        self.announce()

    def saw(self, told: Progress) -> None:
        """Take note of how many stacks were tried."""
        self._tried = told.evaluations

    def stop(self) -> bool:
        """Whether the search is to end now."""
        if self.asked and self._tried > 0:
            self.heeded = True
        return self.heeded and self._tried > 0


def _silently() -> None:
    """Say nothing."""


class ProgressLine:
    """One line on stderr that is kept up to date and gone at the end; nothing off a terminal.

    ``evaluations`` is about the most each search spends, for the time left.
    """

    def __init__(self, interrupts: Interrupts, evaluations: int, quiet: bool) -> None:
        self._interrupts = interrupts
        self._most = evaluations + evaluations // 5  # the local pass on top
        self._quiet = quiet
        self._clock = _Clock()
        self._shown = 0.0
        console = Console(stderr=True, markup=False, emoji=False, highlight=False)
        terminal = console.is_terminal and not console.is_dumb_terminal and not quiet
        self._live = Live("", console=console, auto_refresh=False, transient=True)
        self._on = terminal

    def __enter__(self) -> Self:
        if not self._quiet:
            self._interrupts.announce = self._say_stopping
        if self._on:
            self._live.start()
        return self

    def __exit__(
        self,
        _kind: type[BaseException] | None,
        _error: BaseException | None,
        _trace: TracebackType | None,
    ) -> None:
        if self._on:
            self._live.stop()

    def __call__(self, told: Progress) -> None:
        """Show where the search is."""
        self._interrupts.saw(told)
        self._clock.saw(told)
        now = perf_counter()
        if self._on and now - self._shown >= _BETWEEN:
            self._shown = now
            self._live.update(Text(progress_text(told, self._left(told))), refresh=True)

    def _say_stopping(self) -> None:
        """Written past Python's buffers: a signal may come while those are being written."""
        clear = "\r\x1b[2K" if self._on else ""
        os.write(_STDERR, f"{clear}{STOPPING}\n".encode())

    def _left(self, told: Progress) -> float | None:
        """Seconds left at most; not known for a space that is tried out whole."""
        if told.stage == "every stack":
            return None
        return self._clock.left(self._most)


class _Clock:
    """Time left by the pace since the first batch, which may have had to compile."""

    def __init__(self) -> None:
        self._first: tuple[float, int] | None = None
        self._last = (0.0, 0)

    def saw(self, told: Progress) -> None:
        if told.evaluations < self._last[1]:  # another search has begun
            self._first = None
        self._last = (perf_counter(), told.evaluations)
        if self._first is None and told.evaluations > 0:
            self._first = self._last

    def left(self, most: int) -> float | None:
        """Seconds for the rest of ``most`` evaluations, None while the pace is not known."""
        if self._first is None or self._last[1] <= self._first[1]:
            return None
        pace = (self._last[0] - self._first[0]) / (self._last[1] - self._first[1])
        return pace * max(most - self._last[1], 0)


def progress_text(told: Progress, left_s: float | None) -> str:
    """``generation 12, best error 2.41 %, 4800 stacks tried, up to 6 s left``."""
    stage = f"generation {told.generation}" if told.stage == "generations" else _STAGES[told.stage]
    parts = [stage]
    if told.best_error < float("inf"):
        parts.append(f"best error {100.0 * told.best_error:.2f} %")
    if told.evaluations:
        parts.append(f"{told.evaluations} stacks tried")
    if left_s is not None:
        parts.append(f"up to {max(left_s, 1.0):.0f} s left")
    return ", ".join(parts)


_STAGES = {
    "counting": "looking into the drawer",
    "every stack": "trying every stack",
    "polish": "polishing the best",
}
