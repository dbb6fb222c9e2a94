"""A section's polars from its outline: all angles and Reynolds numbers, on several threads.

The kernels, and with them the compiler, are imported when a flow is asked for.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor, as_completed
from dataclasses import fields
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError, SolverError, require_within
from solver.section.flow_results import (
    Distributions,
    FlowColumn,
    FlowSettings,
    PointStatus,
    SectionFlow,
    StatusArray,
    critical_amplification,
    turbulence_level,
)
from solver.section.geometry import Outline
from solver.section.lift_limits import past_stall
from solver.section.one_thread import linear_algebra_on_one_thread
from solver.section.panelling import PanelNodes, panel_nodes
from solver.section.sweeps import LiftLimit, first_attached_peak

if TYPE_CHECKING:
    from solver.section.boundary_layer.point import Conditions, SectionPanels
    from solver.section.boundary_layer.sweep import Column

__all__ = [
    "Distributions",
    "FlowCancelledError",
    "FlowColumn",
    "FlowSettings",
    "PointStatus",
    "SectionFlow",
    "critical_amplification",
    "distributions",
    "section_flow",
    "turbulence_level",
]

FloatArray = NDArray[np.float64]

LEAST_REYNOLDS, MOST_REYNOLDS = 1e4, 1e8
LARGEST_ANGLE = np.radians(30.0)
MOST_THREADS = 64


class FlowCancelledError(SolverError):
    """A flow was not finished because its caller no longer wanted it."""

    def __init__(self) -> None:
        super().__init__("the flow was cancelled before it was finished")


def section_flow(
    outline: Outline,
    *,
    angle: ArrayLike,
    reynolds: ArrayLike,
    settings: FlowSettings = FlowSettings(),  # noqa: B008
    threads: int = 1,
    on_column: Callable[[FlowColumn], None] | None = None,
    cancelled: Callable[[], bool] | None = None,
) -> SectionFlow:
    """Solve the flow about a section at angles and Reynolds numbers.

    Parameters
    ----------
    outline : Outline
    angle : array_like, shape (na,)
        Of attack, ascending, within 30 degrees. [rad]
    reynolds : array_like, shape (nr,)
        On chord, ascending, 1e4 to 1e8. [-]
    settings : FlowSettings, optional
    threads : int, optional
        Over the Reynolds numbers, 1 to 64. The result does not depend on it.
    on_column : callable, optional
        Called from a worker as soon as a Reynolds number is done, the highest first
        to begin; what it raises ends the flow.
    cancelled : callable, optional
        Asked between points, from every worker.

    Returns
    -------
    SectionFlow

    Raises
    ------
    InputError
        If outline or argument cannot be used.
    FlowCancelledError
        If `cancelled` said so.

    Notes
    -----
    A coupled method: potential flow of panels, integral boundary layers with
    transition by e^n, and a wake, at every point solved together by Newton's method.
    See :mod:`solver.section.boundary_layer`.
    """
    angles, numbers = _checked(angle, reynolds)
    if not 1 <= threads <= MOST_THREADS:
        raise InputError("threads", threads, f"between 1 and {MOST_THREADS}")
    nodes = panel_nodes(outline, nodes=settings.nodes)

    from solver.section.boundary_layer.sweep import solve_column

    stopped = threading.Event()

    def poll() -> None:
        if stopped.is_set() or (cancelled is not None and cancelled()):
            raise FlowCancelledError

    def column(number: float) -> FlowColumn:
        solved = solve_column(panels, conditions, angle=angles, reynolds=number, poll=poll)
        done = _column(angles, number, solved)
        if on_column is not None:
            on_column(done)
        return done

    poll()
    with linear_algebra_on_one_thread():
        panels, conditions = _prepared(nodes, settings)
        pool = ThreadPoolExecutor(min(threads, len(numbers)), thread_name_prefix="section-flow")
        try:
            waiting = [pool.submit(column, float(number)) for number in numbers[::-1]]
            for future in as_completed(waiting):
                future.result()
        finally:
            # Whatever ended the wait: no worker begins another point.
            stopped.set()
            pool.shutdown(cancel_futures=True)
    return _together(outline.name, settings, [future.result() for future in waiting[::-1]])


def distributions(
    outline: Outline,
    *,
    angle: float,
    reynolds: float,
    settings: FlowSettings = FlowSettings(),  # noqa: B008
) -> Distributions:
    """Solve the flow about a section at one point, and keep its layers.

    Parameters
    ----------
    outline : Outline
    angle : float
        Of attack, within 30 degrees. [rad]
    reynolds : float
        On chord, 1e4 to 1e8. [-]
    settings : FlowSettings, optional

    Returns
    -------
    Distributions
        Its status is converged, approximate or missing: a single point cannot tell
        where the stall is.

    Raises
    ------
    InputError
        If outline or argument cannot be used.
    """
    (one,), (number,) = _checked([angle], [reynolds])
    nodes = panel_nodes(outline, nodes=settings.nodes)

    from solver.section.boundary_layer.profile import profile

    with linear_algebra_on_one_thread():
        return profile(*_prepared(nodes, settings), angle=float(one), reynolds=float(number))


def _checked(angle: ArrayLike, reynolds: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Refuse angles and Reynolds numbers that do not ascend or are out of range."""
    angles, numbers = _ascending("angle", angle), _ascending("reynolds", reynolds)
    for end in (0, -1):
        require_within(-LARGEST_ANGLE, LARGEST_ANGLE, angle=float(angles[end]))
        require_within(LEAST_REYNOLDS, MOST_REYNOLDS, reynolds=float(numbers[end]))
    return angles, numbers


