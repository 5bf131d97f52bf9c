"""A stack for a cell, with what it does there."""

from dataclasses import dataclass
from typing import Any

from optimiser.mechanics.deflect import RISE_LIMIT
from optimiser.stack import Group, Shim, Stack


@dataclass(frozen=True)
class Candidate:
    """One stack (nominal thicknesses) that a cell's drawer builds, at the `reported` fidelity.

    ``force_n`` at the target's velocities; ``worst_percent`` signed, at ``worst_m_s``;
    ``rise`` edge rise over thickness.
    """

    stack: Stack
    clicks: int
    error_percent: float
    worst_percent: float
    worst_m_s: float
    utilisation: float
    rise: float
    force_n: tuple[float, ...]

    @property
    def sound(self) -> bool:
        """Lives long enough and lies in the range the model was checked for."""
        return self.utilisation < 1.0 and self.rise <= RISE_LIMIT

    @property
    def order(self) -> tuple[float, list[str]]:
        """What candidates are sorted by: the error, then their text so that none are level."""
        return self.error_percent, self.stack.lines()

    def record(self) -> dict[str, Any]:
        """Plain data that :func:`candidate_from` reads back exactly."""
        groups = [
            [g.quantity, g.shim.outer_mm, g.shim.thickness_mm, g.shim.inner_mm]
            for g in self.stack.groups
        ]
        return {**vars(self), "stack": groups, "force_n": list(self.force_n)}


def candidate_from(record: dict[str, Any]) -> Candidate:
    """The candidate of a record. Raises KeyError, TypeError or ValueError for anything else."""
    groups = tuple(
        Group(int(n), Shim(outer, thick, hole)) for n, outer, thick, hole in record["stack"]
    )
    return Candidate(**{**record, "stack": Stack(groups), "force_n": tuple(record["force_n"])})


def within(candidates: tuple[Candidate, ...], tolerance_percent: float) -> tuple[Candidate, ...]:
    """The candidates a table may choose from, least error first.

    Sound ones within the tolerance; failing that the sound ones (or, if there are none, any) not
    more than half a point worse than the best of them.
    """
    ordered = sorted(candidates, key=lambda candidate: candidate.order)
    sound = [candidate for candidate in ordered if candidate.sound] or ordered
    if not sound:
        return ()
    limit = max(tolerance_percent, sound[0].error_percent + 0.5)
    if sound[0].error_percent <= tolerance_percent and sound[0].sound:
        limit = tolerance_percent
    return tuple(candidate for candidate in sound if candidate.error_percent <= limit)
