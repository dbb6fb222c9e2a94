"""Speeds of the potential flow for the mass defects of the layers."""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.compiled import compiled, compiled_part, inlined
from solver.section.boundary_layer.layout import (
    LN_DSTAR,
    LN_SPEED,
    FloatArray,
    LayerState,
    Linear,
    PotentialFlow,
)

LEAST_WAKE_SPEED = 0.05
"""Floor of the speed along the wake when its direction is taken, over the free stream."""


@compiled_part
def mass_defect(state: FloatArray) -> float:
    """M = ue dstar of a station."""
    return math.exp(state[LN_DSTAR] + state[LN_SPEED])


@inlined
def _signed_defects(stations: FloatArray, stagnation: int) -> FloatArray:
    """Mass defects of all stations, negative where the flow runs against the nodes."""
    signed = np.empty(len(stations))
    for i in range(len(stations)):
        m = mass_defect(stations[i])
        signed[i] = -m if i <= stagnation else m
    return signed


@inlined
def _sheet_strengths(sheet: FloatArray, signed: FloatArray) -> FloatArray:
    """Vortex sheet at the wake's nodes, the trailing edge included."""
    strength = np.empty(len(sheet))
    nodes = len(signed) - len(sheet) + 1
    strength[0] = -sheet[0] * (signed[nodes - 1] - signed[0])
    for k in range(1, len(sheet)):
        strength[k] = -sheet[k] * signed[nodes + k - 1]
    return strength


@compiled
def fill_speeds(flow: Linear, state: LayerState, stagnation: int, out: FloatArray) -> None:
    """Fill speeds of the potential flow for the mass defects of a state.

    Parameters
    ----------
    flow : Linear
        Speeds at k places.
    state : LayerState
    stagnation : int
        Node before the stagnation point.
    out : numpy.ndarray, shape (k,)
        Filled. [-]
    """
    signed = _signed_defects(state.stations, stagnation)
    strength = _sheet_strengths(state.sheet, signed)
    out[:] = flow.base + np.dot(flow.defect, signed) + np.dot(flow.sheet, strength)


@compiled
def fill_wake_angles(
    flow: PotentialFlow, state: LayerState, stagnation: int, speed: FloatArray, out: FloatArray
) -> None:
    """Fill the directions of the flow midway along the wake's panels.

    Parameters
    ----------
    flow : PotentialFlow
    state : LayerState
    stagnation : int
        Node before the stagnation point.
    speed : numpy.ndarray, shape (n + w,)
        Along body and wake. [-]
    out : numpy.ndarray, shape (w,)
        Filled. [rad]
    """
    fill_speeds(flow.across, state, stagnation, out)
    nodes = len(speed) - len(out)
    for i in range(len(out)):
        along = 0.5 * (speed[nodes + i - 1] + speed[nodes + i])
        out[i] = flow.path[i] + math.atan2(out[i], max(along, LEAST_WAKE_SPEED))
