"""What to do at the bench, in words that lead from one stack to the other."""

from hypothesis import given, settings
from hypothesis import strategies as st

from optimiser.search.find import exchanged
from optimiser.stack import Stack
from optimiser.tuning.changes import moved, sentence

from .builders import SIZES, stack_of

counts = st.lists(st.integers(0, 3), min_size=len(SIZES), max_size=len(SIZES))


def test_a_replaced_shim() -> None:
    before = Stack.parse(["2 x 40 x 0.15", "1 x 24 x 0.10", "1 x 18 x 0.30"])
    after = Stack.parse(["2 x 40 x 0.15", "1 x 24 x 0.15", "1 x 18 x 0.30"])
    assert sentence(before, after) == "replace 1 x 24 x 0.10 by 1 x 24 x 0.15"


def test_other_words() -> None:
    plain, more = stack_of([0, 1, 0, 0, 0]), stack_of([0, 1, 2, 0, 0])
    assert sentence(plain, more) == "put in 2 x 32 x 0.20"
    assert sentence(more, plain) == "take out 2 x 32 x 0.20"
    assert sentence(plain, plain) == "keep the stack"
    swapped = Stack((more.groups[0], more.groups[2], more.groups[1], more.groups[3]))
    assert sentence(more, swapped) == "same shims in another order"


@settings(max_examples=50, deadline=None)
@given(counts, counts)
def test_what_is_moved_leads_from_one_to_the_other(one: list[int], other: list[int]) -> None:
    before, after = stack_of(one), stack_of(other)
    out, into = moved(before, after)
    shims = list(before.pieces)
    for group in out:
        for _ in range(group.quantity):
            shims.remove(group.shim)
    shims += [group.shim for group in into for _ in range(group.quantity)]
    assert sorted(shims, key=str) == sorted(after.pieces, key=str)
    assert exchanged(before, after) == sum(group.quantity for group in (*out, *into))
