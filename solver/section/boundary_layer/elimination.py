"""Cells solved for their second station, so that only mass defects are left as unknowns.

Changes are of (ln theta, ln ue, a); ln dstar follows from the mass defect,
d ln dstar = dm/m - d ln ue.
"""

from __future__ import annotations

import math

from solver.section.boundary_layer.compiled import compiled_part, inlined
from solver.section.boundary_layer.layout import (
    LAST,
    LN_DSTAR,
    LN_SPEED,
    LN_THETA,
    PLACE,
    Equations,
    FloatArray,
)

D_THETA, D_SPEED, D_LAST, DEFECT_ONE, DEFECT_TWO, SHIFT, CONSTANT = range(7)
"""Columns of a cell's solution: changes at station one, both mass defects, the shift of the
stagnation point, one. The first three are its rows, too."""


Row = tuple[float, float, float]


@inlined
def _adjugate(second: FloatArray) -> tuple[Row, Row, Row, float]:
    """Rows of the adjugate of a cell's slopes over its second station, and the determinant."""
    a, b, c = second[0, LN_THETA], second[0, LN_SPEED] - second[0, LN_DSTAR], second[0, LAST]
    d, e, f = second[1, LN_THETA], second[1, LN_SPEED] - second[1, LN_DSTAR], second[1, LAST]
    g, h, i = second[2, LN_THETA], second[2, LN_SPEED] - second[2, LN_DSTAR], second[2, LAST]
    one = (e * i - f * h, c * h - b * i, b * f - c * e)
    two = (f * g - d * i, a * i - c * g, c * d - a * f)
    three = (d * h - e * g, b * g - a * h, a * e - b * d)
    return one, two, three, a * one[0] + b * two[0] + c * three[0]


@compiled_part
def _solved(inverse: tuple[Row, Row, Row, float], x: float, y: float, z: float) -> Row:
    """Minus the inverse times a column of three."""
    one, two, three, determinant = inverse
    return (
        -(one[0] * x + one[1] * y + one[2] * z) / determinant,
        -(two[0] * x + two[1] * y + two[2] * z) / determinant,
        -(three[0] * x + three[1] * y + three[2] * z) / determinant,
    )


@compiled_part
def eliminate(
    equations: Equations, defects: tuple[float, float], turn: float, solution: FloatArray
) -> bool:
    """Solve a cell for the changes at station two; returns success.

    Parameters
    ----------
    equations : Equations
    defects : tuple of float
        Mass defects at both stations. [-]
    turn : float
        Change of the places for a shift of the stagnation point along the arc: 1, -1,
        or 0 in the wake.
    solution : numpy.ndarray, shape (3, 7)
        Filled; columns as above.

    Returns
    -------
    bool
    """
    residual, first, second = equations.residual, equations.first, equations.second
    inverse = _adjugate(second)
    if inverse[3] == 0.0 or not math.isfinite(inverse[3]):
        return False
    columns = (
        _solved(inverse, first[0, LN_THETA], first[1, LN_THETA], first[2, LN_THETA]),
        _solved(
            inverse,
            first[0, LN_SPEED] - first[0, LN_DSTAR],
            first[1, LN_SPEED] - first[1, LN_DSTAR],
            first[2, LN_SPEED] - first[2, LN_DSTAR],
        ),
        _solved(inverse, first[0, LAST], first[1, LAST], first[2, LAST]),
        _solved(
            inverse,
            first[0, LN_DSTAR] / defects[0],
            first[1, LN_DSTAR] / defects[0],
            first[2, LN_DSTAR] / defects[0],
        ),
        _solved(
            inverse,
            second[0, LN_DSTAR] / defects[1],
            second[1, LN_DSTAR] / defects[1],
            second[2, LN_DSTAR] / defects[1],
        ),
        _solved(
            inverse,
            turn * (first[0, PLACE] + second[0, PLACE]),
            turn * (first[1, PLACE] + second[1, PLACE]),
            turn * (first[2, PLACE] + second[2, PLACE]),
        ),
        _solved(inverse, residual[0], residual[1], residual[2]),
    )
    for j in range(7):
        solution[D_THETA, j], solution[D_SPEED, j], solution[D_LAST, j] = columns[j]
    return True


@compiled_part
def carry(
    solution: FloatArray,
    before: FloatArray,
    nodes: tuple[int, int],
    columns: tuple[int, int],
    depend: FloatArray,
) -> None:
    """Fill how a station depends on the unknowns, from how the one before it does.

    Parameters
    ----------
    solution : numpy.ndarray, shape (3, 7)
        Of the cell between them.
    before : numpy.ndarray, shape (3, n + w + 2)
        Dependence of the station before.
    nodes : tuple of int
        Both stations, the one before first.
    columns : tuple of int
        First mass defect on which the stations depend, and the one after the last.
    depend : numpy.ndarray, shape (3, n + w + 2)
        Filled in these columns and in the last two.
    """
    total = depend.shape[1] - 2
    low, high = columns
    # Rows of their own, so that the compiler can take several columns at once.
    one, two, three = before[D_THETA, low:high], before[D_SPEED, low:high], before[D_LAST, low:high]
    for r in range(3):
        a, b, c = solution[r, D_THETA], solution[r, D_SPEED], solution[r, D_LAST]
        row = depend[r, low:high]
        for j in range(len(row)):
            row[j] = a * one[j] + b * two[j] + c * three[j]
        for j in range(total, total + 2):
            depend[r, j] = a * before[D_THETA, j] + b * before[D_SPEED, j] + c * before[D_LAST, j]
        depend[r, nodes[0]] += solution[r, DEFECT_ONE]
        depend[r, nodes[1]] += solution[r, DEFECT_TWO]
        depend[r, total] += solution[r, SHIFT]
        depend[r, total + 1] += solution[r, CONSTANT]


@compiled_part
def keep_speed(depend: FloatArray, speeds: FloatArray, node: int) -> None:
    """Keep how the speed of a station depends, for the dense system."""
    for j in range(depend.shape[1]):
        speeds[node, j] = depend[D_SPEED, j]
