"""The report, the document and the chart of a search."""

from collections.abc import Sequence
from dataclasses import replace
from io import StringIO
from typing import Any

import numpy as np
import pytest
from rich.console import Console

from optimiser.cli.inputs import read_given
from optimiser.files import read_stock
from optimiser.fitting.bands import Bands
from optimiser.fitting.spread import Likely, Spread
from optimiser.fitting.uncertainty import usual_uncertainty
from optimiser.prediction import predict
from optimiser.report.find import (
    exchanged_shims,
    find_report,
    panels_of,
    show_answer,
    statistics,
)
from optimiser.report.find_document import find_document, result_document
from optimiser.report.find_tables import limit_text, percent_text, stacks_side_by_side
from optimiser.report.look import Look
from optimiser.results import Answer, SavedCircuit, SavedOrder, SavedTarget
from optimiser.search.find import Found, Proposal
from optimiser.search.pair import find_pair
from optimiser.stack import Stack
from optimiser.wanted.feasible import feasibility
from optimiser.wanted_files import read_target
from tests.cli.calling import lines_wider_than


@pytest.fixture(scope="module")
def answer() -> Answer:
    """Both directions of the bundled damper, revalved from a small drawer."""
    given = read_given("rear-monotube")
    circuits = []
    for direction in given.directions():
        setup = given.setup(direction)
        target = SavedTarget.of(read_target(f"example-{direction}", direction))
        circuits.append(
            SavedCircuit(
                direction=direction, target=target, fitted=setup.valve.fitted, click_range=(6, 16)
            )
        )
    order = SavedOrder(
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
        rows=6,
        seed=4,
        evaluations=400,
        notes=("something about both",),
    )
    pair = find_pair(order.pair_order())
    found = (pair.first, pair.second)
    return Answer(order, found, tuple(one.details(0) for one in found), 1.5, False, 1)


def _look(unicode: bool = True) -> Look:
    console = Console(file=StringIO(), width=80, markup=False, emoji=False, highlight=False)
    return Look(console, unicode)


def _printed(answer: Answer, quiet: bool = False, unicode: bool = True) -> str:
    look = _look(unicode)
    show_answer(answer, look, quiet)
    return str(look.console.file.getvalue())  # type: ignore[attr-defined]  # a StringIO


def _only(answer: Answer, **changes: Any) -> Answer:
    """The first direction alone, its best proposal changed."""
    found = answer.found[0]
    first = replace(found.proposals[0], **changes)
    found = replace(found, proposals=(first, *found.proposals[1:]))
    return replace(answer, found=(found,), best=answer.best[:1])


def test_fits_80_columns_with_every_column_shown(answer: Answer) -> None:
    alone = _only(answer, rise=2.7, utilisation=11.5, error_percent=1234.5)
    for text in (_printed(answer), _printed(alone), _printed(alone, unicode=False)):
        assert not lines_wider_than(text, 80)


def _banded(answer: Answer) -> Answer:
    """The same with a band and a chance for every stack; none for the last."""
    likely = []
    for found in answer.found:
        velocity, force = found.order.target.velocity_m_s, found.proposals[0].force_n
        band = Bands(velocity, 0.9 * force, force, 1.1 * force, force, force[None], 0)
        count = len(found.proposals)
        spread = Spread(usual_uncertainty(found.order.setup), "somewhere")
        chance = (1.0, *[0.5] * (count - 2), 0.0)
        likely.append(Likely(spread, 12.5, (*[band] * (count - 1), None), chance))
    return replace(answer, likely=tuple(likely))


def test_bands_fit_80_columns_beside_everything_else(answer: Answer) -> None:
    banded = _banded(answer)
    alone = _only(banded, rise=2.7, utilisation=11.5, error_percent=1234.5)
    for shown in (banded, alone):
        assert not lines_wider_than(_printed(shown), 80)
    row = _row(_printed(alone))
    assert row[-4:] == ["100", "%", str(alone.found[0].proposals[0].changed), "outside"]
    said = " ".join(_printed(banded).split())
    assert "within 12.5 %" in said
    assert said.count("1000 samples (seed 0), from somewhere") == len(banded.found)


def test_bands_in_the_document_and_the_chart(answer: Answer) -> None:
    banded = _banded(answer)
    document = find_document(banded)
    force = banded.found[0].proposals[0].force_n
    assert document["stacks"][0]["force_p05_n"] == pytest.approx(0.9 * force)
    assert document["stacks"][0]["chance_within"] == 1.0
    assert document["stacks"][-1]["force_p95_n"] is None
    assert document["stacks"][-1]["chance_within"] is None
    assert (document["within_percent"], document["samples"]) == (12.5, 1000)
    assert not {"within_percent", "samples"} & set(find_document(answer))
    first = [one.proposals[0] for one in banded.found]
    curves = [
        [_curve(found, p, [0.1, 0.5])] * 2 for found, p in zip(banded.found, first, strict=True)
    ]
    bands = [one.bands[0] for one in banded.likely]
    lines = panels_of(banded, curves, bands)[1].lines
    assert bands[1] is not None
    assert lines[1].p05_n is bands[1].p05_n
    assert lines[2].p05_n is None


