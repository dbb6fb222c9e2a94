"""The section solver beside measurements its constants were not set with, or not only.

The figures are printed by ``python -m tests.published.section_checks``. What is held is
what was reached, so that a change for the worse is noticed; where that is less than was
wished, the test says so. Each limit is the figure that was reached and some room above
it, since last bits that differ between machines may move a bubble by a part of a panel.
"""

from __future__ import annotations

import numpy as np
import pytest

from tests.published.section_checks import (
    FLAP_REYNOLDS,
    HINGES,
    Errors,
    FlapCase,
    bubble,
    five_degrees,
    flap_cases,
    high_reynolds,
)

pytestmark = [
    pytest.mark.published,
    pytest.mark.slow,
    pytest.mark.usefixtures("compiled_kernels"),
]


# --- NACA 0012 at 6e6


@pytest.fixture(scope="module")
def high(compiled_kernels) -> dict[str, Errors]:
    found = high_reynolds()
    assert all(one.missed == 0 for one in found.values())
    return found


def test_lift_with_fixed_transition_is_that_of_the_tunnel(high):
    # Lift of the three grits differs by 0.002 to 0.018 at equal angle, and all three read
    # 0.007 to 0.012 low at no angle: the datum of the angle is good to 0.1 degrees. The
    # Mach number of 0.15 adds 1 % of lift, 0.016 at the most, that the solver leaves out.
    assert high["tripped, lift"].mean < 0.012
    assert high["tripped, lift"].largest < 0.025


def test_drag_with_fixed_transition_is_that_of_the_tunnel(high):
    # Drag at equal lift spans 1 to 7 % between the grits, 10 % near the largest lift. The
    # grit's own drag is in the measurement and not in ours.
    assert abs(high["tripped, drag"].bias) < 0.03
    assert high["tripped, drag"].mean < 0.045
    assert high["tripped, drag"].largest < 0.14


def test_largest_lift_with_fixed_transition_is_a_little_high(high):
    # The grits differ by 0.023 among themselves. Ours is 2 % more than their mean, at 19
    # in place of 17 degrees: the leading-edge stall is sharper than the method's.
    assert 0.0 < high["tripped, largest lift"].bias < 0.04
    assert high["tripped, largest lift"].largest < 0.05


def test_smooth_lift_is_that_of_the_tunnel(high):
    # Digitised from a small figure: the readings scatter by up to 0.028 about a straight
    # line. From -15.9 to 16.5 degrees, where the tunnel's model is attached.
    assert high["smooth, lift"].mean < 0.022
    assert high["smooth, lift"].largest < 0.04


def test_smooth_drag_is_a_few_per_cent_low(high):
    # Digitised: the two sides of the polar, which should be alike, differ by up to 5 %,
    # by 12 % where lift is 1. How quiet that tunnel's air was is not in the table: ours is
    # that of 0.07 %.
    assert -0.08 < high["smooth, drag"].bias < 0.0
    assert high["smooth, drag"].largest < 0.15


def test_smooth_largest_lift_is_four_per_cent_high(high):
    # One reading from a figure, good to 0.02; the rest is the method's, see above.
    assert abs(high["smooth, largest lift"].bias) < 0.08


# --- E387's bubble

WITHIN = 0.03
"""Of the chord: what was wished for. The pressures' places are good to 0.01, as their
authors say; the solver's panels are 0.022 long at mid-chord."""

BUBBLE = {
    # Places from pressures: where the plateau begins and ends, by eye.
    "pressure, 100k, separation": 0.034,
    "pressure, 100k, transition": 0.050,
    "pressure, 100k, reattachment": 0.047,
    "pressure, 200k, separation": 0.027,
    "pressure, 200k, transition": 0.015,
    "pressure, 200k, reattachment": 0.029,
    "pressure, 300k, separation": 0.039,  # one of four, at -2 degrees, is 0.08 off
    "pressure, 300k, transition": 0.021,
    "pressure, 300k, reattachment": 0.026,
    # Oil: the line taken for reattachment was later judged some per cent upstream of it,
    # so that ours should lie a little downstream, and mostly does.
    "oil flow, 100k, separation": 0.035,
    "oil flow, 100k, reattachment": 0.028,
    "oil flow, 200k, separation": 0.022,
    "oil flow, 200k, reattachment": 0.026,
    "oil flow, 300k, separation": 0.037,
    "oil flow, 300k, reattachment": 0.010,
}
"""Mean distance from the measured places over -2 to 6 degrees [chord]: what was reached,
and 0.005 for a bubble that leaps a panel on another machine."""

MISSED = {
    "pressure, 100k, transition",
    "pressure, 100k, reattachment",
    "pressure, 300k, separation",
    "oil flow, 300k, separation",
}
"""Where the wish is missed: the bubble of 100,000 turns and closes 0.04 too early against
pressures (not against oil), and separation at 300,000 is 0.002 to 0.003 more than that."""


