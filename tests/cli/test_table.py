"""``shimwright table``: exit codes, files, and a run that was killed."""

import csv
import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from optimiser.files import read_stock
from optimiser.stack import Stack
from tests.cli.calling import Called, call, lines_wider_than
from tests.tuning.builders import TINY, write_request

REPOSITORY = Path(__file__).resolve().parents[2]
RUN = "from optimiser.cli.main import run; run()"


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("table")


@pytest.fixture(scope="module")
def request_file(folder: Path) -> Path:
    return write_request(folder)


@pytest.fixture(scope="module")
def made(folder: Path, request_file: Path) -> Called:
    """A table in ``folder/out``, made without a break."""
    return call(
        "table", str(request_file), "--out", str(folder / "out"), "--workers", "1", "--json"
    )


def test_json_is_the_saved_table(made: Called, folder: Path) -> None:
    assert made.code == 0, made.err
    saved = json.loads((folder / "out/table.json").read_text(encoding="utf-8"))
    printed = made.document
    del printed["worker_seconds"]
    assert printed == saved
    assert len(saved["cells"]) == 2
    for cell in saved["cells"]:
        assert {
            "rider_kg",
            "feel",
            "circuit",
            "coil_n_mm",
            "shims",
            "clicks",
            "error_percent",
        } <= set(cell)
    assert saved["kit"]["pieces"] == sum(shim["quantity"] for shim in saved["kit"]["shims"])
    assert [change["from_kg"] for change in saved["changes"]] == [74]


def test_table_and_kit_files(made: Called, folder: Path) -> None:
    """Every stack of table.csv can be built from kit.csv, read as a stock list."""
    assert made.code == 0
    kit = read_stock(folder / "out/kit.csv")
    with (folder / "out/table.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert [row["rider_kg"] for row in rows] == ["74", "82"]
    for row in rows:
        assert not kit.shortage(Stack.parse(row["stack"].split(" + ")), 12.0)


def test_report_fits_100_columns(made: Called, request_file: Path, folder: Path) -> None:
    assert made.code == 0
    shown = call("table", str(request_file), "--out", str(folder / "out"), "--workers", "1")
    assert shown.code == 0, shown.err
    assert not lines_wider_than(shown.out, 100)
    assert "74" in shown.out
    assert "clicks" in shown.out
    assert "Kits that build any one mass and feel" in shown.out
    assert "kept from before" in shown.err
    quiet = call(
        "table", str(request_file), "--out", str(folder / "out"), "--workers", "1", "--quiet"
    )
    assert quiet.err == ""
    assert len(quiet.out) < len(shown.out)


def test_a_killed_run_goes_on_where_it_was(made: Called, request_file: Path, folder: Path) -> None:
    out = folder / "killed"
    command = [sys.executable, "-c", RUN, "table", str(request_file), "--out", str(out)]
    environment = {**os.environ, "PYTHONPATH": str(REPOSITORY)}
    run = subprocess.Popen([*command, "--workers", "1", "--quiet"], env=environment)
    try:
        while not list(out.glob("cells/*.json")) and run.poll() is None:
            time.sleep(0.05)
        run.send_signal(signal.SIGKILL)
    finally:
        run.kill()
    assert run.wait() == -signal.SIGKILL
    assert not (out / "table.json").exists()
    kept = {file.name: file.read_bytes() for file in out.glob("cells/*.json")}
    assert 1 <= len(kept) < len(list((folder / "out/cells").iterdir()))
    again = call("table", str(request_file), "--out", str(out), "--workers", "1")
    assert again.code == 0
    assert again.err.count("kept from before") == len(kept)
    assert all((out / "cells" / name).read_bytes() == text for name, text in kept.items())
    whole = (folder / "out/table.json").read_text(encoding="utf-8")
    assert (out / "table.json").read_text(encoding="utf-8") == whole
    assert made.code == 0


@pytest.mark.parametrize(
    ("options", "sentence"),
    [
        (["--workers", "0"], "--workers is 0; allowed: 1 to 256"),
        (["--workers", "2", "--scheduler", "tcp://127.0.0.1:1"], "allowed: one of them"),
        (["--tolerance", "0"], "tolerance_percent must be 0.1 to 50 %, not 0"),
        (["--evaluations", "1"], "key evaluations"),
        (["--to-buy", "./none.csv"], "there is no such file"),
    ],
)
def test_bad_options(request_file: Path, options: list[str], sentence: str) -> None:
    called = call("table", str(request_file), *options)
    assert called.code == 2
    assert called.out == ""
    assert sentence in called.err


def test_bad_request_writes_nothing(tmp_path: Path) -> None:
    request = write_request(tmp_path, TINY.replace("[74, 82]", "[82, 74]"))
    called = call("table", str(request), "--out", str(tmp_path / "out"))
    assert called.code == 2
    assert not (tmp_path / "out").exists()


def test_other_files_are_not_touched(request_file: Path, tmp_path: Path) -> None:
    (tmp_path / "note.txt").write_text("mine", encoding="utf-8")
    called = call("table", str(request_file), "--out", str(tmp_path))
    assert called.code == 2
    assert "holds other files" in called.err
    assert [file.name for file in tmp_path.iterdir()] == ["note.txt"]


def test_nothing_that_can_be_built(tmp_path: Path) -> None:
    """Exit code 1, and the reason of every cell."""
    request = write_request(tmp_path, TINY.replace("parts = 8", "parts = 4"))
    called = call("table", str(request), "--workers", "1")
    assert called.code == 1
    assert "no stack;" in called.out
