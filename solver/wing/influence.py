"""Velocities that unit circulations induce on one another's control points.

Every station carries a horseshoe: its bound segment and two legs that trail to
infinity along the free stream, together with the mirror image on the left half.

Within one surface the quarter-chord line is straightened, by sliding it along the
stream, before its own downwash is taken: on a swept line straight horseshoes with
control points on the line do not converge as they shrink. What sweep changes is
added from :mod:`solver.wing.sweep`. Between surfaces the true positions hold.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.wing.lattice import Lattice
from solver.wing.sweep import sweep_upwash

FloatArray = NDArray[np.float64]

CORE_FRACTION = 0.35
"""Vortex core radius over the spacing of the trailing legs, between surfaces only.

Chosen so that a tail that moves through the wing's sheet of discrete legs sees
no single leg; a test holds that the results do not depend on it.
"""


@dataclass(frozen=True, eq=False)
class Influence:
    """Linear maps from circulations to what the lifting line needs.

    A circulation g is divided by the free-stream speed and has the unit of a
    length. Arrays have shape (..., n, n): row, the station acted upon.

    Fields
    ------
    wake_angle : ndarray, shape (...)
        Angle of free stream and wake above the x axis [rad].
    upwash : ndarray
        Angle by which the flow is raised at a control point per unit g [1/m].
    force_x, force_z : ndarray
        (v x segment) along x and z per unit g; v is the induced velocity over the
        free-stream speed [-].
    onset : ndarray, shape (..., n)
        Angle between the free stream and the x axis in the plane of each section,
        without twist [rad].
    onset_slope : ndarray, shape (..., n)
        Its derivative with the angle of attack [-].
    """

    wake_angle: FloatArray
    upwash: FloatArray
    force_x: FloatArray
    force_z: FloatArray
    onset: FloatArray
    onset_slope: FloatArray

    def case(self, index: int | slice) -> Influence:
        """One case of a batch along its first axis, or some.

        Parameters
        ----------
        index : int or slice

        Returns
        -------
        Influence
        """
        return Influence(*(getattr(self, name)[index] for name in self.__dataclass_fields__))


def influence(
    lattice: Lattice, *, wake_angle: ArrayLike, core_fraction: float = CORE_FRACTION
) -> Influence:
    """Evaluate the influence of every station on every other.

    Parameters
    ----------
    lattice : Lattice
        Batch shape B.
    wake_angle : array_like, shape (...)
        Angle of attack along which the wake trails; broadcasts with B. [rad]
    core_fraction : float
        Core radius over leg spacing for legs that pass another surface. [-] >= 0.

    Returns
    -------
    Influence
        Arrays of the broadcast batch shape.

    Notes
    -----
    Horseshoe velocity after Phillips and Snyder [1]_, eq. (5) from memory, written with
    h^2 = |u x r|^2 so that it loses no digits downstream. A station's own bound
    segment induces nothing on its own control point. Legs that pass another
    surface are given the core of Vatistas [2]_ with n = 2: the velocity 1/h
    becomes h/(h^4 + r_c^4)^(1/2).

    The angle of the induced flow is taken to first order, v . m with m across
    the free stream in the plane of the section: Prandtl's own linearisation, for
    which the published span loadings hold exactly. The forces use the straightened
    line too, which Munk's stagger theorem allows: moving a surface's own vorticity
    along the stream changes where its induced drag acts, not how much it is.

    References
    ----------
    .. [1] W. F. Phillips, D. O. Snyder, J. Aircraft 37(4), 2000, 662-670.
    .. [2] G. H. Vatistas, V. Kozel, W. C. Mih, Experiments in Fluids 11, 1991, 73-76.
    .. [3] M. M. Munk, The Minimum Induced Drag of Aerofoils, NACA Report 121, 1921.
    """
    angle = np.asarray(wake_angle, dtype=np.float64)
    batch = np.broadcast_shapes(angle.shape, lattice.width.shape[:-1])
    angle = np.broadcast_to(angle, batch)
    stream = np.stack([np.cos(angle), np.zeros(batch), np.sin(angle)], axis=-1)
    velocity = _mirrored_velocity(lattice, stream, core_fraction)
    vx, vy, vz = velocity

    normal = lattice.normal
    cosine, sine = np.cos(angle)[..., None], np.sin(angle)[..., None]
    # Direction across the free stream in the plane of each section.
    along = normal[..., 2] * sine
    mx, my, mz = -along * cosine, normal[..., 1], normal[..., 2] - along * sine
    size = np.sqrt(mx**2 + my**2 + mz**2)
    mx, my, mz = mx / size, my / size, mz / size
    upwash = vx * mx[..., None] + vy * my[..., None] + vz * mz[..., None]
    upwash = upwash + sweep_upwash(lattice)

    segment = lattice.segment
    ly = segment[..., 1, None]
    lx, lz = _straightened(
        segment[..., 0, None], segment[..., 2, None], lattice, stream, mirrored=False
    )
    lift_share = normal[..., 2]
    return Influence(
        wake_angle=angle,
        upwash=upwash,
        force_x=vy * lz - vz * ly,
        force_z=vx * ly - vy * lx,
        onset=np.arctan2(lift_share * sine, cosine),
        onset_slope=lift_share / (cosine**2 + (lift_share * sine) ** 2),
    )


def _mirrored_velocity(
    lattice: Lattice, stream: FloatArray, core_fraction: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Velocity at each control point from each horseshoe and its mirror image.

    The image's velocity at a point is the mirror image of what the right half's
    horseshoe does at the mirrored point, so both are evaluated at once.
    """
    count = lattice.surface.size
    vx, vy, vz = _horseshoes(lattice, stream, core_radius(lattice, core_fraction))
    right, left = slice(0, count), slice(count, 2 * count)
    return (
        vx[..., right, :] + vx[..., left, :],
        vy[..., right, :] - vy[..., left, :],
        vz[..., right, :] + vz[..., left, :],
    )


