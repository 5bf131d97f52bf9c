"""Force over velocity as a picture: SVG, PNG or PDF.

Every curve differs in line style and marker as well as in colour, so that a chart can be read in
black and white and by people who do not see all colours.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from io import BytesIO
from pathlib import Path
from typing import Any, Literal

import numpy as np

from optimiser.faults import BadInput
from optimiser.report.curve import Named, heading, lines_of
from optimiser.report.curve_line import CurveLine, Panel

Format = Literal["svg", "png", "pdf"]
_FORMATS: dict[str, Format] = {".svg": "svg", ".png": "png", ".pdf": "pdf"}

_INK = "#22262b"
_GRID = "#d5d8dc"


@dataclass(frozen=True)
class Style:
    """How one curve is drawn; ``dashes`` in points, () is a full line."""

    colour: str
    dashes: tuple[float, ...]
    marker: str


#: Dark to light as well as different in hue.
STYLES = (
    Style("#123f7a", (), "o"),
    Style("#c2540a", (7, 2.5), "s"),
    Style("#11796b", (2, 1.8), "^"),
    Style("#8a2f7d", (9, 2, 2, 2), "D"),
    Style("#6b5d1f", (12, 3), "v"),
    Style("#50575f", (4, 1.5, 1, 1.5, 1, 1.5), "P"),
)
TARGET_STYLE = Style(_INK, (1, 2), "x")


def chart_format(path: str | Path) -> Format:
    """Format by the file's ending. Raises BadInput."""
    ending = Path(path).suffix.lower()
    if ending not in _FORMATS:
        raise BadInput(
            f"--chart: '{path}' ends in '{ending or 'nothing'}'; allowed: .svg, .png or .pdf"
        )
    return _FORMATS[ending]


def panels_of(results: Sequence[Named]) -> list[Panel]:
    """One panel a direction, its stacks in it."""
    panels: dict[str, list[Named]] = {}
    for result in results:
        panels.setdefault(heading(result.prediction), []).append(result)
    return [Panel(title, tuple(lines_of(of_panel))) for title, of_panel in panels.items()]


def chart_bytes(panels: Sequence[Panel], file_format: Format) -> bytes:
    """The picture's file content. The same panels give the same bytes."""
    import matplotlib as mpl
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    settings = {
        "svg.hashsalt": "shimwright",
        "svg.fonttype": "path",
        "pdf.fonttype": 42,
        "font.family": "DejaVu Sans",
        "font.size": 10,
        "text.color": _INK,
        "text.parse_math": False,
    }
    with mpl.rc_context(settings):
        figure = Figure(figsize=(7.6, 4.4 * len(panels)), layout="constrained")
        FigureCanvasAgg(figure)
        for number, panel in enumerate(panels, start=1):
            draw_panel(figure.add_subplot(len(panels), 1, number), panel)
        content = BytesIO()
        dateless = {"svg": {"Date": None}, "pdf": {"CreationDate": None}, "png": {}}
        figure.savefig(content, format=file_format, dpi=150, metadata=dateless[file_format])
    return content.getvalue()


def draw_panel(axes: Any, panel: Panel) -> None:
    """Draw one panel on matplotlib axes."""
    predicted = [line for line in panel.lines if line.kind == "predicted"]
    for line in panel.lines:
        if line.kind == "target":
            _draw_line(axes, line, TARGET_STYLE)
        elif line.kind == "measured":
            axes.plot(line.velocity_m_s, line.force_n, ".", color=_INK, ms=4, label=line.label)
    for number, line in enumerate(predicted):
        style = STYLES[number % len(STYLES)]
        _draw_band(axes, line, style, only=len(predicted) == 1)
        _draw_spread(axes, line, style, first=number == 0)
        _draw_line(axes, line, style, number)
    fastest = max(float(line.velocity_m_s.max()) for line in panel.lines)
    axes.set_title(panel.title, loc="left", fontsize=10, fontweight="bold")
    axes.set_xlabel("shaft velocity, m/s")
    axes.set_ylabel("force, N")
    axes.set_xlim(0.0, 1.02 * fastest)
    axes.set_ylim(bottom=0.0)
    axes.grid(color=_GRID, linewidth=0.7)
    axes.set_axisbelow(True)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    axes.legend(frameon=False, loc="upper left", handlelength=4.5)


def _draw_line(axes: Any, line: CurveLine, style: Style, place: int = 0) -> None:
    """One curve; its markers are moved along by its ``place``, so that none hides another."""
    force = np.where(np.isfinite(line.force_n), line.force_n, np.nan)
    axes.plot(
        line.velocity_m_s,
        force,
        color=style.colour,
        linewidth=1.9,
        dashes=style.dashes or (None, None),
        marker=style.marker,
        markevery=(2 * place, max(1, line.velocity_m_s.size // 9)),
        markersize=5,
        markerfacecolor="white",
        markeredgewidth=1.4,
        label=line.label,
        zorder=3,
    )


def _draw_spread(axes: Any, line: CurveLine, style: Style, first: bool) -> None:
    """The likely spread, hatched, so that it is not taken for the click range; only its edges
    for the further curves."""
    if line.p05_n is None or line.p95_n is None:
        return
    axes.fill_between(
        line.velocity_m_s,
        line.p05_n,
        line.p95_n,
        facecolor="none",
        edgecolor=style.colour,
        hatch=".." if first else None,
        alpha=0.5,
        linewidth=0.8,
        label=f"likely spread of {line.label}, 5 to 95 %" if first else None,
        zorder=2,
    )


def _draw_band(axes: Any, line: CurveLine, style: Style, only: bool) -> None:
    """The click range; fainter and not named when there are several."""
    if line.low_n is None or line.high_n is None:
        return
    low = np.where(np.isfinite(line.low_n), line.low_n, np.nan)
    high = np.where(np.isfinite(line.high_n), line.high_n, np.nan)
    axes.fill_between(
        line.velocity_m_s,
        low,
        high,
        facecolor=style.colour,
        edgecolor=style.colour,
        alpha=0.16 if only else 0.08,
        linewidth=0.8,
        label="click range, open to closed" if only else None,
        zorder=1,
    )
