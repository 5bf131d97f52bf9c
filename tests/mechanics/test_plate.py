"""The plate's closed forms among each other, and the membrane's Green's function."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import solve_bvp

from optimiser.mechanics.membrane import inner_factor, outer_factor, stress_function
from optimiser.mechanics.plate import (
    pressure_response,
    pressure_slope,
    ring_deflection,
    ring_moment,
    ring_slope,
    slope_load_moment,
    slope_load_slope,
)
from optimiser.mechanics.plates import back_substitute, compliance, factor, inverse
from optimiser.mechanics.reference import ring_responses

STEP = 1e-6
places = st.floats(0.05, 0.95)
holes = st.floats(0.15, 0.8)
poissons = st.floats(0.0, 0.45)
steadily = settings(max_examples=50, deadline=None, derandomize=True)


@given(holes, places, places, poissons)
@steadily
def test_slope_is_the_derivative_of_deflection(b: float, x: float, y: float, nu: float) -> None:
    r, s = b + x * (1 - b), b + y * (1 - b)
    ahead, behind = (ring_deflection(r + d, s, b, 1.0, nu) for d in (STEP, -STEP))
    scale = abs(ring_slope(1.0, s, b, 1.0, nu))
    assert ring_slope(r, s, b, 1.0, nu) == pytest.approx(
        (ahead - behind) / (2 * STEP), rel=1e-5, abs=1e-5 * scale
    )


@given(holes, places, places, poissons)
@steadily
def test_moment_is_the_curvature(b: float, x: float, y: float, nu: float) -> None:
    """M_r = w'' + nu w' / r, away from the loaded ring where w'' has no derivative."""
    r, s = b + x * (1 - b), b + y * (1 - b)
    if abs(r - s) < 3 * STEP:
        return
    ahead, behind = (ring_slope(r + d, s, b, 1.0, nu) for d in (STEP, -STEP))
    moment = (ahead - behind) / (2 * STEP) + nu * ring_slope(r, s, b, 1.0, nu) / r
    scale = ring_moment(b, s, b, 1.0, nu)
    assert ring_moment(r, s, b, 1.0, nu) == pytest.approx(moment, rel=1e-4, abs=1e-5 * scale)


@given(holes, places, places, poissons)
@steadily
def test_slope_loads_are_derivatives_by_the_loaded_radius(
    b: float, x: float, y: float, nu: float
) -> None:
    r, s = b + x * (1 - b), b + y * (1 - b)
    if abs(r - s) < 3 * STEP:
        return
    for response, derivative in ((ring_slope, slope_load_slope), (ring_moment, slope_load_moment)):
        ahead, behind = (response(r, s + d, b, 1.0, nu) for d in (STEP, -STEP))
        scale = abs(derivative(b if response is ring_moment else 1.0, s, b, 1.0, nu))
        assert derivative(r, s, b, 1.0, nu) == pytest.approx(
            (ahead - behind) / (2 * STEP), rel=1e-4, abs=1e-4 * scale
        )


@given(holes, places, places, poissons)
@steadily
def test_closed_forms_solve_the_boundary_conditions(
    b: float, x: float, y: float, nu: float
) -> None:
    """The readable version solves six equations for each ring load instead."""
    r, s = b + x * (1 - b), b + y * (1 - b)
    found = ring_responses(np.array([r, 1.0]), np.array([s]), b, 1.0, nu)
    for values, closed in zip(found, (ring_deflection, ring_slope, ring_moment), strict=True):
        scale = abs(closed(1.0, s, b, 1.0, nu)) + abs(closed(b, s, b, 1.0, nu))
        assert values[0, 0] == pytest.approx(closed(r, s, b, 1.0, nu), rel=1e-7, abs=1e-9 * scale)


