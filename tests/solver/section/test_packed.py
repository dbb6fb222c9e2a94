"""Packed polars: exactness on smooth curves, slopes, smoothness, bands, ends of the table."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from solver.errors import InputError
from solver.section.packed import HELD, HIGH, LOW, NOMINAL
from solver.section.packing import pack_polars, pack_with_held
from solver.section.polar import CellOrigin, polar_from_columns, polar_from_functions

SCALE = np.radians(16.0)
ZERO_LIFT = np.radians(-3.0)


def lift(angle):
    x = angle - ZERO_LIFT
    return 2.0 * np.pi * x * np.exp(-((x / SCALE) ** 6) / 6.0)


def lift_slope(angle):
    x = angle - ZERO_LIFT
    return 2.0 * np.pi * np.exp(-((x / SCALE) ** 6) / 6.0) * (1.0 - (x / SCALE) ** 6)


def drag(angle):
    return 0.01 + 0.3 * angle**2


def moment(angle):
    return -0.06 + 0.02 * angle


def smooth_polar(name="smooth"):
    return polar_from_functions(name, lift=lift, drag=drag, moment=moment)


def polar_of_two_runs():
    """Lift 10 % less and drag twice at the lower Reynolds number."""
    angle = np.radians(np.arange(-15.0, 25.01, 0.25))
    columns = np.stack([0.9 * lift(angle), lift(angle)], axis=1)
    return polar_from_columns(
        "two runs",
        source="made up",
        angle=angle,
        reynolds=[1e5, 3e5],
        lift=columns,
        drag=np.stack([2.0 * drag(angle), drag(angle)], axis=1),
        moment=np.stack([moment(angle), moment(angle)], axis=1),
        origin=CellOrigin.COMPUTED,
        largest_lift_uncertainty=[0.07, 0.05],
        drag_uncertainty=[0.16, 0.08],
    )


def test_a_smooth_curve_is_met_to_a_millionth():
    packed = pack_polars([smooth_polar()])
    angle = np.linspace(-0.3, 0.45, 3001)
    values = packed.evaluate(angle, 1e5)
    # Interpolation error of cubics on a quarter-degree grid.
    assert values.lift == pytest.approx(lift(angle), abs=1e-6)
    assert values.drag == pytest.approx(drag(angle), abs=1e-9)
    assert values.moment == pytest.approx(moment(angle), abs=1e-9)


def test_the_error_falls_with_the_fourth_power_of_the_step():
    angle = np.linspace(-0.2, 0.4, 3001)

    def error(step_deg: float) -> float:
        packed = pack_polars([smooth_polar()], angle_step=np.radians(step_deg))
        return float(np.max(np.abs(packed.evaluate(angle, 1e5).lift - lift(angle))))

    # Sixteen for exactly fourth order; the steps do not divide the range evenly.
    assert error(0.25) / error(0.125) == pytest.approx(16.0, rel=0.25)


def test_slopes_are_those_of_the_curve():
    packed = pack_polars([smooth_polar()], angle_step=np.radians(0.1))
    angle = np.linspace(-0.3, 0.45, 2001)
    values = packed.evaluate(angle, 1e5)
    # Slopes are one order less exact than values: third power of a tenth of a degree.
    assert values.lift_slope == pytest.approx(lift_slope(angle), abs=1e-5)
    assert values.drag_slope == pytest.approx(0.6 * angle, abs=1e-7)


@settings(max_examples=200, deadline=None)
@given(
    angle=st.floats(-3.0, 3.0),
    reynolds=st.floats(1.0, 1e9),
    band=st.sampled_from([LOW, NOMINAL, HIGH]),
    section=st.integers(0, 1),
)
def test_values_are_finite_everywhere_and_slopes_are_their_derivatives(
    angle, reynolds, band, section
):
    packed = PACKED_PAIR
    h = 1e-5
    here = packed.evaluate(angle, reynolds, band=band, section=section)
    ahead = packed.evaluate(angle + h, reynolds, band=band, section=section)
    behind = packed.evaluate(angle - h, reynolds, band=band, section=section)
    for name in ("lift", "drag", "moment"):
        value, slope = getattr(here, name), getattr(here, f"{name}_slope")
        assert np.isfinite(value)
        assert np.isfinite(slope)
        difference = (getattr(ahead, name) - getattr(behind, name)) / (2.0 * h)
        # Rounding is 1e-16/1e-5 of the value; across a node the second derivative
        # jumps by up to the change of slope over a cell, which h takes a share of.
        assert slope == pytest.approx(difference, abs=2e-3)
    assert here.drag > 0.0


PACKED_PAIR = pack_polars([smooth_polar(), polar_of_two_runs()])


def test_values_and_slopes_join_at_every_node():
    packed = PACKED_PAIR
    for reynolds in (1e5, 2e5):
        below = packed.evaluate(np.nextafter(packed.angle[1:-1], -1.0), reynolds, section=1)
        above = packed.evaluate(np.nextafter(packed.angle[1:-1], 1.0), reynolds, section=1)
        # Rounding of a cubic with coefficients of order one.
        assert above.lift == pytest.approx(below.lift, abs=1e-12)
        assert above.lift_slope == pytest.approx(below.lift_slope, abs=1e-9)


def test_lift_and_drag_are_smooth_over_reynolds_number():
    reynolds = np.geomspace(15e3, 3e6, 20001)
    values = PACKED_PAIR.evaluate(0.1, reynolds, section=1)
    slope = np.gradient(values.lift, np.log(reynolds))
    # A jump of the slope would be of the order of 0.07, the change over a table.
    assert np.max(np.abs(np.diff(slope))) < 1e-3
    assert np.all(np.diff(values.drag) <= 1e-15)


def test_the_table_is_met_at_its_own_reynolds_numbers_beside_another_section():
    values = PACKED_PAIR.evaluate(0.1, np.array([1e5, 3e5]), section=1)
    assert values.lift == pytest.approx([0.9 * lift(0.1), lift(0.1)], abs=1e-6)
    assert values.drag == pytest.approx([2.0 * drag(0.1), drag(0.1)], abs=1e-6)


def test_outside_the_reynolds_numbers_the_end_is_held_and_said_to_be_extrapolated():
    far, end = (PACKED_PAIR.evaluate(0.1, re, section=1) for re in (30e3, 1e5))
    assert far.lift == pytest.approx(float(end.lift), abs=1e-12)
    assert far.drag == pytest.approx(float(end.drag), abs=1e-12)
    codes = PACKED_PAIR.trust(0.1, np.array([30e3, 1e5, 2e5, 3e5, 1e6]), section=1)
    assert codes.tolist() == [1, 0, 0, 0, 1]


def test_the_band_widens_outside_the_table():
    def width(reynolds: float) -> float:
        ends = (
            PACKED_PAIR.limits(reynolds, band=band, section=1).largest_lift for band in (LOW, HIGH)
        )
        low, high = ends
        return float(high - low)

    assert width(1e5) == pytest.approx(0.14, abs=1e-12)
    assert width(3e5) == pytest.approx(0.10, abs=1e-12)
    assert width(20e3) > width(50e3) > width(1e5)
    assert width(2e6) > width(6e5) > width(3e5)


def test_beyond_stall_is_marked_on_the_curve_and_not_before():
    limits = PACKED_PAIR.limits(1e5, section=1)
    angle = np.array([0.0, float(limits.knee_angle), 0.45])
    assert PACKED_PAIR.trust(angle, 1e5, section=1).tolist() == [0, 0, 2]


def test_angles_past_the_grid_come_to_rest_smoothly():
    angle = np.radians([29.0, 31.0, 40.0, 90.0, 179.0])
    values = PACKED_PAIR.evaluate(angle, 1e5)
    end = PACKED_PAIR.evaluate(np.radians(60.0), 1e5)
    assert np.isfinite(values.lift).all()
    assert values.lift[-1] == pytest.approx(float(end.lift), abs=1e-9)
    assert abs(values.lift_slope[-1]) < 1e-9


def test_shapes_broadcast():
    angle = np.zeros((3, 1, 4))
    reynolds = np.full((2, 1), 2e5)
    values = PACKED_PAIR.evaluate(angle, reynolds, band=[[NOMINAL]], section=[0, 1, 0, 1])
    limits = PACKED_PAIR.limits(reynolds, band=LOW, section=[0, 1, 0, 1])
    assert values.lift.shape == values.lift_slope.shape == values.drag.shape == (3, 2, 4)
    assert limits.knee_angle.shape == (2, 4)
    assert PACKED_PAIR.trust(angle, reynolds, section=[0, 1, 0, 1]).shape == (3, 2, 4)


def test_each_element_is_what_it_would_be_alone():
    rng = np.random.default_rng(4)
    angle, reynolds = rng.uniform(-0.6, 0.6, 50), rng.uniform(3e4, 9e5, 50)
    band, section = rng.integers(0, 3, 50), rng.integers(0, 2, 50)
    together = PACKED_PAIR.evaluate(angle, reynolds, band=band, section=section)
    for i in range(50):
        alone = PACKED_PAIR.evaluate(angle[i], reynolds[i], band=band[i], section=section[i])
        assert alone.lift == together.lift[i]
        assert alone.moment_slope == together.moment_slope[i]


def test_not_a_number_passes_through():
    values = PACKED_PAIR.evaluate([np.nan, 0.1], [2e5, np.nan])
    assert np.isnan(values.lift).all()


def test_low_and_high_drag_are_a_share_of_drag():
    nominal, low, high = (
        PACKED_PAIR.evaluate(0.05, 1e5, band=band, section=1).drag for band in (NOMINAL, LOW, HIGH)
    )
    assert low == pytest.approx(1.16 * float(nominal))
    assert high == pytest.approx(0.84 * float(nominal))


def test_the_shift_of_a_symmetric_section_is_odd_in_angle():
    polar = polar_from_columns(
        "symmetric",
        source="made up",
        angle=(angle := np.radians(np.arange(-25.0, 25.01, 0.25))),
        reynolds=[1e5],
        lift=lift(angle + ZERO_LIFT)[:, None],
        drag=drag(angle)[:, None],
        moment=np.zeros((angle.size, 1)),
        origin=CellOrigin.ESTIMATED,
        largest_lift_uncertainty=0.1,
        drag_uncertainty=0.2,
    )
    packed = pack_polars([polar])
    angle = np.linspace(0.0, 0.5, 200)
    for band in (LOW, NOMINAL, HIGH):
        up, down = (packed.evaluate(s * angle, 1e5, band=band).lift for s in (1.0, -1.0))
        # The knees of both sides are found on the same grid, each by itself.
        assert down == pytest.approx(-up, abs=1e-9)
    assert packed.estimated.tolist() == [True]


def test_drag_factor_and_debit_are_those_of_the_built_wing():
    plain = pack_polars([polar_of_two_runs()])
    built = pack_polars([polar_of_two_runs()], drag_factor=1.15, largest_lift_debit=0.03)
    assert built.evaluate(0.05, 2e5).drag == pytest.approx(
        1.15 * float(plain.evaluate(0.05, 2e5).drag)
    )
    for band in (LOW, NOMINAL, HIGH):
        difference = (
            plain.limits(1e5, band=band).largest_lift - built.limits(1e5, band=band).largest_lift
        )
        assert difference == pytest.approx(0.03, abs=1e-12)
    assert built.evaluate(0.0, 1e5).lift == plain.evaluate(0.0, 1e5).lift


def test_lift_held_at_the_highest_reynolds_number_leaves_drag_alone():
    plain = pack_polars([polar_of_two_runs()])
    held = pack_polars([polar_of_two_runs()], hold_at_reynolds=np.inf)
    top = plain.evaluate(0.1, 3e5)
    low = held.evaluate(0.1, 1e5)
    assert low.lift == pytest.approx(float(top.lift), abs=1e-12)
    assert low.drag == pytest.approx(float(plain.evaluate(0.1, 1e5).drag), abs=1e-12)
    assert held.limits(1e5).largest_lift == pytest.approx(
        float(plain.limits(3e5).largest_lift), abs=1e-12
    )


def test_an_analytic_section_has_its_limit_where_the_formula_has_it():
    limits = pack_polars([smooth_polar()]).limits(1e5)
    # d/dx of x exp(-(x/s)^6/6) is zero at x = s; the table's step is a tenth of a degree.
    assert limits.peak_angle == pytest.approx(ZERO_LIFT + SCALE, abs=np.radians(0.05) + 1e-9)
    largest = 2.0 * np.pi * SCALE * np.exp(-1.0 / 6.0)
    assert limits.largest_lift == pytest.approx(largest, abs=1e-4)
    assert lift(limits.knee_angle) == pytest.approx(0.98 * largest, abs=1e-4)


@pytest.mark.parametrize(
    ("keywords", "name"),
    [
        ({"drag_factor": 0.0}, "drag_factor"),
        ({"drag_factor": np.nan}, "drag_factor"),
        ({"largest_lift_debit": -0.1}, "largest_lift_debit"),
        ({"hold_at_reynolds": 0.0}, "hold_at_reynolds"),
        ({"angle_step": 0.0}, "angle_step"),
    ],
)
def test_an_unusable_number_is_named_in_the_refusal(keywords, name):
    with pytest.raises(InputError) as caught:
        pack_polars([smooth_polar()], **keywords)
    assert caught.value.name == name


def test_no_section_is_refused():
    with pytest.raises(InputError, match="polars must be one section or more"):
        pack_polars([])


def test_the_counterfactual_stands_beside_the_band_also_where_an_interval_is_unknown():
    polars = [smooth_polar(), polar_of_two_runs()]
    packed, plain = pack_with_held(polars), pack_polars(polars)
    held = pack_polars(polars, hold_at_reynolds=np.inf)
    angle, reynolds = np.radians(np.linspace(-5.0, 15.0, 41)), np.geomspace(4e4, 6e5, 41)
    for section in (0, 1):
        for band in (LOW, NOMINAL, HIGH):
            found = packed.evaluate(angle, reynolds, band=band, section=section)
            same = plain.evaluate(angle, reynolds, band=band, section=section)
            # The grid's extra nodes may only round.
            np.testing.assert_allclose(found.lift, same.lift, atol=1e-9)
        found = packed.evaluate(angle, reynolds, band=HELD, section=section)
        same = held.evaluate(angle, reynolds, band=NOMINAL, section=section)
        np.testing.assert_allclose(found.lift, same.lift, atol=1e-9)
        limits = packed.limits(reynolds, band=HELD, section=section)
        assert np.ptp(limits.largest_lift) < 1e-9