def test_plain_ascii_where_asked_for(answer: Answer) -> None:
    assert _printed(answer, unicode=False).isascii()


def _row(text: str) -> list[str]:
    return next(line for line in text.splitlines() if line.startswith("1 ")).split()


def test_a_row_shows_the_proposal(answer: Answer) -> None:
    proposal = answer.found[0].proposals[0]
    row = _row(_printed(_only(answer)))
    bands = proposal.bands
    assert row == [
        "1",
        f"{proposal.error_percent:.2f}",
        f"{proposal.worst.percent:+.1f}",
        *(percent_text(b) for b in (bands.low_percent, bands.mid_percent, bands.high_percent)),
        str(proposal.parts),
        str(proposal.sizes),
        f"{proposal.utilisation:.2f}{'!' * (proposal.utilisation >= 1)}",
        str(proposal.clicks),
        f"{proposal.stack.height_mm:.2f}",
        str(proposal.variants),
        str(proposal.changed),
    ]


def test_marks(answer: Answer) -> None:
    text = _printed(_only(answer, rise=2.01, utilisation=1.0))
    assert "1.00!" in _row(text)
    assert _row(text)[-1] == "outside"
    text = _printed(_only(answer, rise=1.99, utilisation=0.994))
    assert "0.99" in _row(text)
    assert _row(text)[-1] != "outside"


def test_changed_is_left_out_without_a_fitted_stack(answer: Answer) -> None:
    found = answer.found[0]
    plain = tuple(replace(proposal, changed=None) for proposal in found.proposals)
    found = replace(found, proposals=plain, order=replace(found.order, fitted=None))
    text = _printed(replace(answer, found=(found,), best=answer.best[:1]))
    assert "chan-" not in text
    assert "Revalve:" not in text
    assert "taken out" not in text


def test_what_to_exchange_adds_up(answer: Answer) -> None:
    for found in answer.found:
        assert found.order.fitted is not None
        for proposal in found.proposals:
            out, into = exchanged_shims(found.order.fitted, proposal.stack)
            assert sum(g.quantity for g in (*out, *into)) == proposal.changed
    assert "Revalve: " in _printed(answer)


def test_exchanged_shims_by_hand() -> None:
    one = Stack.parse(["2 x 40 x 0.2", "1 x 30 x 0.2", "2 x 20 x 0.3"])
    other = Stack.parse(["3 x 40 x 0.2", "1 x 32 x 0.2", "1 x 20 x 0.3"])
    out, into = exchanged_shims(one, other)
    assert [str(group) for group in out] == ["1 x 30 x 0.20", "1 x 20 x 0.30"]
    assert [str(group) for group in into] == ["1 x 40 x 0.20", "1 x 32 x 0.20"]
    assert exchanged_shims(one, one) == ([], [])


def test_a_group_is_never_broken_between_lines(answer: Answer) -> None:
    for line in _printed(answer).splitlines():
        assert not line.rstrip().endswith(" x")
        assert not line.startswith("  x ")


def _stack_blocks(found: Found, width: int) -> Sequence[str]:
    console = Console(file=StringIO(), width=width, markup=False)
    for table in stacks_side_by_side(found, Look(console, True)):
        console.print(table)
    return str(console.file.getvalue()).splitlines()  # type: ignore[attr-defined]  # a StringIO


@pytest.mark.parametrize("width", [80, 100])
def test_every_stack_is_listed_whole(answer: Answer, width: int) -> None:
    found = answer.found[1]
    lines = _stack_blocks(found, width)
    assert not [line for line in lines if len(line.rstrip()) > width]
    text = "\n".join(lines)
    for place, proposal in enumerate(found.proposals, start=1):
        assert f"stack {place}" in text
        assert all(line in text for line in proposal.stack.lines())
    groups = sum(len(proposal.stack.lines()) for proposal in found.proposals)
    assert text.count(" x ") == 2 * groups


def test_points_outside_are_told_one_by_one_or_by_reason(answer: Answer) -> None:
    found = answer.found[0]
    target, limits = found.order.target, found.limits
    shut = replace(limits, firmest_n=0.5 * target.force_n, shut_n=0.5 * target.force_n)
    outside = replace(found, feasibility=feasibility(target, shut))
    text = _printed(replace(answer, found=(outside,), best=answer.best[:1]))
    assert text.count("the bleed is too large") == len(target)
    assert "lies within" not in text
    points = outside.feasibility.outside * 3
    crowded = replace(outside, feasibility=replace(outside.feasibility, outside=points))
    text = _printed(replace(answer, found=(crowded,), best=answer.best[:1]))
    assert f"outside at {3 * len(target)} points, most at" in " ".join(text.split())


def test_cut_short_comes_first(answer: Answer) -> None:
    assert _printed(replace(answer, cut_short=True)).startswith("cut short by Ctrl-C")
    assert "cut short" not in _printed(answer)


