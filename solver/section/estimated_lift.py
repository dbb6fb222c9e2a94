"""Lift of a section that was never measured: rules of thin-airfoil theory and of the nose.

Every constant here was fitted once to the lift tables of twelve sections together
(UIUC, Summary of Low-Speed Airfoil Data, vols. 1-3, and NREL/SR-500-34515, Reynolds
numbers 40,000 to 500,000), none to one section.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.section.stalled_flow import plate_lift

FloatArray = NDArray[np.float64]

REFERENCE_REYNOLDS = 1e5
SLOPE_SHARE, SLOPE_EXPONENT = 0.88, 0.03
"""Lift slope over that of an ideal flow at the reference Reynolds number [-], and how the
share grows with Reynolds number; fitted."""
THICKNESS_GAIN = 0.77
"""Of the lift slope with thickness ratio, in an ideal flow [-]."""
CAMBER_LOSS_ANGLE = np.radians(17.4)
"""Zero-lift angle of theory at which real flow reaches half of it [rad]; fitted."""
DIP_DEPTH, DIP_WIDTH = 0.29, 0.48
"""Share of lift lost, at and below DIP_FULL, around the ideal lift, and how far away along
the lift it reaches [-]; fitted."""
DIP_FULL, DIP_GONE = 6e4, 1.5e5
"""Reynolds numbers at which that loss is whole, and gone [-]."""
ROUNDING = 0.40
"""By how much the lift falls short of its straight line at the peak [-]; the median of
the measured runs."""
HALF_STALLED = 0.80
"""Lift missing from the straight line at which half the flow counts as stalled [-]: a third
is at the peak, which gives sections there the drag of 0.04 to 0.06 that is measured."""
STALL_LENGTH = np.radians(12.0)
"""From the peak to the lift of a stalled plate [rad]; our choice, no source."""
BURST_SHARE, BURST_SPREAD = 0.6, 0.15
"""Largest lift over that of the rule where the laminar bubble bursts, and how far it varies
either way [-]: measured 0.53 to 0.78 on the three sections that do so."""
BURST_LIFT = (0.55, 0.75)
"""Ideal lifts between which a section begins to do so [-]: the nine tested sections up to
0.51 did not at any Reynolds number from 40,000, the three from 0.77 did."""
BURST_LAST = 1e5
"""Last Reynolds number taken as burst [-]: the changes were measured between 61,000 and
147,000, at another place for each section."""


@dataclass(frozen=True, eq=False)
class SectionShape:
    """What the rules take of a section; numbers, or arrays that broadcast.

    Fields
    ------
    thickness, nose_radius : array_like
        Over chord [-].
    zero_lift_angle : array_like
        Of thin-airfoil theory [rad].
    ideal_lift : array_like
        Lift at which the flow meets the leading edge without going round it [-].
    moment : array_like
        Of thin-airfoil theory, about the quarter chord [-].
    """

    thickness: ArrayLike
    nose_radius: ArrayLike
    zero_lift_angle: ArrayLike
    ideal_lift: ArrayLike
    moment: ArrayLike = 0.0

    def inverted(self) -> SectionShape:
        """Return the section upside down: its largest lift is this one's least."""
        return SectionShape(
            self.thickness,
            self.nose_radius,
            -np.asarray(self.zero_lift_angle),
            -np.asarray(self.ideal_lift),
            -np.asarray(self.moment),
        )


@dataclass(frozen=True)
class StallRule:
    """Constants of the largest-lift rule, the same for every section.

    Fields
    ------
    pressure_difference : float
        Largest difference between the pressure coefficients at the nose peak and at the
        trailing edge, less that of undisturbed flow, at the reference Reynolds number [-].
    exponent : float
        How it grows with Reynolds number [-].
    bubble_radius : float
        What a laminar bubble adds to the radius of the nose, over chord [-].
    """

    pressure_difference: float = 3.12
    exponent: float = 0.019
    bubble_radius: float = 0.023


STALL_RULE = StallRule()


def smooth_step(value: ArrayLike, start: float, end: float) -> FloatArray:
    """Rise from 0 at `start` to 1 at `end`, level at both, as a cubic.

    Parameters
    ----------
    value : array_like, shape (...)
        In the unit of the ends.
    start, end : float
        start < end.

    Returns
    -------
    numpy.ndarray, shape (...)
        [-]
    """
    share = np.clip((np.asarray(value, dtype=np.float64) - start) / (end - start), 0.0, 1.0)
    return np.asarray(share * share * (3.0 - 2.0 * share))


def camber_share(shape: SectionShape) -> FloatArray:
    """Find what is left of the camber's effect in real flow.

    Parameters
    ----------
    shape : SectionShape
        Any shape (...).

    Returns
    -------
    numpy.ndarray, shape (...)
        On zero-lift angle and moment [-].
    """
    ratio = np.asarray(shape.zero_lift_angle, dtype=np.float64) / CAMBER_LOSS_ANGLE
    return np.asarray(1.0 / (1.0 + ratio * ratio))


