"""What bands are drawn from: the record of a fit as far as it goes, else usual errors."""

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.files import read_damper, read_oil, read_steel
from optimiser.fit_records import record_beside, record_of, spread_of
from optimiser.fitting.parameters import with_values
from optimiser.fitting.uncertainty import usual_uncertainty
from optimiser.prediction import Setup

NAMES = ["compression.seat.discharge", "friction_n"]


def setup_of(direction: Direction = "compression", name: str = "rear-monotube") -> Setup:
    damper = read_damper(name)
    return Setup(damper, direction, read_steel(damper.steel), read_oil(damper.oil), 40.0)


def written(folder: Path, **changes: Any) -> Path:
    """A record that says the bundled damper is as it is."""
    document = {
        "parameters": [
            {"name": "compression.seat.discharge", "value": 0.61},
            {"name": "friction_n", "value": 18.0},
            {"name": "gas_offset_n", "value": 300.0},
        ],
        "uncertainty": {"names": NAMES, "covariance": [[1e-4, 0], [0, 4]], "model_percent": 2.0},
    }
    path = folder / "rear.fit.json"
    path.write_text(json.dumps(document | changes), encoding="utf-8")
    return path


def test_a_record_lies_beside_its_damper(tmp_path: Path) -> None:
    damper = tmp_path / "rear.toml"
    damper.write_text("", encoding="utf-8")
    assert record_of(damper) == tmp_path / "rear.fit.json"
    assert record_beside(str(damper)) is None
    assert record_beside(str(written(tmp_path).with_name("rear.toml"))) == record_of(damper)
    assert record_beside("rear-monotube") is None


def test_the_record_is_used_where_there_is_one(tmp_path: Path) -> None:
    spread = spread_of(setup_of(), written(tmp_path), 500, 7)
    assert spread.known.names == tuple(NAMES)
    assert spread.known.model_percent == 2.0
    assert (spread.samples, spread.seed) == (500, 7)
    assert spread.origin == "the errors in rear.fit.json"
    assert spread.sentence.endswith("500 samples (seed 7), from the errors in rear.fit.json")


def test_usual_errors_without_a_record_or_a_run_in_the_direction(tmp_path: Path) -> None:
    """A fit of compression alone says nothing of rebound: its errors are not taken for small."""
    bare = spread_of(setup_of("rebound"), None)
    other = spread_of(setup_of("rebound"), written(tmp_path))
    usual = usual_uncertainty(setup_of("rebound"))
    for spread in (bare, other):
        assert spread.known.names == usual.names
        assert np.array_equal(spread.known.covariance, usual.covariance)
    assert "not fitted" in bare.origin
    assert "rear.fit.json has no run in rebound" in other.origin


def test_numbers_changed_since_the_fit_are_said(tmp_path: Path) -> None:
    setup = setup_of()
    changed = with_values(setup.damper, {("seat.discharge", "compression"): 0.62})
    spread = spread_of(replace(setup, damper=changed), written(tmp_path))
    assert "changed since" in spread.origin


def test_a_record_of_another_damper_is_refused(tmp_path: Path) -> None:
    names = ["compression.bleed.needle.offset_mm"]
    record = {"names": names, "covariance": [[1e-4]], "model_percent": 2.0}
    file = written(tmp_path, uncertainty=record, parameters=[])
    with pytest.raises(BadInput, match=r"needle\.offset_mm, which digressive-monotube has not"):
        spread_of(setup_of(name="digressive-monotube"), file)
    assert spread_of(setup_of(), file).known.names == tuple(names)
