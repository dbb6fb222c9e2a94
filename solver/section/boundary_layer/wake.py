"""March along the wake, which begins as both sides end."""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.cells import WAKE, cell
from solver.section.boundary_layer.compiled import compiled, inlined, of_one_type
from solver.section.boundary_layer.elimination import (
    CONSTANT,
    D_LAST,
    D_SPEED,
    D_THETA,
    DEFECT_ONE,
    DEFECT_TWO,
    carry,
    eliminate,
    keep_speed,
)
from solver.section.boundary_layer.layout import (
    LAST,
    LN_DSTAR,
    LN_EQUILIBRIUM,
    LN_SPEED,
    LN_THETA,
    FloatArray,
    LayerState,
    March,
    Pair,
    Regime,
    Scratch,
    Stations,
)
from solver.section.boundary_layer.march import NOWHERE, initial_stress
from solver.section.boundary_layer.sides import edge_node
from solver.section.boundary_layer.speeds import mass_defect

FIRST = of_one_type(0)
"""Of the mass defects; a wake depends on all of them."""
WAKE_START = 1.0
"""Place xi at which the wake is taken to begin: of importance to the error of differences
alone, for nothing in the wake depends on where the flow came from."""
LARGEST_LACK = 4.0
"""Most by which a laminar edge's waves are taken to be short of turning turbulent, in n."""


@inlined
def edge_stress(
    side: int, state: LayerState, regime: Regime, arrays: Scratch
) -> tuple[float, float]:
    """Find ln S that a side takes into the wake, and what its waves lack in n.

    A side that is laminar to its end has the stress of turbulence that begins, less what
    its waves lack to that: the stress goes as the square of their amplitude, exp(n).
    """
    nodes = len(state.amplification)
    node = edge_node(side, nodes)
    if state.turbulent_from[side] != NOWHERE:
        return state.stations[node, LAST], 0.0
    lacking = regime.critical - state.amplification[node]
    stress = initial_stress(state.stations[node], regime, arrays)
    return stress - min(max(lacking, 0.0), LARGEST_LACK), lacking


@inlined
def _fill_edge(
    side: int,
    state: LayerState,
    regime: Regime,
    end: FloatArray,
    arrays: Scratch,
    joined: FloatArray,
    rows: FloatArray,
) -> None:
    """Fill theta, dstar, ue, S of a side's end, and how their logarithms depend."""
    node = edge_node(side, len(state.amplification))
    at = state.stations[node]
    rows[LN_THETA] = end[D_THETA]
    rows[LN_DSTAR] = -end[D_SPEED]
    rows[LN_DSTAR, node] += 1.0 / mass_defect(at)
    rows[LN_SPEED] = end[D_SPEED]
    stress, lacking = edge_stress(side, state, regime, arrays)
    if state.turbulent_from[side] != NOWHERE:
        rows[LAST] = end[D_LAST]
    else:
        follows = 0.0 < lacking < LARGEST_LACK
        over = arrays.cell.quantities.slope[1, LN_EQUILIBRIUM]
        for j in range(rows.shape[1]):
            x = end[D_LAST, j] if follows else 0.0
            for q in range(LAST):
                x += over[q] * rows[q, j]
            rows[LAST, j] = x
    for q in range(LAST):
        joined[q] = math.exp(at[q])
    joined[LAST] = math.exp(stress)


@inlined
def _add_edge(
    edge: FloatArray, weights: tuple[float, float, float, float], rows: FloatArray
) -> None:
    """Add one side's share of how the sums depend: of theta, dstar, ue, theta S."""
    for j in range(rows.shape[1]):
        rows[LN_THETA, j] += weights[LN_THETA] * edge[LN_THETA, j]
        rows[LN_DSTAR, j] += weights[LN_DSTAR] * edge[LN_DSTAR, j]
        rows[LN_SPEED, j] += weights[LN_SPEED] * edge[LN_SPEED, j]
        rows[LAST, j] += weights[LAST] * (edge[LN_THETA, j] + edge[LAST, j])


