"""A quarter vehicle with two degrees of freedom: what a damper curve would do on the road.

Body (sprung mass) on spring and damper, wheel (unsprung mass) on the tyre:
    m_s x_s'' = -k (x_s - x_u) - c (x_s' - x_u')
    m_u x_u'' =  k (x_s - x_u) + c (x_s' - x_u') - k_t (x_u - road)
(e.g. Barton and Fieldhouse, *Automotive Chassis Engineering*, Springer 2018, chapter on
suspension). All SI.
"""

from collections.abc import Callable
from dataclasses import dataclass
from math import pi
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike
from scipy.integrate import solve_ivp
from scipy.linalg import eigh

from optimiser.wanted.arrays import Floats
from optimiser.wanted.derive import Ride
from optimiser.wanted.frame import Frame
from optimiser.wanted.sag import weight_n
from optimiser.wanted.target import Target

Step = Literal["load", "road"]
WheelForce = Callable[[float], float]
"""Damper force at the wheel, N, of the speed at which body and wheel approach, m/s (signed)."""

_PERIODS = 8.0
_SAMPLES = 4001


@dataclass(frozen=True)
class QuarterVehicle:
    """The masses and rates of one corner."""

    sprung_kg: float
    unsprung_kg: float
    wheel_rate_n_m: float
    tyre_rate_n_m: float

    def frequencies_hz(self) -> tuple[float, float]:
        """Undamped natural frequencies of body and wheel, Hz: K q = w^2 M q."""
        k, tyre = self.wheel_rate_n_m, self.tyre_rate_n_m
        stiffness = np.array([[k, -k], [-k, k + tyre]])
        squares = eigh(stiffness, np.diag([self.sprung_kg, self.unsprung_kg]), eigvals_only=True)
        low, high = np.sqrt(squares) / (2.0 * pi)
        return float(low), float(high)

    def state_matrix(self, damping_n_s_m: float) -> Floats:
        """A (4, 4) of z' = A z with z = (x_s, x_u, x_s', x_u'), damping at the wheel in N s/m."""
        k, c, tyre = self.wheel_rate_n_m, damping_n_s_m, self.tyre_rate_n_m
        body, wheel = self.sprung_kg, self.unsprung_kg
        return np.array(
            [
                [0.0, 0.0, 1.0, 0.0],
                [0.0, 0.0, 0.0, 1.0],
                [-k / body, k / body, -c / body, c / body],
                [k / wheel, -(k + tyre) / wheel, c / wheel, -c / wheel],
            ]
        )

    def modes(self, damping_n_s_m: float) -> tuple["Mode", "Mode"]:
        """Body and wheel mode with a linear damper, N s/m at the wheel.

        From the eigenvalues s of the state matrix: frequency |s|/(2 pi), ratio -Re(s)/|s|. A mode
        damped beyond critical has two real eigenvalues: frequency and ratio of their pair,
        sqrt(s1 s2) and -(s1 + s2)/(2 sqrt(s1 s2)).
        """
        values = np.linalg.eigvals(self.state_matrix(damping_n_s_m))
        first, second = sorted(_modes_of(values), key=lambda mode: mode.hz)
        return first, second

    def transmissibility(self, frequency_hz: ArrayLike, damping_n_s_m: float) -> Floats:
        """|x_s / road| (n,) at frequencies (n,), Hz, with a linear damper, N s/m at the wheel."""
        s = 2j * pi * np.asarray(frequency_hz, dtype=np.float64)
        link = self.wheel_rate_n_m + damping_n_s_m * s
        body = self.sprung_kg * s**2 + link
        wheel = self.unsprung_kg * s**2 + link + self.tyre_rate_n_m
        return np.asarray(np.abs(link * self.tyre_rate_n_m / (body * wheel - link**2)))

    def step(self, damper: WheelForce, kind: Step = "load", size: float = 0.0) -> "StepResponse":
        """Response of the body to a step: a load on it (N, downwards) or a kerb (m, upwards).

        ``size`` 0 takes a tenth of the static weight or 20 mm. Integrated over eight undamped
        body periods by LSODA (``scipy.integrate.solve_ivp``) with a relative tolerance of 1e-8.
        """
        size = size or (0.1 * weight_n(self.sprung_kg) if kind == "load" else 0.02)
        load, road = (size, 0.0) if kind == "load" else (0.0, size)

        def rates(_time: float, state: Floats) -> list[float]:
            body, wheel, body_speed, wheel_speed = state
            link = -self.wheel_rate_n_m * (body - wheel) + damper(wheel_speed - body_speed)
            tyre = self.tyre_rate_n_m * (road - wheel)
            return [
                body_speed,
                wheel_speed,
                (link - load) / self.sprung_kg,
                (tyre - link) / self.unsprung_kg,
            ]

        end = _PERIODS / self.frequencies_hz()[0]
        time = np.linspace(0.0, end, _SAMPLES)
        solved = solve_ivp(
            rates, (0.0, end), np.zeros(4), "LSODA", time, rtol=1e-8, atol=1e-11, max_step=end / 200
        )
        final = road - load / self.wheel_rate_n_m - load / self.tyre_rate_n_m
        return StepResponse(time, np.asarray(solved.y[0]), np.asarray(solved.y[1]), final)


