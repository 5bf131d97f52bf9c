"""The order by chance, alone and for two directions that share a drawer."""

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
import pytest

from optimiser import chances
from optimiser.chances import weighed
from optimiser.cli.inputs import read_given
from optimiser.files import read_stock
from optimiser.fit_records import spread_of
from optimiser.fitting.spread import Likely
from optimiser.prediction import predict
from optimiser.results import SavedBands, SavedCircuit, SavedOrder, SavedTarget
from optimiser.search.find import Found
from optimiser.search.pair import can_build_both, find_pair
from optimiser.wanted_files import read_target


@pytest.fixture(scope="module")
def order() -> SavedOrder:
    """Both directions of the bundled damper from a small drawer, ranked by chance."""
    given = read_given("rear-monotube")
    circuits = []
    for direction in given.directions():
        setup = given.setup(direction)
        circuits.append(
            SavedCircuit(
                direction=direction,
                target=SavedTarget.of(read_target(f"example-{direction}", direction)),
                fitted=setup.valve.fitted,
                click_range=(6, 16),
                bands=SavedBands.of(spread_of(setup, None, samples=40), 5.0),
            )
        )
    return SavedOrder(
        damper=given.damper,
        steel=given.steel,
        oil=given.oil,
        oil_temp_c=given.oil_temp_c,
        stock_name="small-shop",
        stock=read_stock("small-shop").items,
        circuits=tuple(circuits),
        parts=14,
        face_min=1,
        stages=(1, 2),
        rank_by="chance",
        rows=4,
        seed=4,
        evaluations=400,
    )


@pytest.fixture(scope="module")
def found(order: SavedOrder) -> tuple[Found, Found]:
    pair = find_pair(order.pair_order())
    return pair.first, pair.second


def _with_chances(monkeypatch: pytest.MonkeyPatch, chance: Callable[[int, int], float]) -> None:
    """Chances by direction (0, 1) and place instead of drawn ones."""

    def drawn(order: SavedOrder, circuit: SavedCircuit, one: Found, _workers: int) -> Likely:
        number = [c.direction for c in order.circuits].index(circuit.direction)
        count = len(one.proposals)
        spread = spread_of(one.order.setup, None)
        values = tuple(chance(number, place) for place in range(count))
        return Likely(spread, 5.0, (None,) * count, values)

    monkeypatch.setattr(chances, "_likely", drawn)


def _buildable(order: SavedOrder, shown: Sequence[Found]) -> None:
    drawer, posts = order.whole_drawer, order.pair_order().posts_mm
    first, second = (one.proposals for one in shown)
    assert all(can_build_both(first[0].stack, other.stack, drawer, posts) for other in second)
    assert all(can_build_both(one.stack, second[0].stack, drawer, posts) for one in first)


def test_chances_are_those_of_the_bands(order: SavedOrder, found: tuple[Found, Found]) -> None:
    alone = order.model_copy(update={"circuits": order.circuits[:1], "rank_by": "default"})
    shown, likely = weighed(alone, found[:1], workers=2)
    assert shown == found[:1]
    again = weighed(alone, found[:1], workers=1)[1]
    assert likely[0].chance == again[0].chance
    proposal, bands = found[0].proposals[0], likely[0].bands[0]
    assert bands is not None
    target = found[0].order.target
    seen = predict(found[0].order.setup, proposal.real_stack, target.velocity_m_s, proposal.clicks)
    assert bands.nominal_n == pytest.approx(seen.force_n)
    near = [target.error_percent(sample) <= 5.0 for sample in bands.samples_n]
    assert likely[0].chance[0] == pytest.approx(np.mean(near))


def test_without_bands_nothing_is_weighed(order: SavedOrder, found: tuple[Found, Found]) -> None:
    bare = tuple(circuit.model_copy(update={"bands": None}) for circuit in order.circuits)
    plain = order.model_copy(update={"circuits": bare, "rank_by": "default"})
    assert weighed(plain, found) == (found, ())


def test_one_direction_is_sorted_by_chance_and_cut(
    order: SavedOrder, found: tuple[Found, Found], monkeypatch: pytest.MonkeyPatch
) -> None:
    inside = [p for p in found[0].proposals if not p.outside_model]
    outside = replace(inside[-1], rise=9.0)
    mixed = replace(found[0], proposals=(outside, *inside))
    _with_chances(monkeypatch, lambda _direction, place: 1.0 if place == 0 else place / 100)
    alone = order.model_copy(update={"circuits": order.circuits[:1]})
    (shown,), (likely,) = weighed(alone, (mixed,))
    assert list(shown.proposals) == inside[::-1][:4]
    assert list(likely.chance) == [k / 100 for k in range(len(inside), 0, -1)][:4]
    wide = alone.model_copy(update={"rows": 90})
    assert weighed(wide, (mixed,))[0][0].proposals[-1] is outside


@pytest.mark.parametrize("turn", [1, -1])
def test_two_directions_can_still_be_built_together(
    order: SavedOrder, found: tuple[Found, Found], monkeypatch: pytest.MonkeyPatch, turn: int
) -> None:
    count = max(len(one.proposals) for one in found)
    assert min(len(one.proposals) for one in found) > 1
    _with_chances(monkeypatch, lambda way, place: 0.5 + turn * (-1) ** way * place / count / 2.1)
    shown, likely = weighed(order, found)
    _buildable(order, shown)
    for one in likely:
        assert list(one.chance[1:]) == sorted(one.chance[1:], reverse=True)
    assert "two likeliest together" in order.rank_rule


def test_where_one_direction_has_no_chance_the_other_still_counts(
    order: SavedOrder, found: tuple[Found, Found], monkeypatch: pytest.MonkeyPatch
) -> None:
    _with_chances(monkeypatch, lambda way, place: 0.0 if way else place / 100)
    shown, likely = weighed(order, found)
    _buildable(order, shown)
    inside = [not one.outside_model for one in found[0].proposals]
    assert likely[0].chance[0] == max(k / 100 for k, fits in enumerate(inside) if fits)
