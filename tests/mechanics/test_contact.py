"""Contact and equilibrium, looked at from inside the solvers."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.mechanics import BackSpringForce, deflect
from optimiser.mechanics.plate import ring_deflection

from .solved import POISSON, YOUNGS, fine, quick_contacts
from .stacks import CLAMP, EDGE, KINDS, PORT, SEAT, Question, random_question

seeds = st.integers(0, 2**32 - 1)
kinds = st.sampled_from(KINDS)
LEVELS = np.array([0.2, 0.7, 1.5])
PLACE: dict[str, Any] = {"clamp_mm": CLAMP, "port_inner_mm": PORT[0], "port_outer_mm": PORT[1]}


def _question(seed: int, kind: str) -> Question:
    return random_question(np.random.default_rng(seed), kind)


def _lift_n_mm(r: float, s: float, thickness: float) -> float:
    """Deflection mm at diameter r under 1 N on the ring of diameter s, of one 30 mm shim."""
    rigidity = YOUNGS * 1e-6 * thickness**3 / (12 * (1 - POISSON**2))
    return ring_deflection(r / 2, s / 2, CLAMP / 2, EDGE / 2, POISSON) / rigidity


@given(seeds, kinds, st.booleans())
@settings(max_examples=30, deadline=None, derandomize=True)
def test_fine_contacts_press_or_gape(seed: int, kind: str, stretched: bool) -> None:
    """Overlaps stay below 0.1 % of the largest deflection: closed contacts are 1e4 times stiffer
    than the plates there."""
    question = _question(seed, kind)
    solved = fine(question, question.bend_mpa * LEVELS, stretched)
    for p in range(LEVELS.size):
        force, clear = solved.contacts(p)
        assert np.all(force >= 0.0)
        assert np.all(clear >= 0.0)
        assert not np.any((force > 0.0) & (clear > 0.0))
        overlap = force / np.where(solved.model.push > 0, solved.model.push, 1.0)
        assert np.max(overlap, initial=0.0) < 1e-3 * np.max(np.abs(solved.shapes[p]))


@given(seeds, kinds)
@settings(max_examples=40, deadline=None, derandomize=True)
def test_quick_contacts_press_or_gape(seed: int, kind: str) -> None:
    question = _question(seed, kind)
    for row in quick_contacts(question, question.bend_mpa * LEVELS):
        contacts = [contact for contact in row if not contact.sprung]
        largest = max((contact.force for contact in row), default=0.0)
        for force, clear, _ in contacts:
            assert force >= -1e-8 * largest
            assert clear > -1e-10
            assert min(force / max(largest, 1e-9), clear / 1e-3) < 1e-8


@given(seeds, kinds, st.booleans())
@settings(max_examples=25, deadline=None, derandomize=True)
def test_forces_balance_at_every_radius(seed: int, kind: str, stretched: bool) -> None:
    """What is left over is below a millionth of the largest elastic force at any radius."""
    question = _question(seed, kind)
    solved = fine(question, question.bend_mpa * LEVELS, stretched)
    for p in range(LEVELS.size):
        model, shape = solved.model, solved.shapes[p]
        inside = [
            np.abs(model.bending[g, :k, :k]) @ np.abs(shape[model.start[g] : model.start[g] + k])
            for g, k in enumerate(model.held)
        ]
        assert np.max(np.abs(solved.residual(p))) < 1e-6 * np.max(np.concatenate(inside))


@given(seeds, kinds, st.booleans())
@settings(max_examples=25, deadline=None, derandomize=True)
def test_no_other_shape_has_less_energy(seed: int, kind: str, stretched: bool) -> None:
    question = _question(seed, kind)
    solved = fine(question, np.array([question.bend_mpa]), stretched)
    shape = solved.shapes[0]
    least = solved.energy(shape, 0)
    rng = np.random.default_rng(seed)
    for size in (1e-6, 1e-3, 0.3):
        other = shape * (1 + size * rng.standard_normal(shape.size))
        assert solved.energy(other, 0) >= least - 1e-9 * abs(least)
        assert solved.energy(shape * (1 + size), 0) >= least - 1e-9 * abs(least)


@pytest.mark.parametrize("fidelity", ["linear", "search", "reported"])
def test_a_ring_between_two_shims_bends_both_apart(fidelity: Any) -> None:
    """The ring overfills the filler's gap by g. Two equal shims share it, and since they open wider
    outwards, only the ring's hole presses: with g / (2 c), c a shim's compliance there (closed
    form). g is small, so that nothing stretches."""
    t, hole, g = 0.2, 24.0, 0.002
    shims = [(EDGE, t), (28.0, 0.1 + g, hole), (16.0, 0.1), (EDGE, t)]
    found = deflect(shims, pressures_mpa=[0.0], fidelity=fidelity, **PLACE)
    force = g / 2 / _lift_n_mm(hole, hole, t)
    edge = -force * _lift_n_mm(EDGE, hole, t)
    assert found.edge_deflection_mm[0] == pytest.approx(edge, rel=0.005)


@pytest.mark.parametrize("stretched", [False, True])
def test_seat_force_of_a_preloaded_shim_at_rest(stretched: bool) -> None:
    """Raised by a small height h, the seat presses with h / c(seat, seat)."""
    height, t = 1e-4, 0.2
    question = Question(((EDGE, t),), {"seat_mm": SEAT, "seat_height_mm": height}, 0.0)
    force, _ = fine(question, np.array([0.0]), stretched).contacts(0)
    assert force[-1] == pytest.approx(height / _lift_n_mm(SEAT, SEAT, t), rel=1e-3)


@pytest.mark.parametrize("fidelity", ["linear", "search", "reported"])
def test_preload_lifts_off_where_the_pressure_outbends_the_seat(fidelity: Any) -> None:
    """Linear: it opens at the pressure that would lift a free shim to the seat's height."""
    shim, height = [(EDGE, 0.2)], 0.004
    free = deflect(shim, pressures_mpa=0.01, seat_mm=SEAT, fidelity="linear", **PLACE)
    opens = 0.01 * height / float(free.seat_lift_mm[0])
    levels = opens * np.array([0.5, 0.98, 1.02, 2.0])
    found = deflect(
        shim, pressures_mpa=levels, seat_mm=SEAT, seat_height_mm=height, fidelity=fidelity, **PLACE
    )
    assert np.all(found.seat_lift_mm[:2] == 0.0)
    assert found.seat_lift_mm[2:] == pytest.approx(height * np.array([0.02, 1.0]), rel=0.05)


@pytest.mark.parametrize("fidelity", ["linear", "search", "reported"])
def test_back_spring_is_one_more_stiffness(fidelity: Any) -> None:
    """At small lift: rise without spring less that under the spring's own force (closed form)."""
    t, ring, rate, preload, q = 0.2, 20.0, 150.0, 0.05, 0.002
    shim = [(EDGE, t)]
    free = deflect(shim, pressures_mpa=q, fidelity="linear", **PLACE)
    at_ring = deflect(shim, pressures_mpa=q, seat_mm=ring, fidelity="linear", **PLACE)
    lift = float(at_ring.seat_lift_mm[0])
    flex = _lift_n_mm(ring, ring, t)
    force = (preload + rate * lift) / (1 + rate * flex)
    expected = float(free.edge_deflection_mm[0]) - force * _lift_n_mm(EDGE, ring, t)
    spring = BackSpringForce(ring, rate, preload)
    found = deflect(shim, pressures_mpa=q, fidelity=fidelity, back_spring=spring, **PLACE)
    assert found.edge_deflection_mm[0] == pytest.approx(expected, rel=2e-3)
