"""One typed door to numba, so that kernels keep their signatures under the type checker.

No fast-math: results must not depend on the machine's instruction set. Divisions follow the
floating-point standard (no exceptions).
"""

from collections.abc import Callable
from typing import Any, ParamSpec, TypeVar

import numba

P = ParamSpec("P")
R = TypeVar("R")

_OPTIONS: dict[str, Any] = {
    "cache": True,
    "fastmath": False,
    "nogil": True,
    "error_model": "numpy",
}


def kernel(function: Callable[P, R]) -> Callable[P, R]:
    """Compile a function to machine code at first call and keep it on disk."""
    compiled: Callable[P, R] = numba.njit(**_OPTIONS)(function)
    return compiled


def step(function: Callable[P, R]) -> Callable[P, R]:
    """The same for a step of other kernels, which Python itself never calls: compiles quicker."""
    compiled: Callable[P, R] = numba.njit(
        no_cpython_wrapper=True, no_cfunc_wrapper=True, **_OPTIONS
    )(function)
    return compiled


def inner(function: Callable[P, R]) -> Callable[P, R]:
    """A step that is written into its caller's machine code.

    Handing over a record of many arrays costs more than the arithmetic of a small stack; used where
    that counts, as it makes large callers slow to compile.
    """
    compiled: Callable[P, R] = numba.njit(
        no_cpython_wrapper=True, no_cfunc_wrapper=True, forceinline=True, **_OPTIONS
    )(function)
    return compiled
