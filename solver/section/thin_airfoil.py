"""Thin-airfoil theory: what a camber line alone says about lift and moment, and flaps."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline

from solver.errors import InputError, require_within
from solver.section.geometry import CamberLine, Outline, camber_line
from solver.section.naca import naca_section

FloatArray = NDArray[np.float64]

GAUSS_POINTS = 60
"""For each smooth piece: a slope that is a polynomial in x is then exact to rounding."""
LARGEST_FLAP_ANGLE = float(np.radians(60.0))
"""Of the published curve of flap effectiveness. [rad]"""


@dataclass(frozen=True)
class ThinAirfoil:
    """What a thin cambered plate does in an ideal flow.

    Parameters
    ----------
    zero_lift_angle : float
        Angle of attack of the x axis at zero lift. [rad] Negative with positive camber.
    moment_quarter_chord : float
        Moment coefficient about the quarter chord, at any angle. [-] Nose up positive.
    ideal_angle : float
        Angle at which the flow meets the leading edge without going round it. [rad]
    ideal_lift : float
        Lift coefficient at that angle. [-]
    """

    zero_lift_angle: float
    moment_quarter_chord: float
    ideal_angle: float
    ideal_lift: float


@dataclass(frozen=True, eq=False)
class FlapEffect:
    """What one radian of a plain flap does; arrays have the shape of the chord fraction.

    Parameters
    ----------
    angle_shift : numpy.ndarray
        How far the zero-lift angle falls. [-] > 0.
    lift_slope : numpy.ndarray
        Lift coefficient at constant angle of attack. [1/rad] > 0.
    moment_slope : numpy.ndarray
        Moment coefficient about the quarter chord at constant angle of attack.
        [1/rad] < 0: down is nose down.
    """

    angle_shift: FloatArray
    lift_slope: FloatArray
    moment_slope: FloatArray


def thin_airfoil(
    slope: Callable[[FloatArray], ArrayLike] | CamberLine, *, breaks: Sequence[float] = ()
) -> ThinAirfoil:
    r"""Zero-lift angle, moment and ideal lift from the slope of a camber line.

    Two-dimensional inviscid incompressible flow about a thin, little cambered
    section at small angles.

    Parameters
    ----------
    slope : callable or CamberLine
        dy/dx [-] at x from 0 to 1 (arrays in, arrays of the same shape out), or
        a camber line given at points.
    breaks : sequence of float, optional
        Places where a callable's slope is not smooth. [-] Between 0 and 1.

    Returns
    -------
    ThinAirfoil
        Angles [rad] and coefficients [-].

    Raises
    ------
    InputError
        If the slope is not finite everywhere, or a break lies outside 0 to 1.

    Notes
    -----
    With :math:`x = (1 - \cos\theta)/2`,

    .. math::
       I_0 = \frac{1}{\pi}\int_0^\pi \frac{dy}{dx} d\theta, \quad
       A_n = \frac{2}{\pi}\int_0^\pi \frac{dy}{dx} \cos n\theta \, d\theta,

       \alpha_{L0} = I_0 - A_1/2, \quad c_{m,c/4} = \frac{\pi}{4}(A_2 - A_1), \quad
       \alpha_i = I_0, \quad c_{l,i} = \pi A_1

    References
    ----------
    .. [1] H. Glauert, The Elements of Aerofoil and Airscrew Theory, 2nd ed.,
       Cambridge 1947, ch. VII, eqs. (7.2)-(7.6). Equation numbers from memory.
    .. [2] T. Theodorsen, NACA Report 411, 1931: ideal angle and ideal lift.
    """
    function = _slope_over_x(slope) if isinstance(slope, CamberLine) else slope
    for place in breaks:
        require_within(0.0, 1.0, breaks=place)
    edges = np.arccos(1.0 - 2.0 * np.array([0.0, *sorted(breaks), 1.0]))
    node, weight = np.polynomial.legendre.leggauss(GAUSS_POINTS)
    half = 0.5 * np.diff(edges)[:, None]
    theta = (0.5 * (edges[:-1] + edges[1:])[:, None] + half * node).ravel()
    weights = (half * weight).ravel()
    value = np.asarray(function(0.5 - 0.5 * np.cos(theta)), dtype=np.float64)
    if value.shape != theta.shape or not np.isfinite(value).all():
        raise InputError("slope", "a camber line", "finite at every place from 0 to 1")
    weighted = weights * value / np.pi
    mean = float(weighted.sum())
    first = float(2.0 * (weighted * np.cos(theta)).sum())
    second = float(2.0 * (weighted * np.cos(2.0 * theta)).sum())
    return ThinAirfoil(
        zero_lift_angle=mean - 0.5 * first,
        moment_quarter_chord=0.25 * np.pi * (second - first),
        ideal_angle=mean,
        ideal_lift=np.pi * first,
    )


def _slope_over_x(line: CamberLine) -> Callable[[FloatArray], FloatArray]:
    """Slope of a line given at points, interpolated where it is smooth: over theta."""
    share = (line.x - line.x[0]) / (line.x[-1] - line.x[0])
    spline = CubicSpline(np.arccos(np.clip(1.0 - 2.0 * share, -1.0, 1.0)), line.slope)

    def slope(x: FloatArray) -> FloatArray:
        return np.asarray(spline(np.arccos(np.clip(1.0 - 2.0 * x, -1.0, 1.0))))

    return slope


def naca_thin_airfoil(digits: str) -> ThinAirfoil:
    """Thin-airfoil theory for the exact camber line of a NACA section.

    Parameters
    ----------
    digits : str
        Four or five digits, with or without ``NACA`` before them.

    Returns
    -------
    ThinAirfoil
        Angles [rad] and coefficients [-], exact to rounding.

    Raises
    ------
    InputError
        Named ``digits``, if no such section exists.
    """
    camber = naca_section(digits).camber
    return thin_airfoil(camber.slope, breaks=(camber.joint,))


def outline_thin_airfoil(outline: Outline) -> ThinAirfoil:
    """Thin-airfoil theory for the camber line measured from an outline.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    ThinAirfoil
        Angles [rad], from the x axis of the outline, and coefficients [-].
    """
    return thin_airfoil(camber_line(outline))


def flap_effectiveness(chord_fraction: ArrayLike) -> FlapEffect:
    r"""Find what a plain flap does in thin-airfoil theory, per radian.

    A thin plate with a sealed hinge in an ideal flow, small deflections. Real
    flaps reach less: multiply by :func:`viscous_flap_factor`.

    Parameters
    ----------
    chord_fraction : array_like, shape (...)
        Flap chord over section chord. [-] 0 (no flap) to 1 (all of it).

    Returns
    -------
    FlapEffect
        Arrays of shape (...).

    Raises
    ------
    InputError
        If a fraction is not finite or lies outside 0 to 1.

    Notes
    -----
    With the hinge at :math:`\cos\theta_h = 2E - 1`,

    .. math::
       -\partial\alpha_{L0}/\partial\delta = 1 - (\theta_h - \sin\theta_h)/\pi, \quad
       \partial c_l/\partial\delta = 2 (\pi - \theta_h + \sin\theta_h), \quad
       \partial c_m/\partial\delta = -\tfrac12 \sin\theta_h (1 - \cos\theta_h)

    References
    ----------
    .. [1] H. Glauert, Theoretical Relationships for an Aerofoil with Hinged Flap,
       ARC R&M 1095, 1927, eqs. (8)-(12). Equation numbers from memory.
    """
    fraction = np.asarray(chord_fraction, dtype=np.float64)
    if not np.all((fraction >= 0.0) & (fraction <= 1.0)):
        raise InputError("chord_fraction", chord_fraction, "between 0 and 1")
    hinge = np.arccos(2.0 * fraction - 1.0)
    sine = np.sin(hinge)
    return FlapEffect(
        angle_shift=np.asarray(1.0 - (hinge - sine) / np.pi),
        lift_slope=np.asarray(2.0 * (np.pi - hinge + sine)),
        moment_slope=np.asarray(-0.5 * sine * (1.0 - np.cos(hinge))),
    )


def viscous_flap_factor(deflection: ArrayLike) -> FloatArray:
    r"""Share of a plain flap's theoretical lift that real, sealed flaps reach.

    The boundary layer thickens over the flap and, from about 15 degrees,
    separates at the hinge. The published curve was measured at Reynolds numbers
    above a million, so that the factor is an upper limit on small drones: on the
    one section that we have tables for (SD7037, UIUC vol. 2) a flap at 60,000 to
    100,000 reaches about 0.6 of its own effect at 300,000. A gap at the hinge
    costs more and is not contained.

    Parameters
    ----------
    deflection : array_like, shape (...)
        Flap angle, either way. [rad] -pi/3 to pi/3.

    Returns
    -------
    numpy.ndarray, shape (...)
        Factor on the total effect of the deflection, even in it. [-] Within
        0.1 of the curve, as remembered.

    Raises
    ------
    InputError
        If a deflection is not finite or out of range.

    Notes
    -----
    .. math:: \eta = 0.42 + 0.38 / (1 + (\delta / 25^\circ)^4)

    a fit to the curve's values 0.80, 0.80, 0.70, 0.55, 0.46 and 0.42 at 0, 10,
    20, 30, 40 and 50 degrees, all from memory.

    References
    ----------
    .. [1] B. W. McCormick, Aerodynamics, Aeronautics and Flight Mechanics, 2nd ed.,
       Wiley 1995, fig. 3.33 (correction factor to flap effectiveness, plain flaps);
       from memory.
    """
    angle = np.asarray(deflection, dtype=np.float64)
    if not np.all(np.abs(angle) <= LARGEST_FLAP_ANGLE):
        raise InputError("deflection", deflection, "between -pi/3 and pi/3")
    return np.asarray(0.42 + 0.38 / (1.0 + (angle / np.radians(25.0)) ** 4))
