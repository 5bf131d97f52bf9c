"""A saved search: the complete order behind a result, so that it can be opened and run again.

The order holds damper, steel, oil, stock and target themselves, not the names of their files:
a result stays what it is when a file is edited later. Only ``read_result`` touches a file.
"""

import json
from dataclasses import dataclass
from math import isfinite
from pathlib import Path
from typing import Any, Literal, Self

from pydantic import Field, ValidationInfo, field_validator, model_validator

from optimiser.checking import validate
from optimiser.damper import Damper, Direction
from optimiser.faults import BadInput
from optimiser.files import read_text
from optimiser.fitting.spread import Likely, Spread
from optimiser.fitting.uncertainty import uncertainty_of_record, uncertainty_record
from optimiser.materials import Oil, Steel
from optimiser.prediction import Prediction, Setup
from optimiser.search.engine import Settings
from optimiser.search.find import Found, Order
from optimiser.search.pair import PairOrder
from optimiser.search.rank import EXPLAINED, RankBy
from optimiser.search.rules import Limits
from optimiser.stack import Stack
from optimiser.stock import Stock, StockItem
from optimiser.wanted.bounds import Described
from optimiser.wanted.target import Target

#: By what a list is sorted: a rule of the search, or the chance to be near what is wanted.
Ranking = RankBy | Literal["chance"]
#: Stacks whose chances are compared where the list is sorted by them.
CANDIDATES = 24


class SavedInput(Described):
    """A file the order was made from, by name and fingerprint."""

    kind: str
    name: str
    fingerprint: str


class SavedTarget(Described):
    """A target's points: velocity (n,), m/s, force (n,), N, weight (n,)."""

    velocity_m_s: tuple[float, ...]
    force_n: tuple[float, ...]
    weight: tuple[float, ...]
    origin: str = "points"
    notes: tuple[str, ...] = ()

    @model_validator(mode="after")
    def _usable(self) -> Self:
        self.target("compression")
        return self

    @classmethod
    def of(cls, target: Target) -> Self:
        """The points of a target."""
        return cls(
            velocity_m_s=tuple(target.velocity_m_s.tolist()),
            force_n=tuple(target.force_n.tolist()),
            weight=tuple(target.weight.tolist()),
            origin=target.origin,
            notes=target.notes,
        )

    def target(self, direction: Direction) -> Target:
        """The target in a direction. Raises BadInput."""
        return Target.of(
            self.velocity_m_s,
            self.force_n,
            self.weight,
            direction=direction,
            origin=self.origin,
            notes=self.notes,
        )


class SavedBands(Described):
    """What the bands of one direction are drawn from.

    ``names`` of the uncertain numbers of the damper with their ``covariance``, and the error of
    the model, %, as in the record of a fit; ``origin`` of these in words. ``within_percent``: the
    error, r.m.s., a stack should be within.
    """

    names: tuple[str, ...]
    covariance: tuple[tuple[float, ...], ...]
    model_percent: float
    origin: str
    samples: int = Field(ge=20, le=100_000)
    within_percent: float = Field(gt=0, le=100)

    @model_validator(mode="after")
    def _usable(self) -> Self:
        self.spread(0)
        return self

    @classmethod
    def of(cls, spread: Spread, within_percent: float) -> Self:
        """What a spread is drawn from."""
        record = uncertainty_record(spread.known)
        return cls(
            **record, origin=spread.origin, samples=spread.samples, within_percent=within_percent
        )

    def spread(self, seed: int) -> Spread:
        """What bands are drawn from. Raises BadInput."""
        known = uncertainty_of_record(self.model_dump(), "bands")
        return Spread(known, self.origin, self.samples, seed)


class SavedCircuit(Described):
    """One direction: what is wanted of it, the stack fitted now (revalve mode), the clicks, and
    what bands are drawn from, where they are wanted."""

    direction: Direction
    target: SavedTarget
    fitted: Stack | None = None
    click_range: tuple[int, int] = Field(description="first and last click allowed")
    bands: SavedBands | None = None


