"""The stations of the lifting line: bound segments and control points along surfaces.

Axes as in :mod:`solver.wing.planform`; only the right half is kept.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

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
