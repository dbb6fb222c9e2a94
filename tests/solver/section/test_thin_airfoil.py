from __future__ import annotations

import math

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.geometry import naca_outline, outline_from_coordinates
from solver.section.thin_airfoil import (
    flap_effectiveness,
    naca_thin_airfoil,
    outline_thin_airfoil,
    thin_airfoil,
    viscous_flap_factor,
)

CAMBERED = ["2412", "4409", "4415", "6409", "23012"]


@pytest.mark.parametrize("digits", CAMBERED)
def test_cambered_sections_lift_at_zero_angle_and_pitch_down(digits):
    found = naca_thin_airfoil(digits)
    assert found.zero_lift_angle < 0.0
    assert found.moment_quarter_chord < 0.0
    assert found.ideal_lift > 0.0


@pytest.mark.parametrize("digits", ["0006", "0009", "0012"])
def test_symmetric_sections_do_neither(digits):
    for found in (naca_thin_airfoil(digits), outline_thin_airfoil(naca_outline(digits))):
        # Zero but for rounding in the measured outline.
        assert found.zero_lift_angle == pytest.approx(0.0, abs=1e-12)
        assert found.moment_quarter_chord == pytest.approx(0.0, abs=1e-12)
        assert found.ideal_lift == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize("digits", ["2412", "23012"])
def test_a_section_turned_upside_down_is_odd(digits):
    outline = naca_outline(digits)
    mirrored = outline_from_coordinates("inverted", np.column_stack([outline.x, -outline.y])[::-1])
    given = outline_from_coordinates("given", np.column_stack([outline.x, outline.y]))
    one, other = outline_thin_airfoil(given), outline_thin_airfoil(mirrored)
    # Same points mirrored: the measured line agrees to what Newton leaves, 1e-8.
    assert other.zero_lift_angle == pytest.approx(-one.zero_lift_angle, abs=1e-7)
    assert other.moment_quarter_chord == pytest.approx(-one.moment_quarter_chord, abs=1e-7)


def test_a_reflexed_line_pitches_up_where_the_plain_one_pitches_down():
    assert naca_thin_airfoil("23112").moment_quarter_chord > 0.0
    assert naca_thin_airfoil("23012").moment_quarter_chord < 0.0


def test_moment_does_not_depend_on_a_tilt_and_angles_shift_by_it():
    def plain(x: np.ndarray) -> np.ndarray:
        return 0.1 * (1.0 - 2.0 * x)

    tilt = 0.03
    one, other = thin_airfoil(plain), thin_airfoil(lambda x: plain(x) + tilt)
    # Identities of the integrals: rounding only.
    assert other.zero_lift_angle - one.zero_lift_angle == pytest.approx(tilt, rel=1e-12)
    assert other.moment_quarter_chord == pytest.approx(one.moment_quarter_chord, rel=1e-12)
    assert other.ideal_lift == pytest.approx(one.ideal_lift, rel=1e-12)


def test_a_parabolic_line_meets_its_textbook_values():
    # y = 4 f x (1 - x): zero-lift angle -2 f, moment -pi f, ideal lift 4 pi f.
    camber = 0.03
    found = thin_airfoil(lambda x: 4.0 * camber * (1.0 - 2.0 * x))
    assert found.zero_lift_angle == pytest.approx(-2.0 * camber, rel=1e-12)
    assert found.moment_quarter_chord == pytest.approx(-math.pi * camber, rel=1e-12)
    assert found.ideal_lift == pytest.approx(4.0 * math.pi * camber, rel=1e-12)
    assert found.ideal_angle == pytest.approx(0.0, abs=1e-15)


@pytest.mark.parametrize("fraction", [0.1, 0.25, 0.4])
def test_a_flap_is_a_bent_camber_line(fraction):
    # Second route: quadrature over a line that bends down by one milliradian.
    bend = 1e-3
    hinge = 1.0 - fraction
    found = thin_airfoil(lambda x: np.where(x > hinge, -bend, 0.0), breaks=(hinge,))
    effect = flap_effectiveness(fraction)
    assert -found.zero_lift_angle / bend == pytest.approx(float(effect.angle_shift), rel=1e-9)
    assert found.moment_quarter_chord / bend == pytest.approx(float(effect.moment_slope), rel=1e-9)
    assert 2.0 * math.pi * float(effect.angle_shift) == pytest.approx(
        float(effect.lift_slope), rel=1e-12
    )


def test_flap_limits_are_no_flap_and_all_flap():
    effect = flap_effectiveness(np.array([0.0, 1.0]))
    np.testing.assert_allclose(effect.angle_shift, [0.0, 1.0], atol=1e-15)
    np.testing.assert_allclose(effect.lift_slope, [0.0, 2.0 * math.pi], atol=1e-15)
    np.testing.assert_allclose(effect.moment_slope, [0.0, 0.0], atol=1e-15)


@pytest.mark.parametrize("bad", [-0.01, 1.01, math.nan])
def test_an_unusable_chord_fraction_is_named(bad):
    with pytest.raises(InputError, match="chord_fraction must be between 0 and 1") as caught:
        flap_effectiveness(bad)
    assert caught.value.name == "chord_fraction"


def test_the_viscous_factor_is_even_and_falls_with_deflection():
    angle = np.radians(np.linspace(0.0, 60.0, 61))
    factor = viscous_flap_factor(angle)
    np.testing.assert_array_equal(factor, viscous_flap_factor(-angle))
    assert np.all(np.diff(factor) < 0.0)
    assert np.all((factor > 0.4) & (factor <= 0.8))


def test_the_viscous_factor_follows_the_remembered_curve():
    # Values remembered from the published figure, each good to about 0.05.
    angle = np.radians([0.0, 10.0, 20.0, 30.0, 40.0, 50.0])
    remembered = [0.80, 0.80, 0.70, 0.55, 0.46, 0.42]
    np.testing.assert_allclose(viscous_flap_factor(angle), remembered, atol=0.05)


@pytest.mark.parametrize("bad", [math.radians(61.0), -2.0, math.nan])
def test_an_unusable_deflection_is_named(bad):
    with pytest.raises(InputError, match="deflection must be between") as caught:
        viscous_flap_factor(bad)
    assert caught.value.name == "deflection"


def test_a_slope_that_is_not_finite_is_named():
    with pytest.raises(InputError, match="slope must be finite") as caught:
        thin_airfoil(lambda x: np.full_like(x, np.nan))
    assert caught.value.name == "slope"


def test_a_break_outside_the_chord_is_named():
    with pytest.raises(InputError, match="breaks must be finite and between 0 and 1"):
        thin_airfoil(lambda x: 0.0 * x, breaks=(1.2,))
