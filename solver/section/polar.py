"""A section's lift, drag and moment over angle and Reynolds number, as a table.

Every cell says where it came from, and the table says how sure it is.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields
from enum import IntEnum
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError
from solver.section.confidence import drag_half_width, largest_lift_half_width, lift_jumps
from solver.section.lift_limits import limit_arrays, past_stall, zero_lift
from solver.section.run_columns import LiftColumn, drag_columns, lift_columns
from solver.section.sweeps import Sweep, first_attached_peak
from solver.section.thin_airfoil import ThinAirfoil

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
OriginArray = NDArray[np.uint8]

FEWEST_ANGLES = 5


class CellOrigin(IntEnum):
    """Where one cell of a table comes from."""

    MEASURED = 0
    COMPUTED = 1
    ESTIMATED = 2
    FILLED = 3
    """By a rule, because nothing was measured, computed or estimated there."""


@dataclass(frozen=True, eq=False)
class Polar:
    """Section coefficients on a grid of angle and Reynolds number.

    Fields
    ------
    name, source : str
        Of the section; of the numbers.
    angle : ndarray, shape (na,)
        Ascending [rad].
    reynolds : ndarray, shape (nr,)
        Ascending [-].
    lift, drag, moment : ndarray, shape (na, nr)
        Finite everywhere [-]; moment about the quarter chord, nose up positive.
    origin_lift, origin_drag, origin_moment : ndarray of uint8, shape (na, nr)
        :class:`CellOrigin` codes.
    valid : ndarray of bool, shape (na, nr)
        Inside the angles that the lift data cover.
    beyond_stall : ndarray of bool, shape (na, nr)
        Past the peak or the plateau on either side.
    largest_lift, peak_angle, knee_angle : ndarray, shape (nr,)
        See :class:`solver.section.sweeps.LiftLimit` [-], [rad], [rad].
    plateau_from, plateau_to : ndarray, shape (nr,)
        NaN where there is no plateau [rad].
    bracketed : ndarray of bool, shape (nr,)
        False: the data end at the peak, and the largest lift is a lower bound.
    later_rise : ndarray, shape (nr,)
        Greater lift beyond stall, or NaN [-].
    largest_lift_uncertainty : ndarray, shape (nr,)
        Half-width of the confidence band [-].
    drag_uncertainty : ndarray, shape (nr,)
        Half-width as a share of drag [-].
    unknown : tuple of (float, float)
        Neighbouring Reynolds numbers between which largest lift jumps by more than
        the scatter allows.
    recovery, recovery_lift : ndarray, shape (nr,)
        After a stall come below this angle [rad], where lift is this [-]; NaN where
        no hysteresis was measured.
    estimated : bool
        No measurement and no coupled computation stands behind it.
    zero_lift_angle : ndarray, shape (nr,)
        [rad]

    Raises
    ------
    InputError
        Naming the first field that has the wrong shape, does not ascend or is not
        finite.
    """

    name: str
    source: str
    angle: FloatArray
    reynolds: FloatArray
    lift: FloatArray
    drag: FloatArray
    moment: FloatArray
    origin_lift: OriginArray
    origin_drag: OriginArray
    origin_moment: OriginArray
    valid: BoolArray
    beyond_stall: BoolArray
    largest_lift: FloatArray
    peak_angle: FloatArray
    knee_angle: FloatArray
    plateau_from: FloatArray
    plateau_to: FloatArray
    bracketed: BoolArray
    later_rise: FloatArray
    largest_lift_uncertainty: FloatArray
    drag_uncertainty: FloatArray
    unknown: tuple[tuple[float, float], ...]
    recovery: FloatArray
    recovery_lift: FloatArray
    estimated: bool
    zero_lift_angle: FloatArray

    def __post_init__(self) -> None:
        angles, runs = np.shape(self.angle), np.shape(self.reynolds)
        for name, least in (("angle", FEWEST_ANGLES), ("reynolds", 1)):
            values = getattr(self, name)
            if np.ndim(values) != 1 or values.size < least or not np.all(np.diff(values) > 0.0):
                raise InputError(name, values, f"ascending, {least} or more")
        if not self.reynolds[0] > 0.0:
            raise InputError("reynolds", self.reynolds, "> 0")
        tables = ("lift", "drag", "moment", "origin_lift", "origin_drag", "origin_moment")
        for name in (*tables, "valid", "beyond_stall"):
            if np.shape(getattr(self, name)) != angles + runs:
                raise InputError(name, np.shape(getattr(self, name)), f"of shape {angles + runs}")
        for name in ("lift", "drag", "moment", "largest_lift", "peak_angle", "knee_angle"):
            if not np.isfinite(getattr(self, name)).all():
                raise InputError(name, "an array", "finite everywhere")
        for entry in fields(self):
            value = getattr(self, entry.name)
            if isinstance(value, np.ndarray):
                if value.ndim == 1 and entry.name != "angle" and value.shape != runs:
                    raise InputError(entry.name, value.shape, f"of shape {runs}")
                value.setflags(write=False)

    def content_hash(self) -> str:
        """Sha256 of every array and text: equal polars have equal hashes."""
        content = hashlib.sha256()
        for entry in fields(self):
            value = getattr(self, entry.name)
            content.update(entry.name.encode())
            if isinstance(value, np.ndarray):
                content.update(f"{value.dtype.str}{value.shape}".encode())
                content.update(np.ascontiguousarray(value).tobytes())
            else:
                content.update(repr(value).encode())
        return content.hexdigest()


def polar_from_columns(
    name: str,
    *,
    source: str,
    angle: ArrayLike,
    reynolds: ArrayLike,
    lift: ArrayLike,
    drag: ArrayLike,
    moment: ArrayLike,
    origin: CellOrigin,
    largest_lift_uncertainty: ArrayLike,
    drag_uncertainty: ArrayLike,
) -> Polar:
    """Make a polar of computed or estimated columns, one for each Reynolds number.

    Parameters
    ----------
    name, source : str
        Of the section; of the numbers.
    angle : array_like, shape (na,)
        [rad]
    reynolds : array_like, shape (nr,)
        [-]
    lift, drag, moment : array_like, shape (na, nr)
        [-]
    origin : CellOrigin
        Of every cell.
    largest_lift_uncertainty : array_like, broadcasts to (nr,)
        Half-width [-].
    drag_uncertainty : array_like, broadcasts to (nr,)
        Half-width as a share of drag [-].

    Returns
    -------
    Polar
        Its limits are those that :func:`first_attached_peak` finds.

    Raises
    ------
    InputError
        If shapes do not fit or a value is not finite.
    """
    a, re = np.array(angle, dtype=np.float64), np.array(reynolds, dtype=np.float64)
    tables = [np.array(values, dtype=np.float64) for values in (lift, drag, moment)]
    for label, values in zip(("lift", "drag", "moment"), tables, strict=True):
        if values.shape != a.shape + re.shape:
            raise InputError(label, values.shape, f"of shape {a.shape + re.shape}")
        if not np.isfinite(values).all():
            raise InputError(label, "an array", "finite everywhere")
    columns = [tables[0][:, j] for j in range(re.size)]
    limits = [first_attached_peak(a, column) for column in columns]
    codes = [np.full(tables[0].shape, int(origin), dtype=np.uint8) for _ in range(3)]
    none = np.full(re.size, np.nan)
    return Polar(
        name=name,
        source=source,
        angle=a,
        reynolds=re,
        lift=tables[0],
        drag=tables[1],
        moment=tables[2],
        origin_lift=codes[0],
        origin_drag=codes[1],
        origin_moment=codes[2],
        valid=np.ones(tables[0].shape, dtype=np.bool_),
        beyond_stall=np.column_stack(
            [past_stall(a, column, limit) for column, limit in zip(columns, limits, strict=True)]
        ),
        **limit_arrays(limits),
        largest_lift_uncertainty=np.broadcast_to(largest_lift_uncertainty, re.shape).astype(float),
        drag_uncertainty=np.broadcast_to(drag_uncertainty, re.shape).astype(float),
        unknown=(),
        recovery=none,
        recovery_lift=none.copy(),
        estimated=origin is CellOrigin.ESTIMATED,
        zero_lift_angle=np.array(
            [
                zero_lift(a, column, peak_angle=limit.peak_angle)
                for column, limit in zip(columns, limits, strict=True)
            ]
        ),
    )


def polar_from_functions(
    name: str,
    *,
    lift: Callable[[FloatArray], FloatArray],
    drag: Callable[[FloatArray], FloatArray],
    moment: Callable[[FloatArray], FloatArray],
    lowest_angle: float = -np.pi / 6.0,
    highest_angle: float = np.pi / 6.0,
    points: int = 601,
    reynolds: Sequence[float] = (1e5,),
) -> Polar:
    """Table closed-form curves, the same at every Reynolds number.

    For checks of what uses polars, where the exact answer is known.

    Parameters
    ----------
    name : str
        Of the section.
    lift, drag, moment : callable
        From an array of angles [rad] to an array of coefficients [-].
    lowest_angle, highest_angle : float
        Ends of the table [rad].
    points : int
        Angles in it.
    reynolds : sequence of float
        Ascending [-].

    Returns
    -------
    Polar
        With confidence half-widths of zero.
    """
    angle = np.linspace(lowest_angle, highest_angle, points)
    shape = (points, len(reynolds))
    columns = [
        np.broadcast_to(np.asarray(curve(angle), dtype=np.float64)[:, None], shape)
        for curve in (lift, drag, moment)
    ]
    return polar_from_columns(
        name,
        source="closed form",
        angle=angle,
        reynolds=reynolds,
        lift=columns[0],
        drag=columns[1],
        moment=columns[2],
        origin=CellOrigin.COMPUTED,
        largest_lift_uncertainty=0.0,
        drag_uncertainty=0.0,
    )


def polar_from_sweeps(
    name: str,
    lift_sweeps: Sequence[Sweep],
    drag_sweeps: Sequence[Sweep],
    *,
    thin: ThinAirfoil | None = None,
    source: str = "wind-tunnel tables",
) -> Polar:
    """Make a polar of wind-tunnel runs.

    Parameters
    ----------
    name : str
        Of the section.
    lift_sweeps : sequence of Sweep
        Lift runs, rising and falling; a run may carry moment and drag as well.
    drag_sweeps : sequence of Sweep
        Drag runs, at these or other Reynolds numbers; may be empty if lift runs
        carry drag.
    thin : ThinAirfoil, optional
        Fills the moment where none was measured.
    source : str
        Where the numbers come from.

    Returns
    -------
    Polar
        One column for each Reynolds number at which lift or drag was measured.

    Raises
    ------
    InputError
        If no run has lift or none has drag, or moment is missing and `thin` too.

    Notes
    -----
    Rules, each in the module that applies it: repeats within 3 % in Reynolds number
    are merged (:mod:`solver.section.run_curve`); lift is smoothed within its
    published scatter, its peak kept; falling sweeps say how the section recovers
    and take no part in the curve; drag is carried over at equal lift while lift
    rises (:mod:`solver.section.drag_runs`) and beyond its run as a stalled plate's
    (:mod:`solver.section.stalled_flow`); at a Reynolds number where only drag was
    measured, lift is interpolated between the neighbouring lift runs. A symmetric
    section shows on one side what the other would. Half-widths are those of
    :mod:`solver.section.confidence`.
    """
    runs_of_drag = [*drag_sweeps, *(run for run in lift_sweeps if run.drag is not None)]
    runs_of_drag = [run for run in runs_of_drag if run.rising and run.drag is not None]
    runs_of_lift = list(lift_sweeps) or runs_of_drag
    if not runs_of_lift:
        raise InputError("lift_sweeps", lift_sweeps, "one run or more")
    if not runs_of_drag:
        raise InputError("drag_sweeps", drag_sweeps, "one rising run with drag or more")
    grid, columns = lift_columns(runs_of_lift, runs_of_drag, thin=thin)
    drag, drag_measured = drag_columns(grid, columns, runs_of_drag, thin=thin)
    re = np.array([column.reynolds for column in columns])
    arrays = limit_arrays([column.limit for column in columns])
    half_width = largest_lift_half_width(re)
    return Polar(
        name=name,
        source=source,
        angle=grid,
        reynolds=re,
        lift=_table(columns, "lift"),
        drag=drag,
        moment=_table(columns, "moment"),
        origin_lift=_codes(_table(columns, "lift_measured")),
        origin_drag=_codes(drag_measured),
        origin_moment=_codes(_table(columns, "moment_measured")),
        valid=_table(columns, "covered"),
        beyond_stall=_table(columns, "beyond_stall"),
        **arrays,
        largest_lift_uncertainty=half_width,
        drag_uncertainty=drag_half_width(re),
        unknown=lift_jumps(re, arrays["largest_lift"]),
        recovery=np.array([column.recovery for column in columns]),
        recovery_lift=np.array([column.recovery_lift for column in columns]),
        estimated=False,
        zero_lift_angle=np.array([column.zero_lift_angle for column in columns]),
    )


def _table(columns: Sequence[LiftColumn], name: str) -> NDArray[Any]:
    return np.column_stack([getattr(column, name) for column in columns])


def _codes(measured: BoolArray) -> OriginArray:
    return np.where(measured, CellOrigin.MEASURED, CellOrigin.FILLED).astype(np.uint8)
