"""``shimwright curve`` as a user meets it."""

import os
import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from optimiser.files import bundled_names
from tests.cli.calling import call, lines_wider_than

REPOSITORY = Path(__file__).resolve().parents[2]
FEW = ("--velocities", "0.05,0.3,0.8")
STIFF = ("--shim", "3 x 40 x 0.25", "--shim", "1 x 30 x 0.2", "--shim", "4 x 20 x 0.3")


@pytest.mark.parametrize("damper", bundled_names("damper"))
def test_every_bundled_damper_is_answered_in_both_directions(damper: str) -> None:
    document = call("curve", "--damper", damper, *FEW, "--json").document
    assert [curve["circuit"] for curve in document["curves"]] == ["compression", "rebound"]
    for curve in document["curves"]:
        force = np.array(curve["force_n"])
        assert np.all(np.diff(force) > 0.0)
        assert np.all(np.diff(curve["pressure_mpa"]) > 0.0)
        assert np.all(np.array(curve["force_closed_n"]) >= force - 1e-6)
        assert np.all(np.array(curve["force_open_n"]) <= force + 1e-6)
        assert np.all((np.array(curve["bleed_share"]) >= 0) & (np.array(curve["bleed_share"]) <= 1))
        for shim in curve["shims"]:
            assert {"outer_mm", "thickness_mm", "peak_stress_mpa", "utilisation"} <= set(shim)


def test_json_is_the_first_curve_and_all_curves() -> None:
    called = call("curve", *FEW, "--json")
    document = called.document
    first = document["curves"][0]
    for key in ("velocity_m_s", "force_n", "pressure_mpa", "lift_mm", "shims", "warnings"):
        assert document[key] == first[key]
    assert document["velocity_m_s"] == [0.05, 0.3, 0.8]
    assert [file["kind"] for file in document["inputs"]] == ["damper", "steel", "oil"]
    assert all(re.fullmatch("[0-9a-f]{12}", file["fingerprint"]) for file in document["inputs"])
    assert called.err.count("warning:") == sum(len(c["warnings"]) for c in document["curves"])


def test_quiet_json_leaves_stderr_empty() -> None:
    assert call("curve", *FEW, "--json", "--quiet").err == ""


def test_shims_of_json_are_the_stack_face_first() -> None:
    document = call("curve", *STIFF, *FEW, "--json").document
    assert [s["outer_mm"] for s in document["shims"]] == [40, 40, 40, 30]
    assert document["stack"] == ["3 x 40 x 0.25", "1 x 30 x 0.20", "4 x 20 x 0.30"]
    assert len(document["curves"]) == 1
    assert document["circuit"] == "compression"


def test_a_locked_damper_gives_null_not_infinity(tmp_path: Path) -> None:
    text = (REPOSITORY / "catalogue/dampers/rear-monotube.toml").read_text(encoding="utf-8")
    shut = text.replace("area_mm2 = 0.5 ", "area_mm2 = 0.0 ").replace(
        "height_mm = 0.0", "height_mm = 0.4"
    )
    damper = tmp_path / "shut.toml"
    damper.write_text(shut, encoding="utf-8")
    called = call("curve", "--damper", str(damper), "--velocities", "0.02", "--json")
    assert called.code == 0
    assert called.document["force_n"][0] is None or called.document["force_n"][0] > 0


def test_more_clicks_and_hotter_oil_are_softer() -> None:
    def force(*options: str) -> float:
        document = call("curve", "--circuit", "rebound", *FEW, *options, "--json").document
        return float(document["force_n"][0])

    assert force("--clicks", "2") > force("--clicks", "20")
    assert force("--oil-temp-c", "10") > force("--oil-temp-c", "90")
    assert force("--oil", "heavy") > force("--oil", "extra-light")


def test_clicks_of_the_range_are_its_ends() -> None:
    shut = call("curve", "--circuit", "rebound", *FEW, "--clicks", "0", "--json").document
    assert shut["force_n"] == pytest.approx(shut["force_closed_n"])
    opened = call(
        "curve", "--circuit", "rebound", *FEW, "--clicks", str(shut["clicks_range"]), "--json"
    ).document
    assert opened["force_n"] == pytest.approx(opened["force_open_n"])
    assert opened["force_closed_n"] == pytest.approx(shut["force_closed_n"], rel=1e-3)


def test_first_line_says_what_it_is() -> None:
    first = call("curve", "--circuit", "rebound", *FEW, "--clicks", "3").out.splitlines()[0]
    for word in ("rear-monotube", "rebound", "light oil", "40 C", "3 of 22 clicks"):
        assert word in first


@pytest.mark.parametrize("damper", bundled_names("damper"))
def test_report_fits_80_columns(damper: str) -> None:
    out = call("curve", "--damper", damper, env={"COLUMNS": "80"}).out
    assert not lines_wider_than(out, 80)


def test_comparison_shows_differences_to_the_first_in_80_columns() -> None:
    stacks = ["--stack", "fitted", *["--stack", "rear-two-stage"] * 5]
    called = call("curve", *stacks, *STIFF, *FEW)
    assert called.code == 0
    assert not lines_wider_than(called.out, 80)
    for heading in ("A  fitted", "B  rear-two-stage", "G  --shim", "B-A", "G-A"):
        assert heading in called.out
    document = call("curve", *stacks[:4], *FEW, "--json").document
    first, second = (np.array(curve["force_n"]) for curve in document["curves"])
    percent = f"{100.0 * (second[1] / first[1] - 1.0):+.1f}"
    row = next(line for line in called.out.splitlines() if line.strip().startswith("0.3 "))
    assert percent in row.split()


