"""Dyno files and fit requests: columns, units, signs, and every fault at once."""

from pathlib import Path

import numpy as np
import pytest

from optimiser.dyno_files import (
    find_fit_request,
    read_fit_request,
    read_runs,
    read_strokes,
    read_uncertainty,
)
from optimiser.faults import BadInput
from optimiser.files import read_damper
from optimiser.fitting.request import RunRequest

GOOD = "velocity_m_s,force_n\n0.05,100\n0.1,180\n0.2,300\n0.5,600\n1,1000\n"


def wanted(**keys: object) -> RunRequest:
    given = {"file": "run.csv", "circuit": "compression", "oil_temp_c": 40.0} | keys
    return RunRequest.model_validate(given)


def write(folder: Path, text: str, name: str = "run.csv") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def test_a_plain_table(tmp_path: Path) -> None:
    found = read_strokes(write(tmp_path, GOOD), wanted())
    assert found.curves["compression"].force_n[-1] == 1000.0


def test_units_by_column_names(tmp_path: Path) -> None:
    text = "velocity_in_s,force_lbf\n1,20\n5,60\n10,110\n40,230\n"
    curve = read_strokes(write(tmp_path, text), wanted()).curves["compression"]
    assert curve.velocity_m_s == pytest.approx([0.0254, 0.127, 0.254, 1.016])
    assert curve.force_n[0] == pytest.approx(88.96, abs=0.01)


def test_columns_and_units_by_request(tmp_path: Path) -> None:
    text = "Speed,load cell,note\n50,100,a\n100,180,\n200,300,b\n500,600,c\n"
    named = wanted(
        columns={"velocity": "speed", "force": "Load Cell"},
        units={"velocity": "mm/s", "force": "N"},
    )
    curve = read_strokes(write(tmp_path, text), named).curves["compression"]
    assert curve.velocity_m_s[0] == pytest.approx(0.05)


def test_a_time_series(tmp_path: Path) -> None:
    time = np.arange(0.0, 2.0, 0.004)
    travel = 20.0 * np.sin(2.0 * np.pi * time)
    speed = 40e-3 * np.pi * np.cos(2.0 * np.pi * time)
    force = np.where(speed > 0.0, 2000.0, 4000.0) * speed + 150.0
    rows = "\n".join(
        f"{t:.3f},{x:.4f},{f:.2f}" for t, x, f in zip(time, travel, force, strict=True)
    )
    path = write(tmp_path, f"time_s,displacement_mm,force_n\n{rows}\n")
    found = read_strokes(path, wanted(circuit="both"))
    curve = found.curves["compression"]
    assert curve.force_n - 150.0 == pytest.approx(2000.0 * curve.velocity_m_s, rel=0.02, abs=1.0)
    assert found.gas_n == pytest.approx(150.0, abs=2.0)


@pytest.mark.parametrize(
    ("text", "keys", "fault"),
    [
        (GOOD.replace("velocity_m_s", "v"), {}, "there is no column of velocity; allowed: veloc"),
        (GOOD, {"columns": {"force": "forse_n"}}, "did you mean force_n"),
        (GOOD.replace("force_n", "load"), {"columns": {"force": "load"}}, "unit of column .load."),
        (GOOD.replace("0.1,180", "0.1"), {}, "1 values for 2 columns"),
        (GOOD.replace("0.1,180", "0,1,180"), {}, "decimal comma"),
        (GOOD.replace("\n1,1000", "\n900,1000"), {}, "is it in cm/s or mm/s"),
        ("velocity_m_s,force_n\n0.1,5\n0.2,9\n", {}, "goes up to 9 N"),
        ("velocity_m_s,force_n\n0.1,50\n0.2,90\n", {}, "holds 2 points"),
        (GOOD, {"circuit": "both"}, "one stroke only"),
        ("", {}, "is empty"),
    ],
)
def test_faults_of_a_file(tmp_path: Path, text: str, keys: dict[str, object], fault: str) -> None:
    with pytest.raises(BadInput, match=fault):
        read_strokes(write(tmp_path, text), wanted(**keys))


REQUEST = """
damper = "rear-monotube"
[[runs]]
file = "run.csv"
circuit = "compression"
clicks = 10
oil_temp_c = 40.0
"""


def runs_of(folder: Path, text: str) -> object:
    path = write(folder, text, "fit.toml")
    return read_runs(path, read_fit_request(path), read_damper("rear-monotube"))


