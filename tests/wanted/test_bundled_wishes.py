"""Every bundled frame, rider, feel and target loads, and fits the others."""

import numpy as np
import pytest

from optimiser.files import bundled_names, find_data, read_toml
from optimiser.wanted.derive import derive, ride_of
from optimiser.wanted.rebound_rule import rebound_notes
from optimiser.wanted.target import Target, shape_notes
from optimiser.wanted_files import read_feel, read_frame, read_rider, read_target, write_target


def test_there_is_enough_to_choose_from():
    assert len(bundled_names("frame")) >= 2
    assert len(bundled_names("rider")) >= 3
    assert len(bundled_names("feel")) >= 5


@pytest.mark.parametrize("name", bundled_names("frame"))
def test_every_frame_carries_every_rider(name):
    frame = read_frame(name)
    rides = [ride_of(read_rider(rider), frame) for rider in bundled_names("rider")]
    assert all(1.0 < ride.body_hz < 4.0 for ride in rides)
    assert all(5.0 <= ride.sag_percent <= 50.0 for ride in rides)


@pytest.mark.parametrize("name", bundled_names("feel"))
def test_every_feel_keeps_the_rebound_rule(name):
    frame, rider = read_frame("forest-motorcycle"), read_rider("middle-rider")
    derived = derive(rider, frame, read_feel(name))
    assert read_feel(name).name == name
    assert derived.notes == ()


def test_feels_differ_from_each_other():
    frame, rider = read_frame("forest-motorcycle"), read_rider("middle-rider")
    curves = [
        np.log([t.force_at([0.06, 0.2, 0.6]) for t in (d.compression, d.rebound)])
        for d in (derive(rider, frame, read_feel(name)) for name in bundled_names("feel"))
    ]
    for index, one in enumerate(curves):
        for other in curves[index + 1 :]:
            assert np.abs(one - other).max() > 0.05


@pytest.mark.parametrize("direction", ["compression", "rebound"])
def test_example_targets(direction):
    target = read_target(f"example-{direction}", direction)
    assert len(target) >= 6
    assert shape_notes(target) == []


def test_example_targets_keep_the_rebound_rule():
    pair = [read_target(f"example-{d}", d) for d in ("compression", "rebound")]
    assert rebound_notes(*pair) == []


def test_example_request_names_bundled_data():
    request = read_toml(find_data("request", "example-table"))
    assert request["frame"] in bundled_names("frame")
    assert set(request["feels"]) <= set(bundled_names("feel"))
    assert request["rider_masses_kg"] == sorted(request["rider_masses_kg"])
    frame = read_frame(request["frame"])
    for mass in request["rider_masses_kg"]:
        rider = read_rider("light-rider").model_copy(update={"mass_kg": mass})
        assert ride_of(rider, frame, request["sag_percent"]).coil_n_mm > 0


def test_a_saved_target_reads_back_exactly(tmp_path):
    speeds = np.geomspace(0.03, 1.7, 9)
    target = Target.of(speeds, 777 * speeds**0.83, speeds, origin="two\nlines", notes=["x\ny"])
    write_target(tmp_path / "mine.csv", target)
    again = read_target(tmp_path / "mine.csv", "compression")
    for name in ("velocity_m_s", "force_n", "weight"):
        assert getattr(again, name).tolist() == getattr(target, name).tolist()
