"""What the equations need at one station: quantities and their slopes.

A row of slopes holds derivatives over the station's state (ln theta, ln dstar, ln ue,
a) and its place xi along the surface, in that order; see
:mod:`solver.section.boundary_layer.layout` for the rows.
"""

from __future__ import annotations

import math

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
from solver.section.boundary_layer.compiled import compiled_part, inlined, of_one_type
from solver.section.boundary_layer.constants import (
    DISSIPATION_FROM_H,
    DISSIPATION_RISE,
    DISSIPATION_SPAN,
    EQUILIBRIUM,
    INNER_LAYER,
    LAG,
)
from solver.section.boundary_layer.layout import (
    FRICTION,
    GAIN,
    LAST,
    LN_DSTAR,
    LN_ENERGY,
    LN_EQUILIBRIUM,
    LN_SPEED,
    LN_THETA,
    LN_THICKNESS,
    PLACE,
    RATE,
    FloatArray,
    Regime,
    Sloped,
)

AT_WALL = of_one_type(False)
"""Not in the wake."""

FULLEST_WALL_H, FULLEST_WAKE_H = 1.25, 1.06
"""Below these no turbulent layer is known: the energy shape parameter is bent upwards there,
so that H has a value for any acceleration and never comes to its floor."""
BEND = 0.1
"""How strongly it is bent."""
FASTEST_SLIP_WALL, FASTEST_SLIP_WAKE = 0.95, 0.99
"""Largest slip speed Us, over ue."""
LEAST_OUTER = 0.2
"""Least share of H - 1 that is left to the outer layer, at a low Rt."""
THICKEST = 12.0
"""Largest thickness delta of a layer, over theta."""


@compiled_part
def _spread(row: FloatArray, over_h: float, over_rt: float, h: float) -> None:
    """Slopes over the state from slopes over H and ln Rt."""
    row[LN_THETA] = -h * over_h + over_rt
    row[LN_DSTAR] = h * over_h
    row[LN_SPEED] = over_rt
    row[LAST] = 0.0
    row[PLACE] = 0.0


@compiled_part
def _over_theta(value: float, row: FloatArray, factor: float) -> None:
    """Slopes of value * factor from those of value, where the factor goes as 1/theta."""
    for j in range(5):
        row[j] *= factor
    row[LN_THETA] -= value * factor


@compiled_part
def _fill_per_theta(
    flux: Sloped, over_last: float, xi: float, theta: float, h: float, row: FloatArray
) -> float:
    """Fill the slopes of xi flux/theta; returns its value."""
    ratio = xi / theta
    _spread(row, flux.over_h, flux.over_rt, h)
    row[LAST] = over_last
    _over_theta(flux.value, row, ratio)
    row[PLACE] = flux.value / theta
    return ratio * flux.value


@compiled_part
def laminar_station(
    state: FloatArray, xi: float, regime: Regime, value: FloatArray, slope: FloatArray
) -> None:
    """Fill the quantities of a laminar station.

    Parameters
    ----------
    state : numpy.ndarray, shape (4,)
        (ln theta, ln dstar, ln ue, n).
    xi : float
        Place along the surface. [-]
    regime : Regime
    value : numpy.ndarray, shape (6,)
        Filled, but for the two rows that turbulent layers alone have.
    slope : numpy.ndarray, shape (6, 5)
        Filled likewise.
    """
    theta = math.exp(state[LN_THETA])
    h = math.exp(state[LN_DSTAR] - state[LN_THETA])
    if h < LEAST_LAMINAR_H:
        h = LEAST_LAMINAR_H
    rt = regime.reynolds * math.exp(state[LN_THETA] + state[LN_SPEED])
    hs, hs_h = laminar_energy(h)
    value[LN_ENERGY] = math.log(hs)
    _spread(slope[LN_ENERGY], hs_h / hs, 0.0, h)
    cf, cf_h = laminar_friction(h)
    cd, cd_h = laminar_dissipation(h)
    cf, cf_h, cd, cd_h = cf / rt, cf_h / rt, cd / rt, cd_h / rt
    friction, gain = Sloped(cf, cf_h, -cf), Sloped(cd - cf, cd_h - cf_h, -(cd - cf))
    value[FRICTION] = _fill_per_theta(friction, 0.0, xi, theta, h, slope[FRICTION])
    value[GAIN] = _fill_per_theta(gain, 0.0, xi, theta, h, slope[GAIN])
    grown = growth(h, rt, regime.constants)
    value[RATE] = grown.value / theta
    _spread(slope[RATE], grown.over_h, grown.over_rt, h)
    _over_theta(grown.value, slope[RATE], 1.0 / theta)


