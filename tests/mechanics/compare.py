"""How far two answers to one question are apart, in the measures the bounds are stated in."""

from typing import NamedTuple

import numpy as np

from optimiser.mechanics import Deflection
from optimiser.mechanics.reference import ReferenceDeflection

from .stacks import Question

#: Stacks are compared up to this edge rise in face shim thicknesses, where the model is checked.
MOST_RISE = 2.0


class Apart(NamedTuple):
    """Largest differences over the pressures at which the edge rises less than MOST_RISE."""

    lift: float  # of the edge rise, or of half a thickness where that is more
    moment: float  # of any shim at the clamp, per largest one of the stack
    stress: float  # of the stack's peak, per its largest one


def apart(
    question: Question, found: Deflection, reference: Deflection | ReferenceDeflection
) -> Apart:
    """Compare two answers at the same pressures."""
    thickness = question.shims[0][1]
    rise = reference.edge_deflection_mm
    inside = np.abs(rise) < MOST_RISE * thickness
    if not inside.any():
        return Apart(0.0, 0.0, 0.0)
    lift = np.abs(found.edge_deflection_mm - rise) / np.maximum(np.abs(rise), thickness / 2)
    moment = np.abs(found.clamp_moment_n - reference.clamp_moment_n)[inside]
    stress = np.abs(found.peak_stress_mpa.max(axis=1) - reference.peak_stress_mpa.max(axis=1))
    return Apart(
        float(np.max(lift[inside])),
        float(np.max(moment) / np.max(np.abs(reference.clamp_moment_n[inside]))),
        float(np.max(stress[inside]) / np.max(reference.peak_stress_mpa[inside])),
    )
