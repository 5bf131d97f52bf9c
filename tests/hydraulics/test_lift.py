"""Interpolation of a stack's lift table."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import PchipInterpolator

from optimiser.faults import BadInput
from optimiser.hydraulics.lift import LiftTable, lift_at, opening, pressure_grid

from .examples import stiffening_lift_m, table

fast = settings(max_examples=60, deadline=None)
lift_steps = st.lists(st.floats(0.0, 1e-4), min_size=2, max_size=12)


@fast
@given(lift_steps, st.integers(0, 100))
def test_same_as_scipy_inside_the_table(steps: list[float], seed: int) -> None:
    """An open table is SciPy's PCHIP through the origin and the entries."""
    lift = np.cumsum(np.array(steps) + 1e-6)
    pressure = np.cumsum(np.random.default_rng(seed).uniform(1e4, 1e6, lift.size))
    scipy = PchipInterpolator(np.r_[0.0, pressure], np.r_[0.0, lift])
    wanted = np.linspace(0.0, pressure[-1], 200)
    np.testing.assert_allclose(
        lift_at(pressure, lift, wanted), scipy(wanted), rtol=1e-9, atol=1e-15
    )


@fast
@given(lift_steps, st.integers(0, 4))
def test_never_falls_and_meets_every_entry(steps: list[float], closed: int) -> None:
    lift = np.r_[np.zeros(closed), np.cumsum(steps)]
    pressure = 1e5 * np.arange(1, lift.size + 1) ** 1.5
    fine = lift_at(pressure, lift, np.linspace(0.0, 2 * pressure[-1], 500))
    assert (np.diff(fine) >= -1e-15).all()
    np.testing.assert_allclose(lift_at(pressure, lift, pressure), lift, rtol=1e-12, atol=1e-18)


def test_goes_on_straight_past_the_end() -> None:
    pressure, lift = table(max_pa=4e6, n=12)
    beyond = lift_at(pressure, lift, pressure[-1] * np.array([1.0, 1.1, 1.2, 1.3]))
    assert np.ptp(np.diff(beyond)) < 1e-12 * beyond[-1]
    assert np.diff(beyond)[0] > 0.0


@fast
@given(st.floats(1e5, 6e6))
def test_opening_pressure_of_a_preloaded_stack(opens: float) -> None:
    """Exact when it is an entry (a stiffening curve's tangent never meets 0 above it)."""
    pressure, lift = table(n=20, opens_pa=opens)
    first, found = opening(pressure, lift)
    assert (first, found) == (1, opens)
    assert lift_at(pressure, lift, np.array([0.999 * opens]))[0] == 0.0


@fast
@given(st.floats(1e5, 6e6))
def test_opening_pressure_that_is_no_entry(opens: float) -> None:
    """Extrapolated, and never off by more than the step it lies in."""
    pressure = pressure_grid(12e6, 40)
    lift = stiffening_lift_m(pressure, opens_pa=opens)
    first, found = opening(pressure, lift)
    assert pressure[first - 1] <= found < pressure[first]
    assert found == pytest.approx(opens, abs=0.35 * (pressure[first] - pressure[first - 1]))


def test_table_that_never_opens() -> None:
    pressure = pressure_grid(1e6, 5)
    assert opening(pressure, np.zeros(5)) == (5, pressure[-1])
    assert (lift_at(pressure, np.zeros(5), np.array([1e5, 1e6, 1e8])) == 0.0).all()


def test_table_with_one_open_entry() -> None:
    pressure = np.array([1e6, 2e6, 3e6])
    lift = np.array([0.0, 0.0, 1e-4])
    assert lift_at(pressure, lift, np.array([2e6, 2.5e6, 3e6, 4e6])) == pytest.approx(
        [0.0, 5e-5, 1e-4, 2e-4]
    )


def test_coarse_table_is_near_the_exact_lift() -> None:
    pressure, lift = table(max_pa=10e6, n=16)
    wanted = np.geomspace(2e4, 10e6, 300)
    exact = stiffening_lift_m(wanted)
    np.testing.assert_allclose(lift_at(pressure, lift, wanted), exact, rtol=1e-3)


@fast
@given(st.floats(1e3, 1e8), st.integers(3, 64), st.floats(0.0, 0.9))
def test_pressure_grid(most: float, n: int, part: float) -> None:
    grid = pressure_grid(most, n, part * most)
    assert grid.size == n
    assert part == 0.0 or grid[0] == part * most
    assert grid[-1] == most
    assert grid[0] > 0.0
    assert (np.diff(grid, n=2) > 0.0).all()


def test_pressure_grid_needs_room() -> None:
    with pytest.raises(ValueError, match="opens_pa < max_pa"):
        pressure_grid(0.0, 8)
    with pytest.raises(ValueError, match="n >= 3"):
        pressure_grid(1.0, 2)


@pytest.mark.parametrize(
    ("pressure", "lift", "words"),
    [
        ([1.0, 2.0], [0.1], "as many lifts as pressures"),
        ([1.0], [0.1], "two or more"),
        ([2.0, 1.0], [0.1, 0.2], "rise"),
        ([1.0, np.nan], [0.1, 0.2], "finite"),
        ([1.0, 2.0], [-0.1, 0.2], "0 or more"),
    ],
)
def test_tables_that_cannot_be(pressure: list[float], lift: list[float], words: str) -> None:
    with pytest.raises(BadInput, match=words):
        LiftTable.from_mm(pressure, lift)


def test_table_from_mm() -> None:
    made = LiftTable.from_mm([1.0, 2.0], [0.1, 0.3])
    np.testing.assert_allclose(made.pressure_pa, [1e6, 2e6])
    np.testing.assert_allclose(made.lift_m, [1e-4, 3e-4])
