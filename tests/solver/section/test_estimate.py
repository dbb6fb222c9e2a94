from __future__ import annotations

import math

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.estimate import (
    DRAG_HALF_WIDTH,
    LARGEST_LIFT_HALF_WIDTH,
    REYNOLDS,
    estimate_polar,
    shape_of,
)
from solver.section.estimated_drag import attached_drag, form_factor, plate_friction
from solver.section.estimated_lift import (
    SectionShape,
    burst_weight,
    largest_lift,
    lift_curve,
    lift_slope,
    smooth_step,
    straight_lift,
)
from solver.section.geometry import Outline, naca_outline
from solver.section.polar import CellOrigin

SYMMETRIC = ["0006", "0009", "0012"]
CAMBERED = ["2412", "4409", "6409", "23012"]


def _kink(fine: np.ndarray, coarse: np.ndarray) -> float:
    """How the greatest jump of the slope shrinks when the step is halved.

    To a half where the slope is continuous, not at all where it jumps.
    """
    jump, wide = (np.max(np.abs(np.diff(values, 2))) for values in (fine, coarse))
    return float(2.0 * jump / wide)


def _inverted(outline: Outline) -> Outline:
    return Outline("inverted", outline.x[::-1], -outline.y[::-1])


@pytest.mark.parametrize("digits", SYMMETRIC)
def test_symmetric_sections_are_odd_in_angle_and_do_not_lift_at_zero(digits):
    polar = estimate_polar(naca_outline(digits))
    middle = polar.angle.size // 2
    # The camber line measured from the outline is zero to 1e-12.
    np.testing.assert_allclose(polar.lift[middle], 0.0, atol=1e-9)
    np.testing.assert_allclose(polar.lift, -polar.lift[::-1], atol=1e-9)
    np.testing.assert_allclose(polar.moment, -polar.moment[::-1], atol=1e-9)
    np.testing.assert_allclose(polar.drag, polar.drag[::-1], atol=1e-9)
    np.testing.assert_allclose(polar.zero_lift_angle, 0.0, atol=1e-9)


@pytest.mark.parametrize("digits", CAMBERED)
def test_cambered_sections_lift_at_zero_angle_and_pitch_down(digits):
    polar = estimate_polar(naca_outline(digits))
    middle = polar.angle.size // 2
    assert np.all(polar.lift[middle] > 0.05)
    assert np.all(polar.moment[middle] < -0.005)
    assert np.all(polar.zero_lift_angle < 0.0)


@pytest.mark.parametrize("digits", CAMBERED)
def test_a_section_upside_down_is_mirrored(digits):
    outline = naca_outline(digits)
    one, other = estimate_polar(outline), estimate_polar(_inverted(outline))
    # What Newton leaves in the measured camber line.
    np.testing.assert_allclose(other.lift, -one.lift[::-1], atol=1e-6)
    np.testing.assert_allclose(other.drag, one.drag[::-1], atol=1e-6)
    np.testing.assert_allclose(other.moment, -one.moment[::-1], atol=1e-6)


@pytest.mark.parametrize("digits", SYMMETRIC)
@pytest.mark.parametrize("reynolds", [3e4, 5e4, 7e4, 1e5, 2e5, 3e5])
def test_a_tail_is_smooth_near_zero_lift(digits, reynolds):
    shape = shape_of(naca_outline(digits))
    angle = np.radians(np.linspace(-8.0, 8.0, 321))
    lift = lift_curve(angle, shape, np.array([reynolds])).lift[:, 0]
    slope = np.diff(lift) / np.diff(angle)
    # Between half and a little more than the slope of an ideal flow, measured on
    # symmetric sections: 3.3 to 6 per radian.
    assert np.all((slope[100:220] > 3.0) & (slope[100:220] < 6.5))
    assert _kink(lift, lift[::2]) < 0.6


def test_the_slope_near_zero_lift_recovers_with_reynolds_number():
    polar = estimate_polar(naca_outline("0009"))
    middle = polar.angle.size // 2
    slope = polar.lift[middle + 1] / polar.angle[middle + 1]
    assert np.all(np.diff(slope) > 0.0)
    assert slope[0] < 0.8 * slope[-1]


@pytest.mark.parametrize("digits", ["0009", "2412", "4409", "6409"])
@pytest.mark.parametrize("reynolds", [6e4, 1e5, 2e5, 4e5])
def test_curves_have_no_kink(digits, reynolds):
    angle = np.radians(np.linspace(-25.0, 25.0, 4001))
    curve = lift_curve(angle, shape_of(naca_outline(digits)), np.array([reynolds]))
    for values in (curve.lift, curve.attached_lift, curve.stalled):
        assert _kink(values[:, 0], values[::2, 0]) < 0.6


@pytest.mark.parametrize("digits", [*SYMMETRIC, *CAMBERED])
def test_the_first_peak_is_clear(digits):
    polar = estimate_polar(naca_outline(digits))
    assert polar.bracketed.all()
    assert np.all(polar.knee_angle < polar.peak_angle)
    assert np.isnan(polar.later_rise).all()
    past = polar.angle[:, None] > polar.peak_angle + np.radians(0.6)
    assert polar.beyond_stall[past].all()


