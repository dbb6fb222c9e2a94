"""What the section solver is asked, and what it answers."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError, require_within

FloatArray = NDArray[np.float64]
StatusArray = NDArray[np.uint8]

FEWEST_NODES, MOST_NODES = 101, 201
LEAST_CRITICAL, MOST_CRITICAL = 1.0, 20.0
MACK_LEVEL, MACK_SLOPE = -8.43, 2.4
"""Of Mack's relation; recalled, not read."""
LEAST_TURBULENCE, MOST_TURBULENCE = 0.0002, 0.0196
"""Where the factor of Mack's relation goes from 12 down to 1. In rougher air the layers turn
turbulent without waves that could be followed: force transition there."""


@dataclass(frozen=True)
class FlowSettings:
    """How quiet the air is, where transition is forced, and how fine the panels are.

    Fields
    ------
    critical_amplification : float
        Factor n of e^n at which the flow turns turbulent, 1 to 20. [-]
    trip_upper, trip_lower : float or None
        Place of forced transition on a side as a share of chord, 0 to 1; None leaves
        it natural. The flow may turn ahead of it. [-]
    nodes : int
        Of the panels, odd, 101 to 201.

    Raises
    ------
    InputError
        Naming the field that is out of its range.
    """

    critical_amplification: float = 9.0
    trip_upper: float | None = None
    trip_lower: float | None = None
    nodes: int = 141

    def __post_init__(self) -> None:
        require_within(
            LEAST_CRITICAL, MOST_CRITICAL, critical_amplification=self.critical_amplification
        )
        for name in ("trip_upper", "trip_lower"):
            if (place := getattr(self, name)) is not None:
                require_within(0.0, 1.0, **{name: place})
        if self.nodes % 2 == 0 or not FEWEST_NODES <= self.nodes <= MOST_NODES:
            raise InputError(
                "nodes", self.nodes, f"odd and between {FEWEST_NODES} and {MOST_NODES}"
            )


def critical_amplification(turbulence: float) -> float:
    """Amplification factor at transition for a turbulence level.

    Parameters
    ----------
    turbulence : float
        Root mean square of the free stream's fluctuations over its speed, 0.0002 to
        0.0196. [-]

    Returns
    -------
    float
        -8.43 - 2.4 ln(turbulence). [-]

    Raises
    ------
    InputError
        If `turbulence` is out of range.

    References
    ----------
    .. [1] L. M. Mack, Transition and laminar instability, JPL Publication 77-15, 1977.
    """
    require_within(LEAST_TURBULENCE, MOST_TURBULENCE, turbulence=turbulence)
    return MACK_LEVEL - MACK_SLOPE * math.log(turbulence)


def turbulence_level(critical: float) -> float:
    """Turbulence level that goes with an amplification factor: Mack's relation turned round.

    Parameters
    ----------
    critical : float
        Amplification factor at transition, 1 to 20. [-]

    Returns
    -------
    float
        exp(-(critical + 8.43)/2.4), below the range of :func:`critical_amplification`
        where the factor is above 12. [-]

    Raises
    ------
    InputError
        If `critical` is out of range.
    """
    require_within(LEAST_CRITICAL, MOST_CRITICAL, critical=critical)
    return math.exp((MACK_LEVEL - critical) / MACK_SLOPE)


class PointStatus(IntEnum):
    """How a point ended."""

    CONVERGED = 0
    APPROXIMATE = 1
    """Nearly: the last change of the layers was below 0.3 %."""
    MISSING = 2
    """Not found; there is no value."""
    BEYOND_STALL = 3
    """Converged, past the first attached peak of lift on either side."""


