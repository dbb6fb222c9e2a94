from __future__ import annotations

import numpy as np
import pytest

from solver.section.arc_spline import broken_curve, spline_by_length
from solver.section.fairing import fair_outline
from solver.section.geometry import Outline, naca_outline, outline_from_coordinates
from solver.section.smoothing_spline import chosen_stiffness, spline_family
from tests.published.measured_sections import SECTIONS, outline
from tests.solver.section.outline_cases import distances, naca_points

SCATTERED = "fx63-137"
"""Whose list alternates by 2e-4 of the chord from point to point."""


# --- the smooth curve through an outline


@pytest.mark.parametrize("section", SECTIONS)
def test_the_curve_keeps_to_what_the_list_was_printed_to(section):
    given = outline(section)
    fair = fair_outline(given)
    points = np.column_stack([given.x, given.y])
    if given.y[0] != given.y[-1]:  # its trailing edge was closed: compare what did not move
        points = points[np.abs(given.x) < 0.3]
    curve = spline_by_length(np.column_stack([fair.outline.x, fair.outline.y]))
    off = distances(points, curve(np.linspace(0.0, curve.x[-1], 20001)))
    # Half a printed step each way is 7e-6 for five decimals; a curve smooth within
    # that comes to twice the step at most. The wedge moves 30 % chord by half of 0.3
    # times the gap.
    wedge = 0.15 * abs(given.y[0] - given.y[-1])
    limit = 4e-4 if section == SCATTERED else 2e-5 + wedge
    assert off.max() < limit
    assert fair.shift < (4e-4 if section == SCATTERED else 2e-5)


def test_the_list_that_scatters_does_so_from_point_to_point():
    given = outline(SCATTERED)
    fair = fair_outline(given).outline
    front = slice(20, 38)  # upper surface, 10 to 63 % of chord
    x, y = given.x[front], given.y[front]
    off = y - np.interp(x, fair.x[:201][::-1], fair.y[:201][::-1])
    # Every point lies on the other side than its neighbours: not a shape, a scatter.
    assert np.all(off[1:] * off[:-1] < 0.0)
    assert np.abs(off).max() > 1e-4


def test_the_step_of_the_print_is_found():
    points = np.column_stack([naca_outline("2412").x, naca_outline("2412").y])
    assert outline_from_coordinates("computed", points).rounding == 0.0
    for decimals in (4, 5, 6):
        printed = np.round(np.delete(points, [1, -2], axis=0), decimals)
        found = outline_from_coordinates("printed", printed).rounding
        assert found == pytest.approx(10.0**-decimals, rel=1e-3)  # the chord is 1 within 1e-3
        found = outline_from_coordinates("in mm", printed * 230.0).rounding
        assert found <= 10.0**-decimals * (1.0 + 1e-3)


@pytest.mark.parametrize("digits", ["0012", "4412"])
def test_rounding_is_taken_out_by_smoothing(digits):
    angle = np.linspace(0.0, 2.0 * np.pi, 302)
    exact = naca_points(digits, angle)
    printed = np.round(exact, 4)
    printed[[0, -1]] = [1.0, 0.0]
    kept = np.concatenate([[True], np.diff(printed[:, 0]) != 0.0])
    exact, printed = exact[kept], printed[kept]
    given = Outline("printed", printed[:, 0], printed[:, 1], rounding=1e-4)
    fair = fair_outline(given).outline
    line = naca_points(digits, np.linspace(0.0, 2.0 * np.pi, 20001))
    before = distances(printed, line)
    after = distances(np.column_stack([fair.x, fair.y])[4:-4], line)
    # A smoothing that finds some 50 numbers from 300 leaves sqrt(50/300) of the scatter.
    assert np.sqrt(np.mean(after**2)) < 0.6 * np.sqrt(np.mean(before**2))


def test_a_list_turned_by_another_scale_gives_the_same_curve():
    given = outline("sd7037")
    fair = fair_outline(given).outline
    points = np.column_stack([given.x, given.y]) * 0.23 + [0.4, -0.1]
    other = fair_outline(outline_from_coordinates("moved", points)).outline
    # The same shape but for the last digits, which the print seems to have more of:
    # the smoothing is found by cross-validation in both.
    np.testing.assert_allclose(other.x, fair.x, atol=1e-8)
    np.testing.assert_allclose(other.y, fair.y, atol=1e-8)


# --- smoothing splines


def _noisy() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    place = np.linspace(0.0, 3.0, 151)
    true = np.sin(2.0 * place)
    scatter = np.random.default_rng(7).normal(scale=0.05, size=151)
    return place, true, true + scatter


