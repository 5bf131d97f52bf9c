"""Numbers put into a damper file's text: comments kept, nothing else changed."""

import tomllib

import pytest

from optimiser.checking import validate
from optimiser.damper import Damper, Direction
from optimiser.faults import BadInput
from optimiser.files import find_data, read_text
from optimiser.fitting.calibrate import calibrate
from optimiser.fitting.damper_text import Change, edited
from optimiser.fitting.parameters import with_values
from optimiser.fitting.write import calibrated_text, changes_of
from tests.fitting.invented import TRUTH, parts, run_of, three_runs

TEXT = """# head
name = "x"       # the name
friction_n = 18.0
[body]
piston_mm = 46.0 # bore # really

[[compression.valves]]
name = "base # valve"
fitted = [
    "2 x 40 x 0.25",  # discharge = 3
]
[compression.valves.seat]
seat_mm = 39.0
# remark below
[compression.valves.bleed.needle]
jet_mm = 3.5

[[compression.valves]]
name = "mid"
[compression.valves.seat]
discharge = 0.61   # loss; leave it
height_mm = 0.0
"""
WAYS: tuple[Direction, Direction] = ("compression", "rebound")
SECOND = ("compression", "valves", 1)


def changed(*changes: tuple[tuple[str | int, ...], str]) -> str:
    return edited(TEXT, [Change(place, value, "fit: new") for place, value in changes])


def test_a_value_is_replaced_and_its_comment_kept() -> None:
    new = changed(((*SECOND, "seat", "discharge"), "0.7"))
    assert "discharge = 0.7    # loss; leave it; fit: new" in new
    assert tomllib.loads(new)["compression"]["valves"][1]["seat"]["discharge"] == 0.7
    others = [line for line in TEXT.splitlines() if "discharge = 0.61" not in line]
    assert all(line in new.splitlines() for line in others)


def test_the_first_valves_table_is_not_mistaken_for_the_seconds() -> None:
    new = changed((("compression", "valves", 0, "seat", "discharge"), "0.7"))
    valves = tomllib.loads(new)["compression"]["valves"]
    assert valves[0]["seat"] == {"seat_mm": 39.0, "discharge": 0.7}
    assert valves[1]["seat"]["discharge"] == 0.61


def test_a_missing_table_is_added() -> None:
    new = changed(((*SECOND, "bleed", "area_mm2"), "1.5"))
    valves = tomllib.loads(new)["compression"]["valves"]
    assert valves[1]["bleed"] == {"area_mm2": 1.5}
    assert "area_mm2" not in valves[0]["bleed"]


def test_a_table_between_header_and_subtable() -> None:
    new = changed((("compression", "valves", 0, "bleed", "area_mm2"), "2.5"))
    valves = tomllib.loads(new)["compression"]["valves"]
    assert valves[0]["bleed"] == {"area_mm2": 2.5, "needle": {"jet_mm": 3.5}}


def test_top_keys_and_heading() -> None:
    new = edited(TEXT, [Change(("friction_n",), "9.5", "fit: one")], ["Calibrated.", ""])
    assert new.startswith("# Calibrated.\n#\n# head\n")
    again = edited(new, [Change(("friction_n",), "8.5", "fit: two")], ["Calibrated.", "more", ""])
    assert again.startswith("# Calibrated.\n# more\n#\n# head\n")
    assert "friction_n = 8.5  # fit: two\n" in again
    assert "fit: one" not in again


@pytest.mark.parametrize(
    "text",
    [
        "[[compression.valves]]\nseat = { discharge = 0.61 }\n",
        "[[compression.valves]]\nseat.discharge = 0.61\n",
        "compression = { valves = [{ seat = { discharge = 0.61 } }] }\n",
    ],
)
def test_other_ways_of_writing_are_refused(text: str) -> None:
    change = Change(("compression", "valves", 0, "seat", "discharge"), "0.7", "fit")
    with pytest.raises(BadInput, match="in braces or with dotted keys"):
        edited(text, [change])


@pytest.mark.parametrize(
    "name", ["rear-monotube", "digressive-monotube", "fork-cartridge", "solid-piston"]
)
def test_every_bundled_damper_can_be_written(name: str) -> None:
    damper, steel, oil = parts(name)
    free = ["seat.discharge", "ports.discharge", "bleed.area_mm2", "friction_n"]
    runs = [run_of(damper, clicks=0, direction=way) for way in WAYS]
    result = calibrate(damper, steel, oil, runs, free, 0.0, "search", False)
    text = calibrated_text(read_text(find_data("damper", name)), result, ["one file"])
    again = validate(Damper, tomllib.loads(text), name)
    assert again.friction_n == pytest.approx(result.damper.friction_n, rel=1e-4, abs=1e-6)
    for way in WAYS:
        ours, wanted = again.circuit(way).searched, result.damper.circuit(way).searched
        assert ours.seat is not None
        assert wanted.seat is not None
        assert ours.seat.discharge == pytest.approx(wanted.seat.discharge, rel=1e-4)
        assert ours.bleed.area_mm2 == pytest.approx(wanted.bleed.area_mm2, rel=1e-4)
    comments = [line for line in read_text(find_data("damper", name)).splitlines() if "#" in line]
    kept = [line.split("#", 1)[1].strip() for line in comments]
    assert all(comment in text for comment in kept)


def test_standard_errors_stand_beside_the_values() -> None:
    truth = with_values(parts()[0], TRUTH)
    damper, steel, oil = parts()
    result = calibrate(damper, steel, oil, three_runs(truth), None, 0.0, "search", False)
    remarks = [change.remark for change in changes_of(result)]
    assert all("standard error" in remark and "was" in remark for remark in remarks)


def test_gas_pressure_is_written_where_the_curve_shows_it() -> None:
    damper, steel, oil = parts()
    shown = damper.model_copy(update={"gas_in_force": True})
    quiet = damper.model_copy(update={"gas_in_force": False})
    runs = [
        run_of(quiet, gas_n=200.0, velocity=run.velocity_m_s, direction=run.direction)
        for run in (run_of(quiet), run_of(quiet, direction="rebound"))
    ]
    result = calibrate(shown, steel, oil, runs, ["gas_offset_n", "friction_n"], None, "reported")
    change = changes_of(result)[-1]
    assert change.place == ("gas", "pressure_mpa")
    assert float(change.value) == pytest.approx(200.0 / 201.06, rel=2e-3)
