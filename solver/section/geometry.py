"""Outlines of wing sections: made from NACA digits or coordinate lists, and measured."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError
from solver.section.midline import Midline, foremost_point, midline, skin
from solver.section.naca import naca_section
from solver.section.outline_checks import (
    check_point_list,
    check_shape,
    closing_gap,
    printed_step,
    runs_lower_side_first,
)

FloatArray = NDArray[np.float64]

MIDLINE_POINTS = 201
"""Cosine-spaced places at which camber line and thickness are measured."""


@dataclass(frozen=True, eq=False)
class Outline:
    """A section's outline, chord 1.

    Parameters
    ----------
    name : str
        What the section is called.
    x, y : numpy.ndarray, shape (n,)
        From the trailing edge over the upper surface to the leading edge and
        back along the lower one. [-] The trailing edge is at x = 1 and, where
        it closes, is both the first and the last point.
    turned_round : bool
        The list it came from began along the lower surface and was turned round.
    rounding : float
        Step to which the list it came from was printed; 0 where it was not. [-]
    corners : tuple of int
        Points where its slope or curvature jumps, save the trailing edge: those of a
        deflected flap. No smooth curve runs through them.
    """

    name: str
    x: FloatArray
    y: FloatArray
    turned_round: bool = False
    rounding: float = 0.0
    corners: tuple[int, ...] = ()


@dataclass(frozen=True, eq=False)
class CamberLine:
    """The line midway between the surfaces, midway as measured across itself.

    Parameters
    ----------
    x : numpy.ndarray, shape (n,)
        From the nose to the trailing edge. [-]
    y : numpy.ndarray, shape (n,)
        [-]
    slope : numpy.ndarray, shape (n,)
        dy/dx. [-]
    """

    x: FloatArray
    y: FloatArray
    slope: FloatArray


@dataclass(frozen=True, eq=False)
class Thickness:
    """Distance between the surfaces, measured perpendicular to the camber line.

    Parameters
    ----------
    x, thickness : numpy.ndarray, shape (n,)
        From leading to trailing edge. [-]
    """

    x: FloatArray
    thickness: FloatArray


@dataclass(frozen=True)
class Largest:
    """A largest value and where along the chord it lies; both [-]."""

    value: float
    place: float


def cosine_spacing(points: int) -> FloatArray:
    """Places from 0 to 1, close together at both ends.

    Parameters
    ----------
    points : int
        How many. >= 2.

    Returns
    -------
    numpy.ndarray, shape (points,)
        (1 - cos t)/2 at even steps of t from 0 to pi. [-]

    Raises
    ------
    InputError
        If there are fewer than two points.
    """
    if points < 2:
        raise InputError("points", points, "at least 2")
    return 0.5 - 0.5 * np.cos(np.linspace(0.0, np.pi, points))


def naca_outline(digits: str, *, points: int = 161, closed: bool = True) -> Outline:
    """Outline of a NACA four- or five-digit section.

    The thickness is laid off perpendicular to the camber line, so that the
    foremost point of a cambered section lies a little ahead of x = 0.

    Parameters
    ----------
    digits : str
        Four or five digits, with or without ``NACA`` before them. Five digits
        may be reflexed (third digit 1).
    points : int, optional
        Along the whole outline, both trailing-edge points counted. Odd, 41 to 2001.
    closed : bool, optional
        Bring the trailing edge to a point by changing the last coefficient of
        the thickness; otherwise it is 2.1 % of the thickness high, as published.

    Returns
    -------
    Outline
        Named ``NACA`` and the digits.

    Raises
    ------
    InputError
        If the digits name no section or one so thick and bent at its nose that its
        surfaces fold, or `points` is even or out of range.

    References
    ----------
    .. [1] NACA Report 460, 1933, eqs. (1)-(3); NACA Reports 537 and 610.
    .. [2] I. H. Abbott, A. E. von Doenhoff, Theory of Wing Sections, Dover 1959, eq. (6.1).
    """
    section = naca_section(digits)
    if points % 2 == 0 or not 41 <= points <= 2001:
        raise InputError("points", points, "odd and between 41 and 2001")
    x = cosine_spacing(points // 2 + 1)
    half = section.half_thickness(x, closed=closed)
    if closed:
        half[-1] = 0.0  # the closing coefficients leave 1e-17
    angle = np.arctan(section.camber.slope(x))
    camber = section.camber.height(x)
    upper_x, upper_y = x - half * np.sin(angle), camber + half * np.cos(angle)
    lower_x, lower_y = x + half * np.sin(angle), camber - half * np.cos(angle)
    outline_x = np.concatenate([upper_x[::-1], lower_x[1:]])
    near = int(np.argmin(outline_x))
    if np.any(np.diff(outline_x[: near + 1]) >= 0.0) or np.any(np.diff(outline_x[near:]) <= 0.0):
        raise InputError("digits", digits, "of a section whose outline does not fold over itself")
    return Outline(
        f"NACA {section.digits}", outline_x, np.concatenate([upper_y[::-1], lower_y[1:]])
    )


def outline_from_coordinates(name: str, coordinates: ArrayLike) -> Outline:
    """Outline from a list of points, refused with the reason where it is unusable.

    The list runs once round the section from the trailing edge. One that begins
    along the lower surface is turned round and marked so. Position and size
    are normalised (foremost point at the origin, trailing edge at x = 1); the
    inclination of the list is kept, since it is the datum of its angles.

    Parameters
    ----------
    name : str
        What the section is called.
    coordinates : array_like, shape (n, 2)
        Points x, y in any unit of length. 31 <= n <= 2000.

    Returns
    -------
    Outline
        Chord 1, upper surface first.

    Raises
    ------
    InputError
        Named ``coordinates``, saying what is wrong and at which point (counted
        from 1): not finite, too few or too many points, the same point twice,
        open or slanted trailing edge, running backwards, surfaces that cross,
        no thickness, or too coarse to give the shape of the nose.
    """
    points = check_point_list(coordinates)
    turned = runs_lower_side_first(points)
    if turned:
        points = points[::-1]
    foremost = foremost_point(points)
    chord = closing_gap(points).trailing_edge[0] - foremost[0]
    scaled = (points - foremost) / chord
    check_shape(scaled, turned=turned)
    rounding = printed_step(points[:, 1]) / chord
    return Outline(name, scaled[:, 0].copy(), scaled[:, 1].copy(), turned, rounding)


@lru_cache(maxsize=64)
def _measured(outline: Outline) -> Midline:
    """Camber line and thickness, found once for each outline (they are frozen)."""
    trailing_edge = closing_gap(np.column_stack([outline.x, outline.y])).trailing_edge
    return midline(skin(outline.x, outline.y), trailing_edge=trailing_edge, points=MIDLINE_POINTS)


def camber_line(outline: Outline) -> CamberLine:
    """Find the line midway between the surfaces, measured perpendicular to itself.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    CamberLine
        From the nose to the trailing edge, 201 cosine-spaced points.

    Notes
    -----
    Good to 2e-4 of the chord for NACA sections whose camber line bends no
    earlier than 10 % of chord. A line bent further ahead (NACA 210xx) is
    rounded off there: 0.01 degrees in zero-lift angle, one in ideal angle.
    """
    line = _measured(outline)
    return CamberLine(line.x.copy(), line.y.copy(), line.slope.copy())


def thickness(outline: Outline) -> Thickness:
    """Find the thickness along the chord, measured perpendicular to the camber line.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    Thickness
        From the nose to the trailing edge, 201 cosine-spaced points.
    """
    line = _measured(outline)
    return Thickness(line.x.copy(), 2.0 * line.half)


def max_thickness(outline: Outline) -> Largest:
    """Find the largest thickness, measured perpendicular to the camber line, and its place.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    Largest
        Both [-].
    """
    line = _measured(outline)
    return _peak(line.x, 2.0 * line.half)


def max_camber(outline: Outline) -> Largest:
    """Find the largest height of the camber line above the chord line, and its place.

    The height is measured along y, the camber line perpendicular to itself.
    Where most of it lies below the chord line the value is negative.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    Largest
        Both [-].
    """
    line = _measured(outline)
    run = (line.x - line.x[0]) / (line.x[-1] - line.x[0])
    height = line.y - line.y[0] - (line.y[-1] - line.y[0]) * run
    sign = 1.0 if height.max() >= -height.min() else -1.0
    peak = _peak(line.x, sign * height)
    return Largest(sign * peak.value, peak.place)


def leading_edge_radius(outline: Outline) -> float:
    """Find the radius of the nose, from a fit of the thickness over its first 2 % of chord.

    Within 1.5 % of the closed form for NACA sections given at 61 points or more.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    float
        [-]
    """
    return _measured(outline).nose_radius


def _peak(x: FloatArray, y: FloatArray) -> Largest:
    """Top of the parabola through the largest sample and its neighbours."""
    at = int(np.clip(np.argmax(y), 1, len(x) - 2))
    a, b, c = np.polyfit(x[at - 1 : at + 2] - x[at], y[at - 1 : at + 2], 2)
    if a >= -1e-12:  # flat, as the camber of a symmetric section
        return Largest(float(y[at]), float(x[at]))
    shift = float(np.clip(-b / (2.0 * a), x[at - 1] - x[at], x[at + 1] - x[at]))
    return Largest(float(c + shift * (b + a * shift)), float(x[at] + shift))
