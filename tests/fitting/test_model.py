"""The fast model of the fit against the full prediction."""

from dataclasses import replace

import numpy as np
import pytest

from optimiser.damper import Direction
from optimiser.fitting.lifts import HEIGHT_STEP_MM, LiftStore
from optimiser.fitting.model import Model, sensitivity
from optimiser.fitting.parameters import KEYS, parameter, value_of, with_number, with_values
from optimiser.hydraulics.lift import lift_at
from optimiser.prediction import Setup
from tests.fitting.invented import FAST, four_free, parts, prepared, run_of

KINDS: list[tuple[str, Direction]] = [
    ("rear-monotube", "compression"),
    ("rear-monotube", "rebound"),
    ("digressive-monotube", "compression"),
    ("fork-cartridge", "compression"),
    ("solid-piston", "rebound"),
]


@pytest.mark.parametrize(("name", "direction"), KINDS)
def test_force_is_that_of_the_prediction(name: str, direction: Direction) -> None:
    """Other valves, friction and gas included; the tables reach further here, hence 0.4 %."""
    damper, steel, oil = parts(name)
    changed = with_values(damper, {("seat.discharge", direction): 0.7, ("friction_n", None): 9.0})
    run = run_of(changed, clicks=0, direction=direction, gas_n=100.0, velocity=FAST * 0.5)
    items = [parameter(damper, key, direction) for key in ("seat.discharge", "friction_n")]
    model = Model(damper, steel, oil, tuple(items), "reported", 100.0)
    force = model.force_n(model.prepare(run), np.array([0.7, 9.0]))
    assert force == pytest.approx(run.force_n, rel=4e-3, abs=0.5)


@pytest.mark.parametrize("share", [0.0, 0.3, 0.5])
def test_tables_between_two_heights(share: float) -> None:
    """Half-way between two computed heights the lift is that of a table of its own."""
    damper, steel, oil = parts("digressive-monotube")
    setup = Setup(damper, "compression", steel, oil, 40.0)
    height = 0.15 + share * HEIGHT_STEP_MM
    valve = with_number(setup.valve, "seat.height_mm", height)
    fitted = setup.valve.fitted
    assert fitted is not None
    free = LiftStore().table(setup, valve, fitted, 3e6, True)
    own = LiftStore().table(setup, valve, fitted, 3e6, False)
    pressures = np.linspace(0.3e6, 2.9e6, 25)
    wanted = lift_at(own.pressure_pa, own.lift_m, pressures)
    assert free.pressure_pa[0] == pytest.approx(own.pressure_pa[0], rel=2e-3)
    assert lift_at(free.pressure_pa, free.lift_m, pressures) == pytest.approx(
        wanted, rel=3e-3, abs=2e-7
    )


def test_the_loaded_share_scales_pressures_only() -> None:
    damper, steel, oil = parts()
    setup = Setup(damper, "compression", steel, oil, 40.0)
    fitted = setup.valve.fitted
    assert fitted is not None
    tables = [
        LiftStore().table(
            setup,
            with_number(setup.valve, "ports.loaded_fraction", loaded),
            fitted,
            2e6,
            False,
        )
        for loaded in (1.0, 0.8)
    ]
    assert tables[1].pressure_pa == pytest.approx(tables[0].pressure_pa / 0.8)
    assert np.array_equal(tables[1].lift_m, tables[0].lift_m)


def test_tables_are_computed_once() -> None:
    model, seen, values = prepared()
    count = len(model.store.tables)
    model.force_n(seen[0], values * 1.1)
    sensitivity(model, seen[0], values)
    assert len(model.store.tables) == count


def test_sensitivity_is_the_slope() -> None:
    model, seen, values = prepared()
    slopes = sensitivity(model, seen[0], values)
    for place, item in enumerate(model.parameters):
        moved = values.copy()
        moved[place] += 0.02 * item.scale
        change = model.force_n(seen[0], moved) - model.force_n(seen[0], values)
        assert change / (0.02 * item.scale) == pytest.approx(slopes[:, place], rel=0.02, abs=0.05)


def test_without_a_stack_only_ports_and_bleed_are_left() -> None:
    model, seen, values = prepared()
    bare = model.force_n(model.prepare(seen[0].run, stackless=True), values)
    assert np.all(bare < model.force_n(seen[0], values))
    softer = values.copy()
    softer[0] = 0.9  # the gap's discharge, which is not there
    assert model.force_n(model.prepare(seen[0].run, stackless=True), softer) == pytest.approx(
        bare, rel=1e-5
    )


@pytest.mark.parametrize("key", [key for key in KEYS if key != "gas_offset_n"])
def test_every_number_can_be_set_and_read(key: str) -> None:
    damper, _, _ = parts()
    item = parameter(damper, key, "compression")
    goal = 0.5 * (item.start + min(item.high, item.start + item.scale)) + 1e-3
    changed = with_values(damper, {(key, item.direction): goal})
    assert value_of(changed, key, "compression") == goal
    assert value_of(damper, key, "compression") == item.start


def test_gas_becomes_pressure_where_the_curve_shows_it() -> None:
    damper, _, _ = parts()
    shown = damper.model_copy(update={"gas_in_force": True})
    changed = with_values(shown, {("gas_offset_n", None): 200.0})
    assert value_of(changed, "gas_offset_n", None) == pytest.approx(200.0)
    assert with_values(damper, {("gas_offset_n", None): 200.0}) == damper


def test_a_valve_without_needle_has_no_offset() -> None:
    damper, _, _ = parts("digressive-monotube")
    with pytest.raises(KeyError):
        parameter(damper, "bleed.needle.offset_mm", "compression")


def test_starts_stay_inside_the_limits() -> None:
    damper, _, _ = parts()
    item = four_free(damper)[0]
    assert item.starting_at(7.0).start == item.high
    assert replace(item, start=0.3).name == "compression.seat.discharge"
