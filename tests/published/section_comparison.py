"""Computed section polars set beside the wind-tunnel runs of twelve sections.

Everything here is free of solving: :func:`measured` loads the runs once, and
:func:`compare` sets any computed flows beside them and keeps one record a point, so
that the pooled figures of any subset of sections are one call.

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
from dataclasses import dataclass, fields
from functools import lru_cache
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError
from solver.section.geometry import Outline
from solver.section.sweeps import LiftLimit, first_attached_peak
from tests.published.measured_sections import SECTIONS, Run, outline, runs

FloatArray = NDArray[np.float64]

LOWEST_REYNOLDS = 55_000.0
RANGES = {
    "below 90k": (LOWEST_REYNOLDS, 90e3),
    "90k-170k": (90e3, 170e3),
    "above 170k": (170e3, np.inf),
}
"""Reynolds number ranges, the lower end included."""

SAME_COLUMN = 0.02
"""Runs whose Reynolds numbers differ by no more than this share are computed at one, the
mean of them [-]. Drag goes with the inverse root of the Reynolds number or, where a bubble
is long, its inverse, and runs lie on both sides of the mean: half a per cent of drag, of
either sign, in exchange for half the computing."""

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

DRAG, LIFT, LARGEST_LIFT, CONVERGED = "drag", "lift", "largest lift", "converged"


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
    return before & (angle >= first - ROUND_OFF)


def _last_angle(run: Run) -> float:
    """Up to where points have to converge at this run's Reynolds number [rad]."""
    limit = peak_of(run.angle, run.lift)
    if limit is None:
        return FIRST_ANGLE
    return limit.peak_angle + (PAST_PEAK if limit.bracketed else 0.0)


# --- records


@dataclass(frozen=True)
class Figures:
    """Pooled figures; NaN where there is no point. `missed`: asked, but not reached.

    Drag errors are relative, lift errors absolute; bias is computed minus measured.
    """

    drag_points: int
    drag_missed: int
    drag_mean: float
    drag_median: float
    drag_bias: float
    drag_bias_mean: float
    lift_points: int
    lift_missed: int
    lift_bias: float
    lift_bias_median: float
    lift_rms: float
    largest_runs: int
    largest_missed: int
    largest_bias: float
    largest_rms: float
    points: int
    converged: float


@dataclass(frozen=True, eq=False)
class Comparison:
    """One record a point, as arrays of one length.

    Fields
    ------
    section, table, quantity : ndarray of str
        `quantity` is "drag", "lift", "largest lift" or "converged".
    reynolds : ndarray
        Of the run; for "converged" of the computed column [-].
    angle : ndarray
        Of the measured point, or of the computed one for "converged" [rad].
    lift : ndarray
        Measured lift; NaN for "converged" [-].
    measured, computed : ndarray
        The two values; `computed` is NaN where it is not reached [-].
    """

    section: NDArray[np.str_]
    table: NDArray[np.str_]
    quantity: NDArray[np.str_]
    reynolds: FloatArray
    angle: FloatArray
    lift: FloatArray
    measured: FloatArray
    computed: FloatArray

    @property
    def error(self) -> FloatArray:
        """Computed minus measured, for drag as a share of the measured [-]."""
        scale = np.where(self.quantity == DRAG, self.measured, 1.0)
        return (self.computed - self.measured) / scale

    def select(self, mask: NDArray[np.bool_]) -> Comparison:
        """Those records where `mask` is true."""
        return Comparison(*(getattr(self, field.name)[mask] for field in fields(self)))

    def part(
        self,
        *,
        sections: Iterable[str] | None = None,
        without: Iterable[str] = (),
        reynolds: tuple[float, float] = (0.0, np.inf),
    ) -> Comparison:
        """Those records of the sections named, in a range of Reynolds numbers."""
        mask = (self.reynolds >= reynolds[0]) & (self.reynolds < reynolds[1])
        mask &= ~np.isin(self.section, list(without))
        if sections is not None:
            mask &= np.isin(self.section, list(sections))
        return self.select(mask)

    def figures(self) -> Figures:
        """Pool all records."""
        error = {name: self.error[self.quantity == name] for name in (DRAG, LIFT, LARGEST_LIFT)}
        count = {name: int(np.count_nonzero(np.isfinite(e))) for name, e in error.items()}
        missed = {name: e.size - count[name] for name, e in error.items()}
        drag, lift, largest = (e[np.isfinite(e)] for e in error.values())
        states = self.computed[self.quantity == CONVERGED]
        return Figures(
            drag_points=count[DRAG],
            drag_missed=missed[DRAG],
            drag_mean=_mean(np.abs(drag)),
            drag_median=_median(np.abs(drag)),
            drag_bias=_median(drag),
            drag_bias_mean=_mean(drag),
            lift_points=count[LIFT],
            lift_missed=missed[LIFT],
            lift_bias=_mean(lift),
            lift_bias_median=_median(lift),
            lift_rms=_mean(lift**2) ** 0.5,
            largest_runs=count[LARGEST_LIFT],
            largest_missed=missed[LARGEST_LIFT],
            largest_bias=_mean(largest),
            largest_rms=_mean(largest**2) ** 0.5,
            points=states.size,
            converged=_mean(states),
        )


def _mean(values: FloatArray) -> float:
    return float(np.mean(values)) if values.size else float("nan")


def _median(values: FloatArray) -> float:
    return float(np.median(values)) if values.size else float("nan")


# --- comparing

Record = tuple[str, str, str, float, float, float, float, float]
"""In the order of the fields of :class:`Comparison`."""


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
    rows = list(zip(*records, strict=True)) if records else [()] * 8
    text = [np.array(row, dtype=np.str_) for row in rows[:3]]
    return Comparison(*text, *(np.array(row, dtype=np.float64) for row in rows[3:]))


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
        last[index] = max(last.get(index, FIRST_ANGLE), _last_angle(run))
    records: list[Record] = []
    for index, end in last.items():
        reynolds = float(flow.reynolds[index])
        for angle in np.arange(FIRST_ANGLE, end + ROUND_OFF, ANGLE_STEP):
            found = bool(np.any(np.abs(columns[index].angle - angle) < ROUND_OFF))
            records.append(
                (name, "", CONVERGED, reynolds, float(angle), float("nan"), 1.0, float(found))
            )
    return records
