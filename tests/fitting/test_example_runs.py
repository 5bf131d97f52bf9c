"""The example runs are what their generator makes, and fitting them finds what was put in."""

from itertools import zip_longest

import numpy as np
import pytest

from optimiser.dyno_files import find_fit_request, read_fit_request, read_runs
from optimiser.files import read_damper, read_oil, read_steel
from optimiser.fitting.calibrate import Calibration, calibrate
from optimiser.prediction import Setup, predict
from tests.fitting.example_runs import FOLDER, TRUTH, as_cut, example_texts, true_damper
from tests.fitting.invented import SOFT


def test_the_files_are_the_generators() -> None:
    """Within 0.5 % or the last digit; else run ``python -m tests.fitting.example_runs``."""
    texts = example_texts()
    assert sorted(texts) == sorted(path.stem for path in FOLDER.glob("*.csv"))
    for name, text in texts.items():
        shipped = (FOLDER / f"{name}.csv").read_text(encoding="utf-8").splitlines()
        for ours, theirs in zip_longest(text.splitlines(), shipped, fillvalue=""):
            if ours[:1].isdigit():
                numbers = [[float(cell) for cell in line.split(",")] for line in (ours, theirs)]
                assert numbers[0] == pytest.approx(numbers[1], rel=5e-3, abs=1.0), name
            else:
                assert ours == theirs


@pytest.fixture(scope="module")
def example() -> Calibration:
    path = find_fit_request("rear-monotube")
    request = read_fit_request(path)
    damper = read_damper(request.damper)
    runs = read_runs(path, request, damper).runs
    return calibrate(damper, read_steel(damper.steel), read_oil(damper.oil), runs)


def test_the_fit_comes_near_what_was_put_in(example: Calibration) -> None:
    """Within 6 %, for thicknesses, oil and load cell are off on purpose; bleed and friction, which
    share the slow points, within 15 % and 6 N."""
    for item, value in zip(example.found.parameters, example.found.values, strict=True):
        if item.key.endswith("discharge"):
            assert value == pytest.approx(TRUTH[item.key, item.direction], rel=0.06)
        elif item.key == "bleed.area_mm2":
            assert value == pytest.approx(1.1, rel=0.15)
        elif item.key == "friction_n":
            assert value == pytest.approx(31.0, abs=6.0)


def test_a_stack_never_measured_is_predicted_better_than_before(example: Calibration) -> None:
    speeds = np.array([0.03, 0.1, 0.3, 0.6, 1.2])
    steel, oil = read_steel("carbon-strip"), read_oil("light")
    real = predict(Setup(true_damper(), "compression", steel, oil, 40.0), as_cut(SOFT), speeds)
    errors = []
    for damper in (example.original, example.damper):
        force = predict(Setup(damper, "compression", steel, oil, 40.0), SOFT, speeds).force_n
        errors.append(float(np.sqrt(np.mean((force / real.force_n - 1.0) ** 2))))
    assert errors[1] < 0.035
    assert errors[1] < 0.6 * errors[0]
