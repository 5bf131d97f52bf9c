"""Why nothing can be built: the rule that stops it, in a sentence."""

import numpy as np

from optimiser.search.space import Space


def obstacles(space: Space) -> list[str]:
    """Sentences naming the rules that keep this space empty, the plainest first.

    Meant for a space known to hold no buildable stack; the last resort names rules that
    contradict each other only together.
    """
    found = _drawer(space) or _face(space) or _clamp(space) or _sum(space) or _stages(space)
    return found or [
        "No stack keeps all rules at once: the sizes in stock, the least number of face shims "
        f"({space.rules.face_min}), at most {space.rules.parts} shims and a height of "
        f"{space.rules.height_min_mm:g} to {space.rules.height_max_mm:g} mm exclude each other."
    ]


def _drawer(space: Space) -> list[str]:
    if len(space.sizes):
        return []
    return [
        "The stock holds no shim that fits: every line is empty, has another bore, or is wider "
        f"than the clearance of {space.rules.clearance_mm:g} mm."
    ]


def _face(space: Space) -> list[str]:
    rules = space.rules
    if space.may_face.any():
        return []
    covering = space.outer_of >= rules.cover_mm - 1e-9
    if not covering.any():
        return [
            f"No shim covers the seat: the face shim must be {rules.cover_mm:g} to "
            f"{rules.clearance_mm:g} mm wide, the widest usable shim in stock is "
            f"{space.outer_of[0]:g} mm."
        ]
    most = int(np.bincount(space.diameter, space.sizes.quantity)[covering].max())
    return [
        f"Too few face shims: {rules.face_min} of one diameter of {rules.cover_mm:g} mm or more "
        f"are asked for, the stock holds at most {most}."
    ]


def _clamp(space: Space) -> list[str]:
    if space.may_clamp.any():
        return []
    return [
        "No clamp shim: it must be narrower than the inner edge of the ports "
        f"({space.rules.port_inner_mm:g} mm) and than the face shim, the narrowest shim in stock "
        f"is {space.outer_of[-1]:g} mm."
    ]


def _sum(space: Space) -> list[str]:
    """Height and parts, each against the best the stock can do."""
    rules, sizes = space.rules, space.sizes
    pieces = np.repeat(sizes.thickness_mm, np.minimum(sizes.quantity, rules.parts))
    tallest = float(np.sort(pieces)[::-1][: rules.parts].sum())
    if tallest < rules.height_min_mm - 1e-7:
        return [
            f"The stack cannot reach its least height of {rules.height_min_mm:g} mm: the "
            f"{rules.parts} thickest shims in stock make {tallest:.2f} mm."
        ]
    faces = space.may_face[space.diameter]
    lowest = rules.face_min * sizes.thickness_mm[faces].min()
    lowest += sizes.thickness_mm[space.clamp_sizes].min()
    if lowest > rules.height_max_mm + 1e-7:
        return [
            f"The stack cannot stay below its greatest height of {rules.height_max_mm:g} mm: "
            f"{rules.face_min} face shim(s) and a clamp shim alone make {lowest:.2f} mm."
        ]
    return []


def _stages(space: Space) -> list[str]:
    rules = space.rules
    if 1 in rules.stages:
        return []
    if rules.parts < rules.face_min + 3:
        return [
            f"Two stages with {rules.face_min} face shim(s) need at least {rules.face_min + 3} "
            f"shims, {rules.parts} are allowed."
        ]
    clamp, face = space.outer_of[space.may_clamp].min(), space.outer_of[space.may_face].max()
    if not ((space.outer_of > clamp) & (space.outer_of < face)).any():
        return [
            f"No crossover shim: two stages need one between the clamp shim ({clamp:g} mm) and "
            f"the face shim ({face:g} mm)."
        ]
    return []
