"""Stacks of one cell by both models: many by the quick one, the chosen by the reported one."""

from collections.abc import Sequence

import numpy as np

from optimiser.search.counts import Plans
from optimiser.search.evaluate import ModelEvaluator, middle_clicks
from optimiser.search.evaluator import Scores
from optimiser.search.final import Final, ReportedEvaluator, corrected
from optimiser.search.find import Order
from optimiser.search.neighbours import Neighbours
from optimiser.search.sizes import Ints
from optimiser.search.space import Space
from optimiser.stack import Stack
from optimiser.tuning.candidate import Candidate


class Judge:
    """Both models on the space of an order; the quick one can be corrected by one good stack.

    ``evaluations`` counts the stacks judged.
    """

    def __init__(self, order: Order, good: Stack | None = None) -> None:
        self.order = order
        self.space = Space.of(order.lines, order.setup.valve, order.limits)
        self.evaluations = 0
        clicks = order.click_range or middle_clicks(order.setup)
        self._quick = ModelEvaluator(order.setup, self.space, order.target, clicks)
        self._reported = ReportedEvaluator(order.setup, self.space, order.target, clicks)
        if good is not None:
            self.correct_by(good)

    @property
    def model(self) -> ModelEvaluator:
        """The quick model, corrected where it was."""
        return self._quick

    def plans(self, stacks: Sequence[Stack]) -> Plans:
        """Those of the stacks that the space can hold, (plans, width), each once, in order."""
        found = [self.space.from_stack(stack) for stack in stacks]
        known = {plan.tobytes(): plan for plan in found if plan is not None}
        empty = np.zeros((0, self.space.width), dtype=np.int16)
        return np.stack(list(known.values())) if known else empty

    def changed(self, stacks: Sequence[Stack]) -> Plans:
        """Every buildable plan one change away from one of the stacks, each once."""
        around = Neighbours(self.space)
        plans = self.plans(stacks)
        found = [plans[:0], *(around.single(plan) for plan in plans)]
        return np.unique(np.concatenate(found), axis=0)

    def best(self, plans: Plans, count: int) -> Plans:
        """The ``count`` plans with the least error by the quick model, long-lived ones first."""
        return plans[self.ranked(self.scores(plans))[:count]] if len(plans) else plans

    def scores(self, plans: Plans) -> Scores:
        """What the quick model says."""
        self.evaluations += len(plans)
        return self._quick.evaluate(plans)

    def ranked(self, scores: Scores) -> Ints:
        """Rows by error, those that wear out or leave the model's range last."""
        worn = (scores.utilisation >= 1.0) | (scores.rise > self.order.settings.rise_max)
        return np.lexsort((np.arange(len(scores)), scores.error, worn))

    def reported(self, plans: Plans) -> list[Candidate]:
        """What the reported fidelity says of plans."""
        return [self._candidate(plan, self._final(plan)) for plan in plans]

    def quick(self, plan: Plans, scores: Scores, row: int) -> Candidate:
        """A plan as the quick model sees it; ``scores`` hold it in ``row``."""
        force = self._quick.forces(plan.reshape(1, -1))[0]
        used, rise = float(scores.utilisation[row]), float(scores.rise[row])
        return self._candidate(plan, Final(int(scores.clicks[row]), force, used, rise))

    def _candidate(self, plan: Plans, final: Final) -> Candidate:
        target = self.order.target
        worst = target.worst(final.force_n)
        return Candidate(
            self.space.to_stack(plan),
            final.clicks,
            target.error_percent(final.force_n),
            worst.percent,
            worst.velocity_m_s,
            final.utilisation,
            final.rise,
            tuple(final.force_n.tolist()),
        )

    def _final(self, plan: Plans) -> Final:
        self.evaluations += 1
        return self._reported.judge(self.space.to_stack(plan, real=True))

    def correct_by(self, stack: Stack) -> None:
        """Reckon from now on with what the reported fidelity says of a stack."""
        plans = self.plans([stack])
        if len(plans):
            quick_n, final = self._quick.forces(plans)[0], self._final(plans[0])
            target = corrected(self.order.target, quick_n, final.force_n)
            self._quick = self._quick.with_target(target)
