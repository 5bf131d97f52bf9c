"""What to do at the bench to get from one stack to the next, in words."""

from optimiser.stack import Group, Shim, Stack


def moved(before: Stack, after: Stack) -> tuple[list[Group], list[Group]]:
    """Shims to take out and shims to put in, one group a size, widest and thickest first."""
    counts: dict[Shim, int] = {}
    for stack, sign in ((before, -1), (after, 1)):
        for group in stack.groups:
            counts[group.shim] = counts.get(group.shim, 0) + sign * group.quantity
    ordered = sorted(counts, key=lambda shim: (-shim.outer_mm, -shim.thickness_mm))
    out = [Group(-counts[shim], shim) for shim in ordered if counts[shim] < 0]
    return out, [Group(counts[shim], shim) for shim in ordered if counts[shim] > 0]


def sentence(before: Stack, after: Stack) -> str:
    """``replace 1 x 24 x 0.10 by 1 x 24 x 0.15``, ``take out ...``, ``put in ...`` or ``keep``."""
    out, into = moved(before, after)
    if out and into:
        return f"replace {_listed(out)} by {_listed(into)}"
    if out:
        return f"take out {_listed(out)}"
    if into:
        return f"put in {_listed(into)}"
    return "same shims in another order" if before != after else "keep the stack"


def _listed(groups: list[Group]) -> str:
    return " + ".join(str(group) for group in groups)
