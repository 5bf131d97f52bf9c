"""Every cell of a table at once from one drawer: an exact choice among candidates."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp

from optimiser.search.sizes import Floats, Ints
from optimiser.tuning.kit import Choices

#: What a cell left empty counts as, in points of error: more than any filled one.
EMPTY = 1000.0
_BRANCHES = 20_000


@dataclass(frozen=True)
class Assignment:
    """``choice`` the candidate of each cell, None where none is left for it.

    ``proven`` False when the solver stopped before it was sure that nothing is better.
    """

    choice: tuple[int | None, ...]
    proven: bool


def assign(cells: Sequence[Choices], quantity: Ints) -> Assignment:
    """As many cells as possible filled at once, then the least sum of errors.

    ``cells`` one a cell and circuit; ``quantity`` (sizes,) shims in the drawer. Solved as an
    integer programme (HiGHS).
    """
    if not cells:
        return Assignment((), True)
    errors: list[Floats] = []
    uses: list[Ints] = []
    owner: list[int] = []
    for number, cell in enumerate(cells):
        count = len(cell.error_percent)
        errors += [cell.error_percent, np.array([EMPTY])]
        uses += [cell.uses, np.zeros((1, len(quantity)), dtype=np.int64)]
        owner += [number] * (count + 1)
    cost, of = np.concatenate(errors), np.array(owner)
    one_each = (of == np.arange(len(cells))[:, None]).astype(float)
    found = milp(
        cost,
        integrality=np.ones(cost.size, dtype=np.int64),
        bounds=Bounds(0.0, 1.0),
        constraints=[
            LinearConstraint(one_each, 1.0, 1.0),
            LinearConstraint(np.concatenate(uses).T.astype(float), -np.inf, quantity),
        ],
        options={"node_limit": _BRANCHES, "mip_rel_gap": 0.0},
    )
    if found.x is None:
        return Assignment((None,) * len(cells), False)
    choice: list[int | None] = []
    for number, cell in enumerate(cells):
        picked = int(np.argmax(found.x[of == number]))
        choice.append(picked if picked < len(cell.error_percent) else None)
    return Assignment(tuple(choice), found.status == 0)
