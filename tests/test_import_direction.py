"""Data flows one way: files -> domain objects -> model -> search -> report.

Read from the source, without running it."""

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "optimiser"
MODEL_ROOMS = ("mechanics", "hydraulics", "wanted", "search", "tuning", "fitting")
PHYSICS = ("mechanics", "hydraulics")
FOR_PHYSICS = ("search", "report", "cli", "wanted", "tuning", "fitting", "files")
PRINTERS = ("typer", "rich", "click", "matplotlib", "jinja2")
#: Names that read or write: builtins, and methods of paths.
DOORS = ("print", "open", "input", "read_text", "write_text", "read_bytes", "write_bytes")

#: What a command may use of numpy: nothing that computes.
ARRANGING = (
    "array",
    "asarray",
    "concatenate",
    "geomspace",
    "isfinite",
    "linspace",
    "ndarray",
    "unique",
)


def _modules(*rooms: str) -> list[Path]:
    found = [path for room in rooms for path in sorted((PACKAGE / room).rglob("*.py"))]
    return [path for path in found if "_data" not in path.parts]


def _imports(path: Path) -> Iterator[str]:
    """Every module a source file imports, in dotted form, wherever the import stands."""
    package = ".".join(path.relative_to(PACKAGE.parent).with_suffix("").parts[:-1])
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from (name.name for name in node.names)
        elif isinstance(node, ast.ImportFrom):
            above = package.split(".")[: len(package.split(".")) - node.level + 1]
            base = ".".join([*above, *([node.module] if node.module else [])])
            source = base if node.level else (node.module or "")
            yield source
            yield from (f"{source}.{name.name}" for name in node.names)


def _imports_any(path: Path, modules: tuple[str, ...]) -> list[str]:
    return [
        name
        for name in _imports(path)
        if any(name == module or name.startswith(f"{module}.") for module in modules)
    ]


def _calls(path: Path) -> Iterator[str]:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Call):
            if isinstance(node.func, ast.Name):
                yield node.func.id
            elif isinstance(node.func, ast.Attribute):
                yield node.func.attr


def _numpy_names(path: Path) -> Iterator[str]:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Attribute) and isinstance(node.value, ast.Name):
            if node.value.id in ("np", "numpy"):
                yield node.attr
        elif isinstance(node, ast.ImportFrom) and node.module == "numpy":
            yield from (name.name for name in node.names)


def _short(path: Path) -> str:
    return str(path.relative_to(PACKAGE.parent))


def test_the_reader_sees_relative_and_late_imports(tmp_path: Path) -> None:
    source = PACKAGE / "mechanics" / "deflect.py"
    assert "optimiser.mechanics.layout" in set(_imports(source))
    assert "numpy" in set(_imports(source))
    assert len(_modules(*PHYSICS)) >= 10


@pytest.mark.parametrize("path", _modules(*PHYSICS), ids=_short)
def test_mechanics_and_hydraulics_know_nothing_above_them(path: Path) -> None:
    above = tuple(f"optimiser.{room}" for room in FOR_PHYSICS)
    assert _imports_any(path, above) == []


@pytest.mark.parametrize("path", _modules("mechanics"), ids=_short)
def test_mechanics_knows_no_hydraulics_and_no_damper(path: Path) -> None:
    others = ("optimiser.hydraulics", "optimiser.damper", "optimiser.stock", "optimiser.parsing")
    assert _imports_any(path, others) == []


@pytest.mark.parametrize("path", _modules(*MODEL_ROOMS), ids=_short)
def test_model_rooms_do_not_talk_to_people(path: Path) -> None:
    assert _imports_any(path, (*PRINTERS, "optimiser.cli", "optimiser.report")) == []


@pytest.mark.parametrize("path", _modules(*MODEL_ROOMS), ids=_short)
def test_model_rooms_neither_print_nor_read_files(path: Path) -> None:
    assert [name for name in _calls(path) if name in DOORS] == []


@pytest.mark.parametrize("path", _modules("."), ids=_short)
def test_pymoo_stays_in_search(path: Path) -> None:
    if path.relative_to(PACKAGE).parts[0] != "search":
        assert _imports_any(path, ("pymoo",)) == []


@pytest.mark.parametrize("path", _modules(*MODEL_ROOMS), ids=_short)
def test_numba_has_one_door(path: Path) -> None:
    """compiled.py, so that every kernel is compiled with the same options."""
    assert _imports_any(path, ("numba",)) == []


@pytest.mark.parametrize("path", _modules("cli"), ids=_short)
def test_commands_hold_no_physics(path: Path) -> None:
    """A command reads arguments, calls the library and shows what comes back; it may lay out
    points."""
    assert (
        _imports_any(path, ("scipy", "pymoo", "optimiser.mechanics", "optimiser.hydraulics")) == []
    )
    assert [name for name in _numpy_names(path) if name not in ARRANGING] == []


def test_stack_is_plain_data() -> None:
    """stack.py: no files, no physics."""
    source = PACKAGE / "stack.py"
    rooms = tuple(f"optimiser.{room}" for room in (*MODEL_ROOMS, "report", "cli", "files"))
    assert _imports_any(source, (*rooms, "numpy", "pathlib")) == []
    assert [name for name in _calls(source) if name in DOORS] == []
