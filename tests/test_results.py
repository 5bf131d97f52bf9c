"""The saved order: written, read back equal, and every fault of an edited file named."""

import json
from pathlib import Path
from typing import Any

import pytest

from optimiser.cli.inputs import read_given
from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.files import bundled_names, read_stock
from optimiser.results import (
    SavedCircuit,
    SavedInput,
    SavedOrder,
    SavedTarget,
    is_result,
    post_mm,
    read_result,
)
from optimiser.stack import Shim, Stack
from optimiser.stock import Stock
from optimiser.wanted.target import Target

THIRDS = Target.of([0.1 / 3, 0.2, 0.7], [100.0 / 3, 250.0, 900.1], [1.0, 0.0, 2.0 / 3], notes=["n"])


def saved(damper: str = "rear-monotube", fitted: bool = True) -> SavedOrder:
    """An order for both directions of a bundled damper."""
    given = read_given(damper)
    circuits = []
    for direction in given.directions():
        setup = given.setup(direction)
        circuits.append(
            SavedCircuit(
                direction=direction,
                target=SavedTarget.of(THIRDS),
                fitted=setup.valve.fitted if fitted else None,
                click_range=(0, setup.clicks_range),
            )
        )
    return SavedOrder(
        damper=given.damper,
        steel=given.steel,
        oil=given.oil,
        oil_temp_c=given.oil_temp_c,
        stock_name="workshop",
        stock=read_stock("workshop").items,
        circuits=tuple(circuits),
        parts=12,
        face_min=1,
        stages=(1, 2),
        height_max_mm=4.0,
        rows=5,
        seed=3,
        evaluations=700,
        inputs=(SavedInput(kind="damper", name=damper, fingerprint="0123456789ab"),),
    )


def written(path: Path, order: dict[str, Any]) -> Path:
    """A result file with an order, and nothing else that is looked at."""
    path.write_text(json.dumps({"stacks": [], "order": order}), encoding="utf-8")
    return path


@pytest.mark.parametrize("damper", bundled_names("damper"))
@pytest.mark.parametrize("fitted", [True, False])
def test_reads_back_equal(damper: str, fitted: bool, tmp_path: Path) -> None:
    order = saved(damper, fitted)
    assert read_result(written(tmp_path / "result.json", order.record())) == order


def test_numbers_keep_every_digit_through_json(tmp_path: Path) -> None:
    back = read_result(written(tmp_path / "result.json", saved().record()))
    target = back.circuits[0].target.target("compression")
    assert target.velocity_m_s.tolist() == THIRDS.velocity_m_s.tolist()
    assert target.force_n.tolist() == THIRDS.force_n.tolist()
    assert target.weight.tolist() == THIRDS.weight.tolist()


def test_a_fitted_stack_keeps_ring_shims_and_odd_thicknesses(tmp_path: Path) -> None:
    pieces = [Shim(40.0, 0.2534567891), Shim(38.0, 0.2, 30.0), Shim(36.0, 0.2), Shim(20.0, 0.3)]
    stack = Stack.of(pieces)
    order = saved()
    circuit = order.circuits[0].model_copy(update={"fitted": stack})
    order = order.model_copy(update={"circuits": (circuit,)})
    assert read_result(written(tmp_path / "r.json", order.record())).circuits[0].fitted == stack


def test_search_orders_hold_what_was_saved() -> None:
    order = saved()
    compression, rebound = order.orders(workers=2)
    assert [one.setup.direction for one in (compression, rebound)] == ["compression", "rebound"]
    assert compression.limits.parts == 12
    assert compression.limits.height_max_mm == 4.0
    assert (compression.rows, compression.seed, compression.workers) == (5, 3, 2)
    assert compression.settings.evaluations == 700
    assert compression.fitted == compression.setup.valve.fitted
    post = post_mm(compression.setup)
    assert compression.lines == tuple(Stock(order.stock).for_post(post))
    assert order.pair_order().posts_mm == (post, post_mm(rebound.setup))


def _directions(order: dict[str, Any], first: Direction, second: Direction) -> None:
    order["circuits"][0]["direction"], order["circuits"][1]["direction"] = first, second


@pytest.mark.parametrize(
    ("spoil", "said"),
    [
        (lambda o: o.update(format=2), "order: key format"),
        (lambda o: o.update(colour="red"), "key colour is not known"),
        (lambda o: o.pop("steel"), "key steel is missing"),
        (lambda o: o["stock"][2].update(quantity=-4), "key stock[3]: quantity -4"),
        (lambda o: o["circuits"][0].update(click_range=[3, 90]), "click_range 3 to 90; allowed"),
        (lambda o: o["circuits"][0].update(click_range=[9, 3]), "click_range 9 to 3; allowed"),
        (lambda o: o["circuits"][1]["target"]["force_n"].pop(), "key circuits[2].target"),
        (lambda o: _directions(o, "rebound", "rebound"), "names one direction twice"),
        (lambda o: o.update(circuits=[]), "is empty"),
        (lambda o: o.update(parts=1), "parts: 1 is not allowed"),
        (lambda o: o.update(seed=-1), "key seed"),
        (lambda o: o["damper"]["body"].update(shaft_mm=90.0), "shaft_mm"),
    ],
)
def test_an_edited_order_is_refused_with_a_sentence(spoil: Any, said: str, tmp_path: Path) -> None:
    order = saved().record()
    spoil(order)
    file = written(tmp_path / "result.json", order)
    with pytest.raises(BadInput) as error:
        read_result(file)
    assert any(said in fault for fault in error.value.faults), error.value.faults
    assert all(str(file) in fault for fault in error.value.faults)


def test_all_faults_of_a_file_come_at_once(tmp_path: Path) -> None:
    order = saved().record()
    order["stock"][0]["quantity"] = -1
    order["rows"] = 0
    with pytest.raises(BadInput) as error:
        read_result(written(tmp_path / "result.json", order))
    assert len(error.value.faults) == 2


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("{", "line 1: is not JSON"),
        ('{"order": NaN, "stacks": []}', "NaN, which is not JSON"),
        ('{"order": 1e999, "stacks": []}', "too large"),
        ('{"stacks": []}', "holds no saved search"),
        ("[]", "holds no saved search"),
    ],
)
def test_other_files_are_refused(text: str, said: str, tmp_path: Path) -> None:
    file = tmp_path / "other.json"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(BadInput, match=said):
        read_result(file)


def test_an_absent_file_is_refused(tmp_path: Path) -> None:
    with pytest.raises(BadInput, match="no such file"):
        read_result(tmp_path / "absent.json")


def test_only_a_result_is_one() -> None:
    assert is_result({"order": {}, "stacks": []})
    assert not is_result({"order": []})
    assert not is_result(None)
