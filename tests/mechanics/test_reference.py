"""The fast kernels against the readable version, on random stacks of every kind.

Bounds are about one and a half times the largest differences measured over 800 stacks (100 a kind,
seed 11, four pressures from a fifth of the bending pressure to twice it, edge rise below two
thicknesses). `linear` and `reported` use the same radii as the readable version, so only
quadrature and the softness of closed contacts (1e-4 of the plates') remain. `search` looks for
contacts at shim edges, the seat and two radii of the port only: good for lift and for the stack's
peak stress, less so for a single shim's own moment when it is pressed between these radii."""

import numpy as np
import pytest

from optimiser.mechanics import deflect
from optimiser.mechanics.reference import reference_deflect

from .compare import Apart, apart
from .stacks import KINDS, random_questions

LEVELS = np.array([0.2, 0.5, 1.0, 2.0])
STACKS = 8

#: Measured: lift 0.50 %, moment 0.29 %, stress 0.29 %.
SAME_RADII = Apart(0.0075, 0.005, 0.005)
#: Measured, in the order single, taper, equals, two stages, preload, ring, spring, everything:
#: lift 0.5 0.7 1.4 1.5 1.0 2.5 0.8 4.6 %, moment 0.4 2.5 13 10 3.7 6.2 2.5 15 %,
#: stress 0.3 1.3 3.9 4.2 2.8 11 2.0 6.7 %.
QUICK = {
    "single": Apart(0.007, 0.006, 0.005),
    "taper": Apart(0.012, 0.04, 0.02),
    "equals": Apart(0.02, 0.19, 0.06),
    "two stages": Apart(0.022, 0.15, 0.065),
    "preload": Apart(0.015, 0.055, 0.04),
    "ring": Apart(0.035, 0.095, 0.16),
    "spring": Apart(0.015, 0.04, 0.03),
    "everything": Apart(0.07, 0.23, 0.1),
}


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("stretched", [False, True])
def test_fine_fidelities(kind: str, stretched: bool) -> None:
    for question in random_questions(21, [kind], STACKS):
        pressures = question.bend_mpa * LEVELS
        options = {"pressures_mpa": pressures, **question.place, **question.options}
        reference = reference_deflect(question.shims, stretched=stretched, **options)
        fidelity = "reported" if stretched else "linear"
        found = deflect(question.shims, fidelity=fidelity, **options)
        off = apart(question, found, reference)
        assert np.all(np.array(off) < SAME_RADII), f"{off} for {question}"


@pytest.mark.parametrize("kind", KINDS)
def test_search(kind: str) -> None:
    for question in random_questions(22, [kind], STACKS):
        pressures = question.bend_mpa * LEVELS
        options = {"pressures_mpa": pressures, **question.place, **question.options}
        reference = reference_deflect(question.shims, **options)
        off = apart(question, deflect(question.shims, fidelity="search", **options), reference)
        assert np.all(np.array(off) < QUICK[kind]), f"{off} for {question}"


def test_search_is_usually_much_closer() -> None:
    """Over all kinds, the median lift is 0.4 % off and the median peak stress 0.4 % (measured)."""
    found = []
    for question in random_questions(23, KINDS, 5 * len(KINDS)):
        options = {
            "pressures_mpa": question.bend_mpa * LEVELS, **question.place, **question.options
        }  # fmt: skip
        quick = deflect(question.shims, fidelity="search", **options)
        fine = deflect(question.shims, fidelity="reported", **options)
        found.append(apart(question, quick, fine))
    lift, _, stress = np.median(np.array(found), axis=0)
    assert lift < 0.008
    assert stress < 0.008


def test_forces_and_clearances_of_the_readable_version() -> None:
    """It is exact where the kernels are only close: no pull, no overlap, never both."""
    for question in random_questions(24, KINDS, 2 * len(KINDS)):
        found = reference_deflect(
            question.shims, pressures_mpa=question.bend_mpa, **question.place, **question.options
        )
        force, clear = found.contact_force_n, found.clearance_mm
        if force.size == 0:
            continue
        assert np.all(force >= 0.0)
        assert np.all(clear > -1e-10)
        assert np.all(np.minimum(force / max(1e-9, force.max()), np.abs(clear)) < 1e-8)
