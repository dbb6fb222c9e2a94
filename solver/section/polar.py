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
from solver.section.sweeps import LiftLimit, first_attached_peak

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


def past_stall(angle: FloatArray, lift: FloatArray, limit: LiftLimit) -> BoolArray:
    """Mark the angles past the peak or plateau, on both sides.

    Parameters
    ----------
    angle, lift : ndarray, shape (n,)
        [rad], [-]
    limit : LiftLimit
        Of the positive side.

    Returns
    -------
    ndarray of bool, shape (n,)
    """
    end = max(limit.peak_angle, limit.plateau[1]) if limit.plateau else limit.peak_angle
    marked = np.asarray(angle > end)
    if np.min(lift) < 0.0:
        below = first_attached_peak(-angle[::-1], -lift[::-1])
        if below.bracketed:
            floor = max(below.peak_angle, below.plateau[1] if below.plateau else -np.inf)
            marked |= angle < -floor
    return marked


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