def test_both_directions_are_said_to_go_together(answer: Answer) -> None:
    said = " ".join(_printed(answer).split())
    assert "can be built together from small-shop" in said
    assert "note: something about both" in said
    assert "together" not in _printed(_only(answer))


def test_one_needle_for_both_is_pointed_out_where_clicks_differ(answer: Answer) -> None:
    def at(clicks: tuple[int, int]) -> str:
        found = tuple(
            replace(one, proposals=(replace(one.proposals[0], clicks=count),))
            for one, count in zip(answer.found, clicks, strict=True)
        )
        return _printed(replace(answer, found=found))

    assert "where one needle serves both" in at((8, 9))
    assert "where one needle serves both" not in at((8, 8))


def test_statistics(answer: Answer) -> None:
    found = replace(
        answer.found[0], evaluations=900, seconds=2.0, seconds_model=1.0, seconds_library=0.5
    )
    text = statistics(replace(answer, found=(found,), workers=2))
    assert text == (
        "900 stacks tried, in 1.5 s on 2 workers: 50 % model, 25 % library, 25 % rest. Seed 4."
    )
    whole = statistics(replace(answer, found=(replace(found, complete=True),)))
    assert "every buildable stack" in whole
    assert "1 worker:" in whole


def test_advice_when_the_best_click_is_at_an_end(answer: Answer) -> None:
    def advised(clicks: int) -> bool:
        best = replace(answer.best[0], clicks=clicks)
        alone = replace(_only(answer), best=(best,))
        return "--click-range 0-22 may come nearer" in " ".join(_printed(alone).split())

    assert advised(6)
    assert advised(16)
    assert not advised(10)


def test_advice_when_softer_stacks_lie_outside_the_model(answer: Answer) -> None:
    force = 1.4 * answer.found[0].order.target.force_n
    far = {"force_n": force, "error_percent": 40.0}
    words = "softer stacks lie outside the model"
    assert words in " ".join(_printed(_only(answer, rise=1.95, **far)).split())
    assert words not in " ".join(_printed(_only(answer, rise=1.2, **far)).split())


def test_quiet_is_results_only(answer: Answer) -> None:
    text = _printed(answer, quiet=True)
    for words in ("Ranked by", "verify on a dyno", "wanted\n", "possible:", "Seed"):
        assert words not in text
    assert list(find_report(answer, _look(), quiet=True))


def test_cells() -> None:
    assert [percent_text(p) for p in (None, 0.04, 99.94, 1234.5)] == ["-", "0.0", "99.9", "1234"]
    assert [limit_text(f) for f in (12.34, 4321.0, 1e6, np.inf)] == [
        "12.3", "4321", "> 99999", "locked",
    ]  # fmt: skip


def test_document_is_json_and_holds_both_directions(answer: Answer) -> None:
    document = find_document(answer)
    assert list(document["circuits"]) == ["compression", "rebound"]
    assert document["stacks"] == document["circuits"]["compression"]["stacks"]
    assert document["evaluations"] == sum(one.evaluations for one in answer.found)
    assert document["notes"] == ["something about both"]
    infinite = replace(answer.found[0].limits, shut_n=np.full(7, np.inf))
    blocked = replace(answer, found=(replace(answer.found[0], limits=infinite),))
    document = find_document(replace(blocked, best=answer.best[:1]))
    assert document["limits"]["firmest_possible_n"] == [None] * 7


def test_result_document_is_the_document_with_the_order(answer: Answer) -> None:
    document = result_document(answer)
    assert document.pop("order") == answer.order.record()
    assert document == find_document(answer)


def test_measured_thicknesses_are_told_beside_the_nominal_ones(answer: Answer) -> None:
    real = Stack.parse(["2 x 40 x 0.247", "1 x 20 x 0.3"])
    nominal = Stack.parse(["2 x 40 x 0.25", "1 x 20 x 0.3"])
    stack = find_document(_only(answer, stack=nominal, real_stack=real))["stacks"][0]
    assert stack["shims"][0] == {"outer_mm": 40.0, "thickness_mm": 0.25, "quantity": 2}
    assert stack["measured_shims"][0]["thickness_mm"] == 0.247


def test_panels_show_the_target_and_the_best(answer: Answer) -> None:
    def curves(count: int) -> list[list[Any]]:
        velocity = [0.1, 0.5]
        return [[_curve(one, p, velocity) for p in one.proposals[:count]] for one in answer.found]

    panels = panels_of(answer, curves(2))
    assert len(panels) == 2
    assert [line.kind for line in panels[0].lines] == ["target", "predicted", "predicted"]
    assert panels[0].lines[1].label.startswith("stack 1, ")
    assert panels[0].lines[1].low_n is None
    assert panels_of(answer, curves(1))[0].lines[1].low_n is not None


def _curve(found: Found, proposal: Proposal, velocity: list[float]) -> Any:
    return predict(found.order.setup, proposal.real_stack, velocity, proposal.clicks)
