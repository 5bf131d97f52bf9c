"""A tune table as one JSON document. Nothing in it depends on how long it took."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from optimiser.report.document import as_json
from optimiser.stack import Stack
from optimiser.tuning.buying import Purchase
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.cells import Place
from optimiser.tuning.changes import moved, sentence
from optimiser.tuning.kits import TableKit
from optimiser.tuning.table import TuneTable


def table_document(
    table: TuneTable, purchases: Sequence[Purchase[Place]] | None = None
) -> dict[str, Any]:
    """The table, the changes between rows, the kits and, where asked for, what to buy."""
    request = table.materials.request
    document = {
        "name": request.name,
        "frame": table.materials.frame.name,
        "damper": table.materials.setups[0].damper.name,
        "oil_temp_c": table.materials.setups[0].oil_temp_c,
        "rider_masses_kg": request.rider_masses_kg,
        "feels": [feel.name for feel in table.materials.feels],
        "circuits": request.circuits,
        "tolerance_percent": request.tolerance_percent,
        "change_price_percent": request.change_price_percent,
        "one_drawer": request.one_drawer,
        "seed": request.seed,
        "cells": [_cell(table, place) for place in sorted(table.cells)],
        "changes": [_change(table, before, after) for before, after in table.changes],
        "kit": None if table.kit is None else _kit(table, table.kit),
        "kits": [_kit(table, kit) for kit in table.kits],
        "out_of_tolerance": [_where(table, place) for place in table.short],
        "to_buy": None if purchases is None else [_purchase(table, one) for one in purchases],
        "evaluations": table.evaluations,
    }
    converted: dict[str, Any] = as_json(document)
    return converted


def purchase_document(purchase: Purchase[Any]) -> dict[str, Any]:
    """Sizes to buy and how many; the cells are left to the caller."""
    return {
        "sizes": [
            {"outer_mm": shim.outer_mm, "thickness_mm": shim.thickness_mm, "quantity": count}
            for shim, count in zip(purchase.sizes, purchase.pieces, strict=True)
        ],
        "fixed_cells": len(purchase.fixed),
        "fixed_per_size": purchase.fixed_per_size,
        "mean_error_percent": purchase.mean_percent,
    }


def _where(table: TuneTable, place: Place) -> dict[str, Any]:
    request = table.materials.request
    return {
        "rider_kg": request.rider_masses_kg[place.mass],
        "feel": table.materials.feels[place.feel].name,
        "circuit": request.circuits[place.circuit],
    }


def _cell(table: TuneTable, place: Place) -> dict[str, Any]:
    ride = table.derived[place.mass, place.feel].ride
    cell, one = table.cells[place], table.chosen.get(place)
    return {
        **_where(table, place),
        "coil_n_mm": ride.coil_n_mm,
        "sag_percent": ride.sag_percent,
        "wheel_rate_n_mm": ride.wheel_rate_n_mm,
        "velocity_m_s": cell.order.target.velocity_m_s,
        "wanted_n": cell.order.target.force_n,
        "reachable": cell.feasible.reachable,
        "outside": [point.sentence for point in cell.feasible.outside],
        "candidates": len(table.candidates.get(place, ())),
        "reason": table.reasons.get(place),
        **(_NOTHING if one is None else _stack(one)),
    }


_NOTHING: Mapping[str, None] = dict.fromkeys(
    ("shims", "clicks", "error_percent", "worst", "parts", "utilisation", "force_n")
)


def _stack(one: Candidate) -> dict[str, Any]:
    return {
        "shims": _shims(one.stack),
        "clicks": one.clicks,
        "error_percent": one.error_percent,
        "worst": {"velocity_m_s": one.worst_m_s, "percent": one.worst_percent},
        "parts": one.stack.parts,
        "utilisation": one.utilisation,
        "force_n": one.force_n,
    }


def _shims(stack: Stack) -> list[dict[str, Any]]:
    return [
        {
            "outer_mm": group.shim.outer_mm,
            "thickness_mm": group.shim.thickness_mm,
            "quantity": group.quantity,
        }
        for group in stack.groups
    ]


def _change(table: TuneTable, before: Place, after: Place) -> dict[str, Any]:
    old, new = table.chosen[before].stack, table.chosen[after].stack
    out, into = moved(old, new)
    masses = table.materials.request.rider_masses_kg
    return {
        "feel": table.materials.feels[before.feel].name,
        "circuit": table.materials.request.circuits[before.circuit],
        "from_kg": masses[before.mass],
        "to_kg": masses[after.mass],
        "take_out": [str(group) for group in out],
        "put_in": [str(group) for group in into],
        "moved": sum(group.quantity for group in (*out, *into)),
        "sentence": sentence(old, new),
    }


def _kit(table: TuneTable, one: TableKit) -> dict[str, Any]:
    kit, shelf = one.kit, table.shelf
    return {
        "pieces": kit.pieces,
        "sizes": kit.sizes,
        "cost": kit.cost,
        "mean_error_percent": kit.error_percent,
        "worst_error_percent": kit.worst_percent,
        "proven": kit.proven,
        "shims": [
            {
                "outer_mm": shelf.sizes[number][0],
                "inner_mm": shelf.sizes[number][2],
                "thickness_mm": shelf.sizes[number][1],
                "quantity": int(kit.quantity[number]),
            }
            for number in np.flatnonzero(kit.quantity)
        ],
        "cells": [
            {
                **_where(table, place),
                "stack": candidate.stack.lines(),
                "clicks": candidate.clicks,
                "error_percent": candidate.error_percent,
            }
            for place, candidate in sorted(one.stacks.items(), key=lambda item: item[0])
        ],
    }


def _purchase(table: TuneTable, purchase: Purchase[Place]) -> dict[str, Any]:
    errors = purchase.error_percent
    return {
        **purchase_document(purchase),
        "cells": [
            {
                **_where(table, place),
                "error_percent": errors[place],
                "fixed": place in purchase.fixed,
            }
            for place in sorted(errors)
        ],
    }
