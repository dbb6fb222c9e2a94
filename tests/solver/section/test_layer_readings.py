"""Forces and stations read off layers that were made up."""

from __future__ import annotations

from dataclasses import fields

import numpy as np
import pytest

from solver.section.boundary_layer import constants
from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.boundary_layer.forces import coefficients, wall_curvature, wall_pressures
from solver.section.boundary_layer.readings import half_friction, stations
from solver.section.geometry import naca_outline
from solver.section.panelling import PanelNodes, panel_nodes

NODES = panel_nodes(naca_outline("4415"))
REST = np.log([1e-3, 2e-3, 1.0, 0.03])
"""A wake's end at the speed of the free stream."""


def circle(radius: float, nodes: int = 401) -> PanelNodes:
    turn = np.linspace(0.0, 2.0 * np.pi, nodes)
    return PanelNodes(0.5 + radius * np.cos(turn), radius * np.sin(turn), radius * turn)


@pytest.mark.parametrize("angle", [-0.1, 0.0, 0.2])
def test_a_pressure_gradient_lifts_by_the_area_enclosed(angle):
    x, y = NODES.x, NODES.y
    area = 0.5 * abs(np.sum(x[:-1] * y[1:] - x[1:] * y[:-1]))
    lift, _drag, _moment = coefficients(x, y, 0.3 + 0.7 * x - 1.1 * y, REST, angle)
    # Gauss's theorem, exact for a polygon and a pressure that is linear along its sides.
    assert lift == pytest.approx(area * (1.1 * np.cos(angle) + 0.7 * np.sin(angle)), abs=1e-13)


def test_moment_is_about_the_quarter_chord_and_nose_up_positive():
    x, y = NODES.x, NODES.y
    upper = np.arange(len(x)) < len(x) // 2
    # Suction over the rear of the upper side alone pushes the nose down.
    pressure = np.where(upper & (x > 0.6) & (x < 0.9), -1.0, 0.0)
    lift, _drag, moment = coefficients(x, y, pressure, REST, 0.0)
    assert lift > 0.25
    arm = -moment / lift
    assert 0.6 - 0.25 < arm < 0.9 - 0.25
    # The surface is not level, which shifts the centre by its height times its slope.
    assert arm == pytest.approx(0.75 - 0.25, abs=0.03)


def test_drag_is_twice_the_momentum_thickness_where_the_wake_has_recovered():
    _lift, drag, _moment = coefficients(NODES.x, NODES.y, np.zeros(len(NODES.x)), REST, 0.0)
    assert drag == pytest.approx(2e-3, rel=1e-12)  # rounding


def test_squire_and_youngs_power_of_the_speed():
    slow = REST + np.log([1.0, 1.0, 0.9, 1.0])
    rest = coefficients(NODES.x, NODES.y, np.zeros(len(NODES.x)), REST, 0.0)[1]
    drag = coefficients(NODES.x, NODES.y, np.zeros(len(NODES.x)), slow, 0.0)[1]
    assert drag / rest == pytest.approx(0.9**3.5, rel=1e-12)  # (H + 5)/2 at H = 2


@pytest.mark.parametrize("radius", [0.1, 0.5])
def test_curvature_of_a_circle(radius):
    curvature = wall_curvature(circle(radius))
    # Second order in an arc of 1/400 turn: (2 pi/400)^2/6.
    assert curvature[3:-3] == pytest.approx(1.0 / radius, rel=1e-4)


def test_a_convex_wall_has_less_suction_than_the_edge_of_its_layer():
    curvature = np.array([2.0, 0.0, -2.0, 2.0])
    state = np.tile(np.log([1e-3, 2e-3, 1.3, 0.03]), (5, 1))
    state[3, 1] = np.log(9e-3)  # separated: the mass defect counts up to H = 2.5
    pressure = wall_pressures(state, curvature, 1.0)
    edge = 1.0 - 1.3**2
    assert pressure[1] == pytest.approx(edge, rel=1e-12)
    shift = 1.3**2 * 2.0 * 2.0
    expected = edge + shift * np.array([3e-3, 0.0, -3e-3, 3.5e-3])
    assert pressure == pytest.approx(expected, rel=1e-12)
    assert wall_pressures(state, curvature, 0.0) == pytest.approx(edge, rel=1e-12)


# --- stations

X = np.array([1.0, 0.8, 0.6, 0.4, 0.2, 0.05, 0.05, 0.2, 0.4, 0.6, 0.8, 1.0])
STAGNATION = 5
LAMINAR = np.array([-1, -1])


def places(upper: list[float], lower: list[float], turbulent_from=LAMINAR, share=(0.0, 0.0)):
    """Stations for friction given from the stagnation point outwards."""
    friction = np.array(upper[::-1] + lower)
    return stations(X, friction, STAGNATION, np.array(turbulent_from), np.array(share))


def test_attached_laminar_sides_have_no_stations():
    assert np.isnan(places([1.0] * 6, [1.0] * 6)).all()


def test_separation_and_reattachment_lie_where_friction_vanishes():
    upper = [9.0, 9.0, 3.0, -1.0, -1.0, 1.0]  # x = .05 .2 .4 .6 .8 1
    found = places(upper, [1.0] * 6)
    assert found[0, 1:] == pytest.approx([0.55, 0.9], abs=1e-12)
    assert np.isnan(found[1]).all()


def test_a_side_may_stay_separated_to_the_trailing_edge():
    found = places([1.0] * 6, [9.0, 9.0, 1.0, 1.0, -1.0, -2.0])
    assert found[1, 1] == pytest.approx(0.7, abs=1e-12)
    assert np.isnan(found[1, 2])


def test_only_the_first_bubble_is_told():
    found = places([9.0, 9.0, -9.0, 9.0, -9.0, 9.0], [1.0] * 6)
    assert found[0, 1:] == pytest.approx([0.3, 0.5], abs=1e-12)


def test_transition_lies_in_its_cell_by_the_turbulent_share():
    # Upper: node 2 (x = .6) is the first turbulent one, .4 lies ahead of it.
    found = places([1.0] * 6, [1.0] * 6, turbulent_from=[2, 10], share=[0.25, 1.0])
    assert found[0, 0] == pytest.approx(0.6 - 0.25 * 0.2, abs=1e-12)
    assert found[1, 0] == pytest.approx(0.6, abs=1e-12)


def test_friction_vanishes_with_the_laminar_closure_and_with_the_turbulent_one():
    h = np.array([2.6, 3.9, 4.2, 1.5, 3.0, 4.5])
    state = np.zeros((6, 4))
    state[:, 0] = np.log(1e-3)
    state[:, 1] = state[:, 0] + np.log(h)
    laminar = np.array([True, True, True, False, False, False])
    friction = half_friction(state, laminar, 6, 5e5)
    # Laminar layers part at H = 4.0 (Falkner and Skan), turbulent ones at 3 to 4 here.
    assert (friction[:2] > 0.0).all()
    assert friction[2] < 0.0
    assert friction[3] > friction[4] > friction[5]
    assert friction[5] < 0.0
    assert friction[0] == pytest.approx(0.2205 / 500.0, rel=0.02)  # Blasius, model error


# --- constants


def test_constants_stand_where_the_kernels_look_for_them():
    names = [field.name for field in fields(ClosureConstants)]
    for k, name in enumerate(names):
        assert getattr(constants, name.upper()) == k
    given = {name: 1.0 + k for k, name in enumerate(names)}
    assert ClosureConstants(**given).as_array() == pytest.approx(1.0 + np.arange(len(names)))
