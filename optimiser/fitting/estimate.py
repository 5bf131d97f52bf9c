"""Calibration: the free numbers of a damper that bring prediction and dyno runs together.

Least squares on relative force with the robust loss soft_l1, so that a few bad points do not pull
the rest. Two rounds: the second weighs by the force predicted in the first (weights that contain
the noise themselves would bias the result) and cuts off at twice the scatter found (a
median, itself robust). Covariance of an M-estimate: P. J. Huber, *Robust Statistics* (Wiley 1981)
sec. 7.6, intervals by Student's t.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import OptimizeResult, least_squares
from scipy.stats import t as student

from optimiser.damper import Damper
from optimiser.faults import BadInput
from optimiser.fitting.model import Model, Seen, sensitivity
from optimiser.fitting.parameters import GAS, Parameter, with_values
from optimiser.hydraulics.lift import Floats

#: Share of a run's largest force that joins the force an error is counted against.
LEAST_SHARE = 0.05
#: The robust loss bends at this many times the scatter.
CUT = 2.0
_FIRST_CUT = 0.05
_LEAST_SCATTER = 1e-5
#: A flat direction is known no better than this many scales (keeps the covariance finite).
FLAT_SCALES = 100.0
#: Points beyond this many times the scatter are named as outliers.
OUTLIER = 5.0
#: Nearer to a limit than this many scales counts as at it.
_AT_LIMIT = 1e-3
_MAD = 1.4826  # median absolute deviation to standard deviation of a normal law


@dataclass(frozen=True, eq=False)
class Estimate:
    """One solution: ``values`` (p,), ``covariance`` (p, p), ``relative`` (n,) force over measured
    force's weight less 1 in run order, ``scatter`` their robust standard deviation, ``freedom``
    points less free numbers, ``outliers`` (n,) marks, ``jacobian`` (n, p) per unit."""

    parameters: tuple[Parameter, ...]
    values: Floats
    covariance: Floats
    relative: Floats
    scatter: float
    freedom: int
    outliers: np.ndarray
    jacobian: Floats
    damper: Damper

    @property
    def errors(self) -> Floats:
        """Standard errors (p,), each in its number's unit."""
        return np.sqrt(np.diag(self.covariance))

    @property
    def correlation(self) -> Floats:
        """Correlation of the free numbers (p, p)."""
        errors = self.errors
        return np.asarray(self.covariance / np.outer(errors, errors))

    @property
    def half_width(self) -> Floats:
        """Half the 95 % interval of each number (p,)."""
        return self.errors * float(student.ppf(0.975, max(self.freedom, 1)))

    @property
    def at_limit(self) -> list[bool]:
        """Which numbers came to rest at a limit, where the standard error means little."""
        return [
            bool(value <= item.low or value >= item.high)
            for value, item in zip(self.values, self.parameters, strict=True)
        ]


def weight_of(force_n: Floats, steady_n: float) -> Floats:
    """Force (n,), N, each point's error is counted against: its damping, without the steady force
    of the gas, joined by a share of the largest, as a load cell's own error does not shrink with
    the force (root of the sum of squares)."""
    damping = np.abs(force_n - steady_n)
    return np.asarray(np.hypot(damping, LEAST_SHARE * damping.max()))


def estimate(model: Model, seen: Sequence[Seen], starts: Sequence[Floats]) -> Estimate:
    """Best values of the model's free numbers from prepared runs.

    ``starts``: points (p,) to begin at; the best end counts. Raises BadInput when there are fewer
    points than numbers to find.
    """
    points = sum(item.run.velocity_m_s.size for item in seen)
    wanted = len(model.parameters)
    if points < wanted + 2:
        raise BadInput(
            f"the runs hold {points} points in all; allowed: at least {wanted + 2} to fit "
            f"{wanted} numbers, or fewer free numbers"
        )
    first = [weight_of(s.run.force_n, model.steady_of(s.run, starts[0])) for s in seen]
    ends = [_solve(model, seen, start, first, _FIRST_CUT) for start in starts]
    best = min(ends, key=lambda end: float(end.cost))
    scatter = _scatter(best.fun, wanted)
    weights = [weight_of(model.force_n(s, best.x), model.steady_of(s.run, best.x)) for s in seen]
    cut = CUT * max(scatter, _LEAST_SCATTER)
    final = _solve(model, seen, best.x, weights, cut)
    return _conclude(model, seen, final, weights, cut)


