"""Stall speed in trim, and what is left above it at launch and landing."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.aircraft.configuration import WING, Aircraft
from solver.aircraft.trim import WAKE_TOLERANCE, Load, Trimmed, trim
from solver.section.packed import NOMINAL
from solver.wing.stall import least_angle_room, stalling_range

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

CAREFUL_SHARE = 0.8
"""Share of the room left that the first step up the branch takes [-]. A section turns
by about A/(A + 2) of the wing's turn, so this stays short of every knee."""

OVERSHOOT = 1.15
"""Largest step up, over the room left, once the rate at which it shrinks is known [-]."""

SEARCH_WAKE = np.radians(2.0)
"""Angle by which the wake may lie off the stream while the onset is searched [rad];
the last steps lay it anew."""

ONSET_TOLERANCE = np.radians(0.01)
"""Angle left to the first knee at which the onset counts as found [rad]: 0.1 % in
stall speed."""

MOST_STEPS = 30


@dataclass(frozen=True, eq=False)
class StallOnset:
    """Trimmed flight in which the first wing station reaches its knee; arrays (...).

    Fields
    ------
    trimmed : Trimmed
        Its speed is the stall speed.
    found : ndarray of bool
        Where the onset was met on a converged branch.
    start, end : ndarray
        Part of the half-span within a per cent of the knee's lift [-].
    """

    trimmed: Trimmed
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
            self.trimmed.case(index), self.found[index], self.start[index], self.end[index]
        )

    @property
    def speed(self) -> FloatArray:
        """Stall speed [m/s]."""
        return self.trimmed.speed


def stall_onset(
    aircraft: Aircraft, load: Load, *, band: ArrayLike = NOMINAL, start: Trimmed | None = None
) -> StallOnset:
    """Follow trimmed flight to higher angles until the first station stalls.

    Parameters
    ----------
    aircraft : Aircraft
    load : Load
    band : array_like of int, shape (...)
        Ends of the polars' confidence band.
    start : Trimmed, optional
        Unstalled flight of the same load and shape to begin from.

    Returns
    -------
    StallOnset

    Notes
    -----
    At each angle the elevator balances the moment and the speed is the one at
    which the lift carries the load, so that Reynolds numbers, and with them the
    sections' largest lift, belong to the stall speed itself. Steps up the branch
    stay short of the knee, or go by the rate at which the room shrinks; once the
    onset is bracketed it is closed in by false position (Illinois form). Below the
    first knee the solution is the only one, so the path does not matter; nothing
    here goes further past it than a share of a step.
    """
    bands = np.asarray(band)
    current = start if start is not None else _unstalled(aircraft, load, bands)
    found, lost = np.zeros(bands.shape, dtype=np.bool_), np.zeros(bands.shape, dtype=np.bool_)
    for wake_tolerance in (SEARCH_WAKE, WAKE_TOLERANCE):
        current = trim(
            aircraft,
            load,
            angle=current.angle,
            band=bands,
            start=current,
            wake_tolerance=wake_tolerance,
        )
        gap = least_angle_room(current.state, surface=WING)
        bracket = _Bracket.one_end(current.angle, gap)
        found = current.converged & (np.abs(gap) < ONSET_TOLERANCE)
        lost = lost | ~current.converged
        for _ in range(MOST_STEPS):
            if np.all(found | lost):
                break
            angle = np.where(found | lost, current.angle, bracket.next_angle())
            current = trim(
                aircraft,
                load,
                angle=angle,
                band=bands,
                start=current,
                wake_tolerance=wake_tolerance,
            )
            gap = least_angle_room(current.state, surface=WING)
            lost = lost | (~current.converged & ~found)
            found = found | (current.converged & (np.abs(gap) < ONSET_TOLERANCE))
            bracket = bracket.narrowed(angle, gap)
    low, high = stalling_range(current.state, surface=WING)
    return StallOnset(trimmed=current, found=found & ~lost, start=low, end=high)


@dataclass(frozen=True, eq=False)
class _Bracket:
    """What is known of the room left over angle: the last two angles and a bracket.

    Fields
    ------
    low, low_gap, high, high_gap : ndarray
        Ends with room left and with none; NaN where not yet known [rad].
    last, last_gap, before, before_gap : ndarray
        The last angle tried and the one before [rad].
    """

    low: FloatArray
    low_gap: FloatArray
    high: FloatArray
    high_gap: FloatArray
    last: FloatArray
    last_gap: FloatArray
    before: FloatArray
    before_gap: FloatArray

    @classmethod
    def one_end(cls, angle: FloatArray, gap: FloatArray) -> _Bracket:
        """Only one angle has been tried."""
        none = np.full_like(angle, np.nan)
        below = gap >= 0.0
        return cls(
            np.where(below, angle, none),
            np.where(below, gap, none),
            np.where(below, none, angle),
            np.where(below, none, gap),
            angle,
            gap,
            none,
            none,
        )

    def next_angle(self) -> FloatArray:
        """Between the ends where both are known, else on by secant or a careful step."""
        with np.errstate(invalid="ignore", divide="ignore"):
            between = self.low + (self.high - self.low) * self.low_gap / (
                self.low_gap - self.high_gap
            )
            secant = -self.last_gap * (self.last - self.before) / (self.last_gap - self.before_gap)
        careful = CAREFUL_SHARE * self.last_gap
        sane = np.isfinite(secant) & (secant * self.last_gap > 0.0)
        bound = OVERSHOOT * np.abs(self.last_gap) + ONSET_TOLERANCE
        onward = self.last + np.where(sane, np.clip(secant, -bound, bound), careful)
        return np.where(np.isfinite(between), between, onward)

    def narrowed(self, angle: FloatArray, gap: FloatArray) -> _Bracket:
        """Replace one end; an end kept twice running counts half (Illinois)."""
        past = gap < 0.0
        twice = past == (self.last_gap < 0.0)
        keep = np.where(twice, 0.5, 1.0)
        return _Bracket(
            low=np.where(past, self.low, angle),
            low_gap=np.where(past, keep * self.low_gap, gap),
            high=np.where(past, angle, self.high),
            high_gap=np.where(past, gap, keep * self.high_gap),
            last=angle,
            last_gap=gap,
            before=self.last,
            before_gap=self.last_gap,
        )


def _unstalled(aircraft: Aircraft, load: Load, band: NDArray[np.int64]) -> Trimmed:
    """Trimmed flight at a lift coefficient far from any stall."""
    lift_coefficient = 0.5
    speed = np.sqrt(2.0 * load.force / (load.density * aircraft.area * lift_coefficient))
    return trim(aircraft, load, speed=np.full(band.shape, speed), band=band)


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
