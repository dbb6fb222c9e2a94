"""Beyond the measured angles: a section turns into a flat plate.

The values past the end of a table are those of a stalled flat plate plus what is
left of the table's last reading, which dies away. They are finite and once
differentiable for every angle, and only sketch the trend.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

Quantity = Literal["lift", "drag", "moment"]

MEMORY = np.radians(8.0)
"""Angle over which the last reading dies away to 1/e [rad]; our choice, no source."""

ROUNDING = np.radians(0.7)
"""Angle over which the last slope dies away [rad]; our choice: short, so that a run
that ends while still rising earns at most a few hundredths of lift beyond its end."""


def plate_lift(angle: FloatArray) -> FloatArray:
    r"""Lift coefficient of a stalled flat plate.

    Parameters
    ----------
    angle : ndarray
        [rad]

    Returns
    -------
    ndarray
        [-]

    Notes
    -----
    .. math:: c_l = 2 \sin\alpha \cos\alpha

    References
    ----------
    .. [1] L. A. Viterna, R. D. Corrigan, Fixed Pitch Rotor Performance of Large
       Horizontal Axis Wind Turbines, NASA CP-2230, 1982: the stalled section as a
       flat plate, here with the two-dimensional drag at 90 degrees of 2.
    """
    return np.asarray(np.sin(2.0 * angle))


def plate_drag(angle: FloatArray) -> FloatArray:
    r"""Drag coefficient of a stalled flat plate.

    Parameters
    ----------
    angle : ndarray
        [rad]

    Returns
    -------
    ndarray
        [-]

    Notes
    -----
    .. math:: c_d = 2 \sin^2\alpha

    References
    ----------
    .. [1] Viterna and Corrigan, as in :func:`plate_lift`.
    """
    return np.asarray(2.0 * np.square(np.sin(angle)))


def plate_moment(angle: FloatArray) -> FloatArray:
    r"""Quarter-chord moment coefficient of a stalled flat plate.

    Parameters
    ----------
    angle : ndarray
        [rad], within a quarter turn either way.

    Returns
    -------
    ndarray
        Nose up positive [-].

    Notes
    -----
    The normal force :math:`2 \sin\alpha` acts ahead of mid-chord by
    :math:`\tfrac34 \cos\alpha / (4 + \pi |\sin\alpha|)` of the chord.

    References
    ----------
    .. [1] Lord Rayleigh, On the Resistance of Fluids, Phil. Mag. (5) 2, 1876;
       H. Lamb, Hydrodynamics, 6th ed., art. 77. Both from memory.
    """
    sine = np.sin(angle)
    ahead = 0.75 * np.cos(angle) / (4.0 + np.pi * np.abs(sine))
    return np.asarray(-2.0 * sine * (0.25 - ahead))


_PLATES = {"lift": plate_lift, "drag": plate_drag, "moment": plate_moment}


def _plate_slope(quantity: Quantity, angle: float) -> float:
    step = 1e-5
    ends = _PLATES[quantity](np.array([angle - step, angle + step]))
    return float(ends[1] - ends[0]) / (2.0 * step)


def beyond(
    angle: FloatArray, quantity: Quantity, *, end: float, value: float, slope: float
) -> FloatArray:
    r"""Coefficient past one end of a table.

    Parameters
    ----------
    angle : ndarray
        All on one side of `end` [rad].
    quantity : {"lift", "drag", "moment"}
    end : float
        Last angle of the table on that side [rad].
    value : float
        Coefficient there [-].
    slope : float
        Its slope over angle there [1/rad].

    Returns
    -------
    ndarray
        Joins the table with the same value and slope [-].

    Notes
    -----
    With x the distance past the end and f the plate's coefficient,

    .. math::
       c = f + \Delta e^{-x/w} + (\Delta' + \Delta/w)\, x\, e^{-x/s},

    where :math:`\Delta` and :math:`\Delta'` are the differences of value and
    slope at the end, w is :data:`MEMORY` and s is :data:`ROUNDING`.
    """
    outward = 1.0 if np.all(angle >= end) else -1.0
    distance = outward * (angle - end)
    plate = _PLATES[quantity](angle)
    gap = value - float(_PLATES[quantity](np.array(end)))
    turn = outward * (slope - _plate_slope(quantity, end)) + gap / MEMORY
    result = (
        plate + gap * np.exp(-distance / MEMORY) + turn * distance * np.exp(-distance / ROUNDING)
    )
    if quantity == "drag":
        # A steep fall towards the end of a drag run must not be carried below zero.
        return np.asarray(np.maximum(result, 0.5 * min(value, 1.0)))
    return np.asarray(result)
