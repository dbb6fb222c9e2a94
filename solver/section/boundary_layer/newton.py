"""Boundary layers, wake and potential flow of one section at one angle, by Newton's method.

The mass defect m = ue dstar drives: each side and the wake are marched with it, which
is regular at separation, and every march leaves the speed as a linear function of the
mass defects upstream. One dense system then makes those speeds equal to the potential
flow's.
"""

from __future__ import annotations

import math

import numba
import numpy as np

from solver.section.boundary_layer.cells import LAMINAR, TURBULENT, WAKE, cell, transition_cell
from solver.section.boundary_layer.constants import INITIAL_STRESS
from solver.section.boundary_layer.stations import turbulent_station

STAGNATION_THETA = 0.0855
"""theta^2 Re ue/xi at a stagnation point."""
STAGNATION_H = 2.2162
EXPLICIT = 2
"""Stations of each side that follow the stagnation-point solution."""
LEAST_SPEED = 1e-5


@numba.njit(cache=True, nogil=True, error_model="numpy")
def side_node(side, k, stagnation):
    """Node of station k of a side; the stagnation point lies after node `stagnation`."""
    return stagnation - k if side == 0 else stagnation + 1 + k


@numba.njit(cache=True, nogil=True, error_model="numpy")
def side_length(side, stagnation, nodes):
    """Number of stations on a side."""
    return stagnation + 1 if side == 0 else nodes - stagnation - 1


@numba.njit(cache=True, nogil=True, error_model="numpy")
def place_of(node, side, arc, point):
    """Distance of a node from the stagnation point along the surface."""
    return point - arc[node] if side == 0 else arc[node] - point


@numba.njit(cache=True, nogil=True, error_model="numpy")
def signed_defects(state, stagnation):
    """Mass defects of all stations, negative where the flow runs against the nodes."""
    total = state.shape[0]
    signed = np.empty(total)
    for i in range(total):
        m = math.exp(state[i, 1] + state[i, 2])
        signed[i] = -m if i <= stagnation else m
    return signed


@numba.njit(cache=True, nogil=True, error_model="numpy")
def sheet_strengths(sheet, signed, nodes):
    """Vortex sheet at the wake's nodes, the trailing edge included."""
    after = len(signed) - nodes
    strength = np.empty(after + 1)
    for k in range(after + 1):
        m = signed[nodes - 1] - signed[0] if k == 0 else signed[nodes + k - 1]
        strength[k] = -sheet[k] * m
    return strength


@numba.njit(cache=True, nogil=True, error_model="numpy")
def speeds(base, influence, sheet_influence, sheet, state, stagnation, nodes, out):
    """Speeds of the potential flow along nodes and wake, for the mass defects of a state."""
    signed = signed_defects(state, stagnation)
    strength = sheet_strengths(sheet, signed, nodes)
    out[:] = base + np.dot(influence, signed) + np.dot(sheet_influence, strength)


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _eliminate(first, second, m1, m2, turn, residual, saved):
    """Solve a cell for (d ln theta, d ln ue, d a) at station two.

    `saved`, shape (3, 7): dependence on those three at station one, on dm1, dm2, on
    the shift of the stagnation point, and the constant.
    """
    a, b, c = second[0, 0], second[0, 2] - second[0, 1], second[0, 3]
    d, e, f = second[1, 0], second[1, 2] - second[1, 1], second[1, 3]
    g, h, i = second[2, 0], second[2, 2] - second[2, 1], second[2, 3]
    inverse = np.empty((3, 3))
    inverse[0, 0], inverse[0, 1], inverse[0, 2] = e * i - f * h, c * h - b * i, b * f - c * e
    inverse[1, 0], inverse[1, 1], inverse[1, 2] = f * g - d * i, a * i - c * g, c * d - a * f
    inverse[2, 0], inverse[2, 1], inverse[2, 2] = d * h - e * g, b * g - a * h, a * e - b * d
    determinant = a * inverse[0, 0] + b * inverse[1, 0] + c * inverse[2, 0]
    if determinant == 0.0 or not math.isfinite(determinant):
        return False
    for r in range(3):
        for j in range(7):
            total = 0.0
            for q in range(3):
                if j == 0:
                    x = first[q, 0]
                elif j == 1:
                    x = first[q, 2] - first[q, 1]
                elif j == 2:
                    x = first[q, 3]
                elif j == 3:
                    x = first[q, 1] / m1
                elif j == 4:
                    x = second[q, 1] / m2
                elif j == 5:
                    x = turn * (first[q, 4] + second[q, 4])
                else:
                    x = residual[q]
                total += inverse[r, q] * x
            saved[r, j] = -total / determinant
    return True


@numba.njit(cache=True, nogil=True, error_model="numpy")
def scratch():
    """Arrays that the cells fill."""
    work = (np.zeros((2, 6)), np.zeros((2, 6, 5)), np.zeros(2))
    more = (
        np.zeros(3),
        np.zeros((3, 5)),
        np.zeros((3, 5)),
        np.zeros(5),
        np.zeros(5),
        np.zeros(4),
    )
    return work, more, np.zeros(3), np.zeros((3, 5)), np.zeros((3, 5))


