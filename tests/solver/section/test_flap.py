from __future__ import annotations

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.arc_spline import broken_curve
from solver.section.fairing import fair_outline
from solver.section.flap import deflect_flap
from solver.section.geometry import Outline, naca_outline
from solver.section.panelling import panel_nodes
from tests.published.measured_sections import SECTIONS, outline
from tests.solver.section.outline_cases import crossings, distances

SAMPLE = ["e387", "fx63-137", "naca0009", "s1223", "sd7037"]


def _flap(given: Outline, hinge: float, degrees: float, hinge_height: float = 0.5) -> Outline:
    return deflect_flap(
        given, hinge=hinge, deflection=np.radians(degrees), hinge_height=hinge_height
    )


def _points(given: Outline) -> np.ndarray:
    return np.column_stack([given.x, given.y])


def _heights(given: Outline, x: float) -> tuple[float, float]:
    """Lower and upper surface at a place of the smooth outline without a flap."""
    fair = fair_outline(given).outline
    near = int(np.argmin(fair.x))
    lower = np.interp(x, fair.x[near:], fair.y[near:])
    return float(lower), float(np.interp(x, fair.x[near::-1], fair.y[near::-1]))


def _turned_back(points: np.ndarray, pivot: np.ndarray, degrees: float) -> np.ndarray:
    """Points turned trailing edge up about a pivot."""
    turn = np.exp(1j * np.radians(degrees))
    turned = ((points - pivot) @ [1.0, 1.0j]) * turn
    return pivot + np.column_stack([turned.real, turned.imag])


@pytest.mark.parametrize("section", SAMPLE)
def test_no_deflection_is_the_outline_itself(section):
    assert deflect_flap(outline(section), hinge=0.76, deflection=0.0) is outline(section)


@pytest.mark.parametrize("section", SAMPLE)
@pytest.mark.parametrize("degrees", [1e-6, -1e-6])
def test_the_least_deflection_changes_nothing(section, degrees):
    plain = panel_nodes(outline(section))
    flapped = panel_nodes(_flap(outline(section), 0.76, degrees))
    # 1e-6 degrees move the trailing edge by 4e-9; splines through the smooth curve from
    # corner to corner are within 2e-7 of one through all of it.
    np.testing.assert_allclose(flapped.x, plain.x, atol=1e-6)
    np.testing.assert_allclose(flapped.y, plain.y, atol=1e-6)


@pytest.mark.parametrize("section", SECTIONS)
@pytest.mark.parametrize(
    ("hinge", "degrees", "height"), [(0.76, 5.0, 0.5), (0.5, -40.0, 0.0), (0.9, 25.0, 1.0)]
)
def test_the_part_behind_the_hinge_is_turned_whole(section, hinge, degrees, height):
    given = outline(section)
    fair, flapped = fair_outline(given).outline, _flap(given, hinge, degrees, height)
    low, high = _heights(given, hinge)
    pivot = np.array([hinge, low + height * (high - low)])
    first, last = min(flapped.corners), max(flapped.corners)
    rear = np.concatenate([_points(flapped)[:first], _points(flapped)[last + 1 :]])
    back = _turned_back(rear, pivot, degrees)
    # Turned back it lies on the section without a flap, point by point: the pivot is
    # known here from straight lines between 401 points, to 1e-5 of the chord.
    apart = np.hypot(*(back[:, None] - _points(fair)[None]).transpose(2, 0, 1)).min(axis=1)
    assert apart.max() < 2e-5
    assert back[:, 0].min() > hinge - 0.6 * (high - low)
    # Lengths between points do not change: rounding only.
    count = first
    np.testing.assert_allclose(
        np.hypot(*np.diff(_points(flapped)[:count], axis=0).T),
        np.hypot(*np.diff(_points(fair)[:count], axis=0).T),
        atol=1e-14,
    )


@pytest.mark.parametrize("section", SECTIONS)
def test_the_part_ahead_of_the_hinge_stays_where_it_was(section):
    fair, flapped = fair_outline(outline(section)).outline, _flap(outline(section), 0.7, 20.0)
    first, last = flapped.corners[-2], flapped.corners[-1]
    front = {tuple(point) for point in _points(flapped)[flapped.corners[1] + 1 : last]}
    assert first < last
    ahead = _points(fair)[fair.x < 0.7 - 0.05]
    # The very same points, but for the last digit of a spline's value at its own knot.
    assert len(front) >= len(ahead)
    apart = np.hypot(*(ahead[:, None] - np.array(sorted(front))[None]).transpose(2, 0, 1))
    assert apart.min(axis=1).max() < 1e-15


