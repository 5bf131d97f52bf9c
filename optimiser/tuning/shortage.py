"""Cells of a table that are out of tolerance, as what there is to buy for."""

from dataclasses import replace

from optimiser.tuning.buying import Need
from optimiser.tuning.cells import Place
from optimiser.tuning.table import TuneTable

#: What a cell without any stack counts as, %.
NOTHING_PERCENT = 100.0


def needs_of(table: TuneTable) -> dict[Place, Need]:
    """Every cell out of tolerance that has a stack, with what the others leave it to build from.

    The others are the other circuit of the same mass and feel, or all when the table is built at
    once from one drawer.
    """
    needs: dict[Place, Need] = {}
    for place in table.short:
        post_mm = table.materials.post_mm(place.circuit)
        stock = table.materials.stock
        for other, one in table.chosen.items():
            if other != place and _at_once(table, place, other):
                stock = stock.take(one.stack, table.materials.post_mm(other.circuit))
        order = replace(table.cells[place].order, lines=tuple(stock.for_post(post_mm)))
        chosen = table.chosen.get(place)
        known = [one for one in table.candidates.get(place, ()) if one is not chosen]
        found = (*([chosen] if chosen else []), *known)
        if found:
            error = chosen.error_percent if chosen else NOTHING_PERCENT
            needs[place] = Need(order, post_mm, found, error)
    return needs


def _at_once(table: TuneTable, place: Place, other: Place) -> bool:
    if table.materials.request.one_drawer:
        return True
    return (place.mass, place.feel) == (other.mass, other.feel)
