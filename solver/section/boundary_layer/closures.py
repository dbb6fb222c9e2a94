"""Closure relations of the two-equation boundary layer with lag, and their slopes.

Incompressible. H is the shape parameter dstar/theta, Rt the Reynolds number on
theta and the local speed. Every function returns a value and the slopes that
Newton's method needs. Relations are those of Drela and Giles (AIAA Journal 25(10),
1987) unless another source is named. They are recalled, not read, so no equation
numbers are given; they are checked against similar solutions and flat plates in the
tests.
"""

from __future__ import annotations

import math

from solver.section.boundary_layer.compiled import compiled_in_place, compiled_part, inlined
from solver.section.boundary_layer.constants import (
    GROWTH_FROM_H,
    GROWTH_TO_H,
    SEPARATED_GROWTH,
)
from solver.section.boundary_layer.layout import FloatArray, Sloped

LEAST_LAMINAR_H = 1.05
LEAST_TURBULENT_H = 1.02
"""Floors below anything physical, so that slopes never vanish inside the physical range."""

SIMILAR_SEPARATION_H = 4.0
"""Of similar layers: there the laminar fits change over."""
LARGEST_SIMILAR_H = 8.8
"""Of the tabled similar layers with reversed flow."""
FRICTION_CHANGE_H = 7.4
"""Where the laminar friction is least, and its fit changes over."""

RAMP_BEFORE, RAMP_WIDTH = 0.08, 0.16
"""Growth comes in over so many decades of Rt, and begins so many before the critical one."""
SIMILAR_THETA = 0.3438
"""(theta*)^2 of the similar layer at separation, in the variables of Falkner and Skan."""

LEAST_FRICTION_RT, LEAST_ENERGY_RT = 20.0, 200.0
"""Below them the turbulent relations are held: log Rt would vanish, 1/Rt take over."""
CHANGING_H_RT = 400.0
"""Above it the H at which the turbulent energy shape parameter is least depends on Rt."""


@inlined
def laminar_energy(h: float) -> tuple[float, float]:
    """Energy shape parameter of a laminar layer.

    Parameters
    ----------
    h : float
        H. [-] Above 1.

    Returns
    -------
    tuple of float
        Hs, and its slope over H. [-]
    """
    d = h - SIMILAR_SEPARATION_H
    c = 0.076 if h < SIMILAR_SEPARATION_H else 0.040
    return 1.515 + c * d * d / h, c * (2.0 * d / h - d * d / (h * h))


@compiled_in_place
def laminar_friction(h: float) -> tuple[float, float]:
    """Skin friction of a laminar layer.

    Parameters
    ----------
    h : float
        H. [-] Above 1.

    Returns
    -------
    tuple of float
        Rt cf/2, and its slope over H. [-]
    """
    if h < FRICTION_CHANGE_H:
        d, e = FRICTION_CHANGE_H - h, h - 1.0
        return -0.067 + 0.01977 * d * d / e, -0.01977 * (2.0 * d / e + d * d / (e * e))
    e = h - 6.0
    t = 1.0 - 1.4 / e
    return -0.067 + 0.022 * t * t, 0.022 * 2.0 * t * 1.4 / (e * e)


@inlined
def laminar_dissipation(h: float) -> tuple[float, float]:
    """Dissipation of a laminar layer.

    Parameters
    ----------
    h : float
        H. [-] Above 1.

    Returns
    -------
    tuple of float
        Rt 2 CD/Hs, and its slope over H. [-]
    """
    d = h - SIMILAR_SEPARATION_H
    if d < 0.0:
        p = (-d) ** 4.5
        return 0.207 - 0.00205 * p * d, -0.00205 * 5.5 * p
    q = 1.0 + 0.02 * d * d
    return 0.207 - 0.003 * d * d / q, -0.006 * d / (q * q)


