"""The smooth curve that a printed list of points stands for.

Lists are printed to four to six decimals, and older ones scatter by more than
that. A curve through every point has waves in its curvature, which the flow feels
as waves of pressure. The curve laid here leaves the points by as much as they
scatter and no more.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import BSpline
from scipy.optimize import minimize_scalar

from solver.errors import InputError
from solver.section.geometry import Outline
from solver.section.smoothing_spline import SplineFamily, chosen_stiffness, spline_family

FloatArray = NDArray[np.float64]

FAIR_POINTS = 401
ROUNDS = 2
"""The foremost place and the smoothing depend on each other a little."""
NOSE_REACH = 0.7
"""Angle ahead of which points tell where the curve is foremost: 12 % of chord. [rad]"""
NOSE_POINTS = 6
"""On either surface at least, however coarse the list."""
NOSE_OFFSETS = np.concatenate([[0.0], np.geomspace(1e-6, 3e-3, 25)])
"""How far ahead of the foremost point the curve may reach, over chord."""
TIP_PLAY = 1e-5
"""Keeps the weight of a point at the very nose from vanishing, over chord."""
END_WEIGHT = 1e3
"""The curve meets the trailing edge."""
COARSEST_STEP = 1e-4
"""Of a print that is taken as the reason of scatter: four decimals of the chord."""
ROUNDING_SCATTER = 1.0 / np.sqrt(12.0)
"""Root mean square of an error spread evenly over one printed step, in steps."""
ALIKE = 1e-12
"""Difference of two surfaces below which a section is symmetric, over chord."""
LARGEST_SHIFT = 5e-4
"""Of the curve from a point, over chord: what scatters by more has a shape that is not smooth."""
STEPS_BACK = 12
NOSE_KNOTS = 100
NOSE_STIFFNESS = 1e-10
"""At the least, where the foremost place is sought: the bending must tell, not the knots."""
SLOPE_DEGREE = 9
"""Of the polynomial whose slope turns vertical misfits into distances."""


@dataclass(frozen=True, eq=False)
class FairOutline:
    """An outline laid smoothly through its points.

    Parameters
    ----------
    outline : Outline
        Points of the smooth curve, trailing edge closed.
    shift : float
        Largest distance from the curve to a point of the list. [-]
    """

    outline: Outline
    shift: float


@lru_cache(maxsize=64)
def fair_outline(outline: Outline) -> FairOutline:
    r"""Lay the smooth curve that an outline's points stand for.

    Parameters
    ----------
    outline : Outline
        Chord 1, without corners save the trailing edge.

    Returns
    -------
    FairOutline
        401 points, close together at both edges.

    Raises
    ------
    InputError
        Named ``coordinates``, if the points do not run once round a section.

    Notes
    -----
    The height of both surfaces is one function of the angle t, with
    :math:`x = x_0 + (1 - x_0) \sin^2(t/2)`: t runs from -pi at the trailing edge
    over the lower surface through zero at the nose to pi, so that neither a round
    nose nor a trailing edge is singular. The function is a cubic smoothing spline
    whose smoothing is found by cross-validation, at the least so much that the
    misfits come to the rounding of the list (:attr:`Outline.rounding`), and less where
    a point would be left by more than 5e-4 of the chord. The foremost place x_0 is
    the one that makes the curve near the nose smoothest.

    On published lists of sections for model aircraft the curve keeps within the
    rounding of the print, except where the list scatters by more: that of the
    FX 63-137 alternates by 2e-4 of the chord from point to point.
    """
    points = closed_points(outline)
    x, y = points[:, 0], points[:, 1]
    nose, upper = float(x.min()), bool(y[np.argmin(x)] > 0.0)
    scatter = min(outline.rounding, COARSEST_STEP) * ROUNDING_SCATTER
    family, stiffness, angle = _fit(x, y, nose=nose - TIP_PLAY, upper=upper, scatter=scatter)
    for _ in range(ROUNDS):
        nose, upper = _foremost(x, y, stiffness=stiffness)
        family, stiffness, angle = _fit(x, y, nose=nose, upper=upper, scatter=scatter)
    height, shift = _held(family, stiffness, angle, y[::-1])
    at = np.linspace(np.pi, -np.pi, FAIR_POINTS)
    laid = np.column_stack([nose + (x[0] - nose) * np.sin(0.5 * at) ** 2, height(at)])
    if np.abs(points - points[::-1] * [1.0, -1.0]).max() < ALIKE:
        laid[:, 1] = 0.5 * (laid[:, 1] - laid[::-1, 1])
    laid[[0, -1]] = points[0]
    fair = replace(outline, x=laid[:, 0].copy(), y=laid[:, 1].copy(), rounding=0.0)
    return FairOutline(fair, shift)


def closed_points(outline: Outline) -> FloatArray:
    """Points of an outline, its trailing edge brought to one point.

    Each surface is moved by half the gap times x, from nothing at the foremost
    point. That adds no curvature anywhere, and turns a surface by no more than
    half the gap over the chord.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    numpy.ndarray, shape (n, 2)
        First and last are the same. [-]
    """
    points = np.column_stack([outline.x, outline.y])
    near = int(np.argmin(points[:, 0]))
    middle = 0.5 * (points[0] + points[-1])
    share = (points[:, :1] - points[near, 0]) / (middle[0] - points[near, 0])
    side = np.where(np.arange(len(points)) < near, -0.5, 0.5)[:, None]
    closed = np.asarray(points + side * share * (points[0] - points[-1]), dtype=np.float64)
    closed[[0, -1]] = middle
    return closed


def _angles(x: FloatArray, *, nose: float, upper: bool) -> FloatArray:
    """Angle of each point, from pi down to -pi; see :func:`fair_outline`."""
    near = int(np.argmin(x))
    side = np.where(np.arange(len(x)) < near, 1.0, -1.0)
    side[near] = 1.0 if upper else -1.0
    share = np.clip((x - nose) / (x[0] - nose), 0.0, 1.0)
    return np.asarray(2.0 * side * np.arcsin(np.sqrt(share)))


def _weights(angle: FloatArray, height: FloatArray) -> FloatArray:
    """Distance from the curve over height above it, at each point.

    The cosine of the slope, which is that of dy/dr over 2 r with r = sin(t/2).
    """
    r = np.sin(0.5 * angle)
    degree = min(SLOPE_DEGREE, len(r) // 2)
    slope = np.polynomial.Polynomial.fit(r, height, degree).deriv()(r)
    return np.asarray(np.sqrt((4.0 * r**2 + TIP_PLAY) / (4.0 * r**2 + slope**2 + TIP_PLAY)))


def _fit(
    x: FloatArray, y: FloatArray, *, nose: float, upper: bool, scatter: float
) -> tuple[SplineFamily, float, FloatArray]:
    """Fit the splines over all points, and choose how stiff; angles ascending."""
    angle = _angles(x, nose=nose, upper=upper)[::-1]
    folded = np.flatnonzero(np.diff(angle) <= 0.0)
    if folded.size:
        raise InputError(
            "coordinates",
            f"an outline that folds over itself at {100 * x[::-1][folded[0]]:.1f} % of chord",
            "of a section whose x falls to the leading edge and rises behind it",
        )
    weight = _weights(angle, y[::-1])
    weight[[0, -1]] = END_WEIGHT
    family = spline_family(angle, y[::-1], weight=weight, level_ends=True)
    return family, chosen_stiffness(family, least_scatter=scatter), angle


def _held(
    family: SplineFamily, stiffness: float, angle: FloatArray, height: FloatArray
) -> tuple[BSpline, float]:
    """Find the curve and its largest distance from a point, made less stiff where that is large."""
    weight = _weights(angle, height)[1:-1]
    for _ in range(STEPS_BACK):
        curve = family.member(stiffness)
        shift = float(np.abs(weight * (height - curve(angle))[1:-1]).max())
        if shift <= LARGEST_SHIFT:
            break
        stiffness /= 10.0
    return curve, shift


def _foremost(x: FloatArray, y: FloatArray, *, stiffness: float) -> tuple[float, bool]:
    """Find where the curve is foremost, and whether the foremost point lies above that."""
    near = int(np.argmin(x))
    reach = np.abs(_angles(x, nose=float(x[near]), upper=True)) < NOSE_REACH
    reach[max(near - NOSE_POINTS, 0) : near + NOSE_POINTS + 1] = True
    size = float(x[0])

    def roughness(offset: float, upper: bool) -> float:
        angle = _angles(x, nose=float(x[near]) - size * offset, upper=upper)[reach][::-1]
        if np.any(np.diff(angle) <= 0.0):
            return np.inf
        height = y[reach][::-1]
        weight = _weights(angle, height)
        family = spline_family(
            angle, height, weight=weight, level_ends=False, most_knots=NOSE_KNOTS
        )
        return family.compromise(max(stiffness, NOSE_STIFFNESS))

    tried = [
        (roughness(offset, upper), k, upper)
        for upper in (True, False)
        for k, offset in enumerate(NOSE_OFFSETS)
    ]
    least, k, upper = min(tried)
    last = len(NOSE_OFFSETS) - 1
    found = minimize_scalar(
        lambda offset: roughness(offset, upper),
        bounds=(NOSE_OFFSETS[max(k - 1, 0)], NOSE_OFFSETS[min(k + 1, last)]),
        method="bounded",
        options={"xatol": 1e-9},
    )
    offset = found.x if found.fun < least else NOSE_OFFSETS[k]
    return float(x[near] - size * offset), upper
