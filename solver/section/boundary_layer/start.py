"""A first state: boundary layers marched under given speeds, without feedback."""

from __future__ import annotations

import math

import numba
import numpy as np

from solver.section.boundary_layer.cells import LAMINAR, TURBULENT, WAKE, cell, transition_cell
from solver.section.boundary_layer.newton import (
    EXPLICIT,
    LEAST_SPEED,
    STAGNATION_H,
    STAGNATION_THETA,
    initial_stress,
    place_of,
    side_length,
    side_node,
)

FLOW_LAMINAR, FLOW_TURNING = np.int64(LAMINAR), np.int64(-1)
FLOW_TURBULENT, FLOW_WAKE = np.int64(TURBULENT), np.int64(WAKE)
"""Kinds of a cell, the one with transition among them. Of a type of their own: for plain
numbers the compiler would make every kernel once more for each of them."""

LARGEST_LAMINAR_H, LARGEST_TURBULENT_H = 3.7, 2.6
"""Past these the shape parameter is prescribed and the speed is let go."""


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _solve_three(matrix, residual, step):
    """Fill the step that takes three residuals to zero; returns success."""
    a, b, c = matrix[0]
    d, e, f = matrix[1]
    g, h, i = matrix[2]
    p, q, r = e * i - f * h, c * h - b * i, b * f - c * e
    determinant = a * p + d * q + g * r
    if determinant == 0.0 or not math.isfinite(determinant):
        return False
    x, y, z = -residual[0] / determinant, -residual[1] / determinant, -residual[2] / determinant
    step[0] = p * x + q * y + r * z
    step[1] = (f * g - d * i) * x + (a * i - c * g) * y + (c * d - a * f) * z
    step[2] = (d * h - e * g) * x + (b * g - a * h) * y + (a * e - b * d) * z
    return True


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _solve_cell(kind, one, two, xi, reynolds, critical, trip, constants, buffers, fixed_h):
    """Solve a cell for station two: speed given, or shape parameter given (fixed_h > 0)."""
    work, more, residual, first, second = buffers
    matrix, step = np.empty((3, 3)), np.empty(3)
    if fixed_h > 0.0:
        two[1] = two[0] + math.log(fixed_h)
    for _ in range(25):
        if kind < 0:
            transition_cell(one, two, xi, reynolds, critical, trip, constants, work, more,
                            residual, first, second)  # fmt: skip
        else:
            cell(kind, one, two, xi, reynolds, constants, work, residual, first, second)
        for r in range(3):
            if fixed_h > 0.0:
                matrix[r, 0] = second[r, 0] + second[r, 1]
                matrix[r, 1] = second[r, 2]
            else:
                matrix[r, 0] = second[r, 0]
                matrix[r, 1] = second[r, 1]
            matrix[r, 2] = second[r, 3]
        if not _solve_three(matrix, residual, step):
            return False
        largest = max(abs(step[0]), abs(step[1]))
        if kind != LAMINAR:
            largest = max(largest, abs(step[2]))
        scale = 1.0 if largest < 0.3 else 0.3 / largest
        two[0] += scale * step[0]
        if fixed_h > 0.0:
            two[1] += scale * step[0]
            two[2] += scale * step[1]
        else:
            two[1] += scale * step[1]
        two[3] += scale * step[2]
        if largest < 1e-8:
            return True
    return False


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _next_h(kind, one, xi, w):
    """Shape parameter to prescribe where the given speed asks for more than attached flow."""
    h = math.exp(one[1] - one[0])
    theta = math.exp(one[0])
    d = (xi[1] - xi[0]) / theta
    if kind == LAMINAR:
        return max(LARGEST_LAMINAR_H, min(h + 0.03 * d, 6.0) if h > 3.6 else LARGEST_LAMINAR_H)
    if kind == WAKE:
        return max(1.05, h - 0.02 * d * (h - 1.0) / (1.0 + 0.02 * d))
    if kind < 0:
        return max(LARGEST_TURBULENT_H, (h + w * 0.5) if h < 3.0 else h - 0.15 * w * d)
    return max(LARGEST_TURBULENT_H, h - 0.15 * d if h > LARGEST_TURBULENT_H else h)


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _step(kind, one, two, xi, reynolds, critical, trip, constants, buffers, limit):
    """March one cell, directly or with the shape parameter prescribed."""
    given = two[2]
    trial = two.copy()
    good = _solve_cell(kind, one, trial, xi, reynolds, critical, trip, constants, buffers, 0.0)
    if good and trial[1] - trial[0] < math.log(limit) and trial[1] > trial[0]:
        two[:] = trial
        return
    h = _next_h(kind, one, xi, 1.0)
    trial[:] = two
    trial[0] = one[0]
    if _solve_cell(kind, one, trial, xi, reynolds, critical, trip, constants, buffers, h):
        two[:] = trial
        return
    two[0] = one[0]
    two[1] = one[0] + math.log(min(max(h, 1.2), limit))
    two[2] = given


