"""Riders, frames and feels to test with, and hypothesis strategies for them."""

from typing import Any

from hypothesis import strategies as st

from optimiser.wanted.feel import Feel, StrokeFeel
from optimiser.wanted.frame import Frame, LeveragePoints
from optimiser.wanted.rider import Rider


def frame(**changes: Any) -> Frame:
    """A frame with 240 mm of travel and rising-rate leverage; keys can be changed."""
    keys: dict[str, Any] = {
        "name": "bench frame",
        "wheel_travel_mm": 240.0,
        "leverage": {"travel_mm": [0, 60, 120, 180, 240], "ratio": [2.9, 2.8, 2.6, 2.45, 2.35]},
        "share_of_mass": 0.55,
        "sprung_kg": 80.0,
        "unsprung_kg": 14.0,
        "tyre_n_mm": 120.0,
        "spring": {"kind": "coil", "preload_mm": 6.0},
    }
    return Frame.model_validate({**keys, **changes})


def constant_lever(ratio: float, travel_mm: float = 200.0, **changes: Any) -> Frame:
    """A frame with one leverage ratio over its whole travel."""
    leverage = {"travel_mm": [0.0, travel_mm], "ratio": [ratio, ratio]}
    return frame(**{"wheel_travel_mm": travel_mm, "leverage": leverage, **changes})


def rider(mass_kg: float = 82.0) -> Rider:
    """A rider of a mass, kg."""
    return Rider(mass_kg=mass_kg)


def stroke_feel(**changes: Any) -> StrokeFeel:
    """One direction of a feel; keys can be changed."""
    keys: dict[str, Any] = {
        "low_damping_ratio": 0.22,
        "high_damping_ratio": 0.07,
        "knee_wheel_m_s": 0.6,
        "progressive": 0.1,
        "fastest_wheel_m_s": 4.0,
    }
    return StrokeFeel.model_validate({**keys, **changes})


def feel() -> Feel:
    """A feel that keeps the rebound rule."""
    back = stroke_feel(low_damping_ratio=0.36, high_damping_ratio=0.3, fastest_wheel_m_s=2.0)
    return Feel(name="bench feel", compression=stroke_feel(), rebound=back)


ratios = st.floats(0.02, 2.0)
stroke_feels = st.builds(
    StrokeFeel,
    low_damping_ratio=ratios,
    high_damping_ratio=ratios,
    knee_wheel_m_s=st.floats(0.02, 6.0),
    progressive=st.floats(0.0, 1.0),
    slowest_wheel_m_s=st.floats(0.02, 0.5),
    fastest_wheel_m_s=st.floats(1.0, 12.0),
)
riders = st.builds(Rider, mass_kg=st.floats(20.0, 250.0))


@st.composite
def frames(draw: st.DrawFn) -> Frame:
    """Frames with a coil and a leverage that bends either way by up to 15 % between points."""
    count = draw(st.integers(2, 7))
    travel = draw(st.floats(80.0, 320.0))
    ratio = [draw(st.floats(1.0, 3.5))]
    for _ in range(count - 1):
        ratio.append(ratio[-1] * draw(st.floats(0.85, 1.02)))
    points = LeveragePoints(
        travel_mm=tuple(travel * i / (count - 1) for i in range(count)), ratio=tuple(ratio)
    )
    return frame(
        wheel_travel_mm=travel,
        leverage=points.model_dump(),
        share_of_mass=draw(st.floats(0.3, 1.0)),
        sag_of=draw(st.sampled_from(["wheel_travel", "shaft_stroke"])),
        spring={"kind": "coil", "preload_mm": draw(st.floats(0.0, 20.0))},
    )
