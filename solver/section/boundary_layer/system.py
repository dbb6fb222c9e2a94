"""The dense system that makes the speeds of the layers equal to those of the potential flow."""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.compiled import compiled, compiled_part, inlined
from solver.section.boundary_layer.elimination import (
    CONSTANT,
    DEFECT_ONE,
    DEFECT_TWO,
    SHIFT,
)
from solver.section.boundary_layer.layout import (
    LN_SPEED,
    FloatArray,
    LayerState,
    Linear,
    March,
    Stagnation,
    Stations,
)
from solver.section.boundary_layer.sides import EXPLICIT, node_before, side_length, side_node


@compiled
def assemble(
    flow: Linear,
    state: LayerState,
    stagnation: Stagnation,
    stations: Stations,
    march: March,
    speed: FloatArray,
    matrix: FloatArray,
    right: FloatArray,
) -> None:
    """Fill the system for the changes of the mass defects and of the stagnation point.

    Parameters
    ----------
    flow : Linear
        Speeds along body and wake.
    state : LayerState
    stagnation : Stagnation
    stations : Stations
    march : March
        Of this state.
    speed : numpy.ndarray, shape (n + w,)
        Of the potential flow, for this state. [-]
    matrix : numpy.ndarray, shape (n + w + 1, n + w + 1)
        Filled.
    right : numpy.ndarray, shape (n + w + 1,)
        Filled.
    """
    rows, sheet = march.speeds, state.sheet
    total, nodes = len(state.stations), len(state.amplification)
    sign = np.ones(total)
    sign[: stagnation.node + 1] = -1.0
    for i in range(total):
        u, s = math.exp(state.stations[i, LN_SPEED]), sign[i]
        for j in range(total):
            matrix[i, j] = u * rows[i, j] - s * flow.defect[i, j] * sign[j]
        matrix[i, total] = u * rows[i, total]
        right[i] = s * speed[i] - u - u * rows[i, total + 1]
        # At the trailing edge the sheet goes with the mass defects of both sides.
        c = s * flow.sheet[i, 0] * sheet[0]
        matrix[i, nodes - 1] += c
        matrix[i, 0] += c
        for k in range(1, total - nodes + 1):
            matrix[i, nodes + k - 1] += s * flow.sheet[i, k] * sheet[k]
    _fill_stagnation(state, stagnation, stations, rows, matrix, right)


@inlined
def _fill_stagnation(
    state: LayerState,
    stagnation: Stagnation,
    stations: Stations,
    rows: FloatArray,
    matrix: FloatArray,
    right: FloatArray,
) -> None:
    """Fill the last equation: the speed is linear between the stagnation point's neighbours."""
    total = len(state.stations)
    a, b = stagnation.node, stagnation.node + 1
    ua, ub = math.exp(state.stations[a, LN_SPEED]), math.exp(state.stations[b, LN_SPEED])
    length = stations.arc[b] - stations.arc[a]
    factor = length / ((ua + ub) * (ua + ub))
    for j in range(total + 1):
        matrix[total, j] = -factor * ua * ub * (rows[a, j] - rows[b, j])
    matrix[total, total] += 1.0
    right[total] = stations.arc[a] + length * ua / (ua + ub) - stagnation.arc


@compiled_part
def back_substitute(
    change: FloatArray, march: March, stagnation: int, nodes: int, delta: FloatArray
) -> None:
    """Fill the changes at every station from those of the mass defects.

    Parameters
    ----------
    change : numpy.ndarray, shape (n + w + 1,)
        Of mass defects and of the stagnation point's place.
    march : March
    stagnation : int
        Node before the stagnation point.
    nodes : int
        n.
    delta : numpy.ndarray, shape (n + w, 3)
        Filled: changes of (ln theta, ln ue, a).
    """
    total = delta.shape[0]
    for side in range(2):
        for k in range(side_length(side, stagnation, nodes)):
            node = side_node(side, k, stagnation)
            cell, last = march.cells[node], node_before(side, node)
            for r in range(3):
                x = cell[r, DEFECT_TWO] * change[node] + cell[r, SHIFT] * change[total]
                x += cell[r, CONSTANT]
                if k >= EXPLICIT:
                    x = _from_before(x, cell[r], delta[last], change[last])
                delta[node, r] = x
    for node in range(nodes, total):
        cell = march.cells[node]
        for r in range(3):
            x = cell[r, DEFECT_TWO] * change[node] + cell[r, CONSTANT]
            if node == nodes:
                for j in range(total + 1):
                    x += march.first[r, j] * change[j]
                x += march.first[r, total + 1]
            else:
                x = _from_before(x, cell[r], delta[node - 1], change[node - 1])
            delta[node, r] = x


@compiled_part
def _from_before(x: float, cell: FloatArray, delta: FloatArray, change: float) -> float:
    """Add to a change what it has from the station before it."""
    for q in range(3):
        x += cell[q] * delta[q]
    x += cell[DEFECT_ONE] * change
    return x
