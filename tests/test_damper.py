"""A damper's description: rules within and between its keys, all faults at once."""

from copy import deepcopy
from math import cos, pi, radians, sin
from typing import Any

import pytest

from optimiser.checking import validate
from optimiser.damper import Damper, Needle, Valve, warnings_for
from optimiser.faults import BadInput
from optimiser.stack import Stack

PLAIN: dict[str, Any] = {
    "name": "a damper",
    "oil": "light",
    "body": {"piston_mm": 46.0, "shaft_mm": 16.0, "stroke_mm": 130.0},
    "gas": {"pressure_mpa": 1.0, "volume_cm3": 80.0},
    "compression": {
        "valves": [
            {
                "name": "stack",
                "displacement": "piston_less_shaft",
                "low_side": "lowers",
                "searched": True,
                "fitted": ["2 x 40 x 0.20", "1 x 30 x 0.15", "4 x 20 x 0.30"],
                "fitted_clicks": 10,
                "ports": {
                    "inner_mm": 27.0,
                    "outer_mm": 38.0,
                    "area_mm2": 112.5,
                    "hydraulic_mm": 6.0,
                    "length_mm": 14.0,
                },
                "seat": {"seat_mm": 39.0, "land_mm": 1.0},
                "post": {
                    "post_mm": 12,
                    "height_min_mm": 1.5,
                    "height_max_mm": 6.0,
                    "clearance_mm": 44.5,
                },
                "bleed": {
                    "area_mm2": 0.5,
                    "needle": {
                        "jet_mm": 3.5,
                        "cone_deg": 30.0,
                        "lift_per_click_mm": 0.06,
                        "clicks": 22,
                    },
                },
                "back_spring": {"ring_mm": 26.0, "rate_n_mm": 40.0, "preload_n": 5.0},
                "series": {"area_mm2": 19.6, "length_mm": 10.0, "hydraulic_mm": 4.9},
            },
            {
                "name": "check",
                "kind": "check",
                "displacement": "shaft",
                "low_side": "raises",
                "check_area_mm2": 40.0,
            },
        ]
    },
}
LEAVE_OUT = object()
STACK = "compression.valves.0"


def changed(*changes: tuple[str, object]) -> dict[str, Any]:
    """The plain damper with some keys set, or left out."""
    data = deepcopy(PLAIN)
    for path, value in changes:
        *steps, last = path.split(".")
        table: Any = data
        for step in steps:
            table = table[int(step)] if step.isdigit() else table[step]
        if value is LEAVE_OUT:
            del table[last]
        else:
            table[last] = value
    return data


def faults_of(*changes: tuple[str, object]) -> list[str]:
    with pytest.raises(BadInput) as caught:
        validate(Damper, changed(*changes), "mine.toml")
    return caught.value.faults


def test_plain_damper_is_fine_and_survives_a_round_trip() -> None:
    damper = validate(Damper, PLAIN, "mine.toml")
    valve = damper.circuit("compression").searched
    assert valve.fitted is not None
    assert valve.fitted.clamp_mm == 20.0
    assert valve.seat is not None
    assert valve.seat.cover_mm == 40.0
    assert damper.body.displaced_cm3 == pytest.approx(pi / 4 * 1.6**2 * 13.0)
    assert Damper.model_validate(damper.model_dump(mode="json")) == damper
    assert Damper.model_validate_json(damper.model_dump_json()) == damper
    with pytest.raises(KeyError):
        damper.circuit("rebound")


