"""``shimwright target`` as a user meets it."""

from pathlib import Path

import numpy as np
import pytest

from optimiser.files import bundled_names
from tests.cli.calling import call, lines_wider_than

REPOSITORY = Path(__file__).resolve().parents[2]
RIDE = ("--rider-kg", "82", "--frame", "forest-motorcycle", "--feel", "calm")
FEW = ("--velocities", "0.05,0.2,0.8")
WITHIN = "within what the damper can do"


def test_with_no_options_it_is_the_bundled_example() -> None:
    called = call("target")
    assert called.code == 0
    first = called.out.splitlines()[0]
    assert first == "rear-monotube, compression: light oil at 40 C"
    assert "wanted: example-compression" in called.out
    assert "wanted: example-rebound" in called.out
    assert called.out.count(WITHIN) == 2


@pytest.mark.parametrize("damper", bundled_names("damper"))
def test_every_damper_is_answered_in_80_columns(damper: str) -> None:
    called = call("target", "--damper", damper, env={"COLUMNS": "80"})
    assert called.code == 0
    assert not lines_wider_than(called.out, 80)


def test_json_has_the_first_target_and_all_targets() -> None:
    document = call("target", "--json").document
    assert document["way"] == "example"
    assert [one["circuit"] for one in document["targets"]] == ["compression", "rebound"]
    first = document["targets"][0]
    for key in ("velocity_m_s", "force_n", "weight", "softest_n", "firmest_n", "place_percent"):
        assert document[key] == first[key]
        assert len(first[key]) == len(first["force_n"])
    assert first["reachable"] is True
    assert first["outside"] == []
    assert all(0 < place < 100 for place in first["place_percent"])
    assert document["ride"] is None
    kinds = [file["kind"] for file in document["inputs"]]
    assert kinds == ["damper", "steel", "oil", "target", "target"]


def test_ride_gives_both_targets_the_ride_and_the_feel() -> None:
    called = call("target", *RIDE, "--circuit", "both", env={"COLUMNS": "80"})
    assert called.code == 0
    assert not lines_wider_than(called.out, 80)
    for text in ("The ride: 82 kg", "coil", "N/mm for this sag", "overshoot", "Feel calm"):
        assert text in called.out
    assert "firmer than balanced" in called.out
    document = call("target", *RIDE, "--json", "--quiet").document
    ride = document["ride"]
    assert ride["sag_percent"] == pytest.approx(34.0)
    assert ride["wheel_rate_n_mm"] > 0
    for mode in ("body", "wheel"):
        assert ride[mode]["hz"] > 0
        assert ride[mode]["damping_ratio"] > 0
    assert len(document["feel"]["explained"]) == 5
    assert [file["kind"] for file in document["inputs"]][3:] == ["frame", "feel"]


def test_sag_and_rider_change_the_coil() -> None:
    def coil(*options: str) -> float:
        return float(call("target", *RIDE[2:], *options, "--json").document["ride"]["coil_n_mm"])

    assert coil("--rider", "heavy-rider") > coil("--rider", "light-rider")
    assert coil("--rider-kg", "82", "--sag", "25") > coil("--rider-kg", "82", "--sag", "40")


def test_an_air_spring_has_no_coil() -> None:
    options = ("--rider-kg", "82", "--frame", "bicycle-fork", "--feel", "quick")
    called = call("target", *options, "--damper", "fork-cartridge")
    assert called.code == 0
    assert "air spring at sag" in called.out
    document = call("target", *options, "--damper", "fork-cartridge", "--json").document
    assert document["ride"]["coil_n_mm"] is None


def test_a_frame_that_needs_more_stroke_than_the_damper_has_gets_a_note(tmp_path: Path) -> None:
    text = (REPOSITORY / "catalogue/dampers/rear-monotube.toml").read_text(encoding="utf-8")
    damper = tmp_path / "short.toml"
    damper.write_text(text.replace("stroke_mm = 130.0", "stroke_mm = 60.0"), encoding="utf-8")
    called = call("target", *RIDE, "--damper", str(damper))
    assert called.code == 0
    assert "of shaft stroke" in called.out


