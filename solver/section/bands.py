"""The low and high ends of a lift curve's confidence band.

Largest lift is shifted, the linear range is kept: the shift grows smoothly from
the end of the linear range to the knee. The negative side is treated as the
mirror image, so that a symmetric section stays odd in angle.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.section.sweeps import first_attached_peak

FloatArray = NDArray[np.float64]

STRAIGHT = 0.8
"""The linear range ends where the slope falls below this share of its median [-]."""

SHORTEST_RAMP = np.radians(3.0)
"""The shift grows over at least this much angle [rad], also where a section stalls out
of its linear range: a shorter ramp would put a peak of its own before the knee."""

LARGEST_SHARE = 0.5
"""A shift takes at most this share of the largest lift [-]."""


def shift_weight(
    angle: FloatArray,
    lift: FloatArray,
    *,
    zero_lift_angle: float,
    knee_angle: float,
    negative_knee: float | None,
) -> FloatArray:
    """How one lift curve takes a change of its largest lift, over angle.

    Parameters
    ----------
    angle, lift : ndarray, shape (na,)
        [rad], [-]
    zero_lift_angle, knee_angle : float
        [rad]
    negative_knee : float or None
        Knee on the negative side, None where the table shows none [rad].

    Returns
    -------
    ndarray, shape (na,)
        1 at and past the knee, 0 in the linear range, -1 past the knee on the
        negative side [-].
    """
    weight = _ramp(angle, lift, zero_lift_angle, knee_angle)
    if negative_knee is not None:
        mirrored = _ramp(-angle[::-1], -lift[::-1], -zero_lift_angle, -negative_knee)
        weight = weight - mirrored[::-1]
    return weight


def negative_knee(angle: FloatArray, lift: FloatArray) -> float | None:
    """Knee of the negative side, where the table brackets a peak there.

    Parameters
    ----------
    angle, lift : ndarray, shape (na,)
        The tabled part of the curve [rad], [-].

    Returns
    -------
    float or None
        [rad]
    """
    if angle.size < 3 or not np.min(lift) < 0.0:
        return None
    below = first_attached_peak(-angle[::-1], -lift[::-1])
    return -below.knee_angle if below.bracketed or below.plateau else None


def _ramp(angle: FloatArray, lift: FloatArray, zero: float, knee: float) -> FloatArray:
    inside = (angle > zero) & (angle < knee)
    end = knee
    if np.count_nonzero(inside) >= 3:
        slope = np.gradient(lift, angle)
        lower = inside & (angle < zero + 0.6 * (knee - zero))
        reference = float(np.median(slope[lower if lower.any() else inside]))
        straight = angle[inside & (slope >= STRAIGHT * reference)]
        end = float(straight[-1]) if straight.size else zero
    start = min(end, knee - SHORTEST_RAMP)
    place = np.clip((angle - start) / (knee - start), 0.0, 1.0)
    return np.asarray(place * place * (3.0 - 2.0 * place))