def _residuals(model: Model, seen: Sequence[Seen], x: Floats, weights: list[Floats]) -> Floats:
    return np.concatenate(
        [
            (model.force_n(item, x) - item.run.force_n) / weight
            for item, weight in zip(seen, weights, strict=True)
        ]
    )


def _slopes(model: Model, seen: Sequence[Seen], x: Floats, weights: list[Floats]) -> Floats:
    return np.concatenate(
        [
            sensitivity(model, item, x) / weight[:, None]
            for item, weight in zip(seen, weights, strict=True)
        ]
    )


def _solve(
    model: Model, seen: Sequence[Seen], start: Floats, weights: list[Floats], cut: float
) -> OptimizeResult:
    low = np.array([item.low for item in model.parameters])
    high = np.array([item.high for item in model.parameters])
    margin = 1e-6 * (high - low)

    def residuals(x: Floats) -> Floats:
        return _residuals(model, seen, x, weights)

    def slopes(x: Floats) -> Floats:
        return _slopes(model, seen, x, weights)

    return least_squares(
        residuals,
        np.clip(start, low + margin, high - margin),
        slopes,
        bounds=(low, high),
        x_scale=np.array([item.scale for item in model.parameters]),
        loss="soft_l1",
        f_scale=cut,
        ftol=1e-9,
        xtol=1e-7,
        gtol=1e-10,
        max_nfev=100,
    )


def _scatter(relative: Floats, used: int) -> float:
    """Robust standard deviation of residuals (n,) after fitting ``used`` numbers."""
    share = relative.size / max(relative.size - used, 1)
    return float(_MAD * np.median(np.abs(relative)) * np.sqrt(share))


def _conclude(
    model: Model, seen: Sequence[Seen], end: OptimizeResult, weights: list[Floats], cut: float
) -> Estimate:
    relative = np.asarray(end.fun, dtype=float)
    jacobian = _slopes(model, seen, end.x, weights)
    values = [_snapped(item, x) for item, x in zip(model.parameters, end.x, strict=True)]
    freedom = relative.size - len(model.parameters)
    scatter = _scatter(relative, len(model.parameters))
    return Estimate(
        model.parameters,
        np.array(values),
        covariance_of(model.parameters, jacobian, relative, cut),
        relative,
        scatter,
        freedom,
        np.abs(relative) > OUTLIER * max(scatter, _LEAST_SCATTER),
        jacobian,
        model.damper,
    )


def _snapped(item: Parameter, value: float) -> float:
    """A value that stopped just short of a limit, at the limit."""
    slack = _AT_LIMIT * item.scale
    if value <= item.low + slack:
        return item.low
    return item.high if value >= item.high - slack else float(value)


def covariance_of(
    parameters: Sequence[Parameter], jacobian: Floats, relative: Floats, cut: float
) -> Floats:
    """Covariance (p, p) of an estimate with loss soft_l1 bent at ``cut``.

    sigma^2 (J'J)^-1 with sigma^2 = (sum psi^2 / (n - p)) / (mean psi')^2, psi = r / sqrt(1 +
    (r/cut)^2). Directions that the residuals (n,) do not depend on get a large but finite spread.
    """
    bent = 1.0 + (relative / cut) ** 2
    psi, slope = relative / np.sqrt(bent), bent**-1.5
    freedom = max(relative.size - len(parameters), 1)
    variance = float(np.sum(psi**2)) / freedom / float(np.mean(slope)) ** 2
    variance = max(variance, _LEAST_SCATTER**2)
    scale = np.array([item.scale for item in parameters])
    information = (jacobian * scale).T @ (jacobian * scale) / variance
    information += np.eye(scale.size) / FLAT_SCALES**2
    return np.asarray(np.linalg.inv(information) * np.outer(scale, scale))


def without(model: Model, kept: Estimate, name: str, value: float) -> Model:
    """The model with one number no longer free but fixed at ``value``."""
    held = next(item for item in kept.parameters if item.name == name)
    left = [item for item in kept.parameters if item.name != name]
    if held.key == GAS:
        return model.with_parameters(left, value)
    fixed = replace(model, parameters=tuple(left))
    fixed.damper = with_values(model.damper, {(held.key, held.direction): value})
    fixed.store = model.store
    return fixed
