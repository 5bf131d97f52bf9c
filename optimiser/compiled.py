"""One typed door to numba, so that kernels keep their signatures under the type checker."""

from collections.abc import Callable
from typing import ParamSpec, TypeVar

import numba

P = ParamSpec("P")
R = TypeVar("R")


def kernel(function: Callable[P, R]) -> Callable[P, R]:
    """Compile a function to machine code at first call and keep it on disk.

    No fast-math: results must not depend on the machine's instruction set.
    """
    compiled: Callable[P, R] = numba.njit(cache=True, fastmath=False, nogil=True)(function)
    return compiled