@numba.njit(cache=True, nogil=True, error_model="numpy")
def initial_stress(state, reynolds, constants, work):
    """ln S where turbulence begins; slopes over the state are left in work."""
    guess = np.empty(4)
    guess[0], guess[1], guess[2], guess[3] = state[0], state[1], state[2], 0.0
    turbulent_station(guess, 1.0, reynolds, False, constants, work[0][1], work[1][1])
    return work[0][1, 4] + 0.5 * math.log(constants[INITIAL_STRESS])


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _explicit_station(node, place, turn, reynolds, state, depend, saved):
    """Put a station onto the stagnation-point solution."""
    total = state.shape[0]
    state[node, 0] = 0.5 * (math.log(STAGNATION_THETA * place / reynolds) - state[node, 2])
    state[node, 1] = state[node, 0] + math.log(STAGNATION_H)
    m = math.exp(state[node, 1] + state[node, 2])
    # d ln theta = (dxi/xi - d ln ue)/2 and dm/m = d ln dstar + d ln ue
    saved[:, :] = 0.0
    saved[1, 4], saved[1, 5] = 2.0 / m, -turn / place
    saved[0, 4], saved[0, 5] = -1.0 / m, turn / place
    depend[:, :] = 0.0
    depend[0, node], depend[0, total] = saved[0, 4], saved[0, 5]
    depend[1, node], depend[1, total] = saved[1, 4], saved[1, 5]


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _carry(saved, before, node_before, node, low, high, depend):
    """Linear dependence at a station from that at the one before; columns low..high-1."""
    total = depend.shape[1] - 2
    for r in range(3):
        a, b, c = saved[r, 0], saved[r, 1], saved[r, 2]
        for j in range(low, high):
            depend[r, j] = a * before[0, j] + b * before[1, j] + c * before[2, j]
        for j in range(total, total + 2):
            depend[r, j] = a * before[0, j] + b * before[1, j] + c * before[2, j]
        depend[r, node_before] += saved[r, 3]
        depend[r, node] += saved[r, 4]
        depend[r, total] += saved[r, 5]
        depend[r, total + 1] += saved[r, 6]


@numba.njit(cache=True, nogil=True, error_model="numpy")
def march_side(
    side, stagnation, point, arc, nodes, reynolds, critical, trip, constants,
    state, amplification, turbulent_from, share, store, saved_all, speed_rows, buffers,
):  # fmt: skip
    """March one side; returns success, the first turbulent node and the end's dependence."""
    work, more, residual, first, second = buffers
    total = state.shape[0]
    count = side_length(side, stagnation, nodes)
    turn = 1.0 if side == 0 else -1.0
    before = np.zeros((3, total + 2))
    depend = np.zeros((3, total + 2))
    xi = np.empty(2)
    laminar = True
    changed = nodes + 1  # node at which the turbulent part begins now
    one, two = np.empty(4), np.empty(4)
    for k in range(count):
        node = side_node(side, k, stagnation)
        xi[1] = place_of(node, side, arc, point)
        saved = saved_all[node]
        if k < EXPLICIT:
            _explicit_station(node, xi[1], turn, reynolds, state, depend, saved)
            amplification[node] = 0.0
        else:
            last = node + 1 if side == 0 else node - 1
            xi[0] = place_of(last, side, arc, point)
            one[:3] = state[last, :3]
            two[:3] = state[node, :3]
            done = False
            if laminar:
                # Turbulence may retreat by one node at a time.
                forced = turbulent_from >= 0 and (
                    node < turbulent_from if side == 0 else node > turbulent_from
                )
                one[3], two[3] = amplification[last], 0.0
                cell(LAMINAR, one, two, xi, reynolds, constants, work, residual, first, second)
                grown = -residual[2]
                if grown <= critical and xi[1] <= trip and not forced:
                    amplification[node] = grown
                    residual[2] = 0.0
                    done = True
                else:
                    laminar = False
                    changed = node
                    amplification[node] = grown
                    was = turbulent_from >= 0 and (
                        node <= turbulent_from if side == 0 else node >= turbulent_from
                    )
                    if not was:
                        _begin_stress(side, node, turbulent_from, nodes, state, reynolds,
                                      constants, work)  # fmt: skip
                    two[3] = state[node, 3]
                    share[side] = transition_cell(
                        one, two, xi, reynolds, critical, trip, constants, work, more,
                        residual, first, second,
                    )  # fmt: skip
                    done = True
            if not done:
                amplification[node] = amplification[last]
                one[3], two[3] = state[last, 3], state[node, 3]
                cell(TURBULENT, one, two, xi, reynolds, constants, work, residual, first, second)
            m1 = math.exp(one[1] + one[2])
            m2 = math.exp(two[1] + two[2])
            if not _eliminate(first, second, m1, m2, turn, residual, saved):
                return False, changed, depend
            low = node if side == 0 else stagnation + 1
            high = stagnation + 1 if side == 0 else node + 1
            _carry(saved, before, last, node, low, high, depend)
        store[node] = laminar
        for j in range(total + 2):
            speed_rows[node, j] = depend[1, j]
        before, depend = depend, before
        depend[:, :] = 0.0
    if laminar:
        changed = -1
        share[side] = 0.0
    return True, changed, before


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _begin_stress(side, node, old, nodes, state, reynolds, constants, work):
    """Give nodes that turn turbulent the stress with which turbulence begins."""
    end = 0 if side == 0 else nodes - 1
    step = -1 if side == 0 else 1
    i = node
    while True:
        if old >= 0 and i == old:
            break
        state[i, 3] = initial_stress(state[i], reynolds, constants, work)
        if i == end:
            break
        i += step


