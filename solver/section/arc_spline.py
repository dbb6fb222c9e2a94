"""Smooth curves through points, over the length along themselves."""

from __future__ import annotations

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
