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


def turbulent_layer(cells: int, *, wake: bool, chosen: Closures) -> Side:
    """Turbulent layer in a rising pressure, from its ordinary differential equations."""

    def slopes(xi: float, state: np.ndarray) -> list[float]:
        theta, H, shear = (np.array(one) for one in state)
        ue, change = 1.0 - 0.3 * xi, -0.3
        Rt = REYNOLDS * ue * theta
        friction = 0.0 if wake else float(closures.turbulent_friction(H, Rt))
        loss = float(closures.turbulent_dissipation(H, Rt, shear, chosen, wake=wake))

        def energy(d_shape: float, d_log: float) -> float:
            factor = np.exp(d_log)
            moved = H + d_shape, Rt * factor
            return float(closures.turbulent_energy_shape(*moved, chosen, wake=wake))

        step = 1e-6
        by_shape = (energy(step, 0.0) - energy(-step, 0.0)) / (2.0 * step)
        by_log = (energy(0.0, step) - energy(0.0, -step)) / (2.0 * step)
        thicker = 0.5 * friction - (2.0 + H) * theta / ue * change
        rise = energy(0.0, 0.0) * ((loss - 0.5 * friction) / theta - (1.0 - H) / ue * change)
        bent = (rise - by_log * (thicker / theta + change / ue)) / by_shape
        delta = closures.layer_thickness(H, theta, H * theta) * (0.5 if wake else 1.0)
        wanted = closures.equilibrium_shear(H, Rt, chosen, wake=wake)
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


@pytest.mark.parametrize("chosen", [PUBLISHED, Closures()], ids=["published", "chosen"])
@pytest.mark.parametrize("wake", [False, True])
def test_little_is_left_of_a_turbulent_layer_and_less_with_more_cells(wake, chosen):
    largest = []
    for cells in (40, 80, 160):
        layer = turbulent_layer(cells, wake=wake, chosen=chosen)
        if wake:
            found = second.wake_residuals(layer, reynolds=REYNOLDS, closures=chosen)
        else:
            found = second.wall_residuals(layer, reynolds=REYNOLDS, critical=9.0, closures=chosen)
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
    initial = closures.initial_shear(H, Rt, Closures())
    begun = replace(side, shear=np.where(np.arange(5) < 3, initial, side.shear))
    early = second.wall_residuals(begun, reynolds=REYNOLDS, critical=1.0)
    for name in ("momentum", "shape"):
        mixed = 0.25 * getattr(late, name)[2] + 0.75 * getattr(early, name)[2]
        assert getattr(found, name)[2] == pytest.approx(mixed, rel=1e-12)
        assert getattr(late, name)[2] != pytest.approx(getattr(early, name)[2], rel=0.01)
    assert np.isnan(found.lag).tolist() == [True, True, False, False]
    assert np.isnan(found.growth).tolist() == [False, False, False, True]


def test_separated_growth_comes_in_by_its_ramp():
    H, Rt, one = np.array([3.4, 3.75, 4.0, 4.6]), np.full(4, 2000.0), np.ones(4)
    published = closures.growth_rate(H, one, Rt, PUBLISHED)
    for ramp, quarter in (("linear", 1.0 / 4.0), ("smooth", 5.0 / 32.0)):
        changed = replace(PUBLISHED, separated_growth=0.6, ramp=ramp)
        slower = closures.growth_rate(H, one, Rt, changed) / published
        assert slower == pytest.approx([1.0, 1.0 - 0.4 * quarter, 0.8, 0.6])


def test_disturbances_in_reversed_flow_grow_along_thinner_layers():
    H = np.array([2.4, 4.0, 5.0, 8.8, 12.0])
    one, Rt = np.ones(5), np.full(5, 2000.0)
    changed = replace(PUBLISHED, reversed_length=True)
    published, thinner = (closures.growth_length(H, one) for one in (PUBLISHED, changed))
    assert thinner[:2] == pytest.approx(published[:2], rel=1e-4)  # 0.3438 has four digits
    assert thinner[2] == pytest.approx(0.3438 / 1.05)
    assert thinner[3] == thinner[4] < published[3]
    faster = closures.growth_rate(H, one, Rt, changed) / closures.growth_rate(H, one, Rt, PUBLISHED)
    assert faster == pytest.approx(thinner / published)


@pytest.mark.parametrize("wake", [False, True])
def test_dissipation_rises_with_separation_and_no_further(wake):
    H = np.array([1.7, 1.8001, 2.8, 40.0])
    Rt, shear = np.full(4, 2000.0), np.full(4, 0.1)
    changed = replace(PUBLISHED, dissipation_rise=0.3)
    more, plain = (
        closures.turbulent_dissipation(H, Rt, shear, one, wake=wake) for one in (changed, PUBLISHED)
    )
    wanted = [1.0, 1.00003, 1.0 + 0.3 * (1.0 - np.exp(-1.0)), 1.3]
    assert more / plain == pytest.approx(wanted, abs=1e-8)


