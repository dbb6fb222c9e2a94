"""What the equations need at one station: quantities and their slopes.

A station's state is (ln theta, ln dstar, ln ue, a), with a = n in laminar flow and
a = ln S in turbulent flow, at the place xi along the surface. A row of slopes holds
the five derivatives after those, in that order.
"""

from __future__ import annotations

import math

import numba

from solver.section.boundary_layer.closures import (
    LEAST_LAMINAR_H,
    LEAST_TURBULENT_H,
    growth,
    laminar_dissipation,
    laminar_energy,
    laminar_friction,
    turbulent_energy,
    turbulent_friction,
)
from solver.section.boundary_layer.constants import (
    DISSIPATION_FROM_H,
    DISSIPATION_RISE,
    DISSIPATION_SPAN,
    EQUILIBRIUM,
    INNER_LAYER,
    LAG,
)

# Rows of what a station yields: ln Hs; xi cf/(2 theta); xi (2 CD/Hs - cf/2)/theta; da/dxi;
# and in turbulent layers ln S_eq; ln delta.
FULLEST_WALL_H, FULLEST_WAKE_H = 1.25, 1.06
"""Below these no turbulent layer is known: the energy shape parameter is bent upwards there,
so that H has a value for any acceleration and never comes to its floor."""


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _spread(row, slope_h, slope_r, h):
    """Slopes over ln theta, ln dstar, ln ue from slopes over H and ln Rt."""
    row[0] = -h * slope_h + slope_r
    row[1] = h * slope_h
    row[2] = slope_r
    row[3] = 0.0
    row[4] = 0.0


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _over_theta(value, row, factor):
    """Multiply a quantity and its slopes by xi/theta (factor)."""
    for j in range(5):
        row[j] *= factor
    row[0] -= value * factor


@numba.njit(cache=True, nogil=True, error_model="numpy")
def laminar_station(state, xi, reynolds, constants, value, slope):
    """Fill the laminar quantities of one station."""
    theta = math.exp(state[0])
    h = math.exp(state[1] - state[0])
    low = h < LEAST_LAMINAR_H
    if low:
        h = LEAST_LAMINAR_H
    rt = reynolds * math.exp(state[0] + state[2])
    hs, hs_h = laminar_energy(h)
    cf, cf_h = laminar_friction(h)
    cd, cd_h = laminar_dissipation(h)
    g, g_h, g_r = growth(h, rt, constants)
    value[0] = math.log(hs)
    _spread(slope[0], hs_h / hs, 0.0, h)
    ratio = xi / theta
    cf, cf_h, cd, cd_h = cf / rt, cf_h / rt, cd / rt, cd_h / rt
    value[1] = ratio * cf
    _spread(slope[1], cf_h, -cf, h)
    _over_theta(cf, slope[1], ratio)
    slope[1, 4] = cf / theta
    value[2] = ratio * (cd - cf)
    _spread(slope[2], cd_h - cf_h, -(cd - cf), h)
    _over_theta(cd - cf, slope[2], ratio)
    slope[2, 4] = (cd - cf) / theta
    value[3] = g / theta
    _spread(slope[3], g_h, g_r, h)
    _over_theta(g, slope[3], 1.0 / theta)


@numba.njit(cache=True, nogil=True, error_model="numpy")
def turbulent_station(state, xi, reynolds, wake, constants, value, slope):
    """Fill the turbulent quantities of one station; in a wake there is no friction."""
    theta = math.exp(state[0])
    h = math.exp(state[1] - state[0])
    if h < LEAST_TURBULENT_H:
        h = LEAST_TURBULENT_H
    rt = reynolds * math.exp(state[0] + state[2])
    s = math.exp(state[3])
    hs, hs_h, hs_r = turbulent_energy(h, rt)
    full = FULLEST_WAKE_H if wake else FULLEST_WALL_H
    if h < full:
        d, e = full - h, h - 1.0
        hs += 0.1 * d * d / e
        hs_h -= 0.1 * (2.0 * d / e + d * d / (e * e))
    value[0] = math.log(hs)
    _spread(slope[0], hs_h / hs, hs_r / hs, h)

    # Slip speed Us and what depends on it.
    form = 1.0 - 4.0 * (h - 1.0) / (3.0 * h)
    us = 0.5 * hs * form
    us_h = 0.5 * hs_h * form - 0.5 * hs * 4.0 / (3.0 * h * h)
    us_r = 0.5 * hs_r * form
    cap = 0.99 if wake else 0.95
    if us > cap:
        us, us_h, us_r = cap, 0.0, 0.0
    cf, cf_h, cf_r = 0.0, 0.0, 0.0
    if not wake:
        cf, cf_h, cf_r = turbulent_friction(h, rt)
    many, many_h = 1.0, 0.0
    over = h - constants[DISSIPATION_FROM_H]
    if over > 0.0:
        span = constants[DISSIPATION_SPAN]
        e = math.exp(-over / span)
        many = 1.0 + constants[DISSIPATION_RISE] * span * (1.0 - e)
        many_h = constants[DISSIPATION_RISE] * e
    sheets = 2.0 if wake else 1.0
    raw = cf * us + s * s * (1.0 - us)
    raw_h = cf_h * us + cf * us_h - s * s * us_h
    raw_r = cf_r * us + cf * us_r - s * s * us_r
    raw_s = 2.0 * s * s * (1.0 - us)
    c = 2.0 * sheets / hs
    e = c * many * raw
    e_h = c * (many * raw_h + many_h * raw) - e * hs_h / hs
    e_r = c * many * raw_r - e * hs_r / hs
    e_s = c * many * raw_s

    ratio = xi / theta
    value[1] = ratio * cf
    _spread(slope[1], cf_h, cf_r, h)
    _over_theta(cf, slope[1], ratio)
    slope[1, 4] = cf / theta
    value[2] = ratio * (e - cf)
    _spread(slope[2], e_h - cf_h, e_r - cf_r, h)
    slope[2, 3] = e_s
    _over_theta(e - cf, slope[2], ratio)
    slope[2, 4] = (e - cf) / theta

    # ln S_eq
    inner = constants[INNER_LAYER] / rt
    outer = h - 1.0 - inner
    outer_h, outer_r = 1.0, inner
    if outer < 0.2 * (h - 1.0):
        outer, outer_h, outer_r = 0.2 * (h - 1.0), 0.2, 0.0
    value[4] = 0.5 * math.log(
        constants[EQUILIBRIUM] * hs * (h - 1.0) * outer * outer / ((1.0 - us) * h**3)
    )
    _spread(
        slope[4],
        0.5 * (hs_h / hs + 1.0 / (h - 1.0) + 2.0 * outer_h / outer - 3.0 / h + us_h / (1.0 - us)),
        0.5 * (hs_r / hs + 2.0 * outer_r / outer + us_r / (1.0 - us)),
        h,
    )
    # ln delta
    thick = 3.15 + 1.72 / (h - 1.0) + h
    if thick < 12.0:
        _spread(slope[5], (1.0 - 1.72 / (h - 1.0) ** 2) / thick, 0.0, h)
    else:
        thick = 12.0
        _spread(slope[5], 0.0, 0.0, h)
    if wake:
        thick *= 0.5
    slope[5, 0] += 1.0
    value[5] = state[0] + math.log(thick)
    # d ln S/d xi
    lag = 0.5 * constants[LAG] / (theta * thick)
    seq = math.exp(value[4])
    value[3] = lag * (seq - s)
    for j in range(5):
        slope[3, j] = lag * seq * slope[4, j] - value[3] * slope[5, j]
    slope[3, 3] -= lag * s
