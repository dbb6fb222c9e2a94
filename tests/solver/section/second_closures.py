"""The boundary layer's closure relations once more, in plain numpy, from the papers.

M. Drela, M. B. Giles, AIAA J. 25(10), 1987; lag and equilibrium after J. E. Green,
D. J. Weeks, J. W. F. Brooman, RAE R&M 3791, 1973; amplification in the manner of
J. L. van Ingen, Delft VTH-74, 1956. Constants from memory of the papers;
`tests/published` holds them against tables of computed layers. H is dstar/theta, Rt
the Reynolds number on theta and the speed at the edge.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

INITIAL_SHEAR = 0.7
"""Square of the ratio of the turbulent stress at transition to that in equilibrium."""

EQUILIBRIUM = 0.015
"""Of the stress coefficient in equilibrium."""


@dataclass(frozen=True)
class Closures:
    """What is not as published in the closure relations and the cells made of them.

    Parameters
    ----------
    separated_growth : float
        Factor on the growth of disturbances in separated profiles; 1 is as published.
    ramp : {"linear", "smooth"}
        How that factor comes in between H of 3.5 and 4.5.
    falling : {"own", "before"}
        Where H falls along a cell, disturbances grow at its end with the H there, or
        still with that at its beginning.
    reversed_length : bool
        Whether disturbances in profiles with reversed flow grow along layers that are
        as thick as those similar ones; if not, as the published fits have it, which
        end at separation.
    dissipation_rise, dissipation_from, dissipation_span : float
        Rise of the turbulent dissipation for each unit of H above a beginning, at
        first; it comes to an end over a span. A rise of 0 is as published.
    inner_layer : float
        What the inner layer takes from H - 1 in the stress in equilibrium, times Rt;
        0 is as published.
    fullest : bool
        Whether the energy shape parameter of turbulent layers rises below what H is
        known to have.
    relaxing : float
        Length, in theta, over which the shape of turbulent layers relaxes, for the
        weights of both ends of a cell; 0 is the plain mean.
    waves_at_edge : bool
        Whether a side that is laminar to its end begins the wake with what stress its
        waves have grown to; if not, with that of a layer at transition.
    """

    separated_growth: float = 0.74
    ramp: Literal["linear", "smooth"] = "smooth"
    falling: Literal["own", "before"] = "before"
    reversed_length: bool = True
    dissipation_rise: float = 0.3
    dissipation_from: float = 1.8
    dissipation_span: float = 1.0
    inner_layer: float = 18.0
    fullest: bool = True
    relaxing: float = 5.0
    waves_at_edge: bool = True


PUBLISHED = Closures(
    separated_growth=1.0,
    ramp="linear",
    falling="own",
    reversed_length=False,
    dissipation_rise=0.0,
    inner_layer=0.0,
    fullest=False,
    relaxing=0.0,
    waves_at_edge=False,
)


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


def growth_length(H: Array, closures: Closures = PUBLISHED) -> Array:
    """Find (m + 1) l / 2, the square of theta in the variables of similar layers."""
    fitted = 0.5 * (pressure_function(H) + length_function(H))
    if not closures.reversed_length:
        return np.asarray(fitted)
    beyond = np.clip(H, 4.0, 8.8) - 4.0  # 8.8 ends the table of layers with reversed flow
    return np.asarray(np.where(H > 4.0, 0.3438 / (1.0 + 0.05 * beyond**1.56), fitted))


def switched_on(Rt: Array, critical: Array) -> Array:
    """Cubic ramp of the growth about the critical Rt, 0.08 in log10 either way."""
    t = np.clip((np.log10(Rt / critical) + 0.08) / 0.16, 0.0, 1.0)
    return np.asarray(t * t * (3.0 - 2.0 * t))


def growth_rate(H: Array, theta: Array, Rt: Array, closures: Closures) -> Array:
    """Find dn/dxi."""
    along = growth_length(H, closures) / theta
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


def turbulent_energy_shape(
    H: Array, Rt: Array, closures: Closures = PUBLISHED, *, wake: bool = False
) -> Array:
    R = np.maximum(Rt, 200.0)
    H0 = np.where(R < 400.0, 4.0, 3.0 + 400.0 / R)
    base = 1.505 + 4.0 / R
    under = (0.165 - 1.6 / np.sqrt(R)) * np.maximum(H0 - H, 0.0) ** 1.6 / H
    over = np.maximum(H - H0, 0.0)
    log = np.log(R)
    beyond = over**2 * (0.04 / H + 0.007 * log / (over + 4.0 / log) ** 2)
    shape = base + np.where(H < H0, under, beyond)
    if closures.fullest:
        short = np.maximum((1.06 if wake else 1.25) - H, 0.0)
        shape = shape + 0.1 * short**2 / (H - 1.0)
    return np.asarray(shape)


def slip_speed(H: Array, Hs: Array, *, wake: bool) -> Array:
    slip = 0.5 * Hs * (1.0 - 4.0 * (H - 1.0) / (3.0 * H))
    return np.asarray(np.minimum(slip, 0.99 if wake else 0.95))


def layer_thickness(H: Array, theta: Array, dstar: Array) -> Array:
    return np.asarray(np.minimum(theta * (3.15 + 1.72 / (H - 1.0)) + dstar, 12.0 * theta))


def equilibrium_shear(
    H: Array, Rt: Array, closures: Closures = PUBLISHED, *, wake: bool = False
) -> Array:
    """Find S_eq, the square root of the shear stress coefficient in equilibrium."""
    Hs = turbulent_energy_shape(H, Rt, closures, wake=wake)
    slip = slip_speed(H, Hs, wake=wake)
    outer = np.maximum(H - 1.0 - closures.inner_layer / Rt, 0.2 * (H - 1.0))
    return np.asarray(np.sqrt(EQUILIBRIUM * Hs * (H - 1.0) / (1.0 - slip) / H**3) * outer)


def turbulent_dissipation(
    H: Array, Rt: Array, shear: Array, closures: Closures, *, wake: bool = False
) -> Array:
    """Find 2 CD / Hs."""
    Hs = turbulent_energy_shape(H, Rt, closures, wake=wake)
    slip = slip_speed(H, Hs, wake=wake)
    friction = np.zeros_like(H) if wake else turbulent_friction(H, Rt)
    CD = 0.5 * friction * slip + shear**2 * (1.0 - slip)
    spans = np.maximum(H - closures.dissipation_from, 0.0) / closures.dissipation_span
    most = closures.dissipation_rise * closures.dissipation_span
    halves = 2.0 if wake else 1.0
    return np.asarray(2.0 * halves * CD * (1.0 - most * np.expm1(-spans)) / Hs)


def initial_shear(H: Array, Rt: Array, closures: Closures = PUBLISHED) -> Array:
    """Find S where the layer becomes turbulent."""
    return np.asarray(np.sqrt(INITIAL_SHEAR) * equilibrium_shear(H, Rt, closures))
