"""The report of ``stock --what-to-buy``."""

from dataclasses import dataclass
from typing import Any

from rich.text import Text

from optimiser.report.document import as_json
from optimiser.report.look import Look
from optimiser.report.paragraph import paragraph
from optimiser.report.tune_table import purchase_table
from optimiser.report.tune_table_document import purchase_document
from optimiser.search.find import Order
from optimiser.tuning.buying import Purchase
from optimiser.tuning.candidate import Candidate


@dataclass(frozen=True)
class Advice:
    """A search from a stock list, its best stack, and the purchases that bring it nearer."""

    stock: str
    order: Order
    best: Candidate
    tolerance_percent: float
    purchases: tuple[Purchase[int], ...]

    @property
    def good_enough(self) -> bool:
        """The list as it is will do."""
        return self.best.sound and self.best.error_percent <= self.tolerance_percent


def show_advice(advice: Advice, look: Look, quiet: bool = False) -> None:
    """Print the report."""
    setup, best = advice.order.setup, advice.best
    look.console.print(
        Text(f"{advice.stock} for {setup.damper.name}, {setup.direction}", style="bold")
    )
    for line in paragraph(f"wanted: {advice.order.target.origin}", look):
        look.console.print(line)
    look.console.print(Text(f"best stack now: {best.error_percent:.2f} % from the target"))
    if not best.sound:
        look.console.print(Text("  (short life or outside what the model was checked for)"))
    for group in best.stack.lines() if not quiet else ():
        look.console.print(Text(f"  {group}"))
    if advice.good_enough:
        sentence = f"Nothing to buy: that is within {advice.tolerance_percent:g} %."
    elif not advice.purchases:
        sentence = "No size that can be bought brings it nearer."
    else:
        look.console.print("")
        look.console.print(purchase_table(advice.purchases, look, "good\nenough"))
        sentence = (
            f"Good enough: 1 where the error is {advice.tolerance_percent:g} % or less; then by "
            "fewest sizes and least error. Number of shims: what the best stack takes beyond the "
            "drawer."
        )
    for line in paragraph(sentence, look):
        look.console.print(line)


def advice_document(advice: Advice) -> dict[str, Any]:
    """The advice for JSON."""
    document = {
        "stock": advice.stock,
        "damper": advice.order.setup.damper.name,
        "circuit": advice.order.setup.direction,
        "target": advice.order.target.record(),
        "tolerance_percent": advice.tolerance_percent,
        "good_enough": advice.good_enough,
        "error_percent": advice.best.error_percent,
        "stack": advice.best.stack.lines(),
        "clicks": advice.best.clicks,
        "to_buy": [
            {**purchase_document(one), "error_percent": one.error_percent[0]}
            for one in advice.purchases
        ],
    }
    converted: dict[str, Any] = as_json(document)
    return converted
