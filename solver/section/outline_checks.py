"""Why a list of coordinates cannot be a section's outline: every refusal, with its place.

A list that lacks its last trailing-edge point gives a lift wrong by a factor of
three without any other sign, so nothing here is mended in silence.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError

FloatArray = NDArray[np.float64]

FEWEST_POINTS, MOST_POINTS = 31, 2000
LARGEST_GAP = 0.01
"""Height of an open trailing edge over chord."""
PRINT_ROUNDING = 5e-5
"""Play for lists printed to four or five decimals of the chord. [-]"""
MOST_DECIMALS = 7
"""Numbers with more were not printed but computed."""
LARGEST_SLANT = 0.15
"""Of an open trailing edge against square: about 9 degrees."""
NOSE_SHARE = 0.05
LARGEST_STEP, LARGEST_NOSE_STEP = 0.12, 0.03
"""Between neighbours, over chord; the second ahead of 5 % chord."""
LARGEST_TURN = np.radians(65.0)
"""Between neighbouring steps: a nose with sharper corners than this is a guess."""
LEAST_THICKNESS = 0.01
LARGEST_TILT = np.radians(15.0)


@dataclass(frozen=True, eq=False)
class ClosingGap:
    """How a list ends where it began.

    Parameters
    ----------
    trailing_edge : numpy.ndarray, shape (2,)
        Midway between first and last point, in the unit of the list.
    lag : float
        How far one end lies ahead of the other along the stream, in the unit of the list.
    height : float
        Distance between first and last point, in the unit of the list.
    shorter_step : float
        The shorter of the first and the last step, in the unit of the list.
    """

    trailing_edge: FloatArray
    lag: float
    height: float
    shorter_step: float


def closing_gap(points: FloatArray) -> ClosingGap:
    """Measure the gap between the first and the last point of a list.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, 2)
        In any unit of length.

    Returns
    -------
    ClosingGap
        The lag is the smaller of those along x and along the bisector of the
        trailing edge, so that an edge cut square either way has none.
    """
    first, last = points[0], points[-1]
    steps = np.stack([first - points[1], last - points[-2]])
    lengths = np.maximum(np.hypot(steps[:, 0], steps[:, 1]), 1e-300)
    bisector = (steps / lengths[:, None]).sum(axis=0)
    bisector /= max(float(np.hypot(*bisector)), 1e-300)
    gap = first - last
    lag = min(abs(float(gap[0])), abs(float(gap @ bisector)))
    return ClosingGap(0.5 * (first + last), lag, float(np.hypot(*gap)), float(lengths.min()))


def _refuse(found: str, requirement: str) -> InputError:
    return InputError("coordinates", found, requirement)


def check_point_list(coordinates: ArrayLike) -> FloatArray:
    """Refuse what is not a list of distinct finite points that begins at the trailing edge.

    Parameters
    ----------
    coordinates : array_like, shape (n, 2)
        In any unit of length.

    Returns
    -------
    numpy.ndarray, shape (n, 2)
        The same points.

    Raises
    ------
    InputError
        Named ``coordinates``.
    """
    try:
        points = np.array(coordinates, dtype=np.float64)
    except (TypeError, ValueError):
        raise _refuse("something else", "pairs of numbers x, y") from None
    if points.ndim != 2 or points.shape[1] != 2:
        raise _refuse(f"an array of shape {points.shape}", "pairs of numbers x, y")
    if not FEWEST_POINTS <= len(points) <= MOST_POINTS:
        raise _refuse(
            f"{len(points)} points",
            f"neither too coarse nor too many: {FEWEST_POINTS} to {MOST_POINTS} points",
        )
    unusable = np.flatnonzero(~np.isfinite(points).all(axis=1))
    if unusable.size:
        at = int(unusable[0])
        raise _refuse(f"({points[at, 0]}, {points[at, 1]}) at point {at + 1}", "finite")
    _check_ends(points)
    _check_distinct(points)
    return points


def _check_distinct(points: FloatArray) -> None:
    size = float(np.ptp(points[:, 0]))
    order = np.lexsort((points[:, 1], points[:, 0]))
    close = np.hypot(*np.diff(points[order], axis=0).T) <= 1e-9 * size
    for at in np.flatnonzero(close):
        one, two = sorted((int(order[at]), int(order[at + 1])))
        if (one, two) != (0, len(points) - 1):  # the trailing edge, given at both ends
            raise _refuse(
                f"point {two + 1} equal to point {one + 1}",
                "without duplicates, save the trailing edge at both ends",
            )


def _check_ends(points: FloatArray) -> None:
    """Refuse a list that does not begin and end at the trailing edge, its largest x."""
    x = points[:, 0]
    size = float(np.ptp(x))
    if not size > 0.0:
        raise _refuse("no extent along x", "a section with its chord along x")
    for at in (0, len(points) - 1):
        if x[at] - x.min() < 0.5 * size:
            raise _refuse(
                f"point {at + 1} at {100 * (x[at] - x.min()) / size:.0f} % of the extent in x",
                "not reversed: from the trailing edge (largest x) once round and back to it",
            )
    gap = closing_gap(points)
    if gap.height > LARGEST_GAP * size:
        raise _refuse(
            f"a gap of {100 * gap.height / size:.2f} % of chord "
            f"between point 1 and point {len(points)}",
            f"closed: first and last point within {100 * LARGEST_GAP:g} % of chord "
            "of each other at the trailing edge",
        )
    allowed = min(PRINT_ROUNDING * size + LARGEST_SLANT * gap.height, 0.5 * gap.shorter_step)
    if gap.lag > max(allowed, PRINT_ROUNDING * size):
        late = 1 if x[0] < x[-1] else len(points)
        raise _refuse(
            f"point {late} ending {100 * gap.lag / size:.3f} % of chord ahead of the other end",
            "closed: first and last point level at the trailing edge "
            "(is its last point missing on one surface?)",
        )


def runs_lower_side_first(points: FloatArray) -> bool:
    """Whether a closed list encloses its area clockwise, lower surface first.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, 2)
        In any unit of length.

    Returns
    -------
    bool
        By the sign of the enclosed area.
    """
    x, y = points.T
    return bool(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y) < 0.0)


def printed_step(values: FloatArray) -> float:
    """Find the step to which numbers were printed.

    Parameters
    ----------
    values : numpy.ndarray, shape (n,)
        In any unit.

    Returns
    -------
    float
        The largest power of ten of which all values are multiples, one at the most;
        0 where they have more than seven decimals.
    """
    for decimals in range(MOST_DECIMALS + 1):
        scaled = values * 10.0**decimals
        if np.all(np.abs(scaled - np.round(scaled)) < 1e-4):
            return 10.0**-decimals
    return 0.0


def check_shape(points: FloatArray, *, turned: bool) -> None:
    """Refuse what does not run once round a section with room inside.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, 2)
        Chord 1, foremost point at the origin, upper surface first. [-]
    turned : bool
        The list was turned round: point numbers are given as in the original.

    Raises
    ------
    InputError
        Named ``coordinates``.
    """
    count = len(points)

    def number(at: int) -> int:
        return count - at if turned else at + 1

    _check_direction(points, number)
    tilt = np.arctan2(0.5 * (points[0, 1] + points[-1, 1]), 1.0)
    if abs(tilt) > LARGEST_TILT:
        raise _refuse(
            f"a chord line inclined by {np.degrees(tilt):.0f} degrees",
            f"within {np.degrees(LARGEST_TILT):.0f} degrees of the x axis",
        )
    _check_crossing(points, number)
    _check_steps(points, number)


def _check_direction(points: FloatArray, number: Callable[[int], int]) -> None:
    """Refuse an x that does not fall to the foremost point and rise behind it."""
    x = points[:, 0]
    near = int(np.argmin(x))
    forward = np.where(np.arange(len(x) - 1) < near, np.diff(x) < 0.0, np.diff(x) > 0.0)
    if near + 1 < len(x) and x[near + 1] == x[near]:
        forward[near] = True  # two foremost points, one on each surface
    wrong = np.flatnonzero(~forward)
    if wrong.size:
        at = int(wrong[0])
        raise _refuse(
            f"the step from point {number(at)} to point {number(at + 1)} "
            f"at {100 * x[at]:.1f} % of chord running the other way",
            "without reversed pieces: x falling to the leading edge and rising behind it",
        )


def _check_crossing(points: FloatArray, number: Callable[[int], int]) -> None:
    """Refuse surfaces that cross or leave no room between them."""
    near = int(np.argmin(points[:, 0]))
    upper, lower = points[near::-1], points[near:]
    own = points[:, 0]
    room = np.interp(own, *upper.T) - np.interp(own, *lower.T)
    wrong = np.flatnonzero(room < -PRINT_ROUNDING)
    if wrong.size:
        at = int(wrong[np.argmin(room[wrong])])
        raise _refuse(
            f"the surfaces crossed by {100 * -room[at]:.2f} % of chord at point {number(at)}",
            "free of crossings: the upper surface above the lower one",
        )
    if room.max() < LEAST_THICKNESS:
        raise _refuse(
            f"a thickness of {100 * room.max():.2f} % of chord",
            f"at least {100 * LEAST_THICKNESS:g} % thick",
        )


def _check_steps(points: FloatArray, number: Callable[[int], int]) -> None:
    """Refuse steps too long, or corners too sharp, to give the shape between the points."""
    steps = np.diff(points, axis=0)
    length = np.hypot(steps[:, 0], steps[:, 1])
    at_nose = np.minimum(points[:-1, 0], points[1:, 0]) < NOSE_SHARE
    allowed = np.where(at_nose, LARGEST_NOSE_STEP, LARGEST_STEP)
    wrong = np.flatnonzero(length > allowed)
    if wrong.size:
        at = int(wrong[0])
        raise _refuse(
            f"a step of {100 * length[at]:.1f} % of chord "
            f"from point {number(at)} to point {number(at + 1)}",
            f"not too coarse: steps to {100 * LARGEST_STEP:g} % of chord, "
            f"to {100 * LARGEST_NOSE_STEP:g} % near the nose",
        )
    heading = np.unwrap(np.arctan2(steps[:, 1], steps[:, 0]))
    turn = np.abs(np.diff(heading))
    wrong = np.flatnonzero(turn > LARGEST_TURN)
    if wrong.size:
        at = int(wrong[np.argmax(turn[wrong])])
        raise _refuse(
            f"a corner of {np.degrees(turn[at]):.0f} degrees at point {number(at + 1)}",
            f"smooth and not too coarse: no corner above {np.degrees(LARGEST_TURN):.0f} degrees "
            "save the trailing edge",
        )
