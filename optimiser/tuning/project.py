"""A stack made of sizes that are not all there, made anew from those that are."""

from collections.abc import Iterable
from math import inf, log

from optimiser.search.sizes import StockLine
from optimiser.stack import Shim, Stack

#: How unlike two shims are: the stiffness goes with the cube of the thickness.
_DIAMETER, _THICKNESS = 2.0, 3.0


def projected(stack: Stack, lines: Iterable[StockLine], face_mm: float) -> Stack | None:
    """The stack with every shim that the lines lack replaced by the most similar one they have.

    Stages stay stages, each in order of diameter. No face shim is narrower than ``face_mm``, mm.
    None where no such stack can be made; whether it can be built is for the space to say.
    """
    left: dict[Shim, int] = {}
    for line in lines:
        shim = Shim(line.outer_mm, line.thickness_mm)
        left[shim] = left.get(shim, 0) + line.quantity
    bending, clamp = stack.bending, stack.groups[-1].shim
    face = bending[0].outer_mm
    found = [_taken(left, shim, shim.outer_mm, shim.outer_mm, exact=True) for shim in bending]
    for place, shim in enumerate(bending):
        if found[place] is None:
            low = max(face_mm, clamp.outer_mm) if shim.outer_mm == face else clamp.outer_mm + 0.5
            found[place] = _taken(left, shim, low, inf)
    shims = [shim for shim in found if shim is not None]
    narrowest = min(shim.outer_mm for shim in shims) if shims else 0.0
    last = _taken(left, clamp, 0.0, narrowest - 0.5)
    if len(shims) < len(bending) or last is None:
        return None
    return Stack.of([*_in_stages(bending, shims), last])


def _taken(
    left: dict[Shim, int], wanted: Shim, low_mm: float, high_mm: float, exact: bool = False
) -> Shim | None:
    """The most similar shim with a diameter between two limits, mm, out of what is left."""
    possible = [
        shim
        for shim, count in left.items()
        if count > 0 and low_mm <= shim.outer_mm <= high_mm and (not exact or shim == wanted)
    ]
    if not possible:
        return None
    best = min(possible, key=lambda shim: (_unlike(shim, wanted), shim.outer_mm, shim.thickness_mm))
    left[best] -= 1
    return best


def _unlike(one: Shim, other: Shim) -> float:
    diameter = abs(log(one.outer_mm / other.outer_mm))
    return _DIAMETER * diameter + _THICKNESS * abs(log(one.thickness_mm / other.thickness_mm))


def _in_stages(before: tuple[Shim, ...], shims: list[Shim]) -> list[Shim]:
    """Shims in the places of others, each stage widest first, a crossover shim between two."""
    rise = next(
        (k for k in range(1, len(before)) if before[k].outer_mm > before[k - 1].outer_mm), None
    )
    if rise is None:
        return _widest_first(shims)
    first, crossover, second = shims[: rise - 1], shims[rise - 1], shims[rise:]
    return [*_widest_first(first), crossover, *_widest_first(second)]


def _widest_first(shims: list[Shim]) -> list[Shim]:
    return sorted(shims, key=lambda shim: (-shim.outer_mm, -shim.thickness_mm))
