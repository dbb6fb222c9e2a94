"""The vortex sheet of a curved wake, which lags one iteration behind the layers.

Across a curved wake pressure jumps by kappa ue^2 (dstar + theta), which a vortex sheet
brings about (Lock and Firmin, Survey of techniques for estimating viscous effects in
external aerodynamics, Academic Press, 1982; recalled). Written as a strength for each
unit of mass defect, kappa (1 + min(H, 2.5))/H, it is implicit but for that factor.
"""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.compiled import inlined
from solver.section.boundary_layer.constants import WAKE_CURVATURE, WAKE_SMOOTHING
from solver.section.boundary_layer.layout import (
    LN_DSTAR,
    LN_THETA,
    FloatArray,
    LayerState,
    Regime,
    Stations,
)

SHARPEST_TURN = 0.02
"""Least length, each way, over which the wake's curvature is taken."""
SEPARATED_WAKE_H = 2.5
"""Above it the layer behind the section is separated and the sheet fades, as H^-3: without
that very cambered sections lose much of their largest lift. Set by trial."""
LEAST_MIX, LARGEST_MIX = 0.15, 1.5
"""Of what is new in a sheet, by Aitken's relaxation."""
MIX_FROM = 0.5
"""Largest change of the layers, as a share, from which on that relaxation tells anything."""


@inlined
def _thicknesses(state: LayerState, k: int) -> tuple[float, float]:
    """Theta and dstar at a node of the wake, at the trailing edge those of both sides."""
    nodes = len(state.amplification)
    at = state.stations
    if k == 0:
        one, two = at[0], at[nodes - 1]
        t = math.exp(one[LN_THETA]) + math.exp(two[LN_THETA])
        return t, math.exp(one[LN_DSTAR]) + math.exp(two[LN_DSTAR])
    return math.exp(at[nodes + k - 1, LN_THETA]), math.exp(at[nodes + k - 1, LN_DSTAR])


@inlined
def fill_sheet(
    state: LayerState, stations: Stations, angles: FloatArray, regime: Regime, sheet: FloatArray
) -> None:
    """Fill the strength of the sheet for each unit of mass defect.

    Parameters
    ----------
    state : LayerState
    stations : Stations
    angles : numpy.ndarray, shape (w,)
        Direction of the flow midway along the wake's panels. [rad]
    regime : Regime
    sheet : numpy.ndarray, shape (w + 1,)
        Filled.
    """
    distance, constants = stations.distance, regime.constants
    middle = 0.5 * (distance[1:] + distance[:-1])
    begin, end = middle[0], middle[len(middle) - 1]
    for k in range(len(sheet)):
        t, d = _thicknesses(state, k)
        h = d / t
        half = max(SHARPEST_TURN, constants[WAKE_SMOOTHING] * (t + d))
        low = min(max(distance[k] - half, begin), end)
        high = min(max(distance[k] + half, begin), end)
        turned = np.interp(high, middle, angles) - np.interp(low, middle, angles)
        kappa = turned / (2.0 * half)
        fade = 1.0 if h < SEPARATED_WAKE_H else (SEPARATED_WAKE_H / h) ** 3
        sheet[k] = constants[WAKE_CURVATURE] * kappa * (1.0 + min(h, SEPARATED_WAKE_H)) / h * fade


@inlined
def relax_sheet(
    state: LayerState, fresh: FloatArray, gap_before: FloatArray, known: bool, before: float
) -> tuple[float, float]:
    """Move the sheet of a state towards a fresh one.

    Parameters
    ----------
    state : LayerState
        Its sheet is changed.
    fresh : numpy.ndarray, shape (w + 1,)
    gap_before : numpy.ndarray, shape (w + 1,)
        What was lacking the last time; brought up to date.
    known : bool
        Whether there was a last time: else the whole gap is taken.
    before : float
        Mix of the last time.

    Returns
    -------
    tuple of float
        Mix; largest gap times dstar, a speed over that of the free stream. [-]

    Notes
    -----
    Aitken's relaxation, for vectors.
    """
    nodes = len(state.amplification)
    top = bottom = 0.0
    for k in range(len(fresh)):
        gap = fresh[k] - state.sheet[k]
        top += gap_before[k] * (gap - gap_before[k])
        bottom += (gap - gap_before[k]) ** 2
        gap_before[k] = gap
    mix = 1.0
    if known and bottom > 0.0:
        mix = min(max(-before * top / bottom, LEAST_MIX), LARGEST_MIX)
    moved = 0.0
    for k in range(len(fresh)):
        dstar = math.exp(state.stations[max(nodes + k - 1, nodes), LN_DSTAR])
        moved = max(moved, abs(gap_before[k]) * dstar)
        state.sheet[k] += mix * gap_before[k]
    return mix, moved
