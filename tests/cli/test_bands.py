"""``--bands`` of ``curve`` and ``find``, from the outside."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.cli.calling import Called, call, lines_wider_than

FEW = ("--velocities", "0.05,0.3,0.8")
ONE = ("--circuit", "compression", *FEW, "--bands")
SHORT = ("--evaluations", "600", "--stock", "small-shop", "--seed", "5", "--bands")


@pytest.fixture(scope="module")
def calibrated(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A damper file with the record of its fit beside it."""
    out = tmp_path_factory.mktemp("calibrated") / "mine.toml"
    assert call("fit", "rear-monotube", "--out", str(out), "--quiet").code == 0
    return out


@pytest.fixture(scope="module")
def saved(tmp_path_factory: pytest.TempPathFactory) -> tuple[Called, Path]:
    """A search with bands, its files and sheet."""
    folder = tmp_path_factory.mktemp("banded")
    files = ("--out", str(folder / "result"), "--sheet", str(folder / "sheet.html"))
    called = call("find", *SHORT, "--within", "6", *files)
    assert called.code == 0, called.err
    return called, folder


def _width(document: Any) -> Any:
    low, high = (np.array(document[f"force_p{edge}_n"]) for edge in ("05", "95"))
    return (high - low) / np.array(document["force_n"])


def test_curve_has_the_band_in_table_and_document() -> None:
    printed, document = call("curve", *ONE).out, call("curve", *ONE, "--json").document
    head, row = printed.splitlines()[2], printed.splitlines()[6]
    assert head.split()[:6] == ["velocity", "force", "5", "%", "95", "%"]
    middle = document["force_n"][1], document["force_p05_n"][1], document["force_p95_n"][1]
    assert row.split()[1:4] == [f"{force:.0f}" for force in middle]
    assert (document["samples"], document["seed"]) == (1000, 0)
    assert "usual errors of a damper" in document["band_source"]
    assert "1000 samples (seed 0), from usual errors of a damper" in " ".join(printed.split())
    low, force, high = (document[key] for key in ("force_p05_n", "force_n", "force_p95_n"))
    assert all(a < b < c for a, b, c in zip(low, force, high, strict=True))


def test_without_bands_nothing_of_them_is_there() -> None:
    called = call("curve", *FEW, "--circuit", "compression", "--json")
    assert not {"force_p05_n", "samples", "seed", "band_source"} & set(called.document)
    assert "95 %" not in call("curve", *FEW).out


def test_the_seed_of_curve_decides() -> None:
    one, again, other = (
        call("curve", *ONE, "--seed", seed, "--json").document for seed in ("3", "3", "4")
    )
    assert one["force_p05_n"] == again["force_p05_n"] != other["force_p05_n"]
    assert one["force_n"] == other["force_n"]


@pytest.mark.parametrize("damper", ["rear-monotube", "fork-cartridge", "digressive-monotube"])
def test_curve_with_bands_fits_80_columns(damper: str) -> None:
    called = call("curve", "--damper", damper, "--bands")
    assert called.code == 0
    assert not lines_wider_than(called.out, 80)
    assert "95 %" in called.out


def test_stacks_compared_have_a_table_of_their_own() -> None:
    stacks = ("--stack", "fitted", *["--stack", "rear-two-stage"] * 4)
    called = call("curve", *stacks, *FEW, "--bands")
    assert not lines_wider_than(called.out, 80)
    first = call("curve", *ONE, "--json").document
    low, high = first["force_p05_n"][0], first["force_p95_n"][0]
    assert f"{low:.0f} to {high:.0f}" in called.out
    assert called.out.count("likely") == 5 + 1


def test_a_fit_beside_the_damper_narrows_the_band(calibrated: Path) -> None:
    mine = call("curve", "--damper", str(calibrated), *ONE, "--json").document
    usual = call("curve", *ONE, "--json").document
    assert mine["band_source"] == "the errors in mine.fit.json"
    assert np.all(_width(mine) < 0.6 * _width(usual))
    assert [file["kind"] for file in mine["inputs"]] == ["damper", "steel", "oil", "fit record"]


