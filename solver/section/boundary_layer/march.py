"""March along one side: every cell solved for the mass defects, transition where it falls.

The mass defect m = ue dstar drives, which is regular at separation, where a march with
the speed is not.
"""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.cells import LAMINAR, TURBULENT, cell
from solver.section.boundary_layer.compiled import compiled, compiled_part, inlined
from solver.section.boundary_layer.constants import INITIAL_STRESS
from solver.section.boundary_layer.elimination import (
    D_SPEED,
    D_THETA,
    DEFECT_TWO,
    SHIFT,
    carry,
    eliminate,
    keep_speed,
)
from solver.section.boundary_layer.layout import (
    LAST,
    LN_EQUILIBRIUM,
    THIRD,
    FloatArray,
    LayerState,
    March,
    Pair,
    Regime,
    Scratch,
    Stagnation,
    Stations,
)
from solver.section.boundary_layer.sides import (
    EXPLICIT,
    edge_node,
    fill_stagnation_layer,
    is_downstream,
    node_before,
    place_of,
    side_length,
    side_node,
)
from solver.section.boundary_layer.speeds import mass_defect
from solver.section.boundary_layer.stations import AT_WALL, turbulent_station
from solver.section.boundary_layer.transition import transition_cell

NOWHERE = -1
"""First turbulent node of a side that has none."""


@compiled_part
def initial_stress(state: FloatArray, regime: Regime, arrays: Scratch) -> float:
    """Find ln S where turbulence begins; the station's quantities are left at place two."""
    for q in range(LAST):
        arrays.blend.guess[q] = state[q]
    arrays.blend.guess[LAST] = 0.0
    value, slope = arrays.cell.quantities.value[1], arrays.cell.quantities.slope[1]
    turbulent_station(arrays.blend.guess, 1.0, AT_WALL, regime, value, slope)
    equilibrium: float = value[LN_EQUILIBRIUM]
    return equilibrium + 0.5 * math.log(regime.constants[INITIAL_STRESS])


@inlined
def _explicit_station(
    node: int, place: float, turn: float, reynolds: float, state: LayerState, solution: FloatArray
) -> None:
    """Put a station onto the stagnation-point solution, and fill how it depends on m."""
    fill_stagnation_layer(state.stations[node], place, reynolds)
    state.amplification[node] = 0.0
    m = mass_defect(state.stations[node])
    # d ln theta = (dxi/xi - d ln ue)/2 and dm/m = d ln dstar + d ln ue
    solution[:, :] = 0.0
    solution[D_SPEED, DEFECT_TWO], solution[D_SPEED, SHIFT] = 2.0 / m, -turn / place
    solution[D_THETA, DEFECT_TWO], solution[D_THETA, SHIFT] = -1.0 / m, turn / place


@inlined
def _begin_dependence(node: int, solution: FloatArray, depend: FloatArray) -> None:
    """Fill how an explicit station depends on the unknowns: on none but its own."""
    total = depend.shape[1] - 2
    depend[:, :] = 0.0
    for r in (D_THETA, D_SPEED):
        depend[r, node] = solution[r, DEFECT_TWO]
        depend[r, total] = solution[r, SHIFT]


@inlined
def _begin_stress(side: int, node: int, state: LayerState, regime: Regime, arrays: Scratch) -> None:
    """Give nodes that turn turbulent now the stress with which turbulence begins."""
    old, end = state.turbulent_from[side], edge_node(side, len(state.amplification))
    step = -1 if side == 0 else 1
    for i in range(node, end + step, step):
        if i == old:
            break
        state.stations[i, LAST] = initial_stress(state.stations[i], regime, arrays)


