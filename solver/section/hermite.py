"""Once-differentiable cubics over a grid of angle and Reynolds number.

The order of the two slopes is fixed here. Values are carried over the logarithm of
the Reynolds number first, by monotone cubics, which gives the slopes over it. The
slopes over angle are then taken of the values, and the cross slopes of the slopes
over Reynolds number, by one and the same rule. Since that rule is linear wherever
the grid resolves the curve, the values between two runs have the slopes between
them: taken the other way round, with a monotone slope of the slopes over angle,
lift between two runs gets a ripple from cell to cell.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicHermiteSpline, PchipInterpolator

FloatArray = NDArray[np.float64]

ROUGH = 0.05
"""A slope is limited where its estimates of second and fourth order differ by more
than this share of the steepest chord about it [-]: two nodes from a jump they differ
by a twelfth, on a curve that the grid resolves by less than a hundredth."""

STENCIL = 5


def _lagrange_slopes(x: FloatArray, y: FloatArray, points: int) -> FloatArray:
    """Slope at each node of the polynomial through the `points` nodes about it."""
    count = x.size
    first = np.clip(np.arange(count) - points // 2, 0, count - points)
    nodes = first[:, None] + np.arange(points)
    at = x[nodes]
    slope = np.zeros_like(y)
    for k in range(points):
        others = [m for m in range(points) if m != k]
        bottom = np.prod(at[:, [k]] - at[:, others], axis=1)
        gap = x[:, None] - at
        # Derivative of the k-th Lagrange polynomial: one factor left out in turn.
        top = np.zeros(count)
        for out in others:
            rest = [m for m in others if m != out]
            top += np.prod(gap[:, rest], axis=1)
        weight = top / bottom
        slope += weight.reshape(-1, *([1] * (y.ndim - 1))) * y[nodes[:, k]]
    return slope


def node_slopes(x: FloatArray, y: FloatArray) -> FloatArray:
    """Slopes over the first axis: fourth order, monotone only across jumps.

    Parameters
    ----------
    x : ndarray, shape (n,)
        Ascending, n >= 5.
    y : ndarray, shape (n, ...)

    Returns
    -------
    ndarray, shape (n, ...)
        dy/dx at the nodes. Fourth-order accurate where the grid resolves the
        curve, also at a smooth peak; where it does not (see :data:`ROUGH`) the
        monotone slope of Fritsch and Butland, so that a jump does not overshoot.

    References
    ----------
    .. [1] F. N. Fritsch, J. Butland, A Method for Constructing Local Monotone
       Piecewise Cubic Interpolants, SIAM J. Sci. Stat. Comput. 5(2), 1984.
    """
    fine, coarse = _lagrange_slopes(x, y, STENCIL), _lagrange_slopes(x, y, 3)
    chord = np.abs(np.diff(y, axis=0) / np.diff(x).reshape(-1, *([1] * (y.ndim - 1))))
    padded = np.concatenate([chord[:1], chord[:1], chord, chord[-1:], chord[-1:]])
    steepest = np.max([padded[k : k + x.size] for k in range(4)], axis=0)
    # Chords of rounding size carry no information about roughness.
    scale = np.maximum(steepest, 1e-9 * np.max(chord, initial=0.0))
    rough = np.abs(fine - coarse) > ROUGH * scale
    if not rough.any():
        return fine
    # The edge of a jump, between two rough nodes, can look smooth by itself.
    rough[1:] |= rough[:-1].copy()
    rough[:-1] |= rough[1:].copy()
    limited = PchipInterpolator(x, y, axis=0).derivative()(x)
    return np.where(rough, limited, fine)


def monotone_curve(
    x: FloatArray, y: FloatArray, *, steepest_ends: tuple[float, float] = (np.inf, np.inf)
) -> CubicHermiteSpline:
    """Curve through a few readings that neither overshoots nor rings.

    Parameters
    ----------
    x : ndarray, shape (n,)
        Ascending.
    y : ndarray, shape (n,)
    steepest_ends : tuple of float
        Largest size of the slope at the first and at the last reading.

    Returns
    -------
    scipy.interpolate.CubicHermiteSpline

    Notes
    -----
    Slopes of fourth order, limited where a cubic would otherwise leave the range of
    the readings at its ends.

    References
    ----------
    .. [1] J. M. Hyman, Accurate Monotonicity Preserving Cubic Interpolation, SIAM J.
       Sci. Stat. Comput. 4(4), 1983, eq. (2.6). Number from memory.
    """
    slope = np.gradient(y, x) if x.size < STENCIL else node_slopes(x, y)
    chord = np.diff(y) / np.diff(x)
    left, right = np.append(chord[:1], chord), np.append(chord, chord[-1:])
    sign = np.where(left * right > 0.0, np.sign(left), 0.0)
    least = np.minimum(np.abs(left), np.abs(right))
    slope = sign * np.clip(sign * slope, 0.0, 3.0 * least)
    first, last = steepest_ends
    slope[0], slope[-1] = np.clip(slope[0], -first, first), np.clip(slope[-1], -last, last)
    return CubicHermiteSpline(x, y, slope)


def resample(x: FloatArray, y: FloatArray, to: FloatArray) -> FloatArray:
    """Values between nodes by the cubic that :func:`node_slopes` defines.

    Parameters
    ----------
    x : ndarray, shape (n,)
        Ascending.
    y : ndarray, shape (n, ...)
    to : ndarray, shape (m,)
        Within the range of `x`.

    Returns
    -------
    ndarray, shape (m, ...)
    """
    return np.asarray(CubicHermiteSpline(x, y, node_slopes(x, y), axis=0)(to))


def over_reynolds(
    log_reynolds: FloatArray, values: FloatArray, to: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Values and slopes over the logarithm of the Reynolds number, monotone.

    Parameters
    ----------
    log_reynolds : ndarray, shape (n,)
        Ascending, n >= 2.
    values : ndarray, shape (n, ...)
    to : ndarray, shape (m,)
        Within the range of `log_reynolds`.

    Returns
    -------
    values, slopes : ndarray, shape (m, ...)
    """
    curve = PchipInterpolator(log_reynolds, values, axis=0)
    return np.asarray(curve(to)), np.asarray(curve.derivative()(to))


