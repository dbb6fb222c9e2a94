"""Smooth curves through points, over the length along themselves."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

FloatArray = NDArray[np.float64]

LENGTH_ROUNDS = 4
"""Lengths are found from the curve and the curve from the lengths; each round gains digits."""


def spline_by_length(points: FloatArray) -> CubicSpline:
    """Lay a cubic spline through points, over the length along itself.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, 2)
        In order. n >= 2; two are joined by a straight line, three by a parabola.

    Returns
    -------
    scipy.interpolate.CubicSpline
        Points over length, from 0 at the first, in the unit of the points.
    """
    at, weight = np.polynomial.legendre.leggauss(5)
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    for _ in range(LENGTH_ROUNDS):
        curve = CubicSpline(along, points)
        step = np.diff(along)
        place = along[:-1, None] + 0.5 * step[:, None] * (at + 1.0)
        speed = np.sqrt(np.square(curve(place, 1)).sum(axis=-1))
        along = np.concatenate([[0.0], np.cumsum(0.5 * step * (speed @ weight))])
    return CubicSpline(along, points)


@dataclass(frozen=True, eq=False)
class BrokenCurve:
    """A curve over length along itself, smooth from corner to corner.

    Parameters
    ----------
    pieces : tuple of scipy.interpolate.CubicSpline
        Each over its own length, from 0.
    starts : numpy.ndarray, shape (pieces + 1,)
        Length at which each begins, and the whole length.
    """

    pieces: tuple[CubicSpline, ...]
    starts: FloatArray

    def __call__(self, along: FloatArray) -> FloatArray:
        """Points, shape (n, 2), at lengths `along`, shape (n,)."""
        found = np.empty((len(along), 2))
        at = np.searchsorted(self.starts[1:-1], along, side="right")
        for k, piece in enumerate(self.pieces):
            found[at == k] = piece(along[at == k] - self.starts[k])
        return found


def broken_curve(points: FloatArray, *, corners: tuple[int, ...]) -> BrokenCurve:
    """Lay smooth curves through points, broken at some of them.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, 2)
        In order.
    corners : tuple of int
        Points at which one curve ends and the next begins, ascending, neither end among them.

    Returns
    -------
    BrokenCurve
        Through all points.
    """
    ends = zip((0, *corners), (*corners, len(points) - 1), strict=True)
    pieces = tuple(spline_by_length(points[one : other + 1]) for one, other in ends)
    return BrokenCurve(pieces, np.cumsum([0.0, *(piece.x[-1] for piece in pieces)]))
