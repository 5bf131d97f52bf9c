"""Single restrictions: inverses, limits and laws that must hold for any numbers."""

from math import inf, pi, radians, sin

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.hydraulics.restrictions import (
    check_drop,
    curtain_flow,
    curtain_unit_terms,
    drop,
    flow,
    needle_area,
    orifice_term,
    port_terms,
    share,
    short_tube_terms,
)

fast = settings(max_examples=60, deadline=None)
viscous = st.floats(1e5, 1e14)
inertial = st.floats(1e8, 1e18)
flows = st.floats(1e-9, 1e-2)


@fast
@given(viscous | st.just(0.0), inertial, flows, st.sampled_from([1.0, -1.0]))
def test_flow_undoes_drop(a: float, b: float, q: float, sign: float) -> None:
    assert flow(drop(sign * q, a, b), a, b) == pytest.approx(sign * q, rel=1e-12)


@fast
@given(viscous, flows)
def test_without_inertia_flow_is_proportional(a: float, q: float) -> None:
    assert flow(a * q, a, 0.0) == pytest.approx(q, rel=1e-14)
    assert flow(a * q, a, 1e-30) == pytest.approx(q, rel=1e-14)


def test_closed_and_free_passages() -> None:
    assert flow(1e6, inf, inf) == 0.0
    assert drop(0.0, inf, inf) == 0.0
    assert drop(1e-6, inf, inf) == inf
    assert flow(0.0, 0.0, 0.0) == 0.0
    assert flow(1.0, 0.0, 0.0) == inf
    assert flow(-1.0, 0.0, 0.0) == -inf
    assert short_tube_terms(0.0, 2e-3, 0.7, 850.0, 0.01) == (inf, inf)
    assert orifice_term(0.0, 0.7, 850.0) == inf


@fast
@given(viscous, inertial, viscous, inertial, flows)
def test_parallel_passages_share_one_drop(
    a: float, b: float, a2: float, b2: float, q: float
) -> None:
    through = share(q, a, b, a2, b2)
    assert 0.0 < through <= q
    across = drop(through, a, b)
    assert flow(across, a, b) + flow(across, a2, b2) == pytest.approx(q, rel=1e-9)


def test_share_with_a_closed_passage() -> None:
    assert share(1e-4, 1e8, 1e12, inf, inf) == 1e-4
    assert share(1e-4, inf, inf, 1e8, 1e12) == 0.0
    assert share(0.0, 1e8, 1e12, 1e8, 1e12) == 0.0
    assert share(1e-4, 1e8, 1e12, 1e8, 1e12) == pytest.approx(5e-5, rel=1e-14)


@fast
@given(st.floats(1e-7, 2e-3), st.floats(1e3, 3e7))
def test_curtain_is_the_plain_law_at_its_lift(lift: float, pressure: float) -> None:
    a, b = curtain_unit_terms(18e-3, 1e-3, 0.8, 0.61, 850.0, 0.012)
    plain = flow(pressure, a / lift**3, b / lift**2)
    assert curtain_flow(pressure, lift, a, b) == pytest.approx(plain, rel=1e-12)


@fast
@given(st.floats(0.0, 1e-3), st.floats(1.01, 3.0), st.floats(1e3, 1e7))
def test_curtain_passes_more_the_wider_it_opens(y: float, more: float, pressure: float) -> None:
    a, b = curtain_unit_terms(18e-3, 1e-3, 1.0, 0.61, 850.0, 0.012)
    narrow, wide = curtain_flow(pressure, y, a, b), curtain_flow(pressure, more * y, a, b)
    assert wide > narrow or y < 1e-60
    assert curtain_flow(pressure, 0.0, a, b) == 0.0
    assert curtain_flow(0.0, 1e-4, a, b) == 0.0


@fast
@given(st.floats(0.1, 1.0))
def test_curtain_open_over_part_of_the_seat(part: float) -> None:
    """Flow per open length does not change: both terms are those of a shorter seat."""
    whole = curtain_unit_terms(18e-3, 1e-3, 1.0, 0.61, 850.0, 0.012)
    some = curtain_unit_terms(18e-3, 1e-3, part, 0.61, 850.0, 0.012)
    q = curtain_flow(1e6, 2e-4, *whole)
    assert curtain_flow(1e6, 2e-4, *some) == pytest.approx(part * q, rel=1e-12)


def test_needle_area_against_the_frustum() -> None:
    """Lateral area of a cone frustum, pi s (r1 + r2), with s square to the flank."""
    jet, cone, lift = 3e-3, 30.0, 0.8e-3
    half = radians(15.0)
    s = lift * sin(half)
    r1 = jet / 2
    r2 = r1 - s * np.cos(half)
    assert needle_area(jet, cone, lift) == pytest.approx(pi * s * (r1 + r2), rel=1e-13)


@fast
@given(st.floats(1e-3, 8e-3), st.floats(2.0, 118.0), st.floats(0.0, 0.1), st.floats(1e-6, 0.1))
def test_needle_opens_steadily_to_the_bore(jet: float, cone: float, x: float, more: float) -> None:
    bore = pi * jet * jet / 4
    near, far = needle_area(jet, cone, x), needle_area(jet, cone, x + more)
    assert 0.0 <= near <= far <= bore
    assert needle_area(jet, cone, 0.0) == 0.0
    assert needle_area(jet, cone, 10.0) == pytest.approx(bore, rel=1e-14)


@fast
@given(flows, st.floats(0.0, 1e6), inertial, viscous, inertial)
def test_check_valve_beside_a_bleed(
    q: float, cracking: float, b: float, a2: float, b2: float
) -> None:
    across = check_drop(q, cracking, b, a2, b2)
    through = flow(across - cracking, 0.0, b) if across > cracking else 0.0
    assert through + flow(across, a2, b2) == pytest.approx(q, rel=1e-6)


def test_check_valve_alone() -> None:
    b = orifice_term(90e-6, 0.65, 850.0)
    assert check_drop(1e-3, 2e4, b, inf, inf) == pytest.approx(2e4 + b * 1e-6, rel=1e-14)
    assert check_drop(0.0, 2e4, b, inf, inf) == 0.0
    assert check_drop(1e-4, 2e4, inf, 1e8, 1e12) == drop(1e-4, 1e8, 1e12)


@fast
@given(st.floats(1.1, 10.0))
def test_port_scaling(k: float) -> None:
    """Geometrically similar ports: a as 1/k^3, b as 1/k^4; b as 1/Cd^2."""
    a, b = port_terms(100e-6, 5e-3, 10e-3, 0.5, 850.0, 0.01)
    wide = port_terms(100e-6 * k * k, 5e-3 * k, 10e-3 * k, 0.5, 850.0, 0.01)
    assert wide == pytest.approx((a / k**3, b / k**4), rel=1e-12)
    free = port_terms(100e-6, 5e-3, 10e-3, 1.0, 850.0, 0.01)
    assert free == pytest.approx((a, b / 4), rel=1e-14)
