"""The section solver as it is called: symmetry, independence, order, refusals, marks."""

from __future__ import annotations

import subprocess
import sys
import threading
from dataclasses import fields

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.flap import deflect_flap
from solver.section.flow import (
    FlowCancelledError,
    FlowColumn,
    FlowSettings,
    PointStatus,
    SectionFlow,
    section_flow,
)
from solver.section.geometry import Outline, naca_outline

pytestmark = [pytest.mark.usefixtures("compiled_kernels"), pytest.mark.slow]

ITERATION = 2e-4
"""Of lift: iteration stops when thicknesses and speeds change by less than this."""
TABLES = (
    "lift",
    "drag",
    "moment",
    "transition_upper",
    "transition_lower",
    "separation_upper",
    "separation_lower",
    "reattachment_upper",
    "reattachment_lower",
)
SECTION = naca_outline("2412")
ANGLE = np.radians(np.arange(-4.0, 19.0, 1.0))
REYNOLDS = np.array([1e5, 2e5, 4e5])


@pytest.fixture(scope="module")
def flow(compiled_kernels) -> SectionFlow:
    return section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS)


def mirrored(outline: Outline) -> Outline:
    return Outline("upside down", outline.x[::-1].copy(), -outline.y[::-1])


# --- symmetry


@pytest.mark.parametrize("reynolds", [1.5e5, 1e6])
def test_a_symmetric_section_flies_as_well_upside_down(reynolds):
    angle = np.radians(np.arange(-9.75, 10.0, 1.5))
    flow = section_flow(naca_outline("0012"), angle=angle, reynolds=[reynolds])
    both = np.isfinite(flow.lift) & np.isfinite(flow.lift[::-1])
    assert np.count_nonzero(~both) <= 2  # one point, and its mirror image
    lift, drag, moment = flow.lift, flow.drag, flow.moment
    assert lift[::-1][both] == pytest.approx(-lift[both], abs=ITERATION)
    assert drag[::-1][both] == pytest.approx(drag[both], rel=1e-3)  # iteration
    assert moment[::-1][both] == pytest.approx(-moment[both], abs=ITERATION)
    assert flow.transition_upper[::-1][both] == pytest.approx(
        flow.transition_lower[both], abs=1e-3, nan_ok=True
    )


def test_a_cambered_section_turned_over_has_the_opposite_forces(flow):
    other = section_flow(mirrored(SECTION), angle=-ANGLE[14::-1], reynolds=REYNOLDS[1:2])
    assert other.lift[::-1, 0] == pytest.approx(-flow.lift[:15, 1], abs=ITERATION)
    assert other.drag[::-1, 0] == pytest.approx(flow.drag[:15, 1], rel=1e-3)
    assert other.moment[::-1, 0] == pytest.approx(-flow.moment[:15, 1], abs=ITERATION)
    assert other.transition_lower[::-1, 0] == pytest.approx(
        flow.transition_upper[:15, 1], abs=1e-3, nan_ok=True
    )


# --- independence


@pytest.mark.parametrize("threads", [2, 5])
def test_the_number_of_threads_changes_nothing(flow, threads):
    other = section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS, threads=threads)
    for name in (*TABLES, "status", "largest_lift"):
        assert np.array_equal(getattr(flow, name), getattr(other, name), equal_nan=True), name


def test_neither_do_the_other_reynolds_numbers(flow):
    alone = section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS[1:2])
    for name in (*TABLES, "status"):
        one, of_all = getattr(alone, name)[:, 0], getattr(flow, name)[:, 1]
        assert np.array_equal(one, of_all, equal_nan=True), name


@pytest.mark.parametrize("degrees", [-3.0, 7.0, 13.0])
def test_where_the_sweep_begins_changes_nothing(flow, degrees, monkeypatch):
    from solver.section.boundary_layer import sweep

    monkeypatch.setattr(sweep, "START_ANGLE", np.radians(degrees))
    other = section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS)
    both = np.isfinite(flow.lift) & np.isfinite(other.lift)
    assert np.count_nonzero(~both) <= 1
    apart = np.abs(flow.lift - other.lift)[both] > ITERATION
    # Past the stall the layers can lie in more than one way.
    beyond = (flow.status == PointStatus.BEYOND_STALL)[both]
    assert not apart[~beyond].any()
    assert np.count_nonzero(apart) <= 1


