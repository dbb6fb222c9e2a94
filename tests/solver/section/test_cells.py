"""The compiled cell equations against those written a second time, and their slopes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest

from solver.section.boundary_layer.cells import LAMINAR, TURBULENT, WAKE, cell, scratch
from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.boundary_layer.layout import Pair, Regime, blank_state
from solver.section.boundary_layer.transition import transition_cell
from solver.section.boundary_layer.wake import join
from tests.solver.section import second_closures, second_residual
from tests.solver.section.kernel_constants import CHOSEN, chosen_constants, constants
from tests.solver.section.second_closures import Closures
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
        arrays, pair = scratch(), Pair(*self.states, self.xi)
        regime = Regime(self.reynolds, CRITICAL, constants())
        if self.kind == TRANSITION:
            transition_cell(pair, self.trip, regime, arrays)
        else:
            cell(self.kind, pair, regime, arrays.cell)
        left, first, second = arrays.cell.equations
        return left, np.array([first, second])


def draw(kind: int, generator: np.random.Generator) -> Cell:
    """Two stations of a layer of any shape and Reynolds number that comes up."""
    if kind in (LAMINAR, TRANSITION):
        H = generator.uniform(1.9, 10.0, 2)
    else:
        H = 1.0 + np.exp(generator.uniform(np.log(0.03), np.log(5.0), 2))
    theta = np.exp(generator.uniform(np.log(2e-4), np.log(1e-2)) + generator.normal(0.0, 0.1, 2))
    ue, xi = generator.uniform(0.3, 1.8, 2), np.sort(generator.uniform(0.01, 1.5, 2))
    if kind in (TURBULENT, WAKE) or generator.uniform() < 0.5:
        # Cells of a tenth to some hundred relaxation lengths.
        xi[1] = xi[0] + theta[1] * np.exp(generator.uniform(np.log(0.5), np.log(500.0)))
    last = np.log(generator.uniform(0.005, 0.3, 2))
    if kind in (LAMINAR, TRANSITION):
        last[0] = generator.uniform(0.0, 8.9)
    if kind == LAMINAR:
        last[1] = generator.uniform(0.0, 8.9)
    states = np.column_stack([np.log(theta), np.log(theta * H), np.log(ue), last])
    return Cell(kind, states, xi, float(np.exp(generator.uniform(np.log(3e4), np.log(3e6)))))


def smooth(drawn: Cell) -> bool:
    """Whether every relation is smooth within a thousandth of both stations."""
    theta, dstar, ue = np.exp(drawn.states[:, :3].T)
    H, Rt = dstar / theta, drawn.reynolds * ue * theta
    bends = np.array([1.06, 1.25, 1.8, 3.5, 4.0, 4.5, 7.4, 8.8])
    ratios = [H / bend for bend in bends]
    ratios += [Rt / bend for bend in (20.0, 200.0, 400.0)]
    ratios += [np.array([H[1] / H[0]])]  # growth at the end
    ratios += [H / (3.0 + 400.0 / Rt), 22.5 / Rt / (H - 1.0)]  # energy shape; inner layer
    ratios += [(3.15 + 1.72 / (H - 1.0) + H) / 12.0]  # thickness
    Hs = second_closures.turbulent_energy_shape(H, Rt, CHOSEN, wake=drawn.kind == WAKE)
    slip = 0.5 * Hs * (1.0 - 4.0 * (H - 1.0) / (3.0 * H))
    ratios += [slip / (0.99 if drawn.kind == WAKE else 0.95)]
    onset = second_closures.critical_reynolds(H)
    ratios += [Rt / onset * 10.0**0.08, Rt / onset * 10.0**-0.08]
    return all(bool(np.all(np.abs(ratio - 1.0) > 1e-3)) for ratio in ratios)


def draw_smooth(kind: int, generator: np.random.Generator) -> Cell:
    """Draw until slopes exist; where transition falls, until it does in the cell."""
    while True:
        drawn = draw(kind, generator)
        turns = kind != TRANSITION or grown(drawn) > CRITICAL + 0.1 - drawn.states[0, 3]
        if turns and smooth(drawn):
            return drawn


def second_opinion(drawn: Cell, closures: Closures = CHOSEN) -> tuple[np.ndarray, float]:
    """The same residuals written a second time, and the turbulent share of the cell."""
    theta, dstar, ue = np.exp(drawn.states[:, :3].T)
    last, many = drawn.states[:, 3], np.full(2, 99.0)
    if drawn.kind == WAKE:
        wake = Side(drawn.xi, theta, dstar, ue, many, np.exp(last))
        found = second_residual.wake_residuals(wake, reynolds=drawn.reynolds, closures=closures)
        return np.array([found.momentum[0], found.shape[0], found.lag[0]]), 1.0
    amplification = last if drawn.kind == LAMINAR else many
    if drawn.kind == TRANSITION:
        amplification = last[0] + np.array([0.0, grown(drawn)])
    found = second_residual.wall_residuals(
        Side(drawn.xi, theta, dstar, ue, amplification, np.exp(np.minimum(last, 0.0))),
        reynolds=drawn.reynolds,
        critical=CRITICAL,
        trip=None if drawn.trip == NOWHERE else drawn.trip,
        closures=closures,
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


def test_the_kernels_constants_are_those_of_the_second_residual():
    assert chosen_constants() == ClosureConstants()


@pytest.mark.parametrize("kind", [LAMINAR, TURBULENT, WAKE])
def test_cells_leave_what_the_second_residual_leaves(kind):
    generator = np.random.default_rng(20)
    for _ in range(500):
        drawn = draw(kind, generator)
        left, _ = drawn()
        # The same formulas in another order: rounding of terms up to some thousands.
        assert left == pytest.approx(second_opinion(drawn)[0], rel=1e-11, abs=1e-11)


def test_short_cells_weigh_both_stations_nearly_alike():
    generator, most = np.random.default_rng(24), 0.0
    for kind in (TURBULENT, WAKE):
        for length in (1e-3, 1e-2, 0.04, 0.0499, 0.0501):
            for _ in range(10):
                drawn = draw(kind, generator)
                theta = np.exp(drawn.states[1, 0])
                drawn.xi[1] = drawn.xi[0] + CHOSEN.relaxing * theta * length
                left, wanted = drawn()[0], second_opinion(drawn)[0]
                assert left[[0, 2]] == pytest.approx(wanted[[0, 2]], rel=1e-11, abs=1e-11)
                # The series of the weight is cut after r/12: the next term is r^3/720.
                cut = length**3 / 720.0 if length < 0.05 else 0.0
                plain = second_opinion(drawn, replace(CHOSEN, relaxing=0.0))[0]
                by_weight = abs(wanted[1] - plain[1]) / (length / 12.0)
                assert abs(left[1] - wanted[1]) < 1.01 * cut * by_weight + 1e-11
                most = max(most, cut * by_weight)
    assert 1e-10 < most < 1e-5  # it is seen here, and does not matter


@pytest.mark.parametrize("tripped", [False, True])
def test_the_cell_with_transition_leaves_what_the_second_residual_leaves(tripped):
    generator, shares = np.random.default_rng(21), []
    while len(shares) < 300:
        drawn = draw(TRANSITION, generator)
        if tripped:
            drawn.trip = float(generator.uniform(*drawn.xi))
        elif not grown(drawn) > CRITICAL - drawn.states[0, 3]:
            continue
        wanted, share = second_opinion(drawn)
        shares.append(share)
        assert drawn()[0] == pytest.approx(wanted, rel=1e-11, abs=1e-11)
    assert min(shares) < 0.1
    assert max(shares) > 0.9


@pytest.mark.parametrize("kind", [LAMINAR, TURBULENT, WAKE, TRANSITION])
def test_slopes_are_those_of_the_residuals(kind):
    generator, step = np.random.default_rng(22), 1e-4
    for _ in range(150):
        drawn = draw_smooth(kind, generator)
        _, slopes = drawn()
        largest = np.max(np.abs(slopes), axis=(0, 2))
        for station, column in np.ndindex(2, 4):
            slope = by_differences(drawn, station, column, step)
            off = np.abs(slopes[station, :, column] - slope)
            # Differences of fourth order: the step to the fourth by slopes of fifth order,
            # and rounding, 1e-16 over the step of terms up to some hundreds.
            assert np.all(off < 1e-8 * largest + 1e-9)


def by_differences(drawn: Cell, station: int, column: int, step: float) -> np.ndarray:
    """Slopes of the residuals over one number of one station, of fourth order."""
    total = np.zeros(3)
    for shift, weight in ((-2, 1.0), (-1, -8.0), (1, 8.0), (2, -1.0)):
        moved = drawn.states.copy()
        moved[station, column] += shift * step
        total += weight * replace(drawn, states=moved)()[0]
    return total / (12.0 * step)


@pytest.mark.parametrize("kind", [LAMINAR, TURBULENT, WAKE, TRANSITION])
def test_slopes_over_a_shift_of_both_places(kind):
    # As when the stagnation point moves: the length of the cell stays.
    generator = np.random.default_rng(23)
    for _ in range(150):
        drawn = draw_smooth(kind, generator)
        step = 1e-5 * drawn.xi[0]
        _, slopes = drawn()
        ahead, behind = (replace(drawn, xi=drawn.xi + shift)()[0] for shift in (step, -step))
        slope = (ahead - behind) / (2.0 * step)
        # The step squared, and rounding over the step.
        largest = np.max(np.abs(slopes[:, :, 4]), axis=0)
        assert np.all(np.abs(slopes[:, :, 4].sum(axis=0) - slope) < 1e-7 * largest + 1e-7)


# --- where the wake begins

EDGES = (0, 5)
"""Nodes of the trailing edge, among six; the wake is not needed here."""


def wake_begins(
    numbers: np.ndarray, laminar: tuple[bool, bool], reynolds: float
) -> tuple[np.ndarray, np.ndarray]:
    """What the wake begins with, shape (4,), and its slopes over both edges' numbers.

    `numbers`, shape (2, 4): ln theta, ln m, ln ue, a of both sides. A march leaves the
    first, third and fourth as functions of mass defects: here each is one of its own.
    """
    state = blank_state(6, 0)
    depends, begins, rows = np.zeros((2, 3, 8)), np.empty(4), np.zeros((4, 8))
    for side, node in enumerate(EDGES):
        theta, mass, ue, last = numbers[side]
        state.stations[node, :3] = theta, mass - ue, ue
        (state.amplification if laminar[side] else state.stations[:, 3])[node] = last
        state.turbulent_from[side] = -1 if laminar[side] else node
        for row, column in enumerate((1, 2, 3) if side == 0 else (4, 6, 7)):
            depends[side, row, column] = 1.0
    join(state, Regime(reynolds, CRITICAL, constants()), depends, scratch(), begins, rows)
    by_mass = np.exp(numbers[:, 1])
    slopes = rows[:, [1, 0, 2, 3, 4, 5, 6, 7]]
    slopes[:, 1] *= by_mass[0]
    slopes[:, 5] *= by_mass[1]
    return begins, slopes


def edges(generator: np.random.Generator, laminar: tuple[bool, bool]) -> np.ndarray:
    """Draw ln theta, ln m, ln ue, a of both sides."""
    theta, ue = np.log(generator.uniform(2e-4, 1e-2, 2)), np.log(generator.uniform(0.5, 1.1, 2))
    H = generator.uniform(1.3, 1.7, 2)
    n = generator.choice([2.0, 7.0, 8.9], 2)
    last = np.where(laminar, n, np.log(generator.uniform(0.02, 0.2, 2)))
    return np.column_stack([theta, np.log(H) + theta + ue, ue, last])


@pytest.mark.parametrize(
    "laminar", [(False, False), (True, False), (False, True), (True, True)], ids=str
)
def test_the_wake_begins_as_the_second_residual_has_it(laminar):
    generator, step = np.random.default_rng(25), 1e-4
    for _ in range(50):
        numbers, reynolds = edges(generator, laminar), float(generator.uniform(1e5, 1e6))
        begins, slopes = wake_begins(numbers, laminar, reynolds)
        ends = []
        for side in range(2):
            theta, mass, ue, last = np.exp(numbers[side])
            n = numbers[side, 3] if laminar[side] else 2.0 * CRITICAL
            two = np.ones(2)
            layer = Side(
                np.array([0.9, 1.0]), theta * two, mass / ue * two, ue * two, n * two, last * two
            )
            ends.append(
                second_residual.begun(layer, reynolds=reynolds, critical=CRITICAL, closures=CHOSEN)
            )
        assert np.exp(begins) == pytest.approx(second_residual.joined(*ends), rel=1e-12)
        for column in range(8):
            moved = [numbers.copy() for _ in range(2)]
            for one, shift in zip(moved, (step, -step), strict=True):
                one[divmod(column, 4)] += shift
            ahead, behind = (wake_begins(one, laminar, reynolds)[0] for one in moved)
            # The step squared, times slopes of third order.
            slope = (ahead - behind) / (2.0 * step)
            assert slopes[:, column] == pytest.approx(slope, abs=1e-6)
