"""Sheets of a search, fresh and saved: the same, and honest about the drawer."""

import json
from typing import Any

import pytest

from optimiser.damper import Damper
from optimiser.faults import BadInput
from optimiser.files import read_damper, read_oil, read_steel, read_stock
from optimiser.prediction import predict
from optimiser.report.find_document import result_document
from optimiser.report.sheet import Fact
from optimiser.report.sheet_result import Tuned, ride_facts, sheets_of, tuned_from, tuned_of
from optimiser.results import Answer, SavedCircuit, SavedInput, SavedOrder, SavedTarget
from optimiser.search.pair import find_pair
from optimiser.wanted_files import read_target

RIDE = {
    "rider_kg": 82.0,
    "frame": "forest motorcycle, rear",
    "feel": "balanced",
    "coil_n_mm": 84.13,
    "preload_mm": 10,
    "sag_percent": 34.0,
    "sag_shaft_mm": 36.12,
}


@pytest.fixture(scope="module")
def damper() -> Damper:
    return read_damper("rear-monotube")


@pytest.fixture(scope="module")
def answer(damper: Damper) -> Answer:
    """Both directions from one small drawer, in revalve mode."""
    circuits = tuple(
        SavedCircuit(
            direction=direction,
            target=SavedTarget.of(read_target(f"example-{direction}", direction)),
            fitted=damper.circuit(direction).searched.fitted,
            click_range=(6, 16),
        )
        for direction in ("compression", "rebound")
    )
    order = SavedOrder(
        damper=damper,
        steel=read_steel(damper.steel),
        oil=read_oil(damper.oil),
        oil_temp_c=40.0,
        stock_name="small-shop",
        stock=read_stock("small-shop").items,
        circuits=circuits,
        parts=12,
        face_min=1,
        stages=(1, 2),
        rows=3,
        seed=5,
        evaluations=300,
        notes=("a note on both",),
        inputs=(SavedInput(kind="damper", name="rear-monotube", fingerprint="0123456789ab"),),
    )
    pair = find_pair(order.pair_order())
    found = (pair.first, pair.second)
    return Answer(order, found, tuple(one.details(0) for one in found), 1.0, True, 1)


@pytest.fixture(scope="module")
def document(answer: Answer) -> Any:
    return json.loads(json.dumps(result_document(answer)))


def test_saved_and_fresh_answers_give_the_same_sheets(answer: Answer, document: Any) -> None:
    fresh = tuned_of(answer)
    saved = tuned_from(answer.order, document, "result.json")
    assert saved == fresh


def test_a_sheet_a_direction_with_what_the_search_said(answer: Answer) -> None:
    # loose by 1e-3: a search reads pressures from a lift table of its own, as fine as this one
    sheets = sheets_of(tuned_of(answer, RIDE), "shimwright find --seed 5")
    assert [sheet.direction for sheet in sheets] == ["compression", "rebound"]
    for sheet, found in zip(sheets, answer.found, strict=True):
        best = found.proposals[0]
        assert sheet.parts == best.parts
        assert sheet.sizes == best.sizes
        assert sheet.clicks == best.clicks
        assert sheet.errors is not None
        assert sheet.errors.total_percent == pytest.approx(best.error_percent, rel=1e-3)
        assert sheet.errors.mid_percent == pytest.approx(best.bands.mid_percent, rel=1e-3)
        assert sheet.utilisation == pytest.approx(best.utilisation, rel=1e-3)
        assert [step.size for step in sheet.steps] == best.stack.lines()
        assert sheet.source.seed == 5
        assert Fact("rider with kit", "82 kg") in sheet.facts
        assert Fact("damper rear-monotube", "0123456789ab") in sheet.source.inputs
        assert "a note on both" in sheet.warnings
        assert any("cut short" in warning for warning in sheet.warnings)


def test_shares_of_forces_and_stress_are_the_predictions(answer: Answer) -> None:
    sheet = sheets_of(tuned_of(answer))[0]
    best = answer.best[0]
    assert [row.predicted_n for row in sheet.rows] == pytest.approx(best.force_n.tolist())
    worked = [one.peak_stress_mpa for step in sheet.steps for one in step.worked]
    assert worked == pytest.approx([shim.peak_stress_mpa for shim in best.shims])
    fine = sheet.opening
    again = predict(best.setup, best.stack, fine.velocity_m_s, best.clicks)
    assert fine.lift_mm.tolist() == pytest.approx(again.lift_mm.tolist())