@pytest.mark.parametrize("section", SECTIONS)
@pytest.mark.parametrize("degrees", [-40.0, -10.0, 5.0, 30.0])
def test_the_camber_line_behind_the_hinge_turns_by_the_deflection(section, degrees):
    """Slope of the line midway between points as far from the trailing edge on either side."""
    given = outline(section)

    def slope(shape: Outline) -> float:
        curve = broken_curve(_points(shape), corners=shape.corners)
        whole = curve.starts[-1]
        far = np.array([0.02, 0.16])
        middle = 0.5 * (curve(far) + curve(whole - far))
        run = middle[0] - middle[1]
        return float(np.arctan2(run[1], run[0]))

    change = slope(_flap(given, 0.76, degrees)) - slope(fair_outline(given).outline)
    # A rigid turn: splines over the same points ending at other places, 1e-7 of the chord
    # over 0.14.
    assert np.degrees(change) == pytest.approx(-degrees, abs=1e-3)


def test_trailing_edge_down_is_positive_and_the_chord_line_stays():
    given = naca_outline("0012")
    down = _flap(given, 0.75, 10.0)
    # A quarter of the chord about a hinge on the chord line.
    turn = np.radians(10.0)
    assert down.x[0] == pytest.approx(0.75 + 0.25 * np.cos(turn), abs=1e-9)
    assert down.y[0] == pytest.approx(-0.25 * np.sin(turn), abs=1e-9)
    assert (down.x[-1], down.y[-1]) == (down.x[0], down.y[0])
    assert down.x.min() == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize("degrees", [5.0, 40.0])
def test_the_opening_surface_follows_an_arc_about_the_hinge_and_touches_both_parts(degrees):
    flapped = _flap(naca_outline("0012"), 0.75, degrees)
    start, end = flapped.corners[0], flapped.corners[1]
    arc = _points(flapped)[start : end + 1] - [0.75, 0.0]
    radius = np.hypot(*arc.T)
    np.testing.assert_allclose(radius, radius[0], atol=1e-13)  # rounding
    angles = np.degrees(np.unwrap(np.arctan2(arc[:, 1], arc[:, 0])))
    assert angles[-1] - angles[0] == pytest.approx(degrees, abs=1e-9)
    # The radius is the least distance to the surface, so the arc touches it: the pieces
    # on either side start square to the radius, within half a step's turn (a curvature of
    # 0.3 over 0.006) and half of an arc's step.
    points = _points(flapped)
    for corner, beside in ((start, start - 1), (end, end + 1)):
        step = points[beside] - points[corner]
        spoke = points[corner] - [0.75, 0.0]
        cosine = step @ spoke / (np.hypot(*step) * np.hypot(*spoke))
        assert abs(np.degrees(np.arcsin(cosine))) < 0.15


def test_the_closing_surface_is_cut_off_where_its_parts_meet():
    flapped = _flap(naca_outline("0012"), 0.75, 20.0)
    corner = flapped.corners[-1]
    points = _points(flapped)
    before, behind = points[corner] - points[corner - 2], points[corner + 2] - points[corner]
    turn = np.arctan2(before[0] * behind[1] - before[1] * behind[0], before @ behind)
    # The surface bends by 0.3 x 0.02 between the two steps besides.
    assert np.degrees(turn) == pytest.approx(-20.0, abs=0.5)
    # Two tangents of one circle meet at r tan(angle/2) from where they touch it; the
    # surfaces are nearly straight over that.
    radius = np.hypot(*(points[flapped.corners[0]] - [0.75, 0.0]))
    away = np.hypot(*(points[corner] - [0.75, 0.0]))
    assert away == pytest.approx(radius / np.cos(np.radians(10.0)), rel=2e-3)


@pytest.mark.parametrize("height", [0.0, 1.0])
@pytest.mark.parametrize("degrees", [-30.0, 30.0])
def test_a_hinge_on_a_surface_leaves_that_surface_a_plain_corner(height, degrees):
    given = naca_outline("0012")
    flapped = _flap(given, 0.75, degrees, height)
    hinge = np.array([0.75, _heights(given, 0.75)[int(height)]])
    apart = np.hypot(*(_points(flapped) - hinge).T)
    # Straight lines between the points of the smooth curve find the height to 1e-6.
    assert apart.min() < 1e-5
    assert int(np.argmin(apart)) in flapped.corners
    opens = (degrees > 0.0) == (height == 1.0)  # no arc where the hinge is on the opening side
    assert len(flapped.corners) == (2 if opens else 3)


