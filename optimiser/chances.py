"""How likely the stacks are that a search found, and their order where that is what counts."""

from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace

from optimiser.fitting.bands import Bands, probability_within
from optimiser.fitting.spread import Likely, Spread
from optimiser.prediction import predict
from optimiser.results import SavedCircuit, SavedOrder
from optimiser.search.find import Found, Proposal
from optimiser.search.pair import can_build_both

#: A stack as the order by chance sees it: outside the model, chance (negative), error.
_Key = tuple[bool, float, float]


def weighed(
    order: SavedOrder, found: Sequence[Found], workers: int = 1
) -> tuple[tuple[Found, ...], tuple[Likely, ...]]:
    """What was found, one entry a circuit, with the bands of every stack listed.

    Where the order ranks by chance, the stacks are sorted by it and cut to the rows wanted. Without
    bands in the order it is what was found and nothing. The same for any number of ``workers``.
    """
    if order.circuits[0].bands is None:
        return tuple(found), ()
    pairs = [
        _likely(order, circuit, one, workers)
        for circuit, one in zip(order.circuits, found, strict=True)
    ]
    if order.rank_by != "chance":
        return tuple(found), tuple(pairs)
    places = _places(order, found, pairs)
    shown = [
        _chosen(one, likely, rows[: order.rows])
        for one, likely, rows in zip(found, pairs, places, strict=True)
    ]
    return tuple(one for one, _likely in shown), tuple(likely for _one, likely in shown)


def _likely(order: SavedOrder, circuit: SavedCircuit, found: Found, workers: int) -> Likely:
    spread = order.spread(circuit)
    if spread is None or circuit.bands is None:
        raise TypeError(f"the {circuit.direction} circuit has no bands")
    within = circuit.bands.within_percent
    with ThreadPoolExecutor(workers) as pool:
        bands = tuple(pool.map(lambda one: _band(spread, found, one), found.proposals))
    target = found.order.target
    chance = [0.0 if one is None else probability_within(one, target, within) for one in bands]
    return Likely(spread, within, bands, tuple(chance))


def _band(spread: Spread, found: Found, proposal: Proposal) -> Bands | None:
    order = found.order
    seen = predict(order.setup, proposal.real_stack, order.target.velocity_m_s, proposal.clicks)
    return spread.bands(seen)


def _places(order: SavedOrder, found: Sequence[Found], likely: Sequence[Likely]) -> list[list[int]]:
    """Places of every direction's stacks, the likeliest first."""
    keys = [_keys(one, of_one) for one, of_one in zip(found, likely, strict=True)]
    ranked = [sorted(range(len(of_one)), key=of_one.__getitem__) for of_one in keys]
    if len(found) == 1:
        return ranked
    return _together(order, found, keys, ranked)


def _keys(found: Found, likely: Likely) -> list[_Key]:
    return [
        (proposal.outside_model, -chance, proposal.error_percent)
        for proposal, chance in zip(found.proposals, likely.chance, strict=True)
    ]


def _together(
    order: SavedOrder,
    found: Sequence[Found],
    keys: Sequence[Sequence[_Key]],
    ranked: Sequence[Sequence[int]],
) -> list[list[int]]:
    """The same for two directions that share a drawer: first the two stacks that are likeliest
    together, then what can be built beside the other direction's first."""
    drawer, posts = order.whole_drawer, order.pair_order().posts_mm

    def fits(i: int, j: int) -> bool:
        stacks = found[0].proposals[i].stack, found[1].proposals[j].stack
        return can_build_both(*stacks, drawer, posts)

    def both(pair: tuple[int, int]) -> tuple[float, ...]:
        one, other = keys[0][pair[0]], keys[1][pair[1]]
        chances = -one[1] * other[1], one[1] + other[1]  # both; where that is 0, either
        return (one[0] + other[0], *chances, one[2] + other[2])

    pairs = [(i, j) for i in ranked[0] for j in ranked[1] if fits(i, j)]
    i, j = min(pairs, key=both)
    return [
        [i, *(k for k in ranked[0] if k != i and fits(k, j))],
        [j, *(k for k in ranked[1] if k != j and fits(i, k))],
    ]


def _chosen(found: Found, likely: Likely, rows: Sequence[int]) -> tuple[Found, Likely]:
    return (
        replace(found, proposals=tuple(found.proposals[row] for row in rows)),
        replace(
            likely,
            bands=tuple(likely.bands[row] for row in rows),
            chance=tuple(likely.chance[row] for row in rows),
        ),
    )