@inlined
def _bent_energy(h: float, rt: float, wake: bool) -> Sloped:
    """Turbulent energy shape parameter, bent upwards below the fullest layers known."""
    energy = turbulent_energy(h, rt)
    full = FULLEST_WAKE_H if wake else FULLEST_WALL_H
    if h >= full:
        return energy
    d, e = full - h, h - 1.0
    return Sloped(
        energy.value + BEND * d * d / e,
        energy.over_h - BEND * (2.0 * d / e + d * d / (e * e)),
        energy.over_rt,
    )


@inlined
def _slip_speed(h: float, energy: Sloped, wake: bool) -> Sloped:
    """Slip speed Us = Hs/2 (1 - 4 (H - 1)/(3 H)), over ue."""
    form = 1.0 - 4.0 * (h - 1.0) / (3.0 * h)
    slip = 0.5 * energy.value * form
    cap = FASTEST_SLIP_WAKE if wake else FASTEST_SLIP_WALL
    if slip > cap:
        return Sloped(cap, 0.0, 0.0)
    over_h = 0.5 * energy.over_h * form - 0.5 * energy.value * 4.0 / (3.0 * h * h)
    return Sloped(slip, over_h, 0.5 * energy.over_rt * form)


@inlined
def _dissipation_factor(h: float, constants: FloatArray) -> tuple[float, float]:
    """Turbulent dissipation over the published one, and its slope over H."""
    over = h - constants[DISSIPATION_FROM_H]
    if over <= 0.0:
        return 1.0, 0.0
    span = constants[DISSIPATION_SPAN]
    e = math.exp(-over / span)
    return 1.0 + constants[DISSIPATION_RISE] * span * (1.0 - e), constants[DISSIPATION_RISE] * e


@inlined
def _dissipation(
    friction: Sloped, slip: Sloped, energy: Sloped, stress: float, factor: tuple[float, float]
) -> tuple[Sloped, float]:
    """2 CD/Hs with CD = cf/2 Us + S^2 (1 - Us), and its slope over ln S besides.

    The factor, with its slope over H, multiplies CD; in a wake it has both halves.
    """
    s2 = stress * stress
    raw = friction.value * slip.value + s2 * (1.0 - slip.value)
    raw_h = friction.over_h * slip.value + friction.value * slip.over_h - s2 * slip.over_h
    raw_r = friction.over_rt * slip.value + friction.value * slip.over_rt - s2 * slip.over_rt
    raw_s = 2.0 * stress * stress * (1.0 - slip.value)
    many, many_h = factor
    c = 2.0 / energy.value
    e = c * many * raw
    e_h = c * (many * raw_h + many_h * raw) - e * energy.over_h / energy.value
    e_r = c * many * raw_r - e * energy.over_rt / energy.value
    return Sloped(e, e_h, e_r), c * many * raw_s


@compiled_part
def _fill_equilibrium(
    h: float,
    rt: float,
    energy: Sloped,
    slip: Sloped,
    constants: FloatArray,
    value: FloatArray,
    slope: FloatArray,
) -> None:
    """Fill ln S of a layer in equilibrium.

    S^2 = EQUILIBRIUM Hs (H - 1) outer^2/((1 - Us) H^3), with outer = H - 1 but for what
    the inner layer takes of it.
    """
    inner = constants[INNER_LAYER] / rt
    outer = h - 1.0 - inner
    outer_h, outer_r = 1.0, inner
    if outer < LEAST_OUTER * (h - 1.0):
        outer, outer_h, outer_r = LEAST_OUTER * (h - 1.0), LEAST_OUTER, 0.0
    hs, still = energy.value, 1.0 - slip.value
    value[LN_EQUILIBRIUM] = 0.5 * math.log(
        constants[EQUILIBRIUM] * hs * (h - 1.0) * outer * outer / (still * h**3)
    )
    over_h = energy.over_h / hs + 1.0 / (h - 1.0) + 2.0 * outer_h / outer - 3.0 / h
    over_rt = energy.over_rt / hs + 2.0 * outer_r / outer
    _spread(
        slope[LN_EQUILIBRIUM],
        0.5 * (over_h + slip.over_h / still),
        0.5 * (over_rt + slip.over_rt / still),
        h,
    )


