"""One point of a polar: Newton's iteration to its end."""

from __future__ import annotations

import math

import numba
import numpy as np

from solver.section.boundary_layer.constants import WAKE_CURVATURE, WAKE_SMOOTHING
from solver.section.boundary_layer.newton import (
    EXPLICIT,
    LEAST_SPEED,
    STAGNATION_H,
    STAGNATION_THETA,
    march_side,
    march_wake,
    place_of,
    scratch,
    side_length,
    side_node,
    sheet_strengths,
    signed_defects,
    speeds,
)

LARGEST_THICKENING, LARGEST_SPEEDING = 0.6, 0.4
"""Share by which theta and dstar, and the speed, may change in an iteration."""
LARGEST_GROWTH = 1.5
"""Change of the amplification factor in an iteration."""
AT_REST, SHEET_AT_REST = 2e-4, 3e-5
"""Largest change, as a share, of the last iteration, which squares it; and of the lagged
wake sheet, over the free stream."""
STILL = 0.01
"""Share of the speed's change over three panels below which a node counts as still."""
SHARPEST_TURN = 0.02
"""Least length, each way, over which the wake's curvature is taken."""
LARGEST_SHIFT = 2
"""Panels over which the stagnation point may move in an iteration."""


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _wake_sheet(state, nodes, distance, middle_angle, constants, sheet):
    """Strength of the wake's vortex sheet for each unit of mass defect."""
    after = state.shape[0] - nodes
    count = len(middle_angle)
    middle = 0.5 * (distance[1:] + distance[:-1])
    for k in range(after + 1):
        here = distance[k]
        if k == 0:
            t = math.exp(state[0, 0]) + math.exp(state[nodes - 1, 0])
            d = math.exp(state[0, 1]) + math.exp(state[nodes - 1, 1])
        else:
            t, d = math.exp(state[nodes + k - 1, 0]), math.exp(state[nodes + k - 1, 1])
        h = d / t
        half = max(SHARPEST_TURN, constants[WAKE_SMOOTHING] * (t + d))
        low = min(max(here - half, middle[0]), middle[count - 1])
        high = min(max(here + half, middle[0]), middle[count - 1])
        turned = np.interp(high, middle, middle_angle) - np.interp(low, middle, middle_angle)
        kappa = turned / (2.0 * half)
        fade = 1.0 if h < 2.5 else (2.5 / h) ** 3
        sheet[k] = constants[WAKE_CURVATURE] * kappa * (1.0 + min(h, 2.5)) / h * fade