def test_neither_do_the_steps_of_the_sweep(flow):
    coarse = section_flow(SECTION, angle=ANGLE[::3], reynolds=REYNOLDS)
    both = np.isfinite(flow.lift[::3]) & np.isfinite(coarse.lift)
    assert np.count_nonzero(~both) <= 1
    assert coarse.lift[both] == pytest.approx(flow.lift[::3][both], abs=ITERATION)


# --- one Reynolds number at a time


@pytest.mark.parametrize("threads", [1, 2])
def test_every_reynolds_number_is_told_as_soon_as_it_is_done(flow, threads):
    columns: list[FlowColumn] = []
    told_by = set()

    def tell(column: FlowColumn) -> None:
        columns.append(column)
        told_by.add(threading.current_thread())

    section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS, threads=threads, on_column=tell)
    assert sorted(column.reynolds for column in columns) == list(REYNOLDS)
    if threads == 1:
        assert [column.reynolds for column in columns] == list(REYNOLDS[::-1])
    assert threading.main_thread() not in told_by
    for column in columns:
        j = int(np.flatnonzero(column.reynolds == flow.reynolds)[0])
        for name in (*TABLES, "status"):
            table = getattr(flow, name)
            assert np.array_equal(getattr(column, name), table[:, j], equal_nan=True)
        assert np.array_equal(column.largest_lift, flow.largest_lift[j], equal_nan=True)


def test_it_stops_between_points_when_told_to():
    asked = []

    def enough() -> bool:
        asked.append(threading.current_thread())
        return len(asked) > 5

    columns = []
    with pytest.raises(FlowCancelledError, match="cancelled"):
        section_flow(
            SECTION, angle=ANGLE, reynolds=REYNOLDS, on_column=columns.append, cancelled=enough
        )
    assert not columns
    # The worker may look at every column that is left before it is told of the end.
    assert len(asked) <= 6 + len(REYNOLDS)
    assert not any(thread.name.startswith("section-flow") for thread in threading.enumerate())


def test_nothing_is_computed_when_it_is_cancelled_before():
    with pytest.raises(FlowCancelledError):
        section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS, cancelled=lambda: True)


def test_an_error_in_who_is_told_ends_the_flow():
    told = []

    def fail(column: FlowColumn) -> None:
        told.append(column)
        raise RuntimeError("no room on the screen")

    with pytest.raises(RuntimeError, match="no room"):
        section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS, on_column=fail)
    assert len(told) == 1


def test_linear_algebra_gets_its_threads_back():
    from threadpoolctl import threadpool_info

    before = [(one["filepath"], one["num_threads"]) for one in threadpool_info()]
    section_flow(SECTION, angle=ANGLE[:2], reynolds=REYNOLDS[:1])
    assert [(one["filepath"], one["num_threads"]) for one in threadpool_info()] == before


# --- marks


def test_arrays_have_a_row_an_angle_and_cannot_be_written(flow):
    for name in TABLES:
        table = getattr(flow, name)
        assert table.shape == (len(ANGLE), len(REYNOLDS))
        assert table.dtype == np.float64
        with pytest.raises(ValueError, match="read-only"):
            table[0, 0] = 0.0
    assert flow.status.dtype == np.uint8
    assert flow.largest_lift.shape == REYNOLDS.shape


def test_stall_is_marked_past_the_peak_and_only_there(flow):
    beyond = flow.status == PointStatus.BEYOND_STALL
    assert beyond.any(axis=0).all()
    for j, top in enumerate(flow.largest_lift):
        peak = int(np.nanargmin(np.abs(flow.lift[:, j] - top)))
        assert not beyond[: peak + 1, j].any()
        assert beyond[-1, j]
        # A fall of more than the scatter of readings follows: twice 0.015.
        assert np.nanmin(flow.lift[peak:, j]) < top - 0.03


