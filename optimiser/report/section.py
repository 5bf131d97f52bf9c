"""The stack cut through its axis, as shapes to draw: true in diameter, thicker than it is.

Lengths of the drawing are in units of a view box ``WIDTH`` wide; mm are of the stack.
"""

from collections.abc import Sequence
from dataclasses import dataclass

from optimiser.report.sheet import Piston, Step
from optimiser.stack import Shim

WIDTH = 100.0
#: Room the labels take at the right, and the axis of the post.
_AXIS = 42.5
_HALF = 23.5
_LABELS = 70.5
_CALLS = 15.5
_FACE = 17.0
_SLAB = 8.5
_PITCH = 5.9
_LEAST_STACK, _TALLEST_STACK = 30.0, 56.0
_LONGEST_BIN = 22

Points = tuple[tuple[float, float], ...]


@dataclass(frozen=True)
class Shape:
    """A closed outline of the drawing; ``look`` names how it is filled."""

    points: Points
    look: str

    @property
    def path(self) -> str:
        """The outline as an SVG path."""
        return "M" + "L".join(f"{x:.2f} {y:.2f}" for x, y in self.points) + "Z"


@dataclass(frozen=True)
class Label:
    """Text beside one group, and the line that leads to it."""

    number: int
    size: str
    bins: str
    y: float
    leader: Points


@dataclass(frozen=True)
class Call:
    """Words at the left that point out a shim with a task of its own; ``arrow`` ends at it."""

    words: tuple[str, ...]
    y: float
    arrow: Points


@dataclass(frozen=True)
class Dimension:
    """A diameter between two marks."""

    y: float
    left: float
    right: float
    text: str


@dataclass(frozen=True)
class Section:
    """Everything to draw. ``text`` is the height of a label's main line."""

    height: float
    axis: float
    shapes: tuple[Shape, ...]
    labels: tuple[Label, ...]
    calls: tuple[Call, ...]
    dimensions: tuple[Dimension, ...]
    post: tuple[float, float, float, float]
    ports: tuple[tuple[float, float], ...]
    face_y: float
    text: float
    exaggeration: float
    preload_mm: float
    ringed: bool
    says: str


@dataclass(frozen=True)
class _Scale:
    """Drawing units a mm across, and along the axis; how the preload bends the shims."""

    across: float
    along: float
    piston: Piston
    clamp_mm: float

    def half(self, diameter_mm: float) -> float:
        return 0.5 * diameter_mm * self.across

    def bent(self, diameter_mm: float, rings: Sequence[Shim]) -> float:
        """How far a shim is held off the clamp plane at rest by a dished seat and ring shims.

        Straight lines from the clamp: the true shape is curved.
        """
        reach = max(diameter_mm - self.clamp_mm, 0.0)
        seat = self.piston.seat_mm - self.clamp_mm
        raised = self.piston.seat_height_mm * reach / max(seat, 1e-9)
        for ring in rings:
            raised += ring.thickness_mm * reach / ((ring.inner_mm or 0.0) - self.clamp_mm)
        return raised * self.along


def section_of(piston: Piston, steps: Sequence[Step]) -> Section:
    """The section of a stack under its piston, face first from the top."""
    widest = max([piston.seat_mm + piston.land_mm, *(step.outer_mm for step in steps)])
    plain = [step for step in steps if step.role != "ring"]
    total = sum(step.quantity * step.shim.thickness_mm for step in plain)
    room = min(max(0.95 * _PITCH * len(steps), _LEAST_STACK), _TALLEST_STACK)
    across = 2.0 * _HALF / widest
    scale = _Scale(across, room / total, piston, steps[-1].outer_mm)
    placed = _placed(steps, scale)
    ends = _edge_middles(placed, scale)
    height = _FACE + room + 11.0
    pitch = min(_PITCH, (height - 8.0) / max(len(steps), 1))
    shapes = [*_piston_shapes(scale)]
    for one in placed:
        shapes += _step_shapes(one, scale)
    bottom = _FACE + room
    clamp = scale.half(steps[-1].outer_mm)
    seat = scale.half(piston.seat_mm)
    return Section(
        height=height,
        axis=_AXIS,
        shapes=tuple(shapes),
        labels=tuple(_labels(steps, ends, pitch, height)),
        calls=tuple(_calls(steps, ends, height)),
        dimensions=(
            Dimension(4.6, _AXIS - seat, _AXIS + seat, f"seat \u2300 {piston.seat_mm:g}"),
            Dimension(
                bottom + 7.6, _AXIS - clamp, _AXIS + clamp, f"clamp \u2300 {steps[-1].outer_mm:g}"
            ),
        ),
        post=(
            _AXIS - scale.half(piston.post_mm),
            6.4,
            2 * scale.half(piston.post_mm),
            bottom - 3.2,
        ),
        ports=tuple(_port_middles(scale)),
        face_y=_FACE,
        text=min(3.3, 0.58 * pitch),
        exaggeration=scale.along / scale.across,
        preload_mm=piston.seat_height_mm,
        ringed=len(plain) < len(steps),
        says=_in_words(piston, steps),
    )


@dataclass(frozen=True)
class _Placed:
    """A group with its upper edge at the post, and the ring shims in front of it."""

    step: Step
    top: float
    rings: tuple[Shim, ...]


def _placed(steps: Sequence[Step], scale: _Scale) -> list[_Placed]:
    """Every group in its place; a ring shim takes no height at the post."""
    placed: list[_Placed] = []
    rings: tuple[Shim, ...] = ()
    height = 0.0
    for step in steps:
        placed.append(_Placed(step, _FACE + height * scale.along, rings))
        if step.role == "ring":
            rings += (step.shim,) * step.quantity
        else:
            height += step.quantity * step.shim.thickness_mm
    return placed


