"""Both circuits from one drawer: two stacks that never use a shim twice."""

from collections.abc import Callable
from dataclasses import dataclass, replace

from optimiser.faults import NothingBuildable
from optimiser.search.budget import ProgressCall, StopCall
from optimiser.search.find import Found, Order, Proposal, find
from optimiser.stack import Stack
from optimiser.stock import Stock

#: Rows each circuit is searched for, so that there is something to pair.
CANDIDATES = 24


@dataclass(frozen=True)
class PairOrder:
    """Two orders (their ``lines`` are set from the drawer) and the drawer they share.

    ``posts_mm`` are the posts of the two valves. Fitted stacks are in the drawer as well: they come
    out of the damper.
    """

    first: Order
    second: Order
    drawer: Stock
    posts_mm: tuple[float, float]


@dataclass(frozen=True, eq=False)
class FoundPair:
    """What was found for both; the first proposals of each can be built together."""

    first: Found
    second: Found


def find_pair(
    order: PairOrder, progress: ProgressCall | None = None, stop: StopCall | None = None
) -> FoundPair:
    """Search both circuits and keep stacks that can be built at once, the least error first.

    Each list then holds only what can be built beside the other's first proposal. Raises
    NothingBuildable when no two stacks fit in the drawer together.
    """
    drawer = _with_fitted(order)
    first = find(_from(order.first, drawer, order.posts_mm[0]), progress, stop)
    second = find(_from(order.second, drawer, order.posts_mm[1]), progress, stop)
    pair = _best_pair(first, second, order, drawer)
    if pair is not None:
        return _shown(first, second, pair, order, drawer)
    tried = [
        _one_after_the_other(order, drawer, first, progress, stop),
        _one_after_the_other(_swapped(order), drawer, second, progress, stop),
    ]
    tried[1] = FoundPair(tried[1].second, tried[1].first) if tried[1] else None
    known = [pair for pair in tried if pair is not None]
    if not known:
        raise NothingBuildable("the drawer cannot build a compression and a rebound stack at once")
    return min(known, key=lambda p: _total(p.first.proposals[0], p.second.proposals[0]))


def can_build_both(one: Stack, other: Stack, drawer: Stock, posts_mm: tuple[float, float]) -> bool:
    """Whether the drawer holds the shims of both stacks (nominal thicknesses)."""
    if drawer.shortage(one, posts_mm[0]):
        return False
    return not drawer.take(one, posts_mm[0]).shortage(other, posts_mm[1])


def _with_fitted(order: PairOrder) -> Stock:
    drawer = order.drawer
    for part, post in zip((order.first, order.second), order.posts_mm, strict=True):
        if part.fitted is not None:
            drawer = drawer.put_back(part.fitted, post)
    return drawer


def _from(order: Order, drawer: Stock, post_mm: float) -> Order:
    """The order on what the drawer holds for its post, fitted shims not counted twice."""
    lines = drawer.for_post(post_mm)
    if order.fitted is not None:
        lines = lines.take(order.fitted, post_mm)
    return replace(order, lines=tuple(lines), rows=max(order.rows, CANDIDATES))


def _total(one: Proposal, other: Proposal) -> float:
    worn = max(0.0, one.utilisation - 1.0) + max(0.0, other.utilisation - 1.0)
    outside = 100.0 * (one.outside_model + other.outside_model)
    return one.error_percent + other.error_percent + 2.0 * worn + outside


def _best_pair(
    first: Found, second: Found, order: PairOrder, drawer: Stock
) -> tuple[int, int] | None:
    """Places of the two proposals with the least total that can be built together."""
    places = [
        (_total(one, other), i, j)
        for i, one in enumerate(first.proposals)
        for j, other in enumerate(second.proposals)
    ]
    for _, i, j in sorted(places):
        stacks = first.proposals[i].stack, second.proposals[j].stack
        if can_build_both(*stacks, drawer, order.posts_mm):
            return i, j
    return None


def _shown(
    first: Found, second: Found, pair: tuple[int, int], order: PairOrder, drawer: Stock
) -> FoundPair:
    one, other = first.proposals[pair[0]], second.proposals[pair[1]]

    def beside_other(proposal: Proposal) -> bool:
        return can_build_both(proposal.stack, other.stack, drawer, order.posts_mm)

    def beside_one(proposal: Proposal) -> bool:
        return can_build_both(one.stack, proposal.stack, drawer, order.posts_mm)

    return FoundPair(
        _led_by(first, one, beside_other, order.first.rows),
        _led_by(second, other, beside_one, order.second.rows),
    )


def _led_by(found: Found, leader: Proposal, fits: Callable[[Proposal], bool], rows: int) -> Found:
    rest = [p for p in found.proposals if p is not leader and fits(p)]
    return replace(found, proposals=(leader, *rest)[:rows])


def _swapped(order: PairOrder) -> PairOrder:
    return replace(order, first=order.second, second=order.first, posts_mm=order.posts_mm[::-1])


def _one_after_the_other(
    order: PairOrder,
    drawer: Stock,
    first: Found,
    progress: ProgressCall | None,
    stop: StopCall | None,
) -> FoundPair | None:
    """The best of one circuit, then the other circuit from what is left; None when that fails."""
    leader = first.proposals[0]
    if drawer.shortage(leader.stack, order.posts_mm[0]):
        return None
    left = drawer.take(leader.stack, order.posts_mm[0]).for_post(order.posts_mm[1])
    second = replace(order.second, lines=tuple(left), fitted=None)
    try:
        found = find(second, progress, stop)
    except NothingBuildable:
        return None
    return FoundPair(replace(first, proposals=(leader,)), found)
