"""Read and write what is wanted: targets, frames, riders and feels, by bundled name or path."""

from pathlib import Path

from optimiser.damper import Direction
from optimiser.files import atomic_write_text, read_model, read_points
from optimiser.wanted.feel import Feel
from optimiser.wanted.frame import Frame
from optimiser.wanted.rider import Rider
from optimiser.wanted.target import Target


def read_target(name_or_path: str | Path, direction: Direction) -> Target:
    """A target CSV (velocity in m/s, force in N). Raises BadInput with every fault."""
    velocity, force, weight = read_points(name_or_path)
    return Target.of(velocity, force, weight, direction=direction, origin=str(name_or_path))


def write_target(path: str | Path, target: Target) -> None:
    """Write a target as CSV that ``read_target`` reads back exactly. Raises BadInput."""
    remarks = [f"# {target.direction}, {target.origin}", *(f"# {note}" for note in target.notes)]
    rows = zip(
        target.velocity_m_s.tolist(), target.force_n.tolist(), target.weight.tolist(), strict=True
    )
    lines = [f"{velocity!r},{force!r},{weight!r}" for velocity, force, weight in rows]
    heads = [" ".join(remark.splitlines()) for remark in remarks]
    atomic_write_text(path, "\n".join([*heads, "velocity_m_s,force_n,weight", *lines]) + "\n")


def read_frame(name_or_path: str | Path) -> Frame:
    """A frame TOML. Raises BadInput with every fault."""
    return read_model("frame", name_or_path, Frame)


def read_rider(name_or_path: str | Path) -> Rider:
    """A rider TOML (mass with kit in kg). Raises BadInput with every fault."""
    return read_model("rider", name_or_path, Rider)


def read_feel(name_or_path: str | Path) -> Feel:
    """A feel TOML (damping ratios over wheel speed in m/s). Raises BadInput with every fault."""
    return read_model("feel", name_or_path, Feel)
