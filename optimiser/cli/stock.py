"""``shimwright stock``: check a stock list, what a build takes from it and what is missing."""

from typing import TYPE_CHECKING, Annotated

import typer

from optimiser.cli.buying import (
    DEFAULT_TOLERANCE,
    Question,
    ToBuyOption,
    ToleranceOption,
    WhatToBuyOption,
    answer_what_to_buy,
)
from optimiser.cli.notes import print_document
from optimiser.cli.options import CircuitChoice, JsonOption, QuietOption
from optimiser.cli.wish_options import (
    DEFAULT_STOCK,
    FITTED,
    FeelOption,
    FrameOption,
    HighOption,
    KneeOption,
    LowOption,
    MidOption,
    RiderKgOption,
    SagOption,
    StockOption,
    TargetOption,
)
from optimiser.faults import BadInput, NothingBuildable

if TYPE_CHECKING:
    from optimiser.cli.inputs import InputFile
    from optimiser.damper import Valve
    from optimiser.files import Kind
    from optimiser.report.stock import Build, Shelf
    from optimiser.stack import Stack

#: Narrowest and widest post, mm.
POST_FROM_MM, POST_TO_MM = 1.0, 100.0
FROM_SHIMS = "--shim"


def stock(
    stock: StockOption = DEFAULT_STOCK,
    post: Annotated[
        float | None,
        typer.Option("--post", metavar="MM", help="Only shims for a post of this diameter."),
    ] = None,
    damper: Annotated[
        str | None,
        typer.Option(
            "--damper",
            metavar="NAME|FILE",
            help="Only shims for a post of this damper, and what fits its valve.",
        ),
    ] = None,
    circuit: Annotated[
        CircuitChoice | None,
        typer.Option("--circuit", help="Which valve of the damper; compression by default."),
    ] = None,
    stack: Annotated[
        str | None,
        typer.Option(
            "--stack",
            metavar="NAME|FILE",
            help="Stack CSV to build, or with --damper the word fitted.",
        ),
    ] = None,
    shim: Annotated[
        list[str] | None,
        typer.Option(
            "--shim",
            metavar="'N x D x T'",
            help="Shims to build: quantity x outer mm x thickness mm. Repeat it, clamp shim last.",
        ),
    ] = None,
    what_to_buy: WhatToBuyOption = False,
    to_buy: ToBuyOption = None,
    tolerance: ToleranceOption = DEFAULT_TOLERANCE,
    target: TargetOption = None,
    low: LowOption = None,
    mid: MidOption = None,
    high: HighOption = None,
    knee: KneeOption = None,
    rider_kg: RiderKgOption = None,
    frame: FrameOption = None,
    feel: FeelOption = None,
    sag: SagOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """What is in the drawer, what a build takes from it and what is missing.

    A list with faults is refused with all of them named. When shims are missing for the build,
    the exit code is 1. With --what-to-buy: which sizes would bring a search nearer to its target.
    """
    from optimiser.report.look import look_of
    from optimiser.report.stock import build_of, show_stock, stock_document

    _check_options(post, damper, circuit, stack, shim, what_to_buy)
    wishes = (target, low, mid, high, knee, rider_kg, frame, feel, sag, to_buy)
    if what_to_buy:
        from optimiser.wanted.said import Said

        said = Said(
            targets=tuple(target or ()), low_percent=low, mid_percent=mid, high_percent=high,
            knee_percent=knee, rider_kg=rider_kg, frame=frame, feel=feel, sag_percent=sag,
        )  # fmt: skip
        question = Question(stock, damper, circuit, said, to_buy, tolerance)
        answer_what_to_buy(question, json, quiet)
        return
    if any(wish is not None for wish in wishes) or tolerance != DEFAULT_TOLERANCE:
        raise BadInput(
            "what is wanted, --to-buy and --tolerance belong to --what-to-buy; name it, or leave "
            "them out"
        )
    shelf, files = _shelf(stock, post, damper, circuit)
    build: Build | None = None
    if stack is not None or shim:
        label, wanted = _stack(stack, shim or [], shelf.valve)
        build = build_of(shelf, wanted, label)
    if json:
        if stack is not None and stack != FITTED:
            files.append(_file("stack", stack))
        document = stock_document(shelf, build)
        document["inputs"] = [vars(file) for file in files]
        print_document(document)
    else:
        show_stock(shelf, build, look_of(), quiet)
    if build is not None and build.missing:
        raise NothingBuildable(
            f"{build.label} cannot be built from {shelf.name}: the stock lacks "
            f"{', '.join(build.missing)} mm"
        )


def _check_options(
    post: float | None,
    damper: str | None,
    circuit: CircuitChoice | None,
    stack: str | None,
    shim: list[str] | None,
    what_to_buy: bool = False,
) -> None:
    faults = []
    if what_to_buy and (post is not None or stack is not None or shim):
        faults.append(
            "--what-to-buy stands for itself; allowed beside it: --damper and --circuit, not "
            "--post, --stack or --shim"
        )
    if post is not None and damper is not None:
        faults.append("--post and --damper both say which post; allowed: one of them")
    if post is not None and not POST_FROM_MM <= post <= POST_TO_MM:
        faults.append(f"--post is {post:g}; allowed: {POST_FROM_MM:g} to {POST_TO_MM:g} mm")
    if circuit is not None and damper is None and not what_to_buy:
        faults.append("--circuit belongs to --damper; name one, or leave it out")
    if circuit is CircuitChoice.both:
        faults.append("--circuit is both; allowed: compression or rebound, which are two posts")
    if stack is not None and shim:
        faults.append("--stack and --shim both say what to build; allowed: one of them")
    if stack == FITTED and damper is None:
        faults.append("--stack fitted is the stack of a damper; name one by --damper")
    if faults:
        raise BadInput(faults)


def _shelf(
    stock: str, post: float | None, damper: str | None, circuit: CircuitChoice | None
) -> "tuple[Shelf, list[InputFile]]":
    """The stock list with the post it is asked for. Raises BadInput with all faults."""
    from optimiser.cli.inputs import short_name
    from optimiser.files import read_stock
    from optimiser.report.stock import Shelf

    faults: list[str] = []
    valve = None
    try:
        valve = _valve(damper, circuit) if damper is not None else None
    except BadInput as error:
        faults += error.faults
    try:
        listed = read_stock(stock)
    except BadInput as error:
        raise BadInput([*faults, *error.faults]) from None
    if faults:
        raise BadInput(faults)
    files = [_file("stock", stock)]
    if damper is not None:
        files.append(_file("damper", damper))
    if valve is not None and valve.post is not None:
        post = valve.post.post_mm
    return Shelf(short_name(stock), listed, post, valve), files


def _valve(damper: str, circuit: CircuitChoice | None) -> "Valve":
    from optimiser.cli.inputs import read_given

    given = read_given(damper)
    directions = given.directions()
    if circuit is None:
        direction = directions[0]
    else:
        direction = "compression" if circuit is CircuitChoice.compression else "rebound"
    return given.setup(direction).valve


def _stack(stack: str | None, shims: list[str], valve: "Valve | None") -> "tuple[str, Stack]":
    from optimiser.cli.inputs import parse_shims, read_stack, short_name

    if stack is None:
        return FROM_SHIMS, parse_shims(shims)
    if stack == FITTED and valve is not None and valve.fitted is not None:
        return FITTED, valve.fitted
    return short_name(stack), read_stack(stack)


def _file(kind: "Kind", name: str) -> "InputFile":
    from optimiser.cli.inputs import InputFile
    from optimiser.files import find_data, fingerprint

    return InputFile(kind, name, fingerprint(find_data(kind, name)))
