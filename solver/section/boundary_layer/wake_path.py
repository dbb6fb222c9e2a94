"""The path of a section's wake, found once for all points."""

from __future__ import annotations

import numpy as np

from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.boundary_layer.layout import LayerState
from solver.section.boundary_layer.point import (
    Conditions,
    SectionPanels,
    cold_start,
    iterate,
    place_of_trip,
    potential_flow_at,
)
from solver.section.boundary_layer.solve import CONVERGED
from solver.section.boundary_layer.speeds import fill_speeds, fill_wake_angles
from solver.section.panelling import PanelNodes
from solver.section.potential_flow import Influence, Wake, influence, straight_wake

WAKE_ANGLES = (np.radians(4.0), np.radians(2.0))
"""Up and down, where the wake's path is followed once for all points of a section: the
first of them that is found."""
WAKE_PASSES, WAKE_ITERATIONS, WAKE_REYNOLDS = 2, 30, 3e6
WAKE_TRIP, WAKE_CRITICAL = 0.05, 9.0
"""Transition is forced there, as a share of chord: it matters little to the path, and a
flow with long laminar stretches is found less often."""


def prepared(nodes: PanelNodes, constants: ClosureConstants) -> SectionPanels:
    """Lay the wake of a section along the flow, and solve the potential flow about both.

    Parameters
    ----------
    nodes : PanelNodes
        Of the body.
    constants : ClosureConstants

    Returns
    -------
    SectionPanels
        With the wakes at -4 and at 4 degrees and a Reynolds number of 3e6, or at half
        the angle where that flow is not found. Where neither is, one wake serves all
        angles: the other one, or a straight one.
    """
    straight = influence(nodes, straight_wake(nodes))
    conditions = Conditions(
        WAKE_CRITICAL,
        place_of_trip(nodes, WAKE_TRIP, lower=False),
        place_of_trip(nodes, WAKE_TRIP, lower=True),
        constants,
    )
    falling = _with_wake_along_flow(nodes, straight, conditions, -1.0)
    rising = _with_wake_along_flow(nodes, straight, conditions, 1.0)
    if falling is None or rising is None:
        only, angle = falling or rising or (straight, 0.0)
        return SectionPanels(nodes, only, only, angle, angle)
    return SectionPanels(nodes, falling[0], rising[0], falling[1], rising[1])


def _with_wake_along_flow(
    nodes: PanelNodes, straight: Influence, conditions: Conditions, sign: float
) -> tuple[Influence, float] | None:
    """Move the wake to where the flow goes at the first angle at which it is found."""
    for size in WAKE_ANGLES:
        flow, angle = straight, sign * size
        panels = SectionPanels(nodes, flow, flow, angle, angle)
        state = cold_start(panels, conditions, angle=angle, reynolds=WAKE_REYNOLDS)
        for _ in range(WAKE_PASSES):
            outcome = iterate(
                panels,
                conditions,
                state,
                angle=angle,
                reynolds=WAKE_REYNOLDS,
                iterations=WAKE_ITERATIONS,
                trip_rounds=1,
            )
            if outcome.ended != CONVERGED:
                break
            flow = influence(nodes, _followed(panels, state, angle))
            panels = SectionPanels(nodes, flow, flow, angle, angle)
        if flow is not straight:
            return flow, angle
    return None


def _followed(panels: SectionPanels, state: LayerState, angle: float) -> Wake:
    """Path of the flow behind the section in a state."""
    flow = panels.influence(angle)
    at_angle, stagnation = potential_flow_at(flow, angle), int(state.place[0])
    speed, direction = np.empty(panels.total), np.empty(panels.total - panels.count)
    fill_speeds(at_angle.along, state, stagnation, speed)
    fill_wake_angles(at_angle, state, stagnation, speed, direction)
    step = np.diff(flow.wake.distance)
    return Wake(
        flow.wake.x[0] + np.append(0.0, np.cumsum(step * np.cos(direction))),
        flow.wake.y[0] + np.append(0.0, np.cumsum(step * np.sin(direction))),
        flow.wake.distance,
    )