@dataclass(frozen=True, eq=False)
class FlowColumn:
    """A section at one Reynolds number. Arrays are read-only.

    Fields
    ------
    reynolds : float
        [-]
    angle : numpy.ndarray, shape (na,)
        Ascending. [rad]
    lift, drag, moment : numpy.ndarray, shape (na,)
        Coefficients; moment about the quarter chord, nose up positive. NaN where the
        point is missing. [-]
    transition_upper, transition_lower : numpy.ndarray, shape (na,)
        Where the flow turns turbulent; NaN where it does not. [-]
    separation_upper, separation_lower : numpy.ndarray, shape (na,)
        Where the flow at the wall first runs backwards; NaN where it does not. [-]
    reattachment_upper, reattachment_lower : numpy.ndarray, shape (na,)
        Where it first runs forwards again; NaN where it does not. [-]
    status : numpy.ndarray of uint8, shape (na,)
        :class:`PointStatus` codes.
    largest_lift : float
        First attached peak; NaN where no fall behind it was found, or a point beside
        it is missing. [-]
    iterations : int
        Dense systems that were solved.
    """

    reynolds: float
    angle: FloatArray
    lift: FloatArray
    drag: FloatArray
    moment: FloatArray
    transition_upper: FloatArray
    transition_lower: FloatArray
    separation_upper: FloatArray
    separation_lower: FloatArray
    reattachment_upper: FloatArray
    reattachment_lower: FloatArray
    status: StatusArray
    largest_lift: float
    iterations: int


@dataclass(frozen=True, eq=False)
class SectionFlow:
    """A section over angle and Reynolds number. Arrays are read-only.

    Fields
    ------
    name : str
        Of the section.
    settings : FlowSettings
    angle : numpy.ndarray, shape (na,)
        Ascending. [rad]
    reynolds : numpy.ndarray, shape (nr,)
        Ascending. [-]
    lift, drag, moment : numpy.ndarray, shape (na, nr)
        Coefficients; moment about the quarter chord, nose up positive. NaN where the
        point is missing. [-]
    transition_upper, transition_lower : numpy.ndarray, shape (na, nr)
        Where the flow turns turbulent; NaN where it does not. [-]
    separation_upper, separation_lower : numpy.ndarray, shape (na, nr)
        Where the flow at the wall first runs backwards; NaN where it does not. [-]
    reattachment_upper, reattachment_lower : numpy.ndarray, shape (na, nr)
        Where it first runs forwards again; NaN where it does not. [-]
    status : numpy.ndarray of uint8, shape (na, nr)
        :class:`PointStatus` codes.
    largest_lift : numpy.ndarray, shape (nr,)
        First attached peak; NaN where no fall behind it was found, or a point beside
        it is missing. [-]
    iterations : int
        Dense systems that were solved.
    """

    name: str
    settings: FlowSettings
    angle: FloatArray
    reynolds: FloatArray
    lift: FloatArray
    drag: FloatArray
    moment: FloatArray
    transition_upper: FloatArray
    transition_lower: FloatArray
    separation_upper: FloatArray
    separation_lower: FloatArray
    reattachment_upper: FloatArray
    reattachment_lower: FloatArray
    status: StatusArray
    largest_lift: FloatArray
    iterations: int


@dataclass(frozen=True, eq=False)
class Distributions:
    """Layers and pressures of one point, station by station. Arrays are read-only.

    Fields
    ------
    angle, reynolds : float
        [rad], [-]
    status : PointStatus
        Where it is missing every array is NaN, save places.
    x, y, arc : numpy.ndarray, shape (n + w,)
        Once round the section from the trailing edge over the upper side and back,
        n nodes, then down the wake, w nodes; arc is the length on the way. [-]
    body : int
        n.
    stagnation : int
        Last node of the upper side; -1 where the point is missing.
    pressure : numpy.ndarray, shape (n + w,)
        Coefficient at the wall; in the wake that of the speed. [-]
    speed : numpy.ndarray, shape (n + w,)
        At the edge of the layers, over that of the free stream, positive downstream. [-]
    theta, dstar : numpy.ndarray, shape (n + w,)
        Momentum and displacement thickness over chord. [-]
    H : numpy.ndarray, shape (n + w,)
        dstar/theta. [-]
    friction : numpy.ndarray, shape (n + w,)
        Wall shear over the dynamic pressure of the free stream, positive downstream;
        0 in the wake. [-]
    amplification : numpy.ndarray, shape (n + w,)
        n of e^n in laminar flow; NaN behind transition. [-]
    """

    angle: float
    reynolds: float
    status: PointStatus
    x: FloatArray
    y: FloatArray
    arc: FloatArray
    body: int
    stagnation: int
    pressure: FloatArray
    speed: FloatArray
    theta: FloatArray
    dstar: FloatArray
    H: FloatArray
    friction: FloatArray
    amplification: FloatArray
