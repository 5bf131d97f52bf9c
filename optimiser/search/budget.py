"""How long a search may go on, and what it tells while it does."""

from collections.abc import Callable
from dataclasses import dataclass
from time import perf_counter
from typing import Literal

from optimiser.search.archive import Archive

Stage = Literal["counting", "every stack", "generations", "polish"]


@dataclass(frozen=True)
class Progress:
    """A report between two batches; ``share`` (0..1) is the part of the evaluations spent.

    ``best_error`` is the lowest error (a fraction) so far within the model's range, infinite
    while there is none; ``seconds`` since the start.
    """

    stage: Stage
    generation: int
    evaluations: int
    best_error: float
    share: float
    seconds: float


ProgressCall = Callable[[Progress], None]
StopCall = Callable[[], bool]


class Budget:
    """Counts evaluations against a limit, looks at the stop flag and reports progress."""

    def __init__(
        self, archive: Archive, evaluations: int, progress: ProgressCall, stop: StopCall
    ) -> None:
        self.archive = archive
        self.evaluations = evaluations
        self.generation = 0
        self.cut_short = False
        self._progress = progress
        self._stop = stop
        self._start = perf_counter()

    @property
    def seconds(self) -> float:
        """Time since the start, s."""
        return perf_counter() - self._start

    @property
    def left(self) -> int:
        """Evaluations that may still be spent."""
        return max(self.evaluations - len(self.archive), 0)

    def goes_on(self) -> bool:
        """False once the evaluations are spent or the user stopped the search."""
        if not self.cut_short and self._stop():
            self.cut_short = True
        return self.left > 0 and not self.cut_short

    def report(self, stage: Stage) -> None:
        """Tell the caller where the search is."""
        archive = self.archive
        self._progress(
            Progress(
                stage,
                self.generation,
                len(archive),
                archive.best_error,
                min(len(archive) / max(self.evaluations, 1), 1.0),
                self.seconds,
            )
        )