def test_both_stacks_come_out_of_one_drawer(answer: Answer) -> None:
    """What is left after both builds, counted anew: stock and fitted shims less both stacks."""
    sheets = sheets_of(tuned_of(answer))
    counts: dict[tuple[float, float], int] = {}
    for item in answer.order.stock:
        if abs(item.inner_mm - 12.0) < 0.31:
            key = (item.outer_mm, item.thickness_mm)
            counts[key] = counts.get(key, 0) + item.quantity
    for circuit in answer.order.circuits:
        assert circuit.fitted is not None
        for shim in circuit.fitted.pieces:
            key = (shim.outer_mm, shim.thickness_mm)
            counts[key] = counts.get(key, 0) + 1
    for sheet in sheets:
        for step in sheet.steps:
            counts[step.shim.outer_mm, step.shim.thickness_mm] -= step.quantity
        for step in sheet.steps:
            assert step.left == counts[step.shim.outer_mm, step.shim.thickness_mm]
            assert step.left >= 0


def test_revalving_says_what_goes_out_and_in(answer: Answer) -> None:
    for sheet, found in zip(sheets_of(tuned_of(answer)), answer.found, strict=True):
        assert sheet.exchange is not None
        moved = sum(
            int(line.split(" x ")[0]) for line in (*sheet.exchange.out, *sheet.exchange.put_in)
        )
        assert moved == found.proposals[0].changed


def test_further_ranks(answer: Answer) -> None:
    tuned = tuned_of(answer)
    count = max(len(tunes.stacks) for tunes in tuned.tunes)
    sheets = sheets_of(tuned, ranks=range(1, count + 1))
    assert len(sheets) == sum(len(tunes.stacks) for tunes in tuned.tunes)
    with pytest.raises(BadInput, match=rf"--rank is {count + 1}; allowed: 1 to {count}"):
        sheets_of(tuned, ranks=[count + 1])


def test_faults_of_a_saved_answer_are_told_at_once(answer: Answer, document: Any) -> None:
    broken = json.loads(json.dumps(document))
    stacks = broken["circuits"]["compression"]["stacks"]
    stacks[0]["shims"] = stacks[0]["shims"][:1]
    broken["circuits"]["rebound"]["stacks"][0]["measured_shims"][0]["quantity"] += 1
    with pytest.raises(BadInput) as error:
        tuned_from(answer.order, broken, "result.json")
    assert len(error.value.faults) == 2
    assert "result.json: circuits.compression.stacks[1]: a stack needs" in error.value.faults[0]
    assert "allowed: as many" in error.value.faults[1]
    with pytest.raises(BadInput, match="key circuits is missing"):
        tuned_from(answer.order, {}, "result.json")


def test_clicks_beyond_the_adjuster_are_bad_input(answer: Answer, document: Any) -> None:
    broken = json.loads(json.dumps(document))
    broken["circuits"]["rebound"]["stacks"][0]["clicks"] = 50
    tuned = tuned_from(answer.order, broken, "result.json")
    with pytest.raises(BadInput, match="rebound, stack 1: clicks is 50; allowed: 0 to 22"):
        sheets_of(tuned)


def test_a_target_out_of_reach_is_said(answer: Answer) -> None:
    tuned = tuned_of(answer)
    first = tuned.tunes[0]
    far = Tuned(answer.order, (type(first)(first.direction, first.stacks, ("at 1 m/s", "b")),))
    warnings = sheets_of(far)[0].warnings
    assert "the target cannot be met everywhere: at 1 m/s (and at 1 more)" in warnings


def test_ride_in_words() -> None:
    words = {fact.label: fact.value for fact in ride_facts(RIDE)}
    assert words == {
        "rider with kit": "82 kg",
        "frame": "forest motorcycle, rear",
        "feel": "balanced",
        "spring on the shaft": "coil 84.1 N/mm, 10 mm preload",
        "sag": "34.0 %, 36.1 mm of shaft",
    }
    air = ride_facts({"coil_n_mm": None, "shaft_rate_n_mm": 40.0})
    assert air == (Fact("spring on the shaft", "air, 40.0 N/mm at sag"),)
    assert ride_facts({}) == ()
