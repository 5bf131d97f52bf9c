"""The `search` fidelity: one stack's lift and stress in some ten microseconds a pressure.

The same mathematics as the `reported` fidelity (stretched plates, unilateral contact), arranged
for speed. The unknowns are the contact forces, at shim edges and a few radii more (tables.py);
every plate answers them through tabulated responses. At each pressure three things are repeated
until the lift settles:

1. the membrane force of every plate is worked out from its last shape and becomes a slope load;
2. a plate that stretches is stiffer: a share c of its bending stiffness is added to both sides of
   its equation (left as stiffness, right as load on the last shape), which makes the repetition
   converge without changing what it converges to;
3. the contact forces are found by principal pivoting: closed contacts that would pull are
   opened, open ones that would overlap are closed, all at once, and one at a time when that stops
   getting better.

Sources: plates and membranes as in plate.py and membrane.py; block principal pivoting after J. J.
Judice and F. M. Pires, "A block principal pivoting algorithm for large-scale strictly monotone
linear complementarity problems", Computers & Operations Research 21 (1994) [from memory].
"""

from math import pi
from typing import NamedTuple

import numpy as np

from optimiser.compiled import inner, kernel
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.tables import POINTS, Tables

#: Added stiffness per membrane secant stiffness; between 1 and 3 both lift and shape settle fast.
RELAXATION = 1.6
MOST_ROUNDS = 60
#: From this round on the shapes of two rounds are averaged: a contact may otherwise close and open
#: in turn for ever.
AVERAGED_FROM = 9
MOST_PIVOTS = 1000
#: Relative overlap or pull that passes for none.
SLACK = 1e-9
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
    size: Ints  # (4,) number of used nodes, contacts, closed contacts; pivots in all
    reach: Ints  # (m,) number of used nodes on each group
    front: Ints  # (c,) group in front of each contact; -1 for none
    back: Ints  # (c,) group behind it; -1 for none
    at: Ints  # (c,) used node of each contact
    gap: Floats  # (c,)
    flex: Floats  # (c,) own compliance, of a spring
    closed: Ints  # (c,) 1 closed, 0 open, 2 always closed
    force: Floats  # (c,)
    active: Ints  # (c,)
    wrong: Ints  # (c,)
    low: Ints  # (c,) first column of each row of the matrix
    last_front: Ints  # (n,) rearmost group so far at each used node
    passed: Floats  # (n,) gap since that group
    matrix: Floats  # (c, c)
    vector: Floats  # (c,)
    rigidity: Floats  # (m,)
    soft: Floats  # (m,) 1 / (D (1 + c))
    free: Floats  # (m, n) deflection without contact
    free_slope: Floats  # (m, q)
    lift: Floats  # (m, n)
    theta: Floats  # (m, q)
    load: Floats  # (m, q) slope loads
    bent: Floats  # (m, n) moments
    last_lift: Floats  # (m, n) at the last pressure
    last_theta: Floats  # (m, q)
    kept_lift: Floats  # (m, n) in the last round
    kept_theta: Floats  # (m, q)


@kernel
def bench(groups: int, nodes: int) -> Bench:
    """Scratch arrays, made once."""
    contacts = groups * nodes + 2
    return Bench(
        np.zeros(nodes, np.int64), np.zeros(4, np.int64), np.zeros(groups, np.int64),
        np.zeros(contacts, np.int64), np.zeros(contacts, np.int64), np.zeros(contacts, np.int64),
        np.zeros(contacts), np.zeros(contacts), np.zeros(contacts, np.int64), np.zeros(contacts),
        np.zeros(contacts, np.int64), np.zeros(contacts, np.int64), np.zeros(contacts, np.int64),
        np.zeros(nodes, np.int64), np.zeros(nodes), np.zeros((contacts, contacts)),
        np.zeros(contacts), np.zeros(groups), np.zeros(groups), np.zeros((groups, nodes)),
        np.zeros((groups, POINTS)), np.zeros((groups, nodes)), np.zeros((groups, POINTS)),
        np.zeros((groups, POINTS)), np.zeros((groups, nodes + 1)), np.zeros((groups, nodes)),
        np.zeros((groups, POINTS)), np.zeros((groups, nodes)), np.zeros((groups, POINTS)),
    )  # fmt: skip


