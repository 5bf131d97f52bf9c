"""A real, noisy time series of a small damper on a shaking table.

A. N. Vargas, Labcontrol, UTFPR: open data set, doi 10.5281/zenodo.4445334, files ``ensaio.A.1`` and
``ensaio.B.1`` (MIT licence). It is no shim damper: only the reading of a test is checked, not the
valve model. The reference fit F = f0 tanh(v/v0) + c v + F0 and the means in bands of +-3 mm/s were
computed from the files with a central difference, a 5-point mean and 100 samples cut at each end.
"""

from pathlib import Path
from typing import NamedTuple

import numpy as np
import pytest
from scipy.optimize import curve_fit

from optimiser.dyno_files import read_strokes
from optimiser.fitting.binning import band_means
from optimiser.fitting.request import RunRequest
from optimiser.fitting.series import Motion, motion_of
from optimiser.hydraulics.lift import Floats

FOLDER = Path(__file__).resolve().parents[3] / "shared" / "data" / "mr-damper"
pytestmark = pytest.mark.skipif(
    not FOLDER.is_dir(), reason="the measured files are not beside this checkout"
)
CUT = 100


class Reference(NamedTuple):
    f0_n: float
    v0_mm_s: float
    c_n_s_mm: float
    offset_n: float
    rmse_n: float
    line_rmse_n: float


REFERENCES = {
    "A": Reference(602.62, 10.102, 4.9326, 103.11, 116.52, 209.68),
    "B": Reference(410.52, 7.835, 2.3641, 120.54, 78.75, 163.95),
}
#: Middle of the band mm/s and mean force N, file A.
MEANS = {
    -55: -766.1,
    -40: -700.4,
    -25: -615.2,
    -10: -344.4,
    -3: -94.2,
    3: 290.1,
    10: 568.2,
    25: 839.0,
    40: 906.6,
    55: 942.1,
}


def columns(letter: str) -> Floats:
    return np.loadtxt(FOLDER / f"ensaio_{letter}_1.csv", delimiter=",", skiprows=1).T


def motion(letter: str) -> Motion:
    time, travel, _, force = columns(letter)
    return motion_of(time, travel, force)


def shape(v: Floats, f0: float, v0: float, c: float, offset: float) -> Floats:
    return np.asarray(f0 * np.tanh(v / v0) + c * v + offset)


def fitted(v: Floats, force: Floats) -> Reference:
    values, _ = curve_fit(shape, v, force, p0=[500.0, 10.0, 4.0, 100.0])
    rmse = float(np.sqrt(np.mean((force - shape(v, *values)) ** 2)))
    line = force - np.polyval(np.polyfit(v, force, 1), v)
    return Reference(*(float(x) for x in values), rmse, float(np.sqrt(np.mean(line**2))))


@pytest.mark.parametrize("letter", REFERENCES)
def test_the_reference_is_that_of_its_own_recipe(letter: str) -> None:
    """Reference fit, by the recipe it was made with: to the printed digits."""
    time, travel, _, force = columns(letter)
    v = np.convolve(np.gradient(travel, time), np.ones(5) / 5, "same")[CUT:-CUT]
    assert fitted(v, force[CUT:-CUT]) == pytest.approx(REFERENCES[letter], rel=1.5e-4)


@pytest.mark.parametrize("letter", REFERENCES)
def test_our_velocity_gives_the_reference_fit(letter: str) -> None:
    """Reference fit by our differentiation, its window chosen by itself: within 0.3 %, as the
    parabolas of the smoothing weigh the neighbours a little differently from the 5-point mean."""
    seen = motion(letter)
    inside = (seen.time_s >= 0.995) & (seen.time_s < 13.995)
    v, force = seen.velocity_m_s[inside] * 1e3, seen.force_n[inside]
    assert fitted(v, force) == pytest.approx(REFERENCES[letter], rel=3e-3)


def test_the_window_is_about_a_twentieth_of_a_cycle() -> None:
    assert motion("A").window_s == pytest.approx(0.07)


@pytest.mark.parametrize(("middle", "mean"), MEANS.items())
def test_means_in_bands_by_the_recipe(middle: int, mean: float) -> None:
    """Binned means of A.1: to 0.1 N, but 0.35 N at -3 where one sample lies on the band's end."""
    time, travel, _, force = columns("A")
    v = np.convolve(np.gradient(travel, time), np.ones(5) / 5, "same")[CUT:-CUT]
    ends = np.array([middle - 3.0]), np.array([middle + 3.0])
    found = band_means(v, force[CUT:-CUT], np.ones_like(v), *ends)
    assert found.force[0] == pytest.approx(mean, abs=0.35 if middle == -3 else 0.1)


@pytest.mark.parametrize(("middle", "mean"), MEANS.items())
def test_means_in_bands_by_our_velocity(middle: int, mean: float) -> None:
    """Binned means of A.1: within 1.5 % or, where the force is steep, 10 N: a few of some forty
    samples change bands."""
    seen = motion("A")
    inside = (seen.time_s >= 0.995) & (seen.time_s < 13.995)
    v = seen.velocity_m_s[inside] * 1e3
    ends = np.array([middle - 3.0]), np.array([middle + 3.0])
    found = band_means(v, seen.force_n[inside], seen.speed_gain[inside], *ends)
    assert found.force[0] == pytest.approx(mean, rel=0.015, abs=10.0)


@pytest.mark.parametrize("letter", REFERENCES)
def test_the_file_read_as_a_dyno_run(letter: str) -> None:
    """Signs, steady force and loop of the real file. F0 of the fit (103.11 and 120.54 N) is the
    steady force of strokes that are mirror images, which these are not: half their difference falls
    towards rest, so that the steady force there is a third to the whole of F0."""
    wanted = RunRequest.model_validate(
        {
            "file": "x",
            "circuit": "both",
            "oil_temp_c": 20.0,
            "columns": {"time": "t_s", "displacement": "disp_mm", "force": "force_n_as_recorded"},
            "units": {"force": "N"},
        }
    )
    found = read_strokes(FOLDER / f"ensaio_{letter}_1.csv", wanted)
    assert found.gas_n is not None
    assert 0.33 < found.gas_n / REFERENCES[letter].offset_n < 1.0
    assert found.friction_n is not None
    assert found.friction_n > 50.0
    assert any("positive velocity is read as compression" in note for note in found.notes)
    for curve in found.curves.values():
        assert np.isfinite(curve.hysteresis_n).sum() > 10
        assert np.ptp(curve.force_n) > 200.0
