"""The wheel carries the bundled data and works from another folder, without the checkout."""

import json
import os
import subprocess
import sys
import sysconfig
import venv
import zipfile
from pathlib import Path

import pytest

REPOSITORY = Path(__file__).resolve().parents[1]


def _run(*command: str | Path, cwd: Path, env: dict[str, str] | None = None) -> str:
    ran = subprocess.run(
        [str(part) for part in command], cwd=cwd, env=env, capture_output=True, text=True
    )
    assert ran.returncode == 0, f"{command}\n{ran.stdout}\n{ran.stderr}"
    return ran.stdout


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built from this checkout by the build backend that is installed here."""
    folder = tmp_path_factory.mktemp("wheel")
    _run(
        *(sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", folder),
        REPOSITORY,
        cwd=folder,
    )
    (built,) = folder.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def bin_folder(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Commands of a fresh environment with the wheel; its dependencies are those of this one."""
    home = tmp_path_factory.mktemp("fresh") / "venv"
    venv.create(home, with_pip=False)
    scripts = home / ("Scripts" if os.name == "nt" else "bin")
    python = scripts / "python"
    pip = (sys.executable, "-m", "pip", "--python", python, "--disable-pip-version-check")
    _run(*pip, "install", "--no-deps", "--no-index", wheel, cwd=home)
    found = _run(python, "-c", "import sysconfig; print(sysconfig.get_path('purelib'))", cwd=home)
    packages = {sysconfig.get_path("purelib"), sysconfig.get_path("platlib")}
    borrowed = "\n".join(sorted(packages)) + "\n"
    (Path(found.strip()) / "borrowed.pth").write_text(borrowed, encoding="utf-8")
    return scripts


def _clean_environment() -> dict[str, str]:
    """Nothing that leads back to the checkout; uncompiled kernels, which are slower but at once."""
    kept = {key: value for key, value in os.environ.items() if not key.startswith("PYTHON")}
    return {**kept, "NUMBA_DISABLE_JIT": "1"}


def test_wheel_carries_every_bundled_file(wheel: Path) -> None:
    names = set(zipfile.ZipFile(wheel).namelist())
    for room in ("catalogue", "targets"):
        for file in (REPOSITORY / room).rglob("*.*"):
            assert f"optimiser/_data/{file.relative_to(REPOSITORY).as_posix()}" in names
    assert not [name for name in names if name.startswith(("tests", "catalogue", "targets"))]
    assert any(name.endswith("licenses/LICENSE") for name in names)


def test_installed_command_answers_from_another_folder(bin_folder: Path, tmp_path: Path) -> None:
    env = _clean_environment()
    where = _run(
        *(bin_folder / "python", "-c", "import optimiser; print(optimiser.__file__)"),
        cwd=tmp_path,
        env=env,
    )
    assert Path(where.strip()).is_relative_to(bin_folder.parent)
    out = _run(
        *(bin_folder / "shimwright", "curve", "--json", "--velocities", "0.1,0.5"),
        *("--circuit", "compression", "--stack", "rear-two-stage"),
        cwd=tmp_path,
        env=env,
    )
    document = json.loads(out)
    assert document["damper"] == "rear-monotube"
    assert document["force_n"][1] > document["force_n"][0] > 0.0
    assert list(tmp_path.iterdir()) == []


def test_installed_command_says_its_version(bin_folder: Path, tmp_path: Path) -> None:
    out = _run(bin_folder / "shimwright", "--version", cwd=tmp_path, env=_clean_environment())
    assert out.startswith("shimwright ")
