"""``shimwright stock`` as a user meets it."""

import re
from pathlib import Path

import pytest

from optimiser.files import bundled_names, read_damper, read_stock
from tests.cli.calling import call, lines_wider_than

HEAD = "outer_mm,inner_mm,thickness_mm,quantity"
TAPER = ("--shim", "2 x 40 x 0.20", "--shim", "1 x 30 x 0.20", "--shim", "2 x 20 x 0.30")


def _list(folder: Path, *rows: str, head: str = HEAD) -> str:
    file = folder / "mine.csv"
    file.write_text("\n".join([head, *rows]) + "\n", encoding="utf-8")
    return str(file)


@pytest.mark.parametrize("name", bundled_names("stock"))
def test_every_shim_of_a_list_is_counted(name: str) -> None:
    called = call("stock", "--stock", name, env={"COLUMNS": "80"})
    assert called.code == 0
    assert not lines_wider_than(called.out, 80)
    counted = re.findall(r"^bore [\d.]+ mm: (\d+) shims in", called.out, re.MULTILINE)
    listed = re.findall(r"(\d+) of [\d.]+ x [\d.]+", called.out)
    assert sum(map(int, [*counted, *listed])) == read_stock(name).pieces
    document = call("stock", "--stock", name, "--json").document
    assert sum(item["quantity"] for item in document["items"]) == document["pieces"]
    assert document["build"] is None
    assert [file["kind"] for file in document["inputs"]] == ["stock"]


def test_table_has_diameters_down_and_thicknesses_across(tmp_path: Path) -> None:
    rows = ("24,12,0.10,3", "24,12,0.125,4", "20,12,0.10,0", "20,12,0.30,5", "18,12,0.30,1")
    out = call("stock", "--stock", _list(tmp_path, *rows)).out
    lines = [line.split() for line in out.splitlines()]
    assert ["dia.", "0.10", "0.125", "0.30", "all"] in lines
    assert ["24", "3", "4", "7"] in lines
    assert ["20", "0", "5", "5"] in lines
    assert ["18", "1", "1"] in lines
    assert "1 of 5 lines have 0 shims" in out


def test_many_thicknesses_are_split_into_tables_of_80_columns(tmp_path: Path) -> None:
    rows = [f"{outer},12,{0.1 + 0.01 * k:.2f},7" for outer in (30, 24) for k in range(23)]
    called = call("stock", "--stock", _list(tmp_path, *rows), env={"COLUMNS": "80"})
    assert not lines_wider_than(called.out, 80)
    heads = [line for line in called.out.splitlines() if line.startswith("dia.")]
    assert [line.endswith("all") for line in heads] == [False, False, True]
    assert ["30", *["7"] * 3, str(7 * 23)] in [line.split() for line in called.out.splitlines()]


def test_a_post_leaves_out_other_bores_and_names_ring_shims() -> None:
    document = call("stock", "--post", "12", "--json").document
    assert all(item["inner_mm"] == 12 for item in document["items"])
    assert all(item["inner_mm"] > 12.3 for item in document["ring_shims"])
    out = call("stock", "--post", "12").out
    assert "on a 12 mm post" in out
    assert "as ring shims" in out
    assert "none" in call("stock", "--post", "77").out


def test_measured_thickness_and_bins_are_shown(tmp_path: Path) -> None:
    rows = ("40,12,0.20,4,0.196,drawer 1", "30,12,0.20,1,,drawer 2", "20,12,0.30,2,,")
    stock = _list(tmp_path, *rows, head=f"{HEAD},measured_mm,bin")
    called = call("stock", "--stock", stock, *TAPER)
    assert called.code == 0
    assert "40 x 0.20 mm is 0.196 mm" in called.out
    assert "drawer 1" in called.out
    by_measure = ("--shim", "2 x 40 x 0.196", *TAPER[2:])
    assert call("stock", "--stock", stock, *by_measure).code == 0


def test_a_build_takes_what_it_needs_and_leaves_the_rest() -> None:
    build = call("stock", "--stock", "small-shop", *TAPER, "--json").document["build"]
    assert build["buildable"] is True
    assert build["parts"] == 5
    assert build["height_mm"] == pytest.approx(1.2)
    have = {(i.outer_mm, i.thickness_mm): i.quantity for i in read_stock("small-shop")}
    for shim in build["shims"]:
        there = have[shim["outer_mm"], shim["thickness_mm"]]
        assert shim["available"] == there
        assert shim["left"] == there - shim["needed"]
        assert shim["missing"] == 0