def test_the_inner_layer_takes_stress_where_it_is_thick():
    H, Rt = np.array([1.4, 1.4, 2.5]), np.array([1e9, 180.0, 50.0])
    changed = replace(PUBLISHED, inner_layer=18.0)
    share = closures.equilibrium_shear(H, Rt, changed) / closures.equilibrium_shear(H, Rt)
    # 18/Rt of H - 1 is nothing, a quarter, 0.24.
    assert share == pytest.approx([1.0, 0.75, 0.76], abs=1e-7)
    floor = closures.equilibrium_shear(H, np.full(3, 20.0), changed)
    assert floor / closures.equilibrium_shear(H, np.full(3, 20.0)) == pytest.approx(
        [0.2, 0.2, 1.0 - 0.9 / 1.5]
    )


@pytest.mark.parametrize(("wake", "fullest"), [(False, 1.25), (True, 1.06)])
def test_full_profiles_have_any_energy_shape(wake, fullest):
    H, changed = np.array([fullest + 0.01, 1.05, 1.01, 1.0001]), replace(PUBLISHED, fullest=True)
    Rt = np.full(4, 1000.0)
    more = closures.turbulent_energy_shape(H, Rt, changed, wake=wake)
    more -= closures.turbulent_energy_shape(H, Rt)
    assert more[0] == 0.0
    assert more[1] == pytest.approx(2.0 * (fullest - 1.05) ** 2)
    assert more[3] > 0.9 * 0.1 * (fullest - 1.0) ** 2 / 0.0001


def test_weights_are_those_of_a_quantity_that_relaxes():
    lengths = np.array([1e-3, 0.2, 1.0, 7.0, 50.0, 300.0])
    xi = np.append(0.0, np.cumsum(lengths)) * 5.0 * 0.01
    layer = Side(xi, *(np.full(7, 0.01) for _ in range(5)))
    late = second.late_weight(layer, Closures())
    assert late[0] == pytest.approx(0.5 + 1e-3 / 12.0, abs=1e-9)
    assert late[-1] == pytest.approx(1.0 - 1.0 / 300.0, rel=1e-12)
    # dy/dt = -y from 1: the difference is the weighted rate, times the length.
    end = np.exp(-lengths)
    rate = -((1.0 - late) + late * end)
    assert rate * lengths == pytest.approx(end - 1.0, rel=1e-10)
    assert np.all(second.late_weight(layer, PUBLISHED) == 0.5)


@pytest.mark.parametrize(("n", "lacking"), [(8.0, 1.0), (2.0, 4.0), (8.9999, 0.0001)])
def test_a_laminar_edge_begins_the_wake_with_what_its_waves_have(n, lacking):
    side = similar_layer(2.7, np.linspace(0.3, 0.8, 5))
    side = replace(side, amplification=np.linspace(0.0, n, 5))
    end = [
        second.begun(side, reynolds=REYNOLDS, critical=9.0, closures=one).shear[-1]
        for one in (Closures(), replace(Closures(), waves_at_edge=False))
    ]
    assert end[0] / end[1] == pytest.approx(np.exp(-lacking))
    H, Rt = np.array(2.7), REYNOLDS * side.ue[-1] * side.theta[-1]
    assert end[1] == float(closures.initial_shear(H, Rt, Closures()))
    # What has turned before the edge keeps its own.
    turned = second.begun(side, reynolds=REYNOLDS, critical=9.0, trip=0.4)
    assert turned.shear[-1] == side.shear[-1]


def test_the_wake_takes_over_what_both_sides_bring():
    upper, lower = (
        turbulent_layer(10, wake=False, chosen=Closures()),
        similar_layer(2.6, np.linspace(0.1, 1.0, 5)),
    )
    theta, dstar, ue, shear = second.joined(upper, lower, gap=0.001)
    assert theta == upper.theta[-1] + lower.theta[-1]
    assert dstar == pytest.approx(upper.dstar[-1] + lower.dstar[-1] + 0.001)
    assert min(upper.ue[-1], lower.ue[-1]) < ue < max(upper.ue[-1], lower.ue[-1])
    # Weighted by theta: nearer to the thicker, turbulent one.
    assert 0.5 * (upper.shear[-1] + lower.shear[-1]) < shear < upper.shear[-1]


def test_drag_of_a_wake_that_has_come_to_rest():
    wake = turbulent_layer(10, wake=True, chosen=Closures())
    still = Side(wake.xi, wake.theta, wake.theta, np.ones(11), wake.amplification, wake.shear)
    assert second.drag(still) == 2.0 * wake.theta[-1]  # the momentum that is missing


def test_theta_at_stagnation_is_that_of_the_exact_solution():
    # Hiemenz' layer: theta sqrt(Re due/dxi) = 0.29234 (tables of Falkner-Skan layers, beta 1).
    xi = np.array([0.001, 0.002])
    theta = second.stagnation_theta(xi, 7.0 * xi, reynolds=REYNOLDS)
    assert theta * np.sqrt(7.0 * REYNOLDS) == pytest.approx(0.29234, abs=1e-4)  # 0.513 rounded
