"""Results as one JSON document (design: machine-readable surface)."""

from collections.abc import Sequence
from math import isfinite
from typing import Any

import numpy as np

from optimiser.prediction import Prediction, ShimState
from optimiser.report.curve import Named


def as_json(value: Any) -> Any:
    """A value JSON can hold: arrays become lists, NaN and infinities null."""
    if isinstance(value, np.ndarray):
        return [as_json(item) for item in value.tolist()]
    if isinstance(value, np.generic):
        return as_json(value.item())
    if isinstance(value, float):
        return value if isfinite(value) else None
    if isinstance(value, dict):
        return {key: as_json(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [as_json(item) for item in value]
    return value


def curve_document(results: Sequence[Named]) -> dict[str, Any]:
    """Every curve under ``curves``, and the first one's keys at the top as well."""
    curves = [_one_curve(result) for result in results]
    return {**curves[0], "curves": curves}


def _one_curve(result: Named) -> dict[str, Any]:
    seen = result.prediction
    setup = seen.setup
    document = {
        "label": result.label,
        "damper": setup.damper.name,
        "circuit": setup.direction,
        "valve": setup.valve.name,
        "oil": setup.oil.name,
        "oil_temp_c": setup.oil_temp_c,
        "steel": setup.steel.name,
        "clicks": seen.clicks,
        "clicks_range": setup.clicks_range,
        "stack": seen.stack.lines(),
        "clamp_mm": seen.stack.clamp_mm,
        "height_mm": seen.stack.height_mm,
        "parts": seen.stack.parts,
        **_arrays(seen),
        **_band(result),
        "shims": [_shim(shim) for shim in seen.shims],
        "utilisation": seen.utilisation,
        "cavitation_m_s": seen.cavitation_m_s,
        "outside_model": seen.outside_model,
        "warnings": list(seen.warnings),
    }
    converted: dict[str, Any] = as_json(document)
    return converted


def _arrays(seen: Prediction) -> dict[str, Any]:
    names = (
        "velocity_m_s",
        "force_n",
        "force_closed_n",
        "force_open_n",
        "pressure_mpa",
        "shim_pressure_mpa",
        "lift_mm",
        "bleed_share",
        "edge_rise_mm",
        "rise_thicknesses",
    )
    return {name: getattr(seen, name) for name in names}


def _band(result: Named) -> dict[str, Any]:
    """5 and 95 % of the force, and what they are drawn from; empty where no band was wanted."""
    spread, bands = result.spread, result.bands
    if spread is None:
        return {}
    return {
        "force_p05_n": None if bands is None else bands.p05_n,
        "force_p95_n": None if bands is None else bands.p95_n,
        "samples": spread.samples,
        "seed": spread.seed,
        "band_source": spread.origin,
    }


def _shim(shim: ShimState) -> dict[str, Any]:
    return {
        "outer_mm": shim.outer_mm,
        "thickness_mm": shim.thickness_mm,
        "inner_mm": shim.inner_mm,
        "peak_stress_mpa": shim.peak_stress_mpa,
        "peak_at_mm": shim.peak_at_mm,
        "at_clamp": shim.at_clamp,
        "utilisation": shim.utilisation,
    }
