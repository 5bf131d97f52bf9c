"""Where tasks run: in this process, in processes of this machine, or on a Dask scheduler."""

import signal
from collections.abc import Callable, Iterator
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from contextlib import contextmanager
from importlib import import_module
from multiprocessing import get_context
from typing import Any, TypeVar

from optimiser.faults import BadInput

T = TypeVar("T")
_SECONDS_TO_CONNECT = 10
_TRIES = 3


class Here(Executor):
    """Runs every task at once in this process: one worker without starting another process."""

    def submit(self, fn: Callable[..., T], /, *args: Any, **kwargs: Any) -> "Future[T]":
        """The finished future of a call; what the call raises comes out of its ``result()``."""
        future: Future[T] = Future()
        try:
            future.set_result(fn(*args, **kwargs))
        except Exception as error:
            future.set_exception(error)
        return future


@contextmanager
def local(workers: int) -> Iterator[Executor]:
    """An executor of this machine; when left early, what has not begun is called off."""
    if workers <= 1:
        yield Here()
        return
    pool = ProcessPoolExecutor(workers, get_context("spawn"), _leave_interrupts_to_the_parent)
    try:
        yield pool
    except BaseException:
        pool.shutdown(wait=False, cancel_futures=True)
        raise
    pool.shutdown()


@contextmanager
def scheduler(address: str) -> Iterator[Executor]:
    """An executor on a Dask scheduler, such as ``tcp://host:8786``.

    Tasks of a worker that is lost run again on another. Raises BadInput when Dask is not
    installed or nothing answers at the address.
    """
    try:
        distributed = import_module("distributed")
    except ModuleNotFoundError:
        raise BadInput(
            "--scheduler needs Dask, which is not installed; install shimwright[cluster]"
        ) from None
    try:
        client = distributed.Client(address, timeout=_SECONDS_TO_CONNECT, set_as_default=False)
    except (OSError, ValueError) as error:
        raise BadInput(
            f"--scheduler {address}: no scheduler answers there ({type(error).__name__}); allowed: "
            "the address of a running one, such as tcp://host:8786"
        ) from None
    with client:
        yield client.get_executor(pure=False, retries=_TRIES)


def _leave_interrupts_to_the_parent() -> None:
    """Ctrl-C reaches every process of a terminal; only the parent answers it."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