def test_the_least_stiff_spline_meets_every_point_and_the_stiffest_is_a_parabola():
    place, _, height = _noisy()
    family = spline_family(place, height, weight=np.ones(151), level_ends=False)
    np.testing.assert_allclose(family.member(0.0)(place), height, atol=1e-10)  # rounding
    parabola = np.polyval(np.polyfit(place, height, 2), place)
    np.testing.assert_allclose(family.member(1e12)(place), parabola, atol=1e-8)  # 1 part in 1e12
    assert family.freedom(0.0) == pytest.approx(151.0)
    assert family.freedom(1e12) == pytest.approx(3.0, abs=1e-6)


@pytest.mark.parametrize("stiffness", [1e-6, 1e-3, 1.0])
def test_a_member_has_the_least_of_misfit_and_bending(stiffness):
    place, _, height = _noisy()
    weight = np.linspace(0.5, 2.0, 151)
    family = spline_family(place, height, weight=weight, level_ends=False)

    def total(curve):
        edges = np.unique(curve.t)
        third = curve(0.5 * (edges[1:] + edges[:-1]), 3)
        misfit = ((weight * (height - curve(place))) ** 2).sum()
        return misfit, misfit + stiffness * (third**2 * np.diff(edges)).sum()

    best = family.member(stiffness)
    misfit, least = total(best)
    # Two ways to the same sums; the third derivative loses six digits in 150 knots.
    assert family.squares(stiffness) == pytest.approx(misfit, rel=1e-8)
    assert family.compromise(stiffness) == pytest.approx(least, rel=1e-6)
    for seed in range(5):
        change = np.random.default_rng(seed).normal(scale=1e-4, size=len(best.c))
        best.c += change
        assert total(best)[1] > least
        best.c -= change


def test_cross_validation_finds_the_curve_under_the_scatter():
    place, true, height = _noisy()
    family = spline_family(place, height, weight=np.ones(151), level_ends=False)
    chosen = chosen_stiffness(family, least_scatter=0.0)
    off = np.sqrt(np.mean((family.member(chosen)(place) - true) ** 2))
    # About 10 numbers from 151 points: 0.05 sqrt(10/151) = 0.013.
    assert off < 0.02


def test_a_known_scatter_is_a_lower_limit_of_the_smoothing():
    place, true, _ = _noisy()
    family = spline_family(place, true, weight=np.ones(151), level_ends=False)
    free = chosen_stiffness(family, least_scatter=0.0)
    held = chosen_stiffness(family, least_scatter=0.01)
    left = np.sqrt(family.squares(held) / (151 - family.freedom(held)))
    assert held > free
    # The stiffnesses tried lie 26 % apart, and the scatter left rises no faster than that.
    assert 0.01 / 1.26 < left <= 0.01


def test_level_ends_have_no_slope():
    place, _, height = _noisy()
    family = spline_family(place, height, weight=np.ones(151), level_ends=True)
    curve = family.member(1e-6)
    np.testing.assert_allclose(curve([place[0], place[-1]], 1), 0.0, atol=1e-9)  # rounding


def test_many_points_share_knots_without_losing_the_curve():
    place = np.linspace(0.0, 3.0, 1500)
    family = spline_family(place, np.sin(2.0 * place), weight=np.ones(1500), level_ends=False)
    assert len(family.knots) <= 250 + 4
    # A cubic over steps of 0.012: (2 x 0.012)^4/384 = 1e-9.
    off = family.member(0.0)(place) - np.sin(2.0 * place)
    assert np.abs(off).max() < 1e-8


# --- curves by length


def test_a_curve_through_a_circle_is_parametrised_by_its_length():
    angle = np.linspace(0.0, 3.0, 25) ** 1.2
    circle = np.column_stack([np.cos(angle), np.sin(angle)])
    curve = spline_by_length(circle)
    # Steps of up to 0.19: interpolation error 0.19^4/384 = 3e-6 in place, ten times that
    # in the last step, and less in length.
    assert curve.x[-1] == pytest.approx(angle[-1], abs=1e-5)
    at = np.linspace(0.0, curve.x[-1], 500)
    np.testing.assert_allclose(np.hypot(*curve(at, 1).T), 1.0, atol=2e-3)
    np.testing.assert_allclose(curve(at)[:, 0], np.cos(at), atol=4e-5)


def test_a_broken_curve_keeps_its_corner():
    there = np.linspace(0.0, 1.0, 6)
    points = np.concatenate(
        [np.column_stack([there, 0.0 * there]), np.column_stack([1.0 + 0.0 * there, there])[1:]]
    )
    curve = broken_curve(points, corners=(5,))
    found = curve(np.array([0.3, 0.95, 1.0, 1.05, 2.0]))
    # Straight pieces: rounding only.
    expected = [[0.3, 0.0], [0.95, 0.0], [1.0, 0.0], [1.0, 0.05], [1.0, 1.0]]
    np.testing.assert_allclose(found, expected, atol=1e-14)
