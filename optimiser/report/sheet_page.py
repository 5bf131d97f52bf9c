"""From sheets to one self-contained HTML page: no scripts, no files beside it."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from math import isfinite
from typing import Any

from markupsafe import Markup

from optimiser.report.cautions import CAUTION, CAUTIONS
from optimiser.report.section import Section, section_of, shortened
from optimiser.report.sheet import ForceRow, Sheet, Step
from optimiser.report.sheet_charts import force_chart, lift_chart, share_chart
from optimiser.report.sheet_table import TuneCell, TunePage, pages_of, spanned, tight
from optimiser.report.tables import force_text

#: More than these would not fit on one printed page.
MOST_ROWS = 11
MOST_WARNINGS = 5
LONGEST_WARNING = 170
LONGEST_BIN = 34
_ROOMY_TO, _DENSE_FROM, _PACKED_FROM = 8, 13, 19
_DENSE_WARNINGS = 4
#: Where a bar for a utilisation of 1 ends, of the 40 units of a bar's box.
_LIMIT = 32.0
_BAR_BOX = 40.0
_BY_HAND = (
    "date",
    "built by",
    "oil put in",
    "gas set, MPa",
    "clicks set",
    "shaft cycled",
)
ESTIMATE = "Predicted, not measured: run it on a dyno, then ride it cautiously on known ground."


@dataclass(frozen=True)
class Bar:
    """One piece's bar in the box of its group."""

    y: float
    width: float
    height: float
    over: bool


@dataclass(frozen=True)
class BandLine:
    """Error in one velocity band; ``width`` of the bar's box."""

    name: str
    range: str
    width: float
    text: str
    words: str


@dataclass(frozen=True, eq=False)
class Drawn:
    """What the page shows of a sheet beside its plain values."""

    id: str
    section: Section
    force_svg: Markup
    lift_svg: Markup
    share_svg: Markup
    rows: tuple[ForceRow, ...]
    row_note: str
    bands: tuple[BandLine, ...]
    warnings: tuple[str, ...]
    cautions: tuple[tuple[str, str], ...]
    density: str
    by_hand: tuple[str, ...] = _BY_HAND
    estimate: str = ESTIMATE

    def bars(self, step: Step) -> list[Bar]:
        """A bar a piece, the limit at four fifths of the box; longer ones are cut at its end."""
        count = len(step.worked)
        height = 8.0 / count
        return [
            Bar(
                place * height + 0.1 * height,
                min(_LIMIT * one.utilisation, _BAR_BOX),
                0.8 * height,
                one.utilisation >= 1.0,
            )
            for place, one in enumerate(step.worked)
        ]

    def bins(self, step: Step) -> str:
        """Where the size lies, as far as there is room."""
        room = LONGEST_BIN // 2 if "dense" in self.density else LONGEST_BIN
        return shortened(" + ".join(step.bins), room) or "-"

    def use_words(self, step: Step) -> str:
        """The bars in words."""
        values = ", ".join(f"{one.utilisation:.2f}" for one in step.worked)
        return f"fatigue utilisation of {step.size} mm, limit 1: {values}"


def sheet_html(sheets: Sequence[Sheet], title: str | None = None) -> str:
    """One page with a printed page (A4 or Letter) a sheet. Raises ValueError without a sheet."""
    if not sheets:
        raise ValueError("a page needs at least one sheet")
    named = title or ", ".join(dict.fromkeys(f"{s.title}, {s.direction}" for s in sheets))
    return _render(named, (), sheets)


def table_html(table: TunePage, sheets: Sequence[Sheet] = ()) -> str:
    """A landscape page of the tune table (more where it is too large), then one sheet a cell."""
    return _render(table.title, pages_of(table), sheets)


def _render(title: str, tables: Sequence[TunePage], sheets: Sequence[Sheet]) -> str:
    drawn = [(sheet, _draw(sheet, f"s{number}")) for number, sheet in enumerate(sheets, start=1)]
    template = _environment().get_template("page.html.j2")
    page: str = template.render(
        title=title, tables=tables, sheets=drawn, estimate=ESTIMATE, caution=CAUTION
    )
    return page


