"""One Reynolds number over all angles: from point to point, and round the hard ones."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.section.boundary_layer.layout import FloatArray, LayerState
from solver.section.boundary_layer.point import (
    READINGS,
    Conditions,
    Outcome,
    SectionPanels,
    cold_start,
    iterate,
    read,
)
from solver.section.boundary_layer.solve import BROKEN, CONVERGED

StatusArray = NDArray[np.uint8]

FOUND, NEARLY, LOST = 0, 1, 2
"""How a point ended: at rest, nearly at rest, or not at all."""

START_ANGLE = np.radians(2.0)
"""Near which a sweep begins: both sides of most sections are attached there."""
MOST_ITERATIONS, SUB_ITERATIONS = 40, 25
"""Of a try; of a step on the way to it."""
SUB_STEPS = 4
"""Between a neighbour and a point that does not follow from it at once."""
LONGEST_STEP = np.radians(1.0)
"""Of a sweep to one angle."""
FARTHEST_NEIGHBOUR = np.radians(3.0)
"""From which sub-steps are tried."""
WAY_DOWN = (4.0, 2.5, 1.6, 1.25, 1.0)
"""Times the Reynolds number, on the way down to it at one angle."""
NEARLY_AT_REST = 3e-3
"""Largest change in the last iteration of a point that is kept as approximate: of the
layers' thicknesses and the speed, as a share."""


@dataclass(frozen=True, eq=False)
class Column:
    """All angles at one Reynolds number.

    Parameters
    ----------
    readings : numpy.ndarray, shape (na, len(READINGS))
        NaN where a point was lost. [-]
    status : numpy.ndarray of uint8, shape (na,)
        `FOUND`, `NEARLY` or `LOST`.
    iterations : int
        Dense systems that were solved.
    """

    readings: FloatArray
    status: StatusArray
    iterations: int


@dataclass(frozen=True, eq=False)
class _Point:
    state: LayerState
    change: float
    status: int


class _Sweep:
    """The points of a column as they are found."""

    def __init__(
        self,
        panels: SectionPanels,
        conditions: Conditions,
        angle: FloatArray,
        reynolds: float,
        poll: Callable[[], None],
    ) -> None:
        self.panels, self.conditions = panels, conditions
        self.angle, self.reynolds, self.poll = angle, reynolds, poll
        self.first = int(np.argmin(np.abs(angle - START_ANGLE)))
        self.points: dict[int, _Point] = {}
        self.iterations = 0

    def iterate(
        self, state: LayerState, *, angle: float, factor: float = 1.0, most: int | None = None
    ) -> Outcome:
        outcome = iterate(
            self.panels,
            self.conditions,
            state,
            angle=angle,
            reynolds=factor * self.reynolds,
            iterations=MOST_ITERATIONS if most is None else most,
        )
        self.iterations += outcome.iterations
        return outcome

    def cold(self, angle: float, factor: float = 1.0) -> LayerState:
        return cold_start(
            self.panels, self.conditions, angle=angle, reynolds=factor * self.reynolds
        )

    def tries(self, index: int, neighbour: int | None) -> Iterator[tuple[LayerState, Outcome]]:
        """Ways to a point, the cheapest first."""
        angle = float(self.angle[index])
        if neighbour is not None:
            yield self.warm(index, neighbour)
            if abs(angle - self.angle[neighbour]) <= FARTHEST_NEIGHBOUR:
                yield self.by_sub_steps(index, neighbour)
        yield self.afresh(angle, (1.0,))
        yield self.afresh(angle, WAY_DOWN)

    def warm(self, index: int, neighbour: int) -> tuple[LayerState, Outcome]:
        state = self.points[neighbour].state.copy()
        return state, self.iterate(state, angle=float(self.angle[index]))

    def by_sub_steps(self, index: int, neighbour: int) -> tuple[LayerState, Outcome]:
        state = self.points[neighbour].state.copy()
        steps = np.linspace(self.angle[neighbour], self.angle[index], SUB_STEPS + 1)[1:]
        for angle in steps[:-1]:
            outcome = self.iterate(state, angle=float(angle), most=SUB_ITERATIONS)
            if outcome.ended == BROKEN:
                return state, outcome
        return state, self.iterate(state, angle=float(steps[-1]))

    def afresh(self, angle: float, factors: tuple[float, ...]) -> tuple[LayerState, Outcome]:
        """From layers marched at a multiple of the Reynolds number, going down from it."""
        state = self.cold(angle, factors[0])
        for factor in factors[:-1]:
            outcome = self.iterate(state, angle=angle, factor=factor, most=SUB_ITERATIONS)
            if outcome.ended == BROKEN:
                return state, outcome
        return state, self.iterate(state, angle=angle, factor=factors[-1])

    def find(self, index: int, ways: Iterable[tuple[LayerState, Outcome]]) -> bool:
        """Keep the first way that comes to rest, or else the one nearest to it."""
        best: _Point | None = self.points.get(index)
        for state, outcome in ways:
            if outcome.ended == CONVERGED:
                best = _Point(state, outcome.change, FOUND)
                break
            nearest = NEARLY_AT_REST if best is None else best.change
            if outcome.ended != BROKEN and outcome.change < nearest:
                best = _Point(state, outcome.change, NEARLY)
        if best is not None:
            self.points[index] = best
        return best is not None

    def outwards(self) -> None:
        """From the start up, then from the start down."""
        first = self.first
        for order in (range(first, len(self.angle)), range(first - 1, -1, -1)):
            last: int | None = first if first in self.points else None
            for index in order:
                self.poll()
                if self.find(index, self.tries(index, last)):
                    last = index

    def inwards(self) -> None:
        """Once more at what is missing, from the neighbour on the far side."""
        last = len(self.angle) - 1
        for order, side in ((range(last - 1, self.first - 1, -1), 1), (range(1, self.first), -1)):
            for index in order:
                known, neighbour = self.points.get(index), index + side
                if neighbour in self.points and (known is None or known.status != FOUND):
                    self.poll()
                    ways = (way(index, neighbour) for way in (self.warm, self.by_sub_steps))
                    self.find(index, ways)


