"""The two sides of a section as the flow meets them, and how their layers begin.

Nodes go once round from the trailing edge over the upper side. The stagnation point
lies between two of them; side 0 runs back to node 0, side 1 on to the last node.
Station k of a side is the k-th node from the stagnation point.
"""

from __future__ import annotations

import math

from solver.section.boundary_layer.compiled import compiled_part
from solver.section.boundary_layer.layout import (
    LN_DSTAR,
    LN_SPEED,
    LN_THETA,
    FloatArray,
    Stagnation,
    Stations,
)

STAGNATION_THETA, STAGNATION_H = 0.0855, 2.2162
"""theta^2 Re ue/xi and H of the layer at a stagnation point: K. Hiemenz's, in the constants
for which it solves the equations with these closures exactly."""
EXPLICIT = 2
"""Stations of each side that follow the stagnation-point solution."""
LEAST_SPEED = 1e-5
"""Floor of the speeds whose logarithm is taken, over the free stream."""


@compiled_part
def side_node(side: int, k: int, stagnation: int) -> int:
    """Node of a station of a side.

    Parameters
    ----------
    side : int
        0 or 1.
    k : int
        Station, from 0.
    stagnation : int
        Node before the stagnation point.

    Returns
    -------
    int
    """
    return stagnation - k if side == 0 else stagnation + 1 + k


@compiled_part
def side_length(side: int, stagnation: int, nodes: int) -> int:
    """Count the stations of a side.

    Parameters
    ----------
    side : int
        0 or 1.
    stagnation : int
        Node before the stagnation point.
    nodes : int
        Of the body.

    Returns
    -------
    int
    """
    return stagnation + 1 if side == 0 else nodes - stagnation - 1


@compiled_part
def edge_node(side: int, nodes: int) -> int:
    """Last node of a side, at the trailing edge."""
    return 0 if side == 0 else nodes - 1


@compiled_part
def node_before(side: int, node: int) -> int:
    """Node next to another one, towards the stagnation point."""
    return node + 1 if side == 0 else node - 1


@compiled_part
def is_downstream(side: int, node: int, other: int) -> bool:
    """Whether a node of a side lies farther from the stagnation point than another."""
    return node < other if side == 0 else node > other


@compiled_part
def is_explicit(node: int, stagnation: int, nodes: int) -> bool:
    """Whether a station of body or wake follows the stagnation-point solution."""
    if node >= nodes:
        return False
    k = stagnation - node if node <= stagnation else node - stagnation - 1
    return k < EXPLICIT


@compiled_part
def place_of(node: int, side: int, stations: Stations, stagnation: Stagnation) -> float:
    """Distance of a node from the stagnation point along the surface."""
    arc: float = stations.arc[node]
    return stagnation.arc - arc if side == 0 else arc - stagnation.arc


@compiled_part
def fill_stagnation_layer(state: FloatArray, place: float, reynolds: float) -> None:
    """Put a station onto the stagnation-point solution at its speed."""
    state[LN_THETA] = 0.5 * (math.log(STAGNATION_THETA * place / reynolds) - state[LN_SPEED])
    state[LN_DSTAR] = state[LN_THETA] + math.log(STAGNATION_H)
