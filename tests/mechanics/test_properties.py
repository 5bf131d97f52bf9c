"""What must hold for every stack, at every fidelity.

`linear` and `reported` are held to 0.1 % (their solver stops at 1e-9; closed contacts give way by
up to 1e-4 of the plates' own deflection). `search` stops when the edge moves by less than 0.1 % a
round and finds contacts at a few radii only: it is held to 1 %, where adding a shim adds radii to
2 %."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.mechanics import BackSpringForce, deflect

from .stacks import CLAMP, EDGE, KINDS, PORT, Question, opening_pressure, random_question

FIDELITIES: list[Any] = ["linear", "search", "reported"]
EXACT = {"linear": 1e-3, "search": 1e-2, "reported": 1e-3}
PLACE: dict[str, Any] = {"clamp_mm": CLAMP, "port_inner_mm": PORT[0], "port_outer_mm": PORT[1]}
NO_SEAT = ("single", "taper", "equals", "two stages")

#: Lifts closer than this are one lift.
ROUNDING_MM = 1e-12

seeds = st.integers(0, 2**32 - 1)
each_fidelity = pytest.mark.parametrize("fidelity", FIDELITIES)
# The same examples in every run: a build must not fail by chance.
quickly = settings(max_examples=20, deadline=None, derandomize=True)


def _question(seed: int, kind: str) -> Question:
    return random_question(np.random.default_rng(seed), kind)


def _edge(shims: Any, pressure: Any, fidelity: Any, **options: Any) -> np.ndarray:
    found = deflect(shims, pressures_mpa=pressure, fidelity=fidelity, **(PLACE | options))
    return found.edge_deflection_mm


@each_fidelity
@given(seed=seeds, kind=st.sampled_from(NO_SEAT), start=st.floats(0.05, 0.5))
@quickly
def test_more_pressure_never_lifts_less(fidelity: Any, seed: int, kind: str, start: float) -> None:
    question = _question(seed, kind)
    levels = question.bend_mpa * start * 1.25 ** np.arange(9)
    assert np.all(np.diff(_edge(question.shims, levels, fidelity)) > 0.0)


@each_fidelity
@given(seed=seeds, kind=st.sampled_from(KINDS), start=st.floats(0.05, 0.5))
@quickly
def test_more_pressure_never_opens_less(fidelity: Any, seed: int, kind: str, start: float) -> None:
    """With a seat the rise above it counts: the edge beyond a closed seat may dip as the port
    bulges."""
    question = _question(seed, kind)
    levels = question.bend_mpa * start * 1.25 ** np.arange(9)
    found = deflect(
        question.shims, pressures_mpa=levels, fidelity=fidelity, **PLACE, **question.options
    )
    assert np.all(np.diff(found.seat_lift_mm) >= -ROUNDING_MM)


def _without_gap(shims: tuple[tuple[float, ...], ...]) -> list[int]:
    """Shims that are no spacers: nothing wider lies behind them."""
    return [k for k, shim in enumerate(shims) if shim[0] >= max(s[0] for s in shims[k:])]


@each_fidelity
@given(
    seed=seeds,
    kind=st.sampled_from(NO_SEAT),
    pick=st.integers(0, 100),
    more=st.floats(1.01, 2.0),
    level=st.floats(0.1, 1.5),
)
@quickly
def test_a_thicker_shim_never_lifts_more(
    fidelity: Any, seed: int, kind: str, pick: int, more: float, level: float
) -> None:
    """Thicker spacers do: they widen the gap. So only the others are made thicker here."""
    question = _question(seed, kind)
    places = _without_gap(question.shims)
    at = places[pick % len(places)]
    thicker = list(question.shims)
    thicker[at] = (thicker[at][0], thicker[at][1] * more)
    pressure = question.bend_mpa * level
    before, after = (_edge(s, pressure, fidelity)[0] for s in (question.shims, thicker))
    assert after <= before * (1 + EXACT[fidelity])


@each_fidelity
@given(
    seed=seeds,
    kind=st.sampled_from(NO_SEAT),
    size=st.integers(13, 30),
    thickness=st.sampled_from([0.1, 0.2, 0.3]),
    level=st.floats(0.1, 1.5),
)
@quickly
def test_one_shim_more_behind_never_lifts_more(
    fidelity: Any, seed: int, kind: str, size: int, thickness: float, level: float
) -> None:
    question = _question(seed, kind)
    pressure = question.bend_mpa * level
    added = (*question.shims, (float(size), thickness))
    before, after = (_edge(s, pressure, fidelity)[0] for s in (question.shims, added))
    assert after <= before * (1 + 2 * EXACT[fidelity])


@each_fidelity
@given(seed=seeds, size=st.integers(13, 30), level=st.floats(0.1, 1.5))
@quickly
def test_one_shim_more_within_a_taper_never_lifts_more(
    fidelity: Any, seed: int, size: int, level: float
) -> None:
    question = _question(seed, "taper")
    added = sorted([*question.shims, (float(size), 0.2)], key=lambda shim: -shim[0])
    pressure = question.bend_mpa * level
    before, after = (_edge(s, pressure, fidelity)[0] for s in (question.shims, added))
    assert after <= before * (1 + 2 * EXACT[fidelity])


def _scaled(question: Question, length: float, thickness: float, e: float, rate: float) -> Any:
    """Everything across times ``length``, along the axis times ``thickness``, E times ``e``."""
    shims = [
        (s[0] * length, s[1] * thickness, *(h * length for h in s[2:])) for s in question.shims
    ]
    options = {**PLACE, **question.options, "youngs_mpa": 206000.0 * e}
    for name in ("clamp_mm", "port_inner_mm", "port_outer_mm", "seat_mm"):
        if name in options:
            options[name] *= length
    options["seat_height_mm"] = question.options.get("seat_height_mm", 0.0) * thickness
    if "back_spring" in options:
        ring, stiffness, preload = options["back_spring"]
        options["back_spring"] = BackSpringForce(
            ring * length, stiffness * rate, preload * rate * thickness
        )
    return shims, options


@each_fidelity
@given(
    seed=seeds,
    kind=st.sampled_from(KINDS),
    length=st.floats(0.7, 1.5),
    thickness=st.floats(0.7, 1.5),
    e=st.floats(0.5, 1.5),
)
@quickly
def test_scaling(
    fidelity: Any, seed: int, kind: str, length: float, thickness: float, e: float
) -> None:
    """Sizes by l, thicknesses, gaps and preloads by t, E by e: pressures by e t^4 / l^4 give
    deflections by t and stresses by e t^2 / l^2, von Karman's similarity; springs by e t^3 /
    l^2."""
    question = _question(seed, kind)
    levels = question.bend_mpa * np.array([0.3, 1.0])
    before = deflect(
        question.shims, pressures_mpa=levels, fidelity=fidelity, **PLACE, **question.options
    )
    shims, options = _scaled(question, length, thickness, e, e * thickness**3 / length**2)
    levels = levels * e * (thickness / length) ** 4
    after = deflect(shims, pressures_mpa=levels, fidelity=fidelity, **options)
    near = {"rel": 1e-4, "abs": 1e-6}
    assert after.edge_deflection_mm == pytest.approx(before.edge_deflection_mm * thickness, **near)
    stress = before.peak_stress_mpa * e * (thickness / length) ** 2
    assert after.peak_stress_mpa == pytest.approx(stress, rel=1e-4, abs=1e-4 * stress.max())


@each_fidelity
@given(seed=seeds, kind=st.sampled_from(KINDS), shuffle=st.randoms(use_true_random=False))
@quickly
def test_order_of_equal_diameters_does_not_matter(
    fidelity: Any, seed: int, kind: str, shuffle: Any
) -> None:
    """Neighbours of one diameter change places; each keeps its stress."""
    question = _question(seed, kind)
    order: list[int] = []
    start = 0
    for k in range(1, len(question.shims) + 1):
        ends = k == len(question.shims) or question.shims[k][0] != question.shims[start][0]
        if ends or len(question.shims[k]) == 3 or len(question.shims[start]) == 3:
            run = list(range(start, k))
            shuffle.shuffle(run)
            order += run
            start = k
    changed = [question.shims[k] for k in order]
    options = {"pressures_mpa": question.bend_mpa * np.array([0.3, 1.0]), **PLACE}
    before = deflect(question.shims, fidelity=fidelity, **options, **question.options)
    after = deflect(changed, fidelity=fidelity, **options, **question.options)
    near = {"rel": 1e-6, "abs": 1e-9}
    assert after.edge_deflection_mm == pytest.approx(before.edge_deflection_mm, **near)
    assert after.seat_lift_mm == pytest.approx(before.seat_lift_mm, **near)
    stress = before.peak_stress_mpa[:, order]
    assert after.peak_stress_mpa == pytest.approx(stress, rel=1e-6, abs=1e-6 * stress.max())


@each_fidelity
@given(seed=seeds, kind=st.sampled_from(KINDS), shuffle=st.randoms(use_true_random=False))
@quickly
def test_pressures_may_come_in_any_order_and_number(
    fidelity: Any, seed: int, kind: str, shuffle: Any
) -> None:
    """The answer to one pressure does not depend on its company: 1e-5 (`search`: 0.5 %, since it
    starts from where the last pressure ended), of the rise or of a tenth of a thickness."""
    question = _question(seed, kind)
    levels = list(question.bend_mpa * np.array([0.1, 0.3, 0.31, 1.0, 2.0, 1.0]))
    shuffle.shuffle(levels)
    options = {"fidelity": fidelity, **PLACE, **question.options}
    together = deflect(question.shims, pressures_mpa=levels, **options)
    bound = 5e-3 if fidelity == "search" else 1e-5
    for k, level in enumerate(levels):
        alone = deflect(question.shims, pressures_mpa=level, **options)
        rise, other = together.edge_deflection_mm[k], alone.edge_deflection_mm[0]
        assert abs(rise - other) <= bound * max(abs(other), 0.1 * question.shims[0][1])
    assert together.pressure_mpa == pytest.approx(levels)


@each_fidelity
@pytest.mark.parametrize("gap", [0.05, 0.1, 0.2])
def test_continuous_across_a_gap_closing(fidelity: Any, gap: float) -> None:
    """In 40 equal steps of pressure the rise grows by less and less, and never jumps."""
    shims = [(EDGE, 0.15), (EDGE, 0.15), (18.0, gap), (EDGE, 0.2), (26.0, 0.2)]
    closes = 2.0 * opening_pressure(shims[:2]) * gap / 0.15
    rise = _edge(shims, closes * np.arange(1, 41) / 10, fidelity)
    steps = np.diff(rise, prepend=0.0)
    noise = {"linear": 1e-4, "search": 2e-3, "reported": 1e-4}[fidelity] * rise
    assert np.all(steps > 0.0)
    assert np.all(np.diff(steps) < noise[1:])
    # the second stage does come in: without it the last steps would stay as they were
    assert steps[-1] < 0.8 * steps[0]


@each_fidelity
@given(seed=seeds, level=st.floats(0.2, 1.5))
@quickly
def test_no_gap_is_a_gap_of_nothing(fidelity: Any, seed: int, level: float) -> None:
    """A crossover of thickness g changes the rise by no more than 3 g, so that the stack goes over
    into the one without it; 0.4 % come on top (measured 0.22 %), since its neighbours are pressed
    together at radii instead of merged. And a wider gap never lifts less."""
    rng = np.random.default_rng(seed)
    front = [(EDGE, float(t)) for t in rng.choice([0.1, 0.15, 0.2], 2)]
    behind = [(EDGE, float(rng.choice([0.1, 0.2]))), (24.0, 0.2), (18.0, 0.2)]
    pressure = level * opening_pressure([*front, *behind])
    without = _edge([*front, *behind], pressure, fidelity)[0]
    gaps = np.array([1e-5, 1e-4, 1e-3, 1e-2])
    rises = np.array([_edge([*front, (16.0, g), *behind], pressure, fidelity)[0] for g in gaps])
    assert np.all(np.abs(rises - without) < 3 * gaps + 4e-3 * without)
    assert np.all(np.diff(rises) > -EXACT[fidelity] * without)


@each_fidelity
def test_no_pressure_no_lift(fidelity: Any) -> None:
    found = deflect(
        [(EDGE, 0.2), (24.0, 0.2)], pressures_mpa=[0.0, 0.1], fidelity=fidelity, **PLACE
    )
    assert found.edge_deflection_mm[0] == pytest.approx(0.0, abs=1e-12)
    assert found.peak_stress_mpa[0] == pytest.approx([0.0, 0.0], abs=1e-9)
    assert not found.outside_model[0]


@each_fidelity
@given(seed=seeds, kind=st.sampled_from(KINDS), fillers=st.integers(1, 3))
@quickly
def test_shims_no_wider_than_the_clamp_only_fill_height(
    fidelity: Any, seed: int, kind: str, fillers: int
) -> None:
    """Behind everything they change nothing, and bear nothing."""
    question = _question(seed, kind)
    options = {"fidelity": fidelity, **PLACE, **question.options}
    before = deflect(question.shims, pressures_mpa=question.bend_mpa, **options)
    filled = [*question.shims, *[(CLAMP, 0.3)] * fillers]
    after = deflect(filled, pressures_mpa=question.bend_mpa, **options)
    assert after.edge_deflection_mm == pytest.approx(before.edge_deflection_mm, rel=1e-9)
    assert np.all(after.peak_stress_mpa[:, -fillers:] == 0.0)
    assert np.all(after.clamp_moment_n[:, -fillers:] == 0.0)