@pytest.mark.parametrize(
    ("path", "value", "words"),
    [
        ("name", "", ["key name", 'is the text ""', "at least 1 character"]),
        ("oil", 3, ["key oil", "is 3", "a text in quotes"]),
        ("oil_temp_c", 400.0, ["key oil_temp_c", "is 400", "-30 or more, at most 150"]),
        ("friction_n", -1.0, ["key friction_n", "is -1", "0 or more"]),
        ("gas_in_force", "yes", ["key gas_in_force", "true or false"]),
        ("colour", "red", ["key colour is not known", "allowed: name, summary, oil"]),
        ("oil_tmp_c", 40.0, ["key oil_tmp_c is not known", "did you mean oil_temp_c?"]),
        ("compression", LEAVE_OUT, ["key rebound", "needs a compression or a rebound circuit"]),
        ("body", LEAVE_OUT, ["key body is missing", "piston_mm, shaft_mm, stroke_mm"]),
        ("body.shaft_mm", 46.0, ["key body.shaft_mm: 46", "less than piston_mm 46"]),
        ("body.piston_mm", float("nan"), ["key body.piston_mm: is nan", "finite number"]),
        ("body.stroke_mm", float("inf"), ["key body.stroke_mm: is inf", "finite number"]),
        ("body.stroke_mm", "130", ['is the text "130"', "a number"]),
        ("body.stroke_mm", True, ["is true", "a number"]),
        ("gas.volume_cm3", 20.0, ["key gas: volume_cm3 20", "more than the shaft displaces"]),
        (f"{STACK}.kind", "ball", ["valves[1].kind", "'shim' or 'check'"]),
        (f"{STACK}.displacement", "half", ["valves[1].displacement", "'piston_less_shaft'"]),
        (f"{STACK}.low_side", LEAVE_OUT, ["valves[1].low_side is missing", '"lowers" or']),
        (f"{STACK}.ports", LEAVE_OUT, ["valves[1].ports: is missing", 'kind "shim" needs it']),
        (f"{STACK}.fitted", LEAVE_OUT, ["valves[1].fitted: is missing", "needs it"]),
        (f"{STACK}.check_area_mm2", 3.0, ["valves[1].check_area_mm2", "leave it out"]),
        (f"{STACK}.ports.outer_mm", 27.0, ["ports.outer_mm: 27", "more than inner_mm 27"]),
        (f"{STACK}.ports.area_mm2", 600.0, ["ports.area_mm2: 600", "area of the port ring, 561.6"]),
        (
            f"{STACK}.ports.hydraulic_mm",
            12.0,
            ["ports.hydraulic_mm: 12", "one round hole", "11.97"],
        ),
        (f"{STACK}.ports.length_mm", 0.0, ["ports.length_mm: is 0", "more than 0"]),
        (f"{STACK}.ports.discharge", 1.2, ["ports.discharge: is 1.2", "at most 1"]),
        (f"{STACK}.ports.loaded_fraction", 0.0, ["ports.loaded_fraction", "more than 0.1"]),
        (f"{STACK}.ports.inner_mm", 11.0, ["post: post_mm 12", "less than ports.inner_mm 11"]),
        (f"{STACK}.ports.inner_mm", 20.0, ["fitted: the clamp shim (20 mm)", "ports.inner_mm 20"]),
        (f"{STACK}.seat.seat_mm", 37.0, ["seat: seat_mm 37", "at least ports.outer_mm 38"]),
        (f"{STACK}.seat.land_mm", 12.0, ["seat.land_mm: 12", "at most a quarter of seat_mm"]),
        (f"{STACK}.seat.height_mm", 4.0, ["seat.height_mm: is 4", "at most 3"]),
        (f"{STACK}.seat.open_fraction", 1.5, ["seat.open_fraction", "at most 1"]),
        (f"{STACK}.seat.seat_mm", 40.0, ["fitted: the face shim (40 mm)", "needs 41 mm or more"]),
        (
            f"{STACK}.post.height_max_mm",
            1.5,
            ["post.height_max_mm: 1.5", "more than height_min_mm"],
        ),
        (f"{STACK}.post.height_max_mm", 1.6, ["fitted: the stack is 1.75 mm high", "at most 1.6"]),
        (f"{STACK}.post.height_min_mm", 2.0, ["fitted: the stack is 1.75", "from 2 mm on"]),
        (f"{STACK}.post.clearance_mm", 12.0, ["post.clearance_mm: 12", "more than post_mm 12"]),
        (f"{STACK}.post.clearance_mm", 39.0, ["post: clearance_mm 39", "at least 40"]),
        (
            f"{STACK}.post.post_mm",
            20.0,
            ["fitted: the clamp shim (20 mm)", "wider than post_mm 20"],
        ),
        (f"{STACK}.fitted", "2 x 40", ["fitted: must be a list of shim groups, face first"]),
        (f"{STACK}.fitted", ["2 x 40"], ["fitted: shim group 1", "'2 x 40' is not"]),
        (
            f"{STACK}.fitted",
            ["2 x 46 x 0.20", "4 x 20 x 0.30"],
            ["fitted: the widest shim (46 mm) does not go in", "clearance_mm is 44.5"],
        ),
        (f"{STACK}.back_spring.ring_mm", 20.0, ["fitted: the back spring presses at 20 mm"]),
        (f"{STACK}.back_spring.ring_mm", 41.0, ["fitted: the back spring presses at 41 mm"]),
        (f"{STACK}.back_spring.preload_n", -1.0, ["back_spring.preload_n: is -1", "0 or more"]),
        (f"{STACK}.series.hydraulic_mm", 6.0, ["series.hydraulic_mm: 6", "one round hole"]),
        (f"{STACK}.fitted_clicks", 23, ["fitted_clicks: 23", "0 to bleed.needle.clicks 22"]),
        (f"{STACK}.fitted_clicks", 2.5, ["fitted_clicks", "a whole number"]),
        (f"{STACK}.bleed.needle", LEAVE_OUT, ["fitted_clicks: 10", "no needle: leave it out"]),
        (f"{STACK}.bleed.needle.lift_per_click_mm", 0.6, ["clicks: 22 clicks", "wide open at"]),
        (f"{STACK}.bleed.needle.cone_deg", 130.0, ["needle.cone_deg: is 130", "less than 120"]),
        (f"{STACK}.searched", False, ["compression.valves: 0 valves have searched", "exactly one"]),
        ("compression.valves", [], ["compression.valves: 0 valves have searched", "exactly one"]),
        ("compression.valves.1.searched", True, ["valves[2].searched", "no stack to search"]),
        ("compression.valves.1.name", "stack", ['the name "stack" is given twice']),
        (
            "compression.valves.1.check_area_mm2",
            LEAVE_OUT,
            ["valves[2].check_area_mm2: is missing"],
        ),
        ("compression.valves.1.check_area_mm2", 0.0, ["valves[2].check_area_mm2", "more than 0"]),
        (
            "compression.valves.1.post",
            {"post_mm": 8.0},
            ["valves[2].post.height_min_mm is missing"],
        ),
        ("compression.valves.1.seat", {"seat_mm": 8.0, "land_mm": 1.0}, ["[2].seat", "has none"]),
    ],
)
def test_one_clear_sentence(path: str, value: object, words: list[str]) -> None:
    faults = faults_of((path, value))
    assert any(all(word in fault for word in words) for fault in faults), faults
    assert all(fault.startswith("mine.toml: key ") for fault in faults)


