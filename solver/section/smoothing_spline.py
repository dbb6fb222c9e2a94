"""Smoothing splines: every compromise between meeting points and running smoothly."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import BSpline
from scipy.linalg import qr, solve_triangular, svd

FloatArray = NDArray[np.float64]

MOST_KNOTS = 250
"""Of one spline: enough for waves shorter than a panel."""
STIFFNESS = 10.0 ** np.arange(-20.0, 1.0, 0.1)
"""From which a smoothing is chosen."""


@dataclass(frozen=True, eq=False)
class SplineFamily:
    """Cubic splines near one set of points, from one that meets them all to a parabola.

    The member of stiffness k has the least sum of squared weighted misfits plus
    k times the integral of the squared third derivative.

    Parameters
    ----------
    knots : numpy.ndarray, shape (m + 4,)
        Of the cubic basis.
    level_ends : bool
        The slope is held at zero at both ends.
    triangle : numpy.ndarray, shape (p, p)
        Upper triangular factor of the weighted basis, p = m or, with level ends, m - 2.
    shapes : numpy.ndarray, shape (d, p)
        Orthogonal shapes in the order of their bending.
    bending : numpy.ndarray, shape (d,)
        Square root of the integral of the squared third derivative of each.
    share, rest : numpy.ndarray, shapes (d,) and (p,)
        How much of each shape the points call for, and what has no third derivative.
    misfit : float
        Sum of squares that no member can lower.
    points : int
        How many.
    """

    knots: FloatArray
    level_ends: bool
    triangle: FloatArray
    shapes: FloatArray
    bending: FloatArray
    share: FloatArray
    rest: FloatArray
    misfit: float
    points: int

    def squares(self, stiffness: FloatArray | float) -> FloatArray:
        """Sum of squared weighted misfits at each stiffness (shape kept)."""
        lost = 1.0 - self._kept(stiffness)
        return np.asarray(self.misfit + ((lost * self.share) ** 2).sum(axis=-1))

    def freedom(self, stiffness: FloatArray | float) -> FloatArray:
        """Effective number of parameters at each stiffness (shape kept)."""
        without = len(self.rest) - len(self.bending)
        return np.asarray(without + self._kept(stiffness).sum(axis=-1))

    def compromise(self, stiffness: float) -> float:
        """What the member of this stiffness makes least: misfit and bending together."""
        return float(self.misfit + ((1.0 - self._kept(stiffness)) * self.share**2).sum())

    def member(self, stiffness: float) -> BSpline:
        """Spline of one stiffness."""
        called = self.rest + self.shapes.T @ (self._kept(stiffness) * self.share)
        factors = solve_triangular(self.triangle, called)
        if self.level_ends:
            factors = np.concatenate([factors[:1], factors, factors[-1:]])
        return BSpline(self.knots, factors, 3)

    def _kept(self, stiffness: FloatArray | float) -> FloatArray:
        return np.asarray(
            1.0 / (1.0 + np.asarray(stiffness, dtype=np.float64)[..., None] * self.bending**2)
        )


def spline_family(
    place: FloatArray,
    height: FloatArray,
    *,
    weight: FloatArray,
    level_ends: bool,
    most_knots: int = MOST_KNOTS,
) -> SplineFamily:
    """Prepare all smoothing splines near one set of points.

    Parameters
    ----------
    place : numpy.ndarray, shape (n,)
        Increasing. n >= 7.
    height : numpy.ndarray, shape (n,)
        Any unit.
    weight : numpy.ndarray, shape (n,)
        Of each misfit, > 0.
    level_ends : bool
        Hold the slope at zero at both ends.
    most_knots : int, optional
        More points than this share knots.

    Returns
    -------
    SplineFamily
        Its least stiff member meets all points if there are a knot for each and
        the ends are free.
    """
    knots = _knots(place, most_knots)
    count = len(knots) - 4
    basis = BSpline.design_matrix(place, knots, 3).toarray()
    edges = np.unique(knots)
    middle = 0.5 * (edges[1:] + edges[:-1])  # the third derivative is constant in between
    third = BSpline(knots, np.eye(count), 3)(middle, 3) * np.sqrt(np.diff(edges))[:, None]
    if level_ends:  # two equal factors at an end: no slope there
        joined = np.eye(count)[:, 1:-1]
        joined[0, 0] = joined[-1, -1] = 1.0
        basis, third = basis @ joined, third @ joined
    orthogonal, triangle = qr(weight[:, None] * basis, mode="economic")
    turned = solve_triangular(triangle, third.T, trans="T").T
    _, bending, shapes = svd(np.asarray(turned, dtype=np.float64), full_matrices=False)
    wanted = weight * height
    called = orthogonal.T @ wanted
    share = np.asarray(shapes @ called, dtype=np.float64)
    misfit = float(np.sum((wanted - orthogonal @ called) ** 2))
    return SplineFamily(
        knots,
        level_ends,
        np.asarray(triangle, dtype=np.float64),
        shapes,
        bending,
        share,
        called - shapes.T @ share,
        misfit,
        len(place),
    )


def chosen_stiffness(family: SplineFamily, *, least_scatter: float) -> float:
    r"""Choose how stiff a spline the points themselves call for.

    Parameters
    ----------
    family : SplineFamily
        Smoothing splines near the points.
    least_scatter : float
        Root mean square by which the points are known to scatter, weighted as they are.

    Returns
    -------
    float
        Where the generalised cross-validation score [1]_
        :math:`n R / (n - p)^2` is least, R the sum of squared misfits and p the
        freedom, or the stiffer one at which :math:`R / (n - p)` first comes to the
        square of `least_scatter`.

    References
    ----------
    .. [1] P. Craven, G. Wahba, Smoothing noisy data with spline functions, Numerische
       Mathematik 31, 1979, 377-403 (from memory).
    """
    squares = family.squares(STIFFNESS)
    left = family.points - family.freedom(STIFFNESS)
    usable = left > 1e-6 * family.points
    score = np.where(usable, squares / np.where(usable, left, 1.0) ** 2, np.inf)
    at = int(np.argmin(score))
    calm = (squares < least_scatter**2 * left) & (np.arange(len(STIFFNESS)) >= at)
    last = int(np.flatnonzero(calm)[-1]) if calm.any() else at
    return float(STIFFNESS[last])


def _knots(place: FloatArray, most: int) -> FloatArray:
    """Knots at the points save the second at either end, or at fewer of them.

    Half of the fewer are shared out by count and half by distance, so that a list
    keeps its fine detail where it is dense and a coarse stretch keeps its points.
    """
    if len(place) > most:
        along = (place - place[0]) / (place[-1] - place[0])
        measure = along + np.arange(len(place)) / (len(place) - 1)
        at = np.searchsorted(measure, np.linspace(0.0, 2.0, most))
        at[-1] = len(place) - 1
        place = place[np.unique(np.minimum(at, len(place) - 1))]
    return np.concatenate([[place[0]] * 4, place[2:-2], [place[-1]] * 4])
