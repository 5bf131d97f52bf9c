"""The `search` fidelity: one stack's lift and stress over pressure in some ten microseconds a point.

The same mathematics as the `reported` fidelity (stretched plates, unilateral contact), arranged for
speed. The unknowns are the contact forces, at shim edges and a few radii more (tables.py); every plate
answers them through tabulated responses. At each pressure three things are repeated until
the lift settles:

1. the membrane force of every plate is worked out from its last shape and becomes a slope load;
2. a plate that stretches is stiffer: a share c of its bending stiffness is added to both sides of its
   equation (left as stiffness, right as load on the last shape), which makes the repetition converge
   without changing what it converges to;
3. the contact forces are found by principal pivoting: closed contacts that would pull are
   opened, open ones that would overlap are closed, all at once, and one at a time when that stops
   getting better.

Sources: plates and membranes as in plate.py and membrane.py; block principal pivoting after
J. J. Judice and F. M. Pires, "A block principal pivoting algorithm for large-scale strictly monotone
linear complementarity problems", Computers & Operations Research 21 (1994) [from memory].
"""

from math import pi
from typing import NamedTuple

import numpy as np

from optimiser.compiled import kernel
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.tables import POINTS, Tables

#: Added stiffness per membrane secant stiffness; between 1 and 3 both lift and shape settle fast.
RELAXATION = 1.6
MOST_ROUNDS = 60
MOST_PIVOTS = 80
RING, SPACER = -1, -2


class Layers(NamedTuple):
    """A stack as merged groups, face first. SI units."""

    plate: Ints  # (m,) row in the tables; RING or SPACER otherwise
    hole: Ints  # (m,) node of a ring shim's hole
    rim: Ints  # (m,) node of a ring shim's edge
    thick: Floats  # (m,) sum of t, m
    cubed: Floats  # (m,) sum of t^3, m3
    thickest: Floats  # (m,) m


class Setting(NamedTuple):
    """What the stack is pressed by and against. SI units."""

    youngs: float
    seat_height: float
    spring_rate: float
    spring_preload: float
    tolerance: float  # relative change of the face shim's edge at which a pressure is settled
    seated: bool  # False: nothing to rest on, the seat is only where lift is read


def layers_of(tables: Tables, groups: Floats) -> Layers:
    """Merged groups (m, 6) of :func:`layout.group_shims` as rows of ``tables``."""

    def node(radius: float) -> int:
        return int(np.argmin(np.abs(tables.nodes - radius)))

    ring = groups[:, 4] > 0.0
    plate = np.array([int(np.argmin(np.abs(tables.edge - r))) for r in groups[:, 0]])
    plate[groups[:, 0] <= tables.clamp * (1.0 + 1e-9)] = SPACER
    plate[ring] = RING
    return Layers(
        plate,
        np.array([node(r) for r in groups[:, 4]]),
        np.array([node(r) for r in groups[:, 0]]),
        np.where(ring, groups[:, 5], groups[:, 1]),
        groups[:, 2].copy(),
        groups[:, 3].copy(),
    )


class Bench(NamedTuple):
    """Scratch arrays for stacks of up to m groups on n nodes, one a thread."""

    used: Ints  # (n,) table nodes that matter for this stack
    size: Ints  # (3,) number of used nodes, contacts, closed contacts
    reach: Ints  # (m,) number of used nodes on each group
    front: Ints  # (c,) group in front of each contact; -1 for none
    back: Ints  # (c,) group behind it; -1 for none
    at: Ints  # (c,) used node of each contact
    gap: Floats  # (c,)
    flex: Floats  # (c,) own compliance, of a spring
    closed: Ints  # (c,) 1 closed, 0 open, 2 always closed
    force: Floats  # (c,)
    active: Ints  # (c,)
    matrix: Floats  # (c, c)
    vector: Floats  # (c,)
    rigidity: Floats  # (m,)
    soft: Floats  # (m,) 1 / (D (1 + c))
    free: Floats  # (m, n) deflection without contact
    free_slope: Floats  # (m, q)
    lift: Floats  # (m, n)
    theta: Floats  # (m, q)
    load: Floats  # (m, q) slope loads
    last_lift: Floats  # (3, m, n) at the last pressures
    last_theta: Floats  # (3, m, q)


