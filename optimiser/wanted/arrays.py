"""Array checks shared by the ways to a target. No physics."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from optimiser.faults import BadInput

Floats = NDArray[np.float64]


def read_only(values: ArrayLike) -> Floats:
    """Copy values into a read-only 1-D float array. Raises BadInput when they are not numbers."""
    try:
        array = np.array(values, dtype=np.float64)
    except (TypeError, ValueError):
        raise BadInput("a list of numbers is needed") from None
    if array.ndim != 1:
        raise BadInput(f"a flat list of numbers is needed, not {array.ndim} dimensions")
    array.flags.writeable = False
    return array


def increasing_faults(values: Floats, what: str) -> list[str]:
    """Sentences on values (n,) that do not rise; ``what`` names them with their unit."""
    faults = []
    for index in np.flatnonzero(~(np.diff(values) > 0.0)):
        before, after = values[index], values[index + 1]
        if before == after:
            faults.append(f"point {index + 2}: {what} {after:g} appears twice; each only once")
        elif np.isfinite([before, after]).all():
            faults.append(
                f"point {index + 2}: {what} {after:g} follows {before:g}; "
                "points must be sorted, smallest first"
            )
    return faults


def positive_faults(values: Floats, what: str) -> list[str]:
    """Sentences on values (n,) that are not above 0; ``what`` names them with their unit."""
    return [
        f"point {index + 1}: {what} must be a number above 0, not {values[index]:g}"
        for index in np.flatnonzero(~(np.isfinite(values) & (values > 0.0)))
    ]