@pytest.mark.parametrize("digits", [*SYMMETRIC, *CAMBERED])
def test_higher_reynolds_numbers_lift_more_and_drag_less(digits):
    polar = estimate_polar(naca_outline(digits))
    assert np.all(np.diff(polar.largest_lift) > 0.0)
    assert np.all(np.diff(polar.drag.min(axis=0)) < 0.0)
    best = (polar.lift / polar.drag).max(axis=0)
    assert np.all(np.diff(best) > 0.0)


def test_every_cell_is_marked_and_every_number_finite():
    polar = estimate_polar(naca_outline("4409"))
    assert polar.estimated
    assert polar.name == "NACA 4409"
    assert "estimated" in polar.source
    assert tuple(polar.reynolds) == REYNOLDS
    for codes in (polar.origin_lift, polar.origin_drag, polar.origin_moment):
        assert np.all(codes == CellOrigin.ESTIMATED)
    for values in (polar.lift, polar.drag, polar.moment):
        assert np.isfinite(values).all()
    assert np.all(polar.drag > 0.0)
    assert np.all(polar.largest_lift_uncertainty == LARGEST_LIFT_HALF_WIDTH)
    assert set(polar.drag_uncertainty) == {width for _, width in DRAG_HALF_WIDTH}


def test_strong_camber_is_unknown_where_bubbles_burst():
    polar = estimate_polar(naca_outline("6409"))
    assert polar.unknown == ((1e5, 1.5e5),)
    low = polar.reynolds <= 1e5
    assert polar.largest_lift[low].max() < 0.7 * polar.largest_lift[~low].min()
    assert polar.largest_lift_uncertainty[low].min() > 2.0 * LARGEST_LIFT_HALF_WIDTH
    assert estimate_polar(naca_outline("4409")).unknown == ()


def test_more_camber_lifts_more_and_a_sharper_nose_less():
    plain = SectionShape(0.1, 0.008, -0.05, 0.3)
    more = SectionShape(0.1, 0.008, -0.05, 0.4)
    sharp = SectionShape(0.1, 0.002, -0.05, 0.3)
    assert largest_lift(more, 2e5) > largest_lift(plain, 2e5) > largest_lift(sharp, 2e5)


def test_the_lift_slope_of_a_thin_plate_is_below_two_pi():
    shape = SectionShape(0.0, 0.0, 0.0, 0.0)
    # 2 pi x 0.88 at the reference Reynolds number.
    assert lift_slope(shape, 1e5) == pytest.approx(2.0 * math.pi * 0.88, rel=1e-12)


@pytest.mark.parametrize("ideal", [-0.5, 0.0, 0.3, 0.5, 1.0])
def test_straight_lift_rises_everywhere(ideal):
    shape = SectionShape(0.1, 0.008, -0.12 * ideal, ideal)
    angle = np.radians(np.linspace(-25.0, 25.0, 501))
    for reynolds in (3e4, 6e4, 1e5, 1e6):
        assert np.all(np.diff(straight_lift(angle, shape, reynolds)) > 0.0)


def test_friction_ends_are_blasius_and_prandtl_schlichting():
    # Textbook values: Blasius 1.328/sqrt(1e5), turbulent 0.455/5^2.58 and 0.00447 at 1e6.
    assert plate_friction(1e5, transition=1.0) == pytest.approx(1.328 / math.sqrt(1e5), rel=1e-12)
    assert plate_friction(1e5, transition=2.0) == plate_friction(1e5, transition=1.0)
    # The first 0.1 % is counted as laminar, where its friction is the greater.
    assert plate_friction(1e6, transition=0.0) == pytest.approx(0.00447, rel=5e-3)


def test_friction_falls_as_transition_moves_back():
    values = plate_friction(3e5, transition=np.linspace(0.05, 1.0, 20))
    assert np.all(np.diff(values) < 0.0)


def test_the_form_factor_of_a_twelve_per_cent_section():
    # 1 + 0.24 + 60 x 0.12^4 = 1.2524.
    assert form_factor(0.12) == pytest.approx(1.2524416, rel=1e-12)


def test_drag_is_least_near_the_ideal_lift():
    shape = shape_of(naca_outline("4409"))
    lift = np.linspace(-0.5, 1.2, 171)
    drag = attached_drag(lift, shape, 3e5)
    assert 0.0 < lift[np.argmin(drag)] < float(np.asarray(shape.ideal_lift)) + 0.1


def test_bursting_needs_camber_and_a_low_reynolds_number():
    heavy, light = SectionShape(0.1, 0.008, -0.1, 0.8), SectionShape(0.1, 0.008, -0.1, 0.5)
    assert burst_weight(heavy, 8e4) == 1.0
    assert burst_weight(heavy, 1.2e5) == 0.0
    assert burst_weight(light, 8e4) == 0.0


def test_the_smooth_step_is_level_at_both_ends():
    np.testing.assert_allclose(smooth_step([-1.0, 0.0, 0.5, 1.0, 2.0], 0.0, 1.0), [0, 0, 0.5, 1, 1])


@pytest.mark.parametrize(
    "bad", [(), (2e5, 1e5), (1e5, 1e5), (1e3, 1e5), (1e5, 1e8), (math.nan,), (-1e5, 1e5)]
)
def test_unusable_reynolds_numbers_are_named(bad):
    with pytest.raises(InputError, match="reynolds must be ascending") as caught:
        estimate_polar(naca_outline("0009"), reynolds=bad)
    assert caught.value.name == "reynolds"
