"""The line midway between two surfaces, measured across itself, and the thickness about it."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import BSpline, CubicSpline

from solver.errors import InputError

FloatArray = NDArray[np.float64]

ROUNDS = 12
"""Newton steps at most; three to six are usual."""
PATIENCE = 2
"""Steps that bring no better line after which the best so far is kept: a camber line bent
close to the nose of a thick section cannot be found to the last digit."""
SETTLED = 1e-9
"""Change of the line over chord below which it is taken as found."""
KNOTS = (0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.95, 1.0)
"""Of the cubic spline that carries the line. Coarse at the nose on purpose: there a wave
shorter than the radius would turn the normals, and the midpoints with them, without end."""
SAMPLES = 401
"""Points of the skin whose distance from the line is measured."""
TRAILING_EDGE_WEIGHT = 30.0
NOSE_FIT_LIMIT = 0.02
"""Share of the chord over which the radius of the nose is fitted."""


@dataclass(frozen=True, eq=False)
class Midline:
    """A camber line and the half thickness laid off square to it.

    Parameters
    ----------
    x, y : numpy.ndarray, shape (n,)
        Midway points, from the nose to the trailing edge. [-]
    slope : numpy.ndarray, shape (n,)
        dy/dx. [-]
    half : numpy.ndarray, shape (n,)
        Half the thickness, square to the line. [-]
    nose_radius : float
        Radius at the nose. [-]
    """

    x: FloatArray
    y: FloatArray
    slope: FloatArray
    half: FloatArray
    nose_radius: float


@dataclass(frozen=True, eq=False)
class Skin:
    """Both surfaces as one smooth curve: height over t, with x = x0 + t^2.

    t > 0 on the upper surface and t < 0 on the lower. A round nose, which has a
    vertical tangent over x, is smooth over t.
    """

    height: CubicSpline
    x0: float

    def point(self, t: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Places x and heights y [-] at parameters `t` (shape kept)."""
        return self.x0 + t * t, np.asarray(self.height(t))


def foremost_point(points: FloatArray) -> FloatArray:
    """Where a smooth curve through the points has its least x.

    Between two nodes as a rule: taking the foremost node instead would shift
    the nose by up to 0.1 % of the chord on published lists.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, 2)
        Once round a section, in any unit of length.

    Returns
    -------
    numpy.ndarray, shape (2,)
        In the unit of the points.
    """
    near = int(np.argmin(points[:, 0]))
    window = points[max(near - 4, 0) : near + 5]
    steps = np.hypot(*np.diff(window, axis=0).T)
    # Square roots of the steps (centripetal) keep the curve from overshooting
    # where short and long steps meet.
    along = np.concatenate([[0.0], np.cumsum(np.sqrt(steps))])
    curve = CubicSpline(along, window)
    turning = CubicSpline(along, window[:, 0]).derivative().roots(extrapolate=False)
    candidates = curve(np.concatenate([turning, along]))
    return np.asarray(candidates[np.argmin(candidates[:, 0])], dtype=np.float64)


def skin(x: FloatArray, y: FloatArray) -> Skin:
    """Smooth curve through an outline, upper surface first.

    Parameters
    ----------
    x, y : numpy.ndarray, shape (n,)
        x falls to the foremost point and rises behind it. [-]

    Returns
    -------
    Skin
        The curve.

    Raises
    ------
    InputError
        Named ``coordinates``, if x does not do so.
    """
    foremost = foremost_point(np.column_stack([x, y]))
    near = int(np.argmin(x))
    side = np.where(np.arange(len(x)) < near, 1.0, -1.0)
    side[near] = 1.0 if y[near] > foremost[1] else -1.0
    t = side * np.sqrt(np.maximum(x - foremost[0], 0.0))
    if not np.all(np.diff(t) < 0.0):
        at = int(np.argmax(np.diff(t) >= 0.0)) + 1
        raise InputError(
            "coordinates",
            f"an outline that folds over itself at point {at}",
            "of a section whose x falls to the leading edge and rises behind it",
        )
    return Skin(CubicSpline(t[::-1], y[::-1]), float(foremost[0]))


