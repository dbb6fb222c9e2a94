"""What sweep changes in a surface's own downwash.

Weissinger's extended lifting line looks at the flow half a chord behind the
bound line, where a swept line's downwash is finite. The difference between the
swept surface and the same surface with its line straightened, taken there, is
added to Prandtl's downwash on the straightened line: without sweep nothing is
added, so the classical theory stays exact; with sweep the trend is Weissinger's.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.wing.lattice import Lattice

FloatArray = NDArray[np.float64]


def sweep_upwash(lattice: Lattice) -> FloatArray | float:
    """Change of upwash at each station that sweep causes, per unit circulation.

    Parameters
    ----------
    lattice : Lattice
        Batch shape (...).

    Returns
    -------
    ndarray, shape (..., n, n), or 0.0 where no surface is swept
        Angle per unit g, within each surface only [1/m].

    Notes
    -----
    The flow of the section itself is taken off: a straight infinite line of
    circulation g, swept by L, gives -g/(pi c cos L) half a streamwise chord behind
    it. What is left is the induced angle. Wake along the x axis.

    References
    ----------
    .. [1] J. Weissinger, The Lift Distribution of Swept-Back Wings, NACA TM 1120,
       1947 (translation), method of the extended lifting line.
    """
    if not np.any(np.diff(lattice.inner[..., 0], axis=-1) * _same_surface_steps(lattice)):
        return 0.0
    same = lattice.surface[:, None] == lattice.surface[None, :]
    swept = _downwash_behind(lattice, straightened=False)
    straight = _downwash_behind(lattice, straightened=True)
    change = np.asarray((swept - straight) * same)
    section = (1.0 / lattice.cos_sweep - 1.0) / (np.pi * lattice.chord)
    diagonal = np.arange(lattice.surface.size)
    change[..., diagonal, diagonal] += section
    return change


def _same_surface_steps(lattice: Lattice) -> NDArray[np.bool_]:
    return np.asarray(np.diff(lattice.surface) == 0)


def _downwash_behind(lattice: Lattice, *, straightened: bool) -> FloatArray:
    """Upwash half a chord behind the line, wake along x, both halves."""
    along = 0.0 if straightened else 1.0
    behind = 0.5 * lattice.chord
    total = np.zeros(np.broadcast_shapes(lattice.width.shape)[:-1] + (lattice.surface.size,) * 2)
    for mirror in (1.0, -1.0):
        dx_a, dy_a, dz_a = _from_end(lattice, lattice.inner, mirror, along, behind)
        dx_b, dy_b, dz_b = _from_end(lattice, lattice.outer, mirror, along, behind)
        length_a = np.sqrt(dx_a**2 + dy_a**2 + dz_a**2)
        length_b = np.sqrt(dx_b**2 + dy_b**2 + dz_b**2)
        dot = dx_a * dx_b + dy_a * dy_b + dz_a * dz_b
        product = length_a * length_b
        bound = (length_a + length_b) / (product * (product + dot))
        leg_a = (length_a + dx_a) / (length_a * (dy_a**2 + dz_a**2))
        leg_b = (length_b + dx_b) / (length_b * (dy_b**2 + dz_b**2))
        across = mirror * lattice.normal[..., 1][..., None]
        upward = lattice.normal[..., 2][..., None]
        velocity_y = -leg_b * dz_b + leg_a * dz_a + bound * (dz_a * dx_b - dx_a * dz_b)
        velocity_z = leg_b * dy_b - leg_a * dy_a + bound * (dx_a * dy_b - dy_a * dx_b)
        total += 0.25 / np.pi * (velocity_y * across + velocity_z * upward)
    return total


def _from_end(
    lattice: Lattice, end: FloatArray, mirror: float, along: float, behind: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    point = lattice.point
    dx = along * (point[..., :, None, 0] - end[..., None, :, 0]) + behind[..., :, None]
    dy = mirror * point[..., :, None, 1] - end[..., None, :, 1]
    dz = point[..., :, None, 2] - end[..., None, :, 2]
    return dx, dy, dz
