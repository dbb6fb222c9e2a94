"""The boundary layer's cell equations once more, in plain numpy, to be set beside the kernels.

Two-equation integral method with lag (M. Drela, M. B. Giles, AIAA J. 25(10), 1987)
with the relations of `second_closures`.

Lengths are over chord, speeds over the free stream, everything is dimensionless. All
functions work station by station or cell by cell on arrays. Nothing of the solver is
imported here.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from tests.solver.section.second_closures import (
    INITIAL_SHEAR,
    Array,
    Closures,
    equilibrium_shear,
    growth_rate,
    initial_shear,
    laminar_dissipation,
    laminar_energy_shape,
    laminar_friction,
    layer_thickness,
    turbulent_dissipation,
    turbulent_energy_shape,
    turbulent_friction,
)

LAG_CONSTANT = 4.2
STAGNATION_CONSTANT = 0.513


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
        Square root of the shear stress coefficient; anything ahead of transition.
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


# Cells


def _mean(value: Array) -> Array:
    return np.asarray(0.5 * (value[1:] + value[:-1]))


def _momentum(side: Side, friction: Array) -> Array:
    H = side.dstar / side.theta
    pull = np.diff(np.log(side.xi)) * _mean(0.5 * side.xi * friction / side.theta)
    faster = np.diff(np.log(side.ue))
    return np.asarray(np.diff(np.log(side.theta)) + (2.0 + _mean(H)) * faster - pull)


def late_weight(side: Side, closures: Closures) -> Array:
    """Weight of a cell's end in what a layer's shape relaxes by, 1/2 for short cells.

    Exact for a linear relaxation (W. Liniger, R. A. Willoughby, SIAM J. Numer. Anal. 7,
    1970).
    """
    if closures.relaxing == 0.0:
        return np.full(len(side.xi) - 1, 0.5)
    lengths = np.diff(side.xi) / (closures.relaxing * side.theta[1:])
    return np.asarray(-1.0 / np.expm1(-lengths) - 1.0 / lengths)


def _shape(
    side: Side, energy_shape: Array, dissipation: Array, friction: Array, late: Array | float = 0.5
) -> Array:
    H = side.dstar / side.theta
    loss = side.xi * (dissipation - 0.5 * friction) / side.theta
    faster = np.diff(np.log(side.ue))
    return np.asarray(
        np.diff(np.log(energy_shape))
        + (1.0 - _mean(H)) * faster
        - np.diff(np.log(side.xi)) * (loss[:-1] + late * np.diff(loss))
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
        weighted by their shares of it, the turbulent ones with the initial stress at
        its beginning; growth is laminar over the whole cell, and the lag begins with
        the initial stress at the place of transition.
    """
    chosen = closures or Closures()
    H, Rt = side.dstar / side.theta, reynolds * side.ue * side.theta
    share = turbulent_share(side, critical=critical, trip=trip)
    side = begun(side, reynolds=reynolds, critical=critical, trip=trip, closures=chosen)
    friction = laminar_friction(H, Rt), turbulent_friction(H, Rt)
    energy = laminar_energy_shape(H), turbulent_energy_shape(H, Rt, chosen)
    dissipation = (
        laminar_dissipation(H, Rt),
        turbulent_dissipation(H, Rt, side.shear, chosen),
    )
    momentum = [_momentum(side, one) for one in friction]
    late = 0.5, late_weight(side, chosen)
    shape = [_shape(side, *one) for one in zip(energy, dissipation, friction, late, strict=True)]
    return Residuals(
        momentum=_blend(share, *momentum),
        shape=_blend(share, *shape),
        growth=np.where(share < 1.0, _growth(side, Rt, chosen), np.nan),
        lag=np.where(share > 0.0, _lag(side, Rt, chosen, wake=False, share=share), np.nan),
        turbulent=share,
    )