def _ascending(name: str, values: ArrayLike) -> FloatArray:
    array = np.array(values, dtype=np.float64)
    if array.ndim != 1 or array.size < 1:
        raise InputError(name, array.shape, "one or more values in a row")
    if not np.isfinite(array).all():
        raise InputError(name, "a value that is not", "finite")
    if not (np.diff(array) > 0.0).all():
        raise InputError(name, "values that do not", "ascending")
    array.setflags(write=False)
    return array


def _prepared(nodes: PanelNodes, settings: FlowSettings) -> tuple[SectionPanels, Conditions]:
    from solver.section.boundary_layer.constants import ClosureConstants
    from solver.section.boundary_layer.point import Conditions, place_of_trip
    from solver.section.boundary_layer.wake_path import prepared

    constants = ClosureConstants()
    conditions = Conditions(
        critical=settings.critical_amplification,
        trip_upper=place_of_trip(nodes, settings.trip_upper, lower=False),
        trip_lower=place_of_trip(nodes, settings.trip_lower, lower=True),
        constants=constants,
    )
    return prepared(nodes, constants), conditions


def _column(angle: FloatArray, reynolds: float, solved: Column) -> FlowColumn:
    """Name the readings of a column, and mark what lies past the stall."""
    from solver.section.boundary_layer.point import READINGS

    values = {name: solved.readings[:, k].copy() for k, name in enumerate(READINGS)}
    status, largest = _with_stall(angle, values["lift"], solved.status)
    _freeze(status, *values.values())
    return FlowColumn(
        reynolds=reynolds,
        angle=angle,
        status=status,
        largest_lift=largest,
        iterations=solved.iterations,
        **values,
    )


def _with_stall(
    angle: FloatArray, lift: FloatArray, status: StatusArray
) -> tuple[StatusArray, float]:
    """Mark converged points past the stall on either side; the largest lift."""
    marked = status.copy()
    known = status != PointStatus.MISSING
    a, cl = angle[known], lift[known]
    limit = _limit(a, cl)
    if limit is None:
        return marked, np.nan
    beyond = past_stall(a, cl, limit, at=angle) & (status == PointStatus.CONVERGED)
    if not limit.bracketed:
        beyond &= angle < limit.peak_angle
    marked[beyond] = PointStatus.BEYOND_STALL
    # Beside a point that is missing there may have been more.
    top = int(np.argmin(np.abs(angle - limit.peak_angle)))
    bracketed = limit.bracketed and known[max(top - 1, 0) : top + 2].all()
    return marked, limit.largest_lift if bracketed else np.nan


def _limit(angle: FloatArray, lift: FloatArray) -> LiftLimit | None:
    if len(angle) < 3 or not np.max(lift) > 0.0:
        return None
    return first_attached_peak(angle, lift)


def _together(name: str, settings: FlowSettings, columns: Sequence[FlowColumn]) -> SectionFlow:
    """Set columns side by side."""
    tables: dict[str, NDArray[Any]] = {}
    for field in fields(FlowColumn):
        if field.name not in ("reynolds", "angle", "largest_lift", "iterations"):
            tables[field.name] = np.column_stack([getattr(one, field.name) for one in columns])
    largest = np.array([one.largest_lift for one in columns])
    reynolds = np.array([one.reynolds for one in columns])
    _freeze(largest, reynolds, *tables.values())
    return SectionFlow(
        name=name,
        settings=settings,
        angle=columns[0].angle,
        reynolds=reynolds,
        largest_lift=largest,
        iterations=sum(one.iterations for one in columns),
        **tables,
    )


def _freeze(*arrays: NDArray[Any]) -> None:
    for array in arrays:
        array.setflags(write=False)
