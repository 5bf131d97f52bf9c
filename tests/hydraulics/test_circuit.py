"""Whole circuits of the four kinds of damper."""

from math import pi

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.damper import Damper
from optimiser.faults import BadInput
from optimiser.hydraulics.circuit import circuit_curve, fixed_force_n, limit_forces_n
from optimiser.hydraulics.gas import ATMOSPHERE_PA, gas_force_n, gas_pressure_pa
from optimiser.hydraulics.oil import oil_at

from .examples import DAMPERS, OIL, Oil, cartridge, digressive, lifts_for, monotube, solid_piston

fast = settings(max_examples=30, deadline=None)
VELOCITY = np.array([0.02, 0.05, 0.1, 0.2, 0.4, 0.8, 1.5, 2.5])
STROKES = [
    (name, direction)
    for name, damper in DAMPERS.items()
    for direction in ("compression", "rebound")
    if getattr(damper, direction) is not None
]
every_stroke = pytest.mark.parametrize(("name", "direction"), STROKES)


@every_stroke
def test_force_is_the_sum_of_its_parts(name: str, direction: str) -> None:
    damper = DAMPERS[name]
    curve = circuit_curve(damper, direction, OIL, VELOCITY, lifts_for(damper))
    parts = sum(valve.area_mm2 * valve.drop_mpa for valve in curve.valves)
    np.testing.assert_allclose(curve.force_n, parts, rtol=1e-12)
    assert (np.diff(curve.force_n) > 0.0).all()
    assert (curve.force_n > 0.0).all()
    assert len(curve.valves) == len(damper.circuit(direction).valves)


@every_stroke
def test_fixed_part_is_all_but_the_searched_valve(name: str, direction: str) -> None:
    damper = DAMPERS[name].model_copy(update={"friction_n": 20.0, "gas_in_force": True})
    lifts = lifts_for(damper)
    curve = circuit_curve(damper, direction, OIL, VELOCITY, lifts, 5)
    del lifts[curve.searched]
    fixed = fixed_force_n(damper, direction, OIL, VELOCITY, lifts, 5)
    np.testing.assert_allclose(fixed, curve.force_n - curve.valve().force_n, atol=1e-9)


@every_stroke
def test_limits_enclose_the_curve(name: str, direction: str) -> None:
    damper = DAMPERS[name]
    lifts = lifts_for(damper)
    force = circuit_curve(damper, direction, OIL, VELOCITY, lifts, 3).force_n
    soft, firm = limit_forces_n(damper, direction, OIL, VELOCITY, lifts, 3)
    assert (soft < force).all()
    assert (force <= firm).all()
    assert (force[-1] < firm[-1]).all()


@every_stroke
@pytest.mark.parametrize("clicks", [0, 19])
def test_more_clicks_open_is_less_force(name: str, direction: str, clicks: int) -> None:
    damper = DAMPERS[name]
    lifts = lifts_for(damper)
    shut = circuit_curve(damper, direction, OIL, VELOCITY, lifts, clicks).force_n
    opened = circuit_curve(damper, direction, OIL, VELOCITY, lifts, clicks + 1).force_n
    assert (opened < shut).all()


@every_stroke
def test_cold_oil_is_firmer(name: str, direction: str) -> None:
    damper = DAMPERS[name]
    lifts = lifts_for(damper)
    forces = [
        circuit_curve(damper, direction, oil_at(Oil(), t), VELOCITY, lifts).force_n
        for t in (80.0, 40.0, 0.0)
    ]
    assert (np.diff(forces, axis=0) > 0.0).all()


@pytest.mark.parametrize(
    ("name", "direction", "areas"),
    [
        ("monotube", "compression", {"piston": 46.0**2 - 16.0**2}),
        ("solid piston", "compression", {"external": 46.0**2, "refill": 46.0**2 - 16.0**2}),
        ("solid piston", "rebound", {"external rebound": 46.0**2 - 16.0**2, "refill": 46.0**2}),
        ("cartridge", "compression", {"base": 12.0**2, "mid": 24.0**2 - 12.0**2}),
        ("cartridge", "rebound", {"rebound": 24.0**2 - 12.0**2, "base refill": 12.0**2}),
    ],
)
def test_area_of_every_valve(name: str, direction: str, areas: dict[str, float]) -> None:
    curve = circuit_curve(DAMPERS[name], direction, OIL, [0.1], lifts_for(DAMPERS[name]))
    got = {valve.name: valve.area_mm2 for valve in curve.valves}
    assert got == pytest.approx({key: pi / 4 * d2 for key, d2 in areas.items()})


