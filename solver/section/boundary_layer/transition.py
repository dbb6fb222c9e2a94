"""The cell in which the flow turns turbulent: its laminar and turbulent equations, blended.

The cell is not split at transition. Every equation goes over from its laminar to its
turbulent form with the turbulent share of the cell, so that residuals stay continuous
when transition moves from one cell into the next.
"""

from __future__ import annotations

import math

from solver.section.boundary_layer.cells import balance, laminar_pair
from solver.section.boundary_layer.compiled import compiled_in_place, compiled_part, inlined
from solver.section.boundary_layer.constants import INITIAL_STRESS, LAG, RELAXING
from solver.section.boundary_layer.layout import (
    LAST,
    LN_EQUILIBRIUM,
    LN_THICKNESS,
    RATE,
    THIRD,
    FloatArray,
    Pair,
    Quantities,
    Regime,
    Scratch,
)
from solver.section.boundary_layer.stations import AT_WALL, turbulent_station

LEAST_GROWTH = 1e-12
"""Growth of n along a cell below which it turns nothing turbulent."""


@inlined
def _fill_natural_share(pair: Pair, regime: Regime, arrays: Scratch) -> float:
    """Turbulent share W of a cell by growth alone, and its slopes.

    W = 1 - (critical - n at station one)/(growth along the cell).
    """
    value, slope, cross = (
        arrays.cell.quantities.value,
        arrays.cell.quantities.slope,
        arrays.cell.quantities.cross,
    )
    first, second = arrays.blend.share_first, arrays.blend.share_second
    dxi = pair.xi[1] - pair.xi[0]
    grown: float = 0.5 * dxi * (value[0, RATE] + value[1, RATE])
    left: float = regime.critical - pair.one[LAST]
    first[:] = 0.0
    second[:] = 0.0
    if not (grown > left and grown > LEAST_GROWTH):
        return 0.0
    left = max(left, 0.0)
    for j in range(4):
        first[j] = left / (grown * grown) * 0.5 * dxi * slope[0, RATE, j]
        second[j] = left / (grown * grown) * 0.5 * dxi * slope[1, RATE, j]
    for j in range(2):
        first[j] += left / (grown * grown) * 0.5 * dxi * cross[j]
    first[LAST] += 1.0 / grown
    return 1.0 - left / grown


@inlined
def _fill_share(pair: Pair, trip: float, regime: Regime, arrays: Scratch) -> float:
    """Turbulent share of a cell by growth, or by a trip that is ahead, and its slopes."""
    share = _fill_natural_share(pair, regime, arrays)
    tripped = (pair.xi[1] - trip) / (pair.xi[1] - pair.xi[0])
    if tripped > share:
        share = min(tripped, 1.0)
        arrays.blend.share_first[:] = 0.0
        arrays.blend.share_second[:] = 0.0
    return share


@inlined
def _fill_turbulent_pair(pair: Pair, regime: Regime, guess: FloatArray, both: Quantities) -> None:
    """Quantities of both stations were the cell turbulent; the first has initial stress.

    That stress depends on the state of station one, and so do the quantities through it.
    """
    value, slope = both.value, both.slope
    for q in range(LAST):
        guess[q] = pair.one[q]
    guess[LAST] = 0.0
    turbulent_station(guess, pair.xi[0], AT_WALL, regime, value[0], slope[0])
    lower = math.log(math.sqrt(regime.constants[INITIAL_STRESS]))
    guess[LAST] = value[0, LN_EQUILIBRIUM] + lower
    turbulent_station(guess, pair.xi[0], AT_WALL, regime, value[0], slope[0])
    for q in range(LN_EQUILIBRIUM):
        over_stress = slope[0, q, LAST]
        for j in range(LAST):
            slope[0, q, j] += over_stress * slope[0, LN_EQUILIBRIUM, j]
        slope[0, q, LAST] = 0.0
    turbulent_station(pair.two, pair.xi[1], AT_WALL, regime, value[1], slope[1])