@kernel
def bench(groups: int, nodes: int) -> Bench:
    """Scratch arrays, made once."""
    contacts = groups * nodes + 2
    return Bench(
        np.zeros(nodes, np.int64), np.zeros(3, np.int64), np.zeros(groups, np.int64),
        np.zeros(contacts, np.int64), np.zeros(contacts, np.int64),
        np.zeros(contacts, np.int64), np.zeros(contacts), np.zeros(contacts),
        np.zeros(contacts, np.int64), np.zeros(contacts), np.zeros(contacts, np.int64),
        np.zeros((contacts, contacts)), np.zeros(contacts), np.zeros(groups), np.zeros(groups),
        np.zeros((groups, nodes)), np.zeros((groups, POINTS)), np.zeros((groups, nodes)),
        np.zeros((groups, POINTS)), np.zeros((groups, POINTS)),
        np.zeros((3, groups, nodes)), np.zeros((3, groups, POINTS)),
    )  # fmt: skip


@kernel
def _choose_nodes(tables: Tables, layers: Layers, b: Bench) -> int:
    """Nodes of this stack: the common ones, every edge, every ring shim's hole; sorted."""
    widest = 0
    for g in range(layers.plate.size):
        if layers.plate[g] >= 0:
            widest = max(widest, tables.edge_node[layers.plate[g]])
    marks = b.active  # not in use yet, long enough
    marks[: widest + 1] = 0
    for k in tables.common:
        if k <= widest:
            marks[k] = 1
    for g in range(layers.plate.size):
        if layers.plate[g] >= 0:
            marks[tables.edge_node[layers.plate[g]]] = 1
        elif layers.plate[g] == RING:
            marks[layers.hole[g]] = 1
            if layers.rim[g] <= widest:
                marks[layers.rim[g]] = 1
    count = 0
    for k in range(widest + 1):
        if marks[k]:
            b.used[count] = k
            count += 1
    return count


@kernel
def _add_contact(b: Bench, front: int, back: int, at: int, gap: float, closed: int) -> None:
    c = b.size[1]
    b.front[c] = front
    b.back[c] = back
    b.at[c] = at
    b.gap[c] = gap
    b.flex[c] = 0.0
    b.closed[c] = closed
    b.size[1] = c + 1


@kernel
def _touch_at(tables: Tables, layers: Layers, b: Bench, u: int) -> int:
    """Contacts between groups at one used node; returns the rearmost group that reaches it."""
    k = b.used[u]
    front = -1
    gap = 0.0
    for g in range(layers.plate.size):
        plate = layers.plate[g]
        if plate == RING:
            if layers.hole[g] <= k <= layers.rim[g]:
                gap -= layers.thick[g]
        elif plate >= 0 and tables.edge_node[plate] >= k:
            if front >= 0:
                edge = min(tables.edge_node[plate], tables.edge_node[layers.plate[front]])
                _add_contact(b, front, g, u, gap, 1 if (gap < 0.0 or edge == k) else 0)
                if gap > 0.0:
                    b.closed[b.size[1] - 1] = 0
            front = g
            gap = 0.0
        else:
            gap += layers.thick[g]
    return front


@kernel
def _lay_out(tables: Tables, layers: Layers, setting: Setting, b: Bench) -> None:
    """Find this stack's nodes and contacts, and set its stiffnesses."""
    b.size[0] = _choose_nodes(tables, layers, b)
    b.size[1] = 0
    bend = setting.youngs / (12.0 * (1.0 - tables.poisson * tables.poisson))
    for g in range(layers.plate.size):
        b.reach[g] = 0
        if layers.plate[g] >= 0:
            b.rigidity[g] = bend * layers.cubed[g]
            b.soft[g] = 1.0 / b.rigidity[g]
            for u in range(b.size[0]):
                if b.used[u] <= tables.edge_node[layers.plate[g]]:
                    b.reach[g] = u + 1
        for u in range(b.size[0]):
            b.lift[g, u] = 0.0
        for q in range(POINTS):
            b.theta[g, q] = 0.0
    for u in range(b.size[0]):
        rear = _touch_at(tables, layers, b, u)
        if b.used[u] == tables.seat and setting.seated:
            _add_contact(b, -1, 0, u, -setting.seat_height, 1)
        if b.used[u] == tables.spring and rear >= 0 and setting.spring_rate > 0.0:
            _add_contact(b, rear, -1, u, -setting.spring_preload / setting.spring_rate, 2)
            b.flex[b.size[1] - 1] = 1.0 / setting.spring_rate