@numba.njit(cache=True, nogil=True, error_model="numpy")
def join(state, amplification, critical, ends, laminar, nodes, reynolds, constants, buffers, joined, rows):
    """Trailing edge to wake: sums of theta and dstar; rows depend as (theta, dstar, ue, S)."""
    work = buffers[0]
    total = state.shape[0]
    theta, dstar, speed, stress = np.zeros(2), np.zeros(2), np.zeros(2), np.zeros(2)
    edge = np.zeros((2, 4, total + 2))
    for side in range(2):
        node = 0 if side == 0 else nodes - 1
        m = math.exp(state[node, 1] + state[node, 2])
        for j in range(total + 2):
            edge[side, 0, j] = ends[side, 0, j]
            edge[side, 1, j] = -ends[side, 1, j]
            edge[side, 2, j] = ends[side, 1, j]
        edge[side, 1, node] += 1.0 / m
        if laminar[side]:
            # The stress goes as the square of the waves' amplitude, exp(n).
            lacking = critical - amplification[node]
            ln_s = initial_stress(state[node], reynolds, constants, work)
            follows = 0.0 < lacking < 4.0
            ln_s -= min(max(lacking, 0.0), 4.0)
            for j in range(total + 2):
                x = ends[side, 2, j] if follows else 0.0
                for q in range(3):
                    x += work[1][1, 4, q] * edge[side, q, j]
                edge[side, 3, j] = x
        else:
            ln_s = state[node, 3]
            for j in range(total + 2):
                edge[side, 3, j] = ends[side, 2, j]
        theta[side], dstar[side] = math.exp(state[node, 0]), math.exp(state[node, 1])
        speed[side], stress[side] = math.exp(state[node, 2]), math.exp(ln_s)
    t, d, u = theta.sum(), dstar.sum(), speed.sum()
    s = theta[0] * stress[0] + theta[1] * stress[1]
    joined[0], joined[1], joined[2] = math.log(t), math.log(d), math.log(0.5 * u)
    joined[3] = math.log(s / t)
    for j in range(total + 2):
        a = b = c = e = 0.0
        for side in range(2):
            x = theta[side] / t * edge[side, 0, j]
            a += x
            b += dstar[side] / d * edge[side, 1, j]
            c += speed[side] / u * edge[side, 2, j]
            e += theta[side] * stress[side] / s * (edge[side, 0, j] + edge[side, 3, j])
        rows[0, j], rows[1, j], rows[2, j], rows[3, j] = a, b, c, e - a


@numba.njit(cache=True, nogil=True, error_model="numpy")
def march_wake(distance, start, reynolds, critical, nodes, constants, state, amplification,
               ends, laminar, saved_all, first_rows, speed_rows, buffers):  # fmt: skip
    """March the wake behind both sides."""
    work, _more, residual, first, second = buffers
    total = state.shape[0]
    joined, rows = np.empty(4), np.zeros((4, total + 2))
    join(state, amplification, critical, ends, laminar, nodes, reynolds, constants, buffers, joined, rows)
    before, depend = np.zeros((3, total + 2)), np.zeros((3, total + 2))
    xi, one, two = np.empty(2), np.empty(4), np.empty(4)
    for k in range(total - nodes):
        node = nodes + k
        xi[0], xi[1] = start + distance[k], start + distance[k + 1]
        one[:] = joined if k == 0 else state[node - 1]
        two[:] = state[node]
        cell(WAKE, one, two, xi, reynolds, constants, work, residual, first, second)
        m1 = math.exp(one[1] + one[2])
        m2 = math.exp(two[1] + two[2])
        saved = saved_all[node]
        if not _eliminate(first, second, m1, m2, 0.0, residual, saved):
            return False
        if k == 0:
            # dm1 follows from both sides: dm1/m1 = d ln dstar + d ln ue.
            for r in range(3):
                for j in range(total + 2):
                    depend[r, j] = (
                        saved[r, 0] * rows[0, j] + saved[r, 1] * rows[2, j]
                        + saved[r, 2] * rows[3, j]
                        + saved[r, 3] * m1 * (rows[1, j] + rows[2, j])
                    )  # fmt: skip
                    first_rows[r, j] = depend[r, j]
                depend[r, node] += saved[r, 4]
                depend[r, total + 1] += saved[r, 6]
        else:
            _carry(saved, before, node - 1, node, 0, node, depend)
        for j in range(total + 2):
            speed_rows[node, j] = depend[1, j]
        before, depend = depend, before
        depend[:, :] = 0.0
    return True
