"""Closure relations of the two-equation boundary layer with lag, and their slopes.

Incompressible. H is the shape parameter dstar/theta, Rt the Reynolds number on
theta and the local speed. Every function returns values and the slopes that
Newton's method needs. Relations are those of Drela and Giles (AIAA Journal 25(10),
1987) unless another source is named; they are recalled, and checked against
similar solutions and flat plates in the tests.
"""

from __future__ import annotations

import math

import numba

from solver.section.boundary_layer.constants import (
    GROWTH_FROM_H,
    GROWTH_TO_H,
    SEPARATED_GROWTH,
)

LEAST_LAMINAR_H = 1.05
LEAST_TURBULENT_H = 1.02
"""Floors below anything physical, so that slopes never vanish inside the physical range."""

LARGEST_SIMILAR_H = 8.8
"""Of the tabled similar layers with reversed flow."""


@numba.njit(cache=True, nogil=True, error_model="numpy")
def laminar_energy(h):
    """Energy shape parameter of a laminar layer, and its slope over H."""
    d = h - 4.0
    c = 0.076 if h < 4.0 else 0.040
    return 1.515 + c * d * d / h, c * (2.0 * d / h - d * d / (h * h))


@numba.njit(cache=True, nogil=True, error_model="numpy")
def laminar_friction(h):
    """Rt cf/2 of a laminar layer, and its slope over H."""
    if h < 7.4:
        d, e = 7.4 - h, h - 1.0
        return -0.067 + 0.01977 * d * d / e, -0.01977 * (2.0 * d / e + d * d / (e * e))
    e = h - 6.0
    t = 1.0 - 1.4 / e
    return -0.067 + 0.022 * t * t, 0.022 * 2.0 * t * 1.4 / (e * e)


@numba.njit(cache=True, nogil=True, error_model="numpy")
def laminar_dissipation(h):
    """Rt 2 CD/Hs of a laminar layer, and its slope over H."""
    d = h - 4.0
    if d < 0.0:
        p = (-d) ** 4.5
        return 0.207 - 0.00205 * p * d, -0.00205 * 5.5 * p
    q = 1.0 + 0.02 * d * d
    return 0.207 - 0.003 * d * d / q, -0.006 * d / (q * q)


@numba.njit(cache=True, nogil=True, error_model="numpy")
def growth(h, rt, constants):
    """theta dn/dxi of the most amplified disturbances, and its slopes over H and ln Rt.

    The envelope of the amplification curves of similar profiles (van Ingen 1956 in
    idea). In separated profiles the one envelope overstates what any single
    frequency collects; it is slowed there by a factor set by comparison.
    """
    e = 1.0 / (h - 1.0)
    th = math.tanh(20.0 * e - 12.9)
    r0 = (1.415 * e - 0.489) * th + 3.295 * e + 0.44
    r0_h = e * e * (-1.415 * th - 20.0 * (1.415 * e - 0.489) * (1.0 - th * th) - 3.295)
    lr = math.log10(max(rt, 1.0))
    x = (lr - r0 + 0.08) / 0.16
    if x <= 0.0:
        return 0.0, 0.0, 0.0
    ramp, ramp_x = 1.0, 0.0
    if x < 1.0:
        ramp, ramp_x = x * x * (3.0 - 2.0 * x), 6.0 * x * (1.0 - x)
    t = math.tanh(1.5 * h - 4.65)
    a = 2.4 * h - 3.7 + 2.5 * t
    root = math.sqrt(a * a + 0.25)
    rate = 0.01 * root
    rate_h = 0.01 * a * (2.4 + 3.75 * (1.0 - t * t)) / root
    d = h - 4.0
    length = (6.54 * h - 14.07) / (h * h) + 0.058 * d * d * e - 0.068
    length_h = (
        6.54 / (h * h)
        - 2.0 * (6.54 * h - 14.07) / (h * h * h)
        + 0.058 * (2.0 * d * e - d * d * e * e)
    )
    if h > 4.0:
        # Half the length is (theta*)^2 of similar layers, here those with reversed flow
        # (Falkner and Skan; fitted to their table within 1 %, held past its end).
        e = min(d, LARGEST_SIMILAR_H - 4.0)
        q = 0.05 * e**0.56
        length = 2.0 * 0.3438 / (1.0 + q * e)
        length_h = -length * 1.56 * q / (1.0 + q * e) if e == d else 0.0
    slow, slow_h = 1.0, 0.0
    wide = constants[GROWTH_TO_H] - constants[GROWTH_FROM_H]
    y = (h - constants[GROWTH_FROM_H]) / wide
    if y >= 1.0:
        slow = constants[SEPARATED_GROWTH]
    elif y > 0.0:
        lost = 1.0 - constants[SEPARATED_GROWTH]
        slow = 1.0 - lost * y * y * (3.0 - 2.0 * y)
        slow_h = -lost * 6.0 * y * (1.0 - y) / wide
    value = 0.5 * rate * length
    value_h = 0.5 * (rate_h * length + rate * length_h)
    return (
        value * ramp * slow,
        value_h * ramp * slow - value * slow * ramp_x * r0_h / 0.16 + value * ramp * slow_h,
        value * slow * ramp_x / (0.16 * math.log(10.0)),
    )


@numba.njit(cache=True, nogil=True, error_model="numpy")
def turbulent_friction(h, rt):
    """Half the friction coefficient, cf/2, and its slopes over H and ln Rt."""
    low = rt < 20.0
    lr = math.log10(20.0 if low else rt)
    power = -1.74 - 0.31 * h
    main = 0.3 * math.exp(-1.33 * h) * lr**power
    t = math.tanh(4.0 - h / 0.875)
    cf = main + 0.00011 * (t - 1.0)
    cf_h = main * (-1.33 - 0.31 * math.log(lr)) - 0.00011 * (1.0 - t * t) / 0.875
    cf_r = 0.0 if low else main * power / (lr * math.log(10.0))
    return 0.5 * cf, 0.5 * cf_h, 0.5 * cf_r


@numba.njit(cache=True, nogil=True, error_model="numpy")
def turbulent_energy(h, rt):
    """Energy shape parameter of a turbulent layer, and its slopes over H and ln Rt."""
    low = rt < 200.0
    r = 200.0 if low else rt
    if r < 400.0:
        h0, h0_r = 4.0, 0.0
    else:
        h0, h0_r = 3.0 + 400.0 / r, -400.0 / r
    base, base_r = 1.505 + 4.0 / r, -4.0 / r
    if h < h0:
        c = 0.165 - 1.6 / math.sqrt(r)
        c_r = 0.8 / math.sqrt(r)
        d = h0 - h
        p = d**0.6
        value = base + c * p * d / h
        value_h = -c * (1.6 * p / h + p * d / (h * h))
        value_r = base_r + c_r * p * d / h + c * 1.6 * p / h * h0_r
    else:
        lr = math.log(r)
        d = h - h0
        e = d + 4.0 / lr
        bracket = 0.04 / h + 0.007 * lr / (e * e)
        value = base + d * d * bracket
        slope = 2.0 * d * bracket - d * d * 0.014 * lr / (e * e * e)
        value_h = slope - d * d * 0.04 / (h * h)
        explicit = d * d * (0.007 / (e * e) + 0.056 / (e * e * e * lr))
        value_r = base_r - slope * h0_r + explicit
    if low:
        value_r = 0.0
    return value, value_h, value_r