@inner
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


@inner
def _add_contact(b: Bench, front: int, back: int, at: int, gap: float, closed: int) -> None:
    c = b.size[1]
    b.front[c] = front
    b.back[c] = back
    b.at[c] = at
    b.gap[c] = gap
    b.flex[c] = 0.0
    b.closed[c] = closed
    b.size[1] = c + 1


@inner
def _touch(tables: Tables, layers: Layers, b: Bench) -> None:
    """Contacts between groups at the used nodes, interface after interface."""
    plates, edge_node, used = layers.plate, tables.edge_node, b.used
    front, gap = b.last_front, b.passed
    for u in range(b.size[0]):
        front[u] = -1
        gap[u] = 0.0
    for g in range(plates.size):
        plate = plates[g]
        for u in range(b.size[0]):
            k = used[u]
            if plate == RING:
                if layers.hole[g] <= k <= layers.rim[g]:
                    gap[u] -= layers.thick[g]
            elif plate >= 0 and edge_node[plate] >= k:
                if front[u] >= 0:
                    edge = min(edge_node[plate], edge_node[plates[front[u]]])
                    near = gap[u] < 0.0 or (gap[u] == 0.0 and edge == k)
                    _add_contact(b, front[u], g, u, gap[u], 1 if near else 0)
                front[u] = g
                gap[u] = 0.0
            else:
                gap[u] += layers.thick[g]


@kernel
def lay_out(tables: Tables, layers: Layers, setting: Setting, b: Bench) -> None:
    """Find this stack's nodes and contacts, and set its stiffnesses."""
    size, used, reach = b.size, b.used, b.reach
    rigidity, soft, lift, theta = b.rigidity, b.soft, b.lift, b.theta
    size[0] = _choose_nodes(tables, layers, b)
    size[1] = 0
    bend = setting.youngs / (12.0 * (1.0 - tables.poisson * tables.poisson))
    for g in range(layers.plate.size):
        reach[g] = 0
        if layers.plate[g] >= 0:
            rigidity[g] = bend * layers.cubed[g]
            soft[g] = 1.0 / rigidity[g]
            for u in range(size[0]):
                if used[u] <= tables.edge_node[layers.plate[g]]:
                    reach[g] = u + 1
        for u in range(size[0]):
            lift[g, u] = 0.0
            b.last_lift[g, u] = 0.0
        for q in range(POINTS):
            theta[g, q] = 0.0
            b.last_theta[g, q] = 0.0
    if setting.seated:
        for u in range(size[0]):
            if used[u] == tables.seat:
                _add_contact(b, -1, 0, u, -setting.seat_height, 1)
    _touch(tables, layers, b)
    if setting.spring_rate > 0.0:
        for u in range(size[0]):
            if used[u] == tables.spring and b.last_front[u] >= 0:
                gap = -setting.spring_preload / setting.spring_rate
                _add_contact(b, b.last_front[u], -1, u, gap, 2)
                b.flex[size[1] - 1] = 1.0 / setting.spring_rate


@inner
def _stretch_loads(tables: Tables, layers: Layers, setting: Setting, b: Bench) -> None:
    """Membrane forces of the last shapes as slope loads, and the added stiffness."""
    membrane, weight, stiffening = tables.membrane, tables.weight, tables.stiffening
    plates, thick, reach = layers.plate, layers.thick, b.reach
    lift, theta, load, soft, rigidity = b.lift, b.theta, b.load, b.soft, b.rigidity
    for g in range(plates.size):
        plate = plates[g]
        if plate < 0:
            continue
        stretching = setting.youngs * thick[g]
        tip = lift[g, reach[g] - 1]
        added = RELAXATION * stiffening[plate] * stretching / rigidity[g] * tip * tip
        soft[g] = 1.0 / (rigidity[g] * (1.0 + added))
        for q in range(POINTS):
            total = 0.0
            for k in range(POINTS):
                total += membrane[plate, q, k] * theta[g, k] * theta[g, k]
            load[g, q] = pi * stretching * weight[plate, q] * total * theta[g, q]


