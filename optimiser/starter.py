"""Starter files to edit, made from the bundled examples."""

from pathlib import Path

from optimiser.faults import BadInput
from optimiser.files import Kind, atomic_write_text, find_data, read_damper, read_text

EXAMPLE_DAMPER = "rear-monotube"
STARTER_DAMPER = "my-damper"

#: File to write: kind and name of the bundled example, and what to do with it.
_COPIES: dict[str, tuple[Kind, str, str]] = {
    "damper.toml": ("damper", EXAMPLE_DAMPER, "the damper; measure yours"),
    "stock.csv": ("stock", "small-shop", "the drawer; one line a size"),
    "target-compression.csv": ("target", "example-compression", "a wanted compression curve"),
    "target-rebound.csv": ("target", "example-rebound", "a wanted rebound curve"),
    "frame.toml": ("frame", "forest-motorcycle", "the frame: travel, leverage, masses, spring"),
    "feel.toml": ("feel", "balanced", "the feel: how hard, and from which wheel speed on"),
    "rider.toml": ("rider", "middle-rider", "the rider"),
}
_STOCK_COLUMNS = """\
#   outer_mm      outer diameter, caliper
#   inner_mm      bore, caliper: that of the post; a much wider one is a ring shim
#   thickness_mm  nominal thickness, as bought
#   quantity      shims of this size; 0 keeps the line until more are bought
# Optional columns: measured_mm (micrometer; counts instead of the nominal thickness), price (of one
# shim), bin (where it lies). Leave a cell blank where nothing is known.
"""
_STACK_HEAD = """\
# stack.csv: a stack, face shim first, clamp shim last (the one at which all others are held).
#   outer_mm      outer diameter, caliper
#   thickness_mm  thickness, micrometer
#   quantity      how many lie on each other
# A ring shim has its hole in a column inner_mm, which is blank for all others.
outer_mm,thickness_mm,quantity
"""


def starter_files() -> dict[str, str]:
    """File name to content of every starter file; together they can be used as they are."""
    files = {}
    for file, (kind, name, purpose) in _COPIES.items():
        text = read_text(find_data(kind, name))
        files[file] = f"# {file}: {purpose}. An invented example: put in your own numbers.\n{text}"
    files["damper.toml"] = files["damper.toml"].replace(
        f'\nname = "{EXAMPLE_DAMPER}"', f'\nname = "{STARTER_DAMPER}"'
    )
    head = files["stock.csv"].splitlines()[0]
    files["stock.csv"] = f"{head}\n{_STOCK_COLUMNS}{_without_comments(files['stock.csv'])}"
    files["stack.csv"] = _STACK_HEAD + "\n".join(_fitted_rows()) + "\n"
    return files


def write_starter(folder: Path) -> list[Path]:
    """Write every starter file into a folder, which is made where needed; the files in order.

    Raises BadInput and writes nothing when one of them exists or the folder cannot be made.
    """
    if folder.exists() and not folder.is_dir():
        raise BadInput(f"{folder}: is a file; allowed: the path of a folder")
    files = {folder / name: text for name, text in starter_files().items()}
    there = [path for path in files if path.exists() or path.is_symlink()]
    if there:
        raise BadInput(
            f"{path}: exists already and is not overwritten; allowed: another folder, or move it "
            "away"
            for path in there
        )
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        reason = (error.strerror or type(error).__name__).lower()
        raise BadInput(f"{folder}: cannot be made ({reason})") from None
    for path, text in files.items():
        atomic_write_text(path, text)
    return list(files)


def _without_comments(text: str) -> str:
    lines = [line for line in text.splitlines() if not line.startswith("#")]
    return "\n".join(lines) + "\n"


def _fitted_rows() -> list[str]:
    """Rows of the example damper's compression stack."""
    stack = read_damper(EXAMPLE_DAMPER).circuit("compression").searched.fitted
    groups = stack.groups if stack is not None else ()
    return [f"{g.shim.outer_mm:g},{g.shim.thickness_mm:.2f},{g.quantity}" for g in groups]