def test_dumb_terminal_gets_plain_ascii() -> None:
    called = call("curve", *FEW, env={"TERM": "dumb"})
    assert called.out.isascii()
    assert "\x1b" not in called.out


def test_ascii_terminal_and_no_colour_in_a_process_of_its_own() -> None:
    program = "from optimiser.cli.main import run; run()"
    ran = subprocess.run(
        [sys.executable, "-c", program, "curve", *FEW, "--circuit", "rebound"],
        cwd=REPOSITORY,
        capture_output=True,
        check=True,
        env={**os.environ, "PYTHONIOENCODING": "ascii", "NO_COLOR": "1", "FORCE_COLOR": "1"},
    )
    assert ran.stdout.isascii()
    assert not re.search(rb"\x1b\[[0-9;]*3[0-9]m", ran.stdout)
    assert b"piston face" in ran.stdout


def test_quiet_leaves_out_chart_and_caution() -> None:
    full, quiet = call("curve", *FEW).out, call("curve", *FEW, "--quiet").out
    assert "verify on a dyno" in full
    assert "verify on a dyno" not in quiet
    assert full.startswith(quiet.rstrip())


@pytest.mark.parametrize(
    ("ending", "start"), [("svg", b"<?xml"), ("png", b"\x89PNG"), ("pdf", b"%PDF")]
)
def test_chart_is_written_and_repeats(ending: str, start: bytes, tmp_path: Path) -> None:
    file = tmp_path / f"chart.{ending}"
    options = ("curve", "--damper", "solid-piston", *FEW, "--quiet", "--chart", str(file))
    assert call(*options).code == 0
    content = file.read_bytes()
    assert content.startswith(start)
    assert call(*options).code == 0
    assert file.read_bytes() == content
    assert [path.name for path in tmp_path.iterdir()] == [file.name]


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--damper", "rear"], ["no damper named", "rear-monotube"]),
        (["--damper", "./absent.toml"], ["absent.toml", "no such file"]),
        (["--stack", "./absent.csv"], ["absent.csv", "no such file"]),
        (["--shim", "3 by 24", "--shim", "2 x 20 x 0.3"], ["--shim", "group 1", "3 x 24 x 0.15"]),
        (["--shim", "3 x 40 x 0.2"], ["--shim", "clamp shim"]),
        (["--shim", "3 x 30 x 0.2", "--shim", "2 x 20 x 0.3"], ["30 mm", "seat", "39 mm"]),
        (["--shim", "3 x 40 x 0.2", "--shim", "2 x 28 x 0.3"], ["28 mm", "ports", "27 mm"]),
        (["--clicks", "23"], ["--clicks is 23", "0 (closed) to 22"]),
        (["--damper", "digressive-monotube", "--clicks", "1"], ["no adjuster"]),
        (["--velocities", "0.1;0.2"], ["--velocities", "0.1;0.2", "not a number"]),
        (["--velocities", "0,50,0.1,0.1"], ["0;", "50;", "given twice"]),
        (["--velocities", "nan"], ["--velocities", "nan"]),
        (["--velocities", ""], ["--velocities", "not a number"]),
        (["--oil-temp-c", "200"], ["--oil-temp-c is 200", "-30 to 150"]),
        (["--oil-temp-c", "nan"], ["--oil-temp-c is nan"]),
        (["--oil", "thick", "--steel", "glass"], ["no oil named", "no shim steel named"]),
        (["--chart", "curve.gif"], ["--chart", ".gif", ".svg"]),
        (["--chart", "no-such-folder/c.svg"], ["no-such-folder"]),
        (["--circuit", "both", "--stack", "fitted"], ["--circuit is both", "compression"]),
        (["--circuit", "upward"], ["upward", "rebound"]),
    ],
)
def test_bad_input_gets_a_sentence_and_exit_code_2(options: list[str], said: list[str]) -> None:
    called = call("curve", *options)
    assert called.code == 2
    assert called.out == ""
    for text in said:
        assert text in called.err
    assert "Traceback" not in called.err


def test_every_bad_stack_of_a_comparison_is_named() -> None:
    called = call("curve", "--stack", "./one.csv", "--stack", "fitted", "--stack", "./two.csv")
    assert called.code == 2
    assert "one.csv" in called.err
    assert "two.csv" in called.err


def test_a_chart_that_cannot_be_named_overwrites_nothing(tmp_path: Path) -> None:
    kept = tmp_path / "kept.svg"
    kept.write_text("mine", encoding="utf-8")
    assert call("curve", "--chart", str(kept), "--clicks", "99").code == 2
    assert kept.read_text(encoding="utf-8") == "mine"


def test_warnings_of_a_stack_that_is_too_low_are_shown() -> None:
    called = call("curve", "--shim", "2 x 40 x 0.2", "--shim", "1 x 20 x 0.3", *FEW)
    assert called.code == 0
    assert "warning:" in called.out
    assert "height_min_mm" in called.out


def test_damper_with_one_circuit(tmp_path: Path) -> None:
    text = (REPOSITORY / "catalogue/dampers/rear-monotube.toml").read_text(encoding="utf-8")
    compression = text.index("[[compression.valves]]")
    rebound = text.index("[[rebound.valves]]")
    damper = tmp_path / "rebound-only.toml"
    damper.write_text(text[:compression] + text[rebound:], encoding="utf-8")
    document = call("curve", "--damper", str(damper), *FEW, "--json").document
    assert [curve["circuit"] for curve in document["curves"]] == ["rebound"]
    refused = call("curve", "--damper", str(damper), "--circuit", "compression")
    assert refused.code == 2
    assert "--circuit rebound" in refused.err
