"""What follows from the limit of a lift curve: angles, marks, columns of a table."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from solver.section.sweeps import LiftLimit, first_attached_peak

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


def zero_lift(angle: FloatArray, lift: FloatArray, *, peak_angle: float) -> float:
    """Angle of the last crossing of zero lift below the peak.

    Parameters
    ----------
    angle, lift : ndarray, shape (n,)
        [rad], [-]
    peak_angle : float
        [rad]

    Returns
    -------
    float
        [rad]; carried on along the first chord where the table starts above zero.
    """
    crossings = np.flatnonzero((lift[:-1] <= 0.0) & (lift[1:] > 0.0) & (angle[:-1] < peak_angle))
    i = int(crossings[-1]) if crossings.size else 0
    chord = (lift[i + 1] - lift[i]) / (angle[i + 1] - angle[i])
    if not crossings.size and not chord > 0.0:
        return float(angle[0])
    return float(angle[i] - lift[i] / chord)


def past_stall(
    angle: FloatArray, lift: FloatArray, limit: LiftLimit, *, at: FloatArray | None = None
) -> BoolArray:
    """Mark the angles past the peak or plateau, on both sides.

    Parameters
    ----------
    angle, lift : ndarray, shape (n,)
        [rad], [-]
    limit : LiftLimit
        Of the positive side.
    at : ndarray, shape (m,), optional
        Angles to mark, those of the curve by default [rad].

    Returns
    -------
    ndarray of bool, shape (m,) or (n,)
    """
    at = angle if at is None else at
    end = max(limit.peak_angle, limit.plateau[1]) if limit.plateau else limit.peak_angle
    marked = np.asarray(at > end)
    if np.min(lift) < 0.0:
        below = first_attached_peak(-angle[::-1], -lift[::-1])
        if below.bracketed:
            floor = max(below.peak_angle, below.plateau[1] if below.plateau else -np.inf)
            marked |= at < -floor
    return marked


def limit_arrays(limits: Sequence[LiftLimit]) -> dict[str, Any]:
    """Fields of a :class:`Polar` that its lift limits fill.

    Parameters
    ----------
    limits : sequence of LiftLimit
        One for each Reynolds number.

    Returns
    -------
    dict of str to ndarray, shape (nr,)
    """
    plateaus = [limit.plateau or (np.nan, np.nan) for limit in limits]
    return {
        "largest_lift": np.array([limit.largest_lift for limit in limits]),
        "peak_angle": np.array([limit.peak_angle for limit in limits]),
        "knee_angle": np.array([limit.knee_angle for limit in limits]),
        "plateau_from": np.array([start for start, _ in plateaus]),
        "plateau_to": np.array([end for _, end in plateaus]),
        "bracketed": np.array([limit.bracketed for limit in limits]),
        "later_rise": np.array(
            [np.nan if limit.later_rise is None else limit.later_rise for limit in limits]
        ),
    }
