"""One shim valve: the explicit relation, its inversion and what a workshop expects of it."""

from math import inf

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from optimiser.damper import Valve
from optimiser.faults import BadInput
from optimiser.hydraulics.lift import Floats, LiftTable, lift_at, pressure_grid
from optimiser.hydraulics.oil import OilState, oil_at
from optimiser.hydraulics.restrictions import drop, flow
from optimiser.hydraulics.valve import (
    ValveNumbers,
    bleed_area_m2,
    bleed_numbers,
    bleed_settings,
    bleed_shares,
    displaced_area_m2,
    drops_at,
    firmest_drop,
    softest_drop,
    through_shims,
    valve_numbers,
    valve_table,
)

from .examples import (
    DAMPERS,
    OIL,
    Oil,
    check_valve,
    piston_valve,
    searched_valve,
    stiffening_lift_m,
    table,
    thinner,
)

fast = settings(max_examples=40, deadline=None)
openings = st.just(0.0) | st.floats(1.0, 3e6)
BODY = DAMPERS["monotube"].body
VALVE = searched_valve()
NUMBERS = valve_numbers(VALVE, BODY, OIL)
BLEED = bleed_numbers(VALVE, OIL, 8)
CLOSED = (inf, inf)
VELOCITY = np.array([0.02, 0.05, 0.1, 0.2, 0.4, 0.8, 1.5, 2.5])
FLOWS = NUMBERS.area_m2 * VELOCITY
Bleed = tuple[float, float]


def solve(
    numbers: ValveNumbers, bleed: Bleed, lifts: LiftTable, flows: Floats
) -> tuple[Floats, Floats, Floats, int]:
    """(drop, shim pressure, lift, flows beyond the table) of :func:`drops_at`."""
    drops, pressure, lift = np.empty((3, flows.size))
    beyond = drops_at(
        numbers, *bleed, lifts.pressure_pa, lifts.lift_m, flows, drops, pressure, lift
    )
    return drops, pressure, lift, beyond


def brute_force(numbers: ValveNumbers, bleed: Bleed, q: float, **stack: float) -> float:
    """Total drop by a root find on the exact lift, no table."""

    def total(p: float) -> float:
        y = stiffening_lift_m(np.array([p]), **stack)[0]
        through, across = through_shims(numbers, p, y)
        return through + flow(across, *bleed)

    high = 1e3
    while total(high) < q:
        high *= 2.0
    p = brentq(lambda p: total(p) - q, 0.0, high, xtol=1e-9, rtol=1e-13)
    y = stiffening_lift_m(np.array([p]), **stack)[0]
    across = through_shims(numbers, p, y)[1]
    return across + drop(q, numbers.series_a, numbers.series_b)


@settings(max_examples=25, deadline=None)
@given(
    st.floats(3e9, 1e11),
    st.floats(0.1e-3, 0.5e-3),
    st.just(0.0) | st.floats(1.0, 4e6),
    st.integers(0, 20),
    st.booleans(),
)
def test_drops_at_against_brute_force(
    rate: float, thick: float, opens: float, clicks: int, bled: bool
) -> None:
    """16 entries up to just above what is needed: under 0.1 % of the force everywhere."""
    stack = {"rate_pa_m": rate, "thick_m": thick, "opens_pa": opens}
    bleed = bleed_numbers(VALVE, OIL, clicks) if bled else CLOSED
    exact = np.array([brute_force(NUMBERS, bleed, q, **stack) for q in FLOWS])
    grid = pressure_grid(exact[-1], 16, opens)
    lifts = LiftTable(grid, stiffening_lift_m(grid, **stack))
    drops, _, _, beyond = solve(NUMBERS, bleed, lifts, FLOWS)
    assert beyond == 0
    np.testing.assert_allclose(drops, exact, rtol=1e-3)


@pytest.mark.parametrize(("entries", "most"), [(16, 2e-2), (32, 1.2e-2)])
def test_a_gap_that_closes_between_entries(entries: int, most: float) -> None:
    """The lift's slope halves at one pressure, as when a crossover gap closes; error as stated."""
    for closes in (0.3e6, 0.8e6, 1.7e6, 3.1e6):

        def lift(p: Floats, closes: float = closes) -> Floats:
            return stiffening_lift_m(np.where(p < closes, p, 0.5 * (p + closes)))

        fine = np.geomspace(1e3, 3e7, 4000)
        exact = solve(NUMBERS, BLEED, LiftTable(fine, lift(fine)), FLOWS)[0]
        grid = pressure_grid(exact[-1], entries)
        drops = solve(NUMBERS, BLEED, LiftTable(grid, lift(grid)), FLOWS)[0]
        np.testing.assert_allclose(drops, exact, rtol=most)


