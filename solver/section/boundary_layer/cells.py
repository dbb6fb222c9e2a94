"""The equations of one cell between two stations, and their slopes.

Momentum, energy shape and growth (or lag), in logarithmic differences. A cell in
which transition falls is a blend of its laminar and its turbulent equations.
"""

from __future__ import annotations

import math

import numba

from solver.section.boundary_layer.closures import growth
from solver.section.boundary_layer.constants import INITIAL_STRESS, LAG, RELAXING
from solver.section.boundary_layer.stations import laminar_station, turbulent_station

LAMINAR, TURBULENT, WAKE = 0, 1, 2


@numba.njit(cache=True, nogil=True, error_model="numpy")
def late_share(r):
    """Weight of station two in the mean over a cell of r relaxation lengths, and its slope.

    Exponential fitting: exact for a quantity that relaxes linearly, one half for small r
    and one for large (Liniger and Willoughby, SIAM J. Numer. Anal. 7, 1970).
    """
    if r < 0.05:
        return 0.5 + r / 12.0, 1.0 / 12.0
    if r > 40.0:
        return 1.0 - 1.0 / r, 1.0 / (r * r)
    e = math.exp(-r)
    return 1.0 / (1.0 - e) - 1.0 / r, 1.0 / (r * r) - e / ((1.0 - e) * (1.0 - e))


@numba.njit(cache=True, nogil=True, error_model="numpy")
def balance(one, two, xi, relaxing, value, slope, residual, first, second):
    """Fill residual and slopes of a cell of one kind.

    Parameters
    ----------
    one, two : ndarray, shape (4,)
        States.
    xi : ndarray, shape (2,)
        Places.
    relaxing : float
        Relaxation length of the energy shape parameter over theta; 0 weighs both
        stations alike.
    value : ndarray, shape (2, 6)
        Quantities at both stations.
    slope : ndarray, shape (2, 6, 5)
        Their slopes.
    residual : ndarray, shape (3,)
        Filled.
    first, second : ndarray, shape (3, 5)
        Filled: slopes over the states and places of the two stations.
    """
    dt = two[0] - one[0]
    du = two[2] - one[2]
    h1, h2 = math.exp(one[1] - one[0]), math.exp(two[1] - two[0])
    h = 0.5 * (h1 + h2)
    x = math.log(xi[1] / xi[0])
    dxi = xi[1] - xi[0]
    friction = 0.5 * (value[0, 1] + value[1, 1])
    late, late_r, r = 0.5, 0.0, 0.0
    if relaxing > 0.0:
        r = dxi / (relaxing * math.exp(two[0]))
        late, late_r = late_share(r)
    shape = (1.0 - late) * value[0, 2] + late * value[1, 2]
    residual[0] = dt + (2.0 + h) * du - x * friction
    residual[1] = value[1, 0] - value[0, 0] + (1.0 - h) * du - x * shape
    residual[2] = two[3] - one[3] - dxi * 0.5 * (value[0, 3] + value[1, 3])
    for j in range(5):
        first[0, j] = -0.5 * x * slope[0, 1, j]
        second[0, j] = -0.5 * x * slope[1, 1, j]
        first[1, j] = -slope[0, 0, j] - (1.0 - late) * x * slope[0, 2, j]
        second[1, j] = slope[1, 0, j] - late * x * slope[1, 2, j]
        first[2, j] = -0.5 * dxi * slope[0, 3, j]
        second[2, j] = -0.5 * dxi * slope[1, 3, j]
    second[1, 0] += x * (value[1, 2] - value[0, 2]) * late_r * r
    half1, half2 = 0.5 * h1 * du, 0.5 * h2 * du
    first[0, 0] -= 1.0 + half1
    first[0, 1] += half1
    first[0, 2] -= 2.0 + h
    first[0, 4] += friction / xi[0]
    second[0, 0] += 1.0 - half2
    second[0, 1] += half2
    second[0, 2] += 2.0 + h
    second[0, 4] -= friction / xi[1]
    first[1, 0] += half1
    first[1, 1] -= half1
    first[1, 2] -= 1.0 - h
    first[1, 4] += shape / xi[0]
    second[1, 0] += half2
    second[1, 1] -= half2
    second[1, 2] += 1.0 - h
    second[1, 4] -= shape / xi[1]
    first[2, 3] -= 1.0
    second[2, 3] += 1.0


@numba.njit(cache=True, nogil=True, error_model="numpy")
def laminar_pair(one, two, xi, reynolds, constants, value, slope, cross):
    """Fill the laminar quantities of both stations of a cell.

    Where H falls along the cell the growth at station two is taken at the H of
    station one: otherwise the drop of H behind transition would undo the growth that
    brought it about, and some cells would have no solution. `cross` holds the slopes
    of that growth over ln theta and ln dstar of station one.
    """
    laminar_station(one, xi[0], reynolds, constants, value[0], slope[0])
    laminar_station(two, xi[1], reynolds, constants, value[1], slope[1])
    cross[0], cross[1] = 0.0, 0.0
    if two[1] - two[0] < one[1] - one[0]:
        h = math.exp(one[1] - one[0])
        theta = math.exp(two[0])
        g, g_h, g_r = growth(h, reynolds * math.exp(two[0] + two[2]), constants)
        value[1, 3] = g / theta
        slope[1, 3, 0], slope[1, 3, 1], slope[1, 3, 2] = (g_r - g) / theta, 0.0, g_r / theta
        cross[0], cross[1] = -h * g_h / theta, h * g_h / theta


