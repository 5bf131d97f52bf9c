"""Shims and stacks as data: reading, writing, rules of order."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.faults import BadInput
from optimiser.stack import Group, Shim, Stack, parse_group


def test_reads_what_is_written() -> None:
    lines = ["3 x 24 x 0.15", "1 x 22 x 0.20 / 18", "2 x 20 x 0.147", "1 x 12 x 0.30"]
    stack = Stack.parse(lines)
    assert stack.lines() == lines
    assert stack.parts == 7
    assert stack.clamp_mm == 12.0
    assert [shim.outer_mm for shim in stack.bending] == [24.0, 24.0, 24.0, 22.0, 20.0, 20.0]
    assert len(stack.pieces) == stack.parts


def test_height_leaves_out_ring_shims() -> None:
    stack = Stack.parse(["3 x 24 x 0.15", "1 x 22 x 0.20 / 18", "2 x 20 x 0.10", "1 x 12 x 0.30"])
    assert stack.height_mm == pytest.approx(3 * 0.15 + 2 * 0.10 + 0.30, abs=1e-12)


def test_equal_neighbours_become_one_group() -> None:
    shims = [Shim(24, 0.15), Shim(24, 0.15), Shim(20, 0.15), Shim(12, 0.3)]
    assert [group.quantity for group in Stack.of(shims).groups] == [2, 1, 1]


@pytest.mark.parametrize("text", ["3*24*0.15", " 3 X 24 X .15 ", "3×24×0.15"])
def test_other_ways_to_write_a_group(text: str) -> None:
    assert parse_group(text) == Group(3, Shim(24.0, 0.15))


sizes = st.builds(
    Shim,
    st.integers(30, 80).map(lambda n: n / 2),
    st.integers(20, 999).map(lambda n: n / 1000),
)


@given(st.lists(sizes, min_size=1, max_size=12), st.integers(1, 20))
@settings(max_examples=60, deadline=None)
def test_lines_lose_nothing(shims: list[Shim], quantity: int) -> None:
    groups = (*(Group(quantity, shim) for shim in shims), Group(1, Shim(14.0, 0.3)))
    assert Stack.parse(Stack(groups).lines()).groups == groups


@pytest.mark.parametrize(
    ("lines", "words"),
    [
        (["24 x 0.15", "1 x 12 x 0.3"], ["group 1", "'24 x 0.15'", "quantity x outer mm"]),
        (["3 x 24 x 0,15", "1 x 12 x 0.3"], ["group 1", "point as the decimal mark"]),
        (["3 x 2.4.1 x 0.15", "1 x 12 x 0.3"], ["group 1", "cannot be read"]),
        (["3 x 24 x 0.15"], ["at least a face shim and a clamp shim"]),
        (["0 x 24 x 0.15", "1 x 12 x 0.3"], ["group 1", "quantity must be 1 to 60"]),
        (["61 x 24 x 0.15", "1 x 12 x 0.3"], ["group 1", "quantity must be 1 to 60"]),
        (["1 x 240 x 0.15", "1 x 12 x 0.3"], ["group 1", "2 to 200 mm"]),
        (["1 x 24 x 0.01", "1 x 12 x 0.3"], ["group 1", "0.02 to 5 mm"]),
        (["1 x 12 x 0.15", "1 x 12 x 0.3"], ["group 1", "wider than the clamp shim"]),
        (["1 x 24 x 0.15", "1 x 12 x 0.3 / 11"], ["group 2", "clamp shim", "ring shim"]),
        (["1 x 24 x 0.15 / 16", "1 x 12 x 0.3"], ["group 1", "face shim", "ring shim"]),
        (
            ["1 x 24 x 0.15", "1 x 22 x 0.1 / 12", "1 x 20 x 0.1", "1 x 12 x 0.3"],
            ["group 2", "hole must lie between the clamp diameter 12 mm"],
        ),
        (
            ["1 x 24 x 0.15", "1 x 22 x 0.1 / 18", "1 x 16 x 0.1", "1 x 12 x 0.3"],
            ["group 2", "between shims wider than its hole (18 mm)"],
        ),
    ],
)
def test_one_clear_sentence_a_fault(lines: list[str], words: list[str]) -> None:
    with pytest.raises(BadInput) as caught:
        Stack.parse(lines)
    assert any(all(word in fault for word in words) for fault in caught.value.faults)


def test_all_faults_at_once() -> None:
    with pytest.raises(BadInput) as caught:
        Stack.parse(["a", "1 x 24 x 0.15", "b"])
    assert len(caught.value.faults) == 2


def test_not_a_number_is_no_size() -> None:
    with pytest.raises(BadInput, match="thickness"):
        Stack((Group(1, Shim(24.0, float("nan"))), Group(1, Shim(12.0, 0.3))))