def test_a_change_shows_the_fitted_stack_beside_the_wish() -> None:
    options = ("--low", "10", "--high", "-20", "--circuit", "rebound", *FEW, "--clicks", "6")
    called = call("target", *options, env={"COLUMNS": "80"})
    assert called.code == 0
    assert "6 of 22 clicks: low +10 %, high -20 %" in called.out
    assert not lines_wider_than(called.out, 80)
    document = call("target", *options, "--json").document
    fitted = document["fitted"]
    share = np.array(document["force_n"]) / np.array(fitted["force_n"])
    assert share[[0, -1]] == pytest.approx([1.10, 0.80])
    assert fitted["clicks"] == 6
    for percent in ("+10.0", "-20.0"):
        assert percent in called.out


def test_a_change_of_a_stack_file_is_compression_unless_told() -> None:
    options = ("--fitted", "rear-two-stage", "--knee", "20", *FEW, "--json", "--quiet")
    document = call("target", *options).document
    assert len(document["targets"]) == 1
    assert document["circuit"] == "compression"
    assert document["fitted"]["stack"][0] == "2 x 40 x 0.20"
    assert "stack" in [file["kind"] for file in document["inputs"]]
    own = call("target", "--fitted", "fitted", *FEW, "--json", "--quiet").document
    assert own["force_n"] == pytest.approx(own["fitted"]["force_n"])


def test_targets_of_both_directions_from_files() -> None:
    files = ("--target", "example-compression", "--target", "example-rebound")
    assert call("target", *files, "--quiet").out == call("target", "--quiet").out


def test_resampling_keeps_the_ends() -> None:
    whole = call("target", "--target", "example-compression", "--json").document
    fewer = call("target", "--target", "example-compression", "--resample", "5", "--json").document
    assert len(fewer["force_n"]) == 5
    for key in ("velocity_m_s", "force_n"):
        assert [fewer[key][0], fewer[key][-1]] == pytest.approx([whole[key][0], whole[key][-1]])


def test_what_is_saved_is_accepted_again(tmp_path: Path) -> None:
    file = tmp_path / "mine.csv"
    document = call("target", *RIDE, "--out", str(file), "--json").document
    assert sorted(path.name for path in tmp_path.iterdir()) == [
        "mine-compression.csv",
        "mine-rebound.csv",
    ]
    for one in document["targets"]:
        saved = str(tmp_path / f"mine-{one['circuit']}.csv")
        again = call("target", "--target", saved, "--circuit", one["circuit"], "--json").document
        for key in ("velocity_m_s", "force_n", "weight", "place_percent"):
            assert again[key] == one[key]


def test_one_direction_is_saved_under_the_very_name(tmp_path: Path) -> None:
    file = tmp_path / "mine.csv"
    called = call("target", "--circuit", "rebound", "--out", str(file))
    assert called.code == 0
    assert str(file) in called.err
    assert [path.name for path in tmp_path.iterdir()] == ["mine.csv"]


def test_a_copy_takes_the_static_force_off(tmp_path: Path) -> None:
    file = tmp_path / "dyno.csv"
    rows = "\n".join(f"{v},{1000 * v + 200}" for v in (0.8, 0.05, 0.1, 0.2, 0.4))
    file.write_text("velocity_m_s,force_n\n" + rows, encoding="utf-8")
    options = ("--copy", str(file), "--copy-static-n", "200", "--resample", "4", "--json")
    document = call("target", *options).document
    velocity = np.array(document["velocity_m_s"])
    assert document["force_n"] == pytest.approx(1000 * velocity, rel=2e-3)
    assert document["way"] == "copy"


def test_a_target_partly_outside_says_what_stops_the_damper(tmp_path: Path) -> None:
    file = tmp_path / "soft.csv"
    file.write_text("velocity_m_s,force_n\n0.05,12\n0.1,14\n0.3,400\n0.6,800\n", encoding="utf-8")
    called = call("target", "--target", str(file), env={"COLUMNS": "80"})
    assert called.code == 0
    assert "outside: other parts" in called.out
    assert "outside at 2 points" in called.out
    assert WITHIN not in called.out
    assert not lines_wider_than(called.out, 80)
    document = call("target", "--target", str(file), "--json").document
    assert document["reachable"] is False
    assert [point["reason"] for point in document["outside"]] == ["other_parts_too_firm"] * 2
    assert "friction" in document["outside"][0]["sentence"]