@kernel
def _stretch_loads(tables: Tables, layers: Layers, setting: Setting, b: Bench) -> None:
    """Membrane forces of the last shapes as slope loads, and the added stiffness."""
    for g in range(layers.plate.size):
        plate = layers.plate[g]
        if plate < 0:
            continue
        stretching = setting.youngs * layers.thick[g]
        tip = b.lift[g, b.reach[g] - 1]
        added = RELAXATION * tables.stiffening[plate] * stretching / b.rigidity[g] * tip * tip
        b.soft[g] = 1.0 / (b.rigidity[g] * (1.0 + added))
        for q in range(POINTS):
            total = 0.0
            for k in range(POINTS):
                total += tables.membrane[plate, q, k] * b.theta[g, k] * b.theta[g, k]
            b.load[g, q] = (
                pi * stretching * tables.weight[plate, q] * total * b.theta[g, q]
            )


@kernel
def _without_contact(tables: Tables, layers: Layers, pressure: float, b: Bench) -> None:
    """Deflections and slopes under pressure and slope loads alone."""
    for g in range(layers.plate.size):
        plate = layers.plate[g]
        if plate < 0:
            continue
        soft = b.soft[g]
        kept = 1.0 - soft * b.rigidity[g]
        pressed = pressure if g == 0 else 0.0
        for u in range(b.reach[g]):
            k = b.used[u]
            total = pressed * tables.pressed[plate, k]
            for q in range(POINTS):
                total -= tables.slope[plate, k, q] * b.load[g, q]
            b.free[g, u] = soft * total + kept * b.lift[g, u]
        for q in range(POINTS):
            total = pressed * tables.pressed_slope[plate, q]
            for j in range(POINTS):
                total -= tables.slope_load[plate, q, j] * b.load[g, j]
            b.free_slope[g, q] = soft * total + kept * b.theta[g, q]


@kernel
def _couple(tables: Tables, layers: Layers, b: Bench, c: int, d: int) -> float:
    """Clearance opened at contact c by 1 N in contact d."""
    i, j = b.used[b.at[c]], b.used[b.at[d]]
    value = b.flex[c] if c == d else 0.0
    front, back = b.front[c], b.back[c]
    if front >= 0:
        g = b.soft[front] * tables.deflection[layers.plate[front], i, j]
        if b.front[d] == front:
            value += g
        elif b.back[d] == front:
            value -= g
    if back >= 0:
        g = b.soft[back] * tables.deflection[layers.plate[back], i, j]
        if b.back[d] == back:
            value += g
        elif b.front[d] == back:
            value -= g
    return value


@kernel
def _open_clearance(b: Bench, c: int, lift: Floats) -> float:
    value = b.gap[c]
    if b.back[c] >= 0:
        value += lift[b.back[c], b.at[c]]
    if b.front[c] >= 0:
        value -= lift[b.front[c], b.at[c]]
    return value


@kernel
def _solve_closed(tables: Tables, layers: Layers, b: Bench) -> bool:
    """Forces of the closed contacts so that their clearance is zero (Cholesky)."""
    n = 0
    for c in range(b.size[1]):
        b.force[c] = 0.0
        if b.closed[c]:
            b.active[n] = c
            n += 1
    a, v = b.matrix, b.vector
    for i in range(n):
        c = b.active[i]
        v[i] = -_open_clearance(b, c, b.free)
        for j in range(i + 1):
            total = _couple(tables, layers, b, c, b.active[j])
            for k in range(j):
                total -= a[i, k] * a[j, k]
            if i > j:
                a[i, j] = total / a[j, j]
            elif total > 0.0:
                a[i, i] = np.sqrt(total)
            else:
                return False
        for k in range(i):
            v[i] -= a[i, k] * v[k]
        v[i] /= a[i, i]
    for i in range(n - 1, -1, -1):
        for k in range(i + 1, n):
            v[i] -= a[k, i] * v[k]
        v[i] /= a[i, i]
        b.force[b.active[i]] = v[i]
    b.size[2] = n
    return True


@kernel
def _spread(tables: Tables, layers: Layers, b: Bench) -> None:
    """Deflections and slopes with the contact forces."""
    for g in range(layers.plate.size):
        for u in range(b.reach[g]):
            b.lift[g, u] = b.free[g, u]
    for i in range(b.size[2]):
        c = b.active[i]
        node = b.used[b.at[c]]
        for side in range(2):
            g = b.back[c] if side else b.front[c]
            if g < 0:
                continue
            push = b.force[c] * b.soft[g] * (1.0 if side else -1.0)
            row = tables.deflection[layers.plate[g], node]
            for u in range(b.reach[g]):
                b.lift[g, u] += push * row[b.used[u]]


