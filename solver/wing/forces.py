"""Lift, induced drag and pitching moment of a span loading, near and far.

Forces are divided by the dynamic pressure: lift and drag have the unit of an
area, moments of a volume, both halves together.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.wing.influence import CORE_FRACTION, Influence, core_radius
from solver.wing.lattice import Lattice

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class StationForces:
    """Forces on the bound segments along the stream and across it.

    Fields
    ------
    lift, induced_drag : ndarray, shape (..., n)
        Over dynamic pressure, both halves [m2].
    along_x, along_z : ndarray, shape (..., n)
        The same force in the axes of the aircraft [m2].
    """

    lift: FloatArray
    induced_drag: FloatArray
    along_x: FloatArray
    along_z: FloatArray


def station_forces(
    lattice: Lattice,
    influence: Influence,
    *,
    circulation: FloatArray,
    angle_of_attack: FloatArray,
) -> StationForces:
    """Force of each bound segment, by the vortex force on it.

    Parameters
    ----------
    lattice : Lattice
    influence : Influence
    circulation : ndarray, shape (..., n)
        g [m].
    angle_of_attack : ndarray, shape (...)
        [rad]

    Returns
    -------
    StationForces

    References
    ----------
    .. [1] W. F. Phillips, D. O. Snyder, J. Aircraft 37(4), 2000, eq. (3) (number from memory): the
       Kutta-Joukowski force with the local velocity, free stream plus induced.
    """
    cosine, sine = np.cos(angle_of_attack)[..., None], np.sin(angle_of_attack)[..., None]
    width_y = lattice.segment[..., 1]
    # Two halves, and rho V^2 g = (rho V^2 / 2) 2 g.
    strength = 4.0 * circulation
    induced_x = np.matmul(influence.force_x, circulation[..., None])[..., 0]
    induced_z = np.matmul(influence.force_z, circulation[..., None])[..., 0]
    along_x = strength * (-sine * width_y + induced_x)
    along_z = strength * (cosine * width_y + induced_z)
    return StationForces(
        lift=along_z * cosine - along_x * sine,
        induced_drag=along_x * cosine + along_z * sine,
        along_x=along_x,
        along_z=along_z,
    )


def trefftz_drag(
    lattice: Lattice,
    *,
    circulation: FloatArray,
    angle_of_attack: FloatArray,
    core_fraction: float = CORE_FRACTION,
) -> FloatArray:
    """Induced drag from the flow far downstream, over dynamic pressure.

    Parameters
    ----------
    lattice : Lattice
    circulation : ndarray, shape (..., n)
        g [m].
    angle_of_attack : ndarray, shape (...)
        Direction in which the wake trails [rad].
    core_fraction : float
        As for the influence of the same legs [-].

    Returns
    -------
    ndarray, shape (...)
        Both halves [m2].

    References
    ----------
    .. [1] M. M. Munk, The Minimum Induced Drag of Aerofoils, NACA Report 121, 1921.
    .. [2] J. Katz, A. Plotkin, Low-Speed Aerodynamics, 2nd ed., 2001, eq. (8.146) (number
       from memory).
    """
    inner_y, inner_z = _across_stream(lattice.inner, angle_of_attack)
    outer_y, outer_z = _across_stream(lattice.outer, angle_of_attack)
    point_y, point_z = _across_stream(lattice.point, angle_of_attack)
    length_y, length_z = outer_y - inner_y, outer_z - inner_z
    core = core_radius(lattice, core_fraction)
    total = np.zeros_like(point_y[..., :, None] * point_y[..., None, :])
    # Two-dimensional vortices: -1 at the inner, +1 at the outer end, mirrored at y = 0.
    for y, z, sign in ((inner_y, inner_z, -1.0), (outer_y, outer_z, 1.0)):
        for mirror in (1.0, -1.0):
            dy = point_y[..., :, None] - mirror * y[..., None, :]
            dz = point_z[..., :, None] - z[..., None, :]
            swirl = sign * mirror / (2.0 * np.pi * np.sqrt((dy**2 + dz**2) ** 2 + core**4))
            velocity_y, velocity_z = -swirl * dz, swirl * dy
            total += velocity_z * length_y[..., :, None] - velocity_y * length_z[..., :, None]
    flux = np.matmul(total, circulation[..., None])[..., 0]
    return np.asarray(-2.0 * np.sum(circulation * flux, axis=-1))


def _across_stream(
    position: FloatArray, angle_of_attack: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Coordinates to the right and across the stream of points (..., n, 3)."""
    cosine, sine = np.cos(angle_of_attack)[..., None], np.sin(angle_of_attack)[..., None]
    across = position[..., 2] * cosine - position[..., 0] * sine
    return np.broadcast_to(position[..., 1], across.shape), across


def pitching_moment(
    lattice: Lattice,
    forces: StationForces,
    *,
    drag: FloatArray,
    moment: FloatArray,
    angle_of_attack: FloatArray,
    about_x: float | FloatArray,
    about_z: float = 0.0,
) -> FloatArray:
    """Nose-up moment of every station about a point of the plane of symmetry.

    Parameters
    ----------
    lattice : Lattice
    forces : StationForces
    drag, moment : ndarray, shape (..., n)
        Section drag coefficient, and section moment about the quarter chord, on
        the streamwise chord [-].
    angle_of_attack : ndarray, shape (...)
        [rad]
    about_x : float or ndarray, shape (...)
    about_z : float
        The point [m].

    Returns
    -------
    ndarray, shape (..., n)
        Over dynamic pressure, both halves [m3]: lift, induced and profile drag at
        the quarter chord, and the section's own moment.
    """
    profile = 2.0 * drag * lattice.strip_area
    along_x = forces.along_x + profile * np.cos(angle_of_attack)[..., None]
    along_z = forces.along_z + profile * np.sin(angle_of_attack)[..., None]
    own = 2.0 * moment * lattice.chord * lattice.strip_area * lattice.normal[..., 2]
    arm_x = lattice.point[..., 0] - np.asarray(about_x)[..., None]
    arm_z = lattice.point[..., 2] - about_z
    return np.asarray(arm_z * along_x - arm_x * along_z + own)
