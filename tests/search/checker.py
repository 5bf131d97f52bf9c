"""Whether a stack can be built, judged shim by shim from the rules a workshop goes by.

Written from the rules alone (design section 6 and the search issue): it knows a stack as a list
of (outer_mm, thickness_mm), face first, and shares no code with the search.
"""

from dataclasses import dataclass, field


@dataclass
class Bench:
    """What lies on the bench: the drawer as {(outer_mm, thickness_mm): pieces}, and the valve."""

    drawer: dict[tuple[float, float], int]
    seat_outer_mm: float
    clearance_mm: float
    port_inner_mm: float
    height_min_mm: float
    height_max_mm: float
    parts: int = 14
    face_min: int = 1
    stages: tuple[int, ...] = (1, 2)
    faults: list[str] = field(default_factory=list)


def faults_of(shims: list[tuple[float, float]], bench: Bench) -> list[str]:
    """Every rule the stack breaks; empty when it can be built."""
    faults = []
    for shim in sorted(set(shims)):
        if shims.count(shim) > bench.drawer.get(shim, 0):
            faults.append(f"not enough of {shim}")
    if len(shims) > bench.parts:
        faults.append("too many parts")
    height = sum(thickness for _, thickness in shims)
    if height < bench.height_min_mm - 1e-6 or height > bench.height_max_mm + 1e-6:
        faults.append(f"height {height:.3f}")
    return faults + _shape_faults(shims, bench)


def _shape_faults(shims: list[tuple[float, float]], bench: Bench) -> list[str]:
    faults = []
    clamp = shims[-1]
    bending = list(shims[:-1])
    while bending and bending[-1] == clamp:
        bending.pop()  # further clamp shims that make up the height
    if not bending:
        return ["no face shim"]
    outers = [outer for outer, _ in bending]
    if min(outers) <= clamp[0]:
        faults.append("clamp shim not the narrowest")
    if clamp[0] >= bench.port_inner_mm:
        faults.append("clamp shim over the ports")
    face = outers[0]
    if face < bench.seat_outer_mm - 1e-6:
        faults.append("seat not covered")
    if max(outers) > bench.clearance_mm + 1e-6:
        faults.append("does not fit the bore")
    if max(outers) > face:
        faults.append("a shim is wider than the face shim")
    return faults + _stage_faults(outers, bench)


def _stage_faults(outers: list[float], bench: Bench) -> list[str]:
    rises = [i for i in range(len(outers) - 1) if outers[i + 1] > outers[i]]
    if len(rises) > 1:
        return ["more than two stages"]
    faults = []
    stages = 1 + len(rises)
    if stages not in bench.stages:
        faults.append(f"{stages} stage(s) not allowed")
    first = outers
    if rises:
        crossover = rises[0]
        first = outers[:crossover]
        if not first:
            return [*faults, "a crossover without a first stage"]
        if outers[crossover] >= min(first):
            faults.append("the crossover does not free the first stage")
    if first.count(first[0]) < bench.face_min:
        faults.append("too few face shims")
    return faults
