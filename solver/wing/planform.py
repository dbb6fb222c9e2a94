"""Straight-tapered lifting surfaces.

Axes: x downstream, y to the right, z up; the origin is the leading edge of the
wing's root. Every surface is mirror-symmetric about y = 0, so only its right
half is kept. All fields may be arrays that broadcast: a batch of wings is one
:class:`TaperedSurface` whose fields carry leading axes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError

FloatArray = NDArray[np.float64]


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
