"""One run of a wind tunnel, and what its readings say about the stall.

A smooth curve through the readings would hide four things that real tables do:
the largest lift is the first attached peak and not the table's maximum; plateaus;
jumps between neighbouring Reynolds numbers; and hysteresis.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError, require_positive

FloatArray = NDArray[np.float64]

READING_SCATTER = 0.015
"""Published uncertainty of one lift reading [-]: M. S. Selig et al., Summary of
Low-Speed Airfoil Data, vol. 1, SoarTech 1995, sec. 2.4. Two readings differ by more
than their scatter when they differ by more than twice this."""

KNEE_SHARE = 0.98
"""Share of the largest lift at which the knee of the lift curve is placed [-]."""

PLATEAU_LENGTH = np.radians(2.5)
"""Shortest stretch without a change beyond scatter that is called a plateau [rad]; our
choice: readings stand up to 1.5 degrees apart, so that three of them fit in."""

SAME_REYNOLDS = 0.03
"""Runs whose Reynolds numbers differ by less than this share are repeats [-]."""

LOOP_GAP = 0.07
"""A falling sweep this far below the rising one follows another branch [-]: the
difference of largest lift between two facilities (R. J. McGhee et al., NASA TM-4062,
1988, Table B3 against B1: 1.12 and 1.20 at 100,000)."""

LOW_SHARE = 0.25
"""Readings below this share of the greatest lift are not searched for a peak [-]: the
flat bottom of a run at negative angles is no stall of the upper side."""


@dataclass(frozen=True, eq=False)
class Sweep:
    """Readings of one run at one Reynolds number, in any order of angle.

    Fields
    ------
    reynolds : float
        Mean of the run [-].
    angle : ndarray, shape (n,)
        [rad]
    lift : ndarray, shape (n,)
        [-]
    drag, moment : ndarray, shape (n,), or None
        Where measured; moment about the quarter chord, nose up positive [-].
    rising : bool
        The angle was increased from reading to reading.

    Raises
    ------
    InputError
        If the Reynolds number is not positive, there are fewer than two readings,
        or an array has another length or a value that is not finite.
    """

    reynolds: float
    angle: FloatArray
    lift: FloatArray
    drag: FloatArray | None = None
    moment: FloatArray | None = None
    rising: bool = True

    def __post_init__(self) -> None:
        require_positive(reynolds=self.reynolds)
        for name in ("angle", "lift", "drag", "moment"):
            given = getattr(self, name)
            if given is None and name in ("drag", "moment"):
                continue
            array = np.array(given, dtype=np.float64)
            if array.ndim != 1 or array.size < 2 or array.shape != np.shape(self.angle):
                raise InputError(name, array.shape, "two or more readings, one for each angle")
            if not np.isfinite(array).all():
                raise InputError(name, "a value that is not", "finite")
            array.setflags(write=False)
            object.__setattr__(self, name, array)

    def ordered(self) -> Sweep:
        """Return the same run in ascending order of angle, equal angles averaged."""
        angle, place = np.unique(self.angle, return_inverse=True)
        if np.array_equal(angle, self.angle):
            return self
        count = np.bincount(place)

        def mean(values: FloatArray | None) -> FloatArray | None:
            return None if values is None else np.bincount(place, weights=values) / count

        lift = np.asarray(mean(self.lift))
        return Sweep(self.reynolds, angle, lift, mean(self.drag), mean(self.moment), self.rising)


@dataclass(frozen=True)
class LiftLimit:
    """Where the attached part of a lift curve ends.

    Fields
    ------
    largest_lift : float
        First attached peak, or the top of the first plateau [-].
    peak_angle : float
        Its angle; on a plateau this is noise [rad].
    knee_angle : float
        Where lift first reaches 98 % of the largest [rad].
    plateau : (float, float) or None
        From where to where lift stays within 2 % of the largest, if that is 2.5
        degrees or more [rad].
    bracketed : bool
        A fall of more than the scatter was measured beyond it. False: the run ends
        there, and the largest lift is a lower bound.
    later_rise : float or None
        Greater lift measured further on, beyond stall [-].
    """

    largest_lift: float
    peak_angle: float
    knee_angle: float
    plateau: tuple[float, float] | None
    bracketed: bool
    later_rise: float | None


def first_attached_peak(
    angle: ArrayLike, lift: ArrayLike, *, scatter: float = READING_SCATTER
) -> LiftLimit:
    """Find the first peak that a fall of more than the scatter follows.

    A stretch of 2.5 degrees or more along which lift stays within the scatter
    ends the attached part as well: what rises again after it is reported, not used.

    Parameters
    ----------
    angle : array_like, shape (n,)
        Ascending [rad].
    lift : array_like, shape (n,)
        Of the rising sweep [-].
    scatter : float
        Uncertainty of one reading [-]; a fall, the difference of two, counts when
        it is more than twice this.

    Returns
    -------
    LiftLimit

    Raises
    ------
    InputError
        If there are fewer than three readings, the angles do not ascend, or no
        lift is positive.
    """
    a, cl = np.asarray(angle, dtype=np.float64), np.asarray(lift, dtype=np.float64)
    if a.ndim != 1 or a.size < 3 or a.shape != cl.shape or not np.all(np.diff(a) > 0.0):
        raise InputError("angle", f"{a.size} angles", "three or more, ascending, one for each lift")
    if not np.max(cl) > 0.0:
        raise InputError("lift", float(np.max(cl)), "positive somewhere")
    allowed = 2.0 * scatter
    start = int(np.argmax(cl >= LOW_SHARE * np.max(cl)))
    peak, fallen = _peak_before_fall(cl, start, allowed)
    flat = _first_plateau(a, cl, start, allowed)
    last = peak
    if flat is not None and flat[1] <= max(peak, flat[0]):
        last = flat[1]
        peak = flat[0] + int(np.argmax(cl[flat[0] : last + 1]))
        fallen = bool(np.any(cl[last:] < cl[peak] - allowed))
    top = float(cl[peak])
    knee = _first_crossing(a, cl, start, peak, KNEE_SHARE * top)
    end = _leaves_level(a, cl, peak, low=KNEE_SHARE * top, high=top + allowed)
    rise = float(np.max(cl[peak:]))
    return LiftLimit(
        largest_lift=top,
        peak_angle=float(a[peak]),
        knee_angle=knee,
        plateau=(knee, end) if end - knee >= PLATEAU_LENGTH else None,
        bracketed=fallen,
        later_rise=rise if rise > top + allowed else None,
    )


def _peak_before_fall(cl: FloatArray, start: int, allowed: float) -> tuple[int, bool]:
    """Index of the greatest lift before the first fall beyond `allowed`."""
    highest = np.maximum.accumulate(cl[start:])
    fallen = np.flatnonzero(cl[start:] < highest - allowed)
    stop = int(fallen[0]) if fallen.size else cl.size - start
    return start + int(np.argmax(cl[start : start + stop])), bool(fallen.size)


def _first_plateau(
    a: FloatArray, cl: FloatArray, start: int, allowed: float
) -> tuple[int, int] | None:
    """First stretch of readings that stay within `allowed` for long enough."""
    for first in range(start, a.size):
        stop = first + int(np.argmax(a[first:] >= a[first] + PLATEAU_LENGTH - 1e-9))
        if stop < first + 2:
            # The run ends before the stretch is long enough, or has no reading in it.
            continue
        if np.ptp(cl[first : stop + 1]) > allowed:
            continue
        while stop + 1 < a.size and abs(cl[stop + 1] - np.mean(cl[first : stop + 1])) <= allowed:
            stop += 1
        return first, stop
    return None


def _first_crossing(a: FloatArray, cl: FloatArray, start: int, peak: int, level: float) -> float:
    index = start + int(np.argmax(cl[start : peak + 1] >= level))
    if index == 0 or cl[index - 1] >= level:
        return float(a[index])
    share = (level - cl[index - 1]) / (cl[index] - cl[index - 1])
    return float(a[index - 1] + share * (a[index] - a[index - 1]))


def _leaves_level(a: FloatArray, cl: FloatArray, peak: int, *, low: float, high: float) -> float:
    out = np.flatnonzero((cl[peak:] < low) | (cl[peak:] > high))
    if not out.size:
        return float(a[-1])
    index = peak + int(out[0])
    if cl[index] > high:
        return float(a[index - 1])
    share = (low - cl[index - 1]) / (cl[index] - cl[index - 1])
    return float(a[index - 1] + share * (a[index] - a[index - 1]))


@dataclass(frozen=True)
class Hysteresis:
    """The branch that a section follows after it has stalled.

    Fields
    ------
    lower_lift, upper_lift : float
        Least and greatest lift along the branch [-].
    recovery_angle : float
        First reading, coming down, that is attached again: after a stall come
        below this [rad].
    recovery_lift : float
        Lift just before that, on the lower branch [-].
    """

    lower_lift: float
    upper_lift: float
    recovery_angle: float
    recovery_lift: float


def hysteresis(
    rising: Sweep, falling: Sweep, *, limit: LiftLimit, scatter: float = READING_SCATTER
) -> Hysteresis | None:
    """Find the lower branch of a falling sweep.

    Parameters
    ----------
    rising, falling : Sweep
        At the same Reynolds number.
    limit : LiftLimit
        Of the rising sweep.
    scatter : float
        Uncertainty of one reading [-].

    Returns
    -------
    Hysteresis or None
        None where fewer than two readings in a row, at angles where the rising
        sweep is attached, lie :data:`LOOP_GAP` or more below it.
    """
    up, down = rising.ordered(), falling.ordered()
    end = max(limit.peak_angle, limit.plateau[1] if limit.plateau else -math.inf)
    inside = (down.angle >= up.angle[0]) & (down.angle <= end)
    angle, lift = down.angle[inside], down.lift[inside]
    gap = np.interp(angle, up.angle, up.lift) - lift
    below = gap > max(LOOP_GAP, 2.0 * scatter)
    # The loop is joined to the stall: it reaches down from the top without a break.
    count = int(np.argmin(below[::-1])) if not below.all() else below.size
    if count < 2 or count == below.size:
        return None
    branch = lift[-count:]
    return Hysteresis(
        lower_lift=float(np.min(branch)),
        upper_lift=float(np.max(branch)),
        recovery_angle=float(angle[-count - 1]),
        recovery_lift=float(branch[0]),
    )


def group_repeats(reynolds: Sequence[float]) -> list[list[int]]:
    """Group runs at nearly the same Reynolds number.

    Parameters
    ----------
    reynolds : sequence of float
        [-]

    Returns
    -------
    list of list of int
        Indices, ascending in Reynolds number; a group starts where a run is
        :data:`SAME_REYNOLDS` or more above the first of the group before.
    """
    groups: list[list[int]] = []
    for index in sorted(range(len(reynolds)), key=lambda i: reynolds[i]):
        if groups and reynolds[index] < reynolds[groups[-1][0]] * (1.0 + SAME_REYNOLDS):
            groups[-1].append(index)
        else:
            groups.append([index])
    return groups