def midline(surface: Skin, *, trailing_edge: FloatArray, points: int) -> Midline:
    r"""Find the camber line whose normals meet both surfaces at equal distance.

    The construction by which NACA sections are laid out, reversed: for those it
    returns the line they were made from. The line is a cubic spline, found by
    Newton's method in the least-squares sense.

    Parameters
    ----------
    surface : Skin
        Chord about 1.
    trailing_edge : numpy.ndarray, shape (2,)
        Where the line ends. [-]
    points : int
        Cosine-spaced places along the line. >= 30.

    Returns
    -------
    Midline
        From the nose to the trailing edge.

    Raises
    ------
    InputError
        Named ``coordinates``, if no camber line can be begun.

    Notes
    -----
    With h half the thickness, a change of the line's slope by s turns its
    normals and moves the midpoints by -h h' s, so that a mismatch e between the
    two distances is cured by the change c with :math:`c + h h' c' = e`.
    """
    share = 0.5 - 0.5 * np.cos(np.linspace(0.0, np.pi, points))
    weight = np.ones(points)
    weight[-1] = TRAILING_EDGE_WEIGHT
    chord = trailing_edge[0] - surface.x0
    skin_x, skin_y = surface.point(np.sqrt(chord) * np.cos(np.linspace(0.0, np.pi, SAMPLES)))
    x = surface.x0 + share * chord
    t = np.sqrt(x - surface.x0)
    start = 0.5 * (surface.height(t) + surface.height(-t))
    basis = _basis()
    factors = np.linalg.lstsq(basis(x), start, rcond=None)[0]
    best = None
    worse = 0
    for _ in range(ROUNDS):
        line = BSpline(basis.t, factors, basis.k)
        trial = _measure(line, skin_x, skin_y, share=share, trailing_edge=trailing_edge)
        if trial is None:
            break
        if best is None or trial.error < best.error:
            best, worse = trial, 0
        else:
            worse += 1
        x = trial.x
        system = basis(x) + trial.turn[:, None] * basis(x, 1)
        system[-1] = basis(x[-1:])[0]
        step = np.linalg.lstsq(weight[:, None] * system, weight * trial.mismatch, rcond=None)[0]
        factors = factors + step
        if worse >= PATIENCE or np.abs(step).max() < SETTLED:
            break
    if best is None:
        raise InputError(
            "coordinates", "a skin that folds over it", "those of a section with a camber line"
        )
    line = best.line
    return Midline(best.x, line(best.x), line(best.x, 1), best.half, _nose_radius(best.distance))


@dataclass(frozen=True, eq=False)
class _Trial:
    """A line tried, and how far its normals miss equal distances.

    `mismatch` and `turn` are e and h h' of :func:`midline`, `error` the rms of the former.
    """

    line: BSpline
    x: FloatArray
    half: FloatArray
    distance: CubicSpline
    mismatch: FloatArray
    turn: FloatArray
    error: float


def _measure(
    line: BSpline, x: FloatArray, y: FloatArray, *, share: FloatArray, trailing_edge: FloatArray
) -> _Trial | None:
    """Measure the skin about a line; None where feet of normals fold over one another."""
    found = _distances(line, x, y)
    if found is None:
        return None
    nose, distance = found
    place = nose + share * (trailing_edge[0] - nose)
    t = np.sqrt(place - nose)
    upper, lower = distance(t), -distance(-t)
    half = 0.5 * (upper + lower)
    spread = 0.25 * (distance(t, 1) + distance(-t, 1))  # t dh/dx
    turn = np.append(2.0 * spread[0] ** 2, half[1:] * spread[1:] / t[1:])
    mismatch = 0.5 * (upper - lower) * np.sqrt(1.0 + line(place, 1) ** 2)
    mismatch[-1] = trailing_edge[1] - line(place[-1])
    error = float(np.sqrt(np.mean(mismatch**2)))
    return _Trial(line, place, half, distance, mismatch, turn, error)


@lru_cache(maxsize=1)
def _basis() -> BSpline:
    """All members of the cubic spline basis on KNOTS at once, last axis the member."""
    knots = np.concatenate([[KNOTS[0]] * 3, KNOTS, [KNOTS[-1]] * 3])
    return BSpline(knots, np.eye(len(KNOTS) + 2), 3)


def _distances(line: BSpline, x: FloatArray, y: FloatArray) -> tuple[float, CubicSpline] | None:
    """Distance of the skin from a line, upper side positive, over t.

    Returns where along x the line leaves the nose, x_n, and the distances as a
    spline over t, where x_n + t^2 is the foot of the normal. None where the feet
    do not follow one another as the points of the skin do.
    """
    foot = x.copy()
    for _ in range(6):
        off, slope = line(foot) - y, line(foot, 1)
        foot = foot - ((foot - x) + off * slope) / np.maximum(
            1.0 + slope**2 + off * line(foot, 2), 0.3
        )
    slope = line(foot, 1)
    off = ((y - line(foot)) - (x - foot) * slope) / np.sqrt(1.0 + slope**2)
    along = np.linspace(0.0, 1.0, len(x))
    curve = CubicSpline(along, foot)
    near = float(along[np.argmin(foot)])
    turning = curve.derivative().roots(extrapolate=False)
    if not turning.size:
        return None
    at = float(turning[np.argmin(np.abs(turning - near))])
    nose = min(float(curve(at)), float(foot.min()))
    t = np.where(along < at, 1.0, -1.0) * np.sqrt(foot - nose)
    if not np.all(np.diff(t) < 0.0):
        return None
    return nose, CubicSpline(t[::-1], off[::-1])


def _nose_radius(distance: CubicSpline) -> float:
    """Radius at the nose: half the thickness is sqrt(2 r) t + ... there.

    Fitted with a square and a cubic term over the first 2 % of chord.
    """
    t = np.linspace(0.0, np.sqrt(NOSE_FIT_LIMIT), 41)[1:]
    half = 0.5 * (distance(t) - distance(-t))
    fit = np.linalg.lstsq(np.column_stack([t, t**2, t**3]), half, rcond=None)[0]
    return float(0.5 * fit[0] ** 2)