def test_low_speed_oil_takes_the_bleed() -> None:
    """Common practice, no source."""
    damper = DAMPERS["monotube"]
    curve = circuit_curve(damper, "compression", OIL, VELOCITY, lifts_for(damper))
    assert curve.bleed_share[0] > 0.9
    assert curve.bleed_share[-1] < 0.25
    assert (curve.bleed_share == curve.valve("piston").bleed_share).all()


def test_raised_seat_is_firm_then_blows_off() -> None:
    """Common practice, no source: force per velocity falls past the knee."""
    damper = DAMPERS["digressive"]
    velocity = np.linspace(0.005, 2.0, 400)
    curve = circuit_curve(damper, "compression", OIL, velocity, lifts_for(damper), 6)
    knee = int(np.argmax(curve.lift_mm > 0.0))
    assert curve.drop_mpa[knee] == pytest.approx(2.0, rel=0.05)
    slope = np.gradient(curve.force_n, velocity)
    assert slope[2 * knee :].max() < 0.6 * slope[knee - 2]


def test_series_part_of_the_cartridge_adds_almost_nothing() -> None:
    """Common practice, no source: under 1 % of the force."""
    damper = DAMPERS["cartridge"]
    valves = damper.circuit("compression").valves
    bare = tuple(valve.model_copy(update={"series": None}) for valve in valves)
    without = damper.model_copy(
        update={"compression": damper.circuit("compression").model_copy(update={"valves": bare})}
    )
    lifts = lifts_for(damper)
    force = circuit_curve(damper, "compression", OIL, VELOCITY, lifts).force_n
    plain = circuit_curve(without, "compression", OIL, VELOCITY, lifts).force_n
    assert (force > plain).all()
    assert (force < 1.01 * plain).all()


def test_gas_and_friction_as_a_raw_dyno_shows() -> None:
    plain = DAMPERS["monotube"]
    raw = monotube(gas_in_force=True, friction_n=15.0)
    lifts = lifts_for(plain)
    gas = 1.0 * pi / 4 * 16.0**2
    for direction, sign in (("compression", 1.0), ("rebound", -1.0)):
        shown = circuit_curve(raw, direction, OIL, VELOCITY, lifts)
        hidden = circuit_curve(plain, direction, OIL, VELOCITY, lifts)
        np.testing.assert_allclose(shown.force_n - hidden.force_n, 15.0 + sign * gas, rtol=1e-9)
        assert (shown.friction_n, shown.gas_n) == (15.0, pytest.approx(sign * gas))


@fast
@given(st.floats(0.0, 60.0))
def test_gas_follows_boyle(travel: float) -> None:
    damper = DAMPERS["monotube"]
    swept = pi / 4 * 16.0**2 * travel * 1e-3
    absolute = gas_pressure_pa(damper.gas, damper.body, travel)
    assert absolute * (60.0 - swept) == pytest.approx((1e6 + ATMOSPHERE_PA) * 60.0, rel=1e-12)
    out = gas_force_n(damper.gas, damper.body, "compression", travel)
    assert out == -gas_force_n(damper.gas, damper.body, "rebound", travel) > 0.0


def test_travel_beyond_the_stroke() -> None:
    damper = DAMPERS["monotube"]
    with pytest.raises(BadInput, match="travel 61 mm: allowed is 0 to the stroke, 60 mm"):
        gas_pressure_pa(damper.gas, damper.body, 61.0)


@every_stroke
def test_static_pressure_at_rest(name: str, direction: str) -> None:
    damper = DAMPERS[name]
    curve = circuit_curve(damper, direction, OIL, [0.0], lifts_for(damper))
    assert curve.low_side_mpa[0] == pytest.approx(damper.gas.pressure_mpa + 0.101325)
    assert curve.cavitation_m_s is None
    assert curve.force_n[0] == 0.0


def test_cavitation_where_the_piston_uses_up_the_gas_pressure() -> None:
    """Monotube: the drop over the piston equals gas pressure less vapour pressure there."""
    damper = DAMPERS["monotube"]
    lifts = lifts_for(damper)
    speed = circuit_curve(damper, "compression", OIL, VELOCITY, lifts).cavitation_m_s
    assert speed is not None
    there = circuit_curve(damper, "compression", OIL, [speed], lifts)
    assert there.drop_mpa[0] == pytest.approx(1.101325 - 0.002, rel=1e-4)
    assert there.low_side_mpa[0] == pytest.approx(0.002, abs=1e-4)
    few = circuit_curve(damper, "compression", OIL, [2.5], lifts).cavitation_m_s
    assert few == pytest.approx(speed, rel=1e-4)
    mixed = circuit_curve(damper, "compression", OIL, VELOCITY[::-1], lifts).cavitation_m_s
    assert mixed == pytest.approx(speed, rel=1e-4)


