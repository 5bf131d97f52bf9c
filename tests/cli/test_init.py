"""``shimwright init`` and its files as a user meets them."""

import shlex
from pathlib import Path

import pytest

from tests.cli.calling import call

FILES = {
    "damper.toml",
    "stock.csv",
    "stack.csv",
    "target-compression.csv",
    "target-rebound.csv",
    "frame.toml",
    "feel.toml",
    "rider.toml",
}


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    goal = tmp_path_factory.mktemp("work") / "my bike" / "rear"
    assert call("init", str(goal), "--quiet").code == 0
    return goal


def test_every_file_is_written_and_commented(folder: Path) -> None:
    assert {path.name for path in folder.iterdir()} == FILES
    for path in folder.iterdir():
        text = path.read_text(encoding="utf-8")
        assert text.startswith(f"# {path.name}: ")
        assert "rear-monotube" not in text.replace("# rear-monotube", "").replace(
            "shaft of rear-monotube", ""
        )


@pytest.mark.parametrize(
    "words",
    [
        "curve --damper D/damper.toml --stack D/stack.csv --velocities 0.1,0.5",
        "curve --damper D/damper.toml --circuit both --velocities 0.1,0.5",
        "target --damper D/damper.toml --target D/target-compression.csv",
        "target --damper D/damper.toml --target D/target-rebound.csv --circuit rebound",
        "target --damper D/damper.toml --fitted D/stack.csv --low 10",
        "target --damper D/damper.toml --rider D/rider.toml --frame D/frame.toml "
        "--feel D/feel.toml",
        "target --damper D/damper.toml",
        "stock --stock D/stock.csv",
        "stock --stock D/stock.csv --damper D/damper.toml --stack D/stack.csv",
        "stock --stock D/stock.csv --damper D/damper.toml --circuit rebound",
    ],
)
def test_every_command_runs_on_the_files(folder: Path, words: str) -> None:
    arguments = [word.replace("D/", f"{folder}/") for word in shlex.split(words)]
    called = call(*arguments)
    assert called.code == 0, called.err
    assert called.out


def test_the_line_it_prints_works(tmp_path: Path) -> None:
    called = call("init", str(tmp_path / "a b"))
    assert called.code == 0
    for name in FILES:
        assert f"  {name}\n" in called.out
    line = called.out.strip().splitlines()[-1]
    command = shlex.split(line)
    assert command[0] == "shimwright"
    assert call(*command[1:], "--velocities", "0.2").code == 0


def test_json_lists_the_files(tmp_path: Path) -> None:
    document = call("init", str(tmp_path / "new"), "--json").document
    assert {Path(file).name for file in document["files"]} == FILES
    assert all(Path(file).is_file() for file in document["files"])


def test_an_existing_folder_is_used_but_nothing_in_it_overwritten(tmp_path: Path) -> None:
    (tmp_path / "stock.csv").write_text("mine", encoding="utf-8")
    (tmp_path / "rider.toml").write_text("me", encoding="utf-8")
    called = call("init", str(tmp_path))
    assert called.code == 2
    assert called.out == ""
    for name in ("stock.csv", "rider.toml"):
        assert f"{tmp_path / name}: exists already and is not overwritten" in called.err
    assert {path.name for path in tmp_path.iterdir()} == {"stock.csv", "rider.toml"}
    assert (tmp_path / "stock.csv").read_text(encoding="utf-8") == "mine"
    (tmp_path / "stock.csv").unlink()
    (tmp_path / "rider.toml").rename(tmp_path / "kept.toml")
    assert call("init", str(tmp_path)).code == 0
    assert {path.name for path in tmp_path.iterdir()} == FILES | {"kept.toml"}


def test_a_file_is_no_folder(tmp_path: Path) -> None:
    file = tmp_path / "file"
    file.write_text("mine", encoding="utf-8")
    for goal in (file, file / "below"):
        called = call("init", str(goal))
        assert called.code == 2
        assert "file" in called.err
        assert "Traceback" not in called.err
    assert file.read_text(encoding="utf-8") == "mine"


def test_a_folder_must_be_named() -> None:
    called = call("init")
    assert called.code == 2
    assert "DIR" in called.err