@kernel
def _turn(tables: Tables, layers: Layers, b: Bench) -> None:
    """Slopes with the contact forces."""
    for g in range(layers.plate.size):
        b.theta[g] = b.free_slope[g]
    for i in range(b.size[2]):
        c = b.active[i]
        node = b.used[b.at[c]]
        for side in range(2):
            g = b.back[c] if side else b.front[c]
            if g < 0:
                continue
            push = b.force[c] * b.soft[g] * (1.0 if side else -1.0)
            for q in range(POINTS):
                b.theta[g, q] += push * tables.slope[layers.plate[g], node, q]


@kernel
def _find_contacts(tables: Tables, layers: Layers, b: Bench, scale: float) -> bool:
    """Principal pivoting from the contacts that were closed last. False when it did not end."""
    best = b.size[1] + 1
    patience = 3
    length = 1e-10 * scale
    for _pivot in range(MOST_PIVOTS):
        if not _solve_closed(tables, layers, b):
            return False
        _spread(tables, layers, b)
        total = 0.0
        for c in range(b.size[1]):
            total = max(total, abs(b.force[c]))
        wrong = 0
        last = -1
        for c in range(b.size[1]):
            if (b.closed[c] == 1 and b.force[c] < -1e-10 * total) or (
                b.closed[c] == 0 and _open_clearance(b, c, b.lift) < -length
            ):
                b.active[b.size[2] + wrong] = c
                wrong += 1
                last = c
        if wrong == 0:
            return True
        if wrong < best:
            best = wrong
            patience = 3
        else:
            patience -= 1
        if patience >= 0:
            for i in range(wrong):
                c = b.active[b.size[2] + i]
                b.closed[c] = 1 - b.closed[c]
        else:
            b.closed[last] = 1 - b.closed[last]
    return False


@kernel
def _start(b: Bench, pressures: Floats, p: int, ahead: float) -> None:
    """First guess at a pressure: the last shapes carried on along a power law."""
    if p == 0:
        return
    b.lift[:] = b.last_lift[(p - 1) % 3]
    b.theta[:] = b.last_theta[(p - 1) % 3]
    if p > 1:
        share = (pressures[p] ** ahead - pressures[p - 1] ** ahead) / (
            pressures[p - 1] ** ahead - pressures[p - 2] ** ahead
        )
        b.lift[:] += share * (b.lift - b.last_lift[(p - 2) % 3])
        b.theta[:] += share * (b.theta - b.last_theta[(p - 2) % 3])


@kernel
def settle(
    tables: Tables, layers: Layers, setting: Setting, b: Bench, pressure: float, scale: float
) -> int:
    """Equilibrium at one pressure, from the shapes in ``b``; rounds taken, -1 when none was found."""
    for rounds in range(1, MOST_ROUNDS + 1):
        before = b.lift[0, b.reach[0] - 1]
        _stretch_loads(tables, layers, setting, b)
        _without_contact(tables, layers, pressure, b)
        if not _find_contacts(tables, layers, b, scale):
            return -1
        _turn(tables, layers, b)
        after = b.lift[0, b.reach[0] - 1]
        if abs(after - before) <= setting.tolerance * abs(after):
            return rounds
    return -1


@kernel
def _moment(
    tables: Tables, layers: Layers, b: Bench, pressure: float, g: int, row: int
) -> float:
    """Radial moment, N, of a settled group at the clamp (row 0) or at table node row - 1."""
    plate = layers.plate[g]
    total = pressure * tables.pressed_moment[plate, row] if g == 0 else 0.0
    for q in range(POINTS):
        total -= tables.slope_load_moment[plate, row, q] * b.load[g, q]
    for k in range(b.size[2]):
        c = b.active[k]
        if b.front[c] == g:
            total -= b.force[c] * tables.moment[plate, row, b.used[b.at[c]]]
        elif b.back[c] == g:
            total += b.force[c] * tables.moment[plate, row, b.used[b.at[c]]]
    return total


@kernel
def _pull(tables: Tables, layers: Layers, setting: Setting, b: Bench, g: int, row: int) -> float:
    """Radial membrane force per length, N/m, at the same places."""
    plate = layers.plate[g]
    total = 0.0
    for q in range(POINTS):
        total += tables.membrane_edge[plate, row, q] * b.theta[g, q] * b.theta[g, q]
    r = tables.clamp if row == 0 else tables.nodes[row - 1]
    return 0.5 * setting.youngs * layers.thick[g] * total / r


