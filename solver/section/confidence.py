"""How far published low-Reynolds-number measurements agree with one another.

The half-widths are differences between facilities, since a tunnel that repeats
itself well can still disagree with the next one and with free flight.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

DRAG_SCATTER = (
    (60e3, 0.178),
    (100e3, 0.160),
    (150e3, 0.111),
    (200e3, 0.090),
    (300e3, 0.071),
)
"""Reynolds number and mean difference in drag between two tunnels, a share of drag."""

DRAG_READING_SCATTER = ((60e3, 0.14), (100e3, 0.073), (200e3, 0.049), (300e3, 0.049))
"""Reynolds number and standard deviation of drag over the span of one run, a share of
drag: median of 247 to 327 points at each, derived from SoarTech's tables."""

LIFT_SCATTER = ((100e3, 0.07), (300e3, 0.05))
"""Reynolds number and half-width for largest lift [-]."""


def drag_half_width(reynolds: ArrayLike) -> FloatArray:
    """Half-width of the confidence band of measured drag, as a share of drag.

    Parameters
    ----------
    reynolds : array_like
        [-], > 0

    Returns
    -------
    ndarray
        Linear in the logarithm of the Reynolds number, held outside 60,000 to
        300,000 [-].

    Notes
    -----
    Mean absolute difference in drag at equal lift between the University of
    Illinois and Princeton tunnels, 15 sections tested in both, 161 to 636 points
    at each Reynolds number: 18 % at 60,000, 16 % at 100,000, 11 % at 150,000, 9 %
    at 200,000, 7 % at 300,000.

    References
    ----------
    .. [1] M. S. Selig, J. F. Donovan, D. B. Fraser, Airfoils at Low Speeds,
       SoarTech 8, 1989.
    .. [2] M. S. Selig et al., Summary of Low-Speed Airfoil Data, vols. 1-3,
       SoarTech, 1995-1998. The differences were derived from the tables of both.
    """
    return _over_log(reynolds, DRAG_SCATTER)


def drag_reading_scatter(reynolds: ArrayLike) -> FloatArray:
    """How far one drag reading scatters, as a share of drag.

    Parameters
    ----------
    reynolds : array_like
        [-], > 0

    Returns
    -------
    ndarray
        See :data:`DRAG_READING_SCATTER`; ends held [-].
    """
    return _over_log(reynolds, DRAG_READING_SCATTER)


def largest_lift_half_width(reynolds: ArrayLike) -> FloatArray:
    """Half-width of the confidence band of measured largest lift.

    Parameters
    ----------
    reynolds : array_like
        [-], > 0

    Returns
    -------
    ndarray
        0.07 up to 100,000, 0.05 from 300,000, linear in the logarithm of the
        Reynolds number between [-].

    Notes
    -----
    0.07: E387 at 100,000 reached 1.20 in the Langley tunnel and 1.12 at Stuttgart.
    0.05: mean absolute difference in lift between two tunnels, 0.048 over 2139
    points. That the second holds from 300,000 is our reading: the drag of the same
    tests agrees twice as well there as at 100,000.

    References
    ----------
    .. [1] R. J. McGhee, B. S. Walker, B. F. Millard, NASA TM-4062, 1988, Tables B1
       and B3.
    .. [2] The two sources of :func:`drag_half_width`.
    """
    return _over_log(reynolds, LIFT_SCATTER)


def lift_jumps(reynolds: FloatArray, largest_lift: FloatArray) -> tuple[tuple[float, float], ...]:
    """Neighbouring runs whose largest lift differs by more than the scatter allows.

    Parameters
    ----------
    reynolds : ndarray, shape (nr,)
        Ascending [-].
    largest_lift : ndarray, shape (nr,)
        [-]

    Returns
    -------
    tuple of (float, float)
        Pairs of Reynolds numbers. Two values with half-widths h1 and h2 differ by
        more than their scatter beyond the root of h1 squared plus h2 squared.
    """
    half = largest_lift_half_width(reynolds)
    allowed = np.hypot(half[1:], half[:-1])
    found = np.flatnonzero(np.abs(np.diff(largest_lift)) > allowed)
    return tuple((float(reynolds[i]), float(reynolds[i + 1])) for i in found)


def _over_log(reynolds: ArrayLike, table: tuple[tuple[float, float], ...]) -> FloatArray:
    x, y = np.array(table).T
    return np.asarray(np.interp(np.log(np.asarray(reynolds, dtype=np.float64)), np.log(x), y))
