"""A first state: boundary layers marched under given speeds, without feedback.

A first guess only. Newton's iteration starts from it and ends at the same solution from
any other start that it can begin with; at most it matters which solution is found where
the equations have several.
"""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.cells import LAMINAR, TURBULENT, WAKE, cell, scratch
from solver.section.boundary_layer.compiled import compiled, inlined, of_one_type
from solver.section.boundary_layer.layout import (
    LAST,
    LN_DSTAR,
    LN_SPEED,
    LN_THETA,
    FloatArray,
    LayerState,
    Pair,
    Regime,
    Scratch,
    Stagnation,
    Stations,
)
from solver.section.boundary_layer.march import NOWHERE, initial_stress
from solver.section.boundary_layer.sides import (
    EXPLICIT,
    LEAST_SPEED,
    edge_node,
    fill_stagnation_layer,
    node_before,
    place_of,
    side_length,
    side_node,
)
from solver.section.boundary_layer.transition import transition_cell
from solver.section.boundary_layer.wake import WAKE_START

TURNING = of_one_type(-1)
"""Kind of the cell with transition, beside those of `cells`."""

FREE_H, HELD_H = of_one_type(False), of_one_type(True)
"""Whether the H of a cell's second station is prescribed."""

LARGEST_LAMINAR_H, LARGEST_TURBULENT_H = 3.7, 2.6
"""Past these the shape parameter is prescribed and the speed is let go."""
RISING_H, SEPARATED_H, LAMINAR_RISE = 3.6, 6.0, 0.03
"""Prescribed laminar H: above the first it rises by so much each theta, up to the second."""
TURNING_H, TURNING_RISE = 3.0, 0.5
"""Prescribed H behind transition: below the first a rise by the second, else a fall."""
TURBULENT_FALL, WAKE_FALL = 0.15, 0.02
"""Fall of the prescribed H, each theta; in a wake of H - 1, as a share."""
LEAST_WAKE_H, LEAST_HELD_H = 1.05, 1.2
"""Floors of the prescribed H in a wake, and of the H of a cell that is not solved at all."""

MOST_ROUNDS, LARGEST_STEP, SOLVED = 25, 0.3, 1e-8
"""Newton's method for a cell: iterations, largest change in one, and change at its end."""
FIRST_LN_STRESS = math.log(0.03)
"""Of laminar stations, should they turn turbulent."""
LEAST_PLACE = 1e-9
"""Floors of lengths and speeds that are divided by or whose logarithm is taken."""
NEVER = 9.0
"""Place of a trip that is not there, over chord."""
LEAST_NODE = 2
"""Nodes next to the trailing edge between which no stagnation point is looked for."""


@inlined
def _solve_three(matrix: FloatArray, residual: FloatArray, step: FloatArray) -> bool:
    """Fill the step that takes three residuals to zero; returns success."""
    a, b, c = matrix[0]
    d, e, f = matrix[1]
    g, h, i = matrix[2]
    p, q, r = e * i - f * h, c * h - b * i, b * f - c * e
    determinant = a * p + d * q + g * r
    if determinant == 0.0 or not math.isfinite(determinant):
        return False
    x, y, z = -residual[0] / determinant, -residual[1] / determinant, -residual[2] / determinant
    step[0] = p * x + q * y + r * z
    step[1] = (f * g - d * i) * x + (a * i - c * g) * y + (c * d - a * f) * z
    step[2] = (d * h - e * g) * x + (b * g - a * h) * y + (a * e - b * d) * z
    return True


@inlined
def _cell_step(
    kind: int,
    pair: Pair,
    held: bool,
    trip: float,
    regime: Regime,
    arrays: Scratch,
    matrix: FloatArray,
    step: FloatArray,
) -> bool:
    """Fill the Newton step of a cell's second station; returns success.

    Of (ln theta, ln dstar, a) at its speed, or of (ln theta, ln ue, a) at its H if that
    is held.
    """
    if kind == TURNING:
        transition_cell(pair, trip, regime, arrays)
    else:
        cell(kind, pair, regime, arrays.cell)
    second = arrays.cell.equations.second
    for r in range(3):
        if held:
            matrix[r, 0] = second[r, LN_THETA] + second[r, LN_DSTAR]
            matrix[r, 1] = second[r, LN_SPEED]
        else:
            matrix[r, 0] = second[r, LN_THETA]
            matrix[r, 1] = second[r, LN_DSTAR]
        matrix[r, 2] = second[r, LAST]
    return _solve_three(matrix, arrays.cell.equations.residual, step)


