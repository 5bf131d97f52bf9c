"""The drawer as numbers: how many of each size there are, and what each stack takes."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from optimiser.search.sizes import Floats, Ints
from optimiser.stack import Stack
from optimiser.stock import BORE_PLAY_MM, Stock

Size = tuple[float, float, float]
"""Outer diameter, nominal thickness and post, mm."""


@dataclass(frozen=True, eq=False)
class Shelf:
    """Sizes for some posts; ``posts_mm`` the post of each circuit (those alike are one).

    ``quantity`` (sizes,); ``price`` (sizes,) of one shim, NaN where not known.
    """

    posts_mm: tuple[float, ...]
    sizes: tuple[Size, ...]
    quantity: Ints
    price: Floats

    @classmethod
    def of(cls, stock: Stock, posts_mm: Sequence[float]) -> "Shelf":
        """Lines of one nominal size and different measured thickness count together."""
        posts = _alike(posts_mm)
        quantity: dict[Size, int] = {}
        price: dict[Size, float] = {}
        for post in sorted(set(posts)):
            for item in stock.for_post(post):
                size = item.outer_mm, item.thickness_mm, post
                quantity[size] = quantity.get(size, 0) + item.quantity
                if item.price is not None:
                    price.setdefault(size, item.price)
        sizes = tuple(sorted(quantity, key=lambda size: (size[2], -size[0], -size[1])))
        return cls(
            posts,
            sizes,
            np.array([quantity[size] for size in sizes], dtype=np.int64),
            np.array([price.get(size, np.nan) for size in sizes]),
        )

    def uses(self, stacks: Sequence[Stack], circuit: int) -> Ints:
        """(stacks, sizes) shims of each size that stacks of a circuit take. Raises KeyError."""
        place = {size: number for number, size in enumerate(self.sizes)}
        table = np.zeros((len(stacks), len(self.sizes)), dtype=np.int64)
        for row, stack in enumerate(stacks):
            for group in stack.groups:
                size = group.shim.outer_mm, group.shim.thickness_mm, self.posts_mm[circuit]
                table[row, place[size]] += group.quantity
        return table


def _alike(posts_mm: Sequence[float]) -> tuple[float, ...]:
    """Posts that take the same shims count as the thinnest of them."""
    return tuple(
        min(other for other in posts_mm if abs(other - post) <= BORE_PLAY_MM) for post in posts_mm
    )