def test_largest_lift_is_not_claimed_where_the_angles_end_before_it(flow):
    short = section_flow(SECTION, angle=ANGLE[:11], reynolds=REYNOLDS[:2])
    assert np.isnan(short.largest_lift).all()
    assert not (short.status == PointStatus.BEYOND_STALL).any()
    assert np.array_equal(short.lift, flow.lift[:11, :2])


def spoiled(monkeypatch, ended: str, change: float, low: float, high: float) -> SectionFlow:
    """A flow in which no try between two angles comes to rest."""
    from solver.section.boundary_layer import point, solve, sweep

    def iterate(panels, conditions, state, *, angle, **rest):
        outcome = point.iterate(panels, conditions, state, angle=angle, **rest)
        if np.radians(low) < angle < np.radians(high):
            return point.Outcome(getattr(solve, ended), outcome.iterations, change)
        return outcome

    monkeypatch.setattr(sweep, "iterate", iterate)
    return section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS[1:2])


def test_largest_lift_is_not_claimed_beside_a_gap(flow, monkeypatch):
    at = np.degrees(ANGLE[int(np.nanargmin(np.abs(flow.lift[:, 1] - flow.largest_lift[1])))])
    for low, high in ((at + 0.5, at + 1.5), (at - 1.5, at - 0.5)):
        with monkeypatch.context() as patch:
            assert np.isnan(spoiled(patch, "BROKEN", 1.0, low, high).largest_lift[0])


@pytest.mark.parametrize(("ended", "change"), [("BROKEN", 1e-5), ("MOVING", 0.1)])
def test_a_point_that_is_not_found_is_missing_and_its_neighbours_are_not(
    flow, monkeypatch, ended, change
):
    other = spoiled(monkeypatch, ended, change, 4.5, 6.5)
    gone = (np.radians(4.5) < ANGLE) & (np.radians(6.5) > ANGLE)
    assert np.array_equal(other.status[:, 0] == PointStatus.MISSING, gone)
    for name in ("lift", "drag", "moment"):
        values = getattr(other, name)[:, 0]
        assert np.array_equal(np.isnan(values), gone)
        assert values[~gone] == pytest.approx(getattr(flow, name)[~gone, 1], abs=ITERATION)


def test_a_point_that_nearly_came_to_rest_is_kept_and_marked(flow, monkeypatch):
    other = spoiled(monkeypatch, "MOVING", 1e-3, 4.5, 6.5)
    nearly = (np.radians(4.5) < ANGLE) & (np.radians(6.5) > ANGLE)
    assert np.array_equal(other.status[:, 0] == PointStatus.APPROXIMATE, nearly)
    assert other.lift[:, 0] == pytest.approx(flow.lift[:, 1], abs=ITERATION, nan_ok=True)


def test_status_and_values_agree(flow):
    missing = flow.status == PointStatus.MISSING
    for name in ("lift", "drag", "moment"):
        assert np.array_equal(np.isnan(getattr(flow, name)), missing)
    for side in ("upper", "lower"):
        parted = np.isfinite(getattr(flow, f"separation_{side}"))
        again = np.isfinite(getattr(flow, f"reattachment_{side}"))
        assert not (again & ~parted).any()
        ahead = getattr(flow, f"separation_{side}") < getattr(flow, f"reattachment_{side}")
        assert ahead[again].all()


def test_columns_hold_what_the_whole_holds():
    names = {field.name for field in fields(SectionFlow)} - {"name", "settings"}
    assert names == {field.name for field in fields(FlowColumn)}


# --- settings


def test_a_trip_forces_transition_where_it_is():
    settings = FlowSettings(trip_upper=0.3, trip_lower=0.1)
    flow = section_flow(SECTION, angle=ANGLE[3:9], reynolds=[3e5], settings=settings)
    # Within a cell the place is linear in length along the surface, and read off in x.
    assert flow.transition_upper == pytest.approx(0.3, abs=1e-3)
    assert flow.transition_lower == pytest.approx(0.1, abs=1e-3)


