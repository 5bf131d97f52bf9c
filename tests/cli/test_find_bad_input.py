"""``shimwright find``: every bad input gets its own sentence, and nothing is written."""

from pathlib import Path

import pytest

from tests.cli.calling import call

STOCK_HEAD = "outer_mm,inner_mm,thickness_mm,quantity\n"
TARGET_HEAD = "velocity_m_s,force_n,weight\n"
SHORT = ("--evaluations", "600", "--stock", "small-shop")

STOCKS = [
    ("", 2, ["stock.csv", "has a header but no rows"]),
    ("40,12,0.2,0\n20,12,0.3,0\n", 2, ["stock.csv", "every quantity is 0"]),
    ("40,8,0.2,5\n20,8,0.3,5\n", 1, ["no shim fits the 12 mm post", "bores in stock: 8 mm"]),
    ("40,12,0.2,0\n20,8,0.3,5\n", 1, ["every shim for the 12 mm post has quantity 0"]),
    ("36,12,0.2,9\n20,12,0.3,9\n", 1, ["No shim covers the seat", "40 to 44.5 mm", "36 mm"]),
    ("40,12,0.2,9\n30,12,0.3,9\n", 1, ["No clamp shim", "27 mm"]),
    ("40,12,0.2,1\n20,12,0.1,2\n", 1, ["cannot reach its least height of 1.8 mm"]),
]
TARGETS = [
    ("0.1,200,1\n", ["one point only"]),
    ("0.1,200,1\n0.05,100,1\n", ["line 3", "sorted, slowest first"]),
    ("-0.1,200,1\n0.2,400,1\n", ["line 2", "negative"]),
    ("0.1,200,1\n0.1,210,1\n", ["line 3", "given twice"]),
    ("0.1,0,1\n0.2,210,1\n", ["line 2", "force_n is 0"]),
    ("0.1,200,0\n0.2,400,0\n", ["every weight is 0"]),
    ("0.1,20000,1\n0.2,40000,1\n", ["far outside", "8", "times", "this stock makes"]),
    ("0.1,0.2,1\n0.2,0.4,1\n", ["far outside", "check its unit (N)"]),
]


@pytest.mark.parametrize(("rows", "code", "said"), STOCKS)
def test_stock(rows: str, code: int, said: list[str], tmp_path: Path) -> None:
    file = tmp_path / "stock.csv"
    file.write_text(STOCK_HEAD + rows, encoding="utf-8")
    out = tmp_path / "result"
    called = call("find", "--stock", str(file), "--out", str(out), "--quiet")
    assert (called.code, called.out) == (code, "")
    assert all(text in called.err for text in said), called.err
    assert len(called.err.splitlines()) == 1
    assert not out.exists()


@pytest.mark.parametrize(("rows", "said"), TARGETS)
def test_target(rows: str, said: list[str], tmp_path: Path) -> None:
    file = tmp_path / "target.csv"
    file.write_text(TARGET_HEAD + rows, encoding="utf-8")
    called = call("find", *SHORT, "--target", str(file), "--quiet")
    assert (called.code, called.out) == (2, "")
    assert all(text in called.err for text in said), called.err
    assert len(called.err.splitlines()) == 1


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--clicks", "3", "--click-range", "2-4"], ["--clicks and --click-range"]),
        (["--clicks", "23"], ["--clicks is 23 for compression", "0 (closed) to 22 (open)"]),
        (["--click-range", "9-3"], ["--click-range is '9-3'", "4-12"]),
        (["--click-range", "3"], ["--click-range is '3'"]),
        (["--click-range", "3-99"], ["3-99 for compression", "0 (closed) to 22 (open)"]),
        (["--damper", "digressive-monotube", "--click-range", "1-3"], ["no adjuster"]),
        (["--fitted-clicks", "4", "--target", "example-compression"], ["--fitted-clicks is"]),
        (["--fitted-clicks", "99", "--low", "5"], ["--fitted-clicks is 99 for compression"]),
        (["--parts", "99"], ["--parts", "2 to 40"]),
        (["--face-min", "0"], ["--face-min", "1 to 13"]),
        (["--height-max-mm", "-1"], ["--height-max-mm is -1"]),
        (["--height-min-mm", "9"], ["minimum 9 mm", "maximum 6 mm"]),
        (["--rows", "0"], ["--rows is 0; allowed: 1 to 100"]),
        (["--seed", "-1"], ["--seed is -1"]),
        (["--workers", "0"], ["--workers is 0"]),
        (["--evaluations", "1"], ["--evaluations is 1"]),
        (["--rank-by", "beauty"], ["beauty", "stress"]),
        (["--stages", "3"], ["3", "both"]),
        (["--chart", "c.gif"], [".gif", ".svg"]),
        (["--stock", "absent"], ["no stock list named", "workshop"]),
        (["--target", "./absent.csv"], ["absent.csv", "no such file"]),
        (["--target", "example-compression", "--low", "5"], ["--target and --low"]),
        (["--again", "./absent.json"], ["absent.json", "no such file"]),
        (["--again", "./absent.json", "--seed", "3"], ["--again", "--seed", "--workers"]),
        (["--circuit", "both", "--target", "example-compression"], ["--target is given once"]),
    ],
)
def test_options(options: list[str], said: list[str]) -> None:
    called = call("find", *options, "--quiet")
    assert (called.code, called.out) == (2, "")
    assert all(text in called.err for text in said), called.err
    assert "Traceback" not in called.err


def test_all_faults_that_can_be_told_come_at_once() -> None:
    called = call("find", "--rows", "0", "--parts", "99", "--click-range", "x", "--workers", "99")
    assert len(called.err.splitlines()) == 4
    called = call("find", "--damper", "none", "--stock", "nothing")
    assert "no damper named" in called.err
    assert "no stock list named" in called.err


def test_two_stages_that_do_not_go_into_few_parts() -> None:
    called = call("find", *SHORT, "--stages", "2", "--parts", "3", "--height-min-mm", "0.5")
    assert called.code == 1
    assert "Two stages with 1 face shim(s) need at least 4 shims" in called.err
