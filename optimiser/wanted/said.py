"""What the tuner said, as typed, and which one way to a target it is. No files are read here."""

from dataclasses import dataclass
from typing import Literal

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.wanted.change import Wish
from optimiser.wanted.frame import LEAST_SAG_PERCENT, MOST_SAG_PERCENT
from optimiser.wanted.rider import LEAST_RIDER_KG, MOST_RIDER_KG

Way = Literal["example", "points", "copy", "change", "ride"]

WAYS = (
    "--target; --copy; a change of the fitted stack by --low, --mid, --high or --knee; "
    "or a ride by --rider-kg (or --rider), --frame and --feel"
)
MOST_STATIC_N = 5000.0
_CHANGES = ("low", "mid", "high", "knee")


@dataclass(frozen=True)
class Said:
    """The options that say what is wanted; None or empty: not given.

    ``targets``, ``copies`` and ``fitted`` name bundled data or files, one a direction,
    compression first. Per cents are changes of the fitted stack's force (``knee``: of its knee
    velocity); ``clicks`` is the setting the fitted stack is measured at, ``velocity_m_s`` where.
    """

    targets: tuple[str, ...] = ()
    copies: tuple[str, ...] = ()
    copy_static_n: float | None = None
    fitted: tuple[str, ...] = ()
    low_percent: float | None = None
    mid_percent: float | None = None
    high_percent: float | None = None
    knee_percent: float | None = None
    clicks: int | None = None
    velocity_m_s: tuple[float, ...] | None = None
    rider_kg: float | None = None
    rider: str | None = None
    frame: str | None = None
    feel: str | None = None
    sag_percent: float | None = None
    resample: int | None = None

    @property
    def change(self) -> Wish:
        """The change asked for, 0 % where nothing is said. Raises BadInput out of range."""
        return Wish(*(getattr(self, f"{name}_percent") or 0.0 for name in _CHANGES))

    @property
    def about_points(self) -> list[str]:
        """Options given that name a target file."""
        return ["--target"] if self.targets else []

    @property
    def about_copy(self) -> list[str]:
        """Options given that name a measured damper."""
        return ["--copy"] if self.copies else []

    @property
    def about_change(self) -> list[str]:
        """Options given that change the fitted stack's curve."""
        return [f"--{name}" for name in _CHANGES if getattr(self, f"{name}_percent") is not None]

    @property
    def about_ride(self) -> list[str]:
        """Options given that describe a ride."""
        given = {
            "--rider-kg": self.rider_kg,
            "--rider": self.rider,
            "--frame": self.frame,
            "--feel": self.feel,
            "--sag": self.sag_percent,
        }
        return [option for option, value in given.items() if value is not None]


def way_of(said: Said) -> Way:
    """The one way to a target that was chosen. Raises BadInput with all faults.

    A fitted stack (with clicks, velocities) that comes with nothing else is a change by nothing:
    the target is what it does now.
    """
    given: dict[Way, list[str]] = {
        "points": said.about_points,
        "copy": said.about_copy,
        "change": said.about_change,
        "ride": said.about_ride,
    }
    chosen: list[Way] = [way for way, options in given.items() if options]
    if len(chosen) > 1:
        first = [given[way][0] for way in chosen]
        listed = f"{', '.join(first[:-1])} and {first[-1]}"
        raise BadInput(f"{listed} say what is wanted in different ways; allowed is one: {WAYS}")
    about_fitted = said.fitted or said.clicks is not None or said.velocity_m_s is not None
    way: Way = chosen[0] if chosen else "change" if about_fitted else "example"
    faults = [*_faults_of_change(said, way), *_faults_of_copy(said, way)]
    if way == "ride":
        faults += _faults_of_ride(said)
    if faults:
        raise BadInput(faults)
    return way


def directions_of(
    said: Said, asked: list[Direction] | None, available: list[Direction]
) -> list[Direction]:
    """The directions to make targets of.

    Those ``asked`` for; else all the damper has, but only the first where an option names a single
    file, which holds one direction. Raises BadInput when files and directions do not match.
    """
    files = {"--target": said.targets, "--copy": said.copies, "--fitted": said.fitted}
    directions = asked
    if directions is None:
        single = any(len(names) == 1 for names in files.values())
        directions = available[:1] if single else available
    faults = [
        f"{option} is given {_times(len(names))} for {' and '.join(directions)}; allowed: once a "
        "direction, compression first, or name one --circuit"
        for option, names in files.items()
        if len(names) not in (0, len(directions)) and not (option == "--copy" and len(names) == 1)
    ]
    if faults:
        raise BadInput(faults)
    return directions


def _times(count: int) -> str:
    return {1: "once", 2: "twice"}.get(count, f"{count} times")


def _faults_of_change(said: Said, way: Way) -> list[str]:
    faults: list[str] = []
    try:
        _ = said.change
    except BadInput as error:
        faults += error.faults
    if way != "change" and said.velocity_m_s is not None:
        faults.append(
            "--velocities belongs to a change of the fitted stack; allowed here: --resample N"
        )
    if way != "change" and said.clicks is not None and not said.fitted:
        faults.append(
            "--clicks is the setting the fitted stack is measured at; allowed: with --fitted or a "
            "change by --low, --mid, --high or --knee"
        )
    return faults


def _faults_of_copy(said: Said, way: Way) -> list[str]:
    static = said.copy_static_n
    if static is None:
        return []
    faults = [] if way == "copy" else ["--copy-static-n belongs to --copy; leave it out"]
    if not abs(static) <= MOST_STATIC_N:
        faults.append(
            f"--copy-static-n is {static:g}; allowed: {-MOST_STATIC_N:g} to {MOST_STATIC_N:g} N"
        )
    return faults


def _faults_of_ride(said: Said) -> list[str]:
    faults = []
    if said.rider is None and said.rider_kg is None:
        faults.append(f"{said.about_ride[0]} needs a rider as well; allowed: --rider-kg KG")
    if said.rider is not None and said.rider_kg is not None:
        faults.append("--rider and --rider-kg both say who rides; allowed: one of them")
    faults += [
        f"{said.about_ride[0]} needs --{what} as well; allowed: --{what} NAME|FILE"
        for what, value in (("frame", said.frame), ("feel", said.feel))
        if value is None
    ]
    mass, sag = said.rider_kg, said.sag_percent
    if mass is not None and not LEAST_RIDER_KG <= mass <= MOST_RIDER_KG:
        faults.append(
            f"--rider-kg is {mass:g}; allowed: {LEAST_RIDER_KG:g} to {MOST_RIDER_KG:g} kg, with kit"
        )
    if sag is not None and not LEAST_SAG_PERCENT <= sag <= MOST_SAG_PERCENT:
        faults.append(f"--sag is {sag:g}; allowed: {LEAST_SAG_PERCENT:g} to {MOST_SAG_PERCENT:g} %")
    return faults