def lift_slope(shape: SectionShape, reynolds: ArrayLike) -> FloatArray:
    r"""Lift slope between the stalls.

    Parameters
    ----------
    shape : SectionShape
        Any shape that broadcasts with `reynolds`.
    reynolds : array_like
        [-] > 0.

    Returns
    -------
    numpy.ndarray
        [1/rad]

    Notes
    -----
    .. math:: a = 2\pi (1 + 0.77 t) \cdot 0.88 (Re/10^5)^{0.03}

    References
    ----------
    .. [1] H. Glauert, The Elements of Aerofoil and Airscrew Theory, 2nd ed., Cambridge
       1947, ch. VII: Joukowski sections, slope 2 pi (1 + 0.77 t). The other factor is fitted.
    """
    ideal = 2.0 * np.pi * (1.0 + THICKNESS_GAIN * np.asarray(shape.thickness))
    ratio = np.asarray(reynolds, dtype=np.float64) / REFERENCE_REYNOLDS
    return np.asarray(ideal * SLOPE_SHARE * ratio**SLOPE_EXPONENT)


def attached_largest_lift(
    shape: SectionShape, reynolds: ArrayLike, *, rule: StallRule = STALL_RULE
) -> FloatArray:
    r"""Largest lift by the pressure difference between nose peak and trailing edge.

    Parameters
    ----------
    shape : SectionShape
        Any shape that broadcasts with `reynolds`.
    reynolds : array_like
        [-] > 0. Fitted from 40,000 to 500,000.
    rule : StallRule, optional
        Its constants.

    Returns
    -------
    numpy.ndarray
        [-] Without the loss that a burst bubble brings.

    Notes
    -----
    At the ideal angle the upper surface carries the speed of its thickness (that of an
    ellipse, 1 + t) and of its camber (a quarter of the ideal lift, for an even load);
    beyond it the flow round the nose adds its own. The stall comes where

    .. math::
       \left(1 + t + \tfrac14 c_{l,i}\right)^2
       \left(1 + \frac{2 (\alpha - \alpha_i)^2}{r + r_b}\right) = K (Re/10^5)^n

    The radius of a bubble, :math:`r_b`, stands beside that of the nose, since at these
    Reynolds numbers the flow does not follow a sharp nose but a bubble on it: with the
    bare radius the rule errs by 0.23 in largest lift, with the bubble by 0.06. The published
    values of K belong to Reynolds numbers above a million; form and idea are those of [1],
    K, n and r_b are fitted.

    References
    ----------
    .. [1] W. O. Valarezo, V. D. Chin, Method for the Prediction of Wing Maximum Lift,
       J. Aircraft 31(1), 1994, 103-109: pressure-difference rule. From memory.
    .. [2] M. J. Lighthill, A New Approach to Thin Aerofoil Theory, Aeronautical Quarterly
       3, 1951, 193-210 (also ARC R&M 2328): round noses. From memory.
    """
    ideal = np.asarray(shape.ideal_lift, dtype=np.float64)
    ratio = np.asarray(reynolds, dtype=np.float64) / REFERENCE_REYNOLDS
    allowed = rule.pressure_difference * ratio**rule.exponent
    speed = 1.0 + np.asarray(shape.thickness) + 0.25 * ideal
    # Extreme camber would use up the whole difference before the nose does anything.
    room = np.maximum(allowed / speed**2 - 1.0, 0.05)
    angle = np.sqrt(0.5 * room * (np.asarray(shape.nose_radius) + rule.bubble_radius))
    return np.asarray(ideal + lift_slope(shape, reynolds) * angle)


def burst_weight(shape: SectionShape, reynolds: ArrayLike) -> FloatArray:
    """Find how far a section is taken to stall early because its laminar bubble bursts.

    Parameters
    ----------
    shape : SectionShape
        Any shape that broadcasts with `reynolds`.
    reynolds : array_like
        [-]

    Returns
    -------
    numpy.ndarray
        From 0, not at all, to 1 [-]. Above 0 only to a Reynolds number of 100,000 and
        for ideal lifts above 0.55.
    """
    heavy = smooth_step(shape.ideal_lift, *BURST_LIFT)
    return np.asarray(heavy * (np.asarray(reynolds) <= BURST_LAST))


def largest_lift(shape: SectionShape, reynolds: ArrayLike) -> FloatArray:
    """Largest lift, with the early stall of strongly cambered sections at low Reynolds number.

    Parameters
    ----------
    shape : SectionShape
        Any shape that broadcasts with `reynolds`.
    reynolds : array_like
        [-]

    Returns
    -------
    numpy.ndarray
        [-]
    """
    lost = (1.0 - BURST_SHARE) * burst_weight(shape, reynolds)
    return np.asarray(attached_largest_lift(shape, reynolds) * (1.0 - lost))


