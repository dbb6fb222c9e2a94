"""The second residual itself: nothing is left at solutions found without its cell equations."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from tests.solver.section import second_closures as closures
from tests.solver.section import second_residual as second
from tests.solver.section.second_closures import PUBLISHED, Closures
from tests.solver.section.second_residual import Side

REYNOLDS = 3e5


def similar_layer(H: float, xi: np.ndarray) -> Side:
    """Laminar layer of constant H on the closures: speed and thickness are powers of xi."""
    at, one = np.array(H), np.array(1.0)
    friction, loss = closures.laminar_friction(at, one), closures.laminar_dissipation(at, one)
    excess = (loss - 0.5 * friction) / (1.0 - H)
    scale = friction - 2.0 * (1.5 + H) * excess  # Re ue theta^2 / xi
    ue = xi ** (excess / scale)
    theta = np.sqrt(scale * xi / (REYNOLDS * ue))
    return Side(xi, theta, H * theta, ue, np.zeros_like(xi), np.full_like(xi, 0.03))


def turbulent_layer(cells: int, *, wake: bool) -> Side:
    """Turbulent layer in a rising pressure, from its ordinary differential equations."""
    chosen = Closures()

    def slopes(xi: float, state: np.ndarray) -> list[float]:
        theta, H, shear = (np.array(one) for one in state)
        ue, change = 1.0 - 0.3 * xi, -0.3
        Rt = REYNOLDS * ue * theta
        friction = 0.0 if wake else float(closures.turbulent_friction(H, Rt))
        loss = float(closures.turbulent_dissipation(H, Rt, shear, chosen, wake=wake))

        def energy(d_shape: float, d_log: float) -> float:
            factor = np.exp(d_log)
            return float(closures.turbulent_energy_shape(H + d_shape, Rt * factor))

        step = 1e-6
        by_shape = (energy(step, 0.0) - energy(-step, 0.0)) / (2.0 * step)
        by_log = (energy(0.0, step) - energy(0.0, -step)) / (2.0 * step)
        thicker = 0.5 * friction - (2.0 + H) * theta / ue * change
        rise = energy(0.0, 0.0) * ((loss - 0.5 * friction) / theta - (1.0 - H) / ue * change)
        bent = (rise - by_log * (thicker / theta + change / ue)) / by_shape
        delta = closures.layer_thickness(H, theta, H * theta) * (0.5 if wake else 1.0)
        wanted = closures.equilibrium_shear(H, Rt, wake=wake)
        return [float(thicker), float(bent), float(shear * 2.1 / delta * (wanted - shear))]

    xi = np.linspace(0.3, 1.0, cells + 1)
    start = (0.003, 1.6, 0.05)
    found = solve_ivp(slopes, (0.3, 1.0), start, t_eval=xi, method="LSODA", rtol=1e-10, atol=1e-13)
    theta, H, shear = found.y
    return Side(xi, theta, H * theta, 1.0 - 0.3 * xi, np.full_like(xi, 20.0), shear)


@pytest.mark.parametrize("H", [2.25, 2.59, 3.2, 3.9])
def test_nothing_is_left_of_a_similar_laminar_layer(H):
    side = similar_layer(H, np.geomspace(0.01, 1.0, 40))
    found = second.wall_residuals(side, reynolds=REYNOLDS, critical=9.0)
    # Logarithmic differences are exact for powers: rounding only.
    assert np.max(np.abs(found.momentum)) < 1e-13
    assert np.max(np.abs(found.shape)) < 1e-13
    assert np.all(np.isnan(found.lag))
    assert np.all(found.turbulent == 0.0)


def test_growth_is_the_integral_of_its_rate():
    errors = []
    for cells in (50, 100, 200):
        side = similar_layer(2.7, np.linspace(0.3, 0.8, cells + 1))
        found = second.wall_residuals(side, reynolds=REYNOLDS, critical=9.0)
        # The rate goes as 1/theta, behind where growth is switched on.
        rate = float(closures.growth_rate(np.array(2.7), *_ends(side), PUBLISHED)[-1])
        power = np.log(side.theta[-1] / side.theta[0]) / np.log(0.8 / 0.3)
        whole = rate * 0.8 * (1.0 - (0.3 / 0.8) ** (1.0 - power)) / (1.0 - power)
        errors.append(-found.growth.sum() - whole)
        assert whole > 1.0
    assert np.all(np.log2(np.abs(errors[:-1]) / np.abs(errors[1:])) > 1.9)


def _ends(side: Side) -> tuple[np.ndarray, np.ndarray]:
    ends = [0, -1]
    return side.theta[ends], REYNOLDS * side.ue[ends] * side.theta[ends]


@pytest.mark.parametrize("wake", [False, True])
def test_little_is_left_of_a_turbulent_layer_and_less_with_more_cells(wake):
    largest = []
    for cells in (40, 80, 160):
        layer = turbulent_layer(cells, wake=wake)
        if wake:
            found = second.wake_residuals(layer, reynolds=REYNOLDS)
        else:
            found = second.wall_residuals(layer, reynolds=REYNOLDS, critical=9.0)
        assert np.all(np.isnan(found.growth))
        largest.append([np.max(np.abs(one)) for one in (found.momentum, found.shape, found.lag)])
    # Means over a cell of width h leave h cubed; the layer itself is good to 1e-10.
    orders = np.log2(np.array(largest[:-1]) / np.array(largest[1:]))
    assert np.all(orders > 2.7)
    assert np.max(largest[-1]) < 1e-3


def test_the_cell_with_transition_is_shared():
    xi = np.array([0.1, 0.2, 0.3, 0.4, 0.5])
    n = np.array([2.0, 6.0, 8.0, 12.0, 13.0])
    side = Side(xi, 1e-3 * xi, 2.5e-3 * xi, np.ones(5), n, np.full(5, 0.05))
    share = second.turbulent_share(side, critical=9.0)
    assert share == pytest.approx([0.0, 0.0, 0.75, 1.0])
    forced = second.turbulent_share(side, critical=9.0, trip=0.16)
    assert forced == pytest.approx([0.4, 1.0, 1.0, 1.0])
    found = second.wall_residuals(side, reynolds=REYNOLDS, critical=9.0)
    late = second.wall_residuals(side, reynolds=REYNOLDS, critical=20.0)
    H, Rt = np.full(5, 2.5), REYNOLDS * side.theta
    initial = closures.initial_shear(H, Rt)
    begun = replace(side, shear=np.where(np.arange(5) < 3, initial, side.shear))
    early = second.wall_residuals(begun, reynolds=REYNOLDS, critical=1.0)
    for name in ("momentum", "shape"):
        mixed = 0.25 * getattr(late, name)[2] + 0.75 * getattr(early, name)[2]
        assert getattr(found, name)[2] == pytest.approx(mixed, rel=1e-12)
        assert getattr(late, name)[2] != pytest.approx(getattr(early, name)[2], rel=0.01)
    assert np.isnan(found.lag).tolist() == [True, True, False, False]
    assert np.isnan(found.growth).tolist() == [False, False, False, True]


def test_the_changes_to_the_closures_act_only_where_they_should():
    H, ones = np.array([2.4, 3.4, 4.0, 4.6]), np.ones(4)
    Rt = 2000.0 * ones
    published = closures.growth_rate(H, ones, Rt, PUBLISHED)
    for ramp, middle in (("linear", 0.8), ("smooth", 0.8)):
        slower = closures.growth_rate(H, ones, Rt, Closures(ramp=ramp))
        assert slower / published == pytest.approx([1.0, 1.0, middle, 0.6])
    quarter = np.array([3.75])
    factors = [
        closures.growth_rate(quarter, ones[:1], Rt[:1], Closures(ramp=ramp))
        / closures.growth_rate(quarter, ones[:1], Rt[:1], PUBLISHED)
        for ramp in ("linear", "smooth")
    ]
    assert np.ravel(factors) == pytest.approx([1.0 - 0.4 / 4.0, 1.0 - 0.4 * 5.0 / 32.0])
    for wake in (False, True):
        more, plain = (
            closures.turbulent_dissipation(H, Rt, 0.1 * ones, one, wake=wake)
            for one in (Closures(), PUBLISHED)
        )
        assert more / plain == pytest.approx([1.0, 1.09, 1.15, 1.21])


def test_the_wake_takes_over_what_both_sides_bring():
    upper, lower = turbulent_layer(10, wake=False), similar_layer(2.6, np.linspace(0.1, 1.0, 5))
    theta, dstar, ue, shear = second.joined(upper, lower, gap=0.001)
    assert theta == upper.theta[-1] + lower.theta[-1]
    assert dstar == pytest.approx(upper.dstar[-1] + lower.dstar[-1] + 0.001)
    assert min(upper.ue[-1], lower.ue[-1]) < ue < max(upper.ue[-1], lower.ue[-1])
    # Weighted by theta: nearer to the thicker, turbulent one.
    assert 0.5 * (upper.shear[-1] + lower.shear[-1]) < shear < upper.shear[-1]


def test_drag_of_a_wake_that_has_come_to_rest():
    wake = turbulent_layer(10, wake=True)
    still = Side(wake.xi, wake.theta, wake.theta, np.ones(11), wake.amplification, wake.shear)
    assert second.drag(still) == 2.0 * wake.theta[-1]  # the momentum that is missing


def test_theta_at_stagnation_is_that_of_the_exact_solution():
    # Hiemenz' layer: theta sqrt(Re due/dxi) = 0.29234 (tables of Falkner-Skan layers, beta 1).
    xi = np.array([0.001, 0.002])
    theta = second.stagnation_theta(xi, 7.0 * xi, reynolds=REYNOLDS)
    assert theta * np.sqrt(7.0 * REYNOLDS) == pytest.approx(0.29234, abs=1e-4)  # 0.513 rounded
