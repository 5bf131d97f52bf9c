"""How a stack lies: merged groups, radii to compute at, and every possible contact.

Kernels on plain arrays in one consistent unit system (SI inside the program).

* A *group* is a run of neighbours of one diameter: they bend together without sliding forces, so
  bending stiffnesses and membrane stiffnesses add exactly.
* A *ring shim* has a hole wider than the clamp: it lies loose between two groups and only fills
  their gap between its inner and its outer radius.
* A *contact* joins two groups that are neighbours at a radius; shims between them that do not reach
  that radius leave a gap of their own thickness, a ring shim takes its thickness away from it
  (a negative gap is a preload).
"""

import numpy as np
from numpy.typing import NDArray

from optimiser.compiled import kernel

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Radii closer than this share of the free span are one radius.
SAME = 1e-3


@kernel
def group_shims(outer: Floats, thickness: Floats, hole: Floats) -> tuple[Floats, Ints]:
    """Merge neighbours of equal diameter.

    ``outer`` radii (n,), ``thickness`` (n,), ``hole`` radii (n,) with 0 for a plain shim. Returns
    ``groups`` (m, 6): edge radius, sum of t, sum of t^3, thickest t, inner radius and thickness
    of a ring shim lying behind the group (0 when none), and ``member`` (n,): each shim's group
    (-1: ring).
    """
    groups = np.zeros((outer.size, 6))
    member = np.full(outer.size, -1)
    count = 0
    for k in range(outer.size):
        if hole[k] > 0.0:
            groups[count, 0] = outer[k]
            groups[count, 4] = hole[k]
            groups[count, 5] = thickness[k]
            count += 1
            continue
        joins = (
            count > 0
            and groups[count - 1, 4] == 0.0
            and abs(groups[count - 1, 0] - outer[k]) <= 1e-9 * outer[k]
        )
        if not joins:
            groups[count, 0] = outer[k]
            count += 1
        member[k] = count - 1
        groups[count - 1, 1] += thickness[k]
        groups[count - 1, 2] += thickness[k] ** 3
        groups[count - 1, 3] = max(groups[count - 1, 3], thickness[k])
    return groups[:count].copy(), member


def radii_between(clamp: float, fixed: Floats, spacing: float) -> Floats:
    """Sorted radii beyond the clamp: all ``fixed`` ones, and more so that none is far apart."""
    ordered = np.sort(fixed)
    span = ordered[-1] - clamp
    radii = np.empty(ordered.size + int(span / spacing) + ordered.size + 2)
    count = 0
    last = clamp
    for k in range(ordered.size):
        if ordered[k] - last <= SAME * span:
            continue
        pieces = int(np.ceil((ordered[k] - last) / spacing - 1e-9))
        for piece in range(1, pieces + 1):
            radii[count] = last + (ordered[k] - last) * piece / pieces
            count += 1
        last = ordered[k]
    return radii[:count].copy()


def nearest(radii: Floats, radius: float) -> int:
    """Index of the radius closest to ``radius``."""
    return int(np.argmin(np.abs(radii - radius)))


def find_contacts(groups: Floats, radii: Floats, span: float) -> tuple[Ints, Floats]:
    """Every contact that may close.

    Returns ``pairs`` (m, 3): front group, back group, index of the radius; and ``gaps`` (m,).
    """
    pairs = np.empty((groups.shape[0] * radii.size, 3), dtype=np.int64)
    gaps = np.empty(groups.shape[0] * radii.size)
    count = 0
    for k in range(radii.size):
        front = -1
        gap = 0.0
        for g in range(groups.shape[0]):
            reaches = groups[g, 0] >= radii[k] - SAME * span
            if groups[g, 4] > 0.0:
                if reaches and groups[g, 4] <= radii[k] + SAME * span:
                    gap -= groups[g, 5]
            elif reaches:
                if front >= 0:
                    pairs[count, 0] = front
                    pairs[count, 1] = g
                    pairs[count, 2] = k
                    gaps[count] = gap
                    count += 1
                front = g
                gap = 0.0
            else:
                gap += groups[g, 1]
    return pairs[:count].copy(), gaps[:count].copy()