def test_all_faults_of_a_file_at_once() -> None:
    faults = faults_of(
        ("colour", "red"),
        ("body.shaft_mm", 50.0),
        (f"{STACK}.seat.land_mm", -1.0),
        (f"{STACK}.bleed.needle.jet_mm", "wide"),
        (f"{STACK}.fitted", ["1 x 40 x 0.2", "1 x 30 x 9", "0 x 20 x 0.3"]),
        (f"{STACK}.searched", False),
        ("compression.valves.1.check_area_mm2", LEAVE_OUT),
    )
    for words in (
        "key colour",
        "key body.shaft_mm",
        "seat.land_mm: is -1",
        "bleed.needle.jet_mm",
        "shim group 2 (1 x 30 x 9.00): the thickness",
        "shim group 3 (0 x 20 x 0.30): the quantity",
        "0 valves have searched",
        "valves[2].check_area_mm2",
    ):
        assert sum(words in fault for fault in faults) == 1, (words, faults)
    assert len(faults) == 8


def test_needle_is_wide_open_where_its_cone_area_is_the_bores() -> None:
    """Area pi x s (d - x s c), s and c of the half angle, against the bore's pi d2 / 4."""
    opened = next(
        float(text.split("wide open at ")[1].split(":")[0])
        for text in faults_of((f"{STACK}.bleed.needle.lift_per_click_mm", 0.6))
        if "wide open" in text
    )
    s, c = sin(radians(15.0)), cos(radians(15.0))
    area = pi * opened * s * (3.5 - opened * s * c)
    assert area == pytest.approx(pi / 4 * 3.5**2, rel=0.01)  # printed to 0.01 mm
    Needle(jet_mm=3.5, cone_deg=30.0, lift_per_click_mm=opened / 11, clicks=20)


def valve() -> Valve:
    return Damper.model_validate(PLAIN).circuit("compression").searched


@pytest.mark.parametrize(
    ("lines", "words"),
    [
        (["2 x 38 x 0.2", "2 x 30 x 0.2", "3 x 20 x 0.3"], ["38 mm", "does not cover the seat"]),
        (["2 x 45 x 0.2", "2 x 30 x 0.2", "3 x 20 x 0.3"], ["45 mm", "does not go in", "44.5"]),
        (["2 x 40 x 0.2", "1 x 20 x 0.3"], ["0.70 mm high", "add clamp shims"]),
        (["30 x 40 x 0.2", "1 x 20 x 0.3"], ["6.30 mm high", "at most 6 mm"]),
        (["2 x 40 x 0.2", "4 x 28 x 0.3"], ["clamp shim (28 mm) reaches over the ports"]),
        (["2 x 40 x 0.2", "5 x 11.9 x 0.3"], ["clamp shim (11.9 mm)", "wider than post_mm 12"]),
        (["2 x 40 x 0.2", "1 x 42 x 0.2", "4 x 20 x 0.3"], ["42 mm lies behind a smaller face"]),
        (
            [f"1 x {d} x 0.2" for d in (42, 30, 38, 28, 36)] + ["3 x 20 x 0.3"],
            ["widens again from 28 to 36 mm", "one crossover is usual"],
        ),
        (["2 x 40 x 0.2", "5 x 26 x 0.3"], ["back spring presses at 26 mm", "not on the stack"]),
    ],
)
def test_warnings(lines: list[str], words: list[str]) -> None:
    notes = warnings_for(valve(), Stack.parse(lines))
    assert any(all(word in note for word in words) for note in notes), notes


@pytest.mark.parametrize(
    "lines",
    [
        ["2 x 40 x 0.2", "1 x 36 x 0.2", "1 x 30 x 0.2", "3 x 20 x 0.3"],
        ["2 x 40 x 0.2", "1 x 22 x 0.1", "1 x 36 x 0.2", "1 x 30 x 0.2", "3 x 20 x 0.3"],
        ["2 x 40 x 0.2", "1 x 38 x 0.1 / 32", "1 x 36 x 0.2", "1 x 30 x 0.2", "3 x 20 x 0.3"],
    ],
)
def test_no_warning_for_ordinary_stacks(lines: list[str]) -> None:
    assert warnings_for(valve(), Stack.parse(lines)) == []
