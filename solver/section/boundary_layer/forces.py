"""Lift, drag and moment of a section from the state of its layers."""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.compiled import compiled
from solver.section.boundary_layer.layout import LN_DSTAR, LN_SPEED, LN_THETA, FloatArray
from solver.section.panelling import PanelNodes

MOMENT_CENTRE = 0.25
"""On the chord, over its length."""
FULLEST_H = 2.5
"""Shape parameter from which on a layer's mass defect adds nothing to the pressure at a wall."""


def wall_curvature(nodes: PanelNodes) -> FloatArray:
    """Curvature of an outline at its nodes.

    Parameters
    ----------
    nodes : PanelNodes

    Returns
    -------
    numpy.ndarray, shape (n,)
        Over chord, positive where the surface is convex; at the trailing edge that of
        the nodes next to it. [-]
    """
    turning = np.unwrap(
        np.arctan2(np.gradient(nodes.y, nodes.arc), np.gradient(nodes.x, nodes.arc))
    )
    curvature = np.asarray(np.gradient(turning, nodes.arc), dtype=np.float64)
    curvature[0], curvature[-1] = curvature[1], curvature[-2]
    return curvature


@compiled
def wall_pressures(state: FloatArray, curvature: FloatArray, share: float) -> FloatArray:
    """Pressure coefficients at the wall.

    Parameters
    ----------
    state : numpy.ndarray, shape (n + w, 4)
        (ln theta, ln dstar, ln ue, a) of body and wake.
    curvature : numpy.ndarray, shape (n,)
        Of the wall. [-]
    share : float
        Of the pressure gradient across the layer that is taken into account. [-]

    Returns
    -------
    numpy.ndarray, shape (n,)
        1 - u^2 (1 - 2 kappa (theta + dstar)), with dstar at most 2.5 theta. [-]
    """
    count = len(curvature)
    pressure = np.empty(count)
    for i in range(count):
        theta = math.exp(state[i, LN_THETA])
        h = math.exp(state[i, LN_DSTAR] - state[i, LN_THETA])
        across = 2.0 * share * curvature[i] * theta * (1.0 + min(h, FULLEST_H))
        pressure[i] = 1.0 - math.exp(2.0 * state[i, LN_SPEED]) * (1.0 - across)
    return pressure


@compiled
def coefficients(
    x: FloatArray, y: FloatArray, pressure: FloatArray, wake_end: FloatArray, angle: float
) -> tuple[float, float, float]:
    """Lift, drag and moment coefficient.

    Parameters
    ----------
    x, y, pressure : numpy.ndarray, shape (n,)
        Nodes, once round from the trailing edge over the upper side; pressure
        coefficients there. [-]
    wake_end : numpy.ndarray, shape (4,)
        State at the end of the wake.
    angle : float
        Of attack. [rad]

    Returns
    -------
    tuple of float
        Lift by the pressures; drag by the wake [1]_; moment about the quarter chord,
        nose up positive. [-]

    References
    ----------
    .. [1] H. B. Squire, A. D. Young, The calculation of the profile drag of aerofoils,
       ARC R&M 1838, 1937: cd = 2 theta u^((H + 5)/2).
    """
    along = across = moment = 0.0
    for i in range(len(x) - 1):
        mean = 0.5 * (pressure[i] + pressure[i + 1])
        dx, dy = x[i + 1] - x[i], y[i + 1] - y[i]
        along -= mean * dy
        across += mean * dx
        arm_x = 0.5 * (x[i] + x[i + 1]) - MOMENT_CENTRE
        moment -= mean * (arm_x * dx + 0.5 * (y[i] + y[i + 1]) * dy)
    h = math.exp(wake_end[LN_DSTAR] - wake_end[LN_THETA])
    drag = 2.0 * math.exp(wake_end[LN_THETA] + 0.5 * (h + 5.0) * wake_end[LN_SPEED])
    return across * math.cos(angle) - along * math.sin(angle), drag, moment