def test_a_request_and_its_runs(tmp_path: Path) -> None:
    write(tmp_path, GOOD)
    path = write(tmp_path, REQUEST, "fit.toml")
    found = read_runs(path, read_fit_request(path), read_damper("rear-monotube"))
    run = found.runs[0]
    assert (run.label, run.direction, run.clicks) == ("run.csv", "compression", 10)
    assert run.stack == read_damper("rear-monotube").circuit("compression").searched.fitted


def test_a_stack_file_counts_from_the_request(tmp_path: Path) -> None:
    write(tmp_path, GOOD)
    stack = "outer_mm,thickness_mm,quantity\n40,0.2,3\n30,0.2,3\n20,0.3,3\n"
    write(tmp_path, stack, "soft.csv")
    path = write(tmp_path, REQUEST + 'stack = "soft.csv"\n', "fit.toml")
    found = read_runs(path, read_fit_request(path), read_damper("rear-monotube"))
    assert found.runs[0].stack.parts == 9


def test_the_faults_of_all_runs_at_once(tmp_path: Path) -> None:
    write(tmp_path, GOOD)
    write(tmp_path, GOOD.replace("1000", "many"), "b.csv")
    more = (
        'stack = ["2 x 20 x 0.2", "1 x 16 x 0.3"]\n[[runs]]\nfile = "b.csv"\n'
        'circuit = "compression"\noil_temp_c = 40.0\n[[runs]]\nfile = "none.csv"\n'
        'circuit = "rebound"\noil_temp_c = 40.0\n'
    )
    with pytest.raises(BadInput) as raised:
        runs_of(tmp_path, REQUEST + more)
    text = "\n".join(raised.value.faults)
    assert "run 1 (run.csv): the face shim (20 mm) does not cover the seat" in text
    assert "run 2 (b.csv)" in text
    assert 'force_n "many" is not a number' in text
    assert "run 3 (none.csv): there is no such file" in text


@pytest.mark.parametrize(
    ("extra", "fault"),
    [
        ("stack = 5\n", 'must be "fitted"'),
        ("clicks = 99\n", "clicks"),
        ('units = { force = "pounds" }\n', '"pounds" is not known; allowed: N, kN, lbf, kgf'),
        ('colour = "red"\n', "colour is not known"),
        ('positive = "up"\n', "compression"),
    ],
)
def test_faults_of_a_request(tmp_path: Path, extra: str, fault: str) -> None:
    path = write(tmp_path, REQUEST.replace("clicks = 10\n", "") + extra, "fit.toml")
    with pytest.raises(BadInput, match=fault):
        read_fit_request(path)


def test_free_names(tmp_path: Path) -> None:
    text = 'free = ["seat.discharg", "friction_n", "friction_n"]\n' + REQUEST
    path = write(tmp_path, text, "fit.toml")
    with pytest.raises(BadInput) as raised:
        read_fit_request(path)
    assert len(raised.value.faults) == 2
    assert "did you mean seat.discharge?" in raised.value.faults[0]


def test_both_circuits_need_the_fitted_stacks(tmp_path: Path) -> None:
    both = "velocity_m_s,force_n\n" + "\n".join(
        f"{v},{1000 * v + (200 if v > 0 else -900)}"
        for v in (-1, -0.5, -0.2, -0.1, 0.1, 0.2, 0.5, 1)
    )
    write(tmp_path, both + "\n")
    request = REQUEST.replace('"compression"', '"both"')
    path = write(tmp_path, request, "fit.toml")
    found = read_runs(path, read_fit_request(path), read_damper("rear-monotube"))
    assert [run.direction for run in found.runs] == ["compression", "rebound"]
    with pytest.raises(BadInput, match="both means the fitted stacks"):
        runs_of(tmp_path, request + 'stack = "rear-two-stage"\n')


@pytest.mark.parametrize(
    ("text", "fault"),
    [("{", "is not JSON"), ("[1]", "no record of a fit"), ('{"uncertainty": 3}', "no record")],
)
def test_records_of_a_fit_that_are_none(tmp_path: Path, text: str, fault: str) -> None:
    with pytest.raises(BadInput, match=fault):
        read_uncertainty(write(tmp_path, text, "x.fit.json"))


def test_the_bundled_request_is_found_by_name() -> None:
    assert find_fit_request("rear-monotube").is_file()
    with pytest.raises(BadInput, match="did you mean rear-monotube"):
        find_fit_request("rear-monotub")
    with pytest.raises(BadInput, match="no such file"):
        find_fit_request("nowhere/x.toml")