@pytest.fixture(scope="module")
def bubbles(compiled_kernels) -> dict[str, Errors]:
    return bubble()


def test_the_bubble_is_found_wherever_it_was_measured(bubbles):
    assert set(bubbles) == set(BUBBLE)
    assert all(one.missed == 0 for one in bubbles.values())


@pytest.mark.parametrize("key", BUBBLE)
def test_the_bubble_lies_where_it_was_measured(bubbles, key):
    assert bubbles[key].mean < BUBBLE[key]


def test_the_wish_is_missed_in_known_places_only(bubbles):
    assert {key for key, one in bubbles.items() if one.mean > WITHIN} <= MISSED
    # Pooled over both sources and the higher Reynolds numbers it is met.
    for kind in ("separation", "transition", "reattachment"):
        pooled = [
            one.error for key, one in bubbles.items() if key.endswith(kind) and "100k" not in key
        ]
        assert np.mean(np.abs(np.concatenate(pooled))) < WITHIN


# --- E387 near 5 degrees


@pytest.fixture(scope="module")
def five(compiled_kernels) -> dict[str, Errors]:
    return five_degrees()


@pytest.mark.parametrize("reynolds", ["100k", "200k", "300k", "460k"])
def test_forces_near_five_degrees(five, reynolds):
    # Two tunnels differ by 0.048 in lift and by 7 to 16 % in drag, on average, see
    # measurement_scatter.csv; the four runs at 200,000 here span 0.0024 in moment. Lift
    # is 0.02 to 0.04 high, as of most sections.
    assert abs(five[f"{reynolds}, lift"].bias) < 0.045
    assert abs(five[f"{reynolds}, drag"].bias) < 0.09
    assert abs(five[f"{reynolds}, moment"].bias) < 0.008


def test_the_long_bubble_of_60000_is_too_mild(five):
    # Measured lift at 4 degrees is 0.64 to 0.72 in three runs, drag 0.039 to 0.043. Ours
    # has 0.08 more lift and a fifth less drag: the weakness is known, and held.
    assert abs(five["60k, lift"].bias) < 0.10
    assert -0.25 < five["60k, drag"].bias < 0.0
    assert abs(five["60k, moment"].bias) < 0.025


# --- SD7037 with a flap


@pytest.fixture(scope="module")
def flapped(compiled_kernels) -> tuple[FlapCase, ...]:
    return flap_cases()


def _gains(cases: tuple[FlapCase, ...], deflection: int, reynolds: int) -> tuple[float, ...]:
    """Measured gain of lift, then the computed ones by hinge, from fore to aft."""
    these = [one for one in cases if (one.deflection, one.reynolds) == (deflection, reynolds)]
    assert [one.hinge for one in these] == list(HINGES)
    return (these[0].measured, *(one.computed for one in these))


@pytest.mark.parametrize("reynolds", FLAP_REYNOLDS)
def test_five_degrees_of_flap_give_the_lift_that_was_measured(flapped, reynolds):
    # The place of the hinge is not in the tables: 0.76 to 0.80 of chord is usual, and
    # makes a difference of 0.034. The measured gain, good to 0.01, lies between.
    measured, fore, aft = _gains(flapped, 5, reynolds)
    assert aft - 0.01 < measured < fore + 0.01


@pytest.mark.parametrize("reynolds", FLAP_REYNOLDS)
def test_ten_degrees_of_flap_give_too_much_lift(flapped, reynolds):
    # The second five degrees gave 0.07 to 0.11 where the first gave 0.22 to 0.26; ours
    # give nearly as much again. The flow over a flap so deflected parts in the tunnel and
    # does less so in the computation: up to 0.09 with the hinge aft, 0.15 with it fore.
    measured, fore, aft = _gains(flapped, 10, reynolds)
    assert 0.0 < aft - measured < 0.10
    assert fore - measured < 0.16


def test_drag_with_five_degrees_of_flap(flapped):
    # Two tunnels differ by 7 to 18 % in the drag of smooth sections, see
    # measurement_scatter.csv; the hinge's unknown place adds some per cent.
    for one in flapped:
        if one.deflection == 5:
            assert abs(one.drag.bias) < 0.08
            assert one.drag.mean < 0.16
            assert one.drag.missed <= 1


def test_drag_with_ten_degrees_of_flap_is_uncertain(flapped):
    # Drag at equal lift, with a lift that is 0.1 to 0.2 high: see above.
    for one in flapped:
        if one.deflection == 10:
            assert abs(one.drag.bias) < 0.20
            assert one.drag.mean < 0.37


def test_largest_lift_with_a_flap(flapped):
    # As good as without one above 90,000; at 60,000 and 10 degrees 0.1 high.
    for one in flapped:
        assert one.largest.missed == 0
        assert one.largest.mean < (0.11 if one.reynolds < 90_000 else 0.06)
