from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from solver.errors import InputError
from solver.section.geometry import (
    Outline,
    camber_line,
    cosine_spacing,
    leading_edge_radius,
    max_camber,
    max_thickness,
    naca_outline,
    outline_from_coordinates,
    thickness,
)
from solver.section.naca import naca_digits, naca_section

SECTIONS = ["0006", "0012", "2412", "4412", "6409", "23012", "24112", "43015"]


def _list(outline: Outline) -> np.ndarray:
    return np.column_stack([outline.x, outline.y])


def _refusal(points: object) -> InputError:
    with pytest.raises(InputError) as caught:
        outline_from_coordinates("bad", points)
    assert caught.value.name == "coordinates"
    return caught.value


# --- NACA sections


@pytest.mark.parametrize("digits", SECTIONS)
def test_thickness_is_laid_off_square_to_the_camber_line(digits):
    outline = naca_outline(digits, points=201)
    section = naca_section(digits)
    x = cosine_spacing(101)
    upper, lower = _list(outline)[100::-1], _list(outline)[100:]
    across = upper - lower
    along = np.column_stack([np.ones_like(x), section.camber.slope(x)])
    # Construction identities: rounding only.
    np.testing.assert_allclose((across * along).sum(axis=1), 0.0, atol=1e-15)
    np.testing.assert_allclose(np.hypot(*across.T), 2.0 * section.half_thickness(x), atol=2e-15)
    np.testing.assert_allclose(0.5 * (upper + lower)[:, 1], section.camber.height(x), atol=1e-15)


@pytest.mark.parametrize("digits", SECTIONS)
def test_camber_line_pieces_meet_smoothly_and_end_on_the_chord(digits):
    camber = naca_section(digits).camber
    eps = 1e-9
    before, after = camber.joint - eps, camber.joint + eps
    assert camber.height(before) == pytest.approx(float(camber.height(after)), abs=1e-8)
    assert camber.slope(before) == pytest.approx(float(camber.slope(after)), abs=1e-7)
    assert camber.height(0.0) == 0.0
    # The reflexed constants are printed to three or four figures.
    assert camber.height(1.0) == pytest.approx(0.0, abs=1e-5)


@pytest.mark.parametrize(("digits", "place"), [("2412", 0.4), ("4512", 0.5), ("6309", 0.3)])
def test_the_camber_is_largest_where_the_second_digit_says(digits, place):
    camber = naca_section(digits).camber
    assert camber.height(place) == pytest.approx(int(digits[0]) / 100.0, rel=1e-12)
    assert camber.slope(place) == pytest.approx(0.0, abs=1e-15)


@pytest.mark.parametrize("closed", [True, False])
def test_the_trailing_edge_closes_on_request(closed):
    outline = naca_outline("0012", closed=closed)
    gap = outline.y[0] - outline.y[-1]
    # Published coefficients leave 2.1 % of the thickness: 5 x 0.0021 x 2 x 0.12.
    assert gap == pytest.approx(0.0 if closed else 10 * 0.0021 * 0.12, abs=1e-15)


@pytest.mark.parametrize(
    ("digits", "ordinates"),
    [
        # NACA 0012 in Abbott & von Doenhoff, appendix I (percent; from memory).
        ("0012", {0.0125: 0.01894, 0.05: 0.03555, 0.3: 0.06002, 0.6: 0.04563, 0.95: 0.00807}),
        # NACA 0009, the same table (from memory).
        ("0009", {0.0125: 0.01420, 0.05: 0.02666, 0.3: 0.04501, 0.6: 0.03423, 0.95: 0.00605}),
    ],
)
def test_published_ordinates_to_their_print_precision(digits, ordinates):
    section = naca_section(digits)
    for x, half in ordinates.items():
        # Three decimals of a per cent: half a unit is 5e-6.
        assert section.half_thickness(x, closed=False) == pytest.approx(half, abs=6e-6)


@pytest.mark.parametrize(
    "bad", ["", "12", "241", "0312", "2012", "2400", "2450", "26012", "20012", "22212", "E387"]
)
def test_digits_that_name_no_section_are_refused(bad):
    with pytest.raises(InputError, match="digits must be the digits of a NACA section") as caught:
        naca_outline(bad)
    assert caught.value.name == "digits"


@pytest.mark.parametrize("bad", [40, 160, 39, 2003])
def test_a_number_of_points_out_of_range_is_named(bad):
    with pytest.raises(InputError, match="points must be odd and between 41 and 2001"):
        naca_outline("0012", points=bad)


@pytest.mark.parametrize(
    ("name", "digits"),
    [("NACA 2412", "2412"), ("naca23012", "23012"), (" 0009 ", "0009"), ("E387", None)],
)
def test_naca_names_are_told_from_others(name, digits):
    assert naca_digits(name) == digits


# --- measuring


