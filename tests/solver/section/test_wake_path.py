"""Where the wake is laid, and what is done where its flow is not found."""

from __future__ import annotations

import numpy as np
import pytest

from solver.section.boundary_layer import point, solve, wake_path
from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.boundary_layer.point import SectionPanels
from solver.section.geometry import naca_outline
from solver.section.panelling import panel_nodes

pytestmark = pytest.mark.usefixtures("compiled_kernels")


def laid(digits: str) -> SectionPanels:
    return wake_path.prepared(panel_nodes(naca_outline(digits)), ClosureConstants())


def lost(monkeypatch, where) -> None:
    """Let no flow be found at some angles [deg]."""

    def iterate(panels, conditions, state, *, angle, **rest):
        if where(np.degrees(angle)):
            return point.Outcome(solve.MOVING, 1, 1.0)
        return point.iterate(panels, conditions, state, angle=angle, **rest)

    monkeypatch.setattr(wake_path, "iterate", iterate)


def test_the_wake_leaves_along_the_trailing_edge_and_turns_into_the_stream():
    wake = laid("2412").rising.wake
    direction = np.degrees(point.wake_directions(wake))
    # Camber of 2 % at 40 % of chord: the camber line ends at -3.8 degrees, and the
    # thicker layer of the upper side turns the flow up from that.
    assert -3.8 < direction[0] < 0.0
    assert (np.diff(direction) > 0.0).all()
    # A chord behind a section its downwash is 2 to 3 degrees at this lift.
    assert 0.5 < direction[-1] < 4.0
    length = np.hypot(np.diff(wake.x), np.diff(wake.y))
    assert length == pytest.approx(np.diff(wake.distance), rel=1e-12)


def test_the_wakes_of_a_symmetric_section_mirror_each_other():
    panels = laid("0012")
    assert panels.low == -panels.high
    # Both are iterated until layers change by less than 1e-4 of themselves.
    assert panels.falling.wake.y == pytest.approx(-panels.rising.wake.y, abs=1e-6)


def test_between_both_wakes_the_flow_changes_in_proportion():
    panels = laid("2412")
    low, high = panels.falling, panels.rising
    quarter = panels.influence(panels.low + 0.25 * (panels.high - panels.low))
    assert quarter.along == pytest.approx(0.75 * low.along + 0.25 * high.along, abs=1e-12)
    assert quarter.wake.y == pytest.approx(0.75 * low.wake.y + 0.25 * high.wake.y, abs=1e-12)
    assert panels.influence(panels.low) is low
    assert panels.influence(panels.high) is high
    assert panels.influence(1.0) is high
    assert panels.influence(-1.0) is low


def test_a_flow_that_is_not_found_is_sought_at_half_the_angle(monkeypatch):
    lost(monkeypatch, lambda degrees: degrees < -3.0)
    panels = laid("2412")
    assert np.degrees([panels.low, panels.high]) == pytest.approx([-2.0, 4.0])


@pytest.mark.parametrize("sign", [-1.0, 1.0])
def test_one_wake_serves_all_angles_where_the_other_is_not_found(monkeypatch, sign):
    lost(monkeypatch, lambda degrees: sign * degrees > 0.0)
    panels = laid("2412")
    assert panels.falling is panels.rising
    assert panels.high == pytest.approx(-sign * np.radians(4.0))
    assert panels.influence(-0.2) is panels.influence(0.2)


def test_a_straight_wake_is_kept_where_no_flow_is_found(monkeypatch):
    lost(monkeypatch, lambda degrees: True)
    wake = laid("2412").influence(0.1).wake
    assert not np.diff(wake.y).any()
