"""What goes to stderr (notes) and the one JSON document on stdout."""

import json
import sys
from collections.abc import Mapping
from pathlib import Path
from types import ModuleType
from typing import Any

import typer

PREPARING = "preparing the solver: this happens once and takes about half a minute ..."


def note(text: str, quiet: bool = False) -> None:
    """A line for the person at the terminal, on stderr."""
    if not quiet:
        typer.echo(text, err=True)


def print_document(document: Mapping[str, Any]) -> None:
    """Print one JSON document. Raises ValueError for NaN or an infinity (see ``as_json``)."""
    typer.echo(json.dumps(document, indent=2, allow_nan=False, ensure_ascii=False))


def note_when_preparing(quiet: bool = False) -> None:
    """Say so when the solver will be compiled first, which happens once per installation."""
    if not solver_is_prepared():
        note(PREPARING, quiet)


def solver_is_prepared() -> bool:
    """Whether this version's kernels lie compiled on disk (older ones may lie there too)."""
    import numba

    import optimiser.prediction  # noqa: F401  brings every kernel of the model with it

    if numba.config.DISABLE_JIT:
        return True
    loaded = [module for name, module in sys.modules.items() if name.startswith("optimiser.")]
    ages = [age for module in loaded for age in _ages(module)]
    return max(ages, default=-1.0) >= 0.0


def is_compiled(module: ModuleType, kernel: str) -> bool:
    """Whether this version of one kernel, by name, lies compiled on disk."""
    import numba

    source = Path(str(module.__file__))
    compiled = getattr(module, kernel)
    if numba.config.DISABLE_JIT:
        return True
    found = Path(compiled.stats.cache_path).glob(f"{source.stem}.{kernel}-*.nbi")
    return any(file.stat().st_mtime >= source.stat().st_mtime for file in found)


def _ages(module: ModuleType) -> list[float]:
    """Seconds by which a module's newest compiled kernel is newer than its source; [] without."""
    kernels = [item for item in vars(module).values() if hasattr(item, "py_func")]
    own = [item for item in kernels if item.py_func.__module__ == module.__name__]
    if not own or module.__file__ is None:
        return []
    source = Path(module.__file__)
    found = Path(own[0].stats.cache_path).glob(f"{source.stem}.*.nbi")
    newest = max((file.stat().st_mtime for file in found), default=None)
    return [] if newest is None else [newest - source.stat().st_mtime]
