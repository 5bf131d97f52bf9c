"""``shimwright find`` as a user meets it."""

import csv
import json
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from optimiser.files import bundled_names, read_stock
from tests.cli.calling import Called, call, lines_wider_than

SHORT = ("--evaluations", "600", "--stock", "small-shop")
BOTH = ("--target", "example-compression", "--target", "example-rebound")
HEAD = "outer_mm,inner_mm,thickness_mm,quantity\n"

Size = tuple[float, float]


@pytest.fixture(scope="module")
def short() -> Called:
    """The bundled example from a small drawer, as JSON."""
    return call("find", *SHORT, "--json", "--seed", "5", "--workers", "1")


@pytest.fixture(scope="module")
def printed() -> str:
    """The same, printed."""
    return call("find", *SHORT, "--seed", "5", env={"COLUMNS": "80"}).out


@pytest.fixture(scope="module")
def pair(tmp_path_factory: pytest.TempPathFactory) -> tuple[Any, Counter[Size]]:
    """Both circuits from a scarce drawer, and what the drawer holds."""
    drawer = tmp_path_factory.mktemp("scarce") / "scarce.csv"
    with drawer.open("w", encoding="utf-8") as file:
        file.write(HEAD)
        for outer in (40, 36, 32, 28, 24, 22, 20, 18):
            for thickness in (0.15, 0.2, 0.25, 0.3):
                file.write(f"{outer},12,{thickness},{2 if outer >= 36 else 1}\n")
    called = call("find", *BOTH, "--evaluations", "600", "--stock", str(drawer), "--json")
    assert called.code == 0, called.err
    return called.document, _shelf(str(drawer))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A result folder, in a folder that is new as well."""
    made = tmp_path_factory.mktemp("saved") / "new" / "result"
    called = call("find", "--evaluations", "600", "--seed", "2", "--rows", "4", "--out", str(made))
    assert called.code == 0
    assert called.err.count("written: ") == 4
    return made


def _shelf(stock: str, post_mm: float = 12.0) -> Counter[Size]:
    """Pieces of every size that goes on a post."""
    counts: Counter[Size] = Counter()
    for item in read_stock(stock):
        if post_mm <= item.inner_mm <= post_mm + 0.3:
            counts[item.outer_mm, item.thickness_mm] += item.quantity
    return counts


def _used(shims: list[dict[str, float]]) -> Counter[Size]:
    counts: Counter[Size] = Counter()
    for group in shims:
        counts[group["outer_mm"], group["thickness_mm"]] += int(group["quantity"])
    return counts


def test_json_has_the_promised_keys(short: Called) -> None:
    document = short.document
    assert short.code == 0
    assert {"target", "stacks", "seed", "evaluations", "seconds", "limits", "outside"} <= set(
        document
    )
    assert document["seed"] == 5
    assert document["evaluations"] >= 600
    assert document["cut_short"] is False
    assert {file["kind"] for file in document["inputs"]} == {
        "damper", "steel", "oil", "stock", "target",
    }  # fmt: skip
    for stack in document["stacks"]:
        for key in ("clicks", "error_percent", "worst", "bands", "parts", "sizes", "utilisation"):
            assert key in stack
        for key in ("height_mm", "variants", "changed", "outside_model", "rise_thicknesses"):
            assert key in stack
        assert all({"outer_mm", "thickness_mm", "quantity"} == set(s) for s in stack["shims"])
    assert document["circuits"]["compression"]["stacks"] == document["stacks"]


def test_figures_of_a_stack_agree_with_its_shims_and_curve(short: Called) -> None:
    target = short.document["target"]
    for stack in short.document["stacks"]:
        shims = stack["shims"]
        assert stack["parts"] == sum(group["quantity"] for group in shims)
        assert stack["sizes"] == len(_used(shims))
        height = sum(group["quantity"] * group["thickness_mm"] for group in shims)
        assert stack["height_mm"] == pytest.approx(height)
        off = np.array(stack["force_n"]) / np.array(target["force_n"]) - 1.0
        weight = np.array(target["weight"])
        error = 100.0 * np.sqrt(np.average(off**2, weights=weight))
        assert stack["error_percent"] == pytest.approx(error)
        assert abs(stack["worst"]["percent"]) == pytest.approx(100.0 * np.abs(off).max())
        assert stack["outside_model"] == (stack["rise_thicknesses"] > 2.0)
        assert stack["velocity_m_s"] == target["velocity_m_s"]


def test_nothing_is_taken_that_is_not_in_stock(short: Called) -> None:
    shelf = _shelf("small-shop")
    for stack in short.document["stacks"]:
        assert _used(stack["shims"]) <= shelf


def test_the_best_stack_has_its_stress_shim_by_shim(short: Called) -> None:
    best, *others = short.document["stacks"]
    bending = sum(group["quantity"] for group in best["shims"][:-1])
    assert len(best["stress"]) == bending
    assert max(s["utilisation"] for s in best["stress"]) == pytest.approx(
        best["utilisation"], rel=0.02
    )
    assert all("stress" not in stack for stack in others)


def test_clicks_are_in_the_middle_half_unless_told_otherwise(short: Called) -> None:
    assert short.document["click_range"] == [6, 16]
    assert all(6 <= stack["clicks"] <= 16 for stack in short.document["stacks"])
    fixed = call("find", *SHORT, "--clicks", "3", "--json").document
    assert {stack["clicks"] for stack in fixed["stacks"]} == {3}


def test_limits_given_by_the_user_hold() -> None:
    limits = ("--parts", "9", "--face-min", "2", "--stages", "1", "--click-range", "0-5")
    heights = ("--height-min-mm", "2.2", "--height-max-mm", "2.5")
    document = call("find", *SHORT, *limits, *heights, "--rank-by", "error", "--json").document
    for stack in document["stacks"]:
        assert stack["parts"] <= 9
        assert stack["clicks"] <= 5
        assert 2.2 - 1e-9 <= stack["height_mm"] <= 2.5 + 1e-9
        outer = [g["outer_mm"] for g in stack["shims"] for _ in range(g["quantity"])]
        assert outer == sorted(outer, reverse=True)
        assert outer.count(outer[0]) >= 2
    errors = [s["error_percent"] for s in document["stacks"] if not s["outside_model"]]
    assert errors == sorted(errors)


@pytest.mark.parametrize(("rule", "key"), [("parts", "parts"), ("stress", "utilisation")])
def test_rank_by_sorts_what_is_near_the_best(rule: str, key: str) -> None:
    document = call("find", *SHORT, "--rank-by", rule, "--rows", "5", "--json").document
    assert f"Ranked by {key}" in document["rank_rule"]
    assert len(document["stacks"]) == 5
    inside = [stack for stack in document["stacks"] if not stack["outside_model"]]
    least = min(stack["error_percent"] for stack in inside)
    near = [stack[key] for stack in inside if stack["error_percent"] < least + 1.9]
    assert len(near) > 1
    assert near == sorted(near)


def test_same_seed_same_answer_for_any_number_of_workers(short: Called) -> None:
    two = call("find", *SHORT, "--json", "--seed", "5", "--workers", "2").document
    assert two["workers"] == 2
    for key in ("stacks", "limits", "evaluations", "target"):
        assert two[key] == short.document[key]


def test_limits_bound_every_stack_found(short: Called) -> None:
    limits = {key: np.array(value) for key, value in short.document["limits"].items()}
    assert np.all(limits["softest_possible_n"] <= limits["softest_in_stock_n"] * 1.001)
    assert np.all(limits["firmest_in_stock_n"] <= limits["firmest_possible_n"] * 1.001)
    for stack in short.document["stacks"]:
        force = np.array(stack["force_n"])
        assert np.all(force >= 0.97 * limits["softest_in_stock_n"])
        assert np.all(force <= 1.03 * limits["firmest_in_stock_n"])


def test_revalve_counts_what_is_changed_and_uses_the_fitted_shims(tmp_path: Path) -> None:
    drawer = tmp_path / "one.csv"
    drawer.write_text(f"{HEAD}40,12,0.15,1\n34,12,0.15,1\n22,12,0.2,1\n", encoding="utf-8")
    called = call("find", "--revalve", "--stock", str(drawer), "--evaluations", "600", "--json")
    document = called.document
    fitted = _used(document["fitted"])
    assert fitted[40.0, 0.25] == 2
    for stack in document["stacks"]:
        used = _used(stack["shims"])
        assert used <= fitted + _shelf(str(drawer))
        changed = sum((used - fitted).values()) + sum((fitted - used).values())
        assert stack["changed"] == changed
        moved = [*stack["take_out"], *stack["put_in"]]
        assert sum(int(line.split(" x ")[0]) for line in moved) == changed
    assert call("find", "--stock", str(drawer), "--json").code == 1


def test_a_fitted_file_is_revalved_and_its_curve_is_the_target(tmp_path: Path) -> None:
    file = tmp_path / "mine.csv"
    rows = ["40,0.3,4", "34,0.2,3", "26,0.2,1", "20,0.3,3"]
    file.write_text("\n".join(["outer_mm,thickness_mm,quantity", *rows]), encoding="utf-8")
    options = ("--fitted", str(file), "--fitted-clicks", "9")
    document = call("find", *SHORT, *options, "--json").document
    assert document["target"]["origin"].startswith("fitted stack at 9 of 22 clicks")
    assert _used(document["fitted"])[34.0, 0.2] == 3
    assert min(stack["error_percent"] for stack in document["stacks"]) < 0.5
    assert all(stack["changed"] is not None for stack in document["stacks"])
    assert "stack" in {file["kind"] for file in document["inputs"]}


def test_pairs_never_use_a_shim_twice(pair: tuple[Any, Counter[Size]]) -> None:
    document, shelf = pair
    compression = document["circuits"]["compression"]["stacks"]
    rebound = document["circuits"]["rebound"]["stacks"]
    assert document["stacks"] == compression
    for stack in rebound:
        assert _used(compression[0]["shims"]) + _used(stack["shims"]) <= shelf
    for stack in compression:
        assert _used(stack["shims"]) + _used(rebound[0]["shims"]) <= shelf
    assert document["target"]["direction"] == "compression"
    assert document["circuits"]["rebound"]["target"]["direction"] == "rebound"
    assert document["evaluations"] >= 1200


def test_pairs_in_revalve_mode_have_both_fitted_stacks_to_take_from() -> None:
    called = call("find", *SHORT, *BOTH, "--revalve", "--rows", "3", "--json")
    circuits = called.document["circuits"].values()
    shelf = _shelf("small-shop")
    for circuit in circuits:
        shelf += _used(circuit["fitted"])
    first, second = (_used(circuit["stacks"][0]["shims"]) for circuit in circuits)
    assert first + second <= shelf


def test_report_says_what_a_tuner_needs(printed: str) -> None:
    said = " ".join(printed.split())
    for words in (
        "rear-monotube, compression: light oil at 40 C, shims of small-shop",
        "wanted: example-compression",
        "lies within what this damper can do with this stock",
        "Ranked by error in steps of 0.5 points",
        "Clicks: 6 to 16 of 22",
        "stacks, face first",
        "piston face",
        "possible in stock in stock possible",
        "● wanted ○ stack 1",
        "% library",
        "Seed 5.",
        "verify on a dyno",
    ):
        assert words in said
    assert not lines_wider_than(printed, 80)


def test_report_shows_the_stacks_of_the_document(printed: str, short: Called) -> None:
    best = short.document["stacks"][0]
    for group in best["shims"]:
        assert (
            f"{group['quantity']} x {group['outer_mm']:g} x {group['thickness_mm']:.2f}" in printed
        )
    row = next(line for line in printed.splitlines() if line.startswith("1 "))
    assert row.split()[1] == f"{best['error_percent']:.2f}"


def test_quiet_leaves_out_notes_and_dumb_terminals_get_ascii(printed: str) -> None:
    quiet = call("find", *SHORT, "--quiet", env={"TERM": "dumb"})
    assert quiet.err == ""
    assert quiet.out.isascii()
    for words in ("verify on a dyno", "Ranked by", "o wanted"):
        assert words not in quiet.out
    assert "stack 1" in quiet.out
    assert len(quiet.out) < len(printed)


def test_points_out_of_reach_are_explained_first(tmp_path: Path) -> None:
    target = tmp_path / "firm.csv"
    target.write_text("velocity_m_s,force_n\n0.05,5000\n0.3,500\n1,1300\n", encoding="utf-8")
    options = ("find", *SHORT, "--target", str(target))
    called = call(*options)
    assert called.code == 0
    said = " ".join(called.out.split())
    assert "outside at 0.05 m/s 5000 N is wanted: the seat has no preload" in said
    assert said.index("outside at 0.05") < said.index("stack 1")
    document = call(*options, "--json").document
    assert document["reachable"] is False
    assert document["outside"][0]["reason"] == "no_preload"
    assert document["outside"][0]["beyond_percent"] > 100.0


def test_the_folder_holds_the_stacks(folder: Path) -> None:
    names = {path.name for path in folder.iterdir()}
    assert names == {"result.json", "stacks.csv", "stack-compression-1.csv", "chart.svg"}
    saved = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    with (folder / "stacks.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    columns = "rank circuit position outer_mm thickness_mm quantity clicks error_percent"
    assert list(rows[0]) == columns.split()
    for rank, stack in enumerate(saved["stacks"], start=1):
        listed = [row for row in rows if row["rank"] == str(rank)]
        assert [row["position"] for row in listed] == [
            str(k + 1) for k in range(len(stack["shims"]))
        ]
        for row, group in zip(listed, stack["shims"], strict=True):
            assert {key: float(row[key]) for key in group} == group
            assert row["clicks"] == str(stack["clicks"])
    assert {row["circuit"] for row in rows} == {"compression"}


def test_curve_says_the_same_of_the_saved_stack(folder: Path) -> None:
    saved = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    best = saved["stacks"][0]
    velocities = ",".join(repr(v) for v in best["velocity_m_s"])
    file = str(folder / "stack-compression-1.csv")
    clicks = str(best["clicks"])
    curve = call("curve", "--stack", file, "--velocities", velocities, "--clicks", clicks, "--json")
    assert curve.document["force_n"] == pytest.approx(best["force_n"], rel=2e-3)


def test_again_repeats_a_saved_search_and_replaces_it(folder: Path, tmp_path: Path) -> None:
    before = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    (folder / "my notes.txt").write_text("mine", encoding="utf-8")
    (folder / "stack-rebound-1.csv").write_text("of a former result", encoding="utf-8")
    chart = tmp_path / "chart.png"
    files = ("--out", str(folder), "--chart", str(chart))
    again = ("--again", str(folder / "result.json"), "--workers", "1")
    document = call("find", *again, *files, "--json").document
    for key in ("stacks", "limits", "evaluations", "target", "seed", "inputs"):
        assert document[key] == before[key]
    after = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    assert after["order"] == before["order"]
    assert (folder / "my notes.txt").read_text(encoding="utf-8") == "mine"
    assert not (folder / "stack-rebound-1.csv").exists()
    assert chart.read_bytes().startswith(b"\x89PNG")


def test_out_refuses_a_folder_with_other_things(tmp_path: Path) -> None:
    (tmp_path / "result.json").write_text('{"mine": 1}', encoding="utf-8")
    for folder in (tmp_path, tmp_path / "result.json"):
        called = call("find", *SHORT, "--out", str(folder))
        assert called.code == 2
        assert "--out:" in called.err
    assert [path.name for path in tmp_path.iterdir()] == ["result.json"]
    assert (tmp_path / "result.json").read_text(encoding="utf-8") == '{"mine": 1}'


@pytest.mark.parametrize("damper", [d for d in bundled_names("damper") if d != "rear-monotube"])
def test_other_dampers_start_from_what_is_fitted(damper: str) -> None:
    called = call("find", "--damper", damper, "--evaluations", "300", "--low", "15", "--rows", "2")
    assert called.code == 0
    assert "low +15 %" in called.out
    assert not lines_wider_than(called.out, 80)


def test_a_ride_can_be_asked_for() -> None:
    ride = ("--rider-kg", "82", "--frame", "forest-motorcycle", "--feel", "balanced")
    document = call("find", *SHORT, *ride, "--rows", "2", "--json").document
    assert {"frame", "feel"} <= {file["kind"] for file in document["inputs"]}
    assert len(document["target"]["velocity_m_s"]) > 3