@compiled
def join(
    state: LayerState,
    regime: Regime,
    ends: FloatArray,
    arrays: Scratch,
    joined: FloatArray,
    rows: FloatArray,
) -> None:
    """Fill the state in which the wake begins, and how it depends.

    Parameters
    ----------
    state : LayerState
    regime : Regime
    ends : numpy.ndarray, shape (2, 3, n + w + 2)
        Changes of (ln theta, ln ue, a) at the trailing edge of either side.
    arrays : Scratch
    joined : numpy.ndarray, shape (4,)
        Filled: theta and dstar are the sums of both sides', ue is their mean, and S the
        mean with the weights theta.
    rows : numpy.ndarray, shape (4, n + w + 2)
        Filled: changes of (ln theta, ln dstar, ln ue, ln S).
    """
    edge, by_side = np.empty((2, 4)), np.empty((2, 4, rows.shape[1]))
    for side in range(2):
        _fill_edge(side, state, regime, ends[side], arrays, edge[side], by_side[side])
    t, d = edge[0, LN_THETA] + edge[1, LN_THETA], edge[0, LN_DSTAR] + edge[1, LN_DSTAR]
    u = edge[0, LN_SPEED] + edge[1, LN_SPEED]
    s = edge[0, LN_THETA] * edge[0, LAST] + edge[1, LN_THETA] * edge[1, LAST]
    joined[LN_THETA], joined[LN_DSTAR] = math.log(t), math.log(d)
    joined[LN_SPEED], joined[LAST] = math.log(0.5 * u), math.log(s / t)
    rows[:, :] = 0.0
    for side in range(2):
        theta, dstar, speed, stress = edge[side]
        weights = (theta / t, dstar / d, speed / u, theta * stress / s)
        _add_edge(by_side[side], weights, rows)
    for j in range(rows.shape[1]):
        rows[LAST, j] -= rows[LN_THETA, j]


@inlined
def _carry_over_edge(
    solution: FloatArray,
    rows: FloatArray,
    m: float,
    node: int,
    first: FloatArray,
    depend: FloatArray,
) -> None:
    """Fill how the wake's first station depends, from how both sides' ends do."""
    last = depend.shape[1] - 1
    for r in range(3):
        for j in range(last + 1):
            # The defect m before it follows from both sides: dm/m = d ln dstar + d ln ue.
            depend[r, j] = (
                solution[r, D_THETA] * rows[LN_THETA, j]
                + solution[r, D_SPEED] * rows[LN_SPEED, j]
                + solution[r, D_LAST] * rows[LAST, j]
                + solution[r, DEFECT_ONE] * m * (rows[LN_DSTAR, j] + rows[LN_SPEED, j])
            )
            first[r, j] = depend[r, j]
        depend[r, node] += solution[r, DEFECT_TWO]
        depend[r, last] += solution[r, CONSTANT]


@compiled
def march_wake(
    stations: Stations, regime: Regime, state: LayerState, march: March, arrays: Scratch
) -> bool:
    """March the wake behind both sides.

    Parameters
    ----------
    stations : Stations
    regime : Regime
    state : LayerState
    march : March
        Its `ends` are given; rows of the wake are filled.
    arrays : Scratch

    Returns
    -------
    bool
        Success.
    """
    nodes, total = len(state.amplification), len(state.stations)
    joined, rows = np.empty(4), np.empty((4, total + 2))
    join(state, regime, march.ends, arrays, joined, rows)
    before, depend = np.zeros((3, total + 2)), np.zeros((3, total + 2))
    pair = Pair(np.empty(4), np.empty(4), np.empty(2))
    for k in range(total - nodes):
        node = nodes + k
        pair.xi[0] = WAKE_START + stations.distance[k]
        pair.xi[1] = WAKE_START + stations.distance[k + 1]
        pair.one[:] = joined if k == 0 else state.stations[node - 1]
        pair.two[:] = state.stations[node]
        cell(WAKE, pair, regime, arrays.cell)
        solution = march.cells[node]
        defects = (mass_defect(pair.one), mass_defect(pair.two))
        if not eliminate(arrays.cell.equations, defects, 0.0, solution):
            return False
        if k == 0:
            _carry_over_edge(solution, rows, defects[0], node, march.first, depend)
        else:
            carry(solution, before, (node - 1, node), (FIRST, node), depend)
        keep_speed(depend, march.speeds, node)
        before, depend = depend, before
        depend[:, :] = 0.0
    return True
