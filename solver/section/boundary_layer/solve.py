"""One point of a polar: Newton's iteration to its end.

Marches along both sides and the wake leave every speed as a linear function of the
changes of the mass defects. One dense system makes those speeds equal to the potential
flow's; what it gives is substituted back along the marches.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from solver.section.boundary_layer.advance import apply, largest_and_damping, relocate
from solver.section.boundary_layer.cells import scratch
from solver.section.boundary_layer.compiled import compiled, inlined
from solver.section.boundary_layer.constants import WAKE_CURVATURE
from solver.section.boundary_layer.layout import (
    FloatArray,
    LayerState,
    March,
    PotentialFlow,
    Regime,
    Scratch,
    Stagnation,
    Stations,
)
from solver.section.boundary_layer.march import march_side
from solver.section.boundary_layer.speeds import fill_speeds, fill_wake_angles
from solver.section.boundary_layer.system import assemble, back_substitute
from solver.section.boundary_layer.wake import march_wake
from solver.section.boundary_layer.wake_sheet import MIX_FROM, fill_sheet, relax_sheet

CONVERGED, MOVING, BROKEN = 0, 1, 2
"""How an iteration ended: at rest, without coming to rest, or in numbers that are none."""

AT_REST, SHEET_AT_REST = 2e-4, 3e-5
"""Largest change, as a share, of the last iteration, which squares it; and of the lagged
wake sheet, over the free stream."""
CYCLE, CYCLE_FROM = 6, 10
"""Iterations over which a limit cycle is looked for, and before which it is not."""
SLOWEST_GAIN = 0.5
"""The least change of a cycle over that of the one before it, above which steps are cut."""
CUT, LEAST_LIMIT = 0.6, 0.1
"""Factor by which steps are cut, and their least limit."""


class _System(NamedTuple):
    """The dense system, the speeds of the potential flow, and the changes found."""

    matrix: FloatArray
    right: FloatArray
    speed: FloatArray
    change: FloatArray
    delta: FloatArray


class _Sheet(NamedTuple):
    """The wake's directions, its fresh sheet, and what that last differed by."""

    angles: FloatArray
    fresh: FloatArray
    gap: FloatArray


@inlined
def _march_arrays(total: int) -> March:
    return March(
        np.zeros((total, 3, 7)),
        np.zeros((total, total + 2)),
        np.zeros((2, 3, total + 2)),
        np.zeros((3, total + 2)),
    )


@inlined
def _march_all(
    stagnation: Stagnation,
    stations: Stations,
    trip: FloatArray,
    regime: Regime,
    state: LayerState,
    march: March,
    arrays: Scratch,
) -> bool:
    """March both sides and the wake; returns success."""
    for side in range(2):
        if not march_side(side, stagnation, stations, trip[side], regime, state, march, arrays):
            return False
    return march_wake(stations, regime, state, march, arrays)


@inlined
def _solve(
    flow: PotentialFlow,
    state: LayerState,
    stagnation: Stagnation,
    stations: Stations,
    march: March,
    system: _System,
) -> bool:
    """Find the changes of all stations; returns success."""
    matrix, right = system.matrix, system.right
    assemble(flow.along, state, stagnation, stations, march, system.speed, matrix, right)
    # The solver refuses numbers that are none by an exception.
    if not (math.isfinite(matrix.sum()) and math.isfinite(right.sum())):
        return False
    system.change[:] = np.linalg.solve(matrix, right)
    nodes = len(state.amplification)
    back_substitute(system.change, march, stagnation.node, nodes, system.delta)
    return math.isfinite(system.delta.sum())


@inlined
def _limit(history: FloatArray, iteration: int, limit: float, least: float) -> tuple[float, float]:
    """Limit of the damping factor, and the least change of the cycle that ends now.

    A limit cycle: the last six steps are no smaller than the six before them.
    """
    if iteration <= CYCLE_FROM or iteration % CYCLE != 0:
        return limit, least
    recent = history[iteration - CYCLE : iteration, 0].min()
    limit = CUT * limit if recent > SLOWEST_GAIN * least else 1.0
    return max(limit, LEAST_LIMIT), recent


@inlined
def _renew_sheet(
    flow: PotentialFlow,
    stations: Stations,
    regime: Regime,
    state: LayerState,
    stagnation: int,
    speed: FloatArray,
    sheet: _Sheet,
    known: bool,
    mix: float,
) -> tuple[float, float]:
    """Turn the wake's sheet towards where the flow goes now; returns mix and distance."""
    fill_wake_angles(flow, state, stagnation, speed, sheet.angles)
    fill_sheet(state, stations, sheet.angles, regime, sheet.fresh)
    mix, moved = relax_sheet(state, sheet.fresh, sheet.gap, known, mix)
    fill_speeds(flow.along, state, stagnation, speed)
    return mix, moved


@compiled
def solve_point(
    flow: PotentialFlow,
    stations: Stations,
    trip: FloatArray,
    regime: Regime,
    state: LayerState,
    history: FloatArray,
    iterations: int,
) -> tuple[int, int, float]:
    """Iterate one point.

    Parameters
    ----------
    flow : PotentialFlow
        At the angle of attack.
    stations : Stations
    trip : numpy.ndarray, shape (2,)
        Places of forced transition on both sides, from the stagnation point. [-]
    regime : Regime
    state : LayerState
        To begin with; changed in place.
    history : numpy.ndarray, shape (iterations, 5)
        Filled: largest change, damping factor, distance of the wake's sheet from its
        fresh one, first turbulent nodes of both sides.
    iterations : int
        At most so many.

    Returns
    -------
    tuple of int, int, float
        `CONVERGED`, `MOVING` or `BROKEN`; iterations; the last one's largest change.
    """
    nodes, total = len(state.amplification), len(state.stations)
    wake = total - nodes
    arrays, march = scratch(), _march_arrays(total)
    system = _System(
        np.empty((total + 1, total + 1)),
        np.empty(total + 1),
        np.empty(total),
        np.empty(total + 1),
        np.zeros((total, 3)),
    )
    sheet = _Sheet(np.empty(wake), np.empty(wake + 1), np.zeros(wake + 1))
    node, largest, moved, mix, limit, least = int(state.place[0]), 1.0, 0.0, 1.0, 1.0, np.inf
    for iteration in range(iterations):
        fill_speeds(flow.along, state, node, system.speed)
        stagnation = relocate(state, system.speed, node, stations, regime.reynolds)
        node = stagnation.node
        if regime.constants[WAKE_CURVATURE] > 0.0:
            known = iteration > 0 and largest < MIX_FROM
            mix, moved = _renew_sheet(
                flow, stations, regime, state, node, system.speed, sheet, known, mix
            )
        if not _march_all(stagnation, stations, trip, regime, state, march, arrays):
            return BROKEN, iteration, largest
        if not _solve(flow, state, stagnation, stations, march, system):
            return BROKEN, iteration, largest
        limit, least = _limit(history, iteration, limit, least)
        largest, damping = largest_and_damping(state, system.delta, system.change, node, limit)
        apply(state, system.delta, system.change, node, damping)
        history[iteration, 0], history[iteration, 1] = largest, damping
        history[iteration, 2] = moved
        history[iteration, 3:] = state.turbulent_from
        state.place[0], state.place[1] = node, stagnation.arc
        if largest < AT_REST and moved < SHEET_AT_REST:
            return CONVERGED, iteration + 1, largest
    return MOVING, iterations, largest
