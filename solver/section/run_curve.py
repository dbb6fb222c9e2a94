"""From the readings of one run to a curve: smoothed, but never beyond the scatter."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import lsq_linear

from solver.section.lift_limits import zero_lift
from solver.section.sweeps import LOOP_GAP, Sweep

FloatArray = NDArray[np.float64]

STIFFNESS = 4.0
"""Weight of the squared second derivative against the squared departure from the
readings [deg^4]: waves shorter than about 9 degrees are mostly taken out, as far as
the scatter allows; our choice."""

PINNED = 1e-7
"""How closely a pinned reading is kept [-]."""

CLOSEST = np.radians(0.3)
"""Readings nearer to each other than this are averaged [rad]."""


def smooth_readings(
    angle: FloatArray,
    values: FloatArray,
    *,
    scatter: float | FloatArray,
    pinned: tuple[int, ...] = (),
    ceiling: float = np.inf,
    stiffness: float = STIFFNESS,
) -> FloatArray:
    r"""Stiffest readings that stay within the scatter of those given.

    Parameters
    ----------
    angle : ndarray, shape (n,)
        Ascending [rad].
    values : ndarray, shape (n,)
        [-]
    scatter : float or ndarray, shape (n,)
        No reading is moved further [-].
    pinned : tuple of int
        Readings that are kept as they are: peaks.
    ceiling : float
        No reading is moved above this [-]; those given above it are not raised.
    stiffness : float
        See :data:`STIFFNESS` [deg^4].

    Returns
    -------
    ndarray, shape (n,)

    Notes
    -----
    Least squares with bounds: the least of
    :math:`\int (f - y)^2 + \lambda \int f''^2` with :math:`|f_i - y_i| \le s`, the
    second derivative by divided differences. Jumps survive, since a reading cannot
    move across one; a sawtooth within the scatter does not.

    References
    ----------
    .. [1] E. T. Whittaker, On a New Method of Graduation, Proc. Edinburgh Math. Soc.
       41, 1923: the sum that is made least, there without bounds.
    """
    if angle.size < 4:
        return values.copy()
    x = np.degrees(angle)
    step = np.diff(x)
    span = np.gradient(x)
    rows = np.zeros((x.size - 2, x.size))
    inner = np.arange(x.size - 2)
    mean = 0.5 * (step[1:] + step[:-1])
    rows[inner, inner] = 1.0 / (step[:-1] * mean)
    rows[inner, inner + 2] = 1.0 / (step[1:] * mean)
    rows[inner, inner + 1] = -rows[inner, inner] - rows[inner, inner + 2]
    rows *= np.sqrt(stiffness * mean)[:, None]
    near = np.sqrt(span)
    allowed = np.broadcast_to(np.asarray(scatter, dtype=np.float64), x.shape).copy()
    allowed[list(pinned)] = PINNED
    upper = np.minimum(allowed, np.maximum(ceiling - values, PINNED))
    # Unknown is the move of each reading, so that the bounds are about zero.
    found = lsq_linear(
        np.vstack([np.diag(near), rows]),
        np.concatenate([np.zeros(x.size), -rows @ values]),
        bounds=(-allowed, upper),
        method="bvls",
    )
    return np.asarray(values + found.x)


def merge_lift(runs: list[Sweep]) -> Sweep:
    """Merge repeats of one run into one.

    Parameters
    ----------
    runs : list of Sweep
        At nearly the same Reynolds number, all rising or all falling.

    Returns
    -------
    Sweep
        At the angles of the run with most readings, and beyond them those of the
        others. Where repeats overlap their mean is taken; where they differ by more
        than facilities do (:data:`LOOP_GAP`, one has stalled) the lower lift. The
        moment is kept if the first run has it.
    """
    if len(runs) == 1:
        return runs[0].ordered()
    first, *others = sorted((run.ordered() for run in runs), key=lambda run: -run.angle.size)
    angle, lift = first.angle, first.lift
    for other in others:
        inside = (angle >= other.angle[0]) & (angle <= other.angle[-1])
        repeat = np.interp(angle, other.angle, other.lift)
        agreed = np.where(
            np.abs(lift - repeat) > LOOP_GAP, np.minimum(lift, repeat), 0.5 * (lift + repeat)
        )
        beyond = (other.angle < angle[0] - CLOSEST) | (other.angle > angle[-1] + CLOSEST)
        merged = np.concatenate([angle, other.angle[beyond]])
        order = np.argsort(merged)
        lift = np.concatenate([np.where(inside, agreed, lift), other.lift[beyond]])[order]
        angle = merged[order]
    moment = first.moment
    if moment is not None and angle.size != first.angle.size:
        moment = np.interp(angle, first.angle, moment)
    reynolds = float(np.exp(np.mean([np.log(run.reynolds) for run in runs])))
    return Sweep(reynolds, angle, lift, None, moment, first.rising)


def merge_drag(runs: list[Sweep]) -> Sweep:
    """Pool the readings of drag runs at nearly the same Reynolds number.

    Drag is surveyed point by point, and one Reynolds number's readings are often
    split over several runs.

    Parameters
    ----------
    runs : list of Sweep
        With drag.

    Returns
    -------
    Sweep
        Ascending in angle; readings within :data:`CLOSEST` averaged.
    """
    angle = np.concatenate([run.angle for run in runs])
    order = np.argsort(angle, kind="stable")
    columns = [
        angle[order],
        np.concatenate([run.lift for run in runs])[order],
        np.concatenate([np.asarray(run.drag) for run in runs])[order],
    ]
    group = np.concatenate([[0], np.cumsum(np.diff(columns[0]) > CLOSEST)])
    count = np.bincount(group)
    means = [np.bincount(group, weights=column) / count for column in columns]
    reynolds = float(np.exp(np.mean([np.log(run.reynolds) for run in runs])))
    if means[0].size < 2:
        means = columns
    return Sweep(reynolds, means[0], means[1], means[2])


def mirrored(run: Sweep) -> Sweep:
    """Complete a run of a symmetric section by what it shows on the other side.

    Parameters
    ----------
    run : Sweep
        Ascending in angle.

    Returns
    -------
    Sweep
        With the readings whose mirror image lies beyond its ends: lift and moment
        change sign with the angle, drag does not. The mirror stands at the measured
        angle of zero lift, so that an error of the angle's datum makes no step.
    """
    peak = float(run.angle[np.argmax(run.lift)])
    image = 2.0 * zero_lift(run.angle, run.lift, peak_angle=peak) - run.angle
    added = (image < run.angle[0] - CLOSEST) | (image > run.angle[-1] + CLOSEST)
    angle = np.concatenate([run.angle, image[added]])
    order = np.argsort(angle)

    def joined(values: FloatArray | None, sign: float) -> FloatArray | None:
        if values is None:
            return None
        return np.concatenate([values, sign * values[added]])[order]

    lift = np.concatenate([run.lift, -run.lift[added]])[order]
    drag, moment = joined(run.drag, 1.0), joined(run.moment, -1.0)
    return Sweep(run.reynolds, angle[order], lift, drag, moment, run.rising)
