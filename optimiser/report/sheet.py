"""The bench sheet as plain data: what hangs above the vice, before anybody draws it."""

from dataclasses import dataclass, field
from typing import Literal

from optimiser.report.curve_line import CurveLine, Floats
from optimiser.stack import Shim

Role = Literal["face", "crossover", "ring", "clamp", "shim"]


@dataclass(frozen=True)
class Fact:
    """One thing to know, such as oil: light at 40 C."""

    label: str
    value: str


@dataclass(frozen=True)
class Worked:
    """How hard one shim works at the hardest point of the velocity range."""

    peak_stress_mpa: float
    utilisation: float


@dataclass(frozen=True)
class Step:
    """One group of equal shims to put on the post, in the order of building.

    ``bins`` where the size lies, ``left`` pieces in the drawer after the build (None: no stock
    list). ``measured_mm`` real thicknesses where they differ from what is written on the bin.
    ``worked`` one entry a piece; the clamp shim has none. ``gap_mm`` the gap a crossover opens.
    """

    quantity: int
    shim: Shim
    role: Role
    bins: tuple[str, ...] = ()
    left: int | None = None
    measured_mm: tuple[float, ...] = ()
    worked: tuple[Worked, ...] = ()
    gap_mm: float | None = None

    @property
    def utilisation(self) -> float:
        """Fatigue utilisation of the hardest worked piece; 0 for the clamp shim."""
        return max((one.utilisation for one in self.worked), default=0.0)

    @property
    def outer_mm(self) -> float:
        """Outer diameter, mm."""
        return self.shim.outer_mm

    @property
    def size(self) -> str:
        """Quantity x diameter x thickness, as a label."""
        return f"{self.quantity} x {self.shim}"


@dataclass(frozen=True)
class Piston:
    """The face the stack lies on; all in mm. ``seat_height_mm`` above the clamp face: preload."""

    post_mm: float
    port_inner_mm: float
    port_outer_mm: float
    seat_mm: float
    land_mm: float
    seat_height_mm: float = 0.0
    height_min_mm: float | None = None
    height_max_mm: float | None = None


@dataclass(frozen=True)
class ForceRow:
    """Force at one velocity, N; None where nothing is wanted, infinite where the oil is locked."""

    velocity_m_s: float
    predicted_n: float
    wanted_n: float | None = None
    open_n: float | None = None
    closed_n: float | None = None

    @property
    def off_percent(self) -> float | None:
        """Predicted against wanted, %."""
        if self.wanted_n is None:
            return None
        return 100.0 * (self.predicted_n / self.wanted_n - 1.0)


@dataclass(frozen=True)
class Errors:
    """Error of the prediction against the target, r.m.s. in %, whole and by velocity band."""

    total_percent: float
    worst_percent: float
    worst_at_m_s: float
    low_percent: float | None
    mid_percent: float | None
    high_percent: float | None
    low_to_m_s: float
    mid_to_m_s: float


@dataclass(frozen=True, eq=False)
class Opening:
    """How the stack opens; arrays (n,): lift above the seat, and the bleed's share of the oil."""

    velocity_m_s: Floats
    lift_mm: Floats
    bleed_share: Floats


@dataclass(frozen=True)
class Exchange:
    """Shims to take out of, and put into, the fitted stack."""

    out: tuple[str, ...]
    put_in: tuple[str, ...]


@dataclass(frozen=True)
class Source:
    """What the sheet was made from, so that it can be made again."""

    program: str
    command: str = ""
    seed: int | None = None
    inputs: tuple[Fact, ...] = ()


@dataclass(frozen=True, eq=False)
class Sheet:
    """One tune: one stack in one circuit. ``rows`` and ``lines`` hold forces in N over m/s.

    ``facts`` what it is built into and for whom; ``clicks_range`` 0 without an adjuster;
    ``spread_n`` (low, high) arrays over the predicted line's velocities, None: not known.
    """

    title: str
    subtitle: str
    direction: str
    clicks: int
    clicks_range: int
    facts: tuple[Fact, ...]
    piston: Piston
    steps: tuple[Step, ...]
    height_mm: float
    rows: tuple[ForceRow, ...]
    lines: tuple[CurveLine, ...]
    opening: Opening
    source: Source
    stock_name: str | None = None
    errors: Errors | None = None
    exchange: Exchange | None = None
    warnings: tuple[str, ...] = field(default=())
    spread_n: tuple[Floats, Floats] | None = None

    @property
    def parts(self) -> int:
        """Number of shims."""
        return sum(step.quantity for step in self.steps)

    @property
    def sizes(self) -> int:
        """Number of distinct sizes."""
        return len({step.shim for step in self.steps})

    @property
    def utilisation(self) -> float:
        """Fatigue utilisation of the hardest worked shim."""
        return max((step.utilisation for step in self.steps), default=0.0)
