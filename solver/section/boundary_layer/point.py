"""One point of a polar, and what all points of one section share."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.boundary_layer.forces import coefficients, wall_curvature, wall_pressures
from solver.section.boundary_layer.layout import (
    FloatArray,
    LayerState,
    Linear,
    PotentialFlow,
    Regime,
    Stations,
    blank_state,
)
from solver.section.boundary_layer.readings import half_friction, stations
from solver.section.boundary_layer.solve import CONVERGED, solve_point
from solver.section.boundary_layer.start import start
from solver.section.panelling import PanelNodes
from solver.section.potential_flow import Influence, Wake, between

NEVER = 9.0
"""Distance of a trip that is not there, over chord."""
TRIP_ROUNDS, TRIP_TOLERANCE = 5, 1e-6
"""A trip is so far from the stagnation point, which is known after an iteration only."""

MOST_BLENDS = 64
"""Angles for which the potential flow between two wakes is remembered."""


@dataclass(frozen=True, eq=False)
class SectionPanels:
    """A section laid out in panels, with the potential flow about it.

    Parameters
    ----------
    nodes : PanelNodes
        Of the body.
    falling, rising : Influence
        Of body and wake, the wake laid for a low and for a high angle.
    low, high : float
        Those angles. [rad]
    blends : dict
        What was found between them, by angle: the same for all Reynolds numbers.
    """

    nodes: PanelNodes
    falling: Influence
    rising: Influence
    low: float
    high: float
    blends: dict[float, Influence] = field(default_factory=dict)

    @cached_property
    def count(self) -> int:
        """Nodes of the body."""
        return len(self.nodes.x)

    @cached_property
    def total(self) -> int:
        """Nodes of body and wake."""
        return len(self.rising.along)

    @cached_property
    def curvature(self) -> FloatArray:
        """Of the wall at the nodes."""
        return wall_curvature(self.nodes)

    def influence(self, angle: float) -> Influence:
        """Potential flow for an angle of attack.

        Parameters
        ----------
        angle : float
            [rad]

        Returns
        -------
        Influence
            Between both wakes in proportion to the angle, beyond them that of the
            nearer one: a section turned over flies as before.
        """
        if angle >= self.high or self.falling is self.rising:
            return self.rising
        if angle <= self.low:
            return self.falling
        found = self.blends.get(angle)
        if found is None:
            share = (angle - self.low) / (self.high - self.low)
            found = between(self.falling, self.rising, share)
            if len(self.blends) < MOST_BLENDS:
                self.blends[angle] = found
        return found


@dataclass(frozen=True, eq=False)
class Conditions:
    """What all points of a section are solved under.

    Parameters
    ----------
    critical : float
        Amplification factor at which the flow turns turbulent. [-]
    trip_upper, trip_lower : float or None
        Place of forced transition, arc length from the first node. [-]
    constants : ClosureConstants
    """

    critical: float
    trip_upper: float | None
    trip_lower: float | None
    constants: ClosureConstants

    @cached_property
    def array(self) -> FloatArray:
        """The constants as the kernels take them."""
        return self.constants.as_array()

    def regime(self, reynolds: float) -> Regime:
        """What the kernels take of them, at a Reynolds number."""
        return Regime(reynolds, self.critical, self.array)

    @property
    def tripped(self) -> bool:
        """Whether transition is forced anywhere."""
        return self.trip_upper is not None or self.trip_lower is not None

    def trips(self, stagnation: float) -> FloatArray:
        """Distances of the trips along both sides from a stagnation point."""
        upper, lower = self.trip_upper, self.trip_lower
        return np.array(
            [
                NEVER if upper is None else stagnation - upper,
                NEVER if lower is None else lower - stagnation,
            ]
        )


@dataclass(frozen=True)
class Outcome:
    """How an iteration went.

    Fields
    ------
    ended : int
        `CONVERGED`, `MOVING` or `BROKEN`.
    iterations : int
        How many.
    change : float
        Largest change of ln theta, ln dstar, ln ue in the last one. [-]
    """

    ended: int
    iterations: int
    change: float


def cold_start(
    panels: SectionPanels, conditions: Conditions, *, angle: float, reynolds: float
) -> LayerState:
    """March the layers under the speeds of the potential flow without them.

    Parameters
    ----------
    panels : SectionPanels
    conditions : Conditions
    angle : float
        Of attack. [rad]
    reynolds : float
        [-]

    Returns
    -------
    LayerState
    """
    count = panels.count
    state = blank_state(count, panels.total - count)
    flow = panels.influence(angle)
    speed = flow.along * np.cos(angle) + flow.across * np.sin(angle)
    # The kernel finds the stagnation point itself; a trip needs a first idea of it.
    turns = np.flatnonzero((speed[: count - 1] < 0.0) & (speed[1:count] >= 0.0))
    trips = conditions.trips(panels.nodes.arc[turns[0] if turns.size else count // 2])
    places = Stations(panels.nodes.arc, flow.wake.distance)
    start(speed, places, trips, conditions.regime(reynolds), state)
    return state


def iterate(
    panels: SectionPanels,
    conditions: Conditions,
    state: LayerState,
    *,
    angle: float,
    reynolds: float,
    iterations: int,
    trip_rounds: int = TRIP_ROUNDS,
) -> Outcome:
    """Bring a state to rest at one angle and Reynolds number.

    Parameters
    ----------
    panels : SectionPanels
    conditions : Conditions
    state : LayerState
        To begin with; changed in place.
    angle : float
        Of attack. [rad]
    reynolds : float
        [-]
    iterations : int
        At most so many; with a trip so many for each idea of where it is.
    trip_rounds : int, optional
        Ideas of where a trip is, which depends on the stagnation point.

    Returns
    -------
    Outcome
    """
    flow = panels.influence(angle)
    at_angle, regime = potential_flow_at(flow, angle), conditions.regime(reynolds)
    places = Stations(panels.nodes.arc, flow.wake.distance)
    history = np.zeros((iterations, 5))
    used = 0
    for _ in range(trip_rounds):
        from_place = state.place[1]
        trips = conditions.trips(from_place)
        ended, rounds, change = solve_point(
            at_angle, places, trips, regime, state, history, iterations
        )
        used += rounds
        settled = not conditions.tripped or abs(state.place[1] - from_place) < TRIP_TOLERANCE
        if settled or ended != CONVERGED:
            break
    return Outcome(int(ended), used, float(change))


READINGS = (
    "lift",
    "drag",
    "moment",
    "transition_upper",
    "separation_upper",
    "reattachment_upper",
    "transition_lower",
    "separation_lower",
    "reattachment_lower",
)
"""What :func:`read` returns, in its order."""


def read(
    panels: SectionPanels,
    conditions: Conditions,
    state: LayerState,
    *,
    angle: float,
    reynolds: float,
) -> FloatArray:
    """Read forces and places off a state.

    Parameters
    ----------
    panels : SectionPanels
    conditions : Conditions
    state : LayerState
    angle : float
        Of attack. [rad]
    reynolds : float
        [-]

    Returns
    -------
    numpy.ndarray, shape (len(READINGS),)
        [-]
    """
    nodes, share = panels.nodes, conditions.constants.wall_curvature
    pressure = wall_pressures(state.stations, panels.curvature, share)
    friction = half_friction(state.stations, state.laminar, panels.count, reynolds)
    places = stations(nodes.x, friction, int(state.place[0]), state.turbulent_from, state.share)
    forces = coefficients(nodes.x, nodes.y, pressure, state.stations[-1], angle)
    return np.concatenate([forces, places.ravel()])


def place_of_trip(nodes: PanelNodes, share: float | None, *, lower: bool) -> float | None:
    """Arc length at a share of chord on a side.

    Parameters
    ----------
    nodes : PanelNodes
    share : float or None
        Of chord. [-]
    lower : bool
        The side.

    Returns
    -------
    float or None
        From the first node; None where there is no share.
    """
    if share is None:
        return None
    middle = len(nodes.x) // 2
    side = slice(middle, None, 1 if lower else -1)
    # The nose may reach a little ahead of the leading edge.
    return float(np.interp(share, np.maximum.accumulate(nodes.x[side]), nodes.arc[side]))


def potential_flow_at(flow: Influence, angle: float) -> PotentialFlow:
    """Lay the potential flow at an angle of attack out as the kernels take it.

    Parameters
    ----------
    flow : Influence
        At that angle.
    angle : float
        [rad]

    Returns
    -------
    PotentialFlow
    """
    cosine, sine = np.cos(angle), np.sin(angle)
    return PotentialFlow(
        Linear(flow.along * cosine + flow.across * sine, flow.defect, flow.sheet),
        Linear(
            flow.normal_along * cosine + flow.normal_across * sine,
            flow.normal_defect,
            flow.normal_sheet,
        ),
        wake_directions(flow.wake),
    )


def wake_directions(wake: Wake) -> FloatArray:
    """Direction of each panel of a wake.

    Parameters
    ----------
    wake : Wake

    Returns
    -------
    numpy.ndarray, shape (w,)
        Against the x axis. [rad]
    """
    return np.asarray(np.arctan2(np.diff(wake.y), np.diff(wake.x)), dtype=np.float64)
