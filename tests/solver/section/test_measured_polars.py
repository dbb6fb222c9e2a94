"""From runs to a polar: smoothing, merging, drag at equal lift, what is filled."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.confidence import lift_jumps
from solver.section.hermite import monotone_curve, node_slopes
from solver.section.packed import HIGH, LOW, NOMINAL
from solver.section.packing import pack_polars
from solver.section.polar import CellOrigin, polar_from_sweeps
from solver.section.run_curve import merge_drag, merge_lift, smooth_readings
from solver.section.stalled_flow import beyond, plate_drag, plate_lift, plate_moment
from solver.section.sweeps import Sweep
from solver.section.thin_airfoil import ThinAirfoil

THIN = ThinAirfoil(-0.05, -0.07, 0.0, 0.3)


def lift_of(angle):
    x = angle + 0.05
    return 5.8 * x * np.exp(-((x / 0.27) ** 8) / 8.0)


def run(reynolds=1e5, *, low=-8.0, high=18.0, offset=0.0, factor=1.0, rising=True, **more):
    angle = np.radians(np.arange(low, high + 0.5))
    return Sweep(reynolds, angle, factor * lift_of(angle + offset), rising=rising, **more)


def drag_run(reynolds=1e5, *, low=-5.0, high=10.0, offset=0.0, factor=1.0):
    angle = np.radians(np.arange(low, high + 0.5))
    lift = lift_of(angle + offset)
    return Sweep(reynolds, angle, lift, factor * (0.012 + 0.01 * lift**2))


def test_smoothing_moves_no_reading_beyond_the_scatter_and_takes_a_sawtooth_out():
    angle = np.radians(np.arange(-5.0, 10.0))
    saw = 0.01 * (-1.0) ** np.arange(15)
    straight = 6.0 * angle
    smooth = smooth_readings(angle, straight + saw, scatter=0.015)
    assert np.max(np.abs(smooth - straight - saw)) <= 0.015 + 1e-9
    # The sawtooth is 0.01 high; what is left of it is a tenth and less.
    assert np.max(np.abs(smooth - straight)[2:-2]) < 0.001


def test_smoothing_leaves_a_straight_line_and_a_pinned_peak_alone():
    angle = np.radians(np.arange(8.0))
    # Rounding of the least-squares solution.
    assert smooth_readings(angle, 3.0 * angle, scatter=0.015) == pytest.approx(
        3.0 * angle, abs=1e-12
    )
    peaked = np.array([0.5, 0.6, 0.7, 0.8, 0.9, 0.6, 0.5, 0.4])
    smooth = smooth_readings(angle, peaked, scatter=0.015, pinned=(4,), ceiling=0.9)
    assert smooth[4] == pytest.approx(0.9, abs=1e-6)
    assert np.max(smooth) <= 0.9 + 1e-6


def test_a_jump_survives_smoothing():
    angle = np.radians(np.arange(10.0))
    jump = np.where(np.arange(10) < 5, 1.5, 0.9)
    smooth = smooth_readings(angle, jump, scatter=0.015)
    assert smooth[4] - smooth[5] > 0.6 - 0.031


def test_the_curve_through_readings_does_not_overshoot():
    x = np.arange(8.0)
    y = np.array([0.0, 1.0, 2.0, 3.0, 3.1, 1.0, 1.0, 1.1])
    curve = monotone_curve(x, y)
    fine = curve(np.linspace(0.0, 7.0, 701))
    assert fine.max() <= 3.1 + 1e-12
    assert fine.min() >= 0.0
    assert curve(x) == pytest.approx(y)


def test_slopes_at_nodes_are_of_fourth_order_and_bounded_at_a_jump():
    errors = []
    for n in (41, 81):
        x = np.linspace(0.0, 2.0, n)
        errors.append(np.max(np.abs(node_slopes(x, np.sin(3.0 * x)) - 3.0 * np.cos(3.0 * x))))
    # Sixteen for fourth order, somewhat off at the ends of the range.
    assert errors[0] / errors[1] > 12.0
    x = np.arange(12.0)
    step = np.where(x < 6, 1.0, 0.0)
    slopes = node_slopes(x, step)
    # Rounding of weights that add up to zero.
    assert slopes[:5] == pytest.approx(0.0, abs=1e-12)
    assert np.all(slopes <= 1e-12)


@pytest.mark.parametrize("quantity", ["lift", "drag", "moment"])
@pytest.mark.parametrize(("end", "value", "slope"), [(0.3, 1.1, -1.0), (-0.15, 0.05, 2.0)])
def test_the_stalled_plate_joins_the_table_with_value_and_slope(quantity, end, value, slope):
    sign = 1.0 if end > 0.0 else -1.0
    angle = end + sign * np.array([0.0, 1e-6])
    found = beyond(angle, quantity, end=end, value=value, slope=sign * abs(slope))
    assert found[0] == pytest.approx(value, abs=1e-12)
    # One-sided difference over a millionth of a radian.
    assert (found[1] - found[0]) / 1e-6 == pytest.approx(abs(slope), abs=1e-3)


def test_far_out_only_the_plate_is_left():
    angle = np.radians([80.0, 90.0])
    found = beyond(angle, "drag", end=0.2, value=0.05, slope=0.5)
    # Three per mille of the gap is left after 70 degrees at a memory of eight.
    assert found == pytest.approx(plate_drag(angle), abs=1e-3)


def test_the_plate_carries_no_moment_about_its_middle_when_square_to_the_flow():
    quarter = np.array([np.pi / 2.0])
    assert plate_lift(quarter) == pytest.approx(0.0, abs=1e-12)
    assert plate_moment(quarter) == pytest.approx(-0.25 * plate_drag(quarter))
    assert plate_moment(np.array([0.0])) == pytest.approx(0.0)


def test_repeats_are_averaged_and_the_lower_taken_where_one_has_stalled():
    angle = np.radians(np.arange(5.0))
    first = Sweep(100e3, angle, [0.1, 0.2, 0.3, 0.4, 0.5])
    second = Sweep(102e3, angle, [0.12, 0.22, 0.32, 0.42, 0.3])
    merged = merge_lift([first, second])
    assert merged.lift == pytest.approx([0.11, 0.21, 0.31, 0.41, 0.3])
    assert 100e3 < merged.reynolds < 102e3


def test_drag_runs_that_cover_different_angles_are_pooled():
    merged = merge_drag([drag_run(low=-5, high=0), drag_run(101e3, low=0, high=6)])
    assert np.degrees(merged.angle) == pytest.approx(np.arange(-5.0, 6.5))


def test_drag_is_taken_at_equal_lift_and_not_at_equal_angle():
    shift = np.radians(0.6)
    table = polar_from_sweeps("s", [run()], [drag_run(offset=shift)], thin=THIN)
    rising = (table.lift[:, 0] > 0.0) & (table.lift[:, 0] < 1.0) & (table.angle < 0.2)
    lift = table.lift[rising, 0]
    # Bucket smoothed within 7 %; at equal angle it would be up to 10 % off.
    assert table.drag[rising, 0] == pytest.approx(0.012 + 0.01 * lift**2, rel=0.02)


def test_drag_between_two_runs_is_linear_in_logarithms_and_marked_as_filled():
    table = polar_from_sweeps(
        "s",
        [run(1e5), run(2e5), run(4e5)],
        [drag_run(1e5, factor=2.0), drag_run(4e5)],
        thin=THIN,
    )
    at = int(np.argmin(np.abs(table.angle)))
    assert table.drag[at, 1] == pytest.approx(np.sqrt(table.drag[at, 0] * table.drag[at, 2]))
    measured, filled = CellOrigin.MEASURED, CellOrigin.FILLED
    assert table.origin_drag[at].tolist() == [measured, filled, measured]


def test_drag_outside_the_drag_run_is_filled_positive_and_rising():
    table = polar_from_sweeps("s", [run()], [drag_run()], thin=THIN)
    beyond_run = table.angle > np.radians(11.0)
    assert np.all(table.origin_drag[beyond_run, 0] == CellOrigin.FILLED)
    assert np.all(np.diff(table.drag[beyond_run, 0]) > 0.0)
    assert np.all(table.drag > 0.0)


def test_a_falling_sweep_takes_no_part_in_the_curve():
    down = run(rising=False, factor=0.5)
    with_it = polar_from_sweeps("s", [run(), down], [drag_run()], thin=THIN)
    without = polar_from_sweeps("s", [run()], [drag_run()], thin=THIN)
    assert np.array_equal(with_it.lift, without.lift)


def test_cells_outside_a_run_are_filled_and_not_valid():
    table = polar_from_sweeps("s", [run(), run(3e5, high=10.0)], [drag_run()], thin=THIN)
    late = table.angle > np.radians(12.0)
    assert not table.valid[late, 1].any()
    assert np.all(table.origin_lift[late, 1] == CellOrigin.FILLED)
    assert table.valid[late & (table.angle < np.radians(18.1)), 0].all()


def test_a_run_that_ends_while_rising_promises_no_more_than_its_last_reading():
    table = polar_from_sweeps("s", [run(high=8.0)], [drag_run()], thin=THIN)
    assert not table.bracketed[0]
    angle = np.linspace(0.0, 0.5, 1001)
    largest = pack_polars([table]).evaluate(angle, 1e5).lift.max()
    # The curve rounds off beyond the last reading by less than two readings' scatter.
    assert largest < table.largest_lift[0] + 0.03


def test_runs_may_carry_drag_and_moment_themselves():
    angle = np.radians(np.arange(-5.0, 15.0))
    lift = lift_of(angle)
    whole = Sweep(1e5, angle, lift, 0.01 + 0.01 * lift**2, np.full(20, -0.05))
    table = polar_from_sweeps("s", [whole], [])
    assert (table.origin_moment == CellOrigin.MEASURED).any()
    at = int(np.argmin(np.abs(table.angle)))
    assert table.moment[at, 0] == pytest.approx(-0.05, abs=1e-9)


@pytest.mark.parametrize(
    ("lift", "drag", "thin", "name"),
    [
        ([], [], THIN, "lift_sweeps"),
        ([run()], [], THIN, "drag_sweeps"),
        ([run()], [drag_run()], None, "thin"),
        ([run(low=0, high=1)], [drag_run()], THIN, "lift_sweeps"),
    ],
)
def test_what_is_missing_is_named(lift, drag, thin, name):
    with pytest.raises(InputError) as caught:
        polar_from_sweeps("s", lift, drag, thin=thin)
    assert caught.value.name == name


def test_a_jump_is_two_half_widths_apart_as_a_root_of_squares():
    reynolds = np.array([50e3, 80e3, 100e3])
    assert lift_jumps(reynolds, np.array([1.0, 1.098, 1.196])) == ()
    # 0.07 each: 0.099 together.
    assert lift_jumps(reynolds, np.array([1.0, 1.1, 1.1])) == ((50e3, 80e3),)
    assert lift_jumps(reynolds, np.array([1.1, 1.0, 1.0])) == ((50e3, 80e3),)


def test_where_the_higher_reynolds_number_has_less_lift_it_is_taken_over_the_interval():
    table = polar_from_sweeps("s", [run(1e5), run(2e5, factor=0.7)], [drag_run()], thin=THIN)
    packed = pack_polars([table])
    assert packed.limits(1.5e5).largest_lift == pytest.approx(table.largest_lift[1])
    assert packed.limits(1.02e5).largest_lift == pytest.approx(table.largest_lift[1])
    assert packed.limits(1e5).largest_lift == pytest.approx(table.largest_lift[0])


def test_equal_polars_have_equal_hashes_and_a_changed_cell_another():
    first, second = (polar_from_sweeps("s", [run()], [drag_run()], thin=THIN) for _ in range(2))
    assert first.content_hash() == second.content_hash()
    drag = first.drag.copy()
    drag[3, 0] += 1e-6
    assert dataclasses.replace(first, drag=drag).content_hash() != first.content_hash()


def test_a_polar_refuses_tables_of_another_shape():
    table = polar_from_sweeps("s", [run()], [drag_run()], thin=THIN)
    with pytest.raises(InputError) as caught:
        dataclasses.replace(table, drag=table.drag[:-1])
    assert caught.value.name == "drag"
    with pytest.raises(InputError) as caught:
        dataclasses.replace(table, lift=np.full_like(table.lift, np.nan))
    assert caught.value.name == "lift"


def random_run(rng: np.random.Generator, *, drag: bool) -> Sweep:
    """Readings as bad as a file may hold them: sparse, noisy, far from any stall."""
    n = int(rng.integers(3, 40))
    low, high = -rng.choice([5.0, 10.0, 180.0]), rng.choice([5.0, 15.0, 25.0, 180.0])
    angle = np.radians(np.sort(rng.uniform(low, high, n)))
    lift = rng.choice([0.1, 6.0]) * np.sin(angle + 0.05) + rng.normal(0.0, 0.02, n)
    lift[-1] = 0.2
    return Sweep(
        float(rng.choice([1e3, 3e4, 1e5, 1.02e5, 2e5, 5e6])),
        angle,
        lift,
        np.exp(rng.normal(-4.0, rng.choice([0.1, 1.0]), n)) if drag else None,
        None,
        drag or bool(rng.random() > 0.3),
    )


@pytest.mark.parametrize("seed", range(30))
def test_whatever_the_readings_values_are_finite_and_drag_is_positive(seed):
    rng = np.random.default_rng(seed)
    runs = [random_run(rng, drag=False) for _ in range(rng.integers(1, 5))]
    drag_runs = [random_run(rng, drag=True) for _ in range(rng.integers(1, 4))]
    thin = THIN if seed % 3 else ThinAirfoil(0.0, 0.0, 0.0, 0.0)
    packed = pack_polars([polar_from_sweeps("s", runs, drag_runs, thin=thin)])
    angle, reynolds = np.linspace(-1.0, 1.0, 400)[:, None, None], np.geomspace(1e3, 1e7, 9)
    values = packed.evaluate(angle, reynolds[:, None], band=[LOW, NOMINAL, HIGH])
    for name in values.__dataclass_fields__:
        assert np.isfinite(getattr(values, name)).all()
    assert np.all(values.drag > 0.0)
    assert np.isfinite(packed.limits(reynolds).knee_angle).all()
