"""What can be read off the layers: skin friction, and where they turn, part and come back."""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.closures import laminar_friction, turbulent_friction
from solver.section.boundary_layer.compiled import compiled
from solver.section.boundary_layer.layout import (
    LN_DSTAR,
    LN_SPEED,
    LN_THETA,
    BoolArray,
    FloatArray,
    IntArray,
)
from solver.section.boundary_layer.sides import EXPLICIT, side_length, side_node

UPPER, LOWER = 0, 1
TRANSITION, SEPARATION, REATTACHMENT = 0, 1, 2


@compiled
def half_friction(state: FloatArray, laminar: BoolArray, nodes: int, reynolds: float) -> FloatArray:
    """Half the friction coefficients at the nodes of the body.

    Parameters
    ----------
    state : numpy.ndarray, shape (n + w, 4)
        (ln theta, ln dstar, ln ue, a) of body and wake.
    laminar : numpy.ndarray of bool, shape (n + w,)
    nodes : int
        n.
    reynolds : float
        On chord. [-]

    Returns
    -------
    numpy.ndarray, shape (n,)
        Wall shear over twice the dynamic pressure of the local speed, negative where
        the flow at the wall runs backwards. [-]
    """
    friction = np.empty(nodes)
    for i in range(nodes):
        h = math.exp(state[i, LN_DSTAR] - state[i, LN_THETA])
        rt = reynolds * math.exp(state[i, LN_THETA] + state[i, LN_SPEED])
        if laminar[i]:
            friction[i] = laminar_friction(h)[0] / rt
        else:
            friction[i] = turbulent_friction(h, rt)[0]
    return friction


@compiled
def stations(
    x: FloatArray,
    friction: FloatArray,
    stagnation: int,
    turbulent_from: IntArray,
    share: FloatArray,
) -> FloatArray:
    """Places of transition, separation and reattachment on both sides.

    Parameters
    ----------
    x : numpy.ndarray, shape (n,)
        Nodes, once round from the trailing edge over the upper side. [-]
    friction : numpy.ndarray, shape (n,)
        See :func:`half_friction`.
    stagnation : int
        The node of the upper side next to the stagnation point.
    turbulent_from : numpy.ndarray of int, shape (2,)
        First turbulent node of a side, -1 where all of it is laminar.
    share : numpy.ndarray, shape (2,)
        Turbulent share of the cell before that node.

    Returns
    -------
    numpy.ndarray, shape (2, 3)
        Rows upper and lower; x of transition, separation (first place without skin
        friction) and reattachment (the next place where there is some again); NaN
        where there is none. [-]
    """
    found = np.full((2, 3), np.nan)
    for side in range(2):
        node = turbulent_from[side]
        if node >= 0:
            last = node + 1 if side == UPPER else node - 1
            found[side, TRANSITION] = x[node] + (x[last] - x[node]) * share[side]
        parted = False
        for k in range(EXPLICIT, side_length(side, stagnation, len(x))):
            node = side_node(side, k, stagnation)
            if (friction[node] <= 0.0) == parted:
                continue
            last = node + 1 if side == UPPER else node - 1
            along = friction[last] / (friction[last] - friction[node])
            place = x[last] + (x[node] - x[last]) * along
            if parted:
                found[side, REATTACHMENT] = place
                break
            found[side, SEPARATION] = place
            parted = True
    return found