@cache
def _environment() -> Any:
    from jinja2 import Environment, PackageLoader, StrictUndefined

    environment = Environment(
        loader=PackageLoader("optimiser.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters["force"] = _force
    environment.filters["signed"] = _signed
    environment.filters["spanned"] = spanned
    environment.filters["changed"] = _any_changed
    environment.filters["tight"] = tight
    return environment


def _draw(sheet: Sheet, name: str) -> Drawn:
    rows = chosen(sheet.rows)
    note = "" if len(rows) == len(sheet.rows) else f"{len(rows)} of {len(sheet.rows)} points"
    return Drawn(
        id=name,
        section=section_of(sheet.piston, sheet.steps),
        force_svg=Markup(force_chart(sheet, f"{name}-force")),
        lift_svg=Markup(lift_chart(sheet.opening, f"{name}-lift")),
        share_svg=Markup(share_chart(sheet.opening, f"{name}-share")),
        rows=rows,
        row_note=note,
        bands=_bands(sheet),
        warnings=_warnings(sheet.warnings),
        cautions=tuple(_headed(caution) for caution in CAUTIONS),
        density=_density(sheet),
    )


def _density(sheet: Sheet) -> str:
    """Class of the sheet's style, so that much still fits on a page and little fills it."""
    if len(sheet.steps) >= _PACKED_FROM:
        return " dense packed"
    if len(sheet.steps) >= _DENSE_FROM or len(sheet.warnings) >= _DENSE_WARNINGS:
        return " dense"
    return " roomy" if len(sheet.steps) <= _ROOMY_TO else ""


def chosen(rows: Sequence[ForceRow]) -> tuple[ForceRow, ...]:
    """At most MOST_ROWS rows, evenly taken, the first and the last among them."""
    if len(rows) <= MOST_ROWS:
        return tuple(rows)
    step = (len(rows) - 1) / (MOST_ROWS - 1)
    return tuple(rows[round(place * step)] for place in range(MOST_ROWS))


def _warnings(warnings: Sequence[str]) -> tuple[str, ...]:
    """What fits on the sheet; the rest is counted, so that nobody takes it for all."""
    shown = [shortened(text, LONGEST_WARNING) for text in warnings[:MOST_WARNINGS]]
    more = len(warnings) - len(shown)
    if more:
        shown.append(f"{more} more; see the result on the terminal")
    return tuple(shown)


def _headed(caution: str) -> tuple[str, str]:
    """The words before a caution's colon, and the rest."""
    head, colon, rest = caution.partition(":")
    return (head + colon, rest) if colon else ("", caution)


def _bands(sheet: Sheet) -> tuple[BandLine, ...]:
    errors = sheet.errors
    if errors is None:
        return ()
    first, last = sheet.rows[0].velocity_m_s, sheet.rows[-1].velocity_m_s
    spans = [
        ("low", first, errors.low_to_m_s, errors.low_percent),
        ("mid", errors.low_to_m_s, errors.mid_to_m_s, errors.mid_percent),
        ("high", errors.mid_to_m_s, last, errors.high_percent),
        ("whole", first, last, errors.total_percent),
    ]
    known = [value for *_span, value in spans if value is not None and isfinite(value)]
    scale = max([10.0, *known])
    lines = []
    for name, low, high, value in spans:
        span = f"{low:.2g} to {high:.2g} m/s"
        counts = value is not None and isfinite(value)
        text = f"{value:.1f} %" if counts else "-"
        width = _BAR_BOX * value / scale if value is not None and counts else 0.0
        lines.append(BandLine(name, span, width, text, f"error in the {name} range: {text}"))
    return tuple(lines)


def _any_changed(cells: Sequence[TuneCell | None]) -> bool:
    return any(cell is not None and cell.changes for cell in cells)


def _force(value: float | None) -> str:
    return "-" if value is None else force_text(value)


def _signed(value: float | None) -> str:
    return "-" if value is None or not isfinite(value) else f"{value:+.1f}"
