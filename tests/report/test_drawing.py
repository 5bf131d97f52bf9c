"""The side view in characters."""

import pytest

from optimiser.files import bundled_names, read_damper
from optimiser.report.drawing import HALF_WIDTH, side_view
from optimiser.stack import Stack

VALVE = read_damper("rear-monotube").circuit("compression").searched
STACK = Stack.parse(
    ["2 x 40 x 0.25", "1 x 36 x 0.15", "1 x 36 x 0.10 / 30", "1 x 32 x 0.2", "2 x 20 x 0.3"]
)


def test_widths_are_true_to_diameter() -> None:
    view = side_view(STACK, VALVE, unicode=False)
    for line, group in zip(view.groups, STACK.groups, strict=True):
        drawn = len(line.strip())
        expected = group.shim.outer_mm / 40.0 * 2 * (HALF_WIDTH - 1) + 1
        assert abs(drawn - expected) <= 1.01


def test_ring_shim_is_open_inside() -> None:
    ring = side_view(STACK, VALVE, unicode=False).groups[2]
    plain = side_view(STACK, VALVE, unicode=False).groups[1]
    assert ring.count(" ") > plain.count(" ")
    assert ring.strip()[0] == ring.strip()[-1] != " "


def test_thicker_groups_are_drawn_heavier() -> None:
    groups = side_view(STACK, VALVE, unicode=False).groups
    assert groups[0][0] == "#"
    assert groups[2].strip()[0] == "-"


def test_piston_face_shows_ports_between_post_and_seat() -> None:
    half = side_view(STACK, VALVE, unicode=False).piston[HALF_WIDTH - 1 :]
    post, inner, ports, rim = half.index("|"), half.index("@"), half.rindex(" @"), half.rindex("@")
    assert post < inner < ports < rim


@pytest.mark.parametrize("name", bundled_names("damper"))
def test_every_drawing_is_symmetric_and_as_wide(name: str) -> None:
    valve = read_damper(name).circuit("rebound").searched
    assert valve.fitted is not None
    for unicode in (True, False):
        view = side_view(valve.fitted, valve, unicode)
        for line in (view.piston, *view.groups):
            assert len(line) == 2 * HALF_WIDTH - 1
            assert line == line[::-1]
            assert unicode or line.isascii()


def test_a_common_scale_for_comparisons() -> None:
    narrow = side_view(STACK, VALVE, unicode=False, widest_mm=80.0).groups[0]
    assert len(narrow.strip()) < 0.6 * (2 * HALF_WIDTH - 1)