@pytest.mark.parametrize("section", SECTIONS)
@pytest.mark.parametrize("hinge", [0.5, 0.8, 0.95])
def test_nothing_crosses_over_the_whole_range(section, hinge):
    for degrees in (-40.0, -15.0, -0.01, 0.01, 15.0, 40.0):
        for height in (0.0, 0.5, 1.0):
            flapped = _flap(outline(section), hinge, degrees, height)
            assert (flapped.x[0], flapped.y[0]) == (flapped.x[-1], flapped.y[-1])
            assert crossings(flapped.x, flapped.y) == [], flapped.name
            laid = panel_nodes(flapped)
            assert crossings(laid.x, laid.y) == [], flapped.name


@pytest.mark.parametrize("section", SAMPLE)
@pytest.mark.parametrize("degrees", [-20.0, 10.0])
def test_panels_keep_to_a_flapped_outline(section, degrees):
    flapped = _flap(outline(section), 0.76, degrees)
    laid = panel_nodes(flapped, nodes=201)
    curve = broken_curve(_points(flapped), corners=flapped.corners)
    line = curve(np.linspace(0.0, curve.starts[-1], 40001))
    off = distances(np.column_stack([laid.x, laid.y]), line)
    # A line of 40000 steps cuts the nose by 1e-7, and none is drawn through a corner.
    assert off.max() < 1e-6
    # Smooth splines on either side of the corner: no wave runs from it into the front.
    front = (laid.x > 0.2) & (laid.x < 0.7)
    plain = panel_nodes(outline(section), nodes=201)
    fine = distances(
        np.column_stack([laid.x, laid.y])[front],
        broken_curve(_points(fair_outline(outline(section)).outline), corners=())(
            np.linspace(0.0, plain.arc[-1], 40001)
        ),
    )
    assert fine.max() < 1e-6


def test_a_mirrored_section_with_a_mirrored_flap_is_mirrored():
    given = naca_outline("0009")
    down, up = _flap(given, 0.8, 12.0, 0.3), _flap(given, 0.8, -12.0, 0.7)
    np.testing.assert_allclose(up.x[::-1], down.x, atol=1e-13)  # rounding
    np.testing.assert_allclose(up.y[::-1], -down.y, atol=1e-13)
    assert tuple(len(up.x) - 1 - k for k in reversed(up.corners)) == down.corners


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((0.76, 5.0), "sd7037, flap 24 % at 5 deg"),
        ((0.725, -12.5), "sd7037, flap 27.5 % at -12.5 deg"),
        ((0.8, 10.0, 0.0), "sd7037, flap 20 % at 10 deg, hinged at the lower surface"),
        ((0.8, 10.0, 1.0), "sd7037, flap 20 % at 10 deg, hinged at the upper surface"),
        ((0.8, 10.0, 0.3), "sd7037, flap 20 % at 10 deg, hinged at 30 % of the thickness"),
    ],
)
def test_the_name_says_what_was_deflected(arguments, name):
    assert _flap(outline("sd7037"), *arguments).name == name


@pytest.mark.parametrize(
    ("hinge", "degrees", "height", "name"),
    [
        (0.49, 5.0, 0.5, "hinge"),
        (0.951, 5.0, 0.5, "hinge"),
        (np.nan, 5.0, 0.5, "hinge"),
        (0.76, 40.1, 0.5, "deflection"),
        (0.76, -41.0, 0.5, "deflection"),
        (0.76, np.nan, 0.5, "deflection"),
        (0.76, 5.0, -0.01, "hinge_height"),
        (0.76, 5.0, 1.01, "hinge_height"),
    ],
)
def test_what_is_out_of_range_is_named(hinge, degrees, height, name):
    with pytest.raises(InputError, match=rf"^{name} must be ") as caught:
        _flap(naca_outline("0012"), hinge, degrees, height)
    assert caught.value.name == name


def test_a_flap_on_a_flap_is_refused():
    flapped = _flap(naca_outline("0012"), 0.76, 5.0)
    with pytest.raises(InputError, match="without a flap deflected already") as caught:
        _flap(flapped, 0.9, 5.0)
    assert caught.value.name == "outline"