@fast
@given(
    st.lists(st.floats(0.0, 2e-4), min_size=3, max_size=12),
    st.integers(0, 3),
    st.lists(st.floats(1e-8, 5e-3), min_size=1, max_size=10),
    st.integers(0, 20),
)
def test_drops_at_meets_the_flow_for_any_table(
    steps: list[float], closed: int, flows: list[float], clicks: int
) -> None:
    """The explicit relation gives the asked flow back, whatever the table and order of flows."""
    lift = np.r_[np.zeros(closed), np.cumsum(steps)]
    lifts = LiftTable(pressure_grid(8e6, lift.size), lift)
    bleed = bleed_numbers(VALVE, OIL, clicks)
    drops, pressure, y, beyond = solve(NUMBERS, bleed, lifts, np.array(flows))
    assert beyond == int((pressure > lifts.pressure_pa[-1]).sum())
    np.testing.assert_allclose(lift_at(*lifts, pressure), y, rtol=1e-6, atol=1e-12)
    for q, p, height, across in zip(flows, pressure, y, drops, strict=True):
        through, over = through_shims(NUMBERS, p, height)
        assert through + flow(over, *bleed) == pytest.approx(q, rel=1e-6)
        assert over == pytest.approx(across, rel=1e-6)


@fast
@given(openings, st.integers(0, 20))
def test_table_and_inversion_agree(opens: float, clicks: int) -> None:
    lifts = table(opens_pa=opens)
    bleed = bleed_numbers(VALVE, OIL, clicks)
    flows, drops = valve_table(NUMBERS, *bleed, *lifts)
    assert (np.diff(flows) > 0).all()
    assert (np.diff(drops) > 0).all()
    back, pressure, _, _ = solve(NUMBERS, bleed, lifts, flows)
    np.testing.assert_allclose(back, drops, rtol=1e-6)
    np.testing.assert_allclose(pressure, lifts.pressure_pa, rtol=1e-6)


def test_order_of_flows_does_not_matter() -> None:
    lifts, order = table(), np.array([3, 0, 7, 1, 6, 2, 5, 4])
    rising = solve(NUMBERS, BLEED, lifts, FLOWS)[0]
    np.testing.assert_allclose(solve(NUMBERS, BLEED, lifts, FLOWS[order])[0], rising[order], 1e-6)


@fast
@given(st.floats(1e-9, 5e-3), st.floats(1.0001, 3.0), st.booleans())
def test_more_flow_is_more_drop(q: float, more: float, bled: bool) -> None:
    bleed = BLEED if bled else CLOSED
    drops, pressure, lift, _ = solve(NUMBERS, bleed, table(), np.array([q, more * q]))
    assert drops[1] > drops[0] > 0.0
    assert pressure[1] > pressure[0]
    assert lift[1] >= lift[0]


@fast
@given(st.floats(1.05, 5.0), openings)
def test_similar_flows_have_one_drop(k: float, opens: float) -> None:
    """mu x k, rho x k^2, Q / k leave every term a Q and b Q^2 as it was."""
    other = OilState(OIL.density_kg_m3 * k * k, OIL.viscosity_pa_s * k, 0.0)
    numbers, bleed = valve_numbers(VALVE, BODY, other), bleed_numbers(VALVE, other, 8)
    lifts = table(opens_pa=opens)
    here = solve(NUMBERS, BLEED, lifts, FLOWS)
    there = solve(numbers, bleed, lifts, FLOWS / k)
    np.testing.assert_allclose(there[0], here[0], rtol=1e-6)
    np.testing.assert_allclose(there[2], here[2], rtol=1e-6, atol=1e-12)


@fast
@given(st.integers(0, 19), openings)
def test_more_clicks_open_is_less_drop(clicks: int, opens: float) -> None:
    lifts = table(opens_pa=opens)
    shut = solve(NUMBERS, bleed_numbers(VALVE, OIL, clicks), lifts, FLOWS)[0]
    open_ = solve(NUMBERS, bleed_numbers(VALVE, OIL, clicks + 1), lifts, FLOWS)[0]
    assert (open_ < shut).all()


