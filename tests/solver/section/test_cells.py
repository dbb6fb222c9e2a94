"""The compiled cell equations against those written a second time, and their slopes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest

from solver.section.boundary_layer.cells import LAMINAR, TURBULENT, WAKE, cell, transition_cell
from solver.section.boundary_layer.newton import scratch
from tests.solver.section import second_residual
from tests.solver.section.kernel_constants import CHOSEN, constants
from tests.solver.section.second_residual import Side

CRITICAL = 9.0
TRANSITION = -1
NOWHERE = 1e9
"""Where a trip is that does nothing."""


@dataclass
class Cell:
    """Two stations as the kernels take them, and what they give back."""

    kind: int
    states: np.ndarray
    xi: np.ndarray
    reynolds: float
    trip: float = NOWHERE

    def __call__(self) -> tuple[np.ndarray, np.ndarray]:
        """Residuals, shape (3,), and their slopes over both states, shape (2, 3, 5)."""
        work, more, left, *_ = scratch()
        slopes = np.zeros((2, 3, 5))
        same = (*self.states, self.xi, self.reynolds)
        if self.kind == TRANSITION:
            transition_cell(*same, CRITICAL, self.trip, constants(), work, more, left, *slopes)
        else:
            cell(self.kind, *same, constants(), work, left, *slopes)
        return left.copy(), slopes


def draw(kind: int, generator: np.random.Generator) -> Cell:
    """Two stations of a layer of any shape and Reynolds number that comes up."""
    H = generator.uniform(*((1.9, 9.0) if kind in (LAMINAR, TRANSITION) else (1.1, 6.0)), 2)
    theta = np.exp(generator.uniform(np.log(2e-4), np.log(1e-2)) + generator.normal(0.0, 0.1, 2))
    ue, xi = generator.uniform(0.3, 1.8, 2), np.sort(generator.uniform(0.01, 1.5, 2))
    last = np.log(generator.uniform(0.005, 0.3, 2))
    if kind in (LAMINAR, TRANSITION):
        last[0] = generator.uniform(0.0, 8.9)
    if kind == LAMINAR:
        last[1] = generator.uniform(0.0, 8.9)
    states = np.column_stack([np.log(theta), np.log(theta * H), np.log(ue), last])
    return Cell(kind, states, xi, float(np.exp(generator.uniform(np.log(3e4), np.log(3e6)))))


def second_opinion(drawn: Cell) -> tuple[np.ndarray, float]:
    """The same residuals written a second time, and the turbulent share of the cell."""
    theta, dstar, ue = np.exp(drawn.states[:, :3].T)
    last, many = drawn.states[:, 3], np.full(2, 99.0)
    if drawn.kind == WAKE:
        wake = Side(drawn.xi, theta, dstar, ue, many, np.exp(last))
        found = second_residual.wake_residuals(wake, reynolds=drawn.reynolds, closures=CHOSEN)
        return np.array([found.momentum[0], found.shape[0], found.lag[0]]), 1.0
    amplification = last if drawn.kind == LAMINAR else many
    if drawn.kind == TRANSITION:
        amplification = last[0] + np.array([0.0, grown(drawn)])
    found = second_residual.wall_residuals(
        Side(drawn.xi, theta, dstar, ue, amplification, np.exp(np.minimum(last, 0.0))),
        reynolds=drawn.reynolds,
        critical=CRITICAL,
        trip=None if drawn.trip == NOWHERE else drawn.trip,
        closures=CHOSEN,
    )
    third = found.growth[0] if drawn.kind == LAMINAR else found.lag[0]
    return np.array([found.momentum[0], found.shape[0], third]), float(found.turbulent[0])


def grown(drawn: Cell) -> float:
    """Growth of n over a cell, laminar from end to end."""
    theta, dstar, ue = np.exp(drawn.states[:, :3].T)
    still = Side(drawn.xi, theta, dstar, ue, np.zeros(2), np.ones(2))
    found = second_residual.wall_residuals(
        still, reynolds=drawn.reynolds, critical=CRITICAL, closures=CHOSEN
    )
    return -float(found.growth[0])


@pytest.mark.parametrize("kind", [LAMINAR, TURBULENT, WAKE])
def test_cells_leave_what_the_second_residual_leaves(kind):
    generator = np.random.default_rng(20)
    for _ in range(300):
        drawn = draw(kind, generator)
        left, _ = drawn()
        # The same formulas in another order: rounding of terms up to some thousands.
        assert left == pytest.approx(second_opinion(drawn)[0], rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("tripped", [False, True])
def test_the_cell_with_transition_leaves_what_the_second_residual_leaves(tripped):
    generator, shares = np.random.default_rng(21), []
    while len(shares) < 200:
        drawn = draw(TRANSITION, generator)
        if tripped:
            drawn.trip = float(generator.uniform(*drawn.xi))
        elif not grown(drawn) > CRITICAL - drawn.states[0, 3]:
            continue
        wanted, share = second_opinion(drawn)
        shares.append(share)
        assert drawn()[0] == pytest.approx(wanted, rel=1e-12, abs=1e-12)
    assert min(shares) < 0.1
    assert max(shares) > 0.9


@pytest.mark.parametrize("kind", [LAMINAR, TURBULENT, WAKE, TRANSITION])
def test_slopes_are_those_of_the_residuals(kind):
    generator, step, seen = np.random.default_rng(22), 1e-6, 0
    while seen < 60:
        drawn = draw(kind, generator)
        if kind == TRANSITION and not grown(drawn) > CRITICAL + 0.1 - drawn.states[0, 3]:
            continue
        seen += 1
        _, slopes = drawn()
        for station, column in np.ndindex(2, 4):
            around = []
            for sign in (1.0, -1.0):
                moved = drawn.states.copy()
                moved[station, column] += sign * step
                around.append(replace(drawn, states=moved)()[0])
            slope = (around[0] - around[1]) / (2.0 * step)
            # Rounding of the differences: 1e-16 of terms up to a thousand over the step.
            largest = np.max(np.abs(slopes), axis=(0, 2))
            off = np.abs(slopes[station, :, column] - slope)
            assert np.all(off < 2e-5 * largest + 1e-6)


@pytest.mark.parametrize("kind", [LAMINAR, TURBULENT, WAKE, TRANSITION])
def test_slopes_over_a_shift_of_both_places(kind):
    # As when the stagnation point moves: the length of the cell stays.
    generator, step, seen = np.random.default_rng(23), 1e-8, 0
    while seen < 60:
        drawn = draw(kind, generator)
        if kind == TRANSITION and not grown(drawn) > CRITICAL + 0.1 - drawn.states[0, 3]:
            continue
        seen += 1
        _, slopes = drawn()
        ahead, behind = (replace(drawn, xi=drawn.xi + shift)()[0] for shift in (step, -step))
        slope = (ahead - behind) / (2.0 * step)
        # Rounding, as above, with a smaller step.
        assert slopes[:, :, 4].sum(axis=0) == pytest.approx(slope, rel=1e-4, abs=1e-3)
