"""Force over velocity in characters, for a terminal without a picture."""

from collections.abc import Sequence
from math import ceil, isfinite, log10

import numpy as np

from optimiser.report.curve_line import CurveLine

_UNICODE_MARKS = "●○▲△■□◆◇"
_ASCII_MARKS = "oxa+vw*%"


def small_chart(
    lines: Sequence[CurveLine], unicode: bool = True, width: int = 60, height: int = 10
) -> list[str]:
    """Text lines of a chart, its legend last; every curve has a mark of its own."""
    marks = _UNICODE_MARKS if unicode else _ASCII_MARKS
    fastest = max(float(line.velocity_m_s.max()) for line in lines)
    strongest = max((f for line in lines for f in line.force_n if isfinite(f)), default=1.0)
    top = _round_up(strongest)
    cells = [[" "] * width for _ in range(height)]
    for number, line in reversed(list(enumerate(lines))):
        _draw(cells, line, marks[number % len(marks)], fastest, top)
    side = "│" if unicode else "|"
    rows = [
        f"{_force_label(row, height, top):>8} {side}{''.join(cells[row])}".rstrip()
        for row in range(height)
    ]
    corner, along = ("└", "─") if unicode else ("+", "-")
    rows.append(f"{'0':>8} {corner}{along * width}")
    rows.append(f"{'N':>8}  0{f'{fastest:g} m/s':>{width - 1}}")
    rows += [f"{'':10}{marks[i % len(marks)]} {line.label}" for i, line in enumerate(lines)]
    return rows


def _draw(cells: list[list[str]], line: CurveLine, mark: str, fastest: float, top: float) -> None:
    height, width = len(cells), len(cells[0])
    known = np.isfinite(line.force_n)
    if not known.any():
        return
    velocity = np.concatenate([[0.0], line.velocity_m_s[known]])
    force = np.concatenate([[line.force_n[known][0]], line.force_n[known]])
    for column in range(width):
        speed = (column + 0.5) / width * fastest
        if velocity[1] <= speed <= velocity[-1] + 1e-9:
            row = int(float(np.interp(speed, velocity, force)) / top * height)
            cells[height - 1 - min(row, height - 1)][column] = mark


def _force_label(row: int, height: int, top: float) -> str:
    """The force at the upper edge of the top and the middle row."""
    return f"{top * (height - row) / height:g}" if row % (height // 2) == 0 else ""


def _round_up(value: float) -> float:
    """The next round number, whose half is round as well."""
    decade = 10.0 ** (ceil(log10(max(value, 1.0))) - 1)
    steps = (1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0)
    return next(step * decade for step in steps if value <= step * decade * 1.0001)
