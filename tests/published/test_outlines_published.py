"""Outlines of twelve published sections: read whole, refused when a point is missing."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.geometry import (
    leading_edge_radius,
    max_camber,
    max_thickness,
    outline_from_coordinates,
)

pytestmark = pytest.mark.published
FILES = sorted((Path(__file__).parent / "data" / "sections").glob("*/coordinates.csv"))


def _points(file: Path) -> np.ndarray:
    lines = [line for line in file.read_text().splitlines() if line[0] not in "#x"]
    return np.loadtxt(lines, delimiter=",")


def test_all_twelve_sections_are_there():
    assert len(FILES) == 12


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.parent.name)
def test_a_published_list_is_taken_whole(file):
    outline = outline_from_coordinates(file.parent.name, _points(file))
    assert not outline.turned_round
    # The published chord is 1; the foremost point found by a curve through the
    # list moves it by less than the spacing of the points at the nose, squared
    # over the radius: 5e-4 covers all twelve.
    assert np.abs(outline.x - _points(file)[:, 0]).max() < 5e-4


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.parent.name)
@pytest.mark.parametrize("lacking", ["first", "last"])
@pytest.mark.parametrize("order", ["upper first", "lower first"])
def test_a_list_lacking_one_trailing_edge_point_never_passes(file, lacking, order):
    points = _points(file) if order == "upper first" else _points(file)[::-1]
    cut = points[1:] if lacking == "first" else points[:-1]
    with pytest.raises(InputError, match=r"coordinates must be closed.*point \d+") as caught:
        outline_from_coordinates(file.parent.name, cut)
    assert caught.value.name == "coordinates"


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.parent.name)
def test_a_list_that_begins_along_the_lower_surface_is_turned_round(file):
    given = outline_from_coordinates("given", _points(file))
    other = outline_from_coordinates("other", _points(file)[::-1])
    assert other.turned_round
    # The same numbers in another order: rounding only.
    np.testing.assert_allclose(other.x, given.x, atol=1e-13)
    np.testing.assert_allclose(other.y, given.y, atol=1e-13)


@pytest.mark.parametrize(
    ("name", "thickness", "camber"),
    [("naca0009", 0.09, 0.0), ("naca2414", 0.14, 0.02), ("naca6409", 0.09, 0.06)],
)
def test_published_lists_of_naca_sections_have_the_size_their_digits_say(name, thickness, camber):
    file = next(file for file in FILES if file.parent.name == name)
    outline = outline_from_coordinates(name, _points(file))
    # The lists carry five decimals and about 60 points; NACA 0009 was published
    # from another set of ordinates, 0.2 % of its chord thicker.
    assert max_thickness(outline).value == pytest.approx(thickness, abs=3e-4)
    assert max_camber(outline).value == pytest.approx(camber, abs=1e-4)


@pytest.mark.parametrize("name", ["naca2414", "naca6409"])
def test_the_nose_of_published_lists_has_the_published_radius(name):
    file = next(file for file in FILES if file.parent.name == name)
    outline = outline_from_coordinates(name, _points(file))
    # NACA Report 460: 1.1019 t^2. A list of 61 points with five decimals: 2 %.
    expected = 1.1019 * (int(name[-2:]) / 100.0) ** 2
    assert leading_edge_radius(outline) == pytest.approx(expected, rel=0.02)
