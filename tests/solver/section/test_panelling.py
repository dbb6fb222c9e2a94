from __future__ import annotations

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.fairing import closed_points
from solver.section.geometry import Outline, cosine_spacing, naca_outline, outline_from_coordinates
from solver.section.panelling import panel_nodes
from tests.published.measured_sections import SECTIONS, outline
from tests.solver.section.outline_cases import (
    crossings,
    cusp_points,
    distances,
    naca_points,
    turns,
)

DIGITS = ["0006", "0012", "2412", "4412", "6409", "23012"]
AROUND = np.linspace(0.0, 2.0 * np.pi, 20001)


@pytest.mark.parametrize("section", SECTIONS)
@pytest.mark.parametrize("nodes", [81, 141, 301])
def test_a_closed_loop_of_as_many_nodes_as_asked(section, nodes):
    laid = panel_nodes(outline(section), nodes=nodes)
    assert laid.x.shape == laid.y.shape == laid.arc.shape == (nodes,)
    assert (laid.x[0], laid.y[0]) == (laid.x[-1], laid.y[-1])
    assert np.sum(laid.x[:-1] * laid.y[1:] - laid.x[1:] * laid.y[:-1]) > 0.0  # upper side first
    assert crossings(laid.x, laid.y) == []


@pytest.mark.parametrize(
    ("digits", "points"),
    # Two foremost points nearly level; camber bent within the nose; a corner at 10 % chord.
    [("43013", 239), ("44019", 243), ("5124", 679), ("9106", 693), ("9706", 41)],
)
def test_unusual_sections_are_laid_without_a_fold(digits, points):
    given = naca_outline(digits, points=points)
    laid = panel_nodes(given)
    assert crossings(laid.x, laid.y) == []
    line = naca_points(digits, AROUND)
    # Where the curve cannot bend as the section does it leaves it by 5e-4 at the most.
    assert distances(np.column_stack([laid.x, laid.y]), line).max() < 6e-4


@pytest.mark.parametrize("section", SECTIONS)
def test_lengths_along_either_surface_are_cosine_spaced(section):
    laid = panel_nodes(outline(section))
    share = cosine_spacing(71)
    upper, lower = laid.arc[70], laid.arc[-1] - laid.arc[70]
    # The definition: rounding only.
    np.testing.assert_allclose(laid.arc[:71] / upper, share, atol=1e-14)
    np.testing.assert_allclose((laid.arc[70:] - upper) / lower, share, atol=1e-14)
    # A chord is shorter than its arc by turn^2/24: 4 % for the sharpest turn, 60 degrees.
    chord = np.hypot(np.diff(laid.x), np.diff(laid.y))
    assert np.all(chord <= np.diff(laid.arc) * (1.0 + 1e-9))
    assert np.all(chord >= 0.95 * np.diff(laid.arc))
    assert np.median(chord / np.diff(laid.arc)) == pytest.approx(1.0, abs=1e-4)


def test_length_along_the_surface_is_that_of_the_outline():
    points = naca_points("4412", AROUND)
    length = np.hypot(*np.diff(points, axis=0).T).sum()
    # The nodes' curve is within 1e-5 of the outline: its length by much less.
    assert panel_nodes(naca_outline("4412")).arc[-1] == pytest.approx(length, abs=1e-5)


@pytest.mark.parametrize("section", SECTIONS)
def test_the_middle_node_is_farthest_from_the_trailing_edge(section):
    laid = panel_nodes(outline(section))
    reach = np.hypot(laid.x - laid.x[0], laid.y - laid.y[0])
    assert np.argmax(reach) == 70
    # The tangent there is square to the chord. The neighbours are unlike in
    # curvature: a third of the difference of the panels' turns shows.
    chord = np.array([laid.x[0] - laid.x[70], laid.y[0] - laid.y[70]])
    across = np.array([laid.x[71] - laid.x[69], laid.y[71] - laid.y[69]])
    sine = across @ chord / (np.hypot(*across) * np.hypot(*chord))
    assert abs(np.degrees(np.arcsin(sine))) < 5.0


