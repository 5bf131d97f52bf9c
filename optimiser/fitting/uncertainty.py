"""How sure a damper's numbers and a stack's parts are: what the prediction bands are drawn from."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np

from optimiser.damper import Direction
from optimiser.faults import BadInput
from optimiser.fitting.calibrate import Calibration
from optimiser.fitting.parameters import (
    BLEED,
    CURTAIN,
    FRICTION,
    GAS,
    KEYS,
    LOADED,
    PORTS,
    PRELOAD,
    named_directions,
    parameter,
)
from optimiser.hydraulics.lift import Floats
from optimiser.materials import Tolerance
from optimiser.prediction import Setup

#: Spread of a micrometer reading, mm (one standard deviation; common practice, no source).
MEASURED_MM = 0.002
#: Needle play, clicks to either side, and oil temperature, C to either side, unless stated.
USUAL_PLAY = 0.5
USUAL_TEMPERATURE_C = 5.0
#: Error of the model itself for a damper never put on a dyno, %.
UNFITTED_PERCENT = 5.0
#: Of a damper never put on a dyno these numbers are known to half a scale (see Parameter.scale).
_UNFITTED = (CURTAIN, PORTS, LOADED, BLEED, FRICTION)
Thickness = Tolerance | Literal["measured"]


@dataclass(frozen=True, eq=False)
class Uncertainty:
    """Spread of everything a prediction rests on.

    ``names`` of the uncertain numbers (as :attr:`Parameter.name`) with their ``covariance`` (p, p),
    each in its own unit; their means are the damper's own values. ``model_percent``: error that all
    forces share beyond those, one standard deviation. ``thickness``: class of the strip, or
    "measured"; None: the class of the steel. ``clicks_play``: either side, evenly spread.
    ``oil_temp_span_c``: either side of the setup's temperature, evenly spread.
    """

    names: tuple[str, ...]
    covariance: Floats
    model_percent: float
    thickness: Thickness | None = None
    clicks_play: float = USUAL_PLAY
    oil_temp_span_c: float = USUAL_TEMPERATURE_C

    def of_direction(self, direction: Direction) -> tuple[list[str], Floats]:
        """Keys and covariance of the numbers that matter for one direction."""
        chosen = [
            place
            for place, name in enumerate(self.names)
            if direction in named_directions(name)[1] and name != GAS
        ]
        keys = [named_directions(self.names[place])[0] for place in chosen]
        return keys, self.covariance[np.ix_(chosen, chosen)]


def usual_uncertainty(setup: Setup) -> Uncertainty:
    """Spread for a damper never put on a dyno: round figures, common practice, no source."""
    seat = setup.valve.seat
    keys = (*_UNFITTED, PRELOAD) if seat and seat.height_mm > 0.0 else _UNFITTED
    items = [parameter(setup.damper, key, setup.direction) for key in keys]
    spreads = np.array([0.5 * item.scale for item in items])
    names = tuple(item.name for item in items)
    return Uncertainty(names, np.diag(spreads**2), UNFITTED_PERCENT)


def fitted_uncertainty(result: Calibration) -> Uncertainty:
    """Spread of a calibrated damper: the fit's covariance, and as error of the model what runs left
    out of the fit were missed by beyond the scatter of their points."""
    missed = result.new_stack_percent or result.left_out_percent
    if missed is None:
        model = UNFITTED_PERCENT
    else:
        model = float(np.sqrt(max(missed**2 - result.scatter_percent**2, 0.0)))
    return Uncertainty(
        tuple(item.name for item in result.found.parameters), result.found.covariance, model
    )


def uncertainty_record(known: Uncertainty) -> dict[str, Any]:
    """As plain lists and numbers, for a JSON file."""
    return {
        "names": list(known.names),
        "covariance": known.covariance.tolist(),
        "model_percent": known.model_percent,
    }


def uncertainty_of_record(record: Mapping[str, Any], file: str) -> Uncertainty:
    """From what :func:`uncertainty_record` made. Raises BadInput."""
    try:
        names = tuple(str(name) for name in record["names"])
        covariance = np.array(record["covariance"], dtype=float).reshape(len(names), len(names))
        model = float(record["model_percent"])
    except (KeyError, TypeError, ValueError):
        raise BadInput(
            f"{file}: is no record of a fit; allowed: the .fit.json that fit --out writes"
        ) from None
    unknown = [name for name in names if named_directions(name)[0] not in KEYS]
    if unknown:
        raise BadInput(f"{file}: names is {', '.join(unknown)}; allowed: {', '.join(KEYS)}")
    sound = np.isfinite(covariance).all() and np.allclose(covariance, covariance.T)
    if not sound or np.linalg.eigvalsh(covariance).min(initial=0.0) < -1e-9 or model < 0.0:
        raise BadInput(f"{file}: covariance is no covariance; allowed: symmetric, none negative")
    return Uncertainty(names, covariance, model)
