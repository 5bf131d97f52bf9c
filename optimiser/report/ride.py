"""Rider, frame and feel: the ride in numbers, the feel in words."""

from collections.abc import Iterable
from typing import Any

from rich.table import Table

from optimiser.report.look import Look
from optimiser.report.tables import new_table
from optimiser.wanted.feel import compared, explained
from optimiser.wanted.vehicle import Mode
from optimiser.wish import RideWish


def ride_heading(ride: RideWish) -> str:
    """One line of who rides what."""
    return f"The ride: {ride.rider.mass_kg:g} kg with kit on {ride.frame.name}"


def ride_table(ride: RideWish, look: Look) -> Table:
    """Statics, critical damping, and what the wanted damping would do: one line a value."""
    table = new_table(look, "at rest", "", left=[0, 1])
    for name, value in _statics(ride):
        table.add_row(name, value)
    return table


def road_table(ride: RideWish, look: Look) -> Table:
    """What the wanted damping would do on a quarter vehicle: one line a value."""
    table = new_table(look, f"moving, with this damping{' ' * 5}", "", left=[0, 1])
    for name, value in _road(ride):
        table.add_row(name, value)
    return table


def feel_lines(ride: RideWish) -> list[str]:
    """The feel in words, and against the one to start from."""
    feel = ride.feel
    summary = f": {feel.summary}" if feel.summary else ""
    lines = [f"Feel {feel.name}{summary}.", *(f"* {line}" for line in explained(feel))]
    differences = [f"* {line}" for line in compared(feel, ride.usual_feel)]
    return [*lines, *differences]


def ride_document(ride: RideWish) -> dict[str, Any]:
    """The ride for JSON."""
    rest, vehicle, road = ride.derived.ride, ride.vehicle, ride.corner
    return {
        "rider_kg": rest.rider_kg,
        "frame": ride.frame.name,
        "sprung_kg": rest.sprung_kg,
        "unsprung_kg": vehicle.unsprung_kg,
        "load_n": rest.load_n,
        "sag_percent": rest.sag_percent,
        "sag_of": ride.frame.sag_of,
        "sag_wheel_mm": rest.sag_travel_mm,
        "sag_shaft_mm": rest.sag_stroke_mm,
        "leverage_at_sag": rest.leverage_at_sag,
        "spring": ride.frame.spring.kind,
        "coil_n_mm": rest.coil_n_mm,
        "preload_mm": ride.frame.spring.preload_mm,
        "shaft_rate_n_mm": rest.shaft_rate_n_mm,
        "wheel_rate_n_mm": rest.wheel_rate_n_mm,
        "body_alone_hz": rest.body_hz,
        "critical_wheel_n_s_m": rest.critical_wheel_n_s_m,
        "critical_shaft_n_s_m": rest.critical_shaft_n_s_m,
        "swing_wheel_m_s": road.wheel_speed_m_s,
        "damping_wheel_n_s_m": road.damping_n_s_m,
        "body": _mode(road.body),
        "wheel": _mode(road.wheel),
        "load_overshoot_percent": road.load_overshoot_percent,
        "road_overshoot_percent": road.road_overshoot_percent,
        "settled_s": road.settled_s,
    }


def feel_document(ride: RideWish) -> dict[str, Any]:
    """The feel for JSON."""
    feel = ride.feel
    return {
        **feel.model_dump(),
        "explained": explained(feel),
        "compared": compared(feel, ride.usual_feel),
    }


def _statics(ride: RideWish) -> Iterable[tuple[str, str]]:
    rest, spring = ride.derived.ride, ride.frame.spring
    yield "carried by this wheel's spring", f"{rest.sprung_kg:.1f} kg, {rest.load_n:.0f} N"
    if rest.coil_n_mm is None:
        yield "air spring at sag", f"{rest.shaft_rate_n_mm:.1f} N/mm on the shaft"
    else:
        source = "for this sag" if spring.rate_n_mm is None else "as fitted"
        yield "coil", f"{rest.coil_n_mm:.1f} N/mm {source}, {spring.preload_mm:g} mm preload"
    yield "sag", f"{rest.sag_percent:.1f} % of the {ride.frame.sag_of.replace('_', ' ')}"
    yield "sag at wheel, shaft", f"{rest.sag_travel_mm:.1f} mm, {rest.sag_stroke_mm:.1f} mm"
    yield "leverage ratio at sag", f"{rest.leverage_at_sag:.3f}"
    yield "wheel rate at sag", f"{rest.wheel_rate_n_mm:.2f} N/mm"
    yield "critical damping at wheel", f"{rest.critical_wheel_n_s_m:.0f} N s/m"
    yield "critical damping at shaft", f"{rest.critical_shaft_n_s_m:.0f} N s/m"


def _road(ride: RideWish) -> Iterable[tuple[str, str]]:
    road = ride.corner
    yield (
        "equal linear damping",
        f"{road.damping_n_s_m:.0f} N s/m at the wheel, swings of {road.wheel_speed_m_s:g} m/s",
    )
    yield "body", _mode_text(road.body)
    yield "wheel", _mode_text(road.wheel)
    yield "overshoot after a load", f"{road.load_overshoot_percent:.0f} %"
    yield "overshoot after a 20 mm kerb", f"{road.road_overshoot_percent:.0f} %"
    yield "calm again after the load", f"{road.settled_s:.2f} s, to within 5 %"


def _mode_text(mode: Mode) -> str:
    return f"{mode.hz:.2f} Hz, damping ratio {mode.damping_ratio:.2f}"


def _mode(mode: Mode) -> dict[str, float]:
    return {"hz": mode.hz, "damping_ratio": mode.damping_ratio}
