"""Stall speed in trim, and what is left above it at launch and landing."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.aircraft.configuration import WING, Aircraft
from solver.aircraft.load import Load
from solver.aircraft.trim import Trimmed, trim_at_knee
from solver.section.packed import NOMINAL
from solver.wing.stall import critical_share, stalling_range

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class StallOnset:
    """Trimmed flight in which the first wing station reaches its knee; arrays (...).

    The knee says where and when, the first peak how much: the stall speed belongs to
    the lift that the same loading carries when that station has its whole largest
    lift, a few per cent more than at the knee.

    Fields
    ------
    trimmed : Trimmed
        At the knee.
    share : ndarray
        Lift of that station over its largest [-], about 0.98.
    found : ndarray of bool
        Where the onset was met on a converged branch.
    start, end : ndarray
        Part of the half-span within a per cent of the knee's lift [-].
    """

    trimmed: Trimmed
    share: FloatArray
    found: BoolArray
    start: FloatArray
    end: FloatArray

    def case(self, index: int) -> StallOnset:
        """One case of a batch along its first axis.

        Parameters
        ----------
        index : int

        Returns
        -------
        StallOnset
        """
        return StallOnset(
            trimmed=self.trimmed.case(index),
            share=self.share[index],
            found=self.found[index],
            start=self.start[index],
            end=self.end[index],
        )

    @property
    def speed(self) -> FloatArray:
        """Stall speed [m/s]."""
        return np.asarray(self.trimmed.speed * np.sqrt(self.share))

    @property
    def lift_area(self) -> FloatArray:
        """Lift over dynamic pressure at the stall speed [m2]."""
        return np.asarray(self.trimmed.lift_area / self.share)


def stall_onset(aircraft: Aircraft, load: Load, *, band: ArrayLike = NOMINAL) -> StallOnset:
    """Find the trimmed flight in which the first station stalls.

    Parameters
    ----------
    aircraft : Aircraft
    load : Load
    band : array_like of int, shape (...)
        Ends of the polars' confidence band.

    Returns
    -------
    StallOnset

    Notes
    -----
    The elevator balances the moment and the speed is the one at which the lift
    carries the load, so that Reynolds numbers, and with them the sections' largest
    lift, belong to the stall speed itself.
    """
    flight = trim_at_knee(aircraft, load, band=band)
    low, high = stalling_range(flight.state, surface=WING)
    return StallOnset(
        trimmed=flight,
        share=critical_share(flight.state, surface=WING),
        found=flight.converged,
        start=low,
        end=high,
    )


@dataclass(frozen=True)
class SpeedMargins:
    """What is left at one speed above the stall.

    Fields
    ------
    ratio : float
        Speed over stall speed [-].
    speed_to_lose : float
        [m/s]
    lift : float
        Load factor that would stall it, less one [-].
    bank : float
        Bank in level flight that would stall it [rad]; zero below stall speed.
    gust : float
        Sharp-edged upward gust that would use up the angle left [m/s]. It ignores
        the lag of the lift behind the angle.
    """

    ratio: float
    speed_to_lose: float
    lift: float
    bank: float
    gust: float


def speed_margins(flight: Trimmed, onset: StallOnset) -> SpeedMargins:
    """Margins of one trimmed flight over the onset of stall.

    Parameters
    ----------
    flight, onset : Trimmed, StallOnset
        Single states of the same load.

    Returns
    -------
    SpeedMargins

    Notes
    -----
    Level turn: load factor 1/cos(bank), which stalls at (V/Vs)^2. The gust w
    raises the angle by w/V; the angle left is that between the two flights.
    """
    speed, stall = float(flight.speed), float(onset.speed)
    ratio = speed / stall
    load_factor = ratio**2
    return SpeedMargins(
        ratio=ratio,
        speed_to_lose=speed - stall,
        lift=load_factor - 1.0,
        bank=float(np.arccos(1.0 / load_factor)) if load_factor > 1.0 else 0.0,
        gust=speed * float(np.tan(onset.trimmed.angle - flight.angle)),
    )


def ratio_band(
    ratio: float, *, stall_speed_error: float, airspeed_error: float, speed: float
) -> float:
    """Half-width of V/Vs from independent errors of stall speed and airspeed.

    Parameters
    ----------
    ratio : float
        [-] > 0.
    stall_speed_error : float
        Change of stall speed over stall speed [-].
    airspeed_error : float
        Error of the airspeed shown [m/s].
    speed : float
        [m/s] > 0.

    Returns
    -------
    float
        Root of the sum of squares [-].
    """
    return ratio * float(np.hypot(stall_speed_error, airspeed_error / speed))