@numba.njit(cache=True, nogil=True, error_model="numpy")
def wake_angles(base, defect, sheet_influence, sheet, state, stagnation, nodes, speed, path, out):
    """Direction of the flow midway along each wake panel."""
    after = state.shape[0] - nodes
    signed = signed_defects(state, stagnation)
    strength = sheet_strengths(sheet, signed, nodes)
    across = base + np.dot(defect, signed) + np.dot(sheet_influence, strength)
    for i in range(after):
        left = speed[nodes - 1] if i == 0 else speed[nodes + i - 1]
        u = 0.5 * (left + speed[nodes + i])
        out[i] = path[i] + math.atan2(across[i], max(u, 0.05))


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _assemble(influence, sheet_influence, sheet, state, stagnation, point, arc, nodes, rows,
              speed, matrix, right):  # fmt: skip
    """Matrix and right-hand side for the changes of mass defect and stagnation point."""
    total = state.shape[0]
    side = np.ones(total)
    side[: stagnation + 1] = -1.0
    for i in range(total):
        u = math.exp(state[i, 2])
        s = side[i]
        for j in range(total):
            matrix[i, j] = u * rows[i, j] - s * influence[i, j] * side[j]
        matrix[i, total] = u * rows[i, total]
        right[i] = s * speed[i] - u - u * rows[i, total + 1]
        for k in range(total - nodes + 1):
            c = s * sheet_influence[i, k] * sheet[k]
            if k == 0:
                matrix[i, nodes - 1] += c
                matrix[i, 0] += c
            else:
                matrix[i, nodes + k - 1] += c
    # Place of the stagnation point between its two neighbours.
    a, b = stagnation, stagnation + 1
    ua, ub = math.exp(state[a, 2]), math.exp(state[b, 2])
    length = arc[b] - arc[a]
    factor = length / ((ua + ub) * (ua + ub))
    for j in range(total + 1):
        matrix[total, j] = -factor * ua * ub * (rows[a, j] - rows[b, j])
    matrix[total, total] += 1.0
    right[total] = arc[a] + length * ua / (ua + ub) - point


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _back_substitute(change, saved, first_rows, stagnation, nodes, delta):
    """Changes of (ln theta, ln ue, a) at every station."""
    total = delta.shape[0]
    for side in range(2):
        for k in range(side_length(side, stagnation, nodes)):
            node = side_node(side, k, stagnation)
            last = node + 1 if side == 0 else node - 1
            for r in range(3):
                x = saved[node, r, 4] * change[node] + saved[node, r, 5] * change[total]
                x += saved[node, r, 6]
                if k >= EXPLICIT:
                    for q in range(3):
                        x += saved[node, r, q] * delta[last, q]
                    x += saved[node, r, 3] * change[last]
                delta[node, r] = x
    for node in range(nodes, total):
        for r in range(3):
            x = saved[node, r, 4] * change[node] + saved[node, r, 6]
            if node == nodes:
                for j in range(total + 1):
                    x += first_rows[r, j] * change[j]
                x += first_rows[r, total + 1]
            else:
                for q in range(3):
                    x += saved[node, r, q] * delta[node - 1, q]
                x += saved[node, r, 3] * change[node - 1]
            delta[node, r] = x


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _update(state, delta, change, laminar, stagnation, nodes, damping_limit):
    """Apply the changes, damped by one factor; returns the largest change and the factor."""
    total = state.shape[0]
    largest, damping = 0.0, damping_limit
    for node in range(total):
        if node < nodes:
            k = stagnation - node if node <= stagnation else node - stagnation - 1
            if k < EXPLICIT:
                continue
        m = math.exp(state[node, 1] + state[node, 2])
        dt, du = delta[node, 0], delta[node, 1]
        dd = change[node] / m - du
        thick = max(abs(dt), abs(dd))
        damping = min(damping, LARGEST_THICKENING / max(thick, 1e-12))
        damping = min(damping, LARGEST_SPEEDING / max(abs(du), 1e-12))
        largest = max(largest, max(thick, abs(du)))
        if node >= nodes or not laminar[node]:
            largest = max(largest, 0.1 * abs(delta[node, 2]))
        else:
            damping = min(damping, LARGEST_GROWTH / max(abs(delta[node, 2]), 1e-12))
    for node in range(total):
        m = math.exp(state[node, 1] + state[node, 2])
        dd = change[node] / m - delta[node, 1]
        if node < nodes:
            k = stagnation - node if node <= stagnation else node - stagnation - 1
            if k < EXPLICIT:
                continue
        state[node, 0] += damping * delta[node, 0]
        state[node, 1] += damping * dd
        state[node, 2] += damping * delta[node, 1]
        if node >= nodes or not laminar[node]:
            step = damping * delta[node, 2]
            state[node, 3] += min(max(step, -0.7), 0.7)
            state[node, 3] = min(max(state[node, 3], -7.0), -0.7)
        floor = 1.02 if (node >= nodes or not laminar[node]) else 1.05
        state[node, 1] = max(state[node, 1], state[node, 0] + math.log(floor))
    return largest, damping


@numba.njit(cache=True, nogil=True, error_model="numpy")
def _relocate(state, speed, stagnation, arc, nodes, reynolds):
    """Move the stagnation point to where the potential flow stops; at most two panels."""
    old = stagnation
    for _ in range(LARGEST_SHIFT):
        # A node at which the flow all but stops stays on its side: on a symmetric section
        # without lift it would change sides for ever.
        still = STILL * (speed[stagnation + 2] - speed[stagnation - 1])
        if speed[stagnation] >= still and stagnation > 4:
            stagnation -= 1
        elif speed[stagnation + 1] <= -still and stagnation < nodes - 6:
            stagnation += 1
        else:
            break
    a = max(-speed[stagnation], LEAST_SPEED)
    b = max(speed[stagnation + 1], LEAST_SPEED)
    length = arc[stagnation + 1] - arc[stagnation]
    point = arc[stagnation] + length * min(max(a / (a + b), 0.001), 0.999)
    for side in range(2):
        for k in range(EXPLICIT + abs(stagnation - old)):
            node = side_node(side, k, stagnation)
            sign = -1.0 if side == 0 else 1.0
            crossed = (node <= old) != (node <= stagnation)
            if k < EXPLICIT or crossed:
                state[node, 2] = math.log(max(sign * speed[node], LEAST_SPEED))
                place = place_of(node, side, arc, point)
                state[node, 0] = 0.5 * (
                    math.log(STAGNATION_THETA * place / reynolds) - state[node, 2]
                )
                state[node, 1] = state[node, 0] + math.log(STAGNATION_H)
    return stagnation, point