@compiled
def _solve_cell(
    kind: int, pair: Pair, held: bool, trip: float, regime: Regime, arrays: Scratch
) -> bool:
    """Solve a cell for its second station, at its speed or at its H; returns success."""
    matrix, step, two = np.empty((3, 3)), np.empty(3), pair.two
    for _ in range(MOST_ROUNDS):
        if not _cell_step(kind, pair, held, trip, regime, arrays, matrix, step):
            return False
        largest = max(abs(step[0]), abs(step[1]))
        if kind != LAMINAR:
            largest = max(largest, abs(step[2]))
        scale = 1.0 if largest < LARGEST_STEP else LARGEST_STEP / largest
        two[LN_THETA] += scale * step[0]
        if held:
            two[LN_DSTAR] += scale * step[0]
            two[LN_SPEED] += scale * step[1]
        else:
            two[LN_DSTAR] += scale * step[1]
        two[LAST] += scale * step[2]
        if largest < SOLVED:
            return True
    return False


@inlined
def _next_h(kind: int, pair: Pair) -> float:
    """H to prescribe where the given speed asks for more than an attached layer can bear.

    Made up, so that the march comes past separation with something like a bubble, or a
    thick layer: a laminar H rises from 3.7 to 6 along the way, falls behind transition,
    and a turbulent one falls towards 2.6. A first guess, as all of this module is.
    """
    one, xi = pair.one, pair.xi
    h = math.exp(one[LN_DSTAR] - one[LN_THETA])
    d: float = (xi[1] - xi[0]) / math.exp(one[LN_THETA])
    if kind == LAMINAR:
        rising = min(h + LAMINAR_RISE * d, SEPARATED_H)
        return max(LARGEST_LAMINAR_H, rising if h > RISING_H else LARGEST_LAMINAR_H)
    if kind == WAKE:
        return max(LEAST_WAKE_H, h - WAKE_FALL * d * (h - 1.0) / (1.0 + WAKE_FALL * d))
    if kind == TURNING and h < TURNING_H:
        return max(LARGEST_TURBULENT_H, h + TURNING_RISE)
    return max(LARGEST_TURBULENT_H, h - TURBULENT_FALL * d)


@compiled
def _step(
    kind: int, pair: Pair, trip: float, regime: Regime, arrays: Scratch, limit: float
) -> None:
    """March one cell: at its speed, else at a prescribed H, else by leaving it as it is.

    `limit` is the largest H that is believed of the first of these.
    """
    one, two = pair.one, pair.two
    trial = Pair(one, two.copy(), pair.xi)
    good = _solve_cell(kind, trial, FREE_H, trip, regime, arrays)
    rise = trial.two[LN_DSTAR] - trial.two[LN_THETA]
    if good and rise < math.log(limit) and trial.two[LN_DSTAR] > trial.two[LN_THETA]:
        two[:] = trial.two
        return
    h = _next_h(kind, pair)
    trial.two[:] = two
    trial.two[LN_THETA] = one[LN_THETA]
    trial.two[LN_DSTAR] = trial.two[LN_THETA] + math.log(h)
    if _solve_cell(kind, trial, HELD_H, trip, regime, arrays):
        two[:] = trial.two
        return
    two[LN_THETA] = one[LN_THETA]
    two[LN_DSTAR] = one[LN_THETA] + math.log(min(max(h, LEAST_HELD_H), limit))


@inlined
def _start_laminar(
    node: int, pair: Pair, trip: float, state: LayerState, regime: Regime, arrays: Scratch
) -> bool:
    """March a laminar cell; returns whether its end is still laminar."""
    pair.one[LAST] = pair.two[LAST] = state.amplification[node]
    _step(LAMINAR, pair, trip, regime, arrays, LARGEST_LAMINAR_H)
    grown: float = pair.two[LAST]
    place: float = pair.xi[1]
    state.amplification[node] = grown
    return grown <= regime.critical and place <= trip


