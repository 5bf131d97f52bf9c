"""The chart in characters."""

import numpy as np
import pytest

from optimiser.report.curve_line import CurveLine
from optimiser.report.small_chart import small_chart

VELOCITY = np.linspace(0.05, 2.0, 20)


def _marked(rows: list[str], mark: str) -> dict[int, int]:
    """Row of a mark by column, inside the axes."""
    return {
        column: row
        for row, text in enumerate(rows)
        for column, cell in enumerate(text[10:])
        if cell == mark
    }


def test_a_straight_line_is_drawn_straight() -> None:
    rows = small_chart([CurveLine("line", VELOCITY, 1000.0 * VELOCITY)], unicode=False)[:10]
    marked = _marked(rows, "o")
    assert len(marked) >= 55
    for column, row in marked.items():
        speed = (column + 0.5) / 60 * 2.0
        assert row == 9 - min(int(speed * 1000.0 / 2000.0 * 10), 9)


def test_every_curve_has_a_mark_and_a_legend() -> None:
    lines = [CurveLine(f"stack {n}", VELOCITY, 400.0 * (n + 1) * VELOCITY) for n in range(4)]
    rows = small_chart(lines, unicode=True)
    for mark, n in zip("●○▲△", range(4), strict=True):
        assert f"{' ':10}{mark} stack {n}" in rows
        assert len(_marked(rows[:10], mark)) > 20


def test_locked_forces_are_left_out() -> None:
    force = np.where(VELOCITY < 0.5, np.inf, 500.0)
    rows = small_chart([CurveLine("shut at first", VELOCITY, force)], unicode=False)[:10]
    columns = _marked(rows, "o")
    assert columns
    assert min(columns) >= 14
    nothing = small_chart([CurveLine("shut", VELOCITY, np.full(20, np.inf))], unicode=False)
    assert not _marked(nothing[:10], "o")


@pytest.mark.parametrize("unicode", [True, False])
def test_fits_80_columns(unicode: bool) -> None:
    rows = small_chart([CurveLine("line", VELOCITY, 99999.0 * VELOCITY)], unicode)
    assert max(map(len, rows)) <= 80
    assert unicode or "".join(rows).isascii()
