"""Drag runs carried over to lift runs: at equal lift while lift rises."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from solver.section.hermite import monotone_curve
from solver.section.stalled_flow import beyond
from solver.section.sweeps import SAME_REYNOLDS, Sweep

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

MATCHED_SHARE = 0.95
"""Drag is matched at equal lift up to this share of the lesser largest lift [-]. Nearer
to it lift says nothing about drag: E387 goes from 0.027 to 0.053 along its plateau."""

STEEPEST_END = 0.015 / np.radians(1.0)
"""Slope of drag with which a run may be carried on beyond its ends [1/rad], a little
more than a stalled plate's at 10 degrees: steeper ends would overshoot the plate."""

LARGEST_SHIFT = np.radians(1.5)
"""Largest difference in angle at equal lift that is followed [rad]; more is another
branch. Angles agree within 0.08 degrees in one tunnel, 0.4 degrees between models."""


def drag_over_angle(
    grid: FloatArray,
    lift: FloatArray,
    *,
    largest_lift: float,
    peak_angle: float,
    reynolds: float,
    runs: Sequence[Sweep],
) -> tuple[FloatArray, BoolArray]:
    """Drag of a lift curve, from drag runs at neighbouring Reynolds numbers.

    Parameters
    ----------
    grid : ndarray, shape (n,)
        Ascending [rad].
    lift : ndarray, shape (n,)
        Of the lift run [-].
    largest_lift, peak_angle, reynolds : float
        Of the lift run [-], [rad], [-].
    runs : sequence of Sweep
        Drag runs, ascending in Reynolds number, one or more.

    Returns
    -------
    drag : ndarray, shape (n,)
        Positive [-]. Between two runs linear in the logarithms of drag and Reynolds
        number; outside all of them the nearest is held.
    measured : ndarray of bool, shape (n,)
        False where a rule filled it: outside a run's readings, or at a Reynolds
        number at which no drag was measured.
    """
    log_re = np.log([run.reynolds for run in runs])
    x = float(np.clip(np.log(reynolds), log_re[0], log_re[-1]))
    upper = min(int(np.searchsorted(log_re, x)), len(runs) - 1)
    lower = max(upper - 1, 0) if log_re[upper] > x else upper
    share = (x - log_re[lower]) / (log_re[upper] - log_re[lower]) if upper > lower else 0.0
    nearest = int(np.argmin(np.abs(log_re - np.log(reynolds))))
    if abs(runs[nearest].reynolds / reynolds - 1.0) < SAME_REYNOLDS:
        return _one_run(grid, lift, largest_lift, peak_angle, runs[nearest])
    parts = [_one_run(grid, lift, largest_lift, peak_angle, runs[i])[0] for i in (lower, upper)]
    drag = np.exp((1.0 - share) * np.log(parts[0]) + share * np.log(parts[1]))
    return drag, np.zeros(grid.size, dtype=np.bool_)


def _one_run(
    grid: FloatArray, lift: FloatArray, largest: float, peak: float, run: Sweep
) -> tuple[FloatArray, BoolArray]:
    at = grid - _shift(grid, lift, largest, peak, run)
    drag = np.asarray(run.drag)
    curve = monotone_curve(run.angle, drag, steepest_ends=(STEEPEST_END, STEEPEST_END))
    low, high = float(run.angle[0]), float(run.angle[-1])
    inside = (at >= low) & (at <= high)
    found = np.asarray(curve(np.clip(at, low, high)))
    slope = curve.derivative()
    for outside, end, value in ((at < low, low, drag[0]), (at > high, high, drag[-1])):
        if outside.any():
            found[outside] = beyond(
                at[outside], "drag", end=end, value=float(value), slope=float(slope(end))
            )
    return found, inside


def _shift(
    grid: FloatArray, lift: FloatArray, largest: float, peak: float, run: Sweep
) -> FloatArray:
    """Angle of the lift curve less that of the drag run at equal lift, ends held."""
    top = int(np.argmax(run.lift))
    bottom = int(np.argmin(run.lift[: top + 1]))
    branch = np.maximum.accumulate(run.lift[bottom : top + 1])
    angle = run.angle[bottom : top + 1]
    rising = np.concatenate([[True], np.diff(branch) > 1e-9])
    branch, angle = branch[rising], angle[rising]
    highest = MATCHED_SHARE * min(largest, float(branch[-1]))
    start = int(np.argmin(np.where(grid <= peak, lift, np.inf)))
    stop = int(np.argmax(grid >= peak)) or grid.size
    matched = np.zeros(grid.size, dtype=np.bool_)
    matched[start:stop] = True
    matched &= (lift >= branch[0]) & (lift <= highest)
    if np.count_nonzero(matched) < 2 or branch.size < 2:
        return np.zeros(grid.size)
    shift = grid[matched] - np.interp(lift[matched], branch, angle)
    held = np.interp(grid, grid[matched], np.clip(shift, -LARGEST_SHIFT, LARGEST_SHIFT))
    return _rounded(grid, held)


def _rounded(grid: FloatArray, shift: FloatArray) -> FloatArray:
    """Running mean over two degrees, so that one reading makes no kink in drag."""
    step = float(np.median(np.diff(grid)))
    half = int(np.ceil(np.radians(1.0) / step))
    padded = np.pad(shift, half, mode="edge")
    return np.convolve(padded, np.full(2 * half + 1, 1.0 / (2 * half + 1)), mode="valid")