@fast
@given(st.floats(-20.0, 120.0), st.floats(1.0, 60.0), openings)
def test_hotter_oil_is_not_firmer(temp: float, more: float, opens: float) -> None:
    """Thinner and lighter oil: every passage drops less."""
    lifts = table(opens_pa=opens)
    drops = []
    for t in (temp, temp + more):
        oil = oil_at(Oil(), t)
        numbers, bleed = valve_numbers(VALVE, BODY, oil), bleed_numbers(VALVE, oil, 4)
        drops.append(solve(numbers, bleed, lifts, FLOWS)[0])
    assert (drops[1] < drops[0]).all()


def test_a_stiffer_or_more_preloaded_stack_is_firmer() -> None:
    soft = solve(NUMBERS, BLEED, table(), FLOWS)[0]
    stiff = solve(NUMBERS, BLEED, table(rate_pa_m=4e10), FLOWS)[0]
    preloaded = solve(NUMBERS, BLEED, table(opens_pa=1.5e6), FLOWS)[0]
    assert (stiff > soft).all()
    assert (preloaded > soft).all()


def test_preload_gives_a_knee() -> None:
    """Steep on the bleed until the seat opens, then much flatter (common practice, no source)."""
    opens = 2e6
    lifts = table(n=48, opens_pa=opens)
    flows = np.linspace(1e-6, 1e-3, 400)
    drops, _, lift, _ = solve(NUMBERS, BLEED, lifts, flows)
    knee = int(np.argmax(lift > 0.0))
    assert drops[knee] == pytest.approx(opens, rel=0.02)
    np.testing.assert_allclose(drops[:knee], [drop(q, *BLEED) for q in flows[:knee]], rtol=1e-12)
    slope = np.gradient(drops, flows)
    assert slope[2 * knee] < 0.35 * slope[knee - 2]


def test_low_speed_oil_takes_the_bleed() -> None:
    """Common practice, no source: most of the oil at 0.02 m/s, little of it at 2.5 m/s."""
    drops, *_ = solve(NUMBERS, BLEED, table(), FLOWS)
    shares = bleed_shares(NUMBERS, *BLEED, FLOWS, drops)
    assert shares[0] > 0.9
    assert shares[-1] < 0.2
    assert (np.diff(shares) < 0.0).all()
    assert bleed_shares(NUMBERS, *BLEED, np.zeros(1), np.zeros(1))[0] == 1.0
    assert bleed_shares(NUMBERS, *CLOSED, np.zeros(1), np.zeros(1))[0] == 0.0


def test_an_open_valve_in_series_adds_almost_nothing() -> None:
    """Common practice, no source: a port as wide as the piston's, under 3 % at any speed."""
    part = {"area_mm2": 200.0, "length_mm": 10.0, "hydraulic_mm": 8.0}
    valve = Valve.model_validate(piston_valve("with series", series=part))
    numbers = valve_numbers(valve, BODY, OIL)
    alone = solve(NUMBERS, BLEED, table(), FLOWS)[0]
    behind = solve(numbers, BLEED, table(), FLOWS)[0]
    assert (behind > alone).all()
    assert (behind < 1.03 * alone).all()


def test_limits_enclose_any_stack() -> None:
    soft = np.array([softest_drop(NUMBERS, *BLEED, q) for q in FLOWS])
    firm = np.array([firmest_drop(NUMBERS, *BLEED, q) for q in FLOWS])
    for rate in (1e7, 1e9, 1e11, 1e13):
        drops = solve(NUMBERS, BLEED, table(rate_pa_m=rate), FLOWS)[0]
        assert (drops > soft).all()
        assert (drops < firm).all()