def _piston_shapes(scale: _Scale) -> list[Shape]:
    """Both halves of the piston's face: cut metal with the port left open, and the rim."""
    piston = scale.piston
    rim = piston.seat_height_mm * scale.along
    seat_in = scale.half(piston.seat_mm - piston.land_mm)
    seat_out = scale.half(piston.seat_mm + piston.land_mm)
    first = scale.half(piston.port_inner_mm)
    last = min(scale.half(piston.port_outer_mm), seat_in)
    top, post = _FACE - _SLAB, scale.half(piston.post_mm)
    shapes = []
    for side in (-1.0, 1.0):
        inner = ((post, top), (first, top), (first, _FACE), (post, _FACE))
        outer = (
            (last, top),
            (seat_out + 0.6, top),
            (seat_out, _FACE + rim),
            (seat_in, _FACE + rim),
            (last, _FACE),
        )
        shapes += [Shape(_beside(inner, side), "metal"), Shape(_beside(outer, side), "metal")]
    return shapes


def _step_shapes(placed: _Placed, scale: _Scale) -> list[Shape]:
    """Every piece of a group, both halves, bent as it lies at rest."""
    step = placed.step
    thick = step.shim.thickness_mm * scale.along
    hole = step.shim.inner_mm or scale.piston.post_mm
    diameters = [hole, max(hole, scale.clamp_mm), step.outer_mm]
    shapes = []
    for piece in range(step.quantity):
        y = placed.top + piece * thick
        upper = [(scale.half(d), y + scale.bent(d, placed.rings)) for d in diameters]
        lower = [(x, y_upper + thick) for x, y_upper in reversed(upper)]
        outline = tuple(upper + lower)
        shapes += [Shape(_beside(outline, side), step.role) for side in (-1.0, 1.0)]
    return shapes


def _beside(points: Points, side: float) -> Points:
    return tuple((_AXIS + side * x, y) for x, y in points)


def _port_middles(scale: _Scale) -> list[tuple[float, float]]:
    middle = 0.5 * (scale.half(scale.piston.port_inner_mm) + scale.half(scale.piston.port_outer_mm))
    return [(_AXIS - middle, _FACE), (_AXIS + middle, _FACE)]


def _edge_middles(placed: Sequence[_Placed], scale: _Scale) -> list[tuple[float, float]]:
    """Distance from the axis and height of every group's edge, half-way through the group."""
    ends = []
    for one in placed:
        outer = one.step.outer_mm
        half_way = 0.5 * one.step.quantity * one.step.shim.thickness_mm * scale.along
        ends.append((scale.half(outer), one.top + half_way + scale.bent(outer, one.rings)))
    return ends


def _labels(
    steps: Sequence[Step], ends: Sequence[tuple[float, float]], pitch: float, height: float
) -> list[Label]:
    places = spread_out([y for _x, y in ends], pitch, 4.0, height - 4.0)
    labels = []
    for number, (step, (x, y), place) in enumerate(zip(steps, ends, places, strict=True), start=1):
        leader = ((_AXIS + x, y), (_AXIS + max(x, _HALF) + 1.2, y), (_LABELS - 2.0, place))
        bins = shortened(" + ".join(step.bins), _LONGEST_BIN)
        labels.append(Label(number, step.size, bins, place, leader))
    return labels


def _calls(steps: Sequence[Step], ends: Sequence[tuple[float, float]], height: float) -> list[Call]:
    special = [
        (_words_of(step), x, y)
        for step, (x, y) in zip(steps, ends, strict=True)
        if step.role != "shim"
    ]
    places = spread_out([y for _words, _x, y in special], 7.0, 4.0, height - 5.0)
    return [
        Call(words, place, ((_CALLS + 0.8, place), (_AXIS - _HALF - 1.0, y), (_AXIS - x - 0.3, y)))
        for (words, x, y), place in zip(special, places, strict=True)
    ]


def _words_of(step: Step) -> tuple[str, ...]:
    if step.role == "crossover" and step.gap_mm is not None:
        return ("crossover", f"gap {step.gap_mm:.2f} mm")
    if step.role == "face":
        return ("face shim", "to the piston")
    return (f"{step.role} shim",)


def spread_out(wanted: Sequence[float], pitch: float, low: float, high: float) -> list[float]:
    """Places as near as can be to the wanted ones (n,), in their order, ``pitch`` apart.

    Between two bounds. Neighbours that come too close become one block around their mean.
    """
    blocks: list[tuple[float, int]] = []
    for place, y in enumerate(wanted):
        mean, count = y - place * pitch, 1
        while blocks and blocks[-1][0] > mean:
            before, size = blocks.pop()
            mean, count = (mean * count + before * size) / (count + size), count + size
        blocks.append((mean, count))
    top = max(low, high - (len(wanted) - 1) * pitch)
    starts = [min(max(mean, low), top) for mean, count in blocks for _ in range(count)]
    return [start + place * pitch for place, start in enumerate(starts)]


def shortened(text: str, longest: int) -> str:
    """The text, or its beginning with an ellipsis."""
    return text if len(text) <= longest else text[: longest - 1].rstrip() + "\u2026"


def _in_words(piston: Piston, steps: Sequence[Step]) -> str:
    groups = "; ".join(
        f"{step.size} mm" + (f" ({step.role})" if step.role != "shim" else "") for step in steps
    )
    return f"Section of the stack below a {piston.seat_mm:g} mm seat, face first: {groups}."
