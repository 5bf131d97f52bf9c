"""The one error a user's input may raise: every fault of a file in one go."""

from collections.abc import Iterable


class BadInput(ValueError):
    """Input that cannot be used; carries one plain sentence a fault.

    ``str(error)`` joins the sentences by newlines. The command line prints
    each on a line of its own and exits with code 2; every other exception is a bug
    and keeps its traceback.
    """

    def __init__(self, faults: Iterable[str] | str) -> None:
        self.faults = [faults] if isinstance(faults, str) else list(faults)
        super().__init__("\n".join(self.faults))


class NothingBuildable(RuntimeError):
    """No stack can be built under the given rules (exit code 1); says which rule stops it."""