def test_limits_are_reached() -> None:
    flabby = LiftTable(np.array([1e-6, 1e9]), np.array([0.1, 0.1]))
    soft = [softest_drop(NUMBERS, *BLEED, q) for q in FLOWS]
    np.testing.assert_allclose(solve(NUMBERS, BLEED, flabby, FLOWS)[0], soft, rtol=1e-2)
    shut = LiftTable(pressure_grid(1e12, 16), np.zeros(16))
    firm = [firmest_drop(NUMBERS, *BLEED, q) for q in FLOWS]
    np.testing.assert_allclose(solve(NUMBERS, BLEED, shut, FLOWS)[0], firm, rtol=1e-14)
    ports = [drop(q, NUMBERS.port_a, NUMBERS.port_b) for q in FLOWS]
    assert [softest_drop(NUMBERS, *CLOSED, q) for q in FLOWS] == pytest.approx(ports, rel=1e-14)
    assert firmest_drop(NUMBERS, *CLOSED, 1e-4) == inf


def test_shut_without_a_bleed_lets_nothing_through() -> None:
    shut = LiftTable(pressure_grid(1e6, 8), np.zeros(8))
    drops, pressure, lift, beyond = solve(NUMBERS, CLOSED, shut, np.array([0.0, 1e-4]))
    assert drops.tolist() == [0.0, inf]
    assert pressure.tolist() == [0.0, inf]
    assert lift.tolist() == [0.0, 0.0]
    assert beyond == 1


def test_preload_without_a_bleed_jumps_to_the_opening_pressure() -> None:
    drops, _, lift, _ = solve(NUMBERS, CLOSED, table(opens_pa=2e6), np.array([1e-12, 1e-8]))
    assert drops == pytest.approx([2e6, 2e6], rel=0.03)
    assert drops[1] > drops[0]
    assert (lift > 0.0).all()


def test_flows_beyond_the_table_are_counted() -> None:
    short = table(max_pa=1e6, n=12)
    drops, pressure, lift, beyond = solve(NUMBERS, BLEED, short, FLOWS)
    assert beyond == (pressure > 1e6).sum() == 5
    assert (np.diff(drops) > 0).all()
    np.testing.assert_allclose(lift, lift_at(*short, pressure), rtol=1e-6)


def test_clicks_of_the_needle() -> None:
    areas = [bleed_area_m2(VALVE.bleed, c) for c in range(21)]
    assert (np.diff(areas) >= 0.0).all()
    assert areas[0] == pytest.approx(1e-6)
    assert bleed_area_m2(VALVE.bleed, None) == areas[10]
    all_a, all_b = bleed_settings(VALVE, OIL)
    assert all_a.size == all_b.size == 21
    assert (all_a[8], all_b[8]) == BLEED
    with pytest.raises(BadInput, match=r"clicks 21: .* 0 \(closed\) to 20"):
        bleed_numbers(VALVE, OIL, 21)
    fitted = VALVE.model_copy(update={"fitted_clicks": 8})
    assert bleed_numbers(fitted, OIL) == BLEED


def test_bleed_without_a_needle_has_one_setting() -> None:
    plain = Valve.model_validate(piston_valve("plain", bleed={"area_mm2": 2.0}))
    assert bleed_area_m2(plain.bleed, 7) == pytest.approx(2e-6)
    assert bleed_settings(plain, OIL)[0].size == 1
    none = Valve.model_validate(piston_valve("none", bleed={}))
    assert bleed_numbers(none, OIL) == CLOSED


def test_areas() -> None:
    ring = displaced_area_m2("piston_less_shaft", BODY)
    shaft, piston = displaced_area_m2("shaft", BODY), displaced_area_m2("piston", BODY)
    assert shaft == pytest.approx(201.062e-6, rel=1e-5)
    assert piston == pytest.approx(1661.903e-6, rel=1e-5)
    assert ring == pytest.approx(piston - shaft, rel=1e-14)


def test_thinner_oil_matters_only_where_oil_creeps() -> None:
    thin = thinner(OIL, 3.0)
    numbers, bleed = valve_numbers(VALVE, BODY, thin), bleed_numbers(VALVE, thin, 0)
    thick = bleed_numbers(VALVE, OIL, 0)
    slow = np.array([1e-9, 1e-3])
    thin_drop = solve(numbers, bleed, table(), slow)[0]
    thick_drop = solve(NUMBERS, thick, table(), slow)[0]
    assert thick_drop[0] / thin_drop[0] == pytest.approx(3.0, rel=0.01)
    assert thick_drop[1] / thin_drop[1] < 1.25


def test_a_check_valve_has_no_shim_numbers() -> None:
    valve = Valve.model_validate(check_valve("check"))
    with pytest.raises(TypeError, match="not a shim valve"):
        valve_numbers(valve, BODY, OIL)
