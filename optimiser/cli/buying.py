"""``shimwright stock --what-to-buy``: which few sizes would bring a search nearer to its target."""

from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated

import typer

from optimiser.cli.notes import print_document
from optimiser.cli.options import DEFAULT_DAMPER, CircuitChoice
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from optimiser.cli.inputs import Given
    from optimiser.report.buying import Advice
    from optimiser.tuning.buying import Purchase
    from optimiser.wanted.said import Said

WhatToBuyOption = Annotated[
    bool,
    typer.Option(
        "--what-to-buy",
        help="Which extra sizes would help a search from this list most; say what is wanted as in "
        "find.",
    ),
]
ToBuyOption = Annotated[
    str | None,
    typer.Option(
        "--to-buy",
        metavar="NAME|FILE",
        help="Stock list of what can be bought; without it every 2 mm in usual thicknesses.",
    ),
]
ToleranceOption = Annotated[
    float,
    typer.Option(
        "--tolerance", metavar="PERCENT", help="With --what-to-buy: the error that would do."
    ),
]

DEFAULT_TOLERANCE = 3.0
LEAST_TOLERANCE, MOST_TOLERANCE = 0.1, 50.0
#: Half of the stacks tried for each number of stages.
EVALUATIONS = 3000


@dataclass(frozen=True)
class Question:
    """What ``stock --what-to-buy`` was asked."""

    stock: str
    damper: str | None
    circuit: CircuitChoice | None
    said: "Said"
    to_buy: str | None
    tolerance_percent: float

    @property
    def direction(self) -> CircuitChoice:
        """Compression unless said otherwise."""
        return self.circuit or CircuitChoice.compression


def answer_what_to_buy(question: Question, json: bool, quiet: bool) -> None:
    """Search with the list as it is and with sizes added, and show what helps.

    Raises BadInput, and NothingBuildable where the list builds no stack at all.
    """
    from optimiser.cli.inputs import read_given
    from optimiser.cli.progress import note_when_preparing
    from optimiser.report.buying import advice_document, show_advice
    from optimiser.report.look import look_of

    if not LEAST_TOLERANCE <= question.tolerance_percent <= MOST_TOLERANCE:
        raise BadInput(
            f"--tolerance is {question.tolerance_percent:g}; allowed: {LEAST_TOLERANCE:g} to "
            f"{MOST_TOLERANCE:g} %"
        )
    given = read_given(question.damper or DEFAULT_DAMPER)
    note_when_preparing(quiet)
    advice = _advice(question, given)
    if json:
        document = advice_document(advice)
        document["inputs"] = [vars(file) for file in given.files]
        print_document(document)
    else:
        show_advice(advice, look_of(), quiet)


def _advice(question: Question, given: "Given") -> "Advice":
    from optimiser.cli.inputs import short_name
    from optimiser.cli.wish_options import wanted_from
    from optimiser.files import read_stock
    from optimiser.report.buying import Advice
    from optimiser.search.engine import Settings
    from optimiser.search.find import Order
    from optimiser.tuning.buying import need_of, usual_sizes, what_to_buy
    from optimiser.tuning.executors import Here
    from optimiser.tuning.runner import Forgetful

    stock = read_stock(question.stock)
    given.add_file("stock", question.stock)
    buyable = None
    if question.to_buy is not None:
        buyable = read_stock(question.to_buy)
        given.add_file("stock", question.to_buy)
    (setup,), wished = wanted_from(question.said, given, question.direction)
    post = setup.valve.post
    if post is None:
        raise TypeError(f"valve '{setup.valve.name}' is searched without a post")
    order = Order(
        setup,
        wished.targets[0],
        tuple(stock.for_post(post.post_mm)),
        rank_by="error",
        settings=Settings(evaluations=EVALUATIONS),
    )
    executor, journal = Here(), Forgetful()
    need = need_of(order, post.post_mm, executor, journal)
    tolerance = question.tolerance_percent
    best = need.candidates[0]
    found: tuple[Purchase[int], ...] = ()
    if not (best.sound and best.error_percent <= tolerance):
        sizes = buyable or usual_sizes([setup.valve])
        found = what_to_buy({0: need}, sizes, tolerance, executor, journal)
    return Advice(short_name(question.stock), order, best, tolerance, found)
