"""The cells of a table: what each of them asks for."""

from collections.abc import Sequence
from dataclasses import dataclass

from optimiser.envelope import damper_limits
from optimiser.faults import BadInput
from optimiser.hydraulics.gas import gas_force_n
from optimiser.prediction import Setup
from optimiser.search.engine import Settings
from optimiser.search.find import Order
from optimiser.search.rules import Limits
from optimiser.stock import Stock
from optimiser.tuning.request import TableRequest
from optimiser.wanted.derive import Derived, derive
from optimiser.wanted.feasible import Feasibility, feasibility
from optimiser.wanted.feel import Feel
from optimiser.wanted.frame import Frame
from optimiser.wanted.rider import Rider


@dataclass(frozen=True, order=True)
class Place:
    """A cell of one circuit: number of the mass, of the feel and of the circuit."""

    mass: int
    feel: int
    circuit: int


@dataclass(frozen=True)
class Materials:
    """Everything a table is made from; ``setups`` in the order of the request's circuits."""

    request: TableRequest
    frame: Frame
    feels: tuple[Feel, ...]
    setups: tuple[Setup, ...]
    stock: Stock

    def post_mm(self, circuit: int) -> float:
        """Post diameter of a circuit's searched valve, mm."""
        post = self.setups[circuit].valve.post
        if post is None:
            raise TypeError(f"valve '{self.setups[circuit].valve.name}' is searched without a post")
        return post.post_mm


@dataclass(frozen=True)
class Cell:
    """One search: the order, and whether the damper can do it at all."""

    place: Place
    order: Order
    feasible: Feasibility


def derive_all(materials: Materials) -> dict[tuple[int, int], Derived]:
    """Targets and statics of every mass and feel. Raises BadInput with the faults of all masses."""
    request, damper = materials.request, materials.setups[0].damper
    gas = gas_force_n(damper.gas, damper.body, "compression")
    derived, faults = {}, []
    for m, mass in enumerate(request.rider_masses_kg):
        for f, feel in enumerate(materials.feels):
            try:
                derived[m, f] = derive(
                    Rider(mass_kg=mass), materials.frame, feel, request.sag_percent, gas
                )
            except BadInput as error:
                faults += [f"{mass:g} kg: {fault}" for fault in error.faults]
    if faults:
        raise BadInput(dict.fromkeys(faults))
    return derived


def cells_of(materials: Materials, derived: dict[tuple[int, int], Derived]) -> dict[Place, Cell]:
    """Every cell's order, without stacks to begin from."""
    request = materials.request
    cells = {}
    for (m, f), wanted in derived.items():
        for c, setup in enumerate(materials.setups):
            place = Place(m, f, c)
            order = Order(
                setup,
                wanted.target(setup.direction),
                tuple(materials.stock.for_post(materials.post_mm(c))),
                limits=Limits(parts=request.parts),
                click_range=None if request.clicks is None else (request.clicks, request.clicks),
                seed=request.seed,
                settings=Settings(evaluations=request.evaluations),
            )
            target = order.target
            limits = damper_limits(setup, target.velocity_m_s)
            cells[place] = Cell(place, order, feasibility(target, limits))
    return cells


def clicks_faults(request: TableRequest, setups: Sequence[Setup]) -> list[str]:
    """A sentence for every circuit that has no such click."""
    faults = []
    for setup in setups:
        if request.clicks is not None and request.clicks > setup.clicks_range:
            faults.append(
                f"key clicks: is {request.clicks} for {setup.direction}; allowed: 0 (closed) to "
                f"{setup.clicks_range} (open)"
            )
    return faults