@inner
def _without_contact(tables: Tables, layers: Layers, pressure: float, b: Bench) -> None:
    """Deflections and slopes under pressure and slope loads alone."""
    pressed, pressed_slope = tables.pressed, tables.pressed_slope
    slope, slope_load = tables.slope, tables.slope_load
    plates, used, reach = layers.plate, b.used, b.reach
    lift, theta, load = b.lift, b.theta, b.load
    free, free_slope, softness, rigidity = b.free, b.free_slope, b.soft, b.rigidity
    for g in range(plates.size):
        plate = plates[g]
        if plate < 0:
            continue
        soft = softness[g]
        kept = 1.0 - soft * rigidity[g]
        push = pressure if g == 0 else 0.0
        for u in range(reach[g]):
            k = used[u]
            total = push * pressed[plate, k]
            for q in range(POINTS):
                total -= slope[plate, k, q] * load[g, q]
            free[g, u] = soft * total + kept * lift[g, u]
        for q in range(POINTS):
            total = push * pressed_slope[plate, q]
            for j in range(POINTS):
                total -= slope_load[plate, q, j] * load[g, j]
            free_slope[g, q] = soft * total + kept * theta[g, q]


@inner
def _gather(tables: Tables, layers: Layers, b: Bench) -> int:
    """The closed contacts' compliance (lower half) and clearance without them; their number."""
    deflection, plates = tables.deflection, layers.plate
    fronts, backs, at, used = b.front, b.back, b.at, b.used
    closed, active, soft, free = b.closed, b.active, b.soft, b.free
    matrix, vector, gap, flex, low = b.matrix, b.vector, b.gap, b.flex, b.low
    n = 0
    for c in range(b.size[1]):
        if not closed[c]:
            continue
        front, back, node = fronts[c], backs[c], used[at[c]]
        clear = gap[c]
        if back >= 0:
            clear += free[back, at[c]]
        if front >= 0:
            clear -= free[front, at[c]]
        vector[n] = -clear
        active[n] = c
        start = 0
        while start < n and backs[active[start]] < front:
            start += 1
        low[n] = start
        for i in range(start, n + 1):
            d = active[i]
            other = used[at[d]]
            value = 0.0
            if front >= 0:
                sign = 1.0 if fronts[d] == front else (-1.0 if backs[d] == front else 0.0)
                if sign != 0.0:
                    value += sign * soft[front] * deflection[plates[front], node, other]
            if back >= 0:
                sign = 1.0 if backs[d] == back else (-1.0 if fronts[d] == back else 0.0)
                if sign != 0.0:
                    value += sign * soft[back] * deflection[plates[back], node, other]
            matrix[n, i] = value
        matrix[n, n] += flex[c]
        n += 1
    return n


@inner
def _solve(matrix: Floats, low: Ints, vector: Floats, n: int) -> bool:
    """Cholesky solve with the lower half of ``matrix`` (n, n) from column ``low`` (n,) of each
    row on; ``vector`` (n,) becomes the solution."""
    for i in range(n):
        for j in range(low[i], i + 1):
            total = matrix[i, j]
            for k in range(max(low[i], low[j]), j):
                total -= matrix[i, k] * matrix[j, k]
            if i > j:
                matrix[i, j] = total / matrix[j, j]
            elif total > 0.0:
                matrix[i, i] = np.sqrt(total)
            else:
                return False
        total = vector[i]
        for k in range(low[i], i):
            total -= matrix[i, k] * vector[k]
        vector[i] = total / matrix[i, i]
    for i in range(n - 1, -1, -1):
        vector[i] /= matrix[i, i]
        for k in range(low[i], i):
            vector[k] -= matrix[i, k] * vector[i]
    return True