def test_a_fitted_stack_and_points_outside_still_fit_80_columns(tmp_path: Path) -> None:
    file = tmp_path / "t.csv"
    file.write_text(
        "velocity_m_s,force_n,weight\n0.05,12,0.333\n0.3,400,1\n1.2,90000,1\n", encoding="utf-8"
    )
    called = call("target", "--target", str(file), "--fitted", "fitted", env={"COLUMNS": "80"})
    assert called.code == 0
    assert "outside: other parts" in called.out
    assert not lines_wider_than(called.out, 80)


def test_a_target_far_outside_is_bad_input_and_writes_nothing(tmp_path: Path) -> None:
    file, kept = tmp_path / "newton.csv", tmp_path / "kept.csv"
    file.write_text("velocity_m_s,force_n\n0.05,0.2\n0.3,0.6\n", encoding="utf-8")
    kept.write_text("mine", encoding="utf-8")
    called = call("target", "--target", str(file), "--out", str(kept))
    assert called.code == 2
    assert called.out == ""
    for text in ("newton.csv", "far outside", "unit"):
        assert text in called.err
    assert kept.read_text(encoding="utf-8") == "mine"


def test_a_ride_far_outside_is_shown_with_a_warning(tmp_path: Path) -> None:
    feel = tmp_path / "faint.toml"
    stroke = "low_damping_ratio = 0.02\nhigh_damping_ratio = 0.02\nknee_wheel_m_s = 0.6\n"
    ends = "slowest_wheel_m_s = 0.02\nfastest_wheel_m_s = 0.05\n"
    feel.write_text(
        f'name = "faint"\n[compression]\n{stroke}{ends}[rebound]\n{stroke}{ends}', encoding="utf-8"
    )
    called = call("target", *RIDE[:4], "--feel", str(feel))
    assert called.code == 0
    assert "warning: the target is far outside" in called.out
    assert "The ride" in called.out


def test_dumb_terminal_gets_plain_ascii_and_quiet_leaves_notes_out() -> None:
    plain = call("target", *RIDE, env={"TERM": "dumb"})
    assert plain.out.isascii()
    quiet = call("target", *RIDE, "--quiet")
    assert "Softest:" in plain.out
    assert "Softest:" not in quiet.out
    assert "Feel calm" not in quiet.out
    assert call("target", *RIDE, "--json", "--quiet").err == ""