def solve_single(
    panels: SectionPanels, conditions: Conditions, *, angle: float, reynolds: float
) -> tuple[LayerState | None, int]:
    """Solve one angle by the same ways, from the angle where sweeps begin.

    Parameters
    ----------
    panels : SectionPanels
    conditions : Conditions
    angle : float
        [rad]
    reynolds : float
        [-]

    Returns
    -------
    tuple of LayerState or None, int
        The state, None where it is `LOST`; `FOUND`, `NEARLY` or `LOST`.
    """
    steps = 1 + int(np.ceil(abs(angle - START_ANGLE) / LONGEST_STEP))
    angles = np.unique(np.linspace(START_ANGLE, angle, steps))
    sweep = _Sweep(panels, conditions, angles, reynolds, lambda: None)
    sweep.outwards()
    point = sweep.points.get(int(np.argmin(np.abs(angles - angle))))
    return (None, LOST) if point is None else (point.state, point.status)


def solve_column(
    panels: SectionPanels,
    conditions: Conditions,
    *,
    angle: FloatArray,
    reynolds: float,
    poll: Callable[[], None] = lambda: None,
) -> Column:
    """Solve all angles at one Reynolds number.

    Parameters
    ----------
    panels : SectionPanels
    conditions : Conditions
    angle : numpy.ndarray, shape (na,)
        Ascending. [rad]
    reynolds : float
        [-]
    poll : callable, optional
        Called before every point; what it raises ends the column.

    Returns
    -------
    Column
        Depends on nothing but the arguments: other columns lend it no state.

    Notes
    -----
    The sweep begins near 2 degrees and goes up, then down. A point follows from its
    neighbour; where it does not, by sub-steps in angle, then from layers marched
    afresh, then down from four times the Reynolds number; and once both directions
    are through, from its neighbour on the far side. What does not come to rest is
    kept as approximate where its last change was below `NEARLY_AT_REST`.
    """
    sweep = _Sweep(panels, conditions, angle, reynolds, poll)
    sweep.outwards()
    sweep.inwards()
    readings = np.full((len(angle), len(READINGS)), np.nan)
    status = np.full(len(angle), LOST, dtype=np.uint8)
    for index, point in sweep.points.items():
        values = read(panels, conditions, point.state, angle=float(angle[index]), reynolds=reynolds)
        if np.isfinite(values[:3]).all():
            readings[index], status[index] = values, point.status
    return Column(readings, status, sweep.iterations)
