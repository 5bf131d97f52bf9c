"""What makes a stack buildable, as numbers."""

from dataclasses import dataclass
from typing import Self

from optimiser.damper import Valve
from optimiser.faults import BadInput

SLACK_MM = 1e-9  # rounding of summed thicknesses


@dataclass(frozen=True)
class Limits:
    """What the user allows beyond what the damper needs.

    ``parts`` counts every shim, clamp shims included; ``face_min`` is the least number of shims
    of the face shim's diameter; ``stages`` the allowed numbers of stages (1, 2 or both). Heights
    (mm) replace those of the damper's post. Raises BadInput naming every limit that cannot be.
    """

    parts: int = 14
    face_min: int = 1
    stages: tuple[int, ...] = (1, 2)
    height_min_mm: float | None = None
    height_max_mm: float | None = None

    def __post_init__(self) -> None:
        faults = []
        if not 2 <= self.parts <= 40:
            faults.append(f"parts: {self.parts} is not allowed; it must be 2 to 40")
        if not 1 <= self.face_min < self.parts:
            faults.append(
                f"face_min: {self.face_min} is not allowed; it must be 1 to {self.parts - 1}, "
                "one fewer than parts"
            )
        if not self.stages or not set(self.stages) <= {1, 2}:
            faults.append("stages: must name 1, 2 or both")
        if faults:
            raise BadInput(faults)


@dataclass(frozen=True)
class Rules:
    """The rules a buildable stack keeps; lengths in mm.

    * the face shim is at least ``cover_mm`` wide (seat plus land) and at most ``clearance_mm``;
    * at least ``face_min`` shims of the first stage have the face shim's diameter;
    * within a stage no shim is wider than the one before it (towards the face);
    * one stage, or two with a single crossover shim between them that is narrower than every
      shim of the first stage and than the widest of the second; the second stage is nowhere
      wider than the face shim and may taper to below the crossover's diameter;
    * the clamp shim is narrower than every other shim and than ``port_inner_mm``, so that it
      leaves the ports free;
    * the height, clamp shims included, lies between ``height_min_mm`` and ``height_max_mm``;
      what is missing below the minimum is made up with further shims of the clamp shim's size;
    * no more than ``parts`` shims, those included, and no more of a size than there are.
    """

    cover_mm: float
    clearance_mm: float
    port_inner_mm: float
    height_min_mm: float
    height_max_mm: float
    parts: int
    face_min: int
    stages: tuple[int, ...]

    @classmethod
    def of(cls, valve: Valve, limits: Limits) -> Self:
        """The rules of one valve. Raises BadInput when it has no stack or heights contradict."""
        if valve.ports is None or valve.seat is None or valve.post is None:
            raise BadInput(f"valve '{valve.name}' has no shim stack to search")
        post = valve.post
        low = post.height_min_mm if limits.height_min_mm is None else limits.height_min_mm
        high = post.height_max_mm if limits.height_max_mm is None else limits.height_max_mm
        if not 0 <= low <= high:
            raise BadInput(
                f"stack height: the minimum {low:g} mm must lie between 0 and the maximum "
                f"{high:g} mm"
            )
        return cls(
            cover_mm=valve.seat.seat_mm + valve.seat.land_mm,
            clearance_mm=post.clearance_mm,
            port_inner_mm=valve.ports.inner_mm,
            height_min_mm=low,
            height_max_mm=high,
            parts=limits.parts,
            face_min=limits.face_min,
            stages=tuple(sorted(set(limits.stages))),
        )
