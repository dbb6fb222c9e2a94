"""The boundary layer's cell equations once more, in plain numpy, to be set beside the kernels.

Two-equation integral method with lag: M. Drela, M. B. Giles, AIAA J. 25(10), 1987;
lag after J. E. Green, D. J. Weeks, J. W. F. Brooman, RAE R&M 3791, 1973; amplification
in the manner of J. L. van Ingen, Delft VTH-74, 1956. Constants from memory of the
papers; `tests/published` holds the closures against tables of computed layers.

Lengths are over chord, speeds over the free stream, everything is dimensionless. All
functions work station by station or cell by cell on arrays. Nothing of the solver is
imported here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

LAG_CONSTANT = 4.2
INITIAL_SHEAR = 0.7
"""Square of the ratio of the turbulent stress at transition to that in equilibrium."""
STAGNATION_CONSTANT = 0.513
STAGNATION_SHAPE = 0.64790 / 0.29234


@dataclass(frozen=True)
class Closures:
    """What may be changed in the closure relations.

    Parameters
    ----------
    separated_growth : float
        Factor on the growth of disturbances in separated profiles; 1 is as published.
    ramp : {"linear", "smooth"}
        How that factor comes in between H of 3.5 and 4.5.
    extra_dissipation : float
        Relative rise of the turbulent dissipation for each unit of H above 2.5; 0 is as
        published.
    """

    separated_growth: float = 0.6
    ramp: Literal["linear", "smooth"] = "linear"
    extra_dissipation: float = 0.1


PUBLISHED = Closures(separated_growth=1.0, extra_dissipation=0.0)


@dataclass(frozen=True, eq=False)
class Side:
    """Stations of one side, or of the wake, in the order of the flow.

    Parameters
    ----------
    xi : numpy.ndarray, shape (n,)
        Distance from the stagnation point along the surface and on along the wake.
    theta, dstar : numpy.ndarray, shape (n,)
        Momentum and displacement thickness.
    ue : numpy.ndarray, shape (n,)
        Speed at the edge of the layer.
    amplification : numpy.ndarray, shape (n,)
        n of e^n; anything behind transition.
    shear : numpy.ndarray, shape (n,)
        Square root of the shear stress coefficient; anything ahead of transition, but
        at the last station ahead of it the solver's own initial value.
    """

    xi: Array
    theta: Array
    dstar: Array
    ue: Array
    amplification: Array
    shear: Array


@dataclass(frozen=True, eq=False)
class Residuals:
    """What is left of each equation in each cell; NaN where it does not apply.

    Parameters
    ----------
    momentum, shape, growth, lag : numpy.ndarray, shape (n - 1,)
    turbulent : numpy.ndarray, shape (n - 1,)
        Share of the cell behind transition: 0 laminar, 1 turbulent.
    """

    momentum: Array
    shape: Array
    growth: Array
    lag: Array
    turbulent: Array


# Laminar layer


def laminar_energy_shape(H: Array) -> Array:
    steep = np.where(H < 4.0, 0.076, 0.040)
    return np.asarray(1.515 + steep * (H - 4.0) ** 2 / H)


def laminar_friction(H: Array, Rt: Array) -> Array:
    """Find cf."""
    attached = -0.067 + 0.01977 * (7.4 - H) ** 2 / (H - 1.0)
    far = np.maximum(H, 7.4)
    separated = -0.067 + 0.022 * (1.0 - 1.4 / (far - 6.0)) ** 2
    return np.asarray(2.0 * np.where(H < 7.4, attached, separated) / Rt)


def laminar_dissipation(H: Array, Rt: Array) -> Array:
    """Find 2 CD / Hs."""
    attached = 0.207 + 0.00205 * np.maximum(4.0 - H, 0.0) ** 5.5
    beyond = (H - 4.0) ** 2
    separated = 0.207 - 0.003 * beyond / (1.0 + 0.02 * beyond)
    return np.asarray(np.where(H < 4.0, attached, separated) / Rt)


# Amplification


def growth_over_reynolds(H: Array) -> Array:
    """Find dn/dRt of the envelope."""
    inner = 2.4 * H - 3.7 + 2.5 * np.tanh(1.5 * H - 4.65)
    return np.asarray(0.01 * np.sqrt(inner**2 + 0.25))


def critical_reynolds(H: Array) -> Array:
    """Find the Rt at which disturbances begin to grow."""
    bend = 1.0 / (H - 1.0)
    power = (1.415 * bend - 0.489) * np.tanh(20.0 * bend - 12.9) + 3.295 * bend + 0.44
    return np.asarray(10.0**power)


def length_function(H: Array) -> Array:
    """Find l = Re ue theta^2 / xi of similar layers."""
    return np.asarray((6.54 * H - 14.07) / H**2)


def pressure_function(H: Array) -> Array:
    """Find m l = Re theta^2 due/dxi of similar layers, ue growing with the power m of xi."""
    return np.asarray(0.058 * (H - 4.0) ** 2 / (H - 1.0) - 0.068)


def switched_on(Rt: Array, critical: Array) -> Array:
    """Cubic ramp of the growth about the critical Rt, 0.08 in log10 either way."""
    t = np.clip((np.log10(Rt / critical) + 0.08) / 0.16, 0.0, 1.0)
    return np.asarray(t * t * (3.0 - 2.0 * t))


def growth_rate(H: Array, theta: Array, Rt: Array, closures: Closures) -> Array:
    """Find dn/dxi."""
    along = 0.5 * (pressure_function(H) + length_function(H)) / theta
    start = switched_on(Rt, critical_reynolds(H))
    t = np.clip(H - 3.5, 0.0, 1.0)
    if closures.ramp == "smooth":
        t = t * t * (3.0 - 2.0 * t)
    slower = 1.0 - (1.0 - closures.separated_growth) * t
    return np.asarray(growth_over_reynolds(H) * along * start * slower)


# Turbulent layer


def turbulent_friction(H: Array, Rt: Array) -> Array:
    """Find cf."""
    decades = np.log10(np.maximum(Rt, 20.0))
    wall = 0.3 * np.exp(-1.33 * H) * decades ** (-1.74 - 0.31 * H)
    return np.asarray(wall + 0.00011 * (np.tanh(4.0 - H / 0.875) - 1.0))


def turbulent_energy_shape(H: Array, Rt: Array) -> Array:
    R = np.maximum(Rt, 200.0)
    H0 = np.where(R < 400.0, 4.0, 3.0 + 400.0 / R)
    base = 1.505 + 4.0 / R
    under = (0.165 - 1.6 / np.sqrt(R)) * np.maximum(H0 - H, 0.0) ** 1.6 / H
    over = np.maximum(H - H0, 0.0)
    log = np.log(R)
    beyond = over**2 * (0.04 / H + 0.007 * log / (over + 4.0 / log) ** 2)
    return np.asarray(base + np.where(H < H0, under, beyond))


def slip_speed(H: Array, Hs: Array, *, wake: bool) -> Array:
    slip = 0.5 * Hs * (1.0 - 4.0 * (H - 1.0) / (3.0 * H))
    return np.asarray(np.minimum(slip, 0.99 if wake else 0.95))


def layer_thickness(H: Array, theta: Array, dstar: Array) -> Array:
    return np.asarray(np.minimum(theta * (3.15 + 1.72 / (H - 1.0)) + dstar, 12.0 * theta))


def equilibrium_shear(H: Array, Rt: Array, *, wake: bool = False) -> Array:
    """Find S_eq, the square root of the shear stress coefficient in equilibrium."""
    Hs = turbulent_energy_shape(H, Rt)
    slip = slip_speed(H, Hs, wake=wake)
    return np.asarray(np.sqrt(0.015 * Hs * (H - 1.0) ** 3 / ((1.0 - slip) * H**3)))


def turbulent_dissipation(
    H: Array, Rt: Array, shear: Array, closures: Closures, *, wake: bool = False
) -> Array:
    """Find 2 CD / Hs."""
    Hs = turbulent_energy_shape(H, Rt)
    slip = slip_speed(H, Hs, wake=wake)
    friction = np.zeros_like(H) if wake else turbulent_friction(H, Rt)
    CD = 0.5 * friction * slip + shear**2 * (1.0 - slip)
    CD = CD * (1.0 + closures.extra_dissipation * np.maximum(H - 2.5, 0.0))
    halves = 2.0 if wake else 1.0
    return np.asarray(2.0 * halves * CD / Hs)


# Cells


def _mean(value: Array) -> Array:
    return np.asarray(0.5 * (value[1:] + value[:-1]))


def _momentum(side: Side, friction: Array) -> Array:
    H = side.dstar / side.theta
    pull = np.diff(np.log(side.xi)) * _mean(0.5 * side.xi * friction / side.theta)
    faster = np.diff(np.log(side.ue))
    return np.asarray(np.diff(np.log(side.theta)) + (2.0 + _mean(H)) * faster - pull)


def _shape(side: Side, energy_shape: Array, dissipation: Array, friction: Array) -> Array:
    H = side.dstar / side.theta
    loss = side.xi * (dissipation - 0.5 * friction) / side.theta
    faster = np.diff(np.log(side.ue))
    return np.asarray(
        np.diff(np.log(energy_shape))
        + (1.0 - _mean(H)) * faster
        - np.diff(np.log(side.xi)) * _mean(loss)
    )


def turbulent_share(side: Side, *, critical: float, trip: float | None = None) -> Array:
    """Share of each cell behind transition.

    Parameters
    ----------
    side : Side
        Amplification is read up to the first station at which it is critical.
    critical : float
        Amplification at transition.
    trip : float, optional
        Place xi of forced transition.
    """
    n, cells = side.amplification, len(side.xi) - 1
    share = np.zeros(cells)
    past = np.flatnonzero(n >= critical)
    if past.size and past[0] > 0:
        at = int(past[0]) - 1
        share[at] = (n[at + 1] - critical) / (n[at + 1] - n[at])
        share[at + 1 :] = 1.0
    elif past.size:
        share[:] = 1.0
    if trip is not None:
        forced = (side.xi[1:] - trip) / np.diff(side.xi)
        share = np.maximum(share, np.clip(forced, 0.0, 1.0))
    return share


def wall_residuals(
    side: Side,
    *,
    reynolds: float,
    critical: float,
    trip: float | None = None,
    closures: Closures | None = None,
) -> Residuals:
    """Evaluate every cell equation along one side.

    Parameters
    ----------
    side : Side
        Without the stagnation point itself, where xi is nothing.
    reynolds : float
        Of the chord.
    critical : float
        Amplification at transition.
    trip : float, optional
        Place xi of forced transition.
    closures : Closures, optional

    Returns
    -------
    Residuals
        In the cell with transition, momentum and shape are laminar and turbulent ones
        weighted by their shares of it; growth is laminar over the whole cell, and the
        lag is left out there (it starts inside the cell).
    """
    chosen = closures or Closures()
    H, Rt = side.dstar / side.theta, reynolds * side.ue * side.theta
    share = turbulent_share(side, critical=critical, trip=trip)
    friction = laminar_friction(H, Rt), turbulent_friction(H, Rt)
    energy = laminar_energy_shape(H), turbulent_energy_shape(H, Rt)
    dissipation = (
        laminar_dissipation(H, Rt),
        turbulent_dissipation(H, Rt, side.shear, chosen),
    )
    momentum = [_momentum(side, one) for one in friction]
    shape = [_shape(side, *one) for one in zip(energy, dissipation, friction, strict=True)]
    rate = growth_rate(H, side.theta, Rt, chosen)
    growth = np.diff(side.amplification) - np.diff(side.xi) * _mean(rate)
    return Residuals(
        momentum=_blend(share, *momentum),
        shape=_blend(share, *shape),
        growth=np.where(share < 1.0, growth, np.nan),
        lag=np.where(share == 1.0, _lag(side, Rt, wake=False), np.nan),
        turbulent=share,
    )


def wake_residuals(wake: Side, *, reynolds: float, closures: Closures | None = None) -> Residuals:
    """Evaluate every cell equation along the wake.

    Parameters
    ----------
    wake : Side
        Starts with what :func:`joined` makes of both sides at the trailing edge.
    reynolds : float
        Of the chord.
    closures : Closures, optional

    Returns
    -------
    Residuals
        No growth; turbulent throughout.
    """
    chosen = closures or Closures()
    H, Rt = wake.dstar / wake.theta, reynolds * wake.ue * wake.theta
    dissipation = turbulent_dissipation(H, Rt, wake.shear, chosen, wake=True)
    none = np.zeros_like(H)
    cells = len(H) - 1
    return Residuals(
        momentum=_momentum(wake, none),
        shape=_shape(wake, turbulent_energy_shape(H, Rt), dissipation, none),
        growth=np.full(cells, np.nan),
        lag=_lag(wake, Rt, wake=True),
        turbulent=np.ones(cells),
    )


def _blend(share: Array, laminar: Array, turbulent: Array) -> Array:
    """Weigh both by their shares; what has no share may be anything, NaN too."""
    only = np.where(share == 0.0, laminar, turbulent)
    mixed = (1.0 - share) * laminar + share * turbulent
    return np.asarray(np.where((share == 0.0) | (share == 1.0), only, mixed))


def _lag(side: Side, Rt: Array, *, wake: bool) -> Array:
    H = side.dstar / side.theta
    thickness = layer_thickness(H, side.theta, side.dstar) * (0.5 if wake else 1.0)
    wanted = equilibrium_shear(H, Rt, wake=wake)
    rate = LAG_CONSTANT / (2.0 * thickness) * (wanted - side.shear)
    return np.asarray(np.diff(np.log(side.shear)) - np.diff(side.xi) * _mean(rate))


# Beginning and end


def initial_shear(H: Array, Rt: Array) -> Array:
    """Find S where the layer becomes turbulent."""
    return np.asarray(np.sqrt(INITIAL_SHEAR) * equilibrium_shear(H, Rt))


def stagnation_theta(xi: Array, ue: Array, *, reynolds: float) -> Array:
    """Find theta near the stagnation point, where ue grows in proportion to xi.

    Thwaites' quadrature, theta^2 = 0.513 / (Re ue^6) times the integral of ue^5 over xi.
    """
    return np.asarray(np.sqrt(STAGNATION_CONSTANT * xi / (6.0 * reynolds * ue)))


def joined(upper: Side, lower: Side, *, gap: float = 0.0) -> tuple[float, float, float, float]:
    """What the wake starts with: theta, dstar, ue and S from the last stations of both sides."""
    theta = upper.theta[-1] + lower.theta[-1]
    dstar = upper.dstar[-1] + lower.dstar[-1] + gap
    ue = 0.5 * (upper.ue[-1] + lower.ue[-1])
    shear = (upper.theta[-1] * upper.shear[-1] + lower.theta[-1] * lower.shear[-1]) / theta
    return float(theta), float(dstar), float(ue), float(shear)


def drag(wake: Side) -> float:
    """Drag coefficient from the last wake station (H. B. Squire, A. D. Young, R&M 1838)."""
    H = wake.dstar[-1] / wake.theta[-1]
    return float(2.0 * wake.theta[-1] * wake.ue[-1] ** ((H + 5.0) / 2.0))
