"""Peaks, plateaus, knees and hysteresis on made-up runs whose answer is plain."""

from __future__ import annotations

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.sweeps import Sweep, first_attached_peak, group_repeats, hysteresis


def rad(*degrees):
    return np.radians(np.array(degrees, dtype=float))


def of(lift, step=1.0, start=0.0):
    angle = np.radians(start + step * np.arange(len(lift)))
    return angle, np.array(lift)


def test_a_fall_within_the_scatter_is_no_peak():
    angle, lift = of([0.2, 0.4, 0.6, 0.8, 0.78, 1.0, 1.1, 0.9, 0.8])
    found = first_attached_peak(angle, lift)
    assert found.largest_lift == 1.1
    assert found.peak_angle == angle[6]
    assert found.bracketed
    assert found.later_rise is None


def test_a_fall_beyond_the_scatter_is_the_first_peak_whatever_follows():
    angle, lift = of([0.2, 0.4, 0.6, 0.8, 0.7, 1.0, 1.3, 1.2])
    found = first_attached_peak(angle, lift)
    assert found.largest_lift == 0.8
    assert found.later_rise == 1.3


def test_more_scatter_forgives_a_deeper_dip():
    angle, lift = of([0.2, 0.4, 0.6, 0.8, 0.7, 1.0, 1.3, 1.0])
    assert first_attached_peak(angle, lift, scatter=0.06).largest_lift == 1.3


def test_a_plateau_is_reported_from_its_knee_to_its_fall():
    angle, lift = of([0.2, 0.5, 0.8, 1.0, 1.01, 0.995, 1.0, 1.0, 0.8])
    found = first_attached_peak(angle, lift)
    assert found.plateau is not None
    # 98 % of 1.01 is crossed between the third and fourth reading, and on the fall.
    assert angle[2] < found.plateau[0] < angle[3]
    assert angle[7] < found.plateau[1] < angle[8]
    assert found.knee_angle == found.plateau[0]


def test_a_hump_at_the_end_of_a_plateau_is_a_later_rise():
    angle, lift = of([0.2, 0.5, 0.8, 1.1, 1.11, 1.1, 1.11, 1.2, 1.0])
    found = first_attached_peak(angle, lift)
    assert found.largest_lift == 1.11
    assert found.later_rise == 1.2


def test_a_run_that_ends_while_rising_is_not_bracketed():
    angle, lift = of([0.2, 0.5, 0.8, 1.1])
    found = first_attached_peak(angle, lift)
    assert (found.largest_lift, found.bracketed) == (1.1, False)


def test_a_flat_bottom_at_negative_angles_is_no_plateau():
    angle, lift = of([-0.3, -0.3, -0.3, -0.29, 0.0, 0.4, 0.8, 1.0, 0.7], start=-8.0)
    assert first_attached_peak(angle, lift).largest_lift == 1.0


@pytest.mark.parametrize(
    ("angle", "lift", "name"),
    [
        (rad(0, 1), [0.1, 0.2], "angle"),
        (rad(0, 2, 1), [0.1, 0.2, 0.3], "angle"),
        (rad(0, 1, 2), [0.1, 0.2], "angle"),
        (rad(0, 1, 2), [-0.1, -0.2, 0.0], "lift"),
        (rad(0, 1, 2), [np.nan, np.nan, np.nan], "lift"),
    ],
)
def test_unusable_readings_are_refused(angle, lift, name):
    with pytest.raises(InputError) as caught:
        first_attached_peak(angle, lift)
    assert caught.value.name == name


def loop():
    angle = np.radians(np.arange(0.0, 21.0))
    attached = 0.3 + 0.1 * np.arange(21.0)
    rising = np.where(np.arange(21) <= 15, attached, 1.0)
    falling = np.where(np.arange(21) <= 8, attached, 1.0)
    up = Sweep(1e5, angle, rising)
    down = Sweep(1e5, angle[::-1], falling[::-1], rising=False)
    return up, down


def test_the_lower_branch_ends_at_the_first_attached_reading_coming_down():
    up, down = loop()
    found = hysteresis(up, down, limit=first_attached_peak(up.angle, up.lift))
    assert found is not None
    assert np.degrees(found.recovery_angle) == pytest.approx(8.0)
    assert found.recovery_lift == found.lower_lift == found.upper_lift == 1.0


def test_equal_sweeps_have_no_loop():
    up, _ = loop()
    down = Sweep(1e5, up.angle, up.lift, rising=False)
    assert hysteresis(up, down, limit=first_attached_peak(up.angle, up.lift)) is None


def test_a_branch_that_never_reattaches_is_not_called_recovered():
    up, _ = loop()
    down = Sweep(1e5, up.angle[9:], np.full(12, 1.0), rising=False)
    assert hysteresis(up, down, limit=first_attached_peak(up.angle, up.lift)) is None


def test_a_sweep_is_read_only_and_its_order_can_be_put_right():
    run = Sweep(1e5, rad(2, 0, 1, 1), [0.2, 0.0, 0.1, 0.3])
    ordered = run.ordered()
    assert np.degrees(ordered.angle) == pytest.approx([0, 1, 2])
    assert ordered.lift == pytest.approx([0.0, 0.2, 0.2])
    with pytest.raises(ValueError, match="read-only"):
        run.lift[0] = 9.0


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ({"reynolds": 0.0}, "reynolds"),
        ({"reynolds": np.nan}, "reynolds"),
        ({"angle": [0.1]}, "angle"),
        ({"lift": [0.1]}, "lift"),
        ({"lift": [0.1, np.inf]}, "lift"),
        ({"drag": [0.1, np.nan]}, "drag"),
        ({"moment": [0.1, 0.2, 0.3]}, "moment"),
    ],
)
def test_an_unusable_run_is_refused(arguments, name):
    good = {"reynolds": 1e5, "angle": [0.0, 0.1], "lift": [0.1, 0.7]}
    with pytest.raises(InputError) as caught:
        Sweep(**(good | arguments))
    assert caught.value.name == name


def test_repeats_are_grouped_and_neighbours_are_not():
    assert group_repeats([2e5, 1e5, 1.02e5, 2.1e5]) == [[1, 2], [0], [3]]
