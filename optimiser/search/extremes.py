"""The softest and the firmest stacks of a space: what the stock alone allows."""

from dataclasses import replace

import numpy as np

from optimiser.envelope import damper_limits
from optimiser.search.counts import Counts, Plans
from optimiser.search.evaluate import ModelEvaluator
from optimiser.search.operators import sample
from optimiser.search.repair import Repair
from optimiser.search.space import Space
from optimiser.wanted.feasible import Limits
from optimiser.wanted.target import Target

_SAMPLED = 400


def limits_of(quick: ModelEvaluator, target: Target) -> Limits:
    """Forces at the target's velocities that bound every stack of the evaluator's space.

    The parts' own limits are exact; the stock's are the extremes of single-shim stacks, of
    stacks as thick as the rules allow, and of a seeded sample (quick model).
    """
    setup, plans = quick.setup, _extreme_plans(quick.space)
    most = setup.clicks_range
    limits = damper_limits(setup, target.velocity_m_s)
    return replace(
        limits,
        shut_n=np.minimum(limits.shut_n, 1e9),
        softest_n=quick.with_target(target, (most, most)).forces(plans).min(axis=0),
        firmest_n=quick.with_target(target, (0, 0)).forces(plans).max(axis=0),
    )


def _extreme_plans(space: Space) -> Plans:
    rng = np.random.default_rng(0)
    repair = Repair(space)
    made = [sample(repair, _SAMPLED, rng), repair.counts(_single_shims(space), rng)]
    made.append(repair.counts(_thickest(space), rng))
    plans = np.concatenate(made)
    return np.unique(plans[space.buildable(plans)], axis=0)


def _single_shims(space: Space) -> Counts:
    """One face shim over each clamp shim."""
    faces = np.flatnonzero(space.may_face[space.diameter])
    face, clamp = (grid.ravel() for grid in np.meshgrid(faces, space.clamp_sizes))
    pieces = np.zeros((face.size, 2, len(space.sizes)), dtype=np.int64)
    pieces[np.arange(face.size), 0, face] = space.rules.face_min
    return Counts(pieces, np.full(face.size, -1), clamp)


def _thickest(space: Space) -> Counts:
    """As many of the thickest wide shims as parts and height allow, over each clamp shim."""
    sizes = space.sizes
    faces = np.flatnonzero(space.may_face)
    rows = []
    for face in faces:
        wide = np.flatnonzero(space.diameter >= face)
        order = wide[np.lexsort((-sizes.thickness_mm[wide], space.diameter[wide]))]
        rows.append(_filled(space, order))
    pieces = np.zeros((len(rows), 2, len(sizes)), dtype=np.int64)
    pieces[:, 0] = np.stack(rows)
    clamp = np.repeat(space.clamp_sizes, len(rows))
    pieces = np.tile(pieces, (len(space.clamp_sizes), 1, 1))
    return Counts(pieces, np.full(len(clamp), -1), clamp)


def _filled(space: Space, order: np.ndarray) -> np.ndarray:
    """Pieces of each size, taken in ``order`` until parts or height run out."""
    taken = np.zeros(len(space.sizes), dtype=np.int64)
    room, height = space.rules.parts - 1, space.rules.height_max_mm - 0.1
    for size in order:
        fits = int(max(0.0, height) / space.sizes.thickness_mm[size] + 1e-9)
        count = min(int(space.sizes.quantity[size]), room, fits)
        taken[size] = count
        room -= count
        height -= count * float(space.sizes.thickness_mm[size])
    return taken