@pytest.mark.parametrize("digits", SECTIONS)
@pytest.mark.parametrize("points", [61, 161])
def test_the_nose_radius_meets_the_closed_form(digits, points):
    expected = 1.1019 * (int(digits[-2:]) / 100.0) ** 2
    # 61 points leave 1.5 %: a spline over steps of half a per cent at the nose.
    allowed = 0.02 if points == 61 else 0.006
    assert leading_edge_radius(naca_outline(digits, points=points)) == pytest.approx(
        expected, rel=allowed
    )


@pytest.mark.parametrize("digits", SECTIONS)
def test_largest_thickness_and_its_place(digits):
    found = max_thickness(naca_outline(digits))
    # The closed trailing edge moves the peak from 0.3000 to 0.2996 and the value by
    # 1e-4 of itself; the line it is measured across is good to 1e-4 of the chord.
    assert found.value == pytest.approx(int(digits[-2:]) / 100.0, abs=1e-4)
    assert found.place == pytest.approx(0.30, abs=2e-3)


@pytest.mark.parametrize("digits", SECTIONS)
def test_the_camber_line_is_the_one_the_section_was_made_from(digits):
    line = camber_line(naca_outline(digits))
    camber = naca_section(digits).camber
    np.testing.assert_allclose(line.y, camber.height(line.x), atol=2e-4)
    # The slope has a kink in its own slope where two pieces meet, which a spline
    # with knots elsewhere rounds off.
    np.testing.assert_allclose(line.slope, camber.slope(line.x), atol=6e-3)


@pytest.mark.parametrize("digits", ["22018", "42018", "9215", "6318", "6721"])
def test_thick_and_strongly_bent_sections_are_measured_all_the_same(digits):
    # Their camber bends within a nose radius or two, where the line is not well defined:
    # what is left is looser, but nothing runs away.
    outline = naca_outline(digits)
    ratio = int(digits[-2:]) / 100.0
    camber = naca_section(digits).camber
    assert max_thickness(outline).value == pytest.approx(ratio, abs=5e-4)
    assert leading_edge_radius(outline) == pytest.approx(1.1019 * ratio**2, rel=0.25)
    line = camber_line(outline)
    behind = line.x > 0.05
    np.testing.assert_allclose(line.y[behind], camber.height(line.x[behind]), atol=4e-3)


def test_digits_whose_outline_folds_over_itself_are_refused():
    with pytest.raises(InputError, match="digits must be of a section whose outline") as caught:
        naca_outline("9124")
    assert caught.value.name == "digits"


def test_an_outline_that_folds_over_itself_cannot_be_measured():
    plain = naca_outline("0012")
    x = plain.x.copy()
    x[60] = x[58]
    with pytest.raises(InputError, match="folds over itself at point 6") as caught:
        max_thickness(Outline("folded", x, plain.y))
    assert caught.value.name == "coordinates"


def test_camber_of_a_section_upside_down_is_negative():
    outline = naca_outline("4412")
    found = max_camber(Outline("inverted", outline.x[::-1], -outline.y[::-1]))
    assert found.value == pytest.approx(-0.04, abs=2e-4)
    # The curvature jumps at the top, which the spline rounds off: a slope wrong by
    # 0.0035 over a mean curvature of 0.36 moves the top by 0.01.
    assert found.place == pytest.approx(0.4, abs=0.015)


def test_thickness_runs_from_nose_to_trailing_edge():
    found = thickness(naca_outline("0012"))
    assert found.x[0] == pytest.approx(0.0, abs=1e-12)
    assert found.x[-1] == 1.0
    assert np.all(found.thickness[1:-1] > 0.0)


# --- coordinate lists


@settings(max_examples=25, deadline=None)
@given(
    chord=st.floats(1e-3, 1e4),
    dx=st.floats(-1e3, 1e3),
    dy=st.floats(-1e3, 1e3),
    turned=st.booleans(),
)
def test_size_position_and_order_do_not_matter(chord, dx, dy, turned):
    plain = naca_outline("2412", points=81)
    points = _list(plain) * chord + [dx * chord, dy * chord]
    outline = outline_from_coordinates("moved", points[::-1] if turned else points)
    reference = outline_from_coordinates("plain", _list(plain))
    assert outline.turned_round is turned
    # A shift by a thousand chords costs three digits of sixteen.
    np.testing.assert_allclose(outline.x, reference.x, atol=1e-10)
    np.testing.assert_allclose(outline.y, reference.y, atol=1e-10)


def test_the_outline_begins_on_the_upper_surface_with_its_nose_at_the_origin():
    outline = outline_from_coordinates("4412", _list(naca_outline("4412")) * 250.0 + [3.0, 8.0])
    assert outline.x[0] == pytest.approx(1.0, abs=1e-12)
    assert outline.y[1] > outline.y[-2]
    assert outline.x.min() == pytest.approx(0.0, abs=1e-4)


def test_inclination_is_kept():
    tilt = np.radians(4.0)
    turn = np.array([[np.cos(tilt), -np.sin(tilt)], [np.sin(tilt), np.cos(tilt)]])
    outline = outline_from_coordinates("tilted", _list(naca_outline("0012")) @ turn)
    nose = outline.x.argmin()
    assert np.arctan2(outline.y[nose] - outline.y[0], 1.0) == pytest.approx(tilt, abs=0.002)


