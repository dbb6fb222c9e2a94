"""Reading the table behind a report's sliders, as the report's own script does.

Cubics through four neighbours, along speed over viscosity and the share of the
lift coefficient at which stall begins, or along the weight for the stall itself.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.analysis.aircraft_stage import GRAVITY
from solver.section.packed import NOMINAL

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Reach:
    """Ends of the three sliders: mass [kg], true airspeed [m/s], altitude [m]."""

    mass: tuple[float, float]
    speed: tuple[float, float]
    altitude: tuple[float, float]


@dataclass(frozen=True, eq=False)
class Axis:
    """An even axis of a table: its two ends and how many points lie on it."""

    first: float
    last: float
    count: int

    @property
    def points(self) -> FloatArray:
        """The points, shape (count,)."""
        return np.linspace(self.first, self.last, self.count)

    def weights(self, place: ArrayLike) -> tuple[NDArray[np.int64], FloatArray]:
        """Where to read and with which weights: a cubic through four neighbours.

        Parameters
        ----------
        place : array_like, shape (...)
            On the axis; outside its ends the last cubic goes on.

        Returns
        -------
        first : ndarray of int, shape (...)
            The first of the four.
        weights : ndarray, shape (..., 4)
            They add up to one.
        """
        at = (np.asarray(place) - self.first) / (self.last - self.first) * (self.count - 1)
        cell = np.clip(np.floor(np.nan_to_num(at)), 1, self.count - 3).astype(np.int64)
        x = at - cell
        below, above, far = x + 1.0, x - 1.0, x - 2.0
        weights = np.stack(
            [-x * above * far / 6, below * above * far / 2, -below * x * far / 2,
             below * x * above / 6], axis=-1
        )  # fmt: skip
        return cell - 1, weights

    def read(self, values: FloatArray, place: ArrayLike) -> FloatArray:
        """Interpolate along the last axis of `values`.

        Parameters
        ----------
        values : ndarray, shape (m, count) or (count,)
        place : array_like, shape (...)

        Returns
        -------
        ndarray, shape (m, ...) or (...)
        """
        first, weights = self.weights(place)
        near = values[..., first[..., None] + np.arange(4)]
        return np.asarray(np.sum(near * weights, axis=-1))


@dataclass(frozen=True, eq=False)
class FlightTable:
    """What a wing does over lift coefficient and speed over viscosity.

    Fields
    ------
    reach : Reach
    area : float
        Wing area [m2].
    body : float
        Drag coefficient of the body on that area [-].
    share : Axis
        Lift coefficient over `knee` [-].
    log_speed : Axis
        Natural logarithm of speed over viscosity [1/m].
    log_weight : Axis
        Natural logarithm of weight over density and viscosity squared [-].
    knee : ndarray, shape (SPEEDS,)
        Lift coefficient at which stall begins at the balance point [-].
    columns : ndarray, shape (5, SHARES, SPEEDS)
        As `COLUMNS` names them.
    lift : ndarray, shape (stations, SHARES, SPEEDS)
        Local lift coefficient along the half-wing, root to tip [-].
    limit : ndarray, shape (3, stations, SPEEDS)
        Largest local lift: low, nominal and high [-].
    stall : ndarray, shape (3, STALLS)
        Logarithm of stall speed over viscosity at the forward balance point, with
        low, nominal and high largest lift.
    trust : ndarray, shape (SHARES, SPEEDS)
        Codes of :class:`app.analysis.results.Trust`.
    y_m : ndarray, shape (stations,)
        Places along the half-wing [m].
    altitude : Axis
        [m]
    density, viscosity : ndarray, shape (ALTITUDES,)
        Of the air there, at the scenario's temperature offset [kg/m3], [m2/s].
    """

    reach: Reach
    area: float
    body: float
    share: Axis
    log_speed: Axis
    log_weight: Axis
    knee: FloatArray
    columns: FloatArray
    lift: FloatArray
    limit: FloatArray
    stall: FloatArray
    trust: NDArray[np.uint8]
    y_m: FloatArray
    altitude: Axis
    density: FloatArray
    viscosity: FloatArray

    def at(self, *, speed: ArrayLike, mass: ArrayLike, altitude: ArrayLike) -> TableReading:
        """Read the table as the report does.

        Parameters
        ----------
        speed, mass, altitude : array_like, shape (...)
            [m/s], [kg], [m]

        Returns
        -------
        TableReading
        """
        density = self.altitude.read(self.density, altitude)
        viscosity = self.altitude.read(self.viscosity, altitude)
        weight = np.asarray(mass) * GRAVITY
        pressure = 0.5 * density * np.square(speed)
        place = np.log(np.asarray(speed) / viscosity)
        share = weight / (pressure * self.area) / _straight(self.log_speed, self.knee, place)
        columns = self._read(self.columns, share, place)
        stall = self.log_weight.read(self.stall, np.log(weight / (density * viscosity**2)))
        return TableReading(
            share=share,
            drag=pressure * self.area * (np.sum(columns[:4], axis=0) + self.body),
            parts=pressure * self.area * columns[:4],
            elevator_deg=columns[4],
            lift=self._read(self.lift, share, place),
            limit=self.log_speed.read(self.limit[NOMINAL], place),
            stall_speed=np.exp(stall) * viscosity,
            lift_to_drag=weight / (pressure * self.area * (columns[:4].sum(axis=0) + self.body)),
        )

    def _read(self, values: FloatArray, share: FloatArray, place: FloatArray) -> FloatArray:
        row, across = self.share.weights(share)
        column, along = self.log_speed.weights(place)
        steps = np.arange(4)
        near = values[..., row[..., None, None] + steps[:, None], column[..., None, None] + steps]
        return np.asarray(np.einsum("k...ij,...i,...j->k...", near, across, along))


@dataclass(frozen=True, eq=False)
class TableReading:
    """What the table says of some flights; arrays (...), or (m, ...) where said.

    Fields
    ------
    share : ndarray
        Lift coefficient over that at which stall begins: above one there is no
        level flight [-].
    drag : ndarray
        [N]
    parts : ndarray, shape (4, ...)
        Induced, profile, and what the tail's load adds to each [N].
    elevator_deg : ndarray
    lift, limit : ndarray, shape (stations, ...)
        Local lift and its nominal limit [-].
    stall_speed : ndarray, shape (3, ...)
        With low, nominal and high largest lift [m/s].
    lift_to_drag : ndarray
    """

    share: FloatArray
    drag: FloatArray
    parts: FloatArray
    elevator_deg: FloatArray
    lift: FloatArray
    limit: FloatArray
    stall_speed: FloatArray
    lift_to_drag: FloatArray


def _straight(axis: Axis, values: FloatArray, place: FloatArray) -> FloatArray:
    """Interpolate by straight lines: what merely scales needs no more."""
    return np.interp(place, axis.points, values)