@compiled
def start_side(
    side: int,
    stagnation: Stagnation,
    stations: Stations,
    trip: float,
    regime: Regime,
    state: LayerState,
    arrays: Scratch,
) -> None:
    """March a side under given speeds.

    Parameters
    ----------
    side : int
        0 for the upper side, 1 for the lower.
    stagnation : Stagnation
    stations : Stations
    trip : float
        Place of forced transition, from the stagnation point. [-]
    regime : Regime
    state : LayerState
        Its ln ue are given, and changed where H is prescribed; the rest of the side is
        filled, its first turbulent node among it.
    arrays : Scratch
    """
    pair = Pair(np.empty(4), np.empty(4), np.empty(2))
    one, two, xi = pair
    laminar = True
    state.turbulent_from[side] = NOWHERE
    for k in range(side_length(side, stagnation.node, len(state.amplification))):
        node = side_node(side, k, stagnation.node)
        at = state.stations[node]
        xi[1] = max(place_of(node, side, stations, stagnation), LEAST_PLACE)
        at[LAST] = FIRST_LN_STRESS
        if k < EXPLICIT:
            fill_stagnation_layer(at, xi[1], regime.reynolds)
            state.amplification[node] = 0.0
            continue
        last = node_before(side, node)
        xi[0] = place_of(last, side, stations, stagnation)
        one[:] = state.stations[last]
        two[:LN_SPEED] = one[:LN_SPEED]
        two[LN_SPEED], two[LAST] = at[LN_SPEED], one[LAST]
        state.amplification[node] = state.amplification[last]
        kind = TURBULENT
        if laminar:
            if _start_laminar(node, pair, trip, state, regime, arrays):
                at[:LAST] = two[:LAST]
                continue
            laminar, kind = False, TURNING
            state.turbulent_from[side] = node
            two[LN_SPEED] = at[LN_SPEED]
            two[LAST] = initial_stress(two, regime, arrays)
        _step(kind, pair, trip, regime, arrays, LARGEST_TURBULENT_H)
        at[:] = two


@inlined
def _find_stagnation(speed: FloatArray, stations: Stations) -> Stagnation:
    """Find where the flow turns, on the way along the nodes."""
    arc, node = stations.arc, 1
    for i in range(LEAST_NODE, len(arc) - LEAST_NODE - 1):
        if speed[i] < 0.0 <= speed[i + 1]:
            node = i
            break
    low, high = -speed[node], speed[node + 1]
    point = arc[node] + (arc[node + 1] - arc[node]) * low / max(low + high, LEAST_PLACE)
    return Stagnation(node, point)


@inlined
def _start_wake(stations: Stations, regime: Regime, state: LayerState, arrays: Scratch) -> None:
    """March the wake under given speeds, from the sum of both sides."""
    nodes, total = len(state.amplification), len(state.stations)
    pair = Pair(np.empty(4), np.empty(4), np.empty(2))
    theta = dstar = stress = speed = 0.0
    for side in range(2):
        at = state.stations[edge_node(side, nodes)]
        s = at[LAST]
        if state.turbulent_from[side] == NOWHERE:
            s = initial_stress(at, regime, arrays)
        theta += math.exp(at[LN_THETA])
        dstar += math.exp(at[LN_DSTAR])
        speed += math.exp(at[LN_SPEED])
        stress += math.exp(at[LN_THETA] + s)
    one, two, xi = pair
    one[LN_THETA], one[LN_DSTAR] = math.log(theta), math.log(dstar)
    one[LN_SPEED], one[LAST] = math.log(0.5 * speed), math.log(stress / theta)
    for k in range(total - nodes):
        at = state.stations[nodes + k]
        xi[0] = WAKE_START + stations.distance[k]
        xi[1] = WAKE_START + stations.distance[k + 1]
        two[:] = one
        two[LN_SPEED] = at[LN_SPEED]
        _step(WAKE, pair, NEVER, regime, arrays, LARGEST_TURBULENT_H)
        at[:] = two
        one[:] = two


@compiled
def start(
    speed: FloatArray, stations: Stations, trip: FloatArray, regime: Regime, state: LayerState
) -> None:
    """Fill a state from the speeds of a potential flow.

    Parameters
    ----------
    speed : numpy.ndarray, shape (n + w,)
        Along body and wake, negative against the nodes. [-]
    stations : Stations
    trip : numpy.ndarray, shape (2,)
        Places of forced transition on both sides, from the stagnation point. [-]
    regime : Regime
    state : LayerState
        Filled, but for its sheet.
    """
    arrays = scratch()
    stagnation = _find_stagnation(speed, stations)
    for i in range(len(speed)):
        state.stations[i, LN_SPEED] = math.log(max(abs(speed[i]), LEAST_SPEED))
    for side in range(2):
        start_side(side, stagnation, stations, trip[side], regime, state, arrays)
    _start_wake(stations, regime, state, arrays)
    state.place[0], state.place[1] = stagnation.node, stagnation.arc