def test_more_gas_pressure_cavitates_later_and_a_high_side_valve_never() -> None:
    soft, hard = DAMPERS["monotube"], monotube(gas={"pressure_mpa": 2.0, "volume_cm3": 60.0})
    lifts = lifts_for(soft)
    early = circuit_curve(soft, "compression", OIL, VELOCITY, lifts).cavitation_m_s
    late = circuit_curve(hard, "compression", OIL, VELOCITY, lifts).cavitation_m_s
    assert early is not None
    assert late is not None
    assert late > 1.2 * early
    assert circuit_curve(soft, "rebound", OIL, VELOCITY, lifts).cavitation_m_s is None


def test_base_valve_holds_up_the_low_side() -> None:
    damper = DAMPERS["cartridge"]
    curve = circuit_curve(damper, "compression", OIL, VELOCITY, lifts_for(damper))
    expected = 0.101325 + curve.valve("base").drop_mpa - curve.valve("mid").drop_mpa
    np.testing.assert_allclose(curve.low_side_mpa, expected, rtol=1e-9)


def test_refill_check_valve() -> None:
    """Cracking pressure plus orifice while nothing else passes it; its share of bleed is 0."""
    damper = solid_piston()
    curve = circuit_curve(damper, "compression", OIL, VELOCITY, lifts_for(damper))
    refill = curve.valve("refill")
    flows = refill.area_mm2 * 1e-6 * VELOCITY
    orifice = OIL.density_kg_m3 / 2 * (flows / (0.65 * 90e-6)) ** 2
    np.testing.assert_allclose(refill.drop_mpa * 1e6, 1e4 + orifice, rtol=1e-12)
    assert (refill.bleed_share == 0.0).all()
    assert (refill.lift_mm == 0.0).all()
    assert not refill.beyond_table.any()


def test_clicks_by_valve_name() -> None:
    damper = DAMPERS["cartridge"]
    lifts = lifts_for(damper)
    fitted = circuit_curve(damper, "compression", OIL, VELOCITY, lifts)
    mid = circuit_curve(damper, "compression", OIL, VELOCITY, lifts, {"mid": 20})
    base = circuit_curve(damper, "compression", OIL, VELOCITY, lifts, {"base": 20})
    assert (mid.valve("mid").force_n < fitted.valve("mid").force_n).all()
    assert (mid.valve("base").force_n == fitted.valve("base").force_n).all()
    plain = circuit_curve(damper, "compression", OIL, VELOCITY, lifts, 20)
    assert (plain.force_n == base.force_n).all()


@pytest.mark.parametrize(
    ("velocity", "words"),
    [
        ([], "one or more"),
        ([-0.1, 0.2], "0 or more"),
        ([float("nan")], "finite"),
        ([[0.1]], "list"),
    ],
)
def test_velocities_that_cannot_be(velocity: list[float], words: str) -> None:
    damper = DAMPERS["monotube"]
    with pytest.raises(BadInput, match=words):
        circuit_curve(damper, "compression", OIL, velocity, lifts_for(damper))


def test_missing_tables_circuits_and_valves_are_key_errors() -> None:
    damper = digressive()
    with pytest.raises(KeyError, match="piston"):
        circuit_curve(damper, "compression", OIL, VELOCITY, {})
    with pytest.raises(KeyError, match="rebound"):
        circuit_curve(damper, "rebound", OIL, VELOCITY, {})
    curve = circuit_curve(damper, "compression", OIL, VELOCITY, lifts_for(damper))
    with pytest.raises(KeyError, match="no such"):
        curve.valve("no such")


def test_clicks_out_of_range() -> None:
    damper: Damper = cartridge()
    with pytest.raises(BadInput, match="clicks 99"):
        circuit_curve(damper, "compression", OIL, VELOCITY, lifts_for(damper), 99)


def test_beyond_the_table_is_marked() -> None:
    damper = DAMPERS["monotube"]
    fast_stroke = circuit_curve(damper, "compression", OIL, [0.1, 30.0], lifts_for(damper))
    assert fast_stroke.valve().beyond_table.tolist() == [False, True]