@inlined
def _laminar_cell(
    side: int,
    nodes: tuple[int, int],
    trip: float,
    pair: Pair,
    state: LayerState,
    regime: Regime,
    arrays: Scratch,
) -> bool:
    """Fill a laminar cell; returns whether the flow is still laminar at its end."""
    last, node = nodes
    old = state.turbulent_from[side]
    pair.one[LAST], pair.two[LAST] = state.amplification[last], 0.0
    cell(LAMINAR, pair, regime, arrays.cell)
    residual = arrays.cell.equations.residual
    grown = -residual[THIRD]
    state.amplification[node] = grown
    # Turbulence may retreat by one node at a time.
    forced = old != NOWHERE and is_downstream(side, node, old)
    if grown <= regime.critical and pair.xi[1] <= trip and not forced:
        residual[THIRD] = 0.0  # n at the end is now what it has grown to
        return True
    return False


@inlined
def _turning_cell(
    side: int,
    node: int,
    trip: float,
    pair: Pair,
    state: LayerState,
    regime: Regime,
    arrays: Scratch,
) -> None:
    """Fill the cell with transition, behind a try as a laminar one."""
    old = state.turbulent_from[side]
    if old == NOWHERE or is_downstream(side, old, node):
        _begin_stress(side, node, state, regime, arrays)
    pair.two[LAST] = state.stations[node, LAST]
    state.share[side] = transition_cell(pair, trip, regime, arrays)


@inlined
def _side_cell(
    side: int,
    laminar: bool,
    nodes: tuple[int, int],
    trip: float,
    pair: Pair,
    state: LayerState,
    regime: Regime,
    arrays: Scratch,
) -> bool:
    """Fill the equations of one cell; returns whether its end is laminar."""
    last, node = nodes
    for q in range(LAST):
        pair.one[q], pair.two[q] = state.stations[last, q], state.stations[node, q]
    if laminar:
        if _laminar_cell(side, nodes, trip, pair, state, regime, arrays):
            return True
        _turning_cell(side, node, trip, pair, state, regime, arrays)
        return False
    state.amplification[node] = state.amplification[last]
    pair.one[LAST], pair.two[LAST] = state.stations[last, LAST], state.stations[node, LAST]
    cell(TURBULENT, pair, regime, arrays.cell)
    return False


@compiled
def march_side(
    side: int,
    stagnation: Stagnation,
    stations: Stations,
    trip: float,
    regime: Regime,
    state: LayerState,
    march: March,
    arrays: Scratch,
) -> bool:
    """March one side, from the stagnation point to the trailing edge.

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
        The layers; amplification, first turbulent node, turbulent share, what is
        laminar, and the stress of nodes that turn turbulent are brought up to date.
    march : March
        Rows of the side and of its end are filled.
    arrays : Scratch

    Returns
    -------
    bool
        Success; without it the first turbulent node is left as it was.
    """
    nodes, total = len(state.amplification), len(state.stations)
    turn = 1.0 if side == 0 else -1.0
    pair = Pair(np.empty(4), np.empty(4), np.empty(2))
    before, depend = np.zeros((3, total + 2)), np.zeros((3, total + 2))
    laminar, turbulent_from = True, NOWHERE
    for k in range(side_length(side, stagnation.node, nodes)):
        node = side_node(side, k, stagnation.node)
        last = node_before(side, node)
        solution = march.cells[node]
        pair.xi[1] = place_of(node, side, stations, stagnation)
        if k < EXPLICIT:
            _explicit_station(node, pair.xi[1], turn, regime.reynolds, state, solution)
            _begin_dependence(node, solution, depend)
        else:
            pair.xi[0] = place_of(last, side, stations, stagnation)
            was = laminar
            laminar = _side_cell(side, was, (last, node), trip, pair, state, regime, arrays)
            if was and not laminar:
                turbulent_from = node
            defects = (mass_defect(pair.one), mass_defect(pair.two))
            if not eliminate(arrays.cell.equations, defects, turn, solution):
                return False
            # The stations between the stagnation point and this one.
            low = node if side == 0 else stagnation.node + 1
            high = stagnation.node + 1 if side == 0 else node + 1
            carry(solution, before, (last, node), (low, high), depend)
        state.laminar[node] = laminar
        keep_speed(depend, march.speeds, node)
        before, depend = depend, before
        depend[:, :] = 0.0
    state.turbulent_from[side] = turbulent_from
    if laminar:
        state.share[side] = 0.0
    march.ends[side] = before
    return True
