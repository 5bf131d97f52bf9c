"""Tasks that cost nothing, for the tests of the runner; workers import them from here."""

import os
from dataclasses import dataclass
from pathlib import Path

from optimiser.tuning.tasks import Result, fingerprint_of

from .builders import candidate, stack_of


@dataclass(frozen=True)
class Count:
    """Finds a stack with ``number`` shims more."""

    number: int

    @property
    def key(self) -> str:
        return fingerprint_of("count", self.number)

    def run(self) -> Result:
        return Result((candidate(stack_of([self.number, 0, 0, 0, 0])),), evaluations=self.number)


@dataclass(frozen=True)
class DieOnce:
    """Ends the worker's process the first time it is tried; ``mark`` is the file it leaves."""

    mark: str

    @property
    def key(self) -> str:
        return fingerprint_of("die once", self.mark)

    def run(self) -> Result:
        path = Path(self.mark)
        if not path.exists():
            path.write_text("tried", encoding="utf-8")
            os._exit(9)
        return Result((candidate(stack_of([1, 0, 0, 0, 0])),), evaluations=1)


@dataclass(frozen=True)
class Fails:
    """A bug."""

    @property
    def key(self) -> str:
        return fingerprint_of("fails")

    def run(self) -> Result:
        raise ZeroDivisionError("a bug")
