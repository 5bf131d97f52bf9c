"""What is built: shims and stacks, as data. No files, no physics."""

import re
from collections.abc import Iterable
from dataclasses import dataclass
from itertools import groupby

from optimiser.faults import BadInput

_GROUP = re.compile(
    r"^\s*(?P<quantity>\d+)\s*[x*×]\s*(?P<outer>[\d.]+)\s*[x*×]\s*(?P<thickness>[\d.]+)"
    r"(?:\s*/\s*(?P<inner>[\d.]+))?\s*$",
    re.IGNORECASE,
)


#: More pieces of one size than any post carries: a slip of the pen.
MOST_OF_A_SIZE = 60


@dataclass(frozen=True, order=True)
class Shim:
    """One shim. ``inner_mm`` is given only for a ring shim, whose hole is wider than the clamp."""

    outer_mm: float
    thickness_mm: float
    inner_mm: float | None = None

    def __str__(self) -> str:
        ring = f" / {self.inner_mm:g}" if self.inner_mm is not None else ""
        return f"{self.outer_mm:g} x {_thickness_text(self.thickness_mm)}{ring}"


@dataclass(frozen=True)
class Group:
    """Equal shims that lie on each other."""

    quantity: int
    shim: Shim

    def __str__(self) -> str:
        return f"{self.quantity} x {self.shim}"


@dataclass(frozen=True)
class Stack:
    """Groups of shims, face first; the last group is the clamp shim.

    The clamp shim does not bend: its outer diameter is where all the others are clamped.
    """

    groups: tuple[Group, ...]

    def __post_init__(self) -> None:
        faults = _faults_of(self.groups)
        if faults:
            raise BadInput(faults)

    @classmethod
    def of(cls, shims: Iterable[Shim]) -> "Stack":
        """Build a stack from single shims, face first; equal neighbours become one group."""
        runs = ((shim, sum(1 for _ in run)) for shim, run in groupby(shims))
        return cls(tuple(Group(quantity, shim) for shim, quantity in runs))

    @classmethod
    def parse(cls, lines: Iterable[str]) -> "Stack":
        """Read ``quantity x outer mm x thickness mm`` lines, face first.

        A ring shim adds its hole: ``1 x 24 x 0.20 / 20``. Raises BadInput naming every bad line.
        """
        groups: list[Group] = []
        faults: list[str] = []
        for number, line in enumerate(lines, start=1):
            try:
                groups.append(parse_group(line))
            except BadInput as error:
                faults += [f"shim group {number}: {fault}" for fault in error.faults]
        if faults:
            raise BadInput(faults)
        return cls(tuple(groups))

    @property
    def clamp_mm(self) -> float:
        """Diameter at which the stack is clamped, mm."""
        return self.groups[-1].shim.outer_mm

    @property
    def bending(self) -> tuple[Shim, ...]:
        """Every shim that bends or lies loose, face first, one entry a piece (no clamp shim)."""
        return tuple(g.shim for g in self.groups[:-1] for _ in range(g.quantity))

    @property
    def pieces(self) -> tuple[Shim, ...]:
        """Every shim, face first, clamp shim last, one entry a piece."""
        return tuple(g.shim for g in self.groups for _ in range(g.quantity))

    @property
    def parts(self) -> int:
        """Number of shims, clamp shim included."""
        return sum(g.quantity for g in self.groups)

    @property
    def height_mm(self) -> float:
        """Height on the post, mm (ring shims lie around others and do not count)."""
        return sum(g.quantity * g.shim.thickness_mm for g in self.groups if g.shim.inner_mm is None)

    def lines(self) -> list[str]:
        """The stack as text, face first, one line a group."""
        return [str(g) for g in self.groups]


def parse_group(text: str) -> Group:
    """Read one ``quantity x outer mm x thickness mm`` text. Raises BadInput."""
    match = _GROUP.match(text)
    if not match:
        hint = " (with a point as the decimal mark)" if "," in text else ""
        raise BadInput(
            f"'{text.strip()}' is not 'quantity x outer mm x thickness mm'{hint}, "
            "e.g. 3 x 24 x 0.15"
        )
    inner = match["inner"]
    try:
        outer, thickness = float(match["outer"]), float(match["thickness"])
        hole = float(inner) if inner else None
    except ValueError:
        raise BadInput(f"'{text.strip()}' holds a number that cannot be read") from None
    return Group(int(match["quantity"]), Shim(outer, thickness, hole))


def _thickness_text(thickness_mm: float) -> str:
    """Two decimals as shims are sold; more only where a measured thickness has them."""
    short = f"{thickness_mm:.2f}"
    return short if abs(float(short) - thickness_mm) < 1e-9 else f"{thickness_mm:.6g}"


def _faults_of(groups: tuple[Group, ...]) -> list[str]:
    if len(groups) < 2:
        return ["a stack needs at least a face shim and a clamp shim (the last, smallest one)"]
    faults = []
    for number, group in enumerate(groups, start=1):
        where = f"shim group {number} ({group})"
        faults += [f"{where}: {fault}" for fault in _size_faults(group)]
        faults += [f"{where}: {fault}" for fault in _place_faults(groups, number - 1)]
    return faults


def _size_faults(group: Group) -> list[str]:
    shim = group.shim
    faults = []
    if not 1 <= group.quantity <= MOST_OF_A_SIZE:
        faults.append(f"the quantity must be 1 to {MOST_OF_A_SIZE}")
    if not 2.0 <= shim.outer_mm <= 200.0:
        faults.append("the outer diameter must be 2 to 200 mm")
    if not 0.02 <= shim.thickness_mm <= 5.0:
        faults.append("the thickness must be 0.02 to 5 mm")
    return faults


def _place_faults(groups: tuple[Group, ...], place: int) -> list[str]:
    shim, clamp = groups[place].shim, groups[-1].shim
    if place == len(groups) - 1:
        ring = shim.inner_mm is not None
        return ["the last group is the clamp shim and cannot be a ring shim"] if ring else []
    faults = []
    if not shim.outer_mm > clamp.outer_mm:
        faults.append(f"must be wider than the clamp shim (last group, {clamp.outer_mm:g} mm)")
    if shim.inner_mm is None:
        return faults
    if place == 0:
        faults.append("the first group is the face shim and cannot be a ring shim")
    if not clamp.outer_mm < shim.inner_mm < shim.outer_mm:
        faults.append(
            "a ring shim's hole must lie between the clamp diameter "
            f"{clamp.outer_mm:g} mm and its own outer diameter"
        )
    elif place and not _is_held(groups, place):
        faults.append(
            f"a ring shim must lie between shims wider than its hole ({shim.inner_mm:g} mm), "
            "one in front and one behind"
        )
    return faults


def _is_held(groups: tuple[Group, ...], place: int) -> bool:
    """True when the plain shims next in front of and behind a ring shim reach over its hole."""
    hole = groups[place].shim.inner_mm or 0.0
    front = [g.shim.outer_mm for g in groups[:place] if g.shim.inner_mm is None]
    behind = [g.shim.outer_mm for g in groups[place + 1 :] if g.shim.inner_mm is None]
    return bool(front and behind) and front[-1] > hole and behind[0] > hole
