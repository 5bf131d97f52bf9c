"""``shimwright stock --what-to-buy``."""

from pathlib import Path

import pytest

from optimiser.cli import buying
from tests.cli.calling import call, lines_wider_than

#: Two points the fitted stack meets but a drawer without its face shims does not.
DRAWER = """outer_mm,inner_mm,thickness_mm,quantity
40,12,0.15,2
36,12,0.20,1
32,12,0.20,1
28,12,0.20,1
24,12,0.20,1
20,12,0.30,4
"""
SHOP = """outer_mm,inner_mm,thickness_mm,quantity
40,12,0.25,10
26,12,0.10,10
"""


@pytest.fixture
def options(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> list[str]:
    monkeypatch.setattr(buying, "EVALUATIONS", 60)
    drawer, shop = tmp_path / "drawer.csv", tmp_path / "shop.csv"
    target = tmp_path / "target.csv"
    drawer.write_text(DRAWER, encoding="utf-8")
    shop.write_text(SHOP, encoding="utf-8")
    target.write_text(
        "velocity_m_s,force_n\n0.05,200\n0.1,270\n0.2,390\n0.4,610\n0.6,850\n", encoding="utf-8"
    )
    return [
        "stock", "--what-to-buy", "--stock", str(drawer), "--to-buy", str(shop), "--target",
        str(target), "--tolerance", "12",
    ]  # fmt: skip


def test_the_missing_face_shim_is_named(options: list[str]) -> None:
    called = call(*options, "--json")
    assert called.code == 0, called.err
    document = called.document
    assert not document["good_enough"]
    first = document["to_buy"][0]
    assert [(size["outer_mm"], size["thickness_mm"]) for size in first["sizes"]] == [(40, 0.25)]
    assert first["error_percent"] < document["error_percent"]
    shown = call(*options)
    assert shown.code == 0
    assert "x 40 x 0.25" in shown.out
    assert not lines_wider_than(shown.out, 80)


def test_a_list_that_will_do(options: list[str]) -> None:
    called = call(*options[:-1], "50", "--stock", "workshop", "--circuit", "compression")
    assert called.code == 0
    assert "Nothing to buy" in called.out


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (["--what-to-buy", "--post", "12"], "--what-to-buy stands for itself"),
        (["--what-to-buy", "--shim", "1 x 40 x 0.15"], "--what-to-buy stands for itself"),
        (["--what-to-buy", "--tolerance", "0"], "--tolerance is 0; allowed: 0.1 to 50 %"),
        (["--what-to-buy", "--to-buy", "./none.csv"], "there is no such file"),
        (["--what-to-buy", "--rider-kg", "82"], "--frame"),
        (["--what-to-buy", "--circuit", "both"], "--circuit is both"),
        (["--to-buy", "workshop"], "belong to --what-to-buy"),
        (["--frame", "forest-motorcycle"], "belong to --what-to-buy"),
    ],
)
def test_bad_input(arguments: list[str], sentence: str) -> None:
    called = call("stock", *arguments)
    assert called.code == 2
    assert called.out == ""
    assert sentence in called.err
