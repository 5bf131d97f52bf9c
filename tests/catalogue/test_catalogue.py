"""The bundled data: everything loads, counts and plausibility."""

from pathlib import Path

import pytest

from optimiser import files
from optimiser.damper import Valve, warnings_for
from optimiser.stack import Stack

DAMPERS = ["digressive-monotube", "fork-cartridge", "rear-monotube", "solid-piston"]


def shim_valves(name: str) -> list[Valve]:
    damper = files.read_damper(name)
    circuits = [damper.circuit("compression"), damper.circuit("rebound")]
    return [valve for c in circuits for valve in c.valves if valve.kind == "shim"]


def fitted(valve: Valve) -> Stack:
    assert valve.fitted is not None
    return valve.fitted


def post_mm(valve: Valve) -> float:
    assert valve.post is not None
    return valve.post.post_mm


def test_names() -> None:
    assert files.bundled_names("damper") == DAMPERS
    assert files.bundled_names("stock") == ["small-shop", "workshop"]


@pytest.mark.parametrize("name", DAMPERS)
def test_dampers_load_without_warnings(name: str) -> None:
    damper = files.read_damper(name)
    assert damper.name == name
    for valve in shim_valves(name):
        assert warnings_for(valve, fitted(valve)) == []


@pytest.mark.parametrize("name", DAMPERS)
def test_every_key_says_how_to_measure_it(name: str) -> None:
    """Every number of the first valve of its kind in a file has a remark beside it."""
    text = files.find_data("damper", name).read_text(encoding="utf-8")
    remarked = {
        line.split("=")[0].strip() for line in text.splitlines() if "=" in line and "#" in line
    }
    bare = {
        line.split("=")[0].strip()
        for line in text.splitlines()
        if "=" in line and "#" not in line and not line.startswith(("name", "summary"))
    }
    leave_default = {"discharge", "name", "kind", "searched"}
    assert bare - remarked - leave_default == set()


def test_kinds_of_damper() -> None:
    rear = files.read_damper("rear-monotube")
    assert rear.body.piston_mm == 46.0
    assert {valve.displacement for valve in shim_valves("rear-monotube")} == {"piston_less_shaft"}
    assert rear.steel == "carbon-strip"
    bleeds = [valve.bleed for valve in shim_valves("rear-monotube")]
    assert bleeds[0] == bleeds[1]
    assert bleeds[0].needle is not None
    solid = files.read_damper("solid-piston")
    assert solid.circuit("compression").searched.displacement == "piston"
    assert solid.circuit("rebound").searched.displacement == "piston_less_shaft"
    fork = files.read_damper("fork-cartridge").circuit("compression")
    assert fork.searched.displacement == "shaft"
    assert fork.searched.back_spring is not None
    assert fork.searched.series is not None
    assert len([valve for valve in fork.valves if valve.kind == "shim"]) == 2
    for valve in shim_valves("digressive-monotube"):
        assert valve.seat is not None
        assert 0.1 <= valve.seat.height_mm <= 0.2


def test_workshop_stock() -> None:
    stock = files.read_stock("workshop")
    piston = stock.for_post(12)
    sizes = {(item.outer_mm, item.thickness_mm) for item in piston}
    assert len(sizes) == len(piston) >= 60
    assert {item.outer_mm for item in piston} == set(range(14, 45, 2))
    assert {item.thickness_mm for item in stock} == {0.10, 0.15, 0.20, 0.25, 0.30}
    assert 25 <= len(stock.for_post(8)) <= 30
    assert 3 <= len(stock.ring_shims(12)) <= 8
    assert min(item.quantity for item in stock) == 0
    assert max(item.quantity for item in stock) <= 20
    assert all(item.bin and item.price for item in stock)
    assert 3 <= sum(item.measured_mm is not None for item in stock) <= 10


def test_small_shop_stock() -> None:
    stock = files.read_stock("small-shop")
    assert 18 <= len(stock) <= 24
    assert len(stock.for_post(12)) == len(stock)


@pytest.mark.parametrize("name", DAMPERS)
def test_fitted_stacks_could_be_built_from_the_workshop_stock(name: str) -> None:
    stock = files.read_stock("workshop")
    for valve in shim_valves(name):
        stock = stock.take(fitted(valve), post_mm(valve))


@pytest.mark.parametrize("name", files.bundled_names("stack"))
def test_stacks_fit_the_rear_damper(name: str) -> None:
    stack = files.read_stack(name)
    valve = files.read_damper("rear-monotube").circuit("compression").searched
    assert warnings_for(valve, stack) == []
    assert files.read_stock("workshop").shortage(stack, post_mm(valve)) == ()


@pytest.mark.parametrize("name", files.bundled_names("steel"))
def test_steels(name: str) -> None:
    steel = files.read_steel(name)
    assert steel.name == name
    assert 170e3 < steel.youngs_mpa < 215e3
    assert steel.summary


@pytest.mark.parametrize("name", files.bundled_names("oil"))
def test_oils(name: str) -> None:
    oil = files.read_oil(name)
    assert oil.name == name
    assert oil.viscosity_100c_cst > 2.0  # below that the viscosity law in use is not right
    assert oil.summary


def test_no_file_lies_unread() -> None:
    folder = files.data_root() / "catalogue"
    read = {files.find_data(kind, n) for kind in files.KINDS for n in files.bundled_names(kind)}
    assert {path for path in folder.rglob("*") if path.is_file()} <= {Path(path) for path in read}
