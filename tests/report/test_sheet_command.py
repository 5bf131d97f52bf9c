"""``shimwright sheet``, and ``--sheet`` of other commands."""

from pathlib import Path

import pytest

from optimiser.cli import main
from tests.cli.calling import Called, call


@pytest.fixture(autouse=True)
def _with_the_command(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(main, "COMMANDS", tuple(dict.fromkeys((*main.COMMANDS, "sheet"))))
    monkeypatch.chdir(tmp_path)


@pytest.fixture(scope="module")
def result(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A saved search of the command line, with the sheet that it wrote itself."""
    folder = tmp_path_factory.mktemp("found")
    called = call(
        *("find", "--stock", "small-shop", "--evaluations", "300", "--rows", "2", "--seed", "4"),
        *("--workers", "1", "--quiet", "--out", str(folder / "r")),
        *("--sheet", str(folder / "own.html")),
    )
    assert called.code == 0, called.err
    return folder / "r" / "result.json"


def _articles(file: str | Path) -> list[str]:
    return Path(file).read_text(encoding="utf-8").split("<article")[1:]


def _refused(called: Called, words: str) -> None:
    assert called.code == 2
    assert words in called.err
    assert not list(Path().glob("*.html"))


def test_of_a_result(result: Path) -> None:
    called = call("sheet", str(result), "--out", "page.html")
    assert (called.code, called.out) == (0, "page.html: 1 sheet\n")
    assert "print it at 100 %" in called.err
    (article,) = _articles("page.html")
    for words in ("example-compression", "small-shop", "seed 4", "find --again result.json"):
        assert words in article


def test_find_writes_the_same_sheet_itself(result: Path) -> None:
    call("sheet", str(result), "--out", "page.html")
    (own,) = _articles(result.parents[1] / "own.html")
    (later,) = _articles("page.html")
    assert own.split("<footer>")[0] == later.split("<footer>")[0]
    assert "shimwright find --stock small-shop --seed 4" in own.replace("--rows 2 ", "")


def test_ranks_of_a_result(result: Path) -> None:
    called = call("sheet", str(result), "--rank", "1", "--rank", "2", "--out", "two.html")
    assert called.out == "two.html: 2 sheets\n"
    assert ["stack 1 of 2" in one for one in _articles("two.html")] == [True, False]


def test_of_what_is_fitted_both_directions() -> None:
    called = call("sheet", "--out", "page.htm", "--quiet")
    assert (called.code, called.err) == (0, "")
    assert [">compression<" in one for one in _articles("page.htm")] == [True, False]


def test_with_stock_target_and_measured_run() -> None:
    Path("run.csv").write_text("velocity_m_s,force_n\n0.1,280\n0.5,700\n", encoding="utf-8")
    arguments = ("--stock", "workshop", "--target", "example-compression", "--measured", "run.csv")
    called = call("sheet", "--stack", "rear-two-stage", *arguments, "--out", "p.html", "--json")
    (sheet,) = called.document["sheets"]
    assert called.document["page"] == "p.html"
    assert [line["kind"] for line in sheet["lines"]] == ["target", "predicted", "measured"]
    assert sheet["steps"][0]["bins"] == ["tall cabinet 3-3"]
    assert sheet["rows"][0]["velocity_m_s"] == 0.05
    assert sheet["source"]["command"].startswith("shimwright sheet --stack rear-two-stage --stock")
    (article,) = _articles("p.html")
    assert "measured: run.csv" in article


def test_curve_writes_sheets_too() -> None:
    called = call(
        *("curve", "--shim", "2 x 40 x 0.25", "--shim", "2 x 20 x 0.3", "--velocities", "0.1,0.5"),
        *("--sheet", "page.html"),
    )
    assert called.code == 0
    assert "bench sheets written to page.html" in called.err
    (article,) = _articles("page.html")
    assert "shimwright curve --shim &#39;2 x 40 x 0.25&#39;" in article


def test_same_input_same_bytes() -> None:
    pages = []
    for _time in range(2):
        call("sheet", "--circuit", "compression", "--out", "page.html")
        pages.append(Path("page.html").read_bytes())
    assert pages[0] == pages[1]


def test_nothing_is_written_for_bad_input(result: Path) -> None:
    _refused(call("sheet"), "--out is missing")
    _refused(call("sheet", "--out", "a.pdf"), "allowed: .html or .htm")
    _refused(call("curve", "--sheet", "a.png"), "--sheet: 'a.png' ends in '.png'")
    _refused(call("sheet", "--rank", "1", "--out", "a.html"), "--rank belongs to a RESULT")
    _refused(call("sheet", str(result), "--rank", "7", "--out", "a.html"), "--rank is 7")
    _refused(call("sheet", "none.json", "--out", "a.html"), "there is no such file")
    _refused(
        call("sheet", str(result), "--clicks", "3", "--stock", "workshop", "--out", "a.html"),
        "a RESULT says everything that --clicks, --stock would",
    )
    _refused(
        call("sheet", "--stock", "nope", "--target", "nope", "--out", "a.html"),
        'there is no target named "nope"',
    )
    _refused(
        call("sheet", "--circuit", "both", "--target", "example-rebound", "--out", "a.html"),
        "a target belongs to one direction",
    )
    _refused(
        call("sheet", "--velocities", "1", "--target", "example-rebound", "--out", "a.html"),
        "--velocities and --target",
    )


def test_a_result_that_was_cut_off_is_bad_input(result: Path) -> None:
    Path("half.json").write_text(result.read_text(encoding="utf-8")[:900], encoding="utf-8")
    _refused(call("sheet", "half.json", "--out", "a.html"), "is not JSON")
    Path("other.json").write_text("{}", encoding="utf-8")
    _refused(call("sheet", "other.json", "--out", "a.html"), "holds no saved search")


def test_a_page_that_cannot_be_written_is_bad_input() -> None:
    called = call("sheet", "--circuit", "compression", "--out", "no/such/page.html")
    assert called.code == 2
    assert "does not exist" in called.err
