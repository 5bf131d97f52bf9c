"""Random drawers and valves for property tests."""

from dataclasses import dataclass
from types import SimpleNamespace

import numpy as np
from hypothesis import strategies as st

from optimiser.search.rules import Rules
from optimiser.search.sizes import Sizes
from optimiser.search.space import Space

from .checker import Bench


@dataclass
class Case:
    """One space and the same thing told to the independent checker."""

    space: Space
    bench: Bench

    def shims(self, plan: np.ndarray) -> list[tuple[float, float]]:
        """The built stack as (outer_mm, thickness_mm), face first."""
        stack = self.space.to_stack(plan, real=True)
        return [(shim.outer_mm, shim.thickness_mm) for shim in stack.pieces]


def build(
    stock: list[tuple[float, float, int]],
    *,
    cover: float = 30.0,
    clearance: float = 44.0,
    port_inner: float = 20.0,
    low: float = 0.3,
    high: float = 3.0,
    parts: int = 8,
    face_min: int = 1,
    stages: tuple[int, ...] = (1, 2),
) -> Case:
    """A case from (outer_mm, thickness_mm, pieces) lines; mm."""
    lines = [
        SimpleNamespace(outer_mm=o, thickness_mm=t, real_mm=t, quantity=q) for o, t, q in stock
    ]
    drawer: dict[tuple[float, float], int] = {}
    for outer, thickness, quantity in stock:
        drawer[outer, thickness] = drawer.get((outer, thickness), 0) + quantity
    rules = Rules(cover, clearance, port_inner, low, high, parts, face_min, stages)
    space = Space(Sizes.of(lines, widest_mm=clearance), rules)
    bench = Bench(drawer, cover, clearance, port_inner, low, high, parts, face_min, stages)
    return Case(space, bench)


@st.composite
def cases(draw: st.DrawFn, sizes: int = 14, parts: int = 9) -> Case:
    """Drawers of up to ``sizes`` sizes with few pieces, and valves that may be impossible."""
    size = st.tuples(
        st.sampled_from([14.0, 16.0, 18.0, 22.0, 26.0, 30.0, 34.0, 38.0, 42.0, 46.0]),
        st.sampled_from([0.1, 0.15, 0.2, 0.3]),
        st.integers(0, 5),
    )
    low = draw(st.sampled_from([0.0, 0.4, 0.9, 1.4]))
    allowed = draw(st.integers(2, parts))
    stock = draw(st.lists(size, min_size=1, max_size=sizes - 2))
    if draw(st.integers(0, 9)) > 0:  # without a wide and a narrow shim most cases are impossible
        stock += [(38.0, 0.2, draw(st.integers(1, 4))), (14.0, 0.3, draw(st.integers(1, 4)))]
    return build(
        stock,
        cover=draw(st.sampled_from([28.0, 34.0, 37.0, 39.0])),
        clearance=draw(st.sampled_from([38.0, 42.0, 1000.0])),
        port_inner=draw(st.sampled_from([15.0, 18.0, 23.0])),
        low=low,
        high=low + draw(st.sampled_from([0.0, 0.05, 0.5, 2.0])),
        parts=allowed,
        face_min=draw(st.integers(1, min(3, allowed - 1))),
        stages=draw(st.sampled_from([(1,), (2,), (1, 2)])),
    )
