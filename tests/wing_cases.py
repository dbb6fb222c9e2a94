"""Wings with exact section curves, for tests of the lifting line alone."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from solver.section.packed import SectionLimits, SectionValues
from solver.wing.forces import station_forces, trefftz_drag
from solver.wing.influence import influence
from solver.wing.lattice import lattice
from solver.wing.lifting_line import Flow, Loading, solve
from solver.wing.station_polars import StationPolars


@dataclass(frozen=True)
class ExactSections:
    """Stands where packed polars stand: lift as a formula of angle and place.

    `lift` takes the angle [rad] and returns cl and its slope; it may close over
    the stations' places.
    """

    lift: Callable[[np.ndarray], tuple[np.ndarray, np.ndarray]]
    knee: float = np.inf
    largest: np.ndarray | float = np.inf

    def evaluate(self, angle, reynolds, *, band, section):
        lift, slope = self.lift(np.asarray(angle))
        none = np.zeros_like(lift)
        return SectionValues(
            lift=lift,
            lift_slope=slope,
            drag=none,
            drag_slope=none,
            moment=none,
            moment_slope=none,
        )

    def limits(self, reynolds, *, band, section):
        shape = np.broadcast_shapes(np.shape(reynolds), np.shape(section))
        return SectionLimits(
            largest_lift=np.broadcast_to(self.largest, shape),
            knee_angle=np.full(shape, self.knee),
            peak_angle=np.full(shape, self.knee),
        )


def linear_section(angle):
    return 2.0 * np.pi * angle, np.full_like(angle, 2.0 * np.pi)


@dataclass(frozen=True)
class EllipticSurface:
    """Chord elliptic along the span, quarter-chord line straight."""

    span: float
    aspect_ratio: float
    x: float = 0.0
    z: float = 0.0

    def chord(self, fraction):
        return 4.0 * self.span / (np.pi * self.aspect_ratio) * np.sqrt(1.0 - fraction**2)

    def quarter_chord(self, fraction):
        across = 0.5 * self.span * fraction
        return np.stack([np.full_like(across, self.x), across, np.full_like(across, self.z)], -1)

    def twist(self, fraction):
        return np.zeros_like(fraction)

    def dihedral_angle(self):
        return np.asarray(0.0)


def flow_over(*surfaces, stations, angle, sections=None, wake_angle=None, **keywords) -> Flow:
    grid = lattice(*surfaces, stations=stations)
    count = grid.surface.size
    index = np.zeros(count, dtype=np.int64)
    return Flow(
        lattice=grid,
        polars=StationPolars(
            packed=sections or ExactSections(linear_section),
            first=index,
            second=index,
            weight=np.zeros(count),
        ),
        influence=influence(
            grid, wake_angle=angle if wake_angle is None else wake_angle, **keywords
        ),
        speed_over_viscosity=np.asarray(1e6),
        shift=np.zeros(count),
        active=np.ones(count, dtype=np.bool_),
    )


@dataclass(frozen=True)
class Coefficients:
    """Of a solved loading on a reference area."""

    lift: np.ndarray
    drag: np.ndarray
    far_drag: np.ndarray
    state: Loading


def coefficients(flow: Flow, angle, *, area, start=None) -> Coefficients:
    state = solve(flow, angle, start=start)
    forces = station_forces(
        flow.lattice,
        flow.influence,
        circulation=state.circulation,
        angle_of_attack=state.angle_of_attack,
    )
    far = trefftz_drag(
        flow.lattice, circulation=state.circulation, angle_of_attack=state.angle_of_attack
    )
    return Coefficients(
        lift=forces.lift.sum(-1) / area,
        drag=forces.induced_drag.sum(-1) / area,
        far_drag=far / area,
        state=state,
    )
