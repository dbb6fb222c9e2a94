"""Nonlinear lifting line: section polars in, span loading out. Batch first.

The unknown at each station is its circulation divided by the free-stream speed,
g = Gamma/V [m]. A section gives 2 g = c cl(angle, Reynolds number), and the
angle depends on every g through the downwash; Newton solves the lot with the
exact Jacobian.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.section.packed import NOMINAL, SectionValues
from solver.wing.influence import Influence
from solver.wing.lattice import Lattice
from solver.wing.station_polars import StationPolars

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

LARGEST_ANGLE_STEP = np.radians(3.0)
"""Newton's step is shortened so that no station's angle moves further [rad]."""

TOLERANCE = 1e-10
"""Largest residual over the mean chord at which a solution counts as found [-]."""

MOST_ITERATIONS = 25


@dataclass(frozen=True, eq=False)
class Flow:
    """Everything about one batch of flow conditions except the circulations.

    Fields
    ------
    lattice : Lattice
    polars : StationPolars
    influence : Influence
    speed_over_viscosity : ndarray, shape (...)
        Free-stream speed over kinematic viscosity: Reynolds number per metre [1/m].
    shift : ndarray, shape (..., n)
        Added to the section angle, by a deflected flap [rad].
    active : ndarray of bool, shape (n,)
        Stations that carry lift; the others are held at none.
    band : ndarray of int, broadcasts with (..., n)
        End of the polars' confidence band.
    """

    lattice: Lattice
    polars: StationPolars
    influence: Influence
    speed_over_viscosity: FloatArray
    shift: FloatArray
    active: BoolArray
    band: ArrayLike = NOMINAL

    def case(self, index: int) -> Flow:
        """One case of a batch along its first axis, the lattice shared by all.

        Parameters
        ----------
        index : int

        Returns
        -------
        Flow
        """
        return replace(
            self,
            influence=self.influence.case(index),
            speed_over_viscosity=self.speed_over_viscosity[index],
            shift=self.shift[index],
            band=np.asarray(self.band)[index],
        )

    def reynolds(self) -> FloatArray:
        """Reynolds number of each section, in the plane across its quarter-chord line [-]."""
        return np.asarray(
            self.speed_over_viscosity[..., None]
            * self.lattice.chord
            * np.square(self.lattice.cos_sweep)
        )

    def section_angle(self, circulation: FloatArray, angle_of_attack: FloatArray) -> FloatArray:
        """Angle at which each section works, in the plane across its quarter-chord line.

        Parameters
        ----------
        circulation : ndarray, shape (..., n)
            g [m].
        angle_of_attack : ndarray, shape (...)
            [rad]

        Returns
        -------
        ndarray, shape (..., n)
            [rad]
        """
        influence = self.influence
        turned = (angle_of_attack - influence.wake_angle)[..., None]
        geometric = influence.onset + influence.onset_slope * turned + self.lattice.twist
        induced = np.matmul(influence.upwash, circulation[..., None])[..., 0]
        return np.asarray((geometric + induced) / self.lattice.cos_sweep + self.shift)


@dataclass(frozen=True, eq=False)
class Linearised:
    """The lifting-line equations about a guess of the circulations.

    Fields
    ------
    angle : ndarray, shape (..., n)
        At which each section works [rad].
    values : SectionValues
        Section coefficients, shape (..., n).
    residual : ndarray, shape (..., n)
        g - c cl / 2 [m].
    jacobian : ndarray, shape (..., n, n)
        Derivative with g [-].
    by_angle : ndarray, shape (..., n)
        Derivative with the angle of attack [m].
    by_shift : ndarray, shape (..., n)
        Derivative with each station's own shift [m].
    """

    angle: FloatArray
    values: SectionValues
    residual: FloatArray
    jacobian: FloatArray
    by_angle: FloatArray
    by_shift: FloatArray


def linearise(flow: Flow, circulation: FloatArray, angle_of_attack: FloatArray) -> Linearised:
    """Residual and exact Jacobian of the lifting-line equations.

    Parameters
    ----------
    flow : Flow
    circulation : ndarray, shape (..., n)
        g [m].
    angle_of_attack : ndarray, shape (...)
        [rad]

    Returns
    -------
    Linearised

    Notes
    -----
    With the sweep angle L of the quarter-chord line, simple sweep theory (the
    section lives in the plane across that line, R. T. Jones, NACA Report 863,
    1945) gives g = (c/2) cos^2 L cl(a / cos L).
    """
    lattice = flow.lattice
    angle = flow.section_angle(circulation, angle_of_attack)
    values = flow.polars.evaluate(angle, flow.reynolds(), band=flow.band)
    scale = 0.5 * lattice.chord * np.square(lattice.cos_sweep) * flow.active
    residual = circulation - scale * values.lift
    by_shift = -scale * values.lift_slope
    by_angle = by_shift / lattice.cos_sweep
    jacobian = by_angle[..., :, None] * flow.influence.upwash
    diagonal = np.arange(circulation.shape[-1])
    jacobian[..., diagonal, diagonal] += 1.0
    return Linearised(
        angle=angle,
        values=values,
        residual=residual,
        jacobian=jacobian,
        by_angle=by_angle * flow.influence.onset_slope,
        by_shift=by_shift,
    )


@dataclass(frozen=True, eq=False)
class Loading:
    """A solved span loading; arrays (..., n) unless said otherwise.

    Fields
    ------
    flow : Flow
    angle_of_attack : ndarray, shape (...)
        [rad]
    circulation : ndarray
        g [m].
    section_angle : ndarray
        [rad]
    lift, drag, moment : ndarray
        Section coefficients in the streamwise plane, on the streamwise chord [-].
    converged : ndarray of bool, shape (...)
    """

    flow: Flow
    angle_of_attack: FloatArray
    circulation: FloatArray
    section_angle: FloatArray
    lift: FloatArray
    drag: FloatArray
    moment: FloatArray
    converged: BoolArray

    def case(self, index: int) -> Loading:
        """One case of a batch along its first axis.

        Parameters
        ----------
        index : int

        Returns
        -------
        Loading
        """
        arrays = {
            name: getattr(self, name)[index] for name in self.__dataclass_fields__ if name != "flow"
        }
        return Loading(flow=self.flow.case(index), **arrays)


def loading(
    flow: Flow, circulation: FloatArray, angle_of_attack: FloatArray, *, converged: BoolArray
) -> Loading:
    """Gather the sections' coefficients at a solution.

    Parameters
    ----------
    flow : Flow
    circulation : ndarray, shape (..., n)
        g [m].
    angle_of_attack : ndarray, shape (...)
        [rad]
    converged : ndarray of bool, shape (...)

    Returns
    -------
    Loading
    """
    angle = flow.section_angle(circulation, angle_of_attack)
    values = flow.polars.evaluate(angle, flow.reynolds(), band=flow.band)
    cos_sweep = flow.lattice.cos_sweep
    return Loading(
        flow=flow,
        angle_of_attack=angle_of_attack,
        circulation=circulation,
        section_angle=angle,
        lift=2.0 * circulation / flow.lattice.chord,
        # Friction acts along the stream over the whole wetted area, so cd keeps its size.
        drag=values.drag,
        moment=values.moment * cos_sweep**4,
        converged=converged,
    )


def shortened_step(angle_change: FloatArray) -> FloatArray:
    """Share of a Newton step that keeps every station's angle change in bounds.

    Parameters
    ----------
    angle_change : ndarray, shape (..., n)
        Change of section angle that the whole step would make [rad].

    Returns
    -------
    ndarray, shape (...)
        Between 0 and 1 [-].
    """
    largest = np.max(np.abs(angle_change), axis=-1)
    return np.asarray(np.minimum(1.0, LARGEST_ANGLE_STEP / np.maximum(largest, 1e-300)))


def solve(flow: Flow, angle_of_attack: ArrayLike, *, start: FloatArray | None = None) -> Loading:
    """Span loading at a given angle of attack, wake along the influence's wake angle.

    Parameters
    ----------
    flow : Flow
    angle_of_attack : array_like, shape (...)
        [rad]
    start : ndarray, shape (..., n), optional
        First guess of g [m]; none means no circulation. Past stall the equations
        have several solutions: start from a neighbouring lower angle.

    Returns
    -------
    Loading
        With a mask of the cases that converged.

    References
    ----------
    .. [1] W. F. Phillips, D. O. Snyder, J. Aircraft 37(4), 2000, 662-670.
    """
    batch = np.broadcast_shapes(
        np.shape(angle_of_attack),
        flow.influence.upwash.shape[:-2],
        flow.speed_over_viscosity.shape,
        np.shape(flow.band)[:-1],
        flow.lattice.width.shape[:-1],
        flow.shift.shape[:-1],
    )
    angle = np.broadcast_to(np.asarray(angle_of_attack, dtype=np.float64), batch)
    count = flow.lattice.surface.size
    circulation = np.zeros((*batch, count)) if start is None else np.array(start, dtype=np.float64)
    circulation = np.array(np.broadcast_to(circulation, (*batch, count)))
    mean_chord = np.mean(flow.lattice.chord, axis=-1)
    converged = np.zeros(batch, dtype=np.bool_)
    for _ in range(MOST_ITERATIONS):
        equations = linearise(flow, circulation, angle)
        size = np.max(np.abs(equations.residual), axis=-1)
        converged = size < TOLERANCE * mean_chord
        if np.all(converged):
            break
        change = -np.linalg.solve(equations.jacobian, equations.residual[..., None])[..., 0]
        turned = np.matmul(flow.influence.upwash, change[..., None])[..., 0]
        share = shortened_step(turned / flow.lattice.cos_sweep)
        circulation = circulation + share[..., None] * change
    return loading(flow, circulation, angle, converged=converged)