@kernel
def _peak_stress(
    tables: Tables, layers: Layers, setting: Setting, b: Bench, pressure: float
) -> float:
    """Largest membrane + bending stress in any shim, Pa, as settled."""
    peak = 0.0
    for g in range(layers.plate.size):
        if layers.plate[g] < 0:
            continue
        for i in range(b.reach[g]):
            row = 0 if i == 0 else b.used[i - 1] + 1
            bent = abs(_moment(tables, layers, b, pressure, g, row))
            value = _pull(tables, layers, setting, b, g, row) / layers.thick[g]
            peak = max(peak, value + 6.0 * bent * layers.thickest[g] / layers.cubed[g])
    return peak


@kernel
def _next(
    tables: Tables, layers: Layers, setting: Setting, pressures: Floats, p: int, ahead: float,
    b: Bench,
) -> tuple[int, float]:  # fmt: skip
    """Settle at pressure p, carried on from the ones before; rounds, and the power law from here."""
    face = layers.plate[0]
    tip_node = tables.edge_node[face]
    _start(b, pressures, p, ahead)
    linear = tables.pressed[face, tip_node] / b.rigidity[0] * pressures[p]
    scale = linear + abs(setting.seat_height) + 1e-9 * tables.clamp
    rounds = settle(tables, layers, setting, b, pressures[p], scale)
    b.last_lift[p % 3] = b.lift
    b.last_theta[p % 3] = b.theta
    tip = b.lift[0, b.reach[0] - 1]
    stretching = setting.youngs * layers.thick[0] / b.rigidity[0]
    membrane = tables.stiffening[face] * stretching * tip * tip
    return rounds, (1.0 + membrane) / (1.0 + 3.0 * membrane)


@kernel
def _seat_rise(tables: Tables, b: Bench, height: float) -> float:
    """Rise of the face shim above the seat, m."""
    for u in range(b.reach[0]):
        if b.used[u] == tables.seat:
            return b.lift[0, u] - height
    return b.lift[0, b.reach[0] - 1] - height


@kernel
def follow(
    tables: Tables, layers: Layers, setting: Setting, pressures: Floats, b: Bench,
    edge: Floats, seat: Floats, stress: Floats,
) -> int:  # fmt: skip
    """Follow a stack along ascending ``pressures`` (p,), Pa.

    Writes the face edge's rise ``edge`` (p,) m, the rise at the seat ``seat`` (p,) m and the largest
    stress of any shim ``stress`` (p,) Pa. Returns the rounds taken, -1 when a pressure did not settle.
    """
    _lay_out(tables, layers, setting, b)
    total = 0
    ahead = 1.0
    for p in range(pressures.size):
        rounds, ahead = _next(tables, layers, setting, pressures, p, ahead, b)
        if rounds < 0:
            return -1
        total += rounds
        edge[p] = b.lift[0, b.reach[0] - 1]
        seat[p] = _seat_rise(tables, b, setting.seat_height)
        stress[p] = _peak_stress(tables, layers, setting, b, pressures[p])
    return total


@kernel
def profiles(
    tables: Tables, layers: Layers, setting: Setting, pressures: Floats, b: Bench,
) -> tuple[int, Floats, Floats, Floats]:  # fmt: skip
    """The same in full: rounds; deflection (p, m, n) m at every table node that matters (0 elsewhere);
    moments N and membrane forces N/m (p, m, n + 1) at the clamp and there."""
    m, n = layers.plate.size, tables.nodes.size
    lift = np.zeros((pressures.size, m, n))
    moments = np.zeros((pressures.size, m, n + 1))
    pulls = np.zeros((pressures.size, m, n + 1))
    _lay_out(tables, layers, setting, b)
    total = 0
    ahead = 1.0
    for p in range(pressures.size):
        rounds, ahead = _next(tables, layers, setting, pressures, p, ahead, b)
        if rounds < 0:
            return -1, lift, moments, pulls
        total += rounds
        for g in range(m):
            for i in range(b.reach[g] + 1 if layers.plate[g] >= 0 else 0):
                row = 0 if i == 0 else b.used[i - 1] + 1
                moments[p, g, row] = _moment(tables, layers, b, pressures[p], g, row)
                pulls[p, g, row] = _pull(tables, layers, setting, b, g, row)
                if i > 0:
                    lift[p, g, row - 1] = b.lift[g, i - 1]
    return total, lift, moments, pulls
