"""Reading, checking and writing files: every bad input gets its own clear sentence."""

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser import files
from optimiser.faults import BadInput
from optimiser.stack import Group, Shim, Stack

STOCK = "outer_mm,inner_mm,thickness_mm,quantity\n"
POINTS = "velocity_m_s,force_n\n"


def written(folder: Path, content: str | bytes, name: str = "mine.csv") -> Path:
    path = folder / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return path


def holds(faults: list[str], words: list[str]) -> bool:
    """True when one of the sentences has all the words."""
    return any(all(word in fault for word in words) for fault in faults)


BAD_TABLES = [
    ("", ["mine.csv: is empty"]),
    ("  \n\n", ["mine.csv: is empty"]),
    ("# only a remark\n", ["no header line", "allowed: outer_mm, inner_mm"]),
    (STOCK, ["a header but no rows", "one row or more"]),
    (STOCK.replace(",", ";") + "24;12;0.15;3\n", ["line 1", "semicolons", "allowed: commas"]),
    (STOCK.replace(",", "\t") + "24\t12\t0.15\t3\n", ["line 1", "tabs", "allowed: commas"]),
    ("24,12,0.15,3\n", ["line 1", "must name the columns", "outer_mm, inner_mm"]),
    (STOCK + "24,12,0,15,3\n", ["line 2", "5 values for 4 columns", "decimal comma"]),
    (STOCK + '24,12,"0,15",3\n', ["line 2", 'thickness_mm "0,15"', "decimal comma", "0.15"]),
    (STOCK + "24;12;0.15;3\n", ["line 2", "1 values for 4 columns", "by commas"]),
    (STOCK + "24,12,0.15\n", ["line 2", "3 values for 4 columns", "one each"]),
    (STOCK + "24,12,thin,3\n", ["line 2", 'thickness_mm "thin" is not a number']),
    (STOCK + "24,12,1_5,3\n", ["line 2", 'thickness_mm "1_5" is not a number']),
    (STOCK + "24,12,nan,3\n", ["line 2", "thickness_mm nan is not a finite number"]),
    (STOCK + "24,12,inf,3\n", ["line 2", "thickness_mm inf is not a finite number"]),
    (STOCK + "24,12,-0.15,3\n", ["line 2", "thickness_mm -0.15 is negative", "0 or more"]),
    (STOCK + "24,12,,3\n", ["line 2", "thickness_mm is blank", "a number"]),
    (STOCK + '24,12,"0.15,3\n', ["line 2", "is not comma-separated"]),
    ("outer_mm,inner_mm,quantity\n24,12,3\n", ['"thickness_mm" is missing', "allowed: outer_mm"]),
    (
        STOCK.replace("inner", "iner") + "1,2,3,4\n",
        ['"iner_mm" is not known', "did you mean inner"],
    ),
    (STOCK.replace("inner", "outer") + "1,2,3,4\n", ['"outer_mm" is given twice', "once"]),
    (b"\xff\xfeo\x00u\x00t\x00", ["mine.csv line 1", "is not UTF-8 text", "save the file as"]),
    (STOCK.encode() + b"24,12,0.15,3\xb5\n", ["mine.csv line 2", "is not UTF-8 text"]),
    (STOCK + "24,12,0.15,3\0\n", ["mine.csv", "binary data"]),
]


