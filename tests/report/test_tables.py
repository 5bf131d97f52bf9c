"""The tables of a prediction: what they say, and that they never need more than 80 columns."""

from dataclasses import replace
from io import StringIO

import numpy as np
import pytest
from rich.measure import Measurement
from rich.table import Table

from optimiser.damper import Direction
from optimiser.files import read_damper, read_oil, read_steel
from optimiser.fitting.bands import Bands
from optimiser.prediction import Prediction, Setup, predict
from optimiser.report.band import bands_tables
from optimiser.report.look import Look, look_of
from optimiser.report.tables import compare_tables, force_table, force_text, stack_table

VELOCITY = (0.125, 0.5, 2.125)


@pytest.fixture(scope="module")
def seen() -> Prediction:
    """The bundled rear damper in compression, as fitted."""
    return _fitted("rear-monotube", "compression")


def _fitted(name: str, direction: Direction) -> Prediction:
    damper = read_damper(name)
    steel, oil = read_steel(damper.steel), read_oil(damper.oil)
    setup = Setup(damper, direction, steel, oil, damper.oil_temp_c)
    assert setup.valve.fitted is not None
    return predict(setup, setup.valve.fitted, VELOCITY)


def _look(unicode: bool = True) -> Look:
    return Look(look_of(StringIO()).console, unicode)


def _natural_width(table: Table) -> int:
    console = _look().console
    return Measurement.get(console, console.options.update(width=300), table).maximum


def _printed(table: Table, look: Look) -> list[str]:
    with look.console.capture() as capture:
        look.console.print(table)
    return capture.get().splitlines()


def test_force_table_needs_at_most_80_columns_whatever_the_numbers(seen: Prediction) -> None:
    huge = replace(
        seen,
        force_n=seen.force_n * 30.0,
        force_closed_n=seen.force_closed_n * 30.0,
        force_open_n=seen.force_open_n * 30.0,
        pressure_mpa=seen.pressure_mpa * 50.0,
        cavitation_m_s=0.01,
        rise_thicknesses=seen.rise_thicknesses + 5.0,
    )
    assert huge.force_n.max() > 50e3
    assert _natural_width(force_table(huge, _look())) <= 80
    assert _natural_width(stack_table(huge, _look())) <= 80
    for table in compare_tables([huge] * 9, list("ABCDEFGHI"), _look()):
        assert _natural_width(table) <= 80
    wide = _band(huge)
    assert _natural_width(force_table(huge, _look(), wide)) <= 80
    calm = replace(huge, cavitation_m_s=None, rise_thicknesses=0.0 * huge.rise_thicknesses)
    assert _natural_width(force_table(calm, _look(), wide)) <= 80
    for table in bands_tables([huge] * 9, [wide] * 9, list("ABCDEFGHI"), _look()):
        assert _natural_width(table) <= 80


def _band(seen: Prediction) -> Bands:
    """A band of 10 % to either side."""
    force = seen.force_n
    return Bands(seen.velocity_m_s, 0.9 * force, force, 1.1 * force, force, force[None], 0)


def test_bands_stand_beside_the_force(seen: Prediction) -> None:
    rows = _printed(force_table(seen, _look(), _band(seen)), _look())[3:]
    force = seen.force_n[1]
    assert rows[1].split()[1:4] == [force_text(f) for f in (force, 0.9 * force, 1.1 * force)]
    (table,) = bands_tables([seen, seen], [_band(seen), None], ["A", "B"], _look())
    row = _printed(table, _look())[4]
    assert row.split()[1:] == [
        force_text(0.9 * force),
        "to",
        force_text(1.1 * force),
        "-",
        "to",
        "-",
    ]


def test_force_table_shows_the_prediction(seen: Prediction) -> None:
    rows = _printed(force_table(seen, _look()), _look())[3:]
    assert len(rows) == len(VELOCITY)
    cells = rows[1].split()
    assert cells[0] == "0.5"
    assert float(cells[1]) == pytest.approx(seen.force_n[1], abs=0.5)
    assert float(cells[2]) == pytest.approx(seen.force_closed_n[1], abs=0.5)
    assert float(cells[3]) == pytest.approx(seen.force_open_n[1], abs=0.5)
    assert float(cells[4]) == pytest.approx(seen.pressure_mpa[1], abs=5e-4)
    assert float(cells[5]) == pytest.approx(seen.lift_mm[1], abs=5e-4)
    assert float(cells[6]) == pytest.approx(100.0 * seen.bleed_share[1], abs=0.5)


def test_click_range_is_left_out_without_an_adjuster() -> None:
    fixed = _fitted("digressive-monotube", "rebound")
    head = _printed(force_table(fixed, _look()), _look())[0].split()
    assert head[:4] == ["velocity", "force", "pressure", "lift"]


def test_rows_beyond_the_model_and_the_oil_are_marked(seen: Prediction) -> None:
    marked = replace(
        seen, rise_thicknesses=np.array([0.5, 2.5, 3.0]), cavitation_m_s=2.0, warnings=()
    )
    rows = _printed(force_table(marked, _look()), _look())[3:]
    assert "outside" not in rows[0]
    assert rows[1].rstrip().endswith("outside")
    assert rows[2].rstrip().endswith("outside, cavitates")


def test_stack_table_shows_the_worst_of_a_group(seen: Prediction) -> None:
    shims = list(seen.shims)
    shims[1] = replace(shims[1], peak_stress_mpa=1234.0, utilisation=1.61, at_clamp=False)
    shims[1] = replace(shims[1], peak_at_mm=24.5)
    rows = _printed(stack_table(replace(seen, shims=tuple(shims)), _look(False)), _look(False))
    face = next(row for row in rows if "2 x 40 x 0.25" in row)
    assert face.split()[-3:] == ["1234", "24.5", "1.61!"]
    assert rows[-1].split()[-1] == "clamp"
    assert "".join(rows).isascii()


def test_comparison_is_relative_to_the_first(seen: Prediction) -> None:
    firmer = replace(seen, force_n=seen.force_n * 1.25)
    locked = replace(seen, force_n=np.array([np.inf, *seen.force_n[1:]]))
    (table,) = compare_tables([seen, firmer, locked], ["A", "B", "C"], _look())
    rows = _printed(table, _look())[3:]
    assert rows[0].split()[3:] == ["+25.0", "locked", "-"]
    assert rows[1].split()[-1] == "+0.0"


def test_forces_have_the_digits_that_mean_something() -> None:
    assert [force_text(f) for f in (9.87, 99.94, 1234.5, np.inf)] == [
        "9.9",
        "99.9",
        "1234",
        "locked",
    ]
