"""The aircraft as the trim sees it: wing, tail, body and elevator.

Axes as in :mod:`solver.wing.planform`: x downstream from the leading edge of the
wing root, z up.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError, require_positive
from solver.section.packed import PackedPolars
from solver.section.thin_airfoil import flap_effectiveness
from solver.wing.lattice import Lattice, lattice
from solver.wing.planform import TaperedSurface
from solver.wing.station_polars import StationPolars

FloatArray = NDArray[np.float64]

WING, TAIL = 0, 1
"""Index of each surface in the lattice."""

WING_STATIONS = 40
TAIL_STATIONS = 16


@dataclass(frozen=True)
class Body:
    """A fuselage: its drag area, and its size where given.

    Fields
    ------
    drag_area : float
        Drag over dynamic pressure [m2], >= 0.
    length, width : float
        Zero where not given: its moment is then left out [m].
    """

    drag_area: float
    length: float = 0.0
    width: float = 0.0

    @property
    def known(self) -> bool:
        """Whether its moment can be estimated."""
        return self.length > 0.0 and self.width > 0.0


def body_moment_slope(body: Body) -> float:
    """Nose-up moment of a bare body per radian, over dynamic pressure.

    Parameters
    ----------
    body : Body

    Returns
    -------
    float
        [m3/rad]; zero where the body's size is not given.

    Raises
    ------
    InputError
        If the body is given but not longer than wide.

    Notes
    -----
    Munk's moment of a slender body, 2 (k2 - k1) times its volume [1]_, for the
    spheroid of the same length and width; the apparent masses k1 along and k2
    across are Lamb's closed forms [2]_. The wing's upwash ahead of it and downwash
    behind it are left out.

    References
    ----------
    .. [1] M. M. Munk, The Aerodynamic Forces on Airship Hulls, NACA Report 184, 1924.
    .. [2] H. Lamb, Hydrodynamics, 6th ed., 1932, sec. 114, eq. (6)-(9) (numbers from
       memory; checked against the integrals by quadrature).
    """
    if not body.known:
        return 0.0
    if body.length <= body.width:
        raise InputError("body_length", body.length, f"more than its width {body.width:g} m")
    eccentricity = np.sqrt(1.0 - (body.width / body.length) ** 2)
    logarithm = np.log((1.0 + eccentricity) / (1.0 - eccentricity))
    factor = (1.0 - eccentricity**2) / eccentricity**3
    along = 2.0 * factor * (0.5 * logarithm - eccentricity)
    across = 1.0 / eccentricity**2 - 0.5 * factor * logarithm
    along_mass, across_mass = along / (2.0 - along), across / (2.0 - across)
    volume = np.pi / 6.0 * body.length * body.width**2
    return float(2.0 * (across_mass - along_mass) * volume)


@dataclass(frozen=True)
class Elevator:
    """A plain flap along the whole tail.

    Fields
    ------
    chord_fraction : float
        Flap chord over tail chord [-], 0 to 1.
    travel : float
        Largest deflection either way [rad].
    effectiveness : float
        What is left of the ideal flap after viscosity and the hinge gap [-], 0 to 1.
    """

    chord_fraction: float
    travel: float
    effectiveness: float


@dataclass(frozen=True, eq=False)
class Aircraft:
    """Wing and tail on one lattice, with everything that acts beside them.

    Fields
    ------
    wing, tail : TaperedSurface
    body : Body
    elevator : Elevator
    lattice : Lattice
    polars : StationPolars
    angle_per_elevator, moment_per_elevator : ndarray, shape (n,)
        Change of section angle [-] and of section moment [1/rad] per radian of
        elevator, trailing edge down positive.
    thrust_height : float
        Thrust line above the balance point [m].
    """

    wing: TaperedSurface
    tail: TaperedSurface
    body: Body
    elevator: Elevator
    lattice: Lattice
    polars: StationPolars
    angle_per_elevator: FloatArray
    moment_per_elevator: FloatArray
    thrust_height: float

    @property
    def area(self) -> float:
        """Wing area, the reference of every coefficient [m2]."""
        return float(self.wing.area)

    @property
    def chord(self) -> float:
        """Mean aerodynamic chord of the wing [m]."""
        return float(self.wing.mean_aerodynamic_chord)

    def position(self, share: float) -> float:
        """X of a point at a share of the mean aerodynamic chord.

        Parameters
        ----------
        share : float
            From its leading edge, positive aft [-].

        Returns
        -------
        float
            [m]
        """
        return float(self.wing.mean_leading_edge) + share * self.chord

    @property
    def everywhere(self) -> NDArray[np.bool_]:
        """Mask of all stations, shape (n,)."""
        return np.ones(self.lattice.surface.shape, dtype=np.bool_)

    @property
    def on_wing(self) -> NDArray[np.bool_]:
        """Mask of the wing's stations, shape (n,)."""
        return np.asarray(self.lattice.surface == WING)


def assemble(
    wing: TaperedSurface,
    tail: TaperedSurface,
    *,
    polars: PackedPolars,
    body: Body,
    elevator: Elevator,
    thrust_height: float = 0.0,
    stations: tuple[int, int] = (WING_STATIONS, TAIL_STATIONS),
) -> Aircraft:
    """Put wing, tail, body and sections together.

    Parameters
    ----------
    wing, tail : TaperedSurface
    polars : PackedPolars
        Three sections: wing root, wing tip, tail. Between root and tip the wing's
        coefficients are blended linearly along the span.
    body : Body
    elevator : Elevator
    thrust_height : float
        Thrust line above the balance point [m].
    stations : tuple of int
        Stations across wing and tail.

    Returns
    -------
    Aircraft

    Raises
    ------
    InputError
        If there are not three sections, or the elevator is out of range.
    """
    if len(polars.names) != 3:
        raise InputError("polars", polars.names, "the sections of wing root, wing tip and tail")
    require_positive(travel=elevator.travel, effectiveness=elevator.effectiveness)
    grid = lattice(wing, tail, stations=stations)
    on_wing = grid.surface == WING
    # Equal sections need no blend, which halves the work.
    blend = grid.fraction if polars.names[0] != polars.names[1] else np.zeros(grid.surface.size)
    flap = flap_effectiveness(elevator.chord_fraction)
    return Aircraft(
        wing=wing,
        tail=tail,
        body=body,
        elevator=elevator,
        lattice=grid,
        polars=StationPolars(
            packed=polars,
            first=np.where(on_wing, 0, 2).astype(np.int64),
            second=np.where(on_wing, 1, 2).astype(np.int64),
            weight=np.where(on_wing, blend, 0.0),
        ),
        angle_per_elevator=np.where(on_wing, 0.0, elevator.effectiveness * flap.angle_shift),
        moment_per_elevator=np.where(on_wing, 0.0, elevator.effectiveness * flap.moment_slope),
        thrust_height=thrust_height,
    )
