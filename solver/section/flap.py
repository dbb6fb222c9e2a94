"""A plain flap: the rear of a section turned about a hinge."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

from solver.errors import InputError, require_within
from solver.section.arc_spline import spline_by_length
from solver.section.fairing import fair_outline
from solver.section.geometry import Outline

FloatArray = NDArray[np.float64]

FOREMOST_HINGE, REARMOST_HINGE = 0.5, 0.95
LARGEST_DEFLECTION = np.radians(40.0)
ARC_STEP = np.radians(2.0)
FEWEST_ARC_STEPS = 4
SHORTEST_STEP = 1e-4
"""Between a corner and the points beside it, over chord."""
SHORTEST_ARC = 1e-6
"""Below which the opening surface has one corner and no arc, over chord."""
NEWTON_STEPS = 30
MET = 1e-12
"""Distance between two curves at their crossing, over chord."""


@dataclass(frozen=True)
class _Turn:
    """A rotation, trailing edge down, about a hinge."""

    hinge: FloatArray
    angle: float

    def __call__(self, points: FloatArray, share: float = 1.0) -> FloatArray:
        return np.asarray(self.hinge + self.direction(points - self.hinge, share))

    def direction(self, vectors: FloatArray, share: float = 1.0) -> FloatArray:
        cosine, sine = np.cos(share * self.angle), np.sin(share * self.angle)
        return np.asarray(vectors @ np.array([[cosine, -sine], [sine, cosine]]))


def deflect_flap(
    outline: Outline, *, hinge: float, deflection: float, hinge_height: float = 0.5
) -> Outline:
    """Turn the rear part of a section about a hinge, as a plain flap without a gap.

    Parameters
    ----------
    outline : Outline
        Chord 1, without a flap deflected already.
    hinge : float
        Where it lies along the chord, x/c. [-] 0.5 to 0.95.
    deflection : float
        Trailing edge down positive. [rad] Within 40 degrees either way.
    hinge_height : float, optional
        Where the hinge lies in the local thickness, from the lower surface (0) to
        the upper one (1). [-]

    Returns
    -------
    Outline
        Named with the flap, with its corners. The chord line of the section
        without deflection stays the datum of angles and of length, so that the
        trailing edge is no longer at (1, 0). With no deflection, `outline` itself.

    Raises
    ------
    InputError
        If a number is out of range, or the outline is deflected already, or the
        closing surface finds no place to meet.

    Notes
    -----
    The surface that opens is joined by an arc about the hinge, which both parts
    touch; the one that closes is cut off where its two parts meet. Points lie on
    the smooth curve of :func:`solver.section.fairing.fair_outline`, an open
    trailing edge closed. Camber line and thickness of the result are not to be
    measured with :func:`solver.section.geometry.camber_line`: its smooth line
    would run over the corner.
    """
    _check(outline, hinge, deflection, hinge_height)
    if deflection == 0.0:
        return outline
    fair = fair_outline(outline).outline
    points = np.column_stack([fair.x, fair.y])
    nose = int(np.argmin(fair.x))
    upper, lower = spline_by_length(points[nose::-1]), spline_by_length(points[nose:])
    top, bottom = _at(upper, hinge), _at(lower, hinge)
    pivot = bottom + hinge_height * (top - bottom)
    turn = _Turn(pivot, deflection)
    opening, closing = (upper, lower) if deflection > 0.0 else (lower, upper)
    opened, opened_corners = _opened(opening, turn)
    closed, closed_corner = _closed(closing, turn, hinge)
    sides = [(opened, opened_corners), (closed, [closed_corner])]
    (over, over_corners), (under, under_corners) = sides if deflection > 0.0 else sides[::-1]
    last = len(over) - 1
    corners = [last - k for k in reversed(over_corners)] + [last + k for k in under_corners]
    whole = np.concatenate([over[::-1], under[1:]])
    whole[-1] = whole[0]
    return replace(
        fair,
        name=f"{outline.name}, {_words(hinge, deflection, hinge_height)}",
        x=whole[:, 0].copy(),
        y=whole[:, 1].copy(),
        corners=tuple(corners),
    )


def _check(outline: Outline, hinge: float, deflection: float, hinge_height: float) -> None:
    require_within(FOREMOST_HINGE, REARMOST_HINGE, hinge=hinge)
    require_within(0.0, 1.0, hinge_height=hinge_height)
    if not abs(deflection) <= LARGEST_DEFLECTION * (1.0 + 1e-12):  # refuses NaN too
        raise InputError("deflection", deflection, "within 40 degrees either way, in radians")
    if outline.corners:
        raise InputError("outline", outline.name, "a section without a flap deflected already")


def _words(hinge: float, deflection: float, hinge_height: float) -> str:
    """Name a flap, as ``flap 24 % at 5 deg``."""
    share, angle = round(100.0 * (1.0 - hinge), 2), round(float(np.degrees(deflection)), 2)
    words = f"flap {share:g} % at {angle:g} deg"
    if hinge_height == 0.5:
        return words
    ends = {0.0: "the lower surface", 1.0: "the upper surface"}
    place = ends.get(hinge_height, f"{round(100.0 * hinge_height, 2):g} % of the thickness")
    return f"{words}, hinged at {place}"


def _at(surface: CubicSpline, x: float) -> FloatArray:
    """Point of a surface above or below a place of the chord."""
    along = brentq(lambda s: surface(s)[0] - x, *_around(surface, x), xtol=1e-15)
    return np.asarray(surface(along))


def _around(surface: CubicSpline, x: float) -> tuple[float, float]:
    """Neighbouring points of a surface, by length, between which x lies."""
    at = int(np.searchsorted(surface(surface.x)[:, 0], x))
    return float(surface.x[at - 1]), float(surface.x[at])


def _foot(surface: CubicSpline, hinge: FloatArray) -> float:
    """Length along a surface to its point nearest to the hinge."""
    known = surface(surface.x)
    near = int(np.argmin(np.hypot(*(known - hinge).T)))

    def ahead(along: float) -> float:
        return float((surface(along) - hinge) @ surface(along, 1))

    low, high = surface.x[max(near - 1, 0)], surface.x[min(near + 1, len(known) - 1)]
    return float(brentq(ahead, low, high, xtol=1e-15))


def _opened(surface: CubicSpline, turn: _Turn) -> tuple[FloatArray, list[int]]:
    """Points of the surface that opens, nose to trailing edge, and its corners."""
    foot = _foot(surface, turn.hinge)
    start = surface(foot)
    if np.hypot(*(start - turn.hinge)) * abs(turn.angle) < SHORTEST_ARC:
        arc = turn(start, 0.5)[None]
    else:
        steps = max(FEWEST_ARC_STEPS, int(np.ceil(abs(turn.angle) / ARC_STEP)))
        arc = np.array([turn(start, share) for share in np.linspace(0.0, 1.0, steps + 1)])
    front, rear = _either_side(surface, foot, foot)
    corners = sorted({len(front), len(front) + len(arc) - 1})
    return np.concatenate([front, arc, turn(rear)]), corners


def _closed(surface: CubicSpline, turn: _Turn, place: float) -> tuple[FloatArray, int]:
    """Points of the surface that closes, nose to trailing edge, and its corner."""
    foot = _foot(surface, turn.hinge)
    reach = np.hypot(*(surface(foot) - turn.hinge)) * np.tan(0.5 * abs(turn.angle))
    ends = np.array([foot - reach, foot + reach])
    for _ in range(NEWTON_STEPS):
        apart = surface(ends[0]) - turn(surface(ends[1]))
        if np.hypot(*apart) < MET:
            break
        slopes = np.column_stack([surface(ends[0], 1), -turn.direction(surface(ends[1], 1))])
        ends = ends - np.linalg.solve(slopes, apart)
    if not (np.hypot(*apart) < MET and 0.0 < ends[0] <= ends[1] < surface.x[-1]):
        raise InputError("hinge", place, "where the closing surface can be cut off")
    front, rear = _either_side(surface, ends[0], ends[1])
    return np.concatenate([front, surface(ends[0])[None], turn(rear)]), len(front)


def _either_side(
    surface: CubicSpline, before: float, behind: float
) -> tuple[FloatArray, FloatArray]:
    """Points of a surface ahead of one place and behind another."""
    front = surface.x[surface.x < before - SHORTEST_STEP]
    rear = surface.x[surface.x > behind + SHORTEST_STEP]
    return surface(front), surface(rear)