@inlined
def _blend(share: float, arrays: Scratch) -> None:
    """Momentum and energy shape: laminar and turbulent ones by the turbulent share."""
    residual, first, second = arrays.cell.equations
    laminar, laminar_first, laminar_second = arrays.blend.laminar
    calm = 1.0 - share
    for row in range(THIRD):
        first[row, LAST] = 0.0
        gap = residual[row] - laminar[row]
        residual[row] = calm * laminar[row] + share * residual[row]
        for j in range(5):
            mixed = calm * laminar_first[row, j] + share * first[row, j]
            first[row, j] = mixed + gap * arrays.blend.share_first[j]
            mixed = calm * laminar_second[row, j] + share * second[row, j]
            second[row, j] = mixed + gap * arrays.blend.share_second[j]


@compiled_part
def _fill_lag(pair: Pair, share: float, regime: Regime, arrays: Scratch) -> None:
    """Lag from the initial stress, at the place of transition, over the turbulent share.

    Equilibrium and thickness at that place lie between those of both stations.
    """
    value, slope = arrays.cell.quantities.value, arrays.cell.quantities.slope
    residual, first, second = arrays.cell.equations
    dxi = pair.xi[1] - pair.xi[0]
    initial = math.sqrt(regime.constants[INITIAL_STRESS])
    half_lag = (1.0 - initial) * 0.5 * regime.constants[LAG]
    gap_e = value[0, LN_EQUILIBRIUM] - value[1, LN_EQUILIBRIUM]
    gap_l = value[0, LN_THICKNESS] - value[1, LN_THICKNESS]
    equilibrium = value[1, LN_EQUILIBRIUM] + share * gap_e
    start = half_lag * math.exp(equilibrium - value[1, LN_THICKNESS] - share * gap_l)
    rate = 0.5 * (start + value[1, RATE])
    residual[THIRD] = pair.two[LAST] - equilibrium - math.log(initial) - share * dxi * rate
    over_share = -gap_e - dxi * rate - share * dxi * 0.5 * start * (gap_e - gap_l)
    for j in range(5):
        e1 = share * slope[0, LN_EQUILIBRIUM, j]
        e2 = (1.0 - share) * slope[1, LN_EQUILIBRIUM, j]
        l1 = share * slope[0, LN_THICKNESS, j]
        l2 = (1.0 - share) * slope[1, LN_THICKNESS, j]
        first[THIRD, j] = -e1 - share * dxi * 0.5 * start * (e1 - l1)
        first[THIRD, j] += over_share * arrays.blend.share_first[j]
        second[THIRD, j] = -e2 - share * dxi * 0.5 * (start * (e2 - l2) + slope[1, RATE, j])
        second[THIRD, j] += over_share * arrays.blend.share_second[j]
    second[THIRD, LAST] += 1.0


@compiled_in_place
def transition_cell(pair: Pair, trip: float, regime: Regime, arrays: Scratch) -> float:
    """Fill residuals and slopes of the cell in which the flow turns turbulent.

    Parameters
    ----------
    pair : Pair
        Station one carries n, station two ln S.
    trip : float
        Place of forced transition along the surface. [-]
    regime : Regime
    arrays : Scratch
        The equations among its `cell` are filled.

    Returns
    -------
    float
        Turbulent share of the cell: from where n crosses the critical factor, or from
        the trip if that is ahead. [-]
    """
    laminar_pair(pair, regime, arrays.cell.quantities)
    balance(pair, 0.0, arrays.cell.quantities, arrays.blend.laminar)
    share = _fill_share(pair, trip, regime, arrays)
    _fill_turbulent_pair(pair, regime, arrays.blend.guess, arrays.cell.quantities)
    turbulent = Pair(arrays.blend.guess, pair.two, pair.xi)
    balance(turbulent, regime.constants[RELAXING], arrays.cell.quantities, arrays.cell.equations)
    _blend(share, arrays)
    _fill_lag(pair, share, regime, arrays)
    return share
