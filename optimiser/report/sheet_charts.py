"""The charts of a bench sheet as inline SVG, readable in black and white and at hand's size."""

import re
from collections.abc import Callable
from html import escape
from io import StringIO
from typing import Any

from optimiser.report.chart import STYLES, draw_panel
from optimiser.report.curve_line import Panel
from optimiser.report.sheet import Opening, Sheet

_MM = 1.0 / 25.4
_SHARE_STYLE = STYLES[1]
_SETTINGS = {
    "svg.fonttype": "none",
    "font.family": "DejaVu Sans",
    "font.size": 7.0,
    "axes.linewidth": 0.6,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "hatch.linewidth": 0.5,
    "text.parse_math": False,
}


def force_chart(sheet: Sheet, prefix: str, width_mm: float = 118.0, height_mm: float = 56.0) -> str:
    """Force over velocity: wanted, predicted, click range, spread and measured runs."""

    def draw(axes: Any) -> None:
        draw_panel(axes, Panel("", sheet.lines))
        axes.set_title("")
        _draw_spread(axes, sheet)
        for line in axes.lines:
            line.set_linewidth(0.75 * line.get_linewidth())
            line.set_markersize(0.75 * line.get_markersize())
        axes.legend(frameon=False, loc="upper left", handlelength=4.0, borderaxespad=0.1)

    return _svg(draw, _force_in_words(sheet), prefix, width_mm, height_mm)


def lift_chart(
    opening: Opening, prefix: str, width_mm: float = 70.0, height_mm: float = 25.0
) -> str:
    """Lift above the seat over velocity."""

    def draw(axes: Any) -> None:
        axes.plot(opening.velocity_m_s, opening.lift_mm, color=STYLES[0].colour, linewidth=1.4)
        _finish(axes, opening, "lift, mm")

    return _svg(draw, _lift_in_words(opening), prefix, width_mm, height_mm)


def share_chart(
    opening: Opening, prefix: str, width_mm: float = 70.0, height_mm: float = 25.0
) -> str:
    """Which way the oil goes, % of the valve's oil: bleed below, shims above."""

    def draw(axes: Any) -> None:
        velocity, share = opening.velocity_m_s, 100.0 * opening.bleed_share
        axes.fill_between(
            velocity,
            0.0,
            share,
            facecolor="white",
            edgecolor=_SHARE_STYLE.colour,
            hatch="//////",
            linewidth=1.0,
        )
        axes.set_ylim(0.0, 100.0)
        _finish(axes, opening, "oil, %")

    return _svg(draw, _share_in_words(opening), prefix, width_mm, height_mm)


def _draw_spread(axes: Any, sheet: Sheet) -> None:
    """The likely spread of the prediction, hatched, so that it is not taken for the click range."""
    if sheet.spread_n is None:
        return
    predicted = next(line for line in sheet.lines if line.kind == "predicted")
    low, high = sheet.spread_n
    axes.fill_between(
        predicted.velocity_m_s,
        low,
        high,
        facecolor="none",
        edgecolor=STYLES[0].colour,
        hatch="......",
        linewidth=0.6,
        label="likely spread",
        zorder=2,
    )


def _finish(axes: Any, opening: Opening, name: str) -> None:
    axes.set_xlabel("shaft velocity, m/s", labelpad=1.0)
    axes.set_ylabel(name, labelpad=2.0)
    axes.set_xlim(0.0, float(opening.velocity_m_s.max()))
    axes.set_ylim(bottom=0.0)
    axes.grid(color="#d5d8dc", linewidth=0.5)
    axes.set_axisbelow(True)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _force_in_words(sheet: Sheet) -> str:
    last = sheet.rows[-1]
    wanted = "" if last.wanted_n is None else f", {last.wanted_n:.0f} N wanted"
    names = ", ".join(line.label for line in sheet.lines)
    return (
        f"Chart of force over shaft velocity: {names}. At {last.velocity_m_s:g} m/s "
        f"{last.predicted_n:.0f} N predicted{wanted}; the table of forces holds every value."
    )


def _lift_in_words(opening: Opening) -> str:
    most = float(opening.lift_mm.max())
    return f"Chart of lift over shaft velocity, up to {most:.2f} mm."


def _share_in_words(opening: Opening) -> str:
    first, last = 100.0 * opening.bleed_share[0], 100.0 * opening.bleed_share[-1]
    return (
        f"Chart of the bleed's share of the oil over shaft velocity, from {first:.0f} % at the "
        f"slowest to {last:.0f} % at the fastest."
    )


def _svg(
    draw: Callable[[Any], None], says: str, prefix: str, width_mm: float, height_mm: float
) -> str:
    """An ``svg`` element without a fixed size that ``says`` in words what it shows.

    Every id of it begins with ``prefix``, so that a page can hold many.
    """
    import matplotlib as mpl
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure
    from matplotlib.layout_engine import ConstrainedLayoutEngine

    with mpl.rc_context({**_SETTINGS, "svg.hashsalt": prefix}):
        layout = ConstrainedLayoutEngine(w_pad=0.01, h_pad=0.01)
        figure = Figure(figsize=(width_mm * _MM, height_mm * _MM), layout=layout)
        FigureCanvasSVG(figure)
        draw(figure.add_subplot())
        file = StringIO()
        figure.savefig(file, format="svg", transparent=True, metadata=_NOTHING_ABOUT_IT)
    return _inline(file.getvalue(), says, prefix)


_NOTHING_ABOUT_IT = dict.fromkeys(("Date", "Creator", "Format", "Type"))


def _inline(svg: str, says: str, prefix: str) -> str:
    """The element alone, without prolog, size and metadata, to be set into a page."""
    element = svg[svg.index("<svg") :]
    head, body = element.split(">", 1)
    head = re.sub(r' (?:width|height)="[^"]*"', "", head)
    body = re.sub(r"<metadata>.*?</metadata>", "", body, flags=re.DOTALL)
    body = re.sub(r' id="', f' id="{prefix}-', body)
    body = re.sub(r'href="#', f'href="#{prefix}-', body)
    body = re.sub(r"url\(#", f"url(#{prefix}-", body)
    return (
        f'{head} preserveAspectRatio="xMinYMin meet" role="img" aria-label="{escape(says)}">{body}'
    )
