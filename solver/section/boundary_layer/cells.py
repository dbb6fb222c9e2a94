"""The equations of one cell between two stations, and their slopes.

Momentum, energy shape and growth (or lag), in logarithmic differences, after Drela and
Giles (AIAA Journal 25(10), 1987), recalled.
"""

from __future__ import annotations

import math

import numpy as np

from solver.section.boundary_layer.closures import growth
from solver.section.boundary_layer.compiled import (
    compiled,
    compiled_in_place,
    compiled_part,
    inlined,
    of_one_type,
)
from solver.section.boundary_layer.constants import RELAXING
from solver.section.boundary_layer.layout import (
    FRICTION,
    GAIN,
    LAST,
    LN_DSTAR,
    LN_ENERGY,
    LN_SPEED,
    LN_THETA,
    MOMENTUM,
    PLACE,
    RATE,
    SHAPE,
    THIRD,
    Blend,
    CellArrays,
    Equations,
    Pair,
    Quantities,
    Regime,
    Scratch,
)
from solver.section.boundary_layer.stations import laminar_station, turbulent_station

LAMINAR, TURBULENT, WAKE = of_one_type(0), of_one_type(1), of_one_type(2)
"""Kinds of a cell."""

FEW_LENGTHS, MANY_LENGTHS = 0.05, 40.0
"""Relaxation lengths of a cell beyond which the weight's limits take over from its formula."""

Means = tuple[float, float, float]


@compiled
def scratch() -> Scratch:
    """Make the arrays that cells fill.

    Returns
    -------
    Scratch
    """
    return Scratch(
        CellArrays(
            Quantities(np.zeros((2, 6)), np.zeros((2, 6, 5)), np.zeros(2)),
            Equations(np.zeros(3), np.zeros((3, 5)), np.zeros((3, 5))),
        ),
        Blend(
            Equations(np.zeros(3), np.zeros((3, 5)), np.zeros((3, 5))),
            np.zeros(5),
            np.zeros(5),
            np.zeros(4),
        ),
    )


@inlined
def late_share(r: float) -> tuple[float, float]:
    """Weight of station two in the mean over a cell.

    Parameters
    ----------
    r : float
        Length of the cell over that of relaxation. [-]

    Returns
    -------
    tuple of float
        The weight, and its slope over r. [-]

    Notes
    -----
    Exponential fitting, exact for a quantity that relaxes linearly [1]_: one half for
    small r and one for large.

    References
    ----------
    .. [1] W. Liniger, R. A. Willoughby, Efficient integration methods for stiff systems
       of ordinary differential equations, SIAM J. Numer. Anal. 7, 1970; recalled.
    """
    if r < FEW_LENGTHS:
        return 0.5 + r / 12.0, 1.0 / 12.0
    if r > MANY_LENGTHS:
        return 1.0 - 1.0 / r, 1.0 / (r * r)
    e = math.exp(-r)
    return 1.0 / (1.0 - e) - 1.0 / r, 1.0 / (r * r) - e / ((1.0 - e) * (1.0 - e))


@inlined
def _fill_momentum(pair: Pair, means: Means, quantities: Quantities, equations: Equations) -> None:
    """Fill d ln theta + (2 + H) d ln ue - d ln xi (xi cf/(2 theta)).

    H and friction are means; `means` are H at both stations and d ln xi.
    """
    one, two, xi = pair
    value, slope = quantities.value, quantities.slope
    first, second = equations.first, equations.second
    du = two[LN_SPEED] - one[LN_SPEED]
    h1, h2, x = means
    h = 0.5 * (h1 + h2)
    friction = 0.5 * (value[0, FRICTION] + value[1, FRICTION])
    equations.residual[MOMENTUM] = two[LN_THETA] - one[LN_THETA] + (2.0 + h) * du - x * friction
    for j in range(5):
        first[MOMENTUM, j] = -0.5 * x * slope[0, FRICTION, j]
        second[MOMENTUM, j] = -0.5 * x * slope[1, FRICTION, j]
    half1, half2 = 0.5 * h1 * du, 0.5 * h2 * du
    first[MOMENTUM, LN_THETA] -= 1.0 + half1
    first[MOMENTUM, LN_DSTAR] += half1
    first[MOMENTUM, LN_SPEED] -= 2.0 + h
    first[MOMENTUM, PLACE] += friction / xi[0]
    second[MOMENTUM, LN_THETA] += 1.0 - half2
    second[MOMENTUM, LN_DSTAR] += half2
    second[MOMENTUM, LN_SPEED] += 2.0 + h
    second[MOMENTUM, PLACE] -= friction / xi[1]