def test_chart_and_sheet_show_the_spread(tmp_path: Path) -> None:
    def drawn(*options: str) -> tuple[str, str]:
        chart, sheet = tmp_path / "chart.svg", tmp_path / "sheet.html"
        called = call("curve", *options, "--chart", str(chart), "--sheet", str(sheet))
        assert called.code == 0
        return chart.read_text(encoding="utf-8"), sheet.read_text(encoding="utf-8")

    with_band, without = drawn(*ONE), drawn(*ONE[:-1])
    assert with_band[0].count("<pattern") == without[0].count("<pattern") + 1
    assert "likely spread" in with_band[1]
    assert "likely spread" not in without[1]


def test_find_lists_the_chance_of_every_stack(saved: tuple[Called, Path]) -> None:
    called, folder = saved
    document = json.loads((folder / "result" / "result.json").read_text(encoding="utf-8"))
    assert (document["within_percent"], document["samples"], document["seed"]) == (6.0, 1000, 5)
    assert not lines_wider_than(called.out, 80)
    rows = [line.split() for line in called.out.splitlines() if line[:1].isdigit()]
    target = np.array(document["target"]["force_n"])
    for number, stack in enumerate(document["stacks"], start=1):
        assert 0.0 <= stack["chance_within"] <= 1.0
        low, high = np.array(stack["force_p05_n"]), np.array(stack["force_p95_n"])
        assert low.shape == high.shape == target.shape
        assert np.all(low < high)
        row = next(row for row in rows if row[0] == str(number))
        assert f"{100.0 * stack['chance_within']:.0f} %" in " ".join(row)
    assert "that or less" in called.out
    assert "likely spread" in (folder / "sheet.html").read_text(encoding="utf-8")


def test_again_draws_the_same_bands_without_the_files(calibrated: Path, tmp_path: Path) -> None:
    damper = tmp_path / "own.toml"
    record = damper.with_suffix(".fit.json")
    damper.write_bytes(calibrated.read_bytes())
    record.write_bytes(calibrated.with_suffix(".fit.json").read_bytes())
    options = (*SHORT, "--damper", str(damper), "--rank-by", "chance", "--rows", "3")
    first = call("find", *options, "--out", str(tmp_path / "result"), "--json").document
    record.unlink()
    again = call("find", "--again", str(tmp_path / "result" / "result.json"), "--json").document
    for key in ("stacks", "rank_by", "rank_rule", "within_percent", "band_source"):
        assert again[key] == first[key]
    assert first["band_source"] == "the errors in own.fit.json"
    assert "fit record" in {file["kind"] for file in first["inputs"]}


def test_rank_by_chance_sorts_by_it_and_draws_bands() -> None:
    options = tuple(option for option in SHORT if option != "--bands")
    document = call("find", *options, "--rank-by", "chance", "--rows", "4", "--json").document
    inside = [stack for stack in document["stacks"] if not stack["outside_model"]]
    chances = [stack["chance_within"] for stack in inside]
    assert len(document["stacks"]) == 4
    assert chances == sorted(chances, reverse=True)
    assert document["rank_by"] == "chance"
    assert "Ranked by the chance to be within 5 %" in document["rank_rule"]


def test_bands_change_nothing_else(saved: tuple[Called, Path]) -> None:
    plain = call("find", *SHORT[:-1], "--json").document
    document = json.loads((saved[1] / "result" / "result.json").read_text(encoding="utf-8"))
    for stack, other in zip(plain["stacks"], document["stacks"], strict=True):
        assert all(stack[key] == other[key] for key in stack)


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("find", "--within", "4"), "--within needs a band"),
        (("find", "--bands", "--within", "0"), "--within is 0; allowed: above 0"),
        (("find", "--bands", "--within", "nan"), "--within is nan"),
        (("find", "--again", "./absent.json", "--bands"), "--again repeats a saved search"),
        (("curve", "--seed", "4"), "--seed is 4, but nothing is drawn"),
        (("curve", "--seed", "-1", "--bands"), "--seed is -1; allowed: 0 to"),
    ],
)
def test_bad_input(options: tuple[str, ...], said: str) -> None:
    called = call(*options)
    assert (called.code, called.out) == (2, "")
    assert said in called.err


def test_a_record_that_is_none_stops_bands_only(calibrated: Path, tmp_path: Path) -> None:
    damper = tmp_path / "mine.toml"
    damper.write_bytes(calibrated.read_bytes())
    damper.with_suffix(".fit.json").write_text("{}", encoding="utf-8")
    options = ("curve", "--damper", str(damper), *FEW)
    called = call(*options, "--bands")
    assert called.code == 2
    assert "is no record of a fit" in called.err
    assert call(*options).code == 0
