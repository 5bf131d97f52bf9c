"""``shimwright fit``: calibrate a damper file to dyno runs."""

from json import dumps
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from optimiser.cli.notes import note, note_when_preparing, print_document
from optimiser.cli.options import JsonOption, QuietOption, SteelOption
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from optimiser.dyno_files import DynoRuns
    from optimiser.fitting.calibrate import Calibration


def fit(
    request: Annotated[
        str,
        typer.Argument(
            metavar="NAME|FILE",
            help="Request (TOML): the damper, and for every dyno run its file, circuit, stack, "
            "clicks and oil temperature.",
        ),
    ],
    out: Annotated[
        Path | None,
        typer.Option(
            "--out",
            metavar="FILE.toml",
            help="Write the calibrated damper file, and beside it FILE.fit.json for prediction "
            "bands.",
        ),
    ] = None,
    damper: Annotated[
        str | None,
        typer.Option(
            "--damper", metavar="NAME|FILE", help="Damper, instead of the one the request names."
        ),
    ] = None,
    steel: SteelOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Calibrate a damper file to dyno runs of known stacks.

    Finds the loss coefficients, bleed, friction and preload that make prediction and runs agree,
    how sure each number is, and how well a run is predicted that was left out of the fit.
    """
    from optimiser.cli.inputs import read_given
    from optimiser.dyno_files import damper_of, find_fit_request, read_fit_request, read_runs
    from optimiser.files import find_data
    from optimiser.fitting.calibrate import calibrate
    from optimiser.report.fit import fit_document, show_fit
    from optimiser.report.look import look_of

    path = find_fit_request(request)
    wanted = read_fit_request(path)
    name = damper or damper_of(path, wanted)
    given = read_given(name, steel)
    runs = read_runs(path, wanted, given.damper)
    source = find_data("damper", name)
    if out is not None:
        _check_out(out, [source, path, *runs.files])
    note_when_preparing(quiet)
    result = calibrate(
        given.damper, given.steel, given.oil, runs.runs, wanted.free, wanted.gas_offset_n
    )
    document = fit_document(result, runs.notes)
    document["inputs"] = [*(vars(file) for file in given.files), *_fingerprints(path, runs)]
    if out is not None:
        _write(out, source, result, document)
    if json:
        print_document(document)
    else:
        show_fit(result, runs.notes, look_of(), quiet)
    if out is not None:
        note(f"calibrated damper written to {out} and {_record_of(out)}", quiet)


def _record_of(out: Path) -> Path:
    return out.with_suffix(".fit.json")


def _check_out(out: Path, inputs: list[Path]) -> None:
    """Raise BadInput for a file that is no TOML, or that one of the inputs would be lost to."""
    faults = []
    if out.suffix != ".toml":
        faults.append(f"--out is {out}; allowed: the path of a .toml file")
    if any(out.resolve() == file.resolve() for file in inputs):
        faults.append(f"--out is {out}, which this fit is made from; allowed: another name")
    if not out.parent.is_dir():
        faults.append(f"--out is {out}; the folder {out.parent} does not exist; make it first")
    if faults:
        raise BadInput(faults)


def _fingerprints(path: Path, runs: "DynoRuns") -> list[dict[str, str]]:
    from optimiser.files import fingerprint

    named = [("fit request", path), *(("dyno run", file) for file in runs.files)]
    return [
        {"kind": kind, "name": str(file), "fingerprint": fingerprint(file)} for kind, file in named
    ]


def _write(out: Path, source: Path, result: "Calibration", document: dict[str, Any]) -> None:
    """The calibrated damper file, read again before it is kept, and the record of the fit."""
    from optimiser.checking import validate
    from optimiser.damper import Damper
    from optimiser.files import atomic_write_text, read_text
    from optimiser.fitting.write import calibrated_text
    from optimiser.parsing import parse_toml

    used = [
        f"{file['kind']} {Path(file['name']).name}, {file['fingerprint']}"
        for file in document["inputs"]
    ]
    text = calibrated_text(read_text(source), result, used, _moved(out, source))
    validate(Damper, parse_toml(text, str(out)), str(out))
    atomic_write_text(out, text)
    atomic_write_text(_record_of(out), dumps(document, indent=2, allow_nan=False) + "\n")


def _moved(out: Path, source: Path) -> list[Any]:
    """Oil and steel given as paths, so that they lead to the same files from the new folder."""
    import os

    from optimiser.files import is_path
    from optimiser.fitting.damper_text import Change

    changes = []
    for key in ("oil", "steel"):
        named = _as_written(source, key)
        if named is not None and is_path(named) and not Path(named).expanduser().is_absolute():
            goal = os.path.relpath((source.parent / named).resolve(), out.parent.resolve())
            if goal != named:
                changes.append(Change((key,), dumps(goal), "path from this folder"))
    return changes


def _as_written(source: Path, key: str) -> str | None:
    from optimiser.files import read_toml

    value = read_toml(source).get(key)
    return value if isinstance(value, str) else None