_POWERS = np.array(
    [[1.0, 0.0, 0.0, 0.0], [0.0, 1.0, 0.0, 0.0], [-3.0, -2.0, 3.0, -1.0], [2.0, 1.0, -2.0, 1.0]]
)
"""From (value, slope, value, slope) at the ends of a unit cell to powers 0 to 3."""


def line_coefficients(values: FloatArray, slopes: FloatArray, x: FloatArray) -> FloatArray:
    """Cubic of each interval in powers of the place within it, 0 to 1.

    Parameters
    ----------
    values, slopes : ndarray, shape (n, ...)
        At the nodes `x`.
    x : ndarray, shape (n,)

    Returns
    -------
    ndarray, shape (n - 1, ..., 4)
    """
    width = np.diff(x).reshape(-1, *([1] * (values.ndim - 1)))
    ends = np.stack([values[:-1], slopes[:-1] * width, values[1:], slopes[1:] * width], axis=-1)
    return np.asarray(ends @ _POWERS.T)


def cell_coefficients(
    value: FloatArray,
    angle_slope: FloatArray,
    reynolds_slope: FloatArray,
    cross_slope: FloatArray,
    *,
    angle_step: float,
    log_reynolds: FloatArray,
) -> FloatArray:
    """Bicubic of each cell in powers of the place within it, 0 to 1 both ways.

    Parameters
    ----------
    value, angle_slope, reynolds_slope, cross_slope : ndarray, shape (na, nr, ...)
        f, df/da, df/dlnRe, d2f/da dlnRe at the nodes.
    angle_step : float
        [rad]
    log_reynolds : ndarray, shape (nr,)

    Returns
    -------
    ndarray, shape (na - 1, nr - 1, ..., 4, 4)
        The last axis goes with the powers of the angle, the one before with
        those of the logarithm of the Reynolds number.
    """
    along_value = line_coefficients(
        value.swapaxes(0, 1), reynolds_slope.swapaxes(0, 1), log_reynolds
    )
    along_slope = line_coefficients(
        angle_slope.swapaxes(0, 1), cross_slope.swapaxes(0, 1), log_reynolds
    )
    v, s = along_value.swapaxes(0, 1), angle_step * along_slope.swapaxes(0, 1)
    return np.asarray(np.stack([v[:-1], s[:-1], v[1:], s[1:]], axis=-1) @ _POWERS.T)
