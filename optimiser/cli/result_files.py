"""The folder that ``find --out`` writes."""

import csv
import json
from io import StringIO
from pathlib import Path

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.files import atomic_write_bytes, atomic_write_text, read_text, write_stack
from optimiser.report.find_document import result_document
from optimiser.results import Answer, is_result

RESULT = "result.json"
STACKS = "stacks.csv"
CHART = "chart.svg"
_DIRECTIONS: tuple[Direction, Direction] = ("compression", "rebound")
_COLUMNS = (
    "rank",
    "circuit",
    "position",
    "outer_mm",
    "thickness_mm",
    "quantity",
    "clicks",
    "error_percent",
)


def best_stack_name(direction: Direction) -> str:
    """File of a direction's best stack."""
    return f"stack-{direction}-1.csv"


def check_folder(folder: Path) -> None:
    """Raise BadInput where a result cannot go: a file, or a folder that holds other things."""
    if not folder.exists():
        return
    if not folder.is_dir():
        raise BadInput(f"--out: {folder} is a file; allowed: a folder")
    if any(folder.iterdir()) and not _holds_result(folder):
        raise BadInput(
            f"--out: {folder} is not empty and holds no former result; allowed: a new or empty "
            "folder, or one that find --out wrote"
        )


def write_folder(folder: Path, answer: Answer, chart: bytes) -> list[Path]:
    """Write the result, each file whole or not at all; the files. Raises BadInput.

    The best stack of each direction is written as ``curve --stack`` reads it, in measured
    thicknesses, so that ``curve`` says the same of it.
    """
    check_folder(folder)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        reason = (error.strerror or type(error).__name__).lower()
        raise BadInput(f"--out: {folder} cannot be made ({reason})") from None
    text = json.dumps(result_document(answer), indent=2, allow_nan=False, ensure_ascii=False)
    atomic_write_text(folder / RESULT, text + "\n")
    atomic_write_text(folder / STACKS, _stacks_csv(answer))
    written = [folder / RESULT, folder / STACKS]
    best = {one.order.setup.direction: one.proposals[0].real_stack for one in answer.found}
    for direction in _DIRECTIONS:
        file = folder / best_stack_name(direction)
        if direction in best:
            write_stack(file, best[direction])
            written.append(file)
        else:
            file.unlink(missing_ok=True)  # of a former result
    atomic_write_bytes(folder / CHART, chart)
    return [*written, folder / CHART]


def _holds_result(folder: Path) -> bool:
    file = folder / RESULT
    if not file.is_file():
        return False
    try:
        return is_result(json.loads(read_text(file)))
    except (json.JSONDecodeError, BadInput):
        return False


def _stacks_csv(answer: Answer) -> str:
    """Every stack, one line a group, face first."""
    text = StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(_COLUMNS)
    for found in answer.found:
        for rank, proposal in enumerate(found.proposals, start=1):
            for position, group in enumerate(proposal.stack.groups, start=1):
                writer.writerow(
                    [
                        rank,
                        found.order.setup.direction,
                        position,
                        group.shim.outer_mm,
                        group.shim.thickness_mm,
                        group.quantity,
                        proposal.clicks,
                        f"{proposal.error_percent:.3f}",
                    ]
                )
    return text.getvalue()