def begun(
    side: Side,
    *,
    reynolds: float,
    critical: float,
    trip: float | None = None,
    closures: Closures | None = None,
) -> Side:
    """Give the stations ahead of transition the stress that turbulence would begin with.

    Parameters
    ----------
    side : Side
        Without the stagnation point.
    reynolds : float
        Of the chord.
    critical : float
        Amplification at transition.
    trip : float, optional
        Place xi of forced transition.
    closures : Closures, optional

    Returns
    -------
    Side
        Where it is laminar to its end, the stress there is less: it goes as the square
        of the waves, e^n, and they lack what n lacks; four at the most.
    """
    chosen = closures or Closures()
    share = turbulent_share(side, critical=critical, trip=trip)
    laminar = np.append(share < 1.0, share[-1] == 0.0)
    stress = initial_shear(side.dstar / side.theta, reynolds * side.ue * side.theta, chosen)
    shear = np.where(laminar, stress, side.shear)
    if laminar[-1] and chosen.waves_at_edge:
        shear[-1] *= np.exp(-np.clip(critical - side.amplification[-1], 0.0, 4.0))
    return replace(side, shear=shear)


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
    energy, none = turbulent_energy_shape(H, Rt, chosen, wake=True), np.zeros_like(H)
    cells = len(H) - 1
    return Residuals(
        momentum=_momentum(wake, none),
        shape=_shape(wake, energy, dissipation, none, late_weight(wake, chosen)),
        growth=np.full(cells, np.nan),
        lag=_lag(wake, Rt, chosen, wake=True),
        turbulent=np.ones(cells),
    )


def _blend(share: Array, laminar: Array, turbulent: Array) -> Array:
    """Weigh both by their shares; what has no share may be anything, NaN too."""
    only = np.where(share == 0.0, laminar, turbulent)
    mixed = (1.0 - share) * laminar + share * turbulent
    return np.asarray(np.where((share == 0.0) | (share == 1.0), only, mixed))


def _growth(side: Side, Rt: Array, closures: Closures) -> Array:
    H, theta = side.dstar / side.theta, side.theta
    at_end = np.maximum(H[:-1], H[1:]) if closures.falling == "before" else H[1:]
    rate = 0.5 * growth_rate(H[:-1], theta[:-1], Rt[:-1], closures)
    rate = rate + 0.5 * growth_rate(at_end, theta[1:], Rt[1:], closures)
    return np.asarray(np.diff(side.amplification) - np.diff(side.xi) * rate)


def _lag(
    side: Side, Rt: Array, closures: Closures, *, wake: bool, share: Array | None = None
) -> Array:
    """Begin where transition falls: there the logarithms of what is needed lie between."""
    H = side.dstar / side.theta
    if share is None:
        share = np.ones(len(H) - 1)
    thickness = np.log(layer_thickness(H, side.theta, side.dstar) * (0.5 if wake else 1.0))
    wanted = np.log(equilibrium_shear(H, Rt, closures, wake=wake))
    initial = 0.5 * np.log(INITIAL_SHEAR) + wanted[1:] - share * np.diff(wanted)
    first = np.where(share < 1.0, initial, np.log(side.shear[:-1]))
    rates = [
        0.5 * LAG_CONSTANT * np.exp(-delta) * (np.exp(equilibrium) - np.exp(shear))
        for delta, equilibrium, shear in (
            (
                thickness[1:] - share * np.diff(thickness),
                wanted[1:] - share * np.diff(wanted),
                first,
            ),
            (thickness[1:], wanted[1:], np.log(side.shear[1:])),
        )
    ]
    run = share * np.diff(side.xi)
    return np.asarray(np.log(side.shear[1:]) - first - run * 0.5 * (rates[0] + rates[1]))


# Beginning and end


def stagnation_theta(xi: Array, ue: Array, *, reynolds: float) -> Array:
    """Find theta near the stagnation point, where ue grows in proportion to xi.

    Thwaites' quadrature, theta^2 = 0.513 / (Re ue^6) times the integral of ue^5 over xi.
    """
    return np.asarray(np.sqrt(STAGNATION_CONSTANT * xi / (6.0 * reynolds * ue)))


def joined(upper: Side, lower: Side, *, gap: float = 0.0) -> tuple[float, float, float, float]:
    """What the wake starts with: theta, dstar, ue and S from the last stations of both sides.

    Both as :func:`begun` leaves them, if they may be laminar to their ends.
    """
    theta = upper.theta[-1] + lower.theta[-1]
    dstar = upper.dstar[-1] + lower.dstar[-1] + gap
    ue = 0.5 * (upper.ue[-1] + lower.ue[-1])
    shear = (upper.theta[-1] * upper.shear[-1] + lower.theta[-1] * lower.shear[-1]) / theta
    return float(theta), float(dstar), float(ue), float(shear)


def drag(wake: Side) -> float:
    """Drag coefficient from the last wake station (H. B. Squire, A. D. Young, R&M 1838)."""
    H = wake.dstar[-1] / wake.theta[-1]
    return float(2.0 * wake.theta[-1] * wake.ue[-1] ** ((H + 5.0) / 2.0))
