"""The search of one cell, for stacks that last.

A table is made to be ridden for years: a stack that would break, or one outside the range the model
was checked in, is no answer where another will do. So a worn stack counts as worse the more it is
worn, and what is judged by the reported fidelity are the best of those that last.
"""

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from optimiser.search.archive import Archive
from optimiser.search.counts import Plans
from optimiser.search.engine import Search
from optimiser.search.evaluator import Evaluator, Scores
from optimiser.search.find import Order
from optimiser.search.rank import rank
from optimiser.stack import Stack
from optimiser.tuning.candidate import Candidate
from optimiser.tuning.judge import Judge

#: Utilisation from which a stack counts as worn: short of 1, as the quick model is up to 3 % low.
WORN = 0.96
#: Added to the misfit for each 1 of utilisation above that (a fraction, in quadrature).
WEIGHT = 3.0
#: Plans judged by the reported fidelity: clearly different ones, and simply the best.
DIFFERENT, BEST = 12, 16
#: Share of the evaluations spent once more on the target corrected by what was judged.
CORRECTED_SHARE = 0.25
_LEAST_CORRECTED = 200


@dataclass(frozen=True)
class LongLived:
    """An evaluator whose misfit has one more entry: how far a stack is worn."""

    evaluator: Evaluator

    def evaluate(self, plans: Plans) -> Scores:
        """Scores of (plans, width) rows; ``error`` stays the length of the misfit's rows."""
        scores = self.evaluator.evaluate(plans)
        worn = WEIGHT * np.maximum(scores.utilisation - WORN, 0.0)
        misfit = np.column_stack([scores.misfit, worn])
        return replace(scores, error=np.hypot(scores.error, worn), misfit=misfit)


def search_cell(order: Order) -> tuple[list[Candidate], int]:
    """Candidates at the `reported` fidelity, and how many stacks were tried.

    Searches, judges the best, and searches a little more on the target corrected by the best
    stack's judgement. Raises NothingBuildable.
    """
    judge = Judge(order)
    first = _searched(judge, order, order.start)
    found = judge.reported(_worth_judging(first))
    best = min(found, key=lambda one: (not one.sound, *one.order))
    judge.correct_by(best.stack)
    most = max(int(CORRECTED_SHARE * order.settings.evaluations), _LEAST_CORRECTED)
    settings = replace(order.settings, evaluations=most, generations_share=0.1)
    start = [one.stack for one in sorted(found, key=lambda one: (not one.sound, *one.order))]
    second = _searched(judge, replace(order, settings=settings), start[:BEST])
    found += judge.reported(_worth_judging(second))
    return found, judge.evaluations + len(first) + len(second)


def _searched(judge: Judge, order: Order, start: Iterable[Stack]) -> Archive:
    evaluator = LongLived(judge.model)
    return Search(judge.space, evaluator, order.seed, order.settings, start).run().archive


def _worth_judging(archive: Archive) -> Plans:
    """Plans (plans, width) of the least error that stay in the model's range, then the others."""
    different = [row.plan for row in rank(archive, "error", DIFFERENT)]
    record = archive.record()
    order = np.lexsort((record.scores.error, record.beyond))[:BEST]
    return np.unique(np.concatenate([np.stack(different), record.plans[order]]), axis=0)
