"""A Newton step, shortened where it is long, and the stagnation point moved after it."""

from __future__ import annotations

import math

from solver.section.boundary_layer.closures import LEAST_LAMINAR_H, LEAST_TURBULENT_H
from solver.section.boundary_layer.compiled import inlined
from solver.section.boundary_layer.elimination import D_LAST, D_SPEED, D_THETA
from solver.section.boundary_layer.layout import (
    LAST,
    LN_DSTAR,
    LN_SPEED,
    LN_THETA,
    FloatArray,
    LayerState,
    Stagnation,
    Stations,
)
from solver.section.boundary_layer.sides import (
    EXPLICIT,
    LEAST_SPEED,
    fill_stagnation_layer,
    is_explicit,
    place_of,
    side_node,
)
from solver.section.boundary_layer.speeds import mass_defect

LARGEST_THICKENING, LARGEST_SPEEDING = 0.6, 0.4
"""Share by which theta and dstar, and the speed, may change in an iteration."""
LARGEST_GROWTH = 1.5
"""Change of the amplification factor in an iteration."""
NO_CHANGE = 1e-12
"""Floor of a change that others are divided by."""
STRESS_WEIGHT = 0.1
"""Of changes of ln S in what is called the largest change: they settle last, and matter least."""
LARGEST_STRESSING = 0.7
"""Change of ln S in an iteration, and of each S by itself."""
LEAST_LN_STRESS, LARGEST_LN_STRESS = -7.0, -0.7
"""Bounds of ln S, far beyond those of any layer."""
STILL = 0.01
"""Share of the speed's change over three panels below which a node counts as still."""
LARGEST_SHIFT = 2
"""Panels over which the stagnation point may move in an iteration."""
FEWEST_BEFORE, FEWEST_BEHIND = 4, 6
"""Nodes that are left on either side of it."""
NEAREST_NODE = 0.001
"""Least distance of the stagnation point from a node, over the panel's length."""


@inlined
def largest_and_damping(
    state: LayerState, delta: FloatArray, change: FloatArray, stagnation: int, limit: float
) -> tuple[float, float]:
    """Largest change of a step, and the factor that shortens all of it.

    Parameters
    ----------
    state : LayerState
    delta : numpy.ndarray, shape (n + w, 3)
        Changes of (ln theta, ln ue, a).
    change : numpy.ndarray, shape (n + w + 1,)
        Of mass defects.
    stagnation : int
        Node before the stagnation point.
    limit : float
        Largest factor.

    Returns
    -------
    tuple of float
        [-]
    """
    nodes = len(state.amplification)
    largest, damping = 0.0, limit
    for node in range(len(delta)):
        if is_explicit(node, stagnation, nodes):
            continue
        du = delta[node, D_SPEED]
        dd = change[node] / mass_defect(state.stations[node]) - du
        thick = max(abs(delta[node, D_THETA]), abs(dd))
        damping = min(damping, LARGEST_THICKENING / max(thick, NO_CHANGE))
        damping = min(damping, LARGEST_SPEEDING / max(abs(du), NO_CHANGE))
        largest = max(largest, max(thick, abs(du)))
        last = abs(delta[node, D_LAST])
        if state.laminar[node]:
            damping = min(damping, LARGEST_GROWTH / max(last, NO_CHANGE))
        else:
            largest = max(largest, STRESS_WEIGHT * last)
    return largest, damping


@inlined
def apply(
    state: LayerState, delta: FloatArray, change: FloatArray, stagnation: int, damping: float
) -> None:
    """Apply a step to all stations but the explicit ones.

    Parameters
    ----------
    state : LayerState
        Changed.
    delta, change : numpy.ndarray
        See :func:`largest_and_damping`.
    stagnation : int
    damping : float
        Factor of the step. [-]
    """
    nodes = len(state.amplification)
    for node in range(len(delta)):
        if is_explicit(node, stagnation, nodes):
            continue
        at = state.stations[node]
        dd = change[node] / mass_defect(at) - delta[node, D_SPEED]
        at[LN_THETA] += damping * delta[node, D_THETA]
        at[LN_DSTAR] += damping * dd
        at[LN_SPEED] += damping * delta[node, D_SPEED]
        floor = LEAST_LAMINAR_H
        if not state.laminar[node]:
            step = damping * delta[node, D_LAST]
            at[LAST] += min(max(step, -LARGEST_STRESSING), LARGEST_STRESSING)
            at[LAST] = min(max(at[LAST], LEAST_LN_STRESS), LARGEST_LN_STRESS)
            floor = LEAST_TURBULENT_H
        at[LN_DSTAR] = max(at[LN_DSTAR], at[LN_THETA] + math.log(floor))


@inlined
def _stagnation_node(speed: FloatArray, node: int, nodes: int) -> int:
    """Node before the place where the flow stops, at most two panels from where it was."""
    for _ in range(LARGEST_SHIFT):
        # A node at which the flow all but stops stays on its side: on a symmetric section
        # without lift it would change sides for ever.
        still = STILL * (speed[node + 2] - speed[node - 1])
        if speed[node] >= still and node > FEWEST_BEFORE:
            node -= 1
        elif speed[node + 1] <= -still and node < nodes - FEWEST_BEHIND:
            node += 1
        else:
            break
    return node


@inlined
def relocate(
    state: LayerState, speed: FloatArray, old: int, stations: Stations, reynolds: float
) -> Stagnation:
    """Move the stagnation point to where the potential flow stops.

    Parameters
    ----------
    state : LayerState
        Stations that begin a side, or have changed sides, get the stagnation-point
        solution at their new speeds.
    speed : numpy.ndarray, shape (n + w,)
        Of the potential flow. [-]
    old : int
        Node before the stagnation point until now.
    stations : Stations
    reynolds : float
        [-]

    Returns
    -------
    Stagnation
    """
    node = _stagnation_node(speed, old, len(state.amplification))
    a, b = max(-speed[node], LEAST_SPEED), max(speed[node + 1], LEAST_SPEED)
    length = stations.arc[node + 1] - stations.arc[node]
    along = min(max(a / (a + b), NEAREST_NODE), 1.0 - NEAREST_NODE)
    stagnation = Stagnation(node, stations.arc[node] + length * along)
    for side in range(2):
        sign = -1.0 if side == 0 else 1.0
        for k in range(EXPLICIT + abs(node - old)):
            at = side_node(side, k, node)
            if k < EXPLICIT or (at <= old) != (at <= node):
                state.stations[at, LN_SPEED] = math.log(max(sign * speed[at], LEAST_SPEED))
                place = place_of(at, side, stations, stagnation)
                fill_stagnation_layer(state.stations[at], place, reynolds)
    return stagnation