class SavedOrder(Described):
    """Everything a search is made from; the number of workers is not: it changes nothing.

    Lengths mm, temperature C. Equal orders give equal answers. A change of what is written gets
    the next ``format``.
    """

    format: Literal[1] = 1
    damper: Damper
    steel: Steel
    oil: Oil
    oil_temp_c: float = Field(ge=-30, le=150)
    stock_name: str
    stock: tuple[StockItem, ...]
    circuits: tuple[SavedCircuit, ...] = Field(description="one or both directions")
    parts: int
    face_min: int
    stages: tuple[int, ...]
    height_min_mm: float | None = None
    height_max_mm: float | None = None
    rank_by: Ranking = "default"
    rows: int = Field(ge=1, le=100)
    seed: int = Field(ge=0)
    evaluations: int = Field(ge=100, le=100_000_000)
    notes: tuple[str, ...] = ()
    inputs: tuple[SavedInput, ...] = ()

    @field_validator("circuits")
    @classmethod
    def _of_the_damper(
        cls, circuits: tuple[SavedCircuit, ...], info: ValidationInfo
    ) -> tuple[SavedCircuit, ...]:
        directions = [circuit.direction for circuit in circuits]
        faults = [] if directions else ["is empty; allowed: one direction, or both"]
        if len(set(directions)) < len(directions):
            faults.append("names one direction twice; allowed: each once")
        damper = info.data.get("damper")
        if isinstance(damper, Damper):
            faults += [fault for circuit in circuits for fault in _faults_in(damper, circuit)]
        if faults:
            raise BadInput(faults)
        return circuits

    @model_validator(mode="after")
    def _limits_hold(self) -> Self:
        _ = self.limits
        return self

    @model_validator(mode="after")
    def _bands_for_all(self) -> Self:
        banded = {circuit.bands is not None for circuit in self.circuits}
        if len(banded) > 1:
            raise BadInput("circuits: only one has bands; allowed: all or none")
        if self.rank_by == "chance" and True not in banded:
            raise BadInput("rank_by is chance, which needs the bands of every circuit")
        return self

    @property
    def limits(self) -> Limits:
        """What the user allows. Raises BadInput."""
        return Limits(
            self.parts, self.face_min, self.stages, self.height_min_mm, self.height_max_mm
        )

    @property
    def drawer(self) -> Stock:
        """The stock list."""
        return Stock(self.stock)

    @property
    def whole_drawer(self) -> Stock:
        """The stock, and the shims of the fitted stacks, which come out of the damper."""
        stock = self.drawer
        for circuit in self.circuits:
            if circuit.fitted is not None:
                stock = stock.put_back(circuit.fitted, post_mm(self.setup(circuit)))
        return stock

    @property
    def rank_rule(self) -> str:
        """How the list is sorted, in one sentence."""
        bands = self.circuits[0].bands
        if self.rank_by != "chance" or bands is None:
            return EXPLAINED[self.rank_by if self.rank_by != "chance" else "default"]
        text = (
            f"Ranked by the chance to be within {bands.within_percent:g} %, then error, among the "
            f"{max(self.rows, CANDIDATES)} stacks that lead without it (--rank-by default)"
        )
        both = "; the first of both directions are the two likeliest together"
        return f"{text}{both if len(self.circuits) > 1 else ''}."

    def spread(self, circuit: SavedCircuit) -> Spread | None:
        """What the bands of one direction are drawn from; None where none are wanted."""
        return None if circuit.bands is None else circuit.bands.spread(self.seed)

    def setup(self, circuit: SavedCircuit) -> Setup:
        """One direction of the damper, with steel, oil and temperature."""
        return Setup(self.damper, circuit.direction, self.steel, self.oil, self.oil_temp_c)

    def orders(self, workers: int = 1) -> tuple[Order, ...]:
        """What each circuit's search is asked, alone, from the whole drawer."""
        return tuple(self._order(circuit, workers) for circuit in self.circuits)

    def pair_order(self, workers: int = 1) -> PairOrder:
        """Both circuits from the one drawer. Raises ValueError unless there are two."""
        first, second = self.orders(workers)
        return PairOrder(first, second, self.drawer, (post_mm(first.setup), post_mm(second.setup)))

    def _order(self, circuit: SavedCircuit, workers: int) -> Order:
        setup = self.setup(circuit)
        by_chance = self.rank_by == "chance"
        return Order(
            setup,
            circuit.target.target(circuit.direction),
            tuple(self.drawer.for_post(post_mm(setup))),
            circuit.fitted,
            self.limits,
            circuit.click_range,
            "default" if self.rank_by == "chance" else self.rank_by,
            max(self.rows, CANDIDATES) if by_chance else self.rows,
            self.seed,
            workers,
            Settings(evaluations=self.evaluations),
        )

    def record(self) -> dict[str, Any]:
        """The order as plain data for JSON; ``read_result`` reads it back equal."""
        return self.model_dump(mode="json", exclude_none=True)


@dataclass(frozen=True)
class Answer:
    """An order and what was found, one entry a circuit; ``best`` is stack 1 in full.

    ``seconds`` the user waited, ``cut_short`` by the user; ``likely`` empty without bands.
    """

    order: SavedOrder
    found: tuple[Found, ...]
    best: tuple[Prediction, ...]
    seconds: float
    cut_short: bool
    workers: int
    likely: tuple[Likely, ...] = ()

    @property
    def evaluations(self) -> int:
        """Stacks tried."""
        return sum(one.evaluations for one in self.found)


def post_mm(setup: Setup) -> float:
    """Diameter, mm, of the post the searched stack is threaded on."""
    post = setup.valve.post
    if post is None:
        raise TypeError(f"valve '{setup.valve.name}' is searched but has no post")
    return post.post_mm


def read_result(path: str | Path) -> SavedOrder:
    """The order in a saved ``result.json``. Raises BadInput with every fault."""
    file = Path(path)
    if not file.is_file():
        raise BadInput(f"{path}: there is no such file; allowed: a saved result.json")
    document = _parse(read_text(file), str(path))
    if not is_result(document):
        raise BadInput(f"{path}: holds no saved search; allowed: the result.json of find --out")
    return validate(SavedOrder, document["order"], f"{path}, order")


def is_result(document: object) -> bool:
    """Whether a JSON document is a saved result."""
    return (
        isinstance(document, dict)
        and isinstance(document.get("order"), dict)
        and "stacks" in document
    )


def _parse(text: str, where: str) -> Any:
    def refuse(word: str) -> None:
        raise BadInput(f"{where}: holds {word}, which is not JSON")

    try:
        return json.loads(text, parse_constant=refuse, parse_float=_finite)
    except json.JSONDecodeError as error:
        raise BadInput(f"{where}: line {error.lineno}: is not JSON ({error.msg.lower()})") from None


def _finite(text: str) -> float:
    value = float(text)
    if not isfinite(value):
        raise BadInput(f"{text} is too large a number")
    return value


def _faults_in(damper: Damper, circuit: SavedCircuit) -> list[str]:
    direction = circuit.direction
    if getattr(damper, direction) is None:
        return [f"damper {damper.name} has no {direction} circuit"]
    needle = damper.circuit(direction).searched.bleed.needle
    most = needle.clicks if needle else 0
    first, last = circuit.click_range
    if not 0 <= first <= last <= most:
        return [f"{direction}: click_range {first} to {last}; allowed: within 0 to {most}"]
    return []