@numba.njit(cache=True, nogil=True, error_model="numpy")
def start_side(side, stagnation, point, arc, nodes, reynolds, critical, trip, constants,
               state, amplification, buffers):  # fmt: skip
    """March a side; ln ue of `state` is given on entry. Returns the first turbulent node."""
    work = buffers[0]
    xi, one, two = np.empty(2), np.empty(4), np.empty(4)
    turbulent_from = -1
    for k in range(side_length(side, stagnation, nodes)):
        node = side_node(side, k, stagnation)
        xi[1] = max(place_of(node, side, arc, point), 1e-9)
        if k < EXPLICIT:
            state[node, 0] = 0.5 * (math.log(STAGNATION_THETA * xi[1] / reynolds) - state[node, 2])
            state[node, 1] = state[node, 0] + math.log(STAGNATION_H)
            amplification[node] = 0.0
            state[node, 3] = math.log(0.03)
            continue
        last = node + 1 if side == 0 else node - 1
        xi[0] = place_of(last, side, arc, point)
        one[:] = state[last]
        two[:2] = one[:2]
        two[2] = state[node, 2]
        if turbulent_from < 0:
            one[3] = amplification[last]
            two[3] = one[3]
            _step(FLOW_LAMINAR, one, two, xi, reynolds, critical, trip, constants, buffers,
                  LARGEST_LAMINAR_H)  # fmt: skip
            if two[3] <= critical and xi[1] <= trip:
                amplification[node] = two[3]
                state[node, :3] = two[:3]
                state[node, 3] = math.log(0.03)
                continue
            turbulent_from = node
            amplification[node] = two[3]
            two[2] = state[node, 2]
            two[3] = initial_stress(two, reynolds, constants, work)
            _step(FLOW_TURNING, one, two, xi, reynolds, critical, trip, constants, buffers,
                  LARGEST_TURBULENT_H)  # fmt: skip
        else:
            amplification[node] = amplification[last]
            two[3] = one[3]
            _step(FLOW_TURBULENT, one, two, xi, reynolds, critical, trip, constants, buffers,
                  LARGEST_TURBULENT_H)  # fmt: skip
        state[node] = two
    return turbulent_from


@numba.njit(cache=True, nogil=True, error_model="numpy")
def start(speed, arc, distance, nodes, reynolds, critical, trip, constants, state,
          amplification, turbulent_from, buffers):  # fmt: skip
    """Fill a state from the speeds of a potential flow; returns stagnation node and place."""
    total = state.shape[0]
    stagnation = 1
    for i in range(2, nodes - 3):
        if speed[i] < 0.0 <= speed[i + 1]:
            stagnation = i
            break
    low, high = -speed[stagnation], speed[stagnation + 1]
    point = arc[stagnation] + (arc[stagnation + 1] - arc[stagnation]) * low / max(low + high, 1e-9)
    for i in range(total):
        state[i, 2] = math.log(max(abs(speed[i]), LEAST_SPEED))
    for side in range(2):
        place = trip[side]
        turbulent_from[side] = start_side(
            side, stagnation, point, arc, nodes, reynolds, critical, place, constants, state,
            amplification, buffers,
        )  # fmt: skip
    work = buffers[0]
    xi, one, two = np.empty(2), np.empty(4), np.empty(4)
    theta = dstar = stress = 0.0
    for side in range(2):
        node = 0 if side == 0 else nodes - 1
        s = state[node, 3]
        if turbulent_from[side] < 0:
            s = initial_stress(state[node], reynolds, constants, work)
        theta += math.exp(state[node, 0])
        dstar += math.exp(state[node, 1])
        stress += math.exp(state[node, 0] + s)
    one[0], one[1], one[3] = math.log(theta), math.log(dstar), math.log(stress / theta)
    one[2] = math.log(0.5 * (math.exp(state[0, 2]) + math.exp(state[nodes - 1, 2])))
    for k in range(total - nodes):
        node = nodes + k
        xi[0], xi[1] = 1.0 + distance[k], 1.0 + distance[k + 1]
        two[:] = one
        two[2] = state[node, 2]
        _step(FLOW_WAKE, one, two, xi, reynolds, critical, 9.0, constants, buffers, 2.6)
        state[node] = two
        one[:] = two
    return stagnation, point