@numba.njit(cache=True, nogil=True, error_model="numpy")
def solve_point(
    base, influence, sheet_influence, normal_base, normal_defect, normal_sheet, path_angle,
    arc, distance, nodes, reynolds, critical, trip, constants,
    state, amplification, turbulent_from, place, sheet, share, laminar, history, iterations,
):  # fmt: skip
    """Iterate one point.

    Returns
    -------
    tuple of int, int, float
        Status (0 converged, 1 still moving, 2 broken down), iterations, last change.
    """
    total = state.shape[0]
    buffers = scratch()
    saved = np.zeros((total, 3, 7))
    rows = np.zeros((total, total + 2))
    first_rows = np.zeros((3, total + 2))
    ends = np.zeros((2, 3, total + 2))
    end_laminar = np.zeros(2, dtype=np.bool_)
    matrix, right = np.empty((total + 1, total + 1)), np.empty(total + 1)
    speed, delta = np.empty(total), np.zeros((total, 3))
    angles = np.empty(total - nodes)
    fresh = np.empty(total - nodes + 1)
    stagnation, point = int(place[0]), place[1]
    largest, mix = 1.0, 1.0
    earliest = 1e30
    gap_before = np.zeros(total - nodes + 1)
    damping_limit = 1.0
    for iteration in range(iterations):
        speeds(base, influence, sheet_influence, sheet, state, stagnation, nodes, speed)
        stagnation, point = _relocate(state, speed, stagnation, arc, nodes, reynolds)
        moved = 0.0
        if constants[WAKE_CURVATURE] > 0.0:
            wake_angles(normal_base, normal_defect, normal_sheet, sheet, state, stagnation, nodes,
                        speed, path_angle, angles)  # fmt: skip
            _wake_sheet(state, nodes, distance, angles, constants, fresh)
            # Aitken's relaxation of the lagged sheet.
            top = bottom = 0.0
            for k in range(total - nodes + 1):
                gap = fresh[k] - sheet[k]
                top += gap_before[k] * (gap - gap_before[k])
                bottom += (gap - gap_before[k]) ** 2
                gap_before[k] = gap
            if iteration > 0 and bottom > 0.0 and largest < 0.5:
                mix = min(max(-mix * top / bottom, 0.15), 1.5)
            else:
                mix = 1.0
            for k in range(total - nodes + 1):
                m = math.exp(state[max(nodes + k - 1, nodes), 1])
                moved = max(moved, abs(gap_before[k]) * m)
                sheet[k] += mix * gap_before[k]
            speeds(base, influence, sheet_influence, sheet, state, stagnation, nodes, speed)
        for side in range(2):
            good, changed, end = march_side(
                side, stagnation, point, arc, nodes, reynolds, critical, trip[side], constants,
                state, amplification, turbulent_from[side], share, laminar, saved, rows, buffers,
            )  # fmt: skip
            if not good:
                return 2, iteration, largest
            turbulent_from[side] = changed
            end_laminar[side] = changed < 0
            ends[side] = end
        if not march_wake(distance, 1.0, reynolds, critical, nodes, constants, state,
                          amplification, ends, end_laminar, saved, first_rows, rows, buffers):  # fmt: skip
            return 2, iteration, largest
        _assemble(influence, sheet_influence, sheet, state, stagnation, point, arc, nodes, rows,
                  speed, matrix, right)  # fmt: skip
        if not (math.isfinite(matrix.sum()) and math.isfinite(right.sum())):
            return 2, iteration, largest
        change = np.linalg.solve(matrix, right)
        _back_substitute(change, saved, first_rows, stagnation, nodes, delta)
        if not math.isfinite(delta.sum()):
            return 2, iteration, largest
        if iteration > 10 and iteration % 6 == 0:
            # A limit cycle: the last six steps are no smaller than the six before them.
            recent = history[iteration - 6 : iteration, 0].min()
            damping_limit = 0.6 * damping_limit if recent > 0.5 * earliest else 1.0
            damping_limit = max(damping_limit, 0.1)
            earliest = recent
        largest, damping = _update(state, delta, change, laminar, stagnation, nodes, damping_limit)
        history[iteration, 0] = largest
        history[iteration, 1] = damping
        history[iteration, 2] = moved
        history[iteration, 3] = turbulent_from[0]
        history[iteration, 4] = turbulent_from[1]
        place[0], place[1] = stagnation, point
        if largest < AT_REST and moved < SHEET_AT_REST:
            return 0, iteration + 1, largest
    return 1, iterations, largest