@inlined
def _first_growth(h: float) -> tuple[float, float]:
    """Decades of Rt at which disturbances begin to grow, and their slope over H."""
    e = 1.0 / (h - 1.0)
    t = math.tanh(20.0 * e - 12.9)
    begin = (1.415 * e - 0.489) * t + 3.295 * e + 0.44
    return begin, e * e * (-1.415 * t - 20.0 * (1.415 * e - 0.489) * (1.0 - t * t) - 3.295)


@inlined
def _growth_over_rt(h: float) -> tuple[float, float]:
    """dn/dRt along a similar layer, and its slope over H."""
    t = math.tanh(1.5 * h - 4.65)
    a = 2.4 * h - 3.7 + 2.5 * t
    root = math.sqrt(a * a + 0.25)
    return 0.01 * root, 0.01 * a * (2.4 + 3.75 * (1.0 - t * t)) / root


@inlined
def _rt_over_length(h: float) -> tuple[float, float]:
    """Twice theta dRt/dxi along a similar layer, and its slope over H.

    Up to separation as published; behind it half of it is (theta*)^2 of similar layers
    with reversed flow, fitted to the table of Falkner and Skan's layers within 1 %, and
    held past the table's end: the published fit ends at separation.
    """
    d = h - SIMILAR_SEPARATION_H
    if h > SIMILAR_SEPARATION_H:
        past = min(d, LARGEST_SIMILAR_H - SIMILAR_SEPARATION_H)
        q = 0.05 * past**0.56
        length = 2.0 * SIMILAR_THETA / (1.0 + q * past)
        return length, -length * 1.56 * q / (1.0 + q * past) if past == d else 0.0
    e = 1.0 / (h - 1.0)
    length = (6.54 * h - 14.07) / (h * h) + 0.058 * d * d * e - 0.068
    return length, (
        6.54 / (h * h)
        - 2.0 * (6.54 * h - 14.07) / (h * h * h)
        + 0.058 * (2.0 * d * e - d * d * e * e)
    )


@inlined
def _share_in_separated(h: float, constants: FloatArray) -> tuple[float, float]:
    """Share of the envelope's growth that is kept, and its slope over H."""
    wide = constants[GROWTH_TO_H] - constants[GROWTH_FROM_H]
    y = (h - constants[GROWTH_FROM_H]) / wide
    if y >= 1.0:
        return constants[SEPARATED_GROWTH], 0.0
    if y <= 0.0:
        return 1.0, 0.0
    lost = 1.0 - constants[SEPARATED_GROWTH]
    return 1.0 - lost * y * y * (3.0 - 2.0 * y), -lost * 6.0 * y * (1.0 - y) / wide


@compiled_part
def growth(h: float, rt: float, constants: FloatArray) -> Sloped:
    """Growth of the most amplified disturbances along a laminar layer.

    Parameters
    ----------
    h : float
        H. [-] Above 1.
    rt : float
        Rt. [-]
    constants : numpy.ndarray, shape (14,)
        See :class:`~solver.section.boundary_layer.constants.ClosureConstants`.

    Returns
    -------
    Sloped
        theta dn/dxi, and its slopes over H and ln Rt. [-]

    Notes
    -----
    The envelope of the amplification curves of similar profiles [1]_, fitted [2]_. In
    separated profiles the one envelope overstates what any single frequency collects;
    it is slowed there by a factor set by comparison.

    References
    ----------
    .. [1] J. L. van Ingen, A suggested semi-empirical method for the calculation of the
       boundary layer transition region, Report VTH-74, Delft, 1956; the idea.
    .. [2] M. Drela, M. B. Giles, Viscous-inviscid analysis of transonic and low Reynolds
       number airfoils, AIAA Journal 25(10), 1987; recalled, not read.
    """
    begin, begin_h = _first_growth(h)
    x = (math.log10(max(rt, 1.0)) - begin + RAMP_BEFORE) / RAMP_WIDTH
    if x <= 0.0:
        return Sloped(0.0, 0.0, 0.0)
    ramp, ramp_x = 1.0, 0.0
    if x < 1.0:
        ramp, ramp_x = x * x * (3.0 - 2.0 * x), 6.0 * x * (1.0 - x)
    rate, rate_h = _growth_over_rt(h)
    length, length_h = _rt_over_length(h)
    slow, slow_h = _share_in_separated(h, constants)
    value = 0.5 * rate * length
    value_h = 0.5 * (rate_h * length + rate * length_h)
    return Sloped(
        value * ramp * slow,
        value_h * ramp * slow
        - value * slow * ramp_x * begin_h / RAMP_WIDTH
        + value * ramp * slow_h,
        value * slow * ramp_x / (RAMP_WIDTH * math.log(10.0)),
    )


