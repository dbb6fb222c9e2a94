"""Straight-tapered lifting surfaces and the stations that the lifting line uses.

Axes: x downstream, y to the right, z up; the origin is the leading edge of the
wing's root. Every surface is mirror-symmetric about y = 0, so only its right
half is kept. All fields may be arrays that broadcast: a batch of wings is one
:class:`TaperedSurface` whose fields carry leading axes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


class Surface(Protocol):
    """What the lifting line asks of a mirror-symmetric lifting surface.

    `fraction` is the place along the half-span, 0 at the root and 1 at the tip,
    shape (k,); results have shape (..., k), positions (..., k, 3).
    """

    def chord(self, fraction: FloatArray) -> FloatArray:
        """Streamwise chord [m]."""
        ...

    def quarter_chord(self, fraction: FloatArray) -> FloatArray:
        """Position of the quarter-chord point [m]."""
        ...

    def twist(self, fraction: FloatArray) -> FloatArray:
        """Angle of the chord above the x axis, nose up positive [rad]."""
        ...

    def dihedral_angle(self) -> FloatArray:
        """Angle of the quarter-chord line above the horizontal, seen from the front [rad]."""
        ...


def _column(value: ArrayLike) -> FloatArray:
    """Batch values with a last axis of length one, ready to meet stations."""
    return np.asarray(value, dtype=np.float64)[..., None]


@dataclass(frozen=True, eq=False)
class TaperedSurface:
    """A straight-tapered surface, lengths in metres and angles in radians.

    Parameters
    ----------
    span : array_like, shape (...)
        Tip to tip, seen from above. [m] > 0.
    root_chord, tip_chord : array_like, shape (...)
        Streamwise chords. [m] > 0.
    washout : array_like, shape (...)
        Angle by which the tip's chord points below the root's, linear between. [rad]
    dihedral : array_like, shape (...)
        [rad] Between -pi/3 and pi/3.
    sweep : array_like, shape (...)
        Of the quarter-chord line, aft positive, seen from above. [rad]
        Between -pi/3 and pi/3.
    incidence : array_like, shape (...)
        Angle of the root chord above the x axis. [rad]
    root_x, root_z : array_like, shape (...)
        Position of the root's leading edge. [m]

    Raises
    ------
    InputError
        If a length is not finite and positive or an angle is out of range.
    """

    span: ArrayLike
    root_chord: ArrayLike
    tip_chord: ArrayLike
    washout: ArrayLike = 0.0
    dihedral: ArrayLike = 0.0
    sweep: ArrayLike = 0.0
    incidence: ArrayLike = 0.0
    root_x: ArrayLike = 0.0
    root_z: ArrayLike = 0.0

    def __post_init__(self) -> None:
        for name in ("span", "root_chord", "tip_chord"):
            value = np.asarray(getattr(self, name), dtype=np.float64)
            if not np.all(np.isfinite(value) & (value > 0.0)):
                raise InputError(name, getattr(self, name), "finite and > 0")
        for name in ("dihedral", "sweep", "washout", "incidence"):
            value = np.asarray(getattr(self, name), dtype=np.float64)
            if not np.all(np.abs(value) <= np.pi / 3.0):
                raise InputError(name, getattr(self, name), "between -60 and 60 degrees")

    @property
    def area(self) -> FloatArray:
        """Area seen from above, both halves [m2]."""
        return np.asarray(
            0.5
            * np.asarray(self.span, dtype=np.float64)
            * (np.asarray(self.root_chord) + np.asarray(self.tip_chord))
        )

    @property
    def aspect_ratio(self) -> FloatArray:
        """Span squared over area [-]."""
        return np.asarray(np.square(np.asarray(self.span, dtype=np.float64)) / self.area)

    @property
    def taper(self) -> FloatArray:
        """Tip chord over root chord [-]."""
        tip = np.asarray(self.tip_chord, dtype=np.float64)
        return np.asarray(tip / np.asarray(self.root_chord, dtype=np.float64))

    @property
    def mean_chord(self) -> FloatArray:
        """Area over span, shape (...) [m]."""
        return np.asarray(self.area / np.asarray(self.span, dtype=np.float64))

    @property
    def mean_aerodynamic_chord(self) -> FloatArray:
        """Integral of chord squared over area, shape (...) [m]."""
        taper = self.taper
        return np.asarray(
            2.0 / 3.0 * np.asarray(self.root_chord) * (1.0 + taper + taper**2) / (1.0 + taper)
        )

    @property
    def mean_fraction(self) -> FloatArray:
        """Place along the half-span of the mean aerodynamic chord [-]."""
        taper = self.taper
        return np.asarray((1.0 + 2.0 * taper) / (3.0 * (1.0 + taper)))

    @property
    def mean_leading_edge(self) -> FloatArray:
        """X of the leading edge of the mean aerodynamic chord, shape (...) [m]."""
        half_span = 0.5 * np.asarray(self.span, dtype=np.float64)
        quarter = (
            np.asarray(self.root_x)
            + 0.25 * np.asarray(self.root_chord)
            + np.tan(self.sweep) * half_span * self.mean_fraction
        )
        return np.asarray(quarter - 0.25 * self.mean_aerodynamic_chord)

    def chord(self, fraction: FloatArray) -> FloatArray:
        """Streamwise chord at places along the half-span.

        Parameters
        ----------
        fraction : ndarray, shape (k,)
            0 at the root, 1 at the tip. [-]

        Returns
        -------
        ndarray, shape (..., k)
            [m]
        """
        return _column(self.root_chord) * (1.0 - fraction) + _column(self.tip_chord) * fraction

    def quarter_chord(self, fraction: FloatArray) -> FloatArray:
        """Quarter-chord points at places along the half-span.

        Parameters
        ----------
        fraction : ndarray, shape (k,)
            0 at the root, 1 at the tip. [-]

        Returns
        -------
        ndarray, shape (..., k, 3)
            [m]
        """
        y = 0.5 * _column(self.span) * fraction
        x = _column(self.root_x) + 0.25 * _column(self.root_chord) + y * np.tan(_column(self.sweep))
        z = _column(self.root_z) + y * np.tan(_column(self.dihedral))
        return np.stack(np.broadcast_arrays(x, y, z), axis=-1)

    def twist(self, fraction: FloatArray) -> FloatArray:
        """Angle of the local chord above the x axis.

        Parameters
        ----------
        fraction : ndarray, shape (k,)
            0 at the root, 1 at the tip. [-]

        Returns
        -------
        ndarray, shape (..., k)
            [rad]
        """
        return _column(self.incidence) - _column(self.washout) * fraction

    def dihedral_angle(self) -> FloatArray:
        """Return the dihedral, shape (...) [rad]."""
        return np.asarray(self.dihedral, dtype=np.float64)


def surface_from_area(
    area: float,
    *,
    aspect_ratio: float,
    taper: float,
    incidence: float = 0.0,
    mean_quarter_chord_x: float = 0.0,
    root_z: float = 0.0,
) -> TaperedSurface:
    """Unswept tapered surface of given area, placed by its mean quarter chord.

    Parameters
    ----------
    area : float
        [m2] > 0.
    aspect_ratio : float
        [-] > 0.
    taper : float
        Tip chord over root chord. [-] > 0, at most 1.
    incidence : float
        [rad]
    mean_quarter_chord_x : float
        x of the quarter-chord line. [m]
    root_z : float
        [m]

    Returns
    -------
    TaperedSurface

    Raises
    ------
    InputError
        If area, aspect ratio or taper is out of range.
    """
    for name, value in (("area", area), ("aspect_ratio", aspect_ratio), ("taper", taper)):
        if not (np.isfinite(value) and value > 0.0):
            raise InputError(name, value, "finite and > 0")
    if taper > 1.0:
        raise InputError("taper", taper, "at most 1")
    span = np.sqrt(area * aspect_ratio)
    root_chord = 2.0 * area / (span * (1.0 + taper))
    return TaperedSurface(
        span=span,
        root_chord=root_chord,
        tip_chord=taper * root_chord,
        incidence=incidence,
        root_x=mean_quarter_chord_x - 0.25 * root_chord,
        root_z=root_z,
    )


@dataclass(frozen=True, eq=False)
class Lattice:
    """Stations of one or more surfaces, right half only, ready for the lifting line.

    Each station is a straight bound segment on the quarter-chord line with a
    control point on it. Leading axes are a batch of aircraft.

    Fields
    ------
    inner, outer, point : ndarray, shape (..., n, 3)
        Ends of the bound segment and the control point [m].
    chord : ndarray, shape (..., n)
        Streamwise chord at the control point [m].
    twist : ndarray, shape (..., n)
        Angle of the chord above the x axis [rad].
    normal : ndarray, shape (..., n, 3)
        Unit vector across the segment and the x axis, upward [-].
    cos_sweep : ndarray, shape (..., n)
        Cosine of the angle between segment and the plane across the x axis [-].
    width : ndarray, shape (..., n)
        Length of the segment across the x axis [m].
    fraction : ndarray, shape (n,)
        Place of the control point along its half-span [-].
    surface : ndarray, shape (n,)
        Index of the surface that the station belongs to.
    """

    inner: FloatArray
    outer: FloatArray
    point: FloatArray
    chord: FloatArray
    twist: FloatArray
    normal: FloatArray
    cos_sweep: FloatArray
    width: FloatArray
    fraction: FloatArray
    surface: IntArray

    @property
    def segment(self) -> FloatArray:
        """Bound segment from inner to outer end, shape (..., n, 3) [m]."""
        return self.outer - self.inner

    @property
    def strip_area(self) -> FloatArray:
        """Chord at the control point times width, right half, shape (..., n) [m2]."""
        return self.chord * self.width


def cosine_fractions(stations: int) -> tuple[FloatArray, FloatArray]:
    """Nodes and control points along the half-span, cosine-spaced over the span.

    Parameters
    ----------
    stations : int
        Stations across the whole span, even, at least 4.

    Returns
    -------
    nodes : ndarray, shape (stations/2 + 1,)
        From 0 at the root to 1 at the tip [-].
    points : ndarray, shape (stations/2,)
        Control points at the middle angles [-].

    Raises
    ------
    InputError
        If `stations` is odd or less than 4.

    References
    ----------
    .. [1] W. F. Phillips, D. O. Snyder, Modern Adaptation of Prandtl's Classic
       Lifting-Line Theory, J. Aircraft 37(4), 2000, 662-670: cosine clustering.
    """
    if stations < 4 or stations % 2:
        raise InputError("stations", stations, "even and at least 4")
    half = stations // 2
    angle = 0.5 * np.pi * np.arange(half + 1) / half
    middle = 0.5 * (angle[1:] + angle[:-1])
    return np.sin(angle), np.sin(middle)


def lattice(*surfaces: Surface, stations: tuple[int, ...]) -> Lattice:
    """Lay stations along surfaces.

    Parameters
    ----------
    *surfaces : Surface
        Wing first, then others; their batches must broadcast.
    stations : tuple of int
        Stations across the whole span of each surface, even.

    Returns
    -------
    Lattice
        With n = the sum of half the stations.

    Raises
    ------
    InputError
        If the counts do not match the surfaces, or one is odd or too small.
    """
    if len(stations) != len(surfaces):
        raise InputError("stations", stations, "one count for each surface")
    pieces = [
        _surface_lattice(surface, index=index, stations=count)
        for index, (surface, count) in enumerate(zip(surfaces, stations, strict=True))
    ]
    return _joined(pieces)


def _surface_lattice(surface: Surface, *, index: int, stations: int) -> Lattice:
    nodes, points = cosine_fractions(stations)
    ends = surface.quarter_chord(nodes)
    inner, outer = ends[..., :-1, :], ends[..., 1:, :]
    segment = outer - inner
    width = np.hypot(segment[..., 1], segment[..., 2])
    dihedral = np.broadcast_to(surface.dihedral_angle()[..., None], width.shape)
    normal = np.stack([np.zeros_like(width), -np.sin(dihedral), np.cos(dihedral)], axis=-1)
    return Lattice(
        inner=inner,
        outer=outer,
        point=surface.quarter_chord(points),
        chord=np.broadcast_to(surface.chord(points), width.shape),
        twist=np.broadcast_to(surface.twist(points), width.shape),
        normal=normal,
        cos_sweep=width / np.linalg.norm(segment, axis=-1),
        width=width,
        fraction=points,
        surface=np.full(points.size, index, dtype=np.int64),
    )


def _joined(pieces: list[Lattice]) -> Lattice:
    batch = np.broadcast_shapes(*(piece.width.shape[:-1] for piece in pieces))

    def stations_of(name: str) -> FloatArray:
        parts = [getattr(piece, name) for piece in pieces]
        return np.concatenate([np.broadcast_to(p, batch + p.shape[-1:]) for p in parts], axis=-1)

    def vectors_of(name: str) -> FloatArray:
        parts = [getattr(piece, name) for piece in pieces]
        return np.concatenate([np.broadcast_to(p, batch + p.shape[-2:]) for p in parts], axis=-2)

    return Lattice(
        inner=vectors_of("inner"),
        outer=vectors_of("outer"),
        point=vectors_of("point"),
        chord=stations_of("chord"),
        twist=stations_of("twist"),
        normal=vectors_of("normal"),
        cos_sweep=stations_of("cos_sweep"),
        width=stations_of("width"),
        fraction=np.concatenate([piece.fraction for piece in pieces]),
        surface=np.concatenate([piece.surface for piece in pieces]),
    )