@numba.njit(cache=True, nogil=True, error_model="numpy")
def cell(kind, one, two, xi, reynolds, constants, work, residual, first, second):
    """Fill residual and slopes of a laminar, turbulent or wake cell."""
    value, slope = work[0], work[1]
    if kind == LAMINAR:
        cross = work[2]
        laminar_pair(one, two, xi, reynolds, constants, value, slope, cross)
        balance(one, two, xi, 0.0, value, slope, residual, first, second)
        first[2, 0] -= 0.5 * (xi[1] - xi[0]) * cross[0]
        first[2, 1] -= 0.5 * (xi[1] - xi[0]) * cross[1]
    else:
        wake = kind == WAKE
        turbulent_station(one, xi[0], reynolds, wake, constants, value[0], slope[0])
        turbulent_station(two, xi[1], reynolds, wake, constants, value[1], slope[1])
        balance(one, two, xi, constants[RELAXING], value, slope, residual, first, second)


@numba.njit(cache=True, nogil=True, error_model="numpy")
def transition_cell(
    one, two, xi, reynolds, critical, trip, constants, work, more, residual, first, second
):
    """Fill residual and slopes of the cell in which the flow turns turbulent.

    `one` carries n, `two` carries ln S. The turbulent share W of the cell follows
    from where n crosses the critical factor, or from the trip if that is ahead.
    Returns W.
    """
    value, slope = work[0], work[1]
    r_lam, f_lam, s_lam = more[0], more[1], more[2]
    cross = work[2]
    laminar_pair(one, two, xi, reynolds, constants, value, slope, cross)
    balance(one, two, xi, 0.0, value, slope, r_lam, f_lam, s_lam)
    dxi = xi[1] - xi[0]
    grown = 0.5 * dxi * (value[0, 3] + value[1, 3])
    w = 0.0
    d_first, d_second = more[3], more[4]
    for j in range(5):
        d_first[j] = 0.0
        d_second[j] = 0.0
    left = critical - one[3]
    if grown > left and grown > 1e-12:
        left = max(left, 0.0)
        w = 1.0 - left / grown
        for j in range(4):
            d_first[j] = left / (grown * grown) * 0.5 * dxi * slope[0, 3, j]
            d_second[j] = left / (grown * grown) * 0.5 * dxi * slope[1, 3, j]
        for j in range(2):
            d_first[j] += left / (grown * grown) * 0.5 * dxi * cross[j]
        d_first[3] += 1.0 / grown
    tripped = (xi[1] - trip) / dxi
    if tripped > w:
        w = min(tripped, 1.0)
        for j in range(5):
            d_first[j] = 0.0
            d_second[j] = 0.0

    # Turbulent equations; ahead of transition the stress is the initial one.
    share = math.sqrt(constants[INITIAL_STRESS])
    guess = more[5]
    for j in range(3):
        guess[j] = one[j]
    guess[3] = 0.0
    turbulent_station(guess, xi[0], reynolds, False, constants, value[0], slope[0])
    guess[3] = value[0, 4] + math.log(share)
    turbulent_station(guess, xi[0], reynolds, False, constants, value[0], slope[0])
    for q in range(4):  # the initial stress depends on the state of station one
        s_slope = slope[0, q, 3]
        for j in range(3):
            slope[0, q, j] += s_slope * slope[0, 4, j]
        slope[0, q, 3] = 0.0
    turbulent_station(two, xi[1], reynolds, False, constants, value[1], slope[1])
    balance(guess, two, xi, constants[RELAXING], value, slope, residual, first, second)
    for row in range(2):
        first[row, 3] = 0.0
        gap = residual[row] - r_lam[row]
        residual[row] = (1.0 - w) * r_lam[row] + w * residual[row]
        for j in range(5):
            first[row, j] = (1.0 - w) * f_lam[row, j] + w * first[row, j] + gap * d_first[j]
            second[row, j] = (1.0 - w) * s_lam[row, j] + w * second[row, j] + gap * d_second[j]

    # Lag from the initial stress, at the place of transition, over the turbulent share.
    half_lag = (1.0 - share) * 0.5 * constants[LAG]
    gap_e, gap_l = value[0, 4] - value[1, 4], value[0, 5] - value[1, 5]
    equilibrium = value[1, 4] + w * gap_e
    start = half_lag * math.exp(equilibrium - value[1, 5] - w * gap_l)
    rate = 0.5 * (start + value[1, 3])
    residual[2] = two[3] - equilibrium - math.log(share) - w * dxi * rate
    of_w = -gap_e - dxi * rate - w * dxi * 0.5 * start * (gap_e - gap_l)
    for j in range(5):
        e1, e2 = w * slope[0, 4, j], (1.0 - w) * slope[1, 4, j]
        l1, l2 = w * slope[0, 5, j], (1.0 - w) * slope[1, 5, j]
        first[2, j] = -e1 - w * dxi * 0.5 * start * (e1 - l1) + of_w * d_first[j]
        second[2, j] = -e2 - w * dxi * 0.5 * (start * (e2 - l2) + slope[1, 3, j])
        second[2, j] += of_w * d_second[j]
    second[2, 3] += 1.0
    return w