@pytest.mark.parametrize(("ending", "start"), [("svg", b"<?xml"), ("png", b"\x89PNG")])
def test_chart_is_written_and_repeats(ending: str, start: bytes, tmp_path: Path) -> None:
    file = tmp_path / f"chart.{ending}"
    options = ("target", "--low", "10", "--damper", "digressive-monotube", "--chart", str(file))
    assert call(*options, "--quiet").code == 0
    content = file.read_bytes()
    assert content.startswith(start)
    assert call(*options, "--quiet").code == 0
    assert file.read_bytes() == content


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (["--target", "example-rebound", "--low", "5"], ["--target and --low", "different ways"]),
        (["--target", "example-rebound", *RIDE], ["--target and --rider-kg"]),
        (["--rider-kg", "82"], ["--frame NAME|FILE", "--feel NAME|FILE"]),
        (["--frame", "forest-motorcycle"], ["--rider-kg KG", "--feel"]),
        (["--rider-kg", "12", *RIDE[2:]], ["--rider-kg is 12", "20 to 250"]),
        (["--rider-kg", "260", *RIDE[2:]], ["--rider-kg is 260", "20 to 250"]),
        ([*RIDE, "--sag", "4"], ["--sag is 4", "5 to 50"]),
        ([*RIDE, "--sag", "60"], ["--sag is 60", "5 to 50"]),
        ([*RIDE, "--rider", "light-rider"], ["--rider and --rider-kg"]),
        (["--rider-kg", "82", "--frame", "wood", "--feel", "fast"], ["no frame", "no feel"]),
        (
            ["--rider-kg", "250", "--frame", "bicycle-fork", "--feel", "calm"],
            ["bicycle fork, front", "too soft", "sag"],
        ),
        (
            ["--rider-kg", "80", "--frame", "bicycle-fork", "--feel", "calm", "--sag", "20"],
            ["names its spring"],
        ),
        (["--low", "-90"], ["low", "-80 to +300"]),
        (["--knee", "nan"], ["knee", "nan"]),
        (["--high", "lots"], ["--high"]),
        (["--low", "5", "--clicks", "40"], ["--clicks is 40", "0 (closed) to 22"]),
        (["--low", "5", "--velocities", "0.1"], ["--velocities", "two or more"]),
        (["--velocities", "a"], ["--velocities", "not a number"]),
        (["--target", "example-rebound", "--velocities", "0.1,0.2"], ["--resample"]),
        (["--target", "example-rebound", "--clicks", "3"], ["--clicks", "--fitted"]),
        (["--target", "example-rebound", "--circuit", "both"], ["--target is given once"]),
        (["--fitted", "fitted", "--circuit", "both"], ["--fitted is given once"]),
        (["--fitted", "./absent.csv", "--low", "5"], ["absent.csv", "no such file"]),
        (["--target", "example"], ["no target named", "example-compression"]),
        (["--target", "./absent.csv"], ["absent.csv", "no such file"]),
        (["--copy-static-n", "20"], ["--copy-static-n", "--copy"]),
        (["--resample", "1"], ["resampled", "2 to 500"]),
        (["--out", "mine.txt"], ["--out", ".txt", ".csv"]),
        (["--out", "no-such-folder/mine.csv"], ["no-such-folder"]),
        (["--chart", "mine.gif"], ["--chart", ".gif"]),
        (["--damper", "absent"], ["no damper named"]),
    ],
)
def test_bad_input_gets_a_sentence_and_exit_code_2(options: list[str], said: list[str]) -> None:
    called = call("target", *options)
    assert called.code == 2
    assert called.out == ""
    for text in said:
        assert text in called.err
    assert "Traceback" not in called.err


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("ratio = [2.92, 2.84", "ratio = [0, -1", ["travel_mm 0 ", "travel_mm 50 ", "above 0"]),
        ("[0, 50, 100,", "[0, 100, 50,", ["travel_mm 50 follows 100", "must rise"]),
        ("sag_percent = 34", "sag_percent = 51", ["sag_percent", "5 to 50"]),
        (
            'kind = "coil"\npreload_mm = 10',
            'kind = "coil"\nrate_n_mm = 2',
            ["cannot hold the rider"],
        ),
    ],
)
def test_bad_frames(tmp_path: Path, old: str, new: str, said: list[str]) -> None:
    text = (REPOSITORY / "targets/frames/forest-motorcycle.toml").read_text(encoding="utf-8")
    assert old in text
    frame = tmp_path / "frame.toml"
    frame.write_text(text.replace(old, new), encoding="utf-8")
    called = call("target", "--rider-kg", "82", "--frame", str(frame), "--feel", "calm")
    assert called.code == 2
    for part in said:
        assert part in called.err


@pytest.mark.parametrize("ratio", ["0.019", "2.01"])
def test_bad_damping_ratio(tmp_path: Path, ratio: str) -> None:
    text = (REPOSITORY / "targets/feels/calm.toml").read_text(encoding="utf-8")
    lines = [
        f"low_damping_ratio = {ratio}" if line.startswith("low_damping_ratio") else line
        for line in text.splitlines()
    ]
    feel = tmp_path / "feel.toml"
    feel.write_text("\n".join(lines), encoding="utf-8")
    called = call("target", "--rider-kg", "82", "--frame", "forest-motorcycle", "--feel", str(feel))
    assert called.code == 2
    assert called.err.count("0.02 to 2") == 2
    assert "feel.toml" in called.err