def test_a_trip_behind_natural_transition_does_nothing(flow):
    settings = FlowSettings(trip_upper=0.98)
    other = section_flow(SECTION, angle=ANGLE[6:14], reynolds=REYNOLDS[1:2], settings=settings)
    assert (flow.transition_upper[6:14, 1] < 0.9).all()
    assert other.lift[:, 0] == pytest.approx(flow.lift[6:14, 1], abs=ITERATION)
    assert other.drag[:, 0] == pytest.approx(flow.drag[6:14, 1], rel=1e-3)  # iteration


def test_a_section_that_is_turbulent_all_over_drags_more_at_high_reynolds_numbers():
    angle = ANGLE[4:7]
    smooth = section_flow(SECTION, angle=angle, reynolds=[3e6])
    rough = section_flow(
        SECTION, angle=angle, reynolds=[3e6], settings=FlowSettings(trip_upper=0.0, trip_lower=0.0)
    )
    assert (rough.transition_upper < 0.01).all()
    assert (rough.drag > 1.3 * smooth.drag).all()


def test_rougher_air_moves_transition_forward(flow):
    rough = section_flow(
        SECTION,
        angle=ANGLE[4:12],
        reynolds=REYNOLDS[2:],
        settings=FlowSettings(critical_amplification=4.0),
    )
    assert (rough.transition_upper[:, 0] < flow.transition_upper[4:12, 2] - 0.01).all()


def test_finer_panels_change_little(flow):
    fine = section_flow(
        SECTION, angle=ANGLE[:12], reynolds=REYNOLDS[1:2], settings=FlowSettings(nodes=201)
    )
    # Panels are second order in lift, first order in what displacement does to speeds.
    assert fine.lift[:, 0] == pytest.approx(flow.lift[:12, 1], abs=0.02)
    assert fine.drag[:, 0] == pytest.approx(flow.drag[:12, 1], rel=0.05)


def test_a_flap_adds_lift_and_a_nose_down_moment(flow):
    flapped = deflect_flap(SECTION, hinge=0.75, deflection=np.radians(8.0))
    other = section_flow(flapped, angle=ANGLE[3:9], reynolds=[4e5])
    assert (other.status != PointStatus.MISSING).all()
    gain = other.lift[:, 0] - flow.lift[3:9, 2]
    # Thin airfoil theory gives 2 pi 0.61 x 8 degrees = 0.53; layers take a part of it.
    assert (gain > 0.2).all()
    assert (gain < 0.53).all()
    assert (other.moment[:, 0] < flow.moment[3:9, 2] - 0.04).all()


# --- refusals


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("angle", []),
        ("angle", [[0.0, 0.1]]),
        ("angle", [0.1, 0.1]),
        ("angle", [0.1, 0.0]),
        ("angle", [0.0, np.nan]),
        ("angle", [-0.6, 0.0]),
        ("angle", [0.0, 0.6]),
        ("reynolds", []),
        ("reynolds", [2e5, 1e5]),
        ("reynolds", [np.inf]),
        ("reynolds", [5e3, 1e5]),
        ("reynolds", [1e5, 2e8]),
        ("threads", 0),
        ("threads", 65),
    ],
)
def test_unusable_arguments_are_named(name, value):
    arguments = {"angle": [0.0, 0.1], "reynolds": [1e5, 2e5], "threads": 1} | {name: value}
    with pytest.raises(InputError) as caught:
        section_flow(SECTION, **arguments)
    assert caught.value.name == name


def test_an_outline_that_no_panels_fit_is_refused():
    crossed = Outline("crossed", SECTION.x, SECTION.y * np.where(SECTION.x > 0.5, -1.0, 1.0))
    with pytest.raises(InputError):
        section_flow(crossed, angle=ANGLE, reynolds=REYNOLDS)


def test_the_compiler_is_not_imported_before_a_flow_is_asked_for():
    code = "import sys, solver.section.flow; print('numba' in sys.modules)"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "False"
