"""One shim in millimetres and newtons, and what holds for every plate.

Values computed from the closed forms of S. Timoshenko and S. Woinowsky-Krieger, *Theory of Plates
and Shells*, 2nd ed. (1959), art. 16-17, for outer diameter 20 mm, clamp 12 mm, thickness 0.15 mm,
E = 206 GPa, Poisson's ratio 0.3: 10 N on the edge give 63.142 um and 242.85 MPa, 1 bar over the
free part gives 55.091 um and 274.70 MPa. Invariants after the same chapter."""

from math import pi

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.mechanics import deflect
from optimiser.mechanics.plate import (
    pressure_response,
    ring_deflection,
    ring_moment,
    ring_slope,
    slope_load_moment,
    slope_load_slope,
)

E, NU, T = 206000.0, 0.3, 0.15
OUTER, CLAMP = 20.0, 12.0

shares = st.floats(0.02, 1.0)
holes = st.floats(0.1, 0.9)
poissons = st.floats(0.0, 0.45)


def test_ten_newtons_on_the_edge() -> None:
    rigidity = E * T**3 / (12 * (1 - NU**2))
    lift = 10 * ring_deflection(OUTER / 2, OUTER / 2, CLAMP / 2, OUTER / 2, NU) / rigidity
    stress = 6 * 10 * ring_moment(CLAMP / 2, OUTER / 2, CLAMP / 2, OUTER / 2, NU) / T**2
    assert 1000 * lift == pytest.approx(63.142, abs=0.0005)
    assert stress == pytest.approx(242.85, abs=0.005)


def test_one_bar_over_the_free_part() -> None:
    found = deflect([(OUTER, T)], CLAMP, CLAMP, OUTER, 0.1, fidelity="linear")
    assert 1000 * found.edge_deflection_mm[0] == pytest.approx(55.091, abs=0.0005)
    assert found.peak_stress_mpa[0, 0] == pytest.approx(274.70, abs=0.005)
    assert 6 * found.clamp_moment_n[0, 0] / T**2 == pytest.approx(274.70, abs=0.005)


@given(holes, shares, shares, poissons)
@settings(max_examples=60, deadline=None)
def test_reciprocity_of_equal_total_forces(b: float, x: float, y: float, nu: float) -> None:
    """Maxwell and Betti: lift at r under 1 N at s equals lift at s under 1 N at r; so do slopes
    under slope loads."""
    r, s = b + x * (1 - b), b + y * (1 - b)
    for response in (ring_deflection, slope_load_slope):
        there, back = response(r, s, b, 1.0, nu), response(s, r, b, 1.0, nu)
        assert there == pytest.approx(back, rel=1e-7, abs=1e-15)


@given(holes, shares, poissons)
@settings(max_examples=60, deadline=None)
def test_no_moment_at_the_free_edge(b: float, y: float, nu: float) -> None:
    s = b + y * (1 - b)
    at_clamp = ring_moment(b, s, b, 1.0, nu)
    assert abs(ring_moment(1.0, s, b, 1.0, nu)) <= 1e-9 * at_clamp
    assert abs(slope_load_moment(1.0, s, b, 1.0, nu)) <= 1e-9 * slope_load_moment(b, s, b, 1.0, nu)
    pressed = pressure_response(1.0, b, s, b, 1.0, nu, True)
    assert abs(pressed) <= 1e-9 * pressure_response(b, b, s, b, 1.0, nu, True)


@given(holes, shares, poissons)
@settings(max_examples=60, deadline=None)
def test_held_flat_at_the_clamp(b: float, y: float, nu: float) -> None:
    s, near = b + y * (1 - b), b * (1 + 1e-9)
    assert ring_deflection(b, s, b, 1.0, nu) == ring_slope(b, s, b, 1.0, nu) == 0.0
    assert abs(ring_slope(near, s, b, 1.0, nu)) <= 1e-6 * abs(ring_slope(1.0, s, b, 1.0, nu))


@given(holes, shares, st.floats(0.15, 0.95), poissons)
@settings(max_examples=60, deadline=None)
def test_vertical_balance_inside_the_load(b: float, x: float, y: float, nu: float) -> None:
    """Between clamp and load the shear carries the whole force: r d/dr(w'' + w'/r) = -1 / (2
    pi)."""
    s = b + y * (1 - b)
    r = b + x * 0.9 * (s - b)

    def curvature_sum(at: float) -> float:
        slope = ring_slope(at, s, b, 1.0, nu) / at
        return (ring_moment(at, s, b, 1.0, nu) - nu * slope) + slope

    step = 1e-4 * b
    shear = (curvature_sum(r + step) - curvature_sum(r - step)) / (2 * step)
    assert r * shear == pytest.approx(-1 / (2 * pi), rel=1e-4)


@given(st.floats(0.5, 2.0), st.floats(0.5, 2.0), st.floats(0.5, 2.0))
@settings(max_examples=25, deadline=None)
def test_scaling_with_stiffness_thickness_and_size(e: float, t: float, size: float) -> None:
    """w goes as q a^4 / (E t^3), stress as q a^2 / t^2."""
    base = deflect([(OUTER, T)], CLAMP, 14.0, 18.0, 0.1, fidelity="linear")
    scaled = deflect(
        [(size * OUTER, t * T)],
        size * CLAMP,
        size * 14.0,
        size * 18.0,
        0.1,
        youngs_mpa=e * E,
        fidelity="linear",
    )
    lift = base.edge_deflection_mm[0] * size**4 / (e * t**3)
    assert scaled.edge_deflection_mm[0] == pytest.approx(lift, rel=1e-7)
    assert scaled.peak_stress_mpa[0, 0] == pytest.approx(
        base.peak_stress_mpa[0, 0] * (size / t) ** 2, rel=1e-7
    )