@pytest.mark.parametrize(("content", "words"), BAD_TABLES)
def test_bad_tables(tmp_path: Path, content: str | bytes, words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        files.read_stock(written(tmp_path, content))
    assert holds(caught.value.faults, words), caught.value.faults


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        ("24,12,0.15,2.5\n", ["line 2", "quantity 2.5", "whole number"]),
        ("24,24,0.15,2\n", ["line 2", "inner_mm 24", "less than outer_mm 24"]),
        ("240,12,0.15,2\n", ["line 2", "outer_mm 240", "2 to 200"]),
        ("24,12,0.15,0\n20,12,0.15,0\n", ["every quantity is 0", "at least one shim"]),
        ("24,12,0.15,1\n24,12,0.150,2\n", ["line 3", "repeats line 2", "one line a size"]),
    ],
)
def test_bad_stock(tmp_path: Path, rows: str, words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        files.read_stock(written(tmp_path, STOCK + rows))
    assert holds(caught.value.faults, words), caught.value.faults


def test_all_faults_of_a_table_at_once(tmp_path: Path) -> None:
    text = (
        STOCK.replace("\n", ",colour\n") + "24,24,0.15,1,red\n24,12,x,y,\n24,12,0.15\n20,12,9,-1,\n"
    )
    with pytest.raises(BadInput) as caught:
        files.read_stock(written(tmp_path, text))
    faults = caught.value.faults
    for words in (
        ['"colour" is not known'],
        ["line 2", "inner_mm 24"],
        ["line 3", 'thickness_mm "x"'],
        ["line 3", 'quantity "y"'],
        ["line 4", "3 values for 5 columns"],
        ["line 5", "quantity -1"],
    ):
        assert holds(faults, words), (words, faults)
    assert len(faults) == 6


def test_stock_with_everything(tmp_path: Path) -> None:
    text = (
        "\ufeff# my drawer\nouter_mm, inner_mm,thickness_mm,quantity,measured_mm,price,bin\r\n"
        '24,12,0.15,3,0.148,1.25,"left, top"\r\n\r\n20,12,0.15,0,,,\r\n'
    )
    stock = files.read_stock(written(tmp_path, text))
    first, second = stock
    assert (first.real_mm, first.price, first.bin) == (0.148, 1.25, "left, top")
    assert (second.measured_mm, second.price, second.bin) == (None, None, None)
    assert stock.pieces == 3


def test_same_size_in_two_bins_is_fine(tmp_path: Path) -> None:
    rows = "24,12,0.15,1,a\n24,12,0.15,2,b\n"
    assert len(files.read_stock(written(tmp_path, STOCK[:-1] + ",bin\n" + rows))) == 2


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        ("0.1,200\n", ["holds one point only", "two points or more"]),
        ("0.2,200\n0.1,100\n", ["line 3", "0.1 comes after 0.2", "sorted"]),
        ("-0.1,200\n0.1,100\n", ["line 2", "velocity_m_s -0.1 is negative"]),
        ("0.1,200\n0.1,100\n", ["line 3", "0.1 is given twice", "once"]),
        ("0,0.1\n0.1,100\n", ["line 2", "velocity_m_s is 0", "more than 0"]),
        ("0.1,0\n0.2,100\n", ["line 2", "force_n is 0", "more than 0"]),
        ("0.1,-5\n0.2,100\n", ["line 2", "force_n -5 is negative"]),
        ("50,100\n100,200\n", ["line 2", "velocity_m_s 50", "at most 20", "mm/s"]),
        ("0.1,100\n0.2,200000\n", ["line 3", "force_n 200000", "at most 100000"]),
    ],
)
def test_bad_points(tmp_path: Path, rows: str, words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        files.read_points(written(tmp_path, POINTS + rows))
    assert holds(caught.value.faults, words), caught.value.faults


def test_weights(tmp_path: Path) -> None:
    head = "velocity_m_s,force_n,weight\n"
    with pytest.raises(BadInput, match=r"every weight is 0; allowed: at least one weight above 0"):
        files.read_points(written(tmp_path, head + "0.1,100,0\n0.2,200,0\n"))
    velocity, force, weight = files.read_points(written(tmp_path, head + "0.1,100,\n0.2,200,3\n"))
    np.testing.assert_array_equal(velocity, [0.1, 0.2])
    np.testing.assert_array_equal(force, [100.0, 200.0])
    np.testing.assert_array_equal(weight, [1.0, 3.0])
    *_, weight = files.read_points(written(tmp_path, POINTS + "0.1,100\n0.2,200\n"))
    np.testing.assert_array_equal(weight, [1.0, 1.0])


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("", ["is empty"]),
        ("# nothing\n", ["holds no keys"]),
        ("name = \n", ["line 1", "not TOML", "key = value"]),
        ("a = 1\n[b\n", ["line 2", "not TOML"]),
        ("a = 1\nb = 2\na = 3\n", ["line 3", '"a" is given twice', "once"]),
        ("[a]\nb = 1\n[a]\n", ["line 3", "[a]", "given twice"]),
        ("a = 1\nb = 24,5\n", ["line 2", "decimal comma", "a point"]),
        (b"a = '\xe4'\n", ["line 1", "UTF-8"]),
    ],
)
def test_bad_toml(tmp_path: Path, content: str | bytes, words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        files.read_toml(written(tmp_path, content, "mine.toml"))
    assert holds(caught.value.faults, ["mine.toml", *words]), caught.value.faults


def test_byte_order_mark_is_no_fault(tmp_path: Path) -> None:
    assert files.read_toml(written(tmp_path, "\ufeffa = 1\n", "mine.toml")) == {"a": 1}


@pytest.mark.parametrize("kind", sorted(files.KINDS))
def test_unknown_names(kind: files.Kind) -> None:
    with pytest.raises(BadInput) as caught:
        files.find_data(kind, "no-such-thing")
    (fault,) = caught.value.faults
    title = files.KINDS[kind].title
    assert fault.startswith(f'there is no {title} named "no-such-thing"')
    assert "or the path of a file, such as ./no-such-thing" in fault
    assert all(name in fault for name in files.bundled_names(kind))


def test_nearest_name_is_told() -> None:
    with pytest.raises(
        BadInput, match=r'"workshp"; did you mean workshop\?; allowed: small-shop, w'
    ):
        files.read_stock("workshp")


def test_missing_files_and_folders(tmp_path: Path) -> None:
    with pytest.raises(BadInput, match=r"none\.csv: there is no such file; allowed: a stock list"):
        files.read_stock(tmp_path / "none.csv")
    with pytest.raises(BadInput, match=r"is a folder; allowed: a damper file"):
        files.read_damper(tmp_path)
    with pytest.raises(BadInput, match=r"x\.toml: cannot be read \(no such file"):
        files.read_toml(tmp_path / "x.toml")


def test_a_path_wins_over_a_bundled_name(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    written(tmp_path, STOCK + "24,12,0.15,3\n", "workshop.csv")
    monkeypatch.chdir(tmp_path)
    assert len(files.read_stock("workshop.csv")) == 1
    assert len(files.read_stock("./workshop.csv")) == 1
    assert len(files.read_stock("workshop")) > 60


def test_installed_data_folder_is_used_when_there(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(files, "__file__", str(tmp_path / "files.py"))
    assert files.data_root() == tmp_path.parent
    folder = tmp_path / "_data" / "catalogue" / "stock"
    folder.mkdir(parents=True)
    written(folder, STOCK + "24,12,0.15,3\n", "tin.csv")
    assert files.bundled_names("stock") == ["tin"]
    assert files.read_stock("tin").pieces == 3


OIL = (
    "viscosity_40c_cst = 15.0\nviscosity_100c_cst = 4.0\ndensity_15c_kg_m3 = 850.0\nsource = 'me'\n"
)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (OIL, ["holds 4 entries", "one table, such as [my-oil]"]),
        (f"[a]\n{OIL}[b]\n{OIL}", ["holds 2 entries", "one table"]),
        ("a = 1\n", ["key a stands alone", "[my-oil]"]),
        (f"[a]\nname = 'b'\n{OIL}", ["key a.name is not known", "table's own name"]),
        (f"[a]\n{OIL}".replace("4.0", "40.0"), ["viscosity_100c_cst: 40: must be below", "15"]),
        (f"[a]\n{OIL}".replace("850.0", "0.85"), ["density_15c_kg_m3: is 0.85", "700 or more"]),
        (f"[a]\n{OIL}viscosity_20c = 9\n", ["key viscosity_20c is not known", "did you mean visc"]),
    ],
)
def test_bad_oils(tmp_path: Path, content: str, words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        files.read_oil(written(tmp_path, content, "mine.toml"))
    assert holds(caught.value.faults, ["mine.toml", *words]), caught.value.faults


def test_a_damper_may_name_oil_and_steel_files_beside_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    source = files.find_data("damper", "rear-monotube").read_text(encoding="utf-8")
    changed = source.replace('oil = "light"', 'oil = "./my-oil.toml"')
    path = written(tmp_path, changed, "mine.toml")
    with pytest.raises(BadInput, match=r"mine\.toml: key oil: .*my-oil\.toml: there is no such"):
        files.read_damper(path)
    written(tmp_path, f"[mine]\n{OIL}", "my-oil.toml")
    monkeypatch.chdir("/")
    damper = files.read_damper(path)
    assert files.read_oil(damper.oil).name == "mine"


def test_faults_of_damper_and_its_oil_come_together(tmp_path: Path) -> None:
    source = files.find_data("damper", "rear-monotube").read_text(encoding="utf-8")
    text = source.replace('oil = "light"', 'oil = "lihgt"').replace(
        "shaft_mm = 16.0", "shaft_mm = 0"
    )
    with pytest.raises(BadInput) as caught:
        files.read_damper(written(tmp_path, text, "mine.toml"))
    assert holds(caught.value.faults, ["key body.shaft_mm: is 0", "more than 0"])
    assert holds(caught.value.faults, ["key oil", '"lihgt"', "did you mean light?"])
    assert len(caught.value.faults) == 2


STACK = "outer_mm,thickness_mm,quantity\n"


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (STACK + "24,0.15,2\n", ["mine.csv", "a face shim and a clamp shim"]),
        (STACK + "24,0.15,2.5\n12,0.3,1\n", ["line 2", "quantity 2.5", "whole number"]),
        (STACK + "24,0.15,0\n12,0.3,1\n", ["mine.csv", "group 1", "quantity must be 1 to 60"]),
        (STACK + "24,9,1\n12,0.3,1\n", ["mine.csv", "group 1", "0.02 to 5 mm"]),
        (STACK + "12,0.15,1\n24,0.3,1\n", ["mine.csv", "wider than the clamp shim"]),
        ("outer,thickness_mm,quantity\n24,0.15,2\n", ['"outer" is not known', "outer_mm"]),
    ],
)
def test_bad_stacks(tmp_path: Path, content: str, words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        files.read_stack(written(tmp_path, content))
    assert holds(caught.value.faults, words), caught.value.faults


shims = st.builds(Shim, st.floats(13.0, 90.0), st.floats(0.05, 0.5))


@given(st.lists(st.tuples(shims, st.integers(1, 9)), min_size=1, max_size=8), st.booleans())
@settings(max_examples=40, deadline=None)
def test_stacks_are_read_back_exactly(
    tmp_path_factory: pytest.TempPathFactory, pieces: list[tuple[Shim, int]], ring: bool
) -> None:
    groups = [Group(number, shim) for shim, number in pieces]
    if ring:
        front, behind = Shim(30.0, 0.1), Shim(28.0, 0.1)
        groups = [*groups, Group(1, front), Group(1, Shim(26.0, 0.1, 20.5)), Group(1, behind)]
    stack = Stack((*groups, Group(2, Shim(12.0, 0.3))))
    path = tmp_path_factory.mktemp("stacks") / "mine.csv"
    files.write_stack(path, stack)
    assert files.read_stack(path) == stack


def test_writing_is_whole_or_not_at_all(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "result.txt"
    files.atomic_write_text(path, "first ±\n")
    assert path.read_text(encoding="utf-8") == "first ±\n"
    path.chmod(0o600)

    def fail(*_: object) -> None:
        raise OSError(28, "No space left on device")

    with monkeypatch.context() as patch:
        patch.setattr(files.os, "fsync", fail)
        with pytest.raises(BadInput, match=r"cannot be written \(no space left"):
            files.atomic_write_text(path, "second\n")
    assert path.read_text(encoding="utf-8") == "first ±\n"
    assert list(tmp_path.iterdir()) == [path]
    files.atomic_write_bytes(path, b"third")
    assert path.read_bytes() == b"third"
    assert path.stat().st_mode & 0o777 == 0o600


def test_places_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(BadInput, match=r"does not exist; make it first"):
        files.atomic_write_text(tmp_path / "none" / "result.txt", "x")
    with pytest.raises(BadInput, match=r"is a folder"):
        files.atomic_write_text(tmp_path, "x")


def test_fingerprint(tmp_path: Path) -> None:
    path = written(tmp_path, "abc")
    # first digits of SHA-256("abc"), FIPS 180-4 example
    assert files.fingerprint(b"abc") == files.fingerprint(path) == "ba7816bf8f01"
