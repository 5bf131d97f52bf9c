"""One curve to draw, whoever draws it."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
LineKind = Literal["predicted", "target", "measured"]


@dataclass(frozen=True)
class CurveLine:
    """Force (N) over shaft velocity (m/s), arrays (n,).

    ``low_n`` and ``high_n`` bound a band drawn behind it: the adjuster fully open and shut;
    ``p05_n`` and ``p95_n`` another one: the likely spread.
    """

    label: str
    velocity_m_s: Floats
    force_n: Floats
    kind: LineKind = "predicted"
    low_n: Floats | None = None
    high_n: Floats | None = None
    p05_n: Floats | None = None
    p95_n: Floats | None = None


@dataclass(frozen=True)
class Panel:
    """Curves that share one pair of axes."""

    title: str
    lines: tuple[CurveLine, ...]
