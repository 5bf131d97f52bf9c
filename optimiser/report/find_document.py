"""A search's result as one JSON document (design: machine-readable surface)."""

from typing import Any

from optimiser.fitting.spread import Likely
from optimiser.prediction import Prediction
from optimiser.report.curve import Named
from optimiser.report.document import as_json, curve_document
from optimiser.report.find import exchanged_shims
from optimiser.results import Answer
from optimiser.search.find import Found, Proposal
from optimiser.stack import Stack


def find_document(answer: Answer) -> dict[str, Any]:
    """Every direction under ``circuits``, and the first one's keys at the top as well.

    ``evaluations``, ``seconds`` and what belongs to the whole order stand at the top: those of
    all directions together. Lengths mm, velocities m/s, forces N, stresses MPa.
    """
    order = answer.order
    circuits = {
        found.order.setup.direction: _circuit(answer, place)
        for place, found in enumerate(answer.found)
    }
    document = {
        **next(iter(circuits.values())),
        "damper": order.damper.name,
        "steel": order.steel.name,
        "oil": order.oil.name,
        "oil_temp_c": order.oil_temp_c,
        "stock": order.stock_name,
        "seed": order.seed,
        "evaluations": answer.evaluations,
        "seconds": answer.seconds,
        "workers": answer.workers,
        "cut_short": answer.cut_short,
        "notes": list(order.notes),
        "inputs": [file.model_dump() for file in order.inputs],
        "circuits": circuits,
    }
    converted: dict[str, Any] = as_json(document)
    return converted


def result_document(answer: Answer) -> dict[str, Any]:
    """What ``result.json`` holds: the document, and the complete order to run it again."""
    return {**find_document(answer), "order": answer.order.record()}


def _circuit(answer: Answer, place: int) -> dict[str, Any]:
    found, order = answer.found[place], answer.found[place].order
    likely = answer.likely[place] if answer.likely else None
    stacks = [
        _stack(found, proposal) | _band(likely, number)
        for number, proposal in enumerate(found.proposals)
    ]
    stacks[0] |= _in_full(answer.best[place])
    return {
        "circuit": order.setup.direction,
        "valve": order.setup.valve.name,
        "target": order.target.record(),
        "stacks": stacks,
        "limits": _limits(found),
        "reachable": found.feasibility.reachable,
        "outside": [vars(point) for point in found.feasibility.outside],
        "fitted": _shims(order.fitted) if order.fitted else None,
        "click_range": order.click_range,
        "clicks_range": order.setup.clicks_range,
        "rank_by": answer.order.rank_by,
        "rank_rule": answer.order.rank_rule,
        **_drawn(likely),
        "evaluations": found.evaluations,
        "complete": found.complete,
        "seconds": found.seconds,
        "seconds_model": found.seconds_model,
        "seconds_library": found.seconds_library,
    }


def _stack(found: Found, proposal: Proposal) -> dict[str, Any]:
    bands, fitted = proposal.bands, found.order.fitted
    out, into = exchanged_shims(fitted, proposal.stack) if fitted else ([], [])
    return {
        "shims": _shims(proposal.stack),
        "measured_shims": _shims(proposal.real_stack),
        "clicks": proposal.clicks,
        "error_percent": proposal.error_percent,
        "worst": vars(proposal.worst),
        "bands": vars(bands),
        "parts": proposal.parts,
        "sizes": proposal.sizes,
        "utilisation": proposal.utilisation,
        "height_mm": proposal.stack.height_mm,
        "variants": proposal.variants,
        "changed": proposal.changed,
        "take_out": [str(group) for group in out],
        "put_in": [str(group) for group in into],
        "rise_thicknesses": proposal.rise,
        "outside_model": proposal.outside_model,
        "velocity_m_s": found.order.target.velocity_m_s,
        "force_n": proposal.force_n,
    }


def _band(likely: Likely | None, place: int) -> dict[str, Any]:
    """5 and 95 % of one stack's force and its chance; empty where no bands were wanted."""
    if likely is None:
        return {}
    bands = likely.bands[place]
    return {
        "force_p05_n": None if bands is None else bands.p05_n,
        "force_p95_n": None if bands is None else bands.p95_n,
        "chance_within": None if bands is None else likely.chance[place],
    }


def _drawn(likely: Likely | None) -> dict[str, Any]:
    if likely is None:
        return {}
    return {
        "within_percent": likely.within_percent,
        "samples": likely.spread.samples,
        "band_source": likely.spread.origin,
    }


def _shims(stack: Stack) -> list[dict[str, Any]]:
    """Groups face first, the clamp shims last."""
    return [
        {
            "outer_mm": group.shim.outer_mm,
            "thickness_mm": group.shim.thickness_mm,
            "quantity": group.quantity,
        }
        | ({} if group.shim.inner_mm is None else {"inner_mm": group.shim.inner_mm})
        for group in stack.groups
    ]


def _in_full(best: Prediction) -> dict[str, Any]:
    """What is computed for the best stack only; ``stress`` has an entry a bending shim."""
    curve = curve_document([Named("stack 1", best)])
    names = ("force_closed_n", "force_open_n", "pressure_mpa", "lift_mm", "bleed_share")
    return {
        **{name: curve[name] for name in names},
        "stress": curve["shims"],
        "cavitation_m_s": curve["cavitation_m_s"],
        "warnings": curve["warnings"],
    }


def _limits(found: Found) -> dict[str, Any]:
    limits = found.limits
    return {
        "velocity_m_s": found.order.target.velocity_m_s,
        "softest_possible_n": limits.bare_n,
        "softest_in_stock_n": limits.softest_n,
        "firmest_in_stock_n": limits.firmest_n,
        "firmest_possible_n": limits.shut_n,
        "others_n": limits.others_n,
    }
