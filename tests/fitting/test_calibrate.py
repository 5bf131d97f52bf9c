"""The whole calibration: what is free, what is held, doubts, units, the error left out."""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from optimiser.faults import BadInput
from optimiser.fitting.calibrate import Calibration, calibrate
from optimiser.fitting.parameters import with_values
from optimiser.fitting.runs import Run
from optimiser.stack import Stack
from tests.fitting.invented import SOFT, TRUTH, noisy, parts, run_of, three_runs

REBOUND = {("seat.discharge", "rebound"): 0.66, ("bleed.area_mm2", "rebound"): 0.9}


def fitted(
    runs: list[Run],
    free: list[str] | None = None,
    steady_n: float | None = None,
    leave_out: bool = True,
) -> Calibration:
    damper, steel, oil = parts()
    return calibrate(damper, steel, oil, runs, free, steady_n, leave_out=leave_out)


@pytest.fixture(scope="module")
def both() -> Calibration:
    """Three compression and two rebound runs with 1 % noise and 250 N of gas."""
    truth = with_values(parts()[0], {**TRUTH, **REBOUND})
    random = np.random.default_rng(4)
    runs = [
        run_of(truth, gas_n=250.0),
        run_of(truth, clicks=0, gas_n=250.0),
        run_of(truth, SOFT, gas_n=250.0, label="soft"),
        run_of(truth, direction="rebound", gas_n=250.0),
        run_of(truth, direction="rebound", clicks=2, gas_n=250.0),
    ]
    return fitted([noisy(run, random, 0.01, 1.0) for run in runs])


def test_both_strokes_part_friction_and_gas(both: Calibration) -> None:
    assert both.damper.friction_n == pytest.approx(30.0, abs=3.0)
    assert both.steady_n == pytest.approx(250.0, abs=3.0)
    assert both.held == ()
    seat = both.damper.circuit("compression").searched.seat
    assert seat is not None
    assert seat.discharge == pytest.approx(0.68, abs=0.03)


def test_the_fit_is_better_than_the_file_was(both: Calibration) -> None:
    for run in both.runs:
        assert run.fitted_percent < run.before_percent
        assert run.left_out_percent is not None
        assert run.left_out_percent < 3.0
    assert both.new_stack_percent == both.runs[2].left_out_percent
    assert both.left_out_percent is not None
    assert both.left_out_percent > 0.8 * both.scatter_percent


def test_the_original_is_untouched(both: Calibration) -> None:
    assert both.original == parts()[0]


def test_one_stroke_cannot_part_friction_and_gas() -> None:
    """The usual numbers are then held, and the run that would help is named."""
    truth = with_values(parts()[0], TRUTH)
    result = fitted([noisy(run, np.random.default_rng(2)) for run in three_runs(truth)])
    held = result.held[0]
    assert held.names == ("gas_offset_n",)
    assert "the friction and the gas force cannot be told apart" in held.sentence
    assert held.extra_run == "a rebound run of the fitted stack"
    assert held.after < 0.1 * held.before
    assert result.steady_n == 0.0


def test_fixed_bleed_and_needle_offset_at_one_click() -> None:
    """At one setting only their sum of areas counts: an exact confusion, whatever the noise."""
    truth = with_values(parts()[0], TRUTH)
    runs = [noisy(run_of(truth), np.random.default_rng(3), 0.005, 0.5)]
    free = ["compression.bleed.area_mm2", "compression.bleed.needle.offset_mm"]
    result = fitted(runs, free=free, steady_n=0.0)
    assert len(result.doubts) == 1
    assert set(result.doubts[0].names) == set(free)
    assert "compression run of the same stack with the adjuster" in result.doubts[0].extra_run
    assert abs(result.found.correlation[0, 1]) > 0.99


def test_ports_that_slow_runs_do_not_show() -> None:
    truth = with_values(parts()[0], TRUTH)
    slow = run_of(truth, velocity=np.geomspace(0.01, 0.08, 14))
    result = fitted(
        [noisy(slow, np.random.default_rng(5), 0.01, 0.5)],
        free=["seat.discharge", "ports.discharge"],
        steady_n=0.0,
    )
    assert any("port discharge" in doubt.sentence for doubt in result.doubts)
    helpful = [d.extra_run for d in result.doubts if "port discharge" in d.sentence]
    assert "no stack" in helpful[0] or "up to" in helpful[0]


def test_a_known_gas_force_is_not_fitted() -> None:
    truth = with_values(parts()[0], TRUTH)
    runs = [run_of(truth, gas_n=250.0), run_of(truth, SOFT, gas_n=250.0)]
    result = fitted(runs, steady_n=250.0)
    assert "gas_offset_n" not in [item.name for item in result.found.parameters]
    assert result.damper.friction_n == pytest.approx(30.0, abs=1.0)


def test_one_run_cannot_be_left_out() -> None:
    truth = with_values(parts()[0], TRUTH)
    result = fitted([run_of(truth)], steady_n=0.0)
    assert result.left_out_percent is None
    assert result.new_stack_percent is None


def scaled(run: Run, factor: float) -> Run:
    return replace(run, force_n=run.force_n * factor)


@pytest.mark.parametrize(
    ("factor", "asked"), [(1.0 / 4.448, "lbf"), (1e-3, "kN"), (9.0, "velocity in another unit")]
)
def test_wrong_force_units_are_questioned(factor: float, asked: str) -> None:
    run = run_of(parts()[0])
    with pytest.raises(BadInput, match=asked):
        fitted([scaled(run, factor)], steady_n=0.0)


def test_units_that_are_right_after_all() -> None:
    run = replace(scaled(run_of(parts()[0]), 0.3), trusted=True)
    result = fitted([run], steady_n=0.0, free=["seat.discharge"])
    assert result.found.at_limit == [True]
    assert "ended at a limit" in result.notes[0]


@pytest.mark.parametrize(
    ("change", "text"),
    [
        ({"stack": Stack.parse(["2 x 30 x 0.20", "1 x 20 x 0.30"])}, "does not cover the seat"),
        ({"stack": Stack.parse(["2 x 40 x 0.20", "6 x 30 x 0.30"])}, "reaches over the ports"),
        ({"clicks": 40}, "clicks 40; allowed: 0 .closed. to 22"),
        ({"force_n": np.full(18, 5.0)}, "force is the same"),
        ({"velocity_m_s": np.full(18, 0.3)}, "velocity is the same"),
        ({"velocity_m_s": np.array([0.1]), "force_n": np.array([5.0])}, "holds 1 points"),
    ],
)
def test_runs_that_do_not_fit(change: dict[str, Any], text: str) -> None:
    run = replace(run_of(parts()[0]), **change)
    with pytest.raises(BadInput, match=text):
        fitted([run])


def test_free_names_are_checked_together() -> None:
    with pytest.raises(BadInput) as raised:
        fitted(
            [run_of(parts()[0])],
            free=["seat.dischrage", "rebound.seat.discharge", "gas_offset_n"],
            steady_n=0.0,
        )
    assert len(raised.value.faults) == 3


def test_the_same_input_gives_the_same_result(both: Calibration) -> None:
    again = fitted(list(both.measured), leave_out=False)
    assert np.array_equal(again.found.values, both.found.values)
