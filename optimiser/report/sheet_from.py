"""From predictions and search results to bench sheets."""

from dataclasses import dataclass, field
from importlib.metadata import PackageNotFoundError, version

import numpy as np

from optimiser.prediction import Prediction, Setup, predict
from optimiser.report.curve import Named, lines_of
from optimiser.report.curve_line import CurveLine, Floats
from optimiser.report.sheet import (
    Errors,
    Exchange,
    Fact,
    ForceRow,
    Opening,
    Piston,
    Sheet,
    Source,
)
from optimiser.report.sheet_steps import Drawer, build_steps, shortages
from optimiser.stack import Stack
from optimiser.wanted.bands import band_errors
from optimiser.wanted.target import Target

#: Velocities of a smooth curve.
_SMOOTH = 41


@dataclass(frozen=True, eq=False)
class About:
    """What a prediction does not know: names, target, drawer, exchange, measured runs.

    ``nominal`` the stack as written on the bins where the prediction's is as measured; ``facts``
    on rider, frame and feel; ``warnings`` besides the prediction's own; ``spread_n`` (low, high)
    arrays (n,), N, over ``smooth_velocities`` of the prediction.
    """

    subtitle: str
    source: Source
    target: Target | None = None
    nominal: Stack | None = None
    drawer: Drawer | None = None
    exchange: Exchange | None = None
    facts: tuple[Fact, ...] = ()
    measured: tuple[CurveLine, ...] = ()
    warnings: tuple[str, ...] = ()
    spread_n: tuple[Floats, Floats] | None = field(default=None)


def sheet_of(seen: Prediction, about: About) -> Sheet:
    """The sheet of a prediction, which must be at the target's velocities where there is one."""
    setup = seen.setup
    stack = about.nominal or seen.stack
    fine = predict(setup, seen.stack, smooth_velocities(seen.velocity_m_s), seen.clicks)
    return Sheet(
        title=setup.damper.name,
        subtitle=about.subtitle,
        direction=setup.direction,
        clicks=seen.clicks,
        clicks_range=setup.clicks_range,
        facts=(*_facts(setup), *about.facts),
        piston=_piston(setup),
        steps=build_steps(stack, seen.shims, seen.stack, about.drawer),
        height_mm=seen.stack.height_mm,
        rows=_rows(seen, about.target),
        lines=_lines(fine, about),
        opening=Opening(fine.velocity_m_s, fine.lift_mm, fine.bleed_share),
        source=about.source,
        stock_name=about.drawer.name if about.drawer else None,
        errors=_errors(seen, about.target),
        exchange=about.exchange,
        warnings=(*shortages(stack, about.drawer), *seen.warnings, *about.warnings),
        spread_n=about.spread_n,
    )


def smooth_velocities(velocity_m_s: Floats) -> Floats:
    """Velocities (m,), m/s, for a smooth curve up to the fastest of velocity_m_s (n,)."""
    fastest = float(velocity_m_s.max())
    between = fastest * np.linspace(0.0, 1.0, _SMOOTH)[1:] ** 1.5
    return np.unique(np.concatenate([between, velocity_m_s]))


def program_name() -> str:
    """Name and version, as printed on every sheet."""
    try:
        return f"shimwright {version('shimwright')}"
    except PackageNotFoundError:
        return "shimwright"


def _facts(setup: Setup) -> list[Fact]:
    damper = setup.damper
    return [
        Fact("oil", f"{setup.oil.name}, {setup.oil_temp_c:g} \u00b0C"),
        Fact("gas, shaft out", f"{damper.gas.pressure_mpa:g} MPa"),
        Fact("valve", setup.valve.name),
        Fact("shim steel", setup.steel.name),
    ]


def _piston(setup: Setup) -> Piston:
    valve = setup.valve
    ports, seat, post = valve.ports, valve.seat, valve.post
    if ports is None or seat is None or post is None:
        raise TypeError(f"valve '{valve.name}' has no shims")
    return Piston(
        post.post_mm,
        ports.inner_mm,
        ports.outer_mm,
        seat.seat_mm,
        seat.land_mm,
        seat.height_mm,
        post.height_min_mm,
        post.height_max_mm,
    )


def _rows(seen: Prediction, target: Target | None) -> tuple[ForceRow, ...]:
    adjuster = seen.setup.clicks_range > 0
    return tuple(
        ForceRow(
            float(velocity),
            float(seen.force_n[place]),
            float(target.force_n[place]) if target else None,
            float(seen.force_open_n[place]) if adjuster else None,
            float(seen.force_closed_n[place]) if adjuster else None,
        )
        for place, velocity in enumerate(seen.velocity_m_s)
    )


def _lines(fine: Prediction, about: About) -> tuple[CurveLine, ...]:
    lines: list[CurveLine] = []
    target = about.target
    if target is not None:
        lines.append(CurveLine("wanted", target.velocity_m_s, target.force_n, "target"))
    lines += lines_of([Named("predicted", fine)])
    return (*lines, *about.measured)


def _errors(seen: Prediction, target: Target | None) -> Errors | None:
    if target is None:
        return None
    worst, bands = target.worst(seen.force_n), band_errors(target, seen.force_n)
    return Errors(
        target.error_percent(seen.force_n),
        worst.percent,
        worst.velocity_m_s,
        bands.low_percent,
        bands.mid_percent,
        bands.high_percent,
        bands.low_to_m_s,
        bands.mid_to_m_s,
    )
