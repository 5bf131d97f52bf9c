"""A stack's side view in characters: one line a group, true in diameter, thickness by height."""

from dataclasses import dataclass

from optimiser.damper import Valve
from optimiser.stack import Group, Stack

#: Characters from the post's axis to the widest edge, both included.
HALF_WIDTH = 13
_UNICODE_HEIGHTS = "▂▃▄▅▆▇"
_ASCII_HEIGHTS = "-=#"


@dataclass(frozen=True)
class SideView:
    """``piston``: the face with its ports as gaps; ``groups``: a line a group, face first."""

    piston: str
    groups: tuple[str, ...]


def side_view(
    stack: Stack, valve: Valve, unicode: bool = True, widest_mm: float | None = None
) -> SideView:
    """Side view of ``stack`` under the piston face of ``valve``.

    ``widest_mm`` sets the scale, by default the stack's widest shim (give it to compare stacks).
    """
    widest = widest_mm or max(g.shim.outer_mm for g in stack.groups)
    cells_per_mm = (HALF_WIDTH - 1) / (widest / 2.0)
    post = round(valve.post.post_mm / 2.0 * cells_per_mm) if valve.post else 0
    heights = _UNICODE_HEIGHTS if unicode else _ASCII_HEIGHTS
    tallest = max(_height_mm(group) for group in stack.groups)
    lines = []
    for group in stack.groups:
        mark = heights[round(_height_mm(group) / tallest * (len(heights) - 1))]
        shim = group.shim
        hole = round((shim.inner_mm or 0.0) / 2.0 * cells_per_mm)
        edge = round(shim.outer_mm / 2.0 * cells_per_mm)
        half = [mark if max(post, hole) < cell <= edge else " " for cell in range(HALF_WIDTH)]
        lines.append(_on_post(half, post, unicode))
    piston = _on_post(_piston(valve, cells_per_mm, unicode), post, unicode)
    return SideView(piston, tuple(lines))


def _height_mm(group: Group) -> float:
    return group.quantity * group.shim.thickness_mm


def _piston(valve: Valve, cells_per_mm: float, unicode: bool) -> list[str]:
    """Face of the piston from the axis outward: solid, ports open, solid up to the seat's rim."""
    solid = "█" if unicode else "@"
    ports, seat = valve.ports, valve.seat
    rim = round(seat.seat_mm / 2.0 * cells_per_mm) if seat else 0
    half = [solid if cell <= rim else " " for cell in range(HALF_WIDTH)]
    if ports:
        first = round(ports.inner_mm / 2.0 * cells_per_mm)
        last = min(round(ports.outer_mm / 2.0 * cells_per_mm), rim - 1)
        half[first : last + 1] = " " * (last + 1 - first)
    return half


def _on_post(half: list[str], post: int, unicode: bool) -> str:
    """Both sides of a half section around the post, whose edges are drawn."""
    side = "│" if unicode else "|"
    half = [
        " " if cell < post else side if cell == post else half[cell] for cell in range(len(half))
    ]
    return "".join(reversed(half[1:])) + "".join(half)