@inner
def _spread(tables: Tables, layers: Layers, b: Bench) -> None:
    """Deflections with the contact forces."""
    deflection, plates, used, reach = tables.deflection, layers.plate, b.used, b.reach
    fronts, backs, at, active, vector = b.front, b.back, b.at, b.active, b.vector
    lift, free, soft = b.lift, b.free, b.soft
    for g in range(plates.size):
        for u in range(reach[g]):
            lift[g, u] = free[g, u]
    for i in range(b.size[2]):
        c = active[i]
        node = used[at[c]]
        for side in range(2):
            g = backs[c] if side else fronts[c]
            if g < 0:
                continue
            plate = plates[g]
            push = vector[i] * soft[g] * (1.0 if side else -1.0)
            for u in range(reach[g]):
                lift[g, u] += push * deflection[plate, node, used[u]]


@inner
def _turn(tables: Tables, layers: Layers, b: Bench) -> None:
    """Slopes with the contact forces."""
    slope, plates, used, at = tables.slope, layers.plate, b.used, b.at
    fronts, backs, active, vector = b.front, b.back, b.active, b.vector
    theta, free_slope, soft = b.theta, b.free_slope, b.soft
    for g in range(plates.size):
        for q in range(POINTS):
            theta[g, q] = free_slope[g, q]
    for i in range(b.size[2]):
        c = active[i]
        node = used[at[c]]
        for side in range(2):
            g = backs[c] if side else fronts[c]
            if g < 0:
                continue
            push = vector[i] * soft[g] * (1.0 if side else -1.0)
            for q in range(POINTS):
                theta[g, q] += push * slope[plates[g], node, q]


@inner
def _mistaken(b: Bench, scale: float) -> int:
    """List the contacts that pull though closed, or overlap though open; their number."""
    closed, force, gap, at, lift = b.closed, b.force, b.gap, b.at, b.lift
    fronts, backs, active, vector, wrong = b.front, b.back, b.active, b.vector, b.wrong
    largest = 0.0
    for i in range(b.size[2]):
        largest = max(largest, abs(vector[i]))
    for c in range(b.size[1]):
        force[c] = 0.0
    for i in range(b.size[2]):
        force[active[i]] = vector[i]
    count = 0
    for c in range(b.size[1]):
        if closed[c] == 1:
            bad = force[c] < -SLACK * largest
        elif closed[c] == 0:
            clear = gap[c]
            if backs[c] >= 0:
                clear += lift[backs[c], at[c]]
            if fronts[c] >= 0:
                clear -= lift[fronts[c], at[c]]
            bad = clear < -SLACK * scale
        else:
            bad = False
        if bad:
            wrong[count] = c
            count += 1
    return count


@inner
def _find_contacts(tables: Tables, layers: Layers, b: Bench, scale: float) -> bool:
    """Principal pivoting from the contacts that were closed last. False when it did not end."""
    size, closed, wrong = b.size, b.closed, b.wrong
    best = size[1] + 1
    patience = 3
    for _pivot in range(MOST_PIVOTS):
        size[2] = _gather(tables, layers, b)
        if not _solve(b.matrix, b.low, b.vector, size[2]):
            return False
        size[3] += 1
        _spread(tables, layers, b)
        count = _mistaken(b, scale)
        if count == 0:
            return True
        if count < best:
            best = count
            patience = 3
        else:
            patience -= 1
        first = 0 if patience >= 0 else count - 1
        for i in range(first, count):
            closed[wrong[i]] = 1 - closed[wrong[i]]
    return False


@inner
def _start(layers: Layers, b: Bench, pressures: Floats, p: int, ahead: float) -> None:
    """First guess at a pressure: the last shapes carried on along a power law."""
    lift, theta = b.lift, b.theta
    before, turned = b.last_lift, b.last_theta
    share = 0.0
    if p > 1:
        share = (pressures[p] ** ahead - pressures[p - 1] ** ahead) / (
            pressures[p - 1] ** ahead - pressures[p - 2] ** ahead
        )
    for g in range(layers.plate.size):
        for u in range(b.reach[g]):
            step = lift[g, u] - before[g, u]
            before[g, u] = lift[g, u]
            lift[g, u] += share * step
        for q in range(POINTS):
            step = theta[g, q] - turned[g, q]
            turned[g, q] = theta[g, q]
            theta[g, q] += share * step