@dataclass(frozen=True)
class Mode:
    """One mode of vibration."""

    hz: float
    """Undamped frequency of the mode, Hz."""
    damping_ratio: float
    """1 is critical, more does not swing."""


@dataclass(frozen=True, eq=False)
class StepResponse:
    """Height of body and wheel after a step."""

    time_s: Floats
    body_m: Floats
    wheel_m: Floats
    final_m: float

    @property
    def overshoot_percent(self) -> float:
        """How far the body goes past its final place, % of the whole movement."""
        return 100.0 * max(float(np.max(self.body_m / self.final_m)) - 1.0, 0.0)

    def settled_s(self, within_percent: float = 5.0) -> float:
        """Time, s, after which the body stays within so much of the movement of its final place."""
        off = np.abs(self.body_m / self.final_m - 1.0) > 0.01 * within_percent
        return float(self.time_s[np.flatnonzero(off)[-1]]) if off.any() else 0.0


@dataclass(frozen=True)
class Corner:
    """The sanity table: a corner with a pair of damper curves."""

    wheel_speed_m_s: float
    """Amplitude of the swing the damping is taken at, m/s at the wheel."""
    damping_n_s_m: float
    """Equal-energy viscous damping there, N s/m at the wheel."""
    body: Mode
    wheel: Mode
    load_overshoot_percent: float
    road_overshoot_percent: float
    settled_s: float


def quarter_vehicle(ride: Ride, frame: Frame) -> QuarterVehicle:
    """The corner of a rider on a frame, at sag."""
    return QuarterVehicle(
        ride.sprung_kg, frame.unsprung_kg, 1e3 * ride.wheel_rate_n_mm, 1e3 * frame.tyre_n_mm
    )


def wheel_damper(compression: Target, rebound: Target, leverage: float) -> WheelForce:
    """Damper force at the wheel from two shaft curves and the leverage ratio at sag.

    Straight lines through 0 and the points, the last one carried on; F_w = F_s / LR at
    v_w = LR v_s. Positive for compression speeds, negative for rebound.
    """
    sides = [_wheel_line(curve, leverage) for curve in (compression, rebound)]

    def force(speed: float) -> float:
        speeds, forces, slope = sides[0] if speed >= 0.0 else sides[1]
        size = abs(speed)
        beyond = slope * max(size - speeds[-1], 0.0)
        value = float(np.interp(size, speeds, forces)) + float(beyond)
        return value if speed >= 0.0 else -value

    return force


def equal_energy_damping(damper: WheelForce, amplitude_m_s: float) -> float:
    """Viscous damping, N s/m, that takes the same energy a cycle out of a harmonic swing.

    c = (1/(pi V)) * integral over one cycle of F(V cos a) cos a da (equivalent viscous damping;
    e.g. Thomson, *Theory of Vibration with Applications*); midpoint rule, 256 angles.
    """
    angle = (np.arange(256) + 0.5) * (2.0 * pi / 256)
    force = np.array([damper(float(v)) for v in amplitude_m_s * np.cos(angle)])
    return float(2.0 * np.mean(force * np.cos(angle)) / amplitude_m_s)


def corner(vehicle: QuarterVehicle, damper: WheelForce, amplitude_m_s: float = 0.3) -> Corner:
    """What a damper does on a corner: modes at one swing speed, overshoots after steps."""
    damping = equal_energy_damping(damper, amplitude_m_s)
    body, wheel = vehicle.modes(damping)
    load, road = vehicle.step(damper, "load"), vehicle.step(damper, "road")
    return Corner(
        amplitude_m_s,
        damping,
        body,
        wheel,
        load.overshoot_percent,
        road.overshoot_percent,
        load.settled_s(),
    )


def _wheel_line(curve: Target, leverage: float) -> tuple[Floats, Floats, float]:
    speeds = np.concatenate([[0.0], curve.velocity_m_s * leverage])
    forces = np.concatenate([[0.0], curve.force_n / leverage])
    return speeds, forces, float((forces[-1] - forces[-2]) / (speeds[-1] - speeds[-2]))


def _modes_of(values: ArrayLike) -> list[Mode]:
    roots = np.asarray(values, dtype=np.complex128)
    swinging = roots[roots.imag > 1e-9 * np.abs(roots)]
    modes = [Mode(float(abs(s) / (2.0 * pi)), float(-s.real / abs(s))) for s in swinging]
    still = np.sort(np.abs(roots[np.abs(roots.imag) <= 1e-9 * np.abs(roots)]))
    for slow, fast in zip(still[0::2], still[1::2], strict=True):
        middle = float(np.sqrt(slow * fast))
        modes.append(Mode(middle / (2.0 * pi), float(0.5 * (slow + fast) / middle)))
    return modes
