"""Drag and electric power in level flight, split into their causes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.aircraft.configuration import Aircraft
from solver.aircraft.load import Load
from solver.aircraft.trim import Trimmed, trim
from solver.errors import require_positive, require_within
from solver.section.packed import NOMINAL

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True)
class Drive:
    """Battery, motor and propeller as totals.

    Fields
    ------
    usable_energy : float
        Energy that may be taken from the battery [J], > 0.
    efficiency : float
        Thrust power over battery power [-], 0 to 1.
    avionics_power : float
        Drawn all the time [W], >= 0.
    peukert_exponent : float
        Of the battery [-], 1 to 1.4.
    """

    usable_energy: float
    efficiency: float
    avionics_power: float
    peukert_exponent: float

    def __post_init__(self) -> None:
        require_positive(usable_energy=self.usable_energy)
        require_within(0.01, 1.0, efficiency=self.efficiency)
        require_within(0.0, 1e6, avionics_power=self.avionics_power)
        require_within(1.0, 1.4, peukert_exponent=self.peukert_exponent)


@dataclass(frozen=True, eq=False)
class LevelFlight:
    """Trimmed flight over a batch of speeds, with its drag split; arrays (...).

    Fields
    ------
    trimmed, unloaded : Trimmed
        The flight, and the same lift with a tail that carries nothing.
    induced, profile, body, trim_induced, trim_profile : ndarray
        Drag [N]. The first two belong to the aircraft with the unloaded tail,
        the last two are what the tail's load adds.
    """

    trimmed: Trimmed
    unloaded: Trimmed
    induced: FloatArray
    profile: FloatArray
    body: FloatArray
    trim_induced: FloatArray
    trim_profile: FloatArray

    def case(self, index: int) -> LevelFlight:
        """One case of a batch along its first axis.

        Parameters
        ----------
        index : int

        Returns
        -------
        LevelFlight
        """
        return LevelFlight(
            trimmed=self.trimmed.case(index),
            unloaded=self.unloaded.case(index),
            induced=self.induced[index],
            profile=self.profile[index],
            body=self.body[index],
            trim_induced=self.trim_induced[index],
            trim_profile=self.trim_profile[index],
        )

    @property
    def drag(self) -> FloatArray:
        """Total [N]."""
        return np.asarray(
            self.induced + self.profile + self.body + self.trim_induced + self.trim_profile
        )

    @property
    def converged(self) -> BoolArray:
        """Where both solutions were found."""
        return np.asarray(self.trimmed.converged & self.unloaded.converged)


def level_flight(
    aircraft: Aircraft, load: Load, *, speed: ArrayLike, band: ArrayLike = NOMINAL
) -> LevelFlight:
    """Trim at given speeds and split the drag.

    Parameters
    ----------
    aircraft : Aircraft
    load : Load
    speed : array_like, shape (...)
        [m/s] > 0.
    band : array_like of int, shape (...)
        End of the polars' confidence band for each case.

    Returns
    -------
    LevelFlight

    Raises
    ------
    InputError
        If a speed is not finite and positive.

    Notes
    -----
    The drag of trim is the drag of the trimmed aircraft less that of the same
    aircraft at the same total lift with a tail that carries no load and has no
    deflection. Its induced part holds the wing's extra lift and the mutual terms.
    """
    require_positive(speed=float(np.min(speed)))
    trimmed = trim(aircraft, load, speed=speed, band=band)
    unloaded = trim(aircraft, load, speed=speed, band=band, unloaded_tail=True, start=trimmed)
    pressure = trimmed.dynamic_pressure
    return LevelFlight(
        trimmed=trimmed,
        unloaded=unloaded,
        induced=pressure * unloaded.induced_area,
        profile=pressure * unloaded.profile_area,
        body=pressure * aircraft.body.drag_area,
        trim_induced=pressure * (trimmed.induced_area - unloaded.induced_area),
        trim_profile=pressure * (trimmed.profile_area - unloaded.profile_area),
    )


def electric_power(drive: Drive, *, drag: FloatArray, speed: FloatArray) -> FloatArray:
    """Power drawn from the battery in level flight.

    Parameters
    ----------
    drive : Drive
    drag : ndarray, shape (...)
        [N]
    speed : ndarray, shape (...)
        [m/s]

    Returns
    -------
    ndarray, shape (...)
        [W]
    """
    return np.asarray(drag * speed / drive.efficiency + drive.avionics_power)


def endurance(drive: Drive, *, power: FloatArray) -> FloatArray:
    """Time until the usable energy is gone at a steady power.

    Parameters
    ----------
    drive : Drive
    power : ndarray, shape (...)
        Drawn from the battery [W].

    Returns
    -------
    ndarray, shape (...)
        [s]

    Notes
    -----
    Peukert's law as Traub [1]_ uses it, t = R (E / (P R))^n, with the battery
    rated over R = 1 h. Slower discharge than the rating is given no credit: the
    time never exceeds E/P.

    References
    ----------
    .. [1] L. W. Traub, Range and Endurance Estimates for Battery-Powered Aircraft,
       J. Aircraft 48(2), 2011, 703-707 (form from memory).
    """
    rating = 3600.0
    share = drive.usable_energy / (power * rating)
    return np.asarray(rating * np.minimum(share, share**drive.peukert_exponent))