@compiled_in_place
def turbulent_friction(h: float, rt: float) -> Sloped:
    """Skin friction of a turbulent layer.

    Parameters
    ----------
    h : float
        H. [-] Above 1.
    rt : float
        Rt. [-] Held below 20.

    Returns
    -------
    Sloped
        cf/2, and its slopes over H and ln Rt. [-]

    References
    ----------
    .. [1] T. W. Swafford, Analytical approximation of two-dimensional separated
       turbulent boundary-layer velocity profiles, AIAA Journal 21(6), 1983; recalled,
       not read.
    """
    low = rt < LEAST_FRICTION_RT
    lr = math.log10(LEAST_FRICTION_RT if low else rt)
    power = -1.74 - 0.31 * h
    main = 0.3 * math.exp(-1.33 * h) * lr**power
    t = math.tanh(4.0 - h / 0.875)
    cf = main + 0.00011 * (t - 1.0)
    cf_h = main * (-1.33 - 0.31 * math.log(lr)) - 0.00011 * (1.0 - t * t) / 0.875
    cf_r = 0.0 if low else main * power / (lr * math.log(10.0))
    return Sloped(0.5 * cf, 0.5 * cf_h, 0.5 * cf_r)


@inlined
def _energy_below(
    h: float, r: float, least: tuple[float, float], base: tuple[float, float]
) -> Sloped:
    """Turbulent energy shape parameter below the H of its least value.

    That H and the least value come with their slopes over ln Rt.
    """
    c = 0.165 - 1.6 / math.sqrt(r)
    c_r = 0.8 / math.sqrt(r)
    d = least[0] - h
    p = d**0.6
    return Sloped(
        base[0] + c * p * d / h,
        -c * (1.6 * p / h + p * d / (h * h)),
        base[1] + c_r * p * d / h + c * 1.6 * p / h * least[1],
    )


@inlined
def _energy_above(
    h: float, r: float, least: tuple[float, float], base: tuple[float, float]
) -> Sloped:
    """Turbulent energy shape parameter above the H of its least value."""
    lr = math.log(r)
    d = h - least[0]
    e = d + 4.0 / lr
    bracket = 0.04 / h + 0.007 * lr / (e * e)
    slope = 2.0 * d * bracket - d * d * 0.014 * lr / (e * e * e)
    explicit = d * d * (0.007 / (e * e) + 0.056 / (e * e * e * lr))
    return Sloped(
        base[0] + d * d * bracket,
        slope - d * d * 0.04 / (h * h),
        base[1] - slope * least[1] + explicit,
    )


@inlined
def turbulent_energy(h: float, rt: float) -> Sloped:
    """Energy shape parameter of a turbulent layer.

    Parameters
    ----------
    h : float
        H. [-] Above 1.
    rt : float
        Rt. [-] Held below 200.

    Returns
    -------
    Sloped
        Hs, and its slopes over H and ln Rt. [-]
    """
    low = rt < LEAST_ENERGY_RT
    r = LEAST_ENERGY_RT if low else rt
    least = (4.0, 0.0)
    if r >= CHANGING_H_RT:
        least = (3.0 + CHANGING_H_RT / r, -CHANGING_H_RT / r)
    base = (1.505 + 4.0 / r, -4.0 / r)
    below = h < least[0]
    energy = _energy_below(h, r, least, base) if below else _energy_above(h, r, least, base)
    return Sloped(energy.value, energy.over_h, 0.0 if low else energy.over_rt)
