"""A request is refused with one sentence for each of its faults."""

from pathlib import Path

import pytest

from optimiser.faults import BadInput
from optimiser.files import bundled_names
from optimiser.table_files import open_journal, read_request
from optimiser.tuning.cells import derive_all

from .builders import TINY, write_request


@pytest.mark.parametrize("name", bundled_names("request"))
def test_bundled_requests_are_good(name: str) -> None:
    materials = read_request(name).materials
    assert materials.request.cells == len(materials.feels) * len(materials.setups) * len(
        materials.request.rider_masses_kg
    )
    assert len(derive_all(materials)) == materials.request.cells // len(materials.setups)


@pytest.mark.parametrize(
    ("old", "new", "sentence"),
    [
        ("[74, 82]", "[82, 74]", "74 follows 82; allowed: lightest first"),
        ("[74, 82]", "[82, 82]", "82 follows 82"),
        ("[74, 82]", "[]", "rider_masses_kg"),
        ("[74, 82]", "[7, 82]", "must be 20 to 250 kg, not 7"),
        ('["balanced"]', '["balanced", "balanced"]', "balanced is given twice; allowed: once"),
        ('["balanced"]', '["balancd"]', 'no feel named "balancd"; did you mean balanced?'),
        ('["compression"]', '["sideways"]', "circuits"),
        ('"forest-motorcycle"', '"./none.toml"', "there is no such file"),
        ("clicks = 11", "clicks = 40", "is 40 for compression; allowed: 0 (closed) to 22 (open)"),
        ("parts = 8", "parts = 1", "parts"),
        ("parts = 8", "pieces = 8", "key pieces is not known"),
        ("tolerance_percent = 30", "tolerance_percent = 0", "must be 0.1 to 50 %, not 0"),
        ("evaluations = 50", "evaluations = 3", "evaluations"),
        ("evaluations = 50", "sag_percent = 80", "sag must be 5 to 50 %, not 80"),
    ],
)
def test_faults(tmp_path: Path, old: str, new: str, sentence: str) -> None:
    assert old in TINY
    with pytest.raises(BadInput) as caught:
        read_request(write_request(tmp_path, TINY.replace(old, new)))
    assert any(sentence in fault for fault in caught.value.faults)
    assert all("request.toml" in fault for fault in caught.value.faults)


def test_all_faults_of_all_files_at_once(tmp_path: Path) -> None:
    text = TINY.replace('"forest-motorcycle"', '"none"').replace('"small-shop"', '"./no.csv"')
    with pytest.raises(BadInput) as caught:
        read_request(write_request(tmp_path, text))
    assert [fault.split("key ")[1].split(":")[0] for fault in caught.value.faults] == [
        "frame",
        "stock",
    ]


def test_a_rider_the_frame_cannot_carry(tmp_path: Path) -> None:
    """All masses are named, not the first only."""
    frame = tmp_path / "frame.toml"
    source = (Path(__file__).parents[2] / "targets/frames/forest-motorcycle.toml").read_text()
    frame.write_text(source + "rate_n_mm = 20\n", encoding="utf-8")
    text = TINY.replace('"forest-motorcycle"', '"./frame.toml"')
    read = read_request(write_request(tmp_path, text))
    with pytest.raises(BadInput) as caught:
        derive_all(read.materials)
    assert [fault.split(" kg")[0] for fault in caught.value.faults] == ["74", "82"]


def test_folders_that_hold_other_things(tmp_path: Path) -> None:
    (tmp_path / "note.txt").write_text("mine", encoding="utf-8")
    with pytest.raises(BadInput, match="holds other files"):
        open_journal(tmp_path)
    with pytest.raises(BadInput, match="is a file"):
        open_journal(tmp_path / "note.txt")
    with pytest.raises(BadInput, match="cannot be made"):
        open_journal(tmp_path / "note.txt" / "below")
