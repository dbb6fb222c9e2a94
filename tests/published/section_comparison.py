"""Computed section polars set beside the wind-tunnel runs of twelve sections.

Everything here is free of solving: :func:`measured` loads the runs once, and
:func:`compare` sets any computed flows beside them, one record a point, so that the
figures of all sections but one are ``compare(flows).part(without=[name]).figures()``.

What is compared, and how:

- Drag at equal lift, on the rising branch of both sides: from the angle of the least
  lift to the first attached peak. Our drag is interpolated along the branch at the
  measured lift; where the branch passes that lift more than once, the passage nearest
  to the measured angle is taken. A lift that our branch does not have is *not reached*.
- Lift at equal angle, -4 to 7 degrees, from lift runs, stalled or not.
- Largest lift, where both sides bracket it.
- Points converged from -6 degrees to 3 degrees past the measured largest lift. Each
  computed point counts once, however many runs were made at its Reynolds number. Where
  a run ends before lift falls, it counts to its greatest lift only.

Only converged points are used, those beyond stall among them; a single point that
is missing between two converged ones is bridged by the interpolation.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError
from solver.section.geometry import Outline
from solver.section.sweeps import LiftLimit, first_attached_peak
from tests.published.measured_sections import SECTIONS, Run, outline, runs
from tests.published.section_records import (
    CONVERGED,
    DRAG,
    LARGEST_LIFT,
    LIFT,
    LOWEST_REYNOLDS,
    Comparison,
    FloatArray,
    Record,
)

SAME_COLUMN = 0.02
"""Runs whose Reynolds numbers differ by no more than this share are computed at one, the
mean of them to the nearest hundred [-]: 73 in place of 171. A run is then 0.3 % from where it
is computed on average, 1.1 % at most, on either side; drag goes with the inverse root of the
Reynolds number or, where a bubble is long, about its inverse, so that much again is moved."""

ANGLE_STEP = np.radians(0.5)
FIRST_ANGLE = np.radians(-6.0)
LAST_ANGLE = np.radians(18.0)
PAST_PEAK = np.radians(3.0)
LIFT_ANGLES = np.radians([-4.0, 7.0])
WIDEST_GAP = 2.0 * ANGLE_STEP
ROUND_OFF = 1e-6
"""Angles are equal within this [rad]; they are printed to 0.01 degrees."""

CONVERGED_STATES = (0, 3)
"""Status numbers of converged points: before and beyond the first attached peak."""


class Flow(Protocol):
    """What is read of a computed section: arrays of shape (angles, Reynolds numbers)."""

    @property
    def angle(self) -> FloatArray: ...
    @property
    def reynolds(self) -> FloatArray: ...
    @property
    def lift(self) -> FloatArray: ...
    @property
    def drag(self) -> FloatArray: ...
    @property
    def status(self) -> NDArray[np.uint8]: ...


@dataclass(frozen=True, eq=False)
class Measured:
    """All runs of a section, and where to compute it: angle [rad], Reynolds number [-]."""

    outline: Outline
    lift_runs: tuple[Run, ...]
    drag_runs: tuple[Run, ...]
    angle: FloatArray
    reynolds: FloatArray


@lru_cache(maxsize=1)
def measured() -> dict[str, Measured]:
    """Every section's runs at Reynolds numbers of 55,000 and more."""
    found = {}
    for name in SECTIONS:
        lift, drag = (
            tuple(r for r in runs(kind) if r.section == name and r.reynolds >= LOWEST_REYNOLDS)
            for kind in ("lift", "drag")
        )
        columns = merged_reynolds([run.reynolds for run in (*lift, *drag)])
        last = max([LAST_ANGLE, *(_last_angle(run) for run in lift)])
        steps = int(np.floor((last - FIRST_ANGLE) / ANGLE_STEP + ROUND_OFF))
        angle = FIRST_ANGLE + ANGLE_STEP * np.arange(steps + 1)
        found[name] = Measured(outline(name), lift, drag, angle, columns)
    return found


def merged_reynolds(reynolds: Iterable[float]) -> FloatArray:
    """Ascending means of groups, each no wider than :data:`SAME_COLUMN`."""
    groups: list[list[float]] = []
    for value in sorted(reynolds):
        if groups and value <= groups[-1][0] * (1.0 + SAME_COLUMN):
            groups[-1].append(value)
        else:
            groups.append([value])
    return np.array([round(float(np.mean(group)), -2) for group in groups])


def peak_of(angle: FloatArray, lift: FloatArray) -> LiftLimit | None:
    """The first attached peak, readings at equal angles averaged; None without any."""
    unique, place = np.unique(angle, return_inverse=True)
    try:
        return first_attached_peak(unique, np.bincount(place, weights=lift) / np.bincount(place))
    except InputError:
        return None


def rising(angle: FloatArray, lift: FloatArray) -> NDArray[np.bool_]:
    """Points from the angle of the least lift to the first attached peak."""
    if not angle.size:
        return np.zeros(0, dtype=bool)
    limit = peak_of(angle, lift)
    last = limit.peak_angle if limit is not None else float(angle[np.argmax(lift)])
    before = angle <= last + ROUND_OFF
    first = angle[before][np.argmin(lift[before])]
    found: NDArray[np.bool_] = before & (angle >= first - ROUND_OFF)
    return found


def _last_angle(run: Run) -> float:
    """Up to where points have to converge at this run's Reynolds number [rad]."""
    limit = peak_of(run.angle, run.lift)
    if limit is None:
        return FIRST_ANGLE
    return float(limit.peak_angle + (PAST_PEAK if limit.bracketed else 0.0))


