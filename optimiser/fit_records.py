"""The record of a fit that lies beside a calibrated damper file: what bands are drawn from."""

import json
from math import isclose
from pathlib import Path

from optimiser.damper import Damper
from optimiser.dyno_files import read_uncertainty
from optimiser.faults import BadInput
from optimiser.files import find_data, read_text
from optimiser.fitting.parameters import FRICTION, GAS, KEYS, named_directions, value_of
from optimiser.fitting.spread import SAMPLES, Spread
from optimiser.fitting.uncertainty import usual_uncertainty
from optimiser.prediction import Setup

#: Damper files hold five digits of a fitted number.
_SAME = 1e-4
_USUAL = "usual errors of a damper that was not fitted to dyno runs"


def record_of(damper_file: Path) -> Path:
    """Where the record of a fit lies: ``NAME.fit.json`` beside ``NAME.toml``."""
    return damper_file.with_suffix(".fit.json")


def record_beside(damper: str) -> Path | None:
    """The record beside a damper, by bundled name or path; None without one. Raises BadInput."""
    record = record_of(find_data("damper", damper))
    return record if record.is_file() else None


def spread_of(setup: Setup, record: Path | None, samples: int = SAMPLES, seed: int = 0) -> Spread:
    """What bands of one direction are drawn from: the ``record`` of a fit as far as it covers the
    direction, else usual errors. Raises BadInput."""
    if record is None:
        return Spread(usual_uncertainty(setup), _USUAL, samples, seed)
    known = read_uncertainty(record)
    keys = [key for key in known.of_direction(setup.direction)[0] if key != FRICTION]
    if not keys:
        origin = f"usual errors: {record.name} has no run in {setup.direction}"
        return Spread(usual_uncertainty(setup), origin, samples, seed)
    _check_there(setup, keys, record)
    origin = f"the errors in {record.name}"
    if not _is_of(setup.damper, record):
        origin += " (the damper file was changed since)"
    return Spread(known, origin, samples, seed)


def _check_there(setup: Setup, keys: list[str], record: Path) -> None:
    """Raise BadInput for numbers that the damper has not: a record of another damper."""
    faults = []
    for key in keys:
        try:
            value_of(setup.damper, key, setup.direction)
        except KeyError:
            faults.append(
                f"{record}: names is {setup.direction}.{key}, which {setup.damper.name} has not; "
                "allowed: the record of a fit of this damper"
            )
    if faults:
        raise BadInput(faults)


def _is_of(damper: Damper, record: Path) -> bool:
    """Whether the damper has the numbers that the fit came to, as far as the record tells."""
    listed = json.loads(read_text(record)).get("parameters")
    for item in listed if isinstance(listed, list) else ():
        key, directions = named_directions(str(item.get("name", GAS)))
        if key not in KEYS or key == GAS or getattr(damper, directions[0]) is None:
            continue
        now = value_of(damper, key, directions[0])
        if not isclose(now, float(item.get("value", now)), rel_tol=_SAME, abs_tol=_SAME):
            return False
    return True