@inner
def _shrink(tables: Tables, layers: Layers, setting: Setting, b: Bench) -> None:
    """Scale a first, unstretched shape of every plate to about what its stretching leaves of it."""
    for g in range(layers.plate.size):
        if layers.plate[g] < 0:
            continue
        tip = b.lift[g, b.reach[g] - 1]
        stretching = setting.youngs * layers.thick[g] / b.rigidity[g]
        stiffer = tables.stiffening[layers.plate[g]] * stretching * tip * tip
        share = 1.0 / (1.0 + stiffer) if stiffer < 1.0 else 0.5 * stiffer ** (-1.0 / 3.0)
        for u in range(b.reach[g]):
            b.lift[g, u] *= share
        for q in range(POINTS):
            b.theta[g, q] *= share


@inner
def _keep(layers: Layers, b: Bench) -> None:
    """Remember the shapes of this round."""
    for g in range(layers.plate.size):
        for u in range(b.reach[g]):
            b.kept_lift[g, u] = b.lift[g, u]
        for q in range(POINTS):
            b.kept_theta[g, q] = b.theta[g, q]


@inner
def _average(layers: Layers, b: Bench) -> None:
    """Take the mean of the shapes of the last round and of this one."""
    for g in range(layers.plate.size):
        for u in range(b.reach[g]):
            b.lift[g, u] = 0.5 * (b.lift[g, u] + b.kept_lift[g, u])
        for q in range(POINTS):
            b.theta[g, q] = 0.5 * (b.theta[g, q] + b.kept_theta[g, q])


@inner
def settle(
    tables: Tables, layers: Layers, setting: Setting, b: Bench, pressure: float, scale: float
) -> int:
    """Equilibrium at one pressure, from the shapes in ``b``; rounds taken, -1 when none was
    found."""
    for rounds in range(1, MOST_ROUNDS + 1):
        before = b.lift[0, b.reach[0] - 1]
        if rounds >= AVERAGED_FROM:
            _keep(layers, b)
        _stretch_loads(tables, layers, setting, b)
        _without_contact(tables, layers, pressure, b)
        if not _find_contacts(tables, layers, b, scale):
            return -1
        _turn(tables, layers, b)
        if rounds == 1 and before == 0.0:
            _shrink(tables, layers, setting, b)
        if rounds >= AVERAGED_FROM:
            _average(layers, b)
        after = b.lift[0, b.reach[0] - 1]
        if abs(after - before) <= setting.tolerance * abs(after):
            return rounds
    return -1


@inner
def _peak_stress(
    tables: Tables, layers: Layers, setting: Setting, b: Bench, pressure: float
) -> float:
    """Largest membrane + bending stress in any shim, Pa, as settled."""
    plates, cubed, thickest = layers.plate, layers.cubed, layers.thickest
    pressed, moment, turned = tables.pressed_moment, tables.moment, tables.slope_load_moment
    membrane, nodes, theta, load = tables.membrane_edge, tables.nodes, b.theta, b.load
    fronts, backs, active, vector = b.front, b.back, b.active, b.vector
    reach, used, at, bent = b.reach, b.used, b.at, b.bent
    for g in range(plates.size):
        for i in range(reach[g]):
            row = 0 if i == 0 else used[i - 1] + 1
            total = pressure * pressed[plates[g], row] if g == 0 else 0.0
            for q in range(POINTS):
                total -= turned[plates[g], row, q] * load[g, q]
            bent[g, i] = total
    for k in range(b.size[2]):
        c = active[k]
        node = used[at[c]]
        for side in range(2):
            g = backs[c] if side else fronts[c]
            if g < 0:
                continue
            push = vector[k] if side else -vector[k]
            for i in range(reach[g]):
                row = 0 if i == 0 else used[i - 1] + 1
                bent[g, i] += push * moment[plates[g], row, node]
    peak = 0.0
    for g in range(plates.size):
        for i in range(reach[g]):
            row = 0 if i == 0 else used[i - 1] + 1
            pull = 0.0
            for q in range(POINTS):
                pull += membrane[plates[g], row, q] * theta[g, q] * theta[g, q]
            pull *= 0.5 * setting.youngs / (tables.clamp if i == 0 else nodes[row - 1])
            peak = max(peak, pull + 6.0 * abs(bent[g, i]) * thickest[g] / cubed[g])
    return peak