def test_what_is_missing_is_named_and_the_exit_code_is_1(tmp_path: Path) -> None:
    stock = _list(tmp_path, "40,12,0.20,1", "30,12,0.20,5")
    called = call("stock", "--stock", stock, *TAPER, env={"COLUMNS": "80"})
    assert called.code == 1
    assert "missing: 1 x 40 x 0.20, 2 x 20 x 0.30" in called.out
    assert "the stock lacks 1 x 40 x 0.20, 2 x 20 x 0.30 mm" in called.err
    assert not lines_wider_than(called.out, 80)
    called = call("stock", "--stock", stock, *TAPER, "--json")
    assert called.code == 1
    build = called.document["build"]
    assert build["buildable"] is False
    assert [shim["missing"] for shim in build["shims"]] == [1, 0, 2]


def test_price_is_the_sum_of_the_shims(tmp_path: Path) -> None:
    rows = ("40,12,0.20,4,1.50", "30,12,0.20,1,0.75", "20,12,0.30,2,0.50")
    stock = _list(tmp_path, *rows, head=f"{HEAD},price")
    document = call("stock", "--stock", stock, *TAPER, "--json").document
    assert document["build"]["price"] == pytest.approx(2 * 1.5 + 0.75 + 2 * 0.5)
    assert "4.75" in call("stock", "--stock", stock, *TAPER, "--quiet").out


@pytest.mark.parametrize("damper", bundled_names("damper"))
def test_a_damper_names_its_post_and_what_fits_its_valve(damper: str) -> None:
    for circuit in ("compression", "rebound"):
        options = ("--damper", damper, "--circuit", circuit, "--stack", "fitted")
        called = call("stock", *options, env={"COLUMNS": "80"})
        valve = read_damper(damper).circuit("compression" if circuit[0] == "c" else "rebound")
        assert valve.searched.post is not None
        assert f"on a {valve.searched.post.post_mm:g} mm post" in called.out
        assert "As face shim of" in called.out
        assert not lines_wider_than(called.out, 80)
        assert called.code in (0, 1)


def test_a_stack_that_does_not_suit_the_damper_gets_warnings() -> None:
    called = call("stock", "--damper", "rear-monotube", "--shim", "1 x 30 x 0.20", *TAPER[4:])
    assert "does not cover the seat" in called.out
    document = call("stock", "--damper", "rear-monotube", *TAPER, "--json").document
    assert any("height_min_mm" in text for text in document["build"]["warnings"])


def test_quiet_and_ascii() -> None:
    assert "As face shim" not in call("stock", "--damper", "rear-monotube", "--quiet").out
    assert call("stock", *TAPER, "--post", "12", env={"TERM": "dumb"}).out.isascii()


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--stock", "shelf"], ["no stock list named", "workshop"]),
        (["--stock", "./absent.csv"], ["absent.csv", "no such file"]),
        (["--post", "12", "--damper", "rear-monotube"], ["--post and --damper"]),
        (["--post", "0"], ["--post is 0", "1 to 100"]),
        (["--post", "nan"], ["--post is nan"]),
        (["--circuit", "rebound"], ["--circuit belongs to --damper"]),
        (["--damper", "rear-monotube", "--circuit", "both"], ["--circuit is both"]),
        (["--damper", "absent", "--stock", "shelf"], ["no damper named", "no stock list named"]),
        (["--stack", "rear-two-stage", *TAPER], ["--stack and --shim"]),
        (["--stack", "fitted"], ["--damper"]),
        (["--stack", "./absent.csv"], ["absent.csv"]),
        (["--shim", "2 by 40"], ["--shim", "3 x 24 x 0.15"]),
        (["--shim", "1 x 20 x 0.10", "--shim", "1 x 18 x 0.30"], ["bores of", "name the post"]),
    ],
)
def test_bad_input_gets_a_sentence_and_exit_code_2(options: list[str], said: list[str]) -> None:
    called = call("stock", *options)
    assert called.code == 2
    assert called.out == ""
    for text in said:
        assert text in called.err


def test_every_fault_of_a_list_is_named(tmp_path: Path) -> None:
    rows = ("40,12,0.20,-1", "30,40,0.20,2", "20,12,0,2", "18,12,0.3,1.5")
    called = call("stock", "--stock", _list(tmp_path, *rows))
    assert called.code == 2
    for line in ("line 2", "line 3", "line 4", "line 5"):
        assert line in called.err


def test_a_list_without_shims_is_refused(tmp_path: Path) -> None:
    called = call("stock", "--stock", _list(tmp_path, "40,12,0.20,0"))
    assert called.code == 2
    assert "every quantity is 0" in called.err
