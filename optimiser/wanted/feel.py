"""Feel: how hard the damper works, as damping ratios over wheel speed."""

from typing import Annotated, Self

import numpy as np
from numpy.typing import ArrayLike
from pydantic import Field, model_validator

from optimiser.wanted.arrays import Floats
from optimiser.wanted.bounds import Described, between

LEAST_RATIO, MOST_RATIO = 0.02, 2.0
_SPEED_LOW, _SPEED_HIGH = 0.02, 12.0

Ratio = Annotated[float, between(LEAST_RATIO, MOST_RATIO, "damping ratio")]
WheelSpeed = Annotated[float, between(_SPEED_LOW, _SPEED_HIGH, "wheel speed", "m/s")]


class StrokeFeel(Described):
    """One direction of travel."""

    low_damping_ratio: Ratio = Field(
        description="damping ratio (1 = critical) at wheel speeds far below the knee"
    )
    high_damping_ratio: Ratio = Field(
        description="damping ratio far above the knee, before `progressive` adds to it"
    )
    knee_wheel_m_s: WheelSpeed = Field(
        description="wheel speed, m/s, at which the ratio is half-way between the two"
    )
    progressive: Annotated[float, between(0, 1, "progressive")] = Field(
        default=0.0,
        description="extra power of wheel speed above the knee: 0 linear, 1 like a bare orifice",
    )
    slowest_wheel_m_s: WheelSpeed = Field(
        default=0.1, description="wheel speed, m/s, of the target's first point"
    )
    fastest_wheel_m_s: WheelSpeed = Field(description="wheel speed, m/s, of its last point")

    @model_validator(mode="after")
    def _wide_enough(self) -> Self:
        if self.fastest_wheel_m_s < 2.0 * self.slowest_wheel_m_s:
            raise ValueError(
                f"fastest_wheel_m_s must be at least twice slowest_wheel_m_s, not "
                f"{self.fastest_wheel_m_s:g} after {self.slowest_wheel_m_s:g}"
            )
        return self

    def damping_ratio(self, wheel_m_s: ArrayLike) -> Floats:
        """Damping ratio F / (v c_critical) at wheel speeds (n,), m/s.

        z(v) = (z_low k + z_high v)/(k + v) * (1 + (v/k)^2)^(p/2), k the knee, p progressive. Own
        formula, no source: z_low at rest, z_high far above the knee when p = 0, and v z(v) rises
        with v for every allowed feel (d ln(v z)/d ln v > k/(k + v) > 0).
        """
        speed, knee = np.asarray(wheel_m_s, dtype=np.float64), self.knee_wheel_m_s
        mixed = (self.low_damping_ratio * knee + self.high_damping_ratio * speed) / (knee + speed)
        return mixed * (1.0 + (speed / knee) ** 2) ** (0.5 * self.progressive)

    def wheel_force_n(self, wheel_m_s: ArrayLike, critical_n_s_m: float) -> Floats:
        """Damping force at the wheel, N, at wheel speeds (n,), m/s, given c_critical, N s/m."""
        speed = np.asarray(wheel_m_s, dtype=np.float64)
        return critical_n_s_m * speed * self.damping_ratio(speed)


class Feel(Described):
    """Compression and rebound together, under a plain name."""

    name: str = Field(min_length=1, max_length=60)
    summary: str = Field(default="", description="what it is for, in words")
    compression: StrokeFeel
    rebound: StrokeFeel


def explained(feel: Feel) -> list[str]:
    """What each number of a feel does on the machine, one sentence each (common practice)."""
    squash, back = feel.compression, feel.rebound
    return [
        f"Compression below {squash.knee_wheel_m_s:g} m/s at the wheel, ratio "
        f"{squash.low_damping_ratio:g}: slow movements such as braking dive, squat and pumping; "
        "more holds the body level, less follows small bumps.",
        f"Compression above it, ratio {squash.high_damping_ratio:g}: hits by stones and kerbs, "
        "landings; more keeps travel in reserve, less softens the blow.",
        f"Compression progressive {squash.progressive:g}: "
        + (
            "the hardest hits are braked more than in proportion."
            if squash.progressive > 0.0
            else "no extra braking of the hardest hits."
        ),
        f"Rebound at low speed, ratio {back.low_damping_ratio:g}: how the body comes back after "
        "a roll or a dip; more is calm, less is lively; well under 0.2 it bobs.",
        f"Rebound at high speed, ratio {back.high_damping_ratio:g}: how fast the wheel comes "
        "back down after a hit; too much and the damper packs down over a row of bumps.",
    ]


def compared(feel: Feel, other: Feel) -> list[str]:
    """How a feel differs from another in words; an empty list when it does not."""
    sentences = []
    for direction in ("compression", "rebound"):
        mine: StrokeFeel = getattr(feel, direction)
        theirs: StrokeFeel = getattr(other, direction)
        for part, firmer, softer in (
            ("low_damping_ratio", "firmer", "softer"),
            ("high_damping_ratio", "firmer", "softer"),
            ("knee_wheel_m_s", "later", "earlier"),
        ):
            percent = 100.0 * (getattr(mine, part) / getattr(theirs, part) - 1.0)
            if abs(percent) >= 0.5:
                word = firmer if percent > 0.0 else softer
                what = part.split("_")[0] + ("" if "knee" in part else " speed")
                sentences.append(
                    f"{direction} {what}: {abs(percent):.0f} % {word} than {other.name}"
                )
        if mine.progressive != theirs.progressive:
            word = "more" if mine.progressive > theirs.progressive else "less"
            sentences.append(f"{direction}: {word} progressive than {other.name}")
    return sentences
