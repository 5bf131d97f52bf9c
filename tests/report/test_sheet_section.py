"""The section of a stack as shapes."""

from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.report.section import Section, Shape, section_of, shortened, spread_out
from optimiser.report.sheet import Step
from optimiser.stack import Shim
from tests.report.sheets import PISTON, crowded, plain, usual


def _of(section: Section, look: str) -> list[Shape]:
    return [shape for shape in section.shapes if shape.look == look]


def _half_width(section: Section, shape: Shape) -> float:
    return max(abs(x - section.axis) for x, _y in shape.points)


def _thickness(shape: Shape) -> float:
    ys = [y for _x, y in shape.points]
    return max(ys) - min(ys)


def test_diameters_are_to_scale() -> None:
    steps = usual().steps
    section = section_of(PISTON, steps)
    drawn = [_half_width(section, _of(section, step.role)[0]) for step in steps]
    one_mm = drawn[0] / steps[0].outer_mm
    for step, width in zip(steps, drawn, strict=True):
        if step.role != "shim":
            assert width == pytest.approx(step.outer_mm * one_mm)


def test_every_piece_is_drawn_on_both_sides_true_to_thickness() -> None:
    steps = usual().steps
    section = section_of(PISTON, steps)
    assert len(section.shapes) - 4 == 2 * sum(step.quantity for step in steps)
    face, clamp = _of(section, "face"), _of(section, "clamp")
    assert len(face) == len(clamp) == 4
    assert _thickness(clamp[0]) / _thickness(face[0]) == pytest.approx(0.3 / 0.2)
    one_mm_across = _half_width(section, face[0]) / 20.0
    assert _thickness(face[0]) == pytest.approx(0.2 * one_mm_across * section.exaggeration)


def test_face_first_from_the_piston_down() -> None:
    section = section_of(PISTON, usual().steps)
    top = {look: min(y for _x, y in _of(section, look)[0].points) for look in ("face", "clamp")}
    assert top["face"] == section.face_y
    assert top["clamp"] > top["face"]
    assert max(y for shape in _of(section, "metal") for _x, y in shape.points) == section.face_y


def test_a_dished_seat_bends_what_lies_on_it() -> None:
    sheet = plain()
    section = section_of(sheet.piston, sheet.steps)
    face = _of(section, "face")[0]
    edge = max(face.points, key=lambda point: abs(point[0] - section.axis))
    assert edge[1] > section.face_y
    rim = max(y for shape in _of(section, "metal") for _x, y in shape.points)
    one_mm_along = _thickness(_of(section, "clamp")[0]) / 0.3
    assert rim == pytest.approx(section.face_y + 0.15 * one_mm_along)
    assert section.preload_mm == 0.15


def test_ring_shim_takes_no_height_and_holds_up_what_lies_behind_it() -> None:
    ring = Step(1, Shim(40, 0.2, 30), "ring")
    face, *_rest, clamp = usual().steps
    section = section_of(PISTON, (face, ring, Step(1, Shim(36, 0.2), "shim"), clamp))
    drawn, behind = _of(section, "ring")[0], _of(section, "shim")[0]
    hole = min(abs(x - section.axis) for x, _y in drawn.points)
    assert hole / _half_width(section, drawn) == pytest.approx(30 / 40)
    assert min(y for _x, y in behind.points) == pytest.approx(min(y for _x, y in drawn.points))
    one_mm_along = _thickness(_of(section, "clamp")[0]) / 0.3
    raised = _thickness(behind) - 0.2 * one_mm_along
    assert raised == pytest.approx(0.2 * one_mm_along * (36 - 20) / (30 - 20))
    assert section.ringed


def test_labels_name_every_group_with_its_bin() -> None:
    steps = usual().steps
    labels = section_of(PISTON, steps).labels
    assert [label.size for label in labels] == [step.size for step in steps]
    assert [label.bins for label in labels] == ["A 1", "A 2", "B 1", "A 3 + A 4", "C 9"]
    assert [label.number for label in labels] == [1, 2, 3, 4, 5]


def test_crossover_and_clamp_are_pointed_out() -> None:
    section = section_of(PISTON, usual().steps)
    words = [call.words for call in section.calls]
    assert ("crossover", "gap 0.10 mm") in words
    assert ("clamp shim",) in words
    crossover = section.calls[words.index(("crossover", "gap 0.10 mm"))]
    shape = _of(section, "crossover")[0]
    x, y = crossover.arrow[-1]
    assert x == pytest.approx(section.axis - _half_width(section, shape), abs=0.5)
    assert min(p[1] for p in shape.points) <= y <= max(p[1] for p in shape.points)


def test_everything_stays_in_the_box() -> None:
    for sheet in (usual(), plain(), crowded()):
        section = section_of(sheet.piston, sheet.steps)
        ys = [y for shape in section.shapes for _x, y in shape.points]
        assert min(ys) >= 0.0
        assert max(ys) <= section.height
        assert 2.0 < section.labels[0].y < section.labels[-1].y < section.height - 2.0


def test_words_for_those_who_do_not_see_it() -> None:
    says = section_of(PISTON, usual().steps).says
    assert "2 x 40 x 0.20 mm (face)" in says
    assert "1 x 22 x 0.10 mm (crossover)" in says


@settings(max_examples=60)
@given(st.lists(st.floats(0, 100), min_size=1, max_size=20), st.floats(0.5, 4))
def test_spread_out_keeps_order_and_distance(wanted: list[float], pitch: float) -> None:
    wanted = sorted(wanted)
    places = spread_out(wanted, pitch, 0.0, 100.0)
    gaps = [after - before for before, after in pairwise(places)]
    assert all(gap >= pitch - 1e-9 for gap in gaps)
    assert places[0] >= 0.0
    assert places[-1] <= 100.0 + 1e-9


def test_spread_out_leaves_what_has_room_and_centres_what_has_not() -> None:
    assert spread_out([10.0, 50.0], 5.0, 0.0, 100.0) == [10.0, 50.0]
    assert spread_out([20.0, 20.0], 4.0, 0.0, 100.0) == [18.0, 22.0]


def test_shortened() -> None:
    assert shortened("tall cabinet", 12) == "tall cabinet"
    assert shortened("tall cabinet 1", 12) == "tall cabine\u2026"


def test_many_thin_shims_have_smaller_labels() -> None:
    few, many = section_of(PISTON, usual().steps), section_of(PISTON, crowded().steps)
    assert many.text < few.text
    assert section_of(replace(PISTON, seat_mm=30.0), usual().steps).exaggeration > 1.0