def straight_lift(angle: ArrayLike, shape: SectionShape, reynolds: ArrayLike) -> FloatArray:
    """Lift as it would go on without a stall.

    Below a Reynolds number of 150,000 some of it is missing around the ideal lift,
    where no suction peak makes the flow turbulent and both surfaces separate far ahead
    of the trailing edge. Symmetric sections, tails among them, have a flat spot there.

    Parameters
    ----------
    angle : array_like
        [rad]
    shape : SectionShape
        Any shape that broadcasts.
    reynolds : array_like
        [-]

    Returns
    -------
    numpy.ndarray
        [-] Rises with angle everywhere.
    """
    zero = np.asarray(shape.zero_lift_angle) * camber_share(shape)
    lift = lift_slope(shape, reynolds) * (np.asarray(angle, dtype=np.float64) - zero)
    gone = smooth_step(np.log(reynolds), float(np.log(DIP_FULL)), float(np.log(DIP_GONE)))
    # Where the ideal lift is so high that a burst is taken to end it, there is none to dip.
    gone = np.maximum(gone, smooth_step(np.abs(shape.ideal_lift), *BURST_LIFT))
    away = (lift - np.asarray(shape.ideal_lift)) / DIP_WIDTH
    return np.asarray(lift * (1.0 - DIP_DEPTH * (1.0 - gone) * np.exp(-away * away)))


@dataclass(frozen=True, eq=False)
class LiftCurve:
    """Estimated lift over angle.

    Fields
    ------
    lift : numpy.ndarray, shape (na, nr)
        [-]
    attached_lift : numpy.ndarray, shape (na, nr)
        Of the part of the flow that is attached: held at its peaks [-].
    stalled : numpy.ndarray, shape (na, nr)
        Share of a stalled plate in the flow, 0 to 1 [-].
    stall : numpy.ndarray of bool, shape (na, nr)
        Past the peak on either side.
    """

    lift: FloatArray
    attached_lift: FloatArray
    stalled: FloatArray
    stall: NDArray[np.bool_]


def lift_curve(angle: FloatArray, shape: SectionShape, reynolds: FloatArray) -> LiftCurve:
    """Lift over angle: straight, rounded to its peak on both sides, then a stalled plate.

    Parameters
    ----------
    angle : numpy.ndarray, shape (na,)
        Ascending [rad].
    shape : SectionShape
        One section.
    reynolds : numpy.ndarray, shape (nr,)
        [-]

    Returns
    -------
    LiftCurve
        Once differentiable in angle.
    """
    alpha = angle[:, None]
    straight = straight_lift(alpha, shape, reynolds)
    top = largest_lift(shape, reynolds)
    bottom = -largest_lift(shape.inverted(), reynolds)
    rounding = np.minimum(ROUNDING, 0.4 * (top - bottom))
    reached = np.clip(straight, bottom - rounding, top + rounding)
    above = np.maximum(reached - (top - rounding), 0.0)
    below = np.maximum((bottom + rounding) - reached, 0.0)
    attached = np.asarray(reached - (above**2 - below**2) / (4.0 * rounding))
    lift = attached.copy()
    stall = (straight > top + rounding) | (straight < bottom - rounding)
    wide = np.linspace(-1.2, 1.2, 2401)
    line = straight_lift(wide[:, None], shape, reynolds)
    for column in range(len(reynolds)):
        for sign, peak in ((1.0, top[column]), (-1.0, bottom[column])):
            at = np.interp(peak + sign * rounding[column], line[:, column], wide)
            past = stall[:, column] & (sign * (angle - at) > 0.0)
            lift[past, column] = _falling(angle[past], at=float(at), peak=float(peak), sign=sign)
    missing = np.abs(straight - lift)
    return LiftCurve(lift, attached, missing / (missing + HALF_STALLED), stall)


def _falling(angle: FloatArray, *, at: float, peak: float, sign: float) -> FloatArray:
    """Lift past a peak: a cubic from its level top to the stalled plate, then the plate."""
    end = at + sign * STALL_LENGTH
    share = np.clip((angle - at) / (end - at), 0.0, 1.0)
    goal = float(plate_lift(np.array(end)))
    slope = 2.0 * float(np.cos(2.0 * end)) * (end - at)  # of sin 2a, the plate's lift
    cubic = (
        peak + (3.0 * (goal - peak) - slope) * share**2 + (slope - 2.0 * (goal - peak)) * share**3
    )
    return np.where(share < 1.0, cubic, plate_lift(angle))