@inlined
def _fill_shape(
    pair: Pair, means: Means, relaxing: float, quantities: Quantities, equations: Equations
) -> None:
    """Fill d ln Hs + (1 - H) d ln ue - d ln xi (xi (2 CD/Hs - cf/2)/theta).

    The last mean leans towards station two by `late_share`.
    """
    one, two, xi = pair
    value, slope = quantities.value, quantities.slope
    first, second = equations.first, equations.second
    du = two[LN_SPEED] - one[LN_SPEED]
    h1, h2, x = means
    h = 0.5 * (h1 + h2)
    late, late_r, r = 0.5, 0.0, 0.0
    if relaxing > 0.0:
        r = (xi[1] - xi[0]) / (relaxing * math.exp(two[LN_THETA]))
        late, late_r = late_share(r)
    gain = (1.0 - late) * value[0, GAIN] + late * value[1, GAIN]
    equations.residual[SHAPE] = (
        value[1, LN_ENERGY] - value[0, LN_ENERGY] + (1.0 - h) * du - x * gain
    )
    for j in range(5):
        first[SHAPE, j] = -slope[0, LN_ENERGY, j] - (1.0 - late) * x * slope[0, GAIN, j]
        second[SHAPE, j] = slope[1, LN_ENERGY, j] - late * x * slope[1, GAIN, j]
    second[SHAPE, LN_THETA] += x * (value[1, GAIN] - value[0, GAIN]) * late_r * r
    half1, half2 = 0.5 * h1 * du, 0.5 * h2 * du
    first[SHAPE, LN_THETA] += half1
    first[SHAPE, LN_DSTAR] -= half1
    first[SHAPE, LN_SPEED] -= 1.0 - h
    first[SHAPE, PLACE] += gain / xi[0]
    second[SHAPE, LN_THETA] += half2
    second[SHAPE, LN_DSTAR] -= half2
    second[SHAPE, LN_SPEED] += 1.0 - h
    second[SHAPE, PLACE] -= gain / xi[1]


@inlined
def _fill_third(pair: Pair, quantities: Quantities, equations: Equations) -> None:
    """Fill da - dxi (da/dxi), for growth in laminar cells and lag in turbulent ones."""
    value, slope = quantities.value, quantities.slope
    first, second = equations.first, equations.second
    dxi = pair.xi[1] - pair.xi[0]
    rate = 0.5 * (value[0, RATE] + value[1, RATE])
    equations.residual[THIRD] = pair.two[LAST] - pair.one[LAST] - dxi * rate
    for j in range(5):
        first[THIRD, j] = -0.5 * dxi * slope[0, RATE, j]
        second[THIRD, j] = -0.5 * dxi * slope[1, RATE, j]
    first[THIRD, LAST] -= 1.0
    second[THIRD, LAST] += 1.0


@compiled_part
def balance(pair: Pair, relaxing: float, quantities: Quantities, equations: Equations) -> None:
    """Fill residuals and slopes of a cell of one kind.

    Parameters
    ----------
    pair : Pair
    relaxing : float
        Relaxation length of the energy shape parameter over theta; 0 weighs both
        stations alike. [-]
    quantities : Quantities
        Of both stations.
    equations : Equations
        Filled. Slopes over the places are good for a shift of both at once, all that
        ever happens to them: what depends on the cell's length alone is left out.
    """
    one, two, xi = pair.one, pair.two, pair.xi
    h1 = math.exp(one[LN_DSTAR] - one[LN_THETA])
    h2 = math.exp(two[LN_DSTAR] - two[LN_THETA])
    means = (h1, h2, math.log(xi[1] / xi[0]))
    _fill_momentum(pair, means, quantities, equations)
    _fill_shape(pair, means, relaxing, quantities, equations)
    _fill_third(pair, quantities, equations)


@compiled_part
def laminar_pair(pair: Pair, regime: Regime, quantities: Quantities) -> None:
    """Fill the quantities of both stations of a laminar cell.

    Parameters
    ----------
    pair : Pair
    regime : Regime
    quantities : Quantities
        Filled.

    Notes
    -----
    Where H falls along the cell the growth at station two is taken at the H of
    station one: otherwise the drop of H behind transition would undo the growth that
    brought it about, and some cells would have no solution.
    """
    one, two, xi = pair.one, pair.two, pair.xi
    value, slope, cross = quantities.value, quantities.slope, quantities.cross
    laminar_station(one, xi[0], regime, value[0], slope[0])
    laminar_station(two, xi[1], regime, value[1], slope[1])
    cross[0], cross[1] = 0.0, 0.0
    if two[LN_DSTAR] - two[LN_THETA] < one[LN_DSTAR] - one[LN_THETA]:
        h = math.exp(one[LN_DSTAR] - one[LN_THETA])
        theta = math.exp(two[LN_THETA])
        rt = regime.reynolds * math.exp(two[LN_THETA] + two[LN_SPEED])
        grown = growth(h, rt, regime.constants)
        value[1, RATE] = grown.value / theta
        slope[1, RATE, LN_THETA] = (grown.over_rt - grown.value) / theta
        slope[1, RATE, LN_DSTAR] = 0.0
        slope[1, RATE, LN_SPEED] = grown.over_rt / theta
        cross[0], cross[1] = -h * grown.over_h / theta, h * grown.over_h / theta


@compiled_in_place
def cell(kind: int, pair: Pair, regime: Regime, arrays: CellArrays) -> None:
    """Fill residuals and slopes of a laminar, turbulent or wake cell.

    Parameters
    ----------
    kind : int
        `LAMINAR`, `TURBULENT` or `WAKE`.
    pair : Pair
    regime : Regime
    arrays : CellArrays
        Its `equations` are filled.
    """
    xi, quantities = pair.xi, arrays.quantities
    if kind == LAMINAR:
        laminar_pair(pair, regime, quantities)
        balance(pair, 0.0, quantities, arrays.equations)
        first, cross = arrays.equations.first, quantities.cross
        first[THIRD, LN_THETA] -= 0.5 * (xi[1] - xi[0]) * cross[0]
        first[THIRD, LN_DSTAR] -= 0.5 * (xi[1] - xi[0]) * cross[1]
    else:
        wake = kind == WAKE
        value, slope = quantities.value, quantities.slope
        turbulent_station(pair.one, xi[0], wake, regime, value[0], slope[0])
        turbulent_station(pair.two, xi[1], wake, regime, value[1], slope[1])
        balance(pair, regime.constants[RELAXING], quantities, arrays.equations)
