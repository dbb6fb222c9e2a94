"""Wind-tunnel runs as columns of a table: one for each Reynolds number."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError
from solver.section.confidence import drag_reading_scatter, lift_jumps
from solver.section.drag_runs import drag_over_angle
from solver.section.hermite import monotone_curve
from solver.section.lift_limits import past_stall, zero_lift
from solver.section.run_curve import (
    merge_drag,
    merge_lift,
    mirrored,
    smooth_readings,
)
from solver.section.stalled_flow import Quantity, beyond
from solver.section.sweeps import (
    READING_SCATTER,
    LiftLimit,
    Sweep,
    first_attached_peak,
    group_repeats,
    hysteresis,
)
from solver.section.thin_airfoil import ThinAirfoil

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

GRID_STEP = np.radians(0.25)
STALLED_SCATTER = 0.03
"""How far a reading beyond stall is moved at most [-]: repeats of stalled readings in
one tunnel differ by this and more; our reading of the tables."""

STEEP_FALL = -0.1 / np.radians(1.0)
"""A run that ends in a steeper fall than this [1/rad], or that ends while lift still
rises, is ended level, so that nothing is promised beyond its last reading."""

SPARE = np.radians(2.0)
"""Room for a mirror image about another angle than zero [rad]."""

OWN_COLUMN = 0.1
"""A drag run further than this in log Reynolds number from every lift run has a column
of its own [-]."""

DRAG_STIFFNESS = 0.2
"""As :data:`solver.section.run_curve.STIFFNESS`, for the logarithm of drag, whose bucket
has sharper corners than a lift curve [deg^4]."""

MOMENT_SCATTER = 0.01
"""How far a moment reading is moved at most [-]: that of E387 model E at 100,000
scatters by about this from one degree to the next (NREL/SR-500-34515)."""


@dataclass(frozen=True, eq=False)
class LiftColumn:
    """Lift and moment of one Reynolds number on the grid; arrays of shape (n,).

    Fields
    ------
    reynolds : float
        [-]
    lift, moment : ndarray
        [-]
    lift_measured, moment_measured : ndarray of bool
        False where a rule filled it.
    covered : ndarray of bool
        Within the angles of the run.
    beyond_stall : ndarray of bool
    limit : LiftLimit
    zero_lift_angle : float
        Of the curve [rad].
    recovery, recovery_lift : float
        NaN where no hysteresis was measured [rad], [-].
    """

    reynolds: float
    lift: FloatArray
    moment: FloatArray
    lift_measured: BoolArray
    moment_measured: BoolArray
    covered: BoolArray
    beyond_stall: BoolArray
    limit: LiftLimit
    zero_lift_angle: float
    recovery: float
    recovery_lift: float


def lift_columns(
    runs: Sequence[Sweep], drag_runs: Sequence[Sweep], *, thin: ThinAirfoil | None
) -> tuple[FloatArray, list[LiftColumn]]:
    """Merge, smooth and lay lift runs down on one grid of angle.

    Parameters
    ----------
    runs : sequence of Sweep
        Rising and falling.
    drag_runs : sequence of Sweep
        Their Reynolds numbers get columns too.
    thin : ThinAirfoil or None
        Fills the moment.

    Returns
    -------
    grid : ndarray, shape (n,)
        [rad]
    columns : list of LiftColumn
        Ascending in Reynolds number.

    Raises
    ------
    InputError
        If moment is missing and `thin` too, or a run is too short for its limit.
    """
    lowest = min(float(np.min(run.angle)) for run in runs)
    highest = max(float(np.max(run.angle)) for run in runs)
    if symmetric(thin):
        lowest, highest = min(lowest, -highest) - SPARE, max(highest, -lowest) + SPARE
    steps = np.arange(math.floor(lowest / GRID_STEP - 1e-9), math.ceil(highest / GRID_STEP) + 1)
    grid = steps * GRID_STEP
    columns = []
    for group in group_repeats([run.reynolds for run in runs]):
        same = [runs[i] for i in group]
        # Where only a falling sweep was run it is all there is.
        rising = [run for run in same if run.rising] or same
        falling = [run for run in same if not run.rising]
        merged = merge_lift(rising)
        if symmetric(thin):
            merged = mirrored(merged)
        if merged.angle.size < 3:
            raise InputError("lift_sweeps", merged.angle.size, "runs of three readings or more")
        columns.append(_column(grid, merged, falling, thin))
    for group in group_repeats([run.reynolds for run in drag_runs]):
        reynolds = merge_drag([drag_runs[i] for i in group]).reynolds
        _insert_between(grid, columns, reynolds)
    return grid, columns


def _column(
    grid: FloatArray, run: Sweep, falling: Sequence[Sweep], thin: ThinAirfoil | None
) -> LiftColumn:
    run = _peak_on_grid(run)
    limit = first_attached_peak(run.angle, run.lift)
    peak = int(np.searchsorted(run.angle, limit.peak_angle))
    stalled = run.angle > max(limit.peak_angle, limit.plateau[1] if limit.plateau else -np.inf)
    fitted = smooth_readings(
        run.angle,
        run.lift,
        scatter=np.where(stalled, STALLED_SCATTER, READING_SCATTER),
        pinned=(peak,),
        ceiling=limit.largest_lift,
    )
    last = (fitted[-1] - fitted[-2]) / (run.angle[-1] - run.angle[-2])
    level = last < STEEP_FALL or (not limit.bracketed and peak == run.angle.size - 1)
    lift, covered = _laid_down(grid, "lift", run.angle, fitted, level_end=level)
    zero = zero_lift(grid, lift, peak_angle=limit.peak_angle)
    loop = hysteresis(run, merge_lift(list(falling)), limit=limit) if falling else None
    moment, moment_measured = _moment(grid, run, covered, limit, thin)
    return LiftColumn(
        reynolds=run.reynolds,
        lift=lift,
        moment=moment,
        lift_measured=covered,
        moment_measured=moment_measured,
        covered=covered,
        beyond_stall=past_stall(run.angle, run.lift, limit, at=grid),
        limit=limit,
        zero_lift_angle=zero,
        recovery=loop.recovery_angle if loop else math.nan,
        recovery_lift=loop.recovery_lift if loop else math.nan,
    )


def symmetric(thin: ThinAirfoil | None) -> bool:
    """Tell a symmetric section by its thin-airfoil values, as far as an outline shows.

    Parameters
    ----------
    thin : ThinAirfoil or None

    Returns
    -------
    bool
    """
    return thin is not None and (
        abs(thin.moment_quarter_chord) < 0.002 and abs(thin.zero_lift_angle) < np.radians(0.1)
    )


def _peak_on_grid(run: Sweep) -> Sweep:
    """Move the reading at the peak to the nearest angle of the grid.

    By at most half a step, no more than about the uncertainty of an angle (0.08
    degrees): the table then holds the largest lift exactly.
    """
    limit = first_attached_peak(run.angle, run.lift)
    angle = run.angle.copy()
    peak = int(np.searchsorted(angle, limit.peak_angle))
    angle[peak] = np.round(angle[peak] / GRID_STEP) * GRID_STEP
    return replace(run, angle=angle) if np.all(np.diff(angle) > 0.0) else run


def _laid_down(
    grid: FloatArray,
    quantity: Quantity,
    angle: FloatArray,
    values: FloatArray,
    *,
    level_end: bool = False,
) -> tuple[FloatArray, BoolArray]:
    """Curve through readings on the grid, extended as a stalled plate."""
    curve = monotone_curve(angle, values, steepest_ends=(np.inf, 0.0 if level_end else np.inf))
    slope = curve.derivative()
    result = np.asarray(curve(np.clip(grid, angle[0], angle[-1])))
    below, above = grid < angle[0], grid > angle[-1]
    for outside, end in ((below, 0), (above, -1)):
        if outside.any():
            at = float(angle[end])
            result[outside] = beyond(
                grid[outside], quantity, end=at, value=float(values[end]), slope=float(slope(at))
            )
    return result, ~(below | above)


def _moment(
    grid: FloatArray,
    run: Sweep,
    covered: BoolArray,
    limit: LiftLimit,
    thin: ThinAirfoil | None,
) -> tuple[FloatArray, BoolArray]:
    if run.moment is not None:
        fitted = smooth_readings(run.angle, run.moment, scatter=MOMENT_SCATTER)
        return _laid_down(grid, "moment", run.angle, fitted)
    if thin is None:
        raise InputError("thin", None, "given where no moment was measured")
    # Attached flow keeps the moment of thin-airfoil theory at every angle.
    lowest = min(max(run.angle[0], -limit.knee_angle), limit.knee_angle - GRID_STEP)
    attached = np.array([lowest, limit.knee_angle])
    filled, _ = _laid_down(grid, "moment", attached, np.full(2, thin.moment_quarter_chord))
    return filled, np.zeros_like(covered)


def _insert_between(grid: FloatArray, columns: list[LiftColumn], reynolds: float) -> None:
    """Add a column at a Reynolds number at which only drag was measured.

    Only between two lift runs whose lift does not jump: elsewhere nothing can be
    said about lift there, and the drag run serves its neighbours alone.
    """
    near = [abs(math.log(column.reynolds / reynolds)) < OWN_COLUMN for column in columns]
    above = sum(column.reynolds < reynolds for column in columns)
    if any(near) or above in (0, len(columns)):
        return
    low, high = columns[above - 1], columns[above]
    pair = np.array([low.limit.largest_lift, high.limit.largest_lift])
    if lift_jumps(np.array([low.reynolds, high.reynolds]), pair):
        return
    if np.any(_attached(grid, low) & _attached(grid, high)):
        columns.insert(above, _between(grid, low, high, reynolds))


def _attached(grid: FloatArray, column: LiftColumn) -> BoolArray:
    return column.covered & (grid <= column.limit.peak_angle + 1e-9)


def _between(grid: FloatArray, low: LiftColumn, high: LiftColumn, reynolds: float) -> LiftColumn:
    """Lift and moment linear in log Reynolds number between two columns."""
    share = math.log(reynolds / low.reynolds) / math.log(high.reynolds / low.reynolds)

    def mixed(first: object, second: object, name: str) -> FloatArray:
        return np.asarray((1.0 - share) * getattr(first, name) + share * getattr(second, name))

    lift, covered = mixed(low, high, "lift"), low.covered & high.covered
    nearest = low if share < 0.5 else high
    peak = float(mixed(low.limit, high.limit, "peak_angle"))
    attached = covered & (grid <= peak + 1e-9)
    limit = replace(
        nearest.limit,
        largest_lift=float(np.max(lift[attached])),
        peak_angle=float(grid[attached][np.argmax(lift[attached])]),
        knee_angle=float(mixed(low.limit, high.limit, "knee_angle")),
    )
    nothing = np.zeros_like(covered)
    return replace(
        nearest,
        reynolds=reynolds,
        lift=lift,
        moment=mixed(low, high, "moment"),
        lift_measured=nothing,
        moment_measured=nothing,
        covered=covered,
        limit=limit,
        beyond_stall=past_stall(grid[covered], lift[covered], limit, at=grid),
        zero_lift_angle=zero_lift(grid, lift, peak_angle=limit.peak_angle),
    )


def drag_columns(
    grid: FloatArray,
    columns: Sequence[LiftColumn],
    runs: Sequence[Sweep],
    *,
    thin: ThinAirfoil | None,
) -> tuple[FloatArray, BoolArray]:
    """Drag for every column.

    Parameters
    ----------
    grid : ndarray, shape (n,)
        [rad]
    columns : sequence of LiftColumn
    runs : sequence of Sweep
        Rising, with drag.
    thin : ThinAirfoil or None
        Tells whether the section is symmetric.

    Returns
    -------
    drag : ndarray, shape (n, k)
        [-]
    measured : ndarray of bool, shape (n, k)
    """
    groups = group_repeats([run.reynolds for run in runs])
    merged = [_smooth_drag(merge_drag([runs[i] for i in group])) for group in groups]
    if symmetric(thin):
        merged = [mirrored(run) for run in merged]
    found = [
        drag_over_angle(
            grid,
            column.lift,
            largest_lift=column.limit.largest_lift,
            peak_angle=column.limit.peak_angle,
            reynolds=column.reynolds,
            runs=merged,
        )
        for column in columns
    ]
    return np.column_stack([drag for drag, _ in found]), np.column_stack([m for _, m in found])


def _smooth_drag(run: Sweep) -> Sweep:
    """Smooth the logarithm of drag within the spanwise scatter of one run."""
    scatter = float(drag_reading_scatter(run.reynolds))
    smoothed = smooth_readings(
        run.angle, np.log(np.asarray(run.drag)), scatter=scatter, stiffness=DRAG_STIFFNESS
    )
    return replace(run, drag=np.exp(smoothed))
