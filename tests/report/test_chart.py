"""The picture: formats, what is drawn, and that it can be told apart without colour."""

import xml.etree.ElementTree as ET
from itertools import combinations

import numpy as np
import pytest
from matplotlib.figure import Figure

from optimiser.faults import BadInput
from optimiser.report.chart import STYLES, chart_bytes, chart_format, draw_panel
from optimiser.report.curve_line import CurveLine, Panel

VELOCITY = np.linspace(0.02, 2.0, 30)


def _line(label: str, scale: float = 1000.0, **more: object) -> CurveLine:
    return CurveLine(label, VELOCITY, scale * VELOCITY, **more)  # type: ignore[arg-type]  # by name


@pytest.mark.parametrize("path", ["a.svg", "A.SVG", "b.png", "c.pdf"])
def test_format_by_ending(path: str) -> None:
    assert chart_format(path) == path[-3:].lower()


@pytest.mark.parametrize("path", ["a.gif", "svg", "a.svg.bak"])
def test_other_endings_are_refused(path: str) -> None:
    with pytest.raises(BadInput, match=r"allowed: \.svg, \.png or \.pdf"):
        chart_format(path)


def test_svg_is_well_formed_whatever_the_label() -> None:
    panel = Panel("a & b < c", (_line("<script> $x_{ & y"),))
    root = ET.fromstring(chart_bytes([panel], "svg"))
    assert root.tag.endswith("svg")


def test_same_panels_same_bytes() -> None:
    panel = Panel("title", (_line("one"), _line("two", 800.0)))
    for file_format in ("svg", "png", "pdf"):
        assert chart_bytes([panel], file_format) == chart_bytes([panel], file_format)


def test_target_prediction_band_and_measurement_are_all_drawn() -> None:
    axes = Figure().add_subplot()
    band = {"low_n": 900.0 * VELOCITY, "high_n": 1100.0 * VELOCITY}
    lines = (
        _line("wanted", 1050.0, kind="target"),
        _line("stack", **band),
        _line("dyno run", 1010.0, kind="measured"),
    )
    draw_panel(axes, Panel("title", lines))
    _handles, labels = axes.get_legend_handles_labels()
    assert set(labels) == {"wanted", "stack", "dyno run", "click range, open to closed"}
    drawn = next(line for line in axes.lines if line.get_label() == "stack")
    np.testing.assert_allclose(drawn.get_ydata(), 1000.0 * VELOCITY)
    assert len(axes.collections) == 1
    assert axes.get_xlabel() == "shaft velocity, m/s"
    assert axes.get_ylabel() == "force, N"


def test_the_likely_spread_is_told_from_the_click_range() -> None:
    axes = Figure().add_subplot()
    clicks = {"low_n": 900.0 * VELOCITY, "high_n": 1100.0 * VELOCITY}
    spread = {"p05_n": 800.0 * VELOCITY, "p95_n": 1200.0 * VELOCITY}
    draw_panel(axes, Panel("title", (_line("one", **clicks, **spread), _line("two", **spread))))
    filled, first, second = axes.collections
    assert filled.get_hatch() is None
    assert (first.get_hatch(), second.get_hatch()) == ("..", None)
    assert (first.get_facecolor().size, second.get_facecolor().size) == (0, 0)
    assert first.get_paths()[0].vertices[:, 1].max() == pytest.approx(1200.0 * VELOCITY[-1])
    _handles, labels = axes.get_legend_handles_labels()
    assert [label for label in labels if "likely" in label] == ["likely spread of one, 5 to 95 %"]


def test_locked_forces_leave_a_gap() -> None:
    force = np.where(VELOCITY < 0.5, np.inf, 500.0)
    axes = Figure().add_subplot()
    draw_panel(
        axes, Panel("title", (CurveLine("shut", VELOCITY, force, "predicted", force, force),))
    )
    assert np.isnan(axes.lines[0].get_ydata()[0])
    assert np.isfinite(axes.get_ylim()).all()


def test_styles_differ_without_colour() -> None:
    for first, second in combinations(STYLES, 2):
        assert first.dashes != second.dashes
        assert first.marker != second.marker
        assert first.colour != second.colour