@given(holes, places, places, places, poissons)
@steadily
def test_pressure_is_ring_loads_added_up(
    b: float, x: float, low: float, high: float, nu: float
) -> None:
    """Against 2000 midpoints, which are good to 1e-4 here."""
    low, high = sorted((b + low * (1 - b), b + high * (1 - b)))
    if high - low < 0.01:
        return
    r = b + x * (1 - b)
    edges = np.linspace(low, high, 2001)
    s = (edges[1:] + edges[:-1]) / 2
    force = np.pi * np.diff(edges**2)
    sums = [
        sum(f * response(r, q, b, 1.0, nu) for f, q in zip(force, s, strict=True))
        for response in (ring_deflection, ring_moment, ring_slope)
    ]
    found = [
        pressure_response(r, low, high, b, 1.0, nu, False),
        pressure_response(r, low, high, b, 1.0, nu, True),
        pressure_slope(r, low, high, b, 1.0, nu),
    ]
    scale = abs(pressure_response(b, low, high, b, 1.0, nu, True))
    assert found == pytest.approx(sums, rel=1e-4, abs=1e-5 * scale)


def test_loads_on_the_clamp_do_nothing() -> None:
    for response in (ring_deflection, ring_slope):
        assert response(0.8, 0.5, 0.5, 1.0, 0.3) == 0.0
        assert response(0.5, 0.8, 0.5, 1.0, 0.3) == 0.0
    assert ring_moment(0.8, 0.5, 0.5, 1.0, 0.3) == 0.0


@pytest.mark.parametrize(("b", "nu"), [(0.3, 0.3), (0.5, 0.0), (0.7, 0.45)])
def test_membrane_force_solves_the_compatibility_equation(b: float, nu: float) -> None:
    """F'' + F'/r - F/r^2 = -(w')^2 / (2 r), F' = nu F/r at the clamp, F = 0 at the edge; by
    collocation."""

    def slope(r: np.ndarray) -> np.ndarray:
        return np.sin(2.0 * (r - b))

    def equations(r: np.ndarray, y: np.ndarray) -> np.ndarray:
        return np.array([y[1], y[0] / r**2 - y[1] / r - slope(r) ** 2 / (2 * r)])

    mesh = np.linspace(b, 1.0, 101)
    exact = solve_bvp(
        equations,
        lambda y, z: np.array([y[1] - nu * y[0] / b, z[0]]),
        mesh,
        np.zeros((2, mesh.size)),
        tol=1e-9,
    )
    assert exact.success
    roots, weights = np.polynomial.legendre.leggauss(400)
    points = b + (1 - b) * (1 + roots) / 2
    stretch = weights * (1 - b) / 2 * slope(points) ** 2 / 2
    inner = np.array([inner_factor(r, b, nu) for r in points])
    outer = np.array([outer_factor(r, b, 1.0, nu) for r in points])
    force = np.empty(points.size)
    stress_function(stretch, inner, outer, force)
    expected = exact.sol(points)[0]
    assert force == pytest.approx(expected, rel=1e-3, abs=1e-4 * np.max(expected))


def test_factor_and_inverse_of_a_compliance() -> None:
    radii = np.array([0.6, 0.75, 0.8, 1.0])
    flexible = compliance(radii, 0.5, 1.0, 0.3)
    assert flexible == pytest.approx(flexible.T)
    assert inverse(flexible) @ flexible == pytest.approx(np.eye(4), abs=1e-8)
    upper, reach = flexible.copy(), np.full(4, 3)
    assert factor(upper, reach, 4)
    right = np.array([1.0, 2.0, 3.0, 4.0])
    solution = right.copy()
    back_substitute(upper, reach, 4, solution)
    assert flexible @ solution == pytest.approx(right)
    assert not factor(-flexible, np.full(4, 3), 4)


def test_factor_keeps_to_the_rows_reach_and_fills_it() -> None:
    """A banded matrix whose factor has entries where the matrix has none."""
    matrix = np.array([[4.0, 1, 1, 0], [1, 4, 0, 0], [1, 0, 4, 1], [0, 0, 1, 4]])
    upper, reach = np.triu(matrix), np.array([2, 1, 3, 3])
    assert factor(upper, reach, 4)
    assert reach.tolist() == [2, 2, 3, 3]
    assert np.triu(upper).T @ np.triu(upper) == pytest.approx(matrix)
