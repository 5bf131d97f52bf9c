"""From a stack and a stock list to the steps of building it: bins, what is left, roles."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import islice, takewhile

from optimiser.prediction import ShimState
from optimiser.report.sheet import Role, Step, Worked
from optimiser.stack import Group, Shim, Stack
from optimiser.stock import SAME_DIAMETER_MM, SAME_THICKNESS_MM, Stock, StockItem


@dataclass(frozen=True)
class Drawer:
    """A stock list with its name and the post (mm) a stack is built on."""

    name: str
    stock: Stock
    post_mm: float


def build_steps(
    stack: Stack,
    states: Sequence[ShimState] = (),
    real: Stack | None = None,
    drawer: Drawer | None = None,
) -> tuple[Step, ...]:
    """Steps face first. ``stack`` in nominal thicknesses, ``real`` the same pieces as measured;
    ``states`` (one a bending piece) in the order of the pieces."""
    worked = iter([Worked(s.peak_stress_mpa, s.utilisation) for s in states])
    pieces = iter((real or stack).pieces)
    after = _after(stack, drawer)
    roles = roles_of(stack)
    steps = []
    for place, (group, role) in enumerate(zip(stack.groups, roles, strict=True)):
        measured = {shim.thickness_mm for shim in islice(pieces, group.quantity)}
        lies = _lines_of(group.shim, drawer, after)
        steps.append(
            Step(
                group.quantity,
                group.shim,
                role,
                tuple(dict.fromkeys(item.bin for item, _left in lies if item.bin)),
                sum(left for _item, left in lies) if after is not None else None,
                tuple(sorted(measured - {group.shim.thickness_mm})),
                tuple(islice(worked, group.quantity)) if role != "clamp" else (),
                _gap_mm(stack.groups, place) if role == "crossover" else None,
            )
        )
    return tuple(steps)


def roles_of(stack: Stack) -> list[Role]:
    """What each group is for; a crossover is smaller than the shims in front of and behind it."""
    last = len(stack.groups) - 1
    plain = [i for i, g in enumerate(stack.groups[:-1]) if g.shim.inner_mm is None]
    roles: list[Role] = []
    for place, group in enumerate(stack.groups):
        if place == last:
            roles.append("clamp")
        elif place == 0:
            roles.append("face")
        elif group.shim.inner_mm is not None:
            roles.append("ring")
        else:
            behind = [i for i in plain if i > place]
            widens = bool(behind) and stack.groups[behind[0]].shim.outer_mm > group.shim.outer_mm
            roles.append("crossover" if widens else "shim")
    return roles


def shortages(stack: Stack, drawer: Drawer | None) -> list[str]:
    """A sentence a size that the drawer does not hold."""
    if drawer is None:
        return []
    return [
        f"{drawer.name} lacks {group.quantity} x {group.shim} mm"
        for group in drawer.stock.shortage(stack, drawer.post_mm)
    ]


def _gap_mm(groups: Sequence[Group], place: int) -> float:
    """Thickness of the crossover with the equally wide groups next in front of it, mm."""
    outer = groups[place].shim.outer_mm
    alike = takewhile(lambda group: group.shim.outer_mm == outer, reversed(groups[: place + 1]))
    return sum(group.quantity * group.shim.thickness_mm for group in alike)


def _after(stack: Stack, drawer: Drawer | None) -> Stock | None:
    """The stock after the build; as it is where something is missing."""
    if drawer is None:
        return None
    if drawer.stock.shortage(stack, drawer.post_mm):
        return drawer.stock
    return drawer.stock.take(stack, drawer.post_mm)


def _lines_of(
    shim: Shim, drawer: Drawer | None, after: Stock | None
) -> list[tuple[StockItem, int]]:
    """Lines of a size with what is left of each; only those drawn from, where any is."""
    if drawer is None or after is None:
        return []
    found = [
        (item, left.quantity, item.quantity - left.quantity)
        for item, left in zip(drawer.stock, after, strict=True)
        if _is_size(item, shim, drawer.post_mm)
    ]
    drawn = [entry for entry in found if entry[2] > 0]
    return [(item, left) for item, left, _taken in drawn or found]


def _is_size(item: StockItem, shim: Shim, post_mm: float) -> bool:
    if abs(item.outer_mm - shim.outer_mm) > SAME_DIAMETER_MM:
        return False
    named = (item.thickness_mm, item.real_mm)
    if min(abs(t - shim.thickness_mm) for t in named) > SAME_THICKNESS_MM:
        return False
    if shim.inner_mm is not None:
        return abs(item.inner_mm - shim.inner_mm) <= SAME_DIAMETER_MM
    return item.fits(post_mm)
