"""``shimwright fit`` from the outside."""

import json
from pathlib import Path

import pytest

from optimiser.cli import main
from optimiser.dyno_files import read_uncertainty
from optimiser.files import read_damper
from tests.cli.calling import Called, call, lines_wider_than


@pytest.fixture(scope="module")
def written(tmp_path_factory: pytest.TempPathFactory) -> tuple[Called, Path]:
    out = tmp_path_factory.mktemp("fit") / "mine.toml"
    called = call("fit", "rear-monotube", "--out", str(out))
    return called, out


def test_the_bundled_request_runs(written: tuple[Called, Path]) -> None:
    called, out = written
    assert called.code == 0
    assert "compression.seat.discharge" in called.out
    assert "predicted within" in called.out
    assert "calibrated damper written to" in called.err
    assert out.is_file()


def test_the_report_is_readable_in_80_columns(written: tuple[Called, Path]) -> None:
    assert not lines_wider_than(written[0].out, 80)


def test_the_written_damper_loads_and_is_changed(written: tuple[Called, Path]) -> None:
    called, out = written
    damper, original = read_damper(out), read_damper("rear-monotube")
    assert damper.friction_n != original.friction_n
    seat, before = (
        damper.circuit("rebound").searched.seat,
        original.circuit("rebound").searched.seat,
    )
    assert seat is not None
    assert before is not None
    assert seat.discharge > before.discharge
    text = out.read_text(encoding="utf-8")
    assert "standard error" in text
    assert "compression-two-stage.csv" in text
    record = json.loads(out.with_suffix(".fit.json").read_text(encoding="utf-8"))
    assert record["uncertainty"]["names"] == [item["name"] for item in record["parameters"]]
    known = read_uncertainty(out.with_suffix(".fit.json"))
    assert known.covariance[0, 0] > 0.0
    assert called.code == 0


def test_the_document() -> None:
    called = call("fit", "rear-monotube", "--json")
    assert called.code == 0
    document = called.document
    assert {"parameters", "correlation", "runs", "left_out_percent", "cannot_be_told"} <= set(
        document
    )
    first = document["parameters"][0]
    assert first["low_95"] < first["value"] < first["high_95"]
    assert len(document["correlation"]) == len(document["parameters"])
    assert len(document["runs"]) == 6
    assert {file["kind"] for file in document["inputs"]} >= {"damper", "fit request", "dyno run"}


def test_quiet_leaves_out_notes() -> None:
    called = call("fit", "rear-monotube", "--quiet")
    assert "read as" not in called.out
    assert "verify on a dyno" not in called.out
    assert called.err == ""


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        (["nothing-such"], "there is no fit request"),
        (["nowhere/x.toml"], "no such file"),
        (["rear-monotube", "--out", "x.csv"], "allowed: the path of a .toml"),
        (["rear-monotube", "--damper", "fork-cartridge"], "does not cover|reaches over|widest"),
        (["rear-monotube", "--damper", "nowhere/x.toml"], "no such file"),
    ],
)
def test_bad_input_exits_2_with_a_sentence(arguments: list[str], text: str) -> None:
    called = call("fit", *arguments)
    assert called.code == 2
    assert called.out == ""
    assert "Traceback" not in called.err
    assert any(word in called.err for word in text.split("|"))


def test_inputs_are_never_overwritten(written: tuple[Called, Path], tmp_path: Path) -> None:
    mine = tmp_path / "mine.toml"
    mine.write_bytes(written[1].read_bytes())
    called = call("fit", "rear-monotube", "--damper", str(mine), "--out", str(mine))
    assert called.code == 2
    assert "which this fit is made from" in called.err
    assert mine.read_bytes() == written[1].read_bytes()


def test_oil_by_path_still_leads_there(tmp_path: Path) -> None:
    source = Path(main.__file__).resolve().parents[2] / "catalogue" / "dampers"
    text = (source / "rear-monotube.toml").read_text(encoding="utf-8")
    home = tmp_path / "home"
    home.mkdir()
    (home / "own.toml").write_text(text.replace('oil = "light"', 'oil = "oil.toml"'))
    (home / "oil.toml").write_text(
        "[mine]\nviscosity_40c_cst = 15.0\nviscosity_100c_cst = 4.2\n"
        'density_15c_kg_m3 = 848.0\nsource = "invented"\n'
    )
    away = tmp_path / "away"
    away.mkdir()
    out = away / "new.toml"
    called = call(
        "fit", "rear-monotube", "--damper", str(home / "own.toml"), "--out", str(out), "--quiet"
    )
    assert called.code == 0, called.err
    assert Path(read_damper(out).oil).resolve() == (home / "oil.toml").resolve()


def test_fitting_a_fitted_damper_again_changes_little(
    written: tuple[Called, Path], tmp_path: Path
) -> None:
    out = tmp_path / "again.toml"
    called = call("fit", "rear-monotube", "--damper", str(written[1]), "--out", str(out), "--quiet")
    assert called.code == 0
    first, second = read_damper(written[1]), read_damper(out)
    assert second.friction_n == pytest.approx(first.friction_n, rel=0.02)
    assert out.read_text(encoding="utf-8").count("Calibrated to dyno runs") == 1