@kernel
def advance(
    tables: Tables, layers: Layers, setting: Setting, pressures: Floats, p: int, ahead: float,
    b: Bench,
) -> tuple[int, float]:  # fmt: skip
    """Settle at pressure p, carried on from the ones before; rounds, and the power law from
    here."""
    face = layers.plate[0]
    tip_node = tables.edge_node[face]
    _start(layers, b, pressures, p, ahead)
    linear = tables.pressed[face, tip_node] / b.rigidity[0] * pressures[p]
    scale = linear + abs(setting.seat_height) + 1e-9 * tables.clamp
    rounds = settle(tables, layers, setting, b, pressures[p], scale)
    tip = b.lift[0, b.reach[0] - 1]
    stretching = setting.youngs * layers.thick[0] / b.rigidity[0]
    membrane = tables.stiffening[face] * stretching * tip * tip
    return rounds, (1.0 + membrane) / (1.0 + 3.0 * membrane)


@inner
def _seat_rise(tables: Tables, b: Bench, height: float) -> float:
    """Rise of the face shim above the seat, m."""
    for u in range(b.reach[0]):
        if b.used[u] == tables.seat:
            return float(b.lift[0, u]) - height
    return float(b.lift[0, b.reach[0] - 1]) - height


@kernel
def follow(
    tables: Tables, layers: Layers, setting: Setting, pressures: Floats, b: Bench,
    edge: Floats, seat: Floats, stress: Floats, force: Floats,
) -> int:  # fmt: skip
    """Follow a stack along ascending ``pressures`` (p,), Pa.

    Writes the face edge's rise ``edge`` (p,) m, the rise at the seat ``seat`` (p,) m, the largest
    stress of any shim ``stress`` (p,) Pa and the force on the seat ``force`` (p,) N. Returns the
    rounds taken, -1 when a pressure did not settle.
    """
    lay_out(tables, layers, setting, b)
    total = 0
    ahead = 1.0
    for p in range(pressures.size):
        rounds, ahead = advance(tables, layers, setting, pressures, p, ahead, b)
        if rounds < 0:
            return -1
        total += rounds
        edge[p] = b.lift[0, b.reach[0] - 1]
        seat[p] = _seat_rise(tables, b, setting.seat_height)
        stress[p] = _peak_stress(tables, layers, setting, b, pressures[p])
        force[p] = b.force[0] if setting.seated else 0.0
    return total


class Profile(NamedTuple):
    """A settled stack in full, at the clamp and every table node (k = n + 1, clamp first)."""

    lift: Floats  # (m, k) m
    moment: Floats  # (m, k) radial, N
    pull: Floats  # (m, k) radial membrane force per length, N/m


def profile(tables: Tables, layers: Layers, setting: Setting, b: Bench, pressure: float) -> Profile:
    """Deflection, moment and membrane force of every group as settled at ``pressure``, Pa; zeros
    at radii that do not matter for the stack."""
    shape = (layers.plate.size, tables.nodes.size + 1)
    lift, moment, pull = np.zeros(shape), np.zeros(shape), np.zeros(shape)
    radii = np.concatenate([[tables.clamp], tables.nodes])
    active = b.active[: b.size[2]]
    node = b.used[b.at[active]]
    force = b.force[active]
    for g in np.flatnonzero(layers.plate >= 0):
        plate = layers.plate[g]
        rows = np.concatenate([[0], b.used[: b.reach[g]] + 1])
        push = force * ((b.back[active] == g) * 1.0 - (b.front[active] == g))
        bent = tables.moment[plate][:, node] @ push
        bent -= tables.slope_load_moment[plate] @ b.load[g]
        if g == 0:
            bent += pressure * tables.pressed_moment[plate]
        stretch = 0.5 * setting.youngs * layers.thick[g] * b.theta[g] ** 2
        moment[g, rows] = bent[rows]
        pull[g, rows] = (tables.membrane_edge[plate] @ stretch / radii)[rows]
        lift[g, rows[1:]] = b.lift[g, : b.reach[g]]
    return Profile(lift, moment, pull)