@pytest.mark.parametrize("digits", ["0006", "0009", "0012", "0018"])
@pytest.mark.parametrize("decimals", [None, 5, 4])
def test_a_symmetric_section_has_mirrored_nodes(digits, decimals):
    given = naca_outline(digits, points=101)
    if decimals is not None:
        points = np.round(np.column_stack([given.x, given.y]), decimals)
        given = outline_from_coordinates(digits, points)
    laid = panel_nodes(given)
    # The same numbers by another way round: rounding only.
    np.testing.assert_allclose(laid.x, laid.x[::-1], atol=1e-13)
    np.testing.assert_allclose(laid.y, -laid.y[::-1], atol=1e-13)


@pytest.mark.parametrize("section", ["e387", "s1223", "naca2414"])
def test_a_section_upside_down_has_its_nodes_upside_down(section):
    given = outline(section)
    over = Outline("over", given.x[::-1], -given.y[::-1], rounding=given.rounding)
    laid, other = panel_nodes(given), panel_nodes(over)
    # The place of the nose is searched for from either side: to 1e-9 of the chord.
    np.testing.assert_allclose(other.x[::-1], laid.x, atol=1e-7)
    np.testing.assert_allclose(-other.y[::-1], laid.y, atol=1e-7)


@pytest.mark.parametrize("digits", DIGITS)
@pytest.mark.parametrize("points", [161, 2001])
def test_nodes_lie_on_a_section_known_in_closed_form(digits, points):
    laid = panel_nodes(naca_outline(digits, points=points))
    # 161 points leave 2e-6 where the curvature of the camber line jumps, and a line
    # of 20000 steps 1e-8.
    off = distances(np.column_stack([laid.x, laid.y]), naca_points(digits, AROUND))
    assert off.max() < 1e-5


@pytest.mark.parametrize("points", [61, 160])
def test_nodes_lie_on_a_cusp(points):
    given = cusp_points(np.linspace(0.0, 2.0 * np.pi, points + 1))
    laid = panel_nodes(Outline("cusp", given[:, 0], given[:, 1]))
    off = distances(np.column_stack([laid.x, laid.y]), cusp_points(AROUND))
    # 61 points leave 2e-6.
    assert off.max() < 1e-5


def test_an_open_trailing_edge_is_closed_by_a_wedge_along_the_chord():
    given = naca_outline("0012", closed=False)
    gap = given.y[0] - given.y[-1]
    laid = panel_nodes(given)
    assert (laid.x[0], laid.y[0]) == pytest.approx((1.0, 0.0), abs=1e-15)
    around = 0.5 * AROUND
    x = 0.5 * (1.0 + np.cos(around))
    half = (
        5.0
        * 0.12
        * (0.2969 * np.sqrt(x) - 0.126 * x - 0.3516 * x**2 + 0.2843 * x**3 - 0.1015 * x**4)
    )
    wedged = np.column_stack([x, half - 0.5 * gap * x])
    # The published thickness, less the wedge; the smooth curve is within 1e-6 of it.
    assert distances(np.column_stack([laid.x, laid.y])[:71], wedged).max() < 2e-6


@pytest.mark.parametrize("section", SECTIONS)
def test_the_curvature_along_the_nodes_is_smooth(section):
    """By what alternates from node to node in the turn from panel to panel.

    The fourth difference of the turns over sixteen leaves an alternation as it is and
    takes out what is smooth over five nodes. At the nose, where the turn rises to 60
    degrees a panel, smooth is more than five nodes can show: 3 % of chord is left out.
    """
    laid = panel_nodes(outline(section))
    behind = laid.x[3:-3] > 0.03
    alternating = np.abs(np.diff(turns(laid.x, laid.y), 4))[behind] / 16.0
    # A spline through every point leaves 0.02 to 0.5, and 2.0 for the FX 63-137.
    # S1223 curls within the last 3 % of chord, which is its shape.
    assert alternating.max() < (0.2 if section == "s1223" else 0.05)