def core_radius(lattice: Lattice, core_fraction: float) -> FloatArray:
    """Core radius of each station's legs at each control point.

    Parameters
    ----------
    lattice : Lattice
    core_fraction : float
        Over the widest spacing of the legs of the surface that sheds them [-].

    Returns
    -------
    ndarray, shape (..., n, n)
        Row, the station acted upon; zero within one surface [m].
    """
    other = lattice.surface[:, None] != lattice.surface[None, :]
    widest = np.zeros(lattice.width.shape)
    for index in np.unique(lattice.surface):
        of_surface = lattice.surface == index
        widest[..., of_surface] = lattice.width[..., of_surface].max(axis=-1, keepdims=True)
    return np.asarray(core_fraction * widest[..., None, :] * other)


def _horseshoes(
    lattice: Lattice, stream: FloatArray, core: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Velocity at control points and, behind them, at their mirror images.

    Each component has shape (..., 2 n, n); both ends of every segment are worked on
    together along an axis in front of the points.
    """
    dx, dy, dz = _displacements(lattice, stream)
    length = np.sqrt(dx**2 + dy**2 + dz**2)
    core = np.concatenate([core, core], axis=-2)[..., None, :, :]
    legs = _legs(dx, dy, dz, length, stream, core)

    ax, ay, az = dx[..., 0, :, :], dy[..., 0, :, :], dz[..., 0, :, :]
    bx, by, bz = dx[..., 1, :, :], dy[..., 1, :, :], dz[..., 1, :, :]
    product = length[..., 0, :, :] * length[..., 1, :, :]
    denominator = product * (product + ax * bx + ay * by + az * bz)
    diagonal = np.arange(lattice.surface.size)
    denominator[..., diagonal, diagonal] = np.inf
    bound = (length[..., 0, :, :] + length[..., 1, :, :]) / denominator
    cross = (ay * bz - az * by, az * bx - ax * bz, ax * by - ay * bx)
    scale = 0.25 / np.pi
    vx, vy, vz = (
        scale * (leg[..., 1, :, :] - leg[..., 0, :, :] + bound * turned)
        for leg, turned in zip(legs, cross, strict=True)
    )
    return vx, vy, vz


def _displacements(
    lattice: Lattice, stream: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Vectors from both ends of every segment to every point and its mirror image."""
    point = np.concatenate([lattice.point, lattice.point * np.array([1.0, -1.0, 1.0])], axis=-2)
    ends = np.stack([lattice.inner, lattice.outer], axis=-3)
    dx, dy, dz = (point[..., None, :, None, k] - ends[..., None, :, k] for k in range(3))
    dx, dz = _straightened(dx, dz, lattice, stream[..., None, :], mirrored=True)
    return np.broadcast_to(dx, np.broadcast_shapes(dx.shape, dy.shape)), dy, dz


def _straightened(
    dx: FloatArray, dz: FloatArray, lattice: Lattice, stream: FloatArray, *, mirrored: bool
) -> tuple[FloatArray, FloatArray]:
    """Take off the part along the stream where both stations share a surface."""
    own = lattice.surface[:, None] == lattice.surface[None, :]
    own = np.concatenate([own, own]) if mirrored else own
    ux, uz = stream[..., 0][..., None, None], stream[..., 2][..., None, None]
    along = (dx * ux + dz * uz) * own
    return dx - along * ux, dz - along * uz


def _legs(
    dx: FloatArray,
    dy: FloatArray,
    dz: FloatArray,
    length: FloatArray,
    stream: FloatArray,
    core: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Velocities, times 4 pi, of legs that trail along the stream from their heads."""
    ux = stream[..., 0][..., None, None, None]
    uz = stream[..., 2][..., None, None, None]
    cross_x, cross_y, cross_z = -uz * dy, uz * dx - ux * dz, ux * dy
    distance_squared = cross_x**2 + cross_y**2 + cross_z**2
    spread = np.sqrt(distance_squared**2 + core**4)
    factor = (length + ux * dx + uz * dz) / (length * spread)
    return factor * cross_x, factor * cross_y, factor * cross_z