@pytest.mark.parametrize("digits", ["0012", "6412", "23012"])
def test_a_square_cut_trailing_edge_is_taken(digits):
    outline_from_coordinates(digits, _list(naca_outline(digits, closed=False)))


@pytest.mark.parametrize("points", [61, 161, 401])
@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize("cut", [slice(1, None), slice(None, -1)])
def test_a_missing_end_is_found_however_fine_the_list(points, closed, cut):
    # 401 points end in steps of 6e-5 of the chord, close to printed precision.
    found = _refusal(_list(naca_outline("2412", points=points, closed=closed))[cut])
    assert "closed" in found.requirement


@pytest.mark.parametrize(
    ("gap", "passes"), [(0.004, True), (0.009, True), (0.011, False), (0.03, False)]
)
def test_the_trailing_edge_may_be_open_by_one_per_cent(gap, passes):
    points = _list(naca_outline("2412"))
    wedge = np.where(np.arange(len(points)) <= 80, 0.5, -0.5) * gap * points[:, 0]
    points[:, 1] += wedge
    if passes:
        outline_from_coordinates("blunt", points)
    else:
        assert "a gap of" in str(_refusal(points))


def test_crossed_surfaces_are_refused_with_the_place():
    points = _list(naca_outline("0012", points=81))
    points[points[:, 0] > 0.7, 1] *= -1.0
    found = str(_refusal(points))
    assert "free of crossings" in found
    assert "at point" in found


@pytest.mark.parametrize("at", [5, 30, 60])
def test_swapped_points_are_refused_with_the_place(at):
    points = _list(naca_outline("2412", points=81))
    points[[at, at + 1]] = points[[at + 1, at]]
    found = str(_refusal(points))
    assert "without reversed pieces" in found
    assert f"point {at + 1} to point {at + 2}" in found


def test_point_numbers_are_those_of_the_list_as_given():
    points = _list(naca_outline("2412", points=81))[::-1]
    points[[10, 11]] = points[[11, 10]]
    assert "from point 12 to point 11" in str(_refusal(points))


def test_a_list_in_two_halves_from_nose_to_tail_is_refused():
    points = _list(naca_outline("2412", points=81))
    halves = np.concatenate([points[40::-1], points[41:]])
    assert "reversed" in str(_refusal(halves))


def test_a_list_that_points_the_other_way_is_refused():
    points = _list(naca_outline("2412", points=81))
    points[:, 0] = 1.0 - points[:, 0]
    assert "largest x" in str(_refusal(points))


@pytest.mark.parametrize("every", [2, 3])
def test_a_coarse_list_is_refused(every):
    points = _list(naca_outline("2412", points=61 if every == 2 else 121))
    assert "coarse" in str(_refusal(points[::every]))


def test_a_nose_left_out_is_too_coarse():
    points = _list(naca_outline("0012", points=121))
    assert "coarse" in str(_refusal(points[np.abs(points[:, 0] - 0.02) > 0.015]))


def test_a_point_far_off_is_a_corner():
    points = _list(naca_outline("2412", points=81))
    points[20, 1] += 0.2
    assert "point 2" in str(_refusal(points))


def test_a_repeated_point_is_refused_with_both_numbers():
    points = _list(naca_outline("2412", points=81))
    points = np.insert(points, 30, points[30], axis=0)
    assert "point 32 equal to point 31" in str(_refusal(points))


@pytest.mark.parametrize("value", [np.nan, np.inf])
def test_a_value_that_is_not_finite_is_refused_with_its_place(value):
    points = _list(naca_outline("2412", points=81))
    points[17, 1] = value
    assert "at point 18" in str(_refusal(points))


@pytest.mark.parametrize("bad", [[], [1.0, 2.0], [[1.0, 2.0, 3.0]], "text", [["a", "b"]], None])
def test_what_is_no_list_of_pairs_is_refused(bad):
    assert "pairs of numbers" in str(_refusal(bad))


def test_too_many_points_are_refused():
    assert "3000 points" in str(_refusal(np.zeros((3000, 2))))


def test_a_plate_without_thickness_is_refused():
    points = _list(naca_outline("0012", points=81)) * [1.0, 0.05]
    assert "thick" in str(_refusal(points))


def test_a_section_standing_on_its_nose_is_refused():
    tilt = np.radians(30.0)
    turn = np.array([[np.cos(tilt), -np.sin(tilt)], [np.sin(tilt), np.cos(tilt)]])
    assert "inclined" in str(_refusal(_list(naca_outline("0012")) @ turn))


def test_the_callers_list_is_left_alone():
    points = _list(naca_outline("2412", points=81)) * 3.0
    before = points.copy()
    outline_from_coordinates("copy", points)
    np.testing.assert_array_equal(points, before)


def test_cosine_spacing_needs_two_points():
    with pytest.raises(InputError, match="points must be at least 2"):
        cosine_spacing(1)