@compiled_part
def _fill_thickness(
    state: FloatArray, h: float, wake: bool, value: FloatArray, slope: FloatArray
) -> float:
    """Fill ln delta; returns delta/theta, of one half of a wake."""
    thick = 3.15 + 1.72 / (h - 1.0) + h
    over_h = 0.0
    if thick < THICKEST:
        over_h = (1.0 - 1.72 / (h - 1.0) ** 2) / thick
    else:
        thick = THICKEST
    _spread(slope[LN_THICKNESS], over_h, 0.0, h)
    slope[LN_THICKNESS, LN_THETA] += 1.0
    if wake:
        thick *= 0.5
    value[LN_THICKNESS] = state[LN_THETA] + math.log(thick)
    return thick


@compiled_part
def _fill_lag(
    stress: float, thickness: float, constants: FloatArray, value: FloatArray, slope: FloatArray
) -> None:
    """Fill d ln S/dxi = LAG/(2 delta) (S_eq - S), from the two rows filled before."""
    lag = 0.5 * constants[LAG] / thickness
    equilibrium = math.exp(value[LN_EQUILIBRIUM])
    value[RATE] = lag * (equilibrium - stress)
    for j in range(5):
        follows = lag * equilibrium * slope[LN_EQUILIBRIUM, j]
        slope[RATE, j] = follows - value[RATE] * slope[LN_THICKNESS, j]
    slope[RATE, LAST] -= lag * stress


@compiled_part
def turbulent_station(
    state: FloatArray,
    xi: float,
    wake: bool,
    regime: Regime,
    value: FloatArray,
    slope: FloatArray,
) -> None:
    """Fill the quantities of a turbulent station.

    Parameters
    ----------
    state : numpy.ndarray, shape (4,)
        (ln theta, ln dstar, ln ue, ln S).
    xi : float
        Place along the surface. [-]
    wake : bool
        Whether there is no wall: no friction, and both halves dissipate.
    regime : Regime
    value : numpy.ndarray, shape (6,)
        Filled.
    slope : numpy.ndarray, shape (6, 5)
        Filled.

    References
    ----------
    .. [1] M. Drela, M. B. Giles, Viscous-inviscid analysis of transonic and low Reynolds
       number airfoils, AIAA Journal 25(10), 1987; recalled, not read. Departures are
       the constants of `ClosureConstants` that are not called published there.
    """
    constants = regime.constants
    theta = math.exp(state[LN_THETA])
    h = math.exp(state[LN_DSTAR] - state[LN_THETA])
    if h < LEAST_TURBULENT_H:
        h = LEAST_TURBULENT_H
    rt = regime.reynolds * math.exp(state[LN_THETA] + state[LN_SPEED])
    stress = math.exp(state[LAST])
    energy = _bent_energy(h, rt, wake)
    value[LN_ENERGY] = math.log(energy.value)
    _spread(slope[LN_ENERGY], energy.over_h / energy.value, energy.over_rt / energy.value, h)
    slip = _slip_speed(h, energy, wake)
    friction = Sloped(0.0, 0.0, 0.0)
    if not wake:
        friction = turbulent_friction(h, rt)
    many, many_h = _dissipation_factor(h, constants)
    halves = 2.0 if wake else 1.0
    lost, lost_s = _dissipation(friction, slip, energy, stress, (halves * many, halves * many_h))
    gain = Sloped(
        lost.value - friction.value,
        lost.over_h - friction.over_h,
        lost.over_rt - friction.over_rt,
    )
    value[FRICTION] = _fill_per_theta(friction, 0.0, xi, theta, h, slope[FRICTION])
    value[GAIN] = _fill_per_theta(gain, lost_s, xi, theta, h, slope[GAIN])
    _fill_equilibrium(h, rt, energy, slip, constants, value, slope)
    thick = _fill_thickness(state, h, wake, value, slope)
    _fill_lag(stress, theta * thick, constants, value, slope)