# --- comparing


@dataclass(frozen=True, eq=False)
class Column:
    """The converged points of one computed Reynolds number, ascending in angle [rad]."""

    angle: FloatArray
    lift: FloatArray
    drag: FloatArray

    def branch(self) -> Column:
        """The rising branch."""
        mask = rising(self.angle, self.lift)
        return Column(self.angle[mask], self.lift[mask], self.drag[mask])

    def lift_at(self, angle: float) -> float:
        """Lift at an angle [rad]; NaN outside the points or in a gap."""
        return _along(self.angle, self.lift, self.angle, at=angle, near=angle)

    def drag_at(self, lift: float, *, near: float) -> float:
        """Drag where lift passes a value, nearest to an angle [rad]; NaN where it does not."""
        return _along(self.lift, self.drag, self.angle, at=lift, near=near)


def _along(x: FloatArray, y: FloatArray, angle: FloatArray, *, at: float, near: float) -> float:
    """`y` where the line through the points passes ``x = at``, nearest to angle `near`."""
    low, high = x[:-1] - at, x[1:] - at
    passed = (low * high <= 0.0) & (np.diff(angle) <= WIDEST_GAP + ROUND_OFF)
    if not passed.any():
        return float("nan")
    step = np.where(high == low, 1.0, high - low)
    share = np.where(high == low, 0.0, -low / step)
    place = angle[:-1] + share * np.diff(angle)
    index = int(np.argmin(np.where(passed, np.abs(place - near), np.inf)))
    return float(y[index] + share[index] * (y[index + 1] - y[index]))


def column_of(flow: Flow, reynolds: float) -> int:
    """Index of the computed Reynolds number nearest to that of a run.

    Raises
    ------
    InputError
        If it is further away than runs may be that share one.
    """
    index = int(np.argmin(np.abs(np.log(flow.reynolds / reynolds))))
    if abs(flow.reynolds[index] / reynolds - 1.0) > 1.01 * SAME_COLUMN:
        raise InputError("reynolds", float(flow.reynolds[index]), f"within 2 % of {reynolds:.0f}")
    return index


def converged_points(flow: Flow, index: int) -> Column:
    """The converged points of one column."""
    good = np.isin(flow.status[:, index], CONVERGED_STATES)
    good &= np.isfinite(flow.lift[:, index]) & np.isfinite(flow.drag[:, index])
    return Column(flow.angle[good], flow.lift[good, index], flow.drag[good, index])


def compare(flows: Mapping[str, Flow]) -> Comparison:
    """Set computed flows, by section, beside all measured runs of those sections.

    Raises
    ------
    InputError
        If a flow has no Reynolds number close enough to one that was measured.
    """
    records: list[Record] = []
    for name, flow in flows.items():
        section = measured()[name]
        columns = [converged_points(flow, index) for index in range(flow.reynolds.size)]
        branches = [column.branch() for column in columns]
        for run in section.drag_runs:
            branch = branches[column_of(flow, run.reynolds)]
            records += _drag_records(run, branch)
        for run in section.lift_runs:
            column = columns[column_of(flow, run.reynolds)]
            records += _lift_records(run, column)
            records += _largest_lift_records(run, column)
        records += _state_records(name, section.lift_runs, flow, columns)
    return Comparison.of(records)


def _drag_records(run: Run, branch: Column) -> list[Record]:
    assert run.drag is not None
    up = rising(run.angle, run.lift)
    return [
        (run.section, run.table, DRAG, run.reynolds, a, cl, cd, branch.drag_at(cl, near=a))
        for a, cl, cd in zip(run.angle[up], run.lift[up], run.drag[up], strict=True)
    ]


def _lift_records(run: Run, column: Column) -> list[Record]:
    inside = (run.angle >= LIFT_ANGLES[0] - ROUND_OFF) & (run.angle <= LIFT_ANGLES[1] + ROUND_OFF)
    return [
        (run.section, run.table, LIFT, run.reynolds, a, cl, cl, column.lift_at(a))
        for a, cl in zip(run.angle[inside], run.lift[inside], strict=True)
    ]


def _largest_lift_records(run: Run, column: Column) -> list[Record]:
    limit = peak_of(run.angle, run.lift)
    if limit is None or not limit.bracketed:
        return []
    own = peak_of(column.angle, column.lift)
    reached = own.largest_lift if own is not None and own.bracketed else float("nan")
    top = limit.largest_lift
    return [
        (run.section, run.table, LARGEST_LIFT, run.reynolds, limit.peak_angle, top, top, reached)
    ]


def _state_records(
    name: str, lift_runs: tuple[Run, ...], flow: Flow, columns: list[Column]
) -> list[Record]:
    """One record a computed point: 1 measured, 1 or 0 computed."""
    last: dict[int, float] = {}
    for run in lift_runs:
        index = column_of(flow, run.reynolds)
        last[index] = max(last.get(index, float(FIRST_ANGLE)), _last_angle(run))
    records: list[Record] = []
    for index, end in last.items():
        reynolds = float(flow.reynolds[index])
        for angle in np.arange(FIRST_ANGLE, end + ROUND_OFF, ANGLE_STEP):
            found = bool(np.any(np.abs(columns[index].angle - angle) < ROUND_OFF))
            records.append(
                (name, "", CONVERGED, reynolds, float(angle), float("nan"), 1.0, float(found))
            )
    return records