@pytest.mark.parametrize("decimals", [4, 5, 6])
@pytest.mark.parametrize("points", [61, 101, 301, 999, 1999])
def test_the_print_of_a_list_does_not_make_waves(points, decimals):
    around = np.linspace(0.0, 2.0 * np.pi, 4001)
    fine = naca_points("2414", around)
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(fine, axis=0).T))])
    # Even steps along the surface, closer together at the nose of a short list.
    even = np.linspace(-1.0, 1.0, points)
    share = np.sign(even) * np.abs(even) ** (1.7 if points < 300 else 1.0)
    at = np.interp(0.5 * (1.0 + share) * along[-1], along, around)
    printed = np.round(naca_points("2414", at), decimals)
    printed = np.delete(printed, np.flatnonzero(np.diff(printed[:, 0]) == 0.0), axis=0)
    laid = panel_nodes(outline_from_coordinates("printed", printed))
    true = panel_nodes(naca_outline("2414", points=2001))
    behind = (true.x[1:-1] > 0.05) & (true.x[1:-1] < 0.98)
    off = (turns(laid.x, laid.y) - turns(true.x, true.y))[behind]
    # Turns are up to 1 degree a panel. Four decimals, half a step each way over two
    # panels of 2 % chord: 0.4 degrees if every point were met. 0.1 comes with five
    # decimals and short lists from the jump of curvature at 40 % chord.
    assert np.abs(off).max() < (0.2 if decimals == 4 else 0.1)


@pytest.mark.parametrize("bad", [140, 79, 303, 0, -141])
def test_a_number_of_nodes_out_of_range_is_named(bad):
    with pytest.raises(InputError, match="nodes must be odd and between 81 and 301") as caught:
        panel_nodes(naca_outline("0012"), nodes=bad)
    assert caught.value.name == "nodes"


def _squeezed(offset: float, start: float) -> Outline:
    """NACA 0012 whose surfaces come to a distance `offset` (negative: crossed) behind `start`."""
    given = naca_outline("0012", points=161)
    x, y = given.x, given.y.copy()
    rear = (x > start) & (x < 1.0)
    y[rear] = np.sign(y[rear]) * 0.5 * offset
    y[[0, -1]] = 0.0
    return Outline("squeezed", x, y)


@pytest.mark.parametrize(("offset", "start"), [(-2e-3, 0.9), (0.0, 0.8), (-2e-4, 0.95)])
def test_surfaces_without_room_between_them_are_refused_with_the_place(offset, start):
    with pytest.raises(
        InputError, match=r"a thickness of -?\d\.\d+ % of chord at x = [89]"
    ) as caught:
        panel_nodes(_squeezed(offset, start))
    assert caught.value.name == "coordinates"


def test_surfaces_crossed_by_less_than_the_print_can_tell_are_parted():
    around = np.linspace(0.0, 2.0 * np.pi, 82)
    points = np.round(cusp_points(around, thick=0.05), 4)
    points[[0, -1]] = points[[0, -1]].mean(axis=0)
    laid = panel_nodes(outline_from_coordinates("cusp", points))
    assert crossings(laid.x, laid.y) == []
    away = np.hypot(laid.x - laid.x[0], laid.y - laid.y[0])
    apart = np.hypot(laid.x - laid.x[::-1], laid.y - laid.y[::-1])
    # 0.1 degrees at the least, measured from node to node.
    assert np.all(apart[1:50] > 0.00199 * np.minimum(away[1:50], 0.05))


def test_an_outline_that_folds_is_refused_with_the_place():
    given = naca_outline("0012")
    x = given.x.copy()
    x[30] = x[28]
    with pytest.raises(InputError, match=r"folds over itself at 7\d\.\d % of chord") as caught:
        panel_nodes(Outline("folded", x, given.y))
    assert caught.value.name == "coordinates"


@pytest.mark.parametrize(
    ("height", "words"),
    [(0.65, r"an upper surface 1\.\d\d times as long"), (2.0, r"farthest from .* at x = \d\d\.")],
)
def test_what_has_its_leading_edge_in_no_usual_place_is_refused(height, words):
    given = naca_outline("0012", points=201)
    hump = np.where(given.y > 0.0, height * np.sin(np.pi * given.x) ** 2, 0.0)
    with pytest.raises(InputError, match=words) as caught:
        panel_nodes(Outline("humped", given.x, given.y + hump))
    assert caught.value.name == "coordinates"


def test_closing_leaves_a_closed_outline_alone():
    given = naca_outline("2412")
    np.testing.assert_array_equal(closed_points(given), np.column_stack([given.x, given.y]))
