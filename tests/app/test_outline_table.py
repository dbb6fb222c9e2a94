"""Outlines in: the arrangements that people keep, and the reason where one is refused."""

from __future__ import annotations

from itertools import count

import numpy as np
import pytest

from app import outline_table
from app.outline_table import read_outline
from app.table_text import TableError, TableText
from solver.section.geometry import naca_outline, outline_from_coordinates

ROUND = np.column_stack([naca_outline("2412", points=61).x, naca_outline("2412", points=61).y])
UPPER, LOWER = ROUND[30::-1], ROUND[30:]
"""Both from the leading edge, which they share."""


def text_of(points, *, separator=" ", point=".", chord=1.0) -> str:
    """Points as a list with six decimals."""
    rows = (separator.join(f"{chord * v:.6f}".replace(".", point) for v in row) for row in points)
    return "".join(f"{row}\n" for row in rows)


def read(text: str):
    return read_outline(TableText("my section.dat", text))


@pytest.mark.parametrize(
    ("text", "name"),
    [
        (text_of(ROUND), "my section"),
        (text_of(ROUND, separator=","), "my section"),
        (text_of(ROUND, separator="\t"), "my section"),
        (text_of(ROUND, separator=" , "), "my section"),
        (text_of(ROUND, separator="   ", point=","), "my section"),
        (text_of(ROUND, separator="; ", point=","), "my section"),
        (text_of(ROUND, separator="\t", point=","), "my section"),
        ("x y\n" + text_of(ROUND), "my section"),
        ("X/c,Y/c\n" + text_of(ROUND, separator=","), "my section"),
        ("x, y\n" + text_of(ROUND), "my section"),
        ("Y;X\n" + text_of(ROUND[:, ::-1], separator=";"), "my section"),
        ("x (mm) y (mm)\n" + text_of(ROUND), "my section"),
        ("NACA 2412\n" + text_of(ROUND), "NACA 2412"),
        ("Clark Y\n" + text_of(ROUND), "Clark Y"),
        (
            "S 1 2,5 % camber; 12.5 % thick\nx,y\n" + text_of(ROUND),
            "S 1 2,5 % camber; 12.5 % thick",
        ),
        ("Title, of two\nlines\n\n" + text_of(ROUND, separator=","), "Title, of two"),
        ("Title\n# name: said\n" + text_of(ROUND), "said"),
        ("61\n" + text_of(ROUND), "my section"),
        ("  Title\t 2 \n" + text_of(ROUND) + "\x1a", "Title 2"),
        (text_of(ROUND).replace("\n", " \r\n"), "my section"),
    ],
    ids=count(),
)
def test_lists_once_round_come_as_they_stand(text, name):
    found = read(text)
    assert found.name == name
    # Six decimals were written.
    assert found.coordinates == pytest.approx(ROUND, abs=0.5e-6)
    lines = text.splitlines()
    for line, x in ((found.lines[0], "1"), (found.lines[60], "1"), (found.lines[30], "0")):
        assert x in lines[line - 1]
    assert np.diff(found.lines).tolist() == [1] * 60


@pytest.mark.parametrize(
    "text",
    [
        text_of(UPPER) + text_of(LOWER),
        "Title\n" + text_of(UPPER) + "\n" + text_of(LOWER),
        "Title\n31 31\n" + text_of(UPPER) + text_of(LOWER),
        "Title 2\n  31.   31.\n\n" + text_of(UPPER) + "\n" + text_of(LOWER) + "\n",
        "x y\n31 31\n" + text_of(UPPER) + "\n" + text_of(LOWER),
        "Title\nUpper surface\n" + text_of(UPPER) + "Lower surface:\n" + text_of(LOWER),
        "Title\n" + text_of(UPPER[::-1]) + "\n" + text_of(LOWER),
    ],
    ids=count(),
)
def test_two_surfaces_are_joined_at_the_leading_edge(text):
    found = read(text)
    assert found.coordinates == pytest.approx(ROUND, abs=0.5e-6)
    lines = text.splitlines()
    for line, point in zip(found.lines, found.coordinates, strict=True):
        assert [float(field) for field in lines[line - 1].split()] == point.tolist()


def test_the_lower_surface_may_come_first():
    found = read(text_of(LOWER) + "\n" + text_of(UPPER))
    outline = outline_from_coordinates(found.name, found.coordinates)
    other = outline_from_coordinates("as it was", ROUND)
    assert outline.turned_round
    assert outline.y == pytest.approx(other.y, abs=2e-6)  # six decimals, normalised


def test_surfaces_that_share_no_point_keep_theirs():
    found = read(text_of(UPPER) + "\n" + text_of(LOWER[1:]))
    assert found.coordinates == pytest.approx(ROUND, abs=0.5e-6)


def test_any_unit_of_length_will_do_with_counts_too():
    text = "31 31\n" + text_of(UPPER, chord=180.0) + text_of(LOWER, chord=180.0)
    assert read(text).coordinates == pytest.approx(180.0 * ROUND, abs=0.5e-6)


def test_columns_are_found_among_others():
    rows = text_of(ROUND, separator=";").splitlines()
    text = "Title\nside;x;y\n" + "".join(f"a;{row}\n" for row in rows)
    found = read(text)
    assert (found.name, found.lines[0]) == ("Title", 3)
    assert found.coordinates == pytest.approx(ROUND, abs=0.5e-6)


def test_a_title_becomes_a_name_of_one_short_line():
    assert read("a\tb\x7f c" + " long" * 40 + "\n" + text_of(ROUND)).name.startswith("a b c long")
    assert len(read("long " * 40 + "\n" + text_of(ROUND)).name) == outline_table.LONGEST_NAME


def test_the_name_of_the_caller_stands_in_for_that_of_the_file():
    found = read_outline(TableText("my section.dat", text_of(ROUND)), unnamed="E387")
    assert found.name == "E387"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("only words\n", "has no points"),
        ("x y\n", "has no points"),
        ("y;x\nno;points\n", "has 0 points; an outline has three or more"),
        ("1 0\n0 0\n", "has 2 points; an outline has three or more"),
        (text_of(np.repeat(ROUND, 40, axis=0)), "has 2440 points; an outline may have 2000"),
        (text_of(ROUND[:, [0, 1, 1]]), "line 1: has no columns x and y"),
        ("x y\n1.0 nan\n" + text_of(ROUND), "line 2, column 'y': must be a finite number"),
        ("1.0 O.0\n" + text_of(ROUND), "line 1, column 'y': must be a finite number; got 'O.0'"),
        (text_of(ROUND) + "1e999 0\n", "line 62, column 'x': must be a finite number"),
        (text_of(ROUND) + "1 0 0\n", "line 62: is not a point, two numbers x and y"),
        (text_of(ROUND) + "from page 12\n", "line 62: is not a point"),
        (text_of(ROUND) + "the end\n", "line 62: has words among the points"),
        (
            text_of(UPPER) + text_of(LOWER[:9]) + "words\n" + text_of(LOWER[9:]),
            "line 41: has words among the points",
        ),
        (text_of(UPPER), "line 31: ends at the trailing edge after one surface"),
        (text_of(UPPER) + text_of(LOWER[::-1]), "line 1: begins at the leading edge and runs"),
        (text_of(UPPER[::-1]) + text_of(LOWER[::-1]), "line 32: goes back to the trailing edge"),
        (
            text_of(UPPER) + text_of(LOWER) + text_of(UPPER),
            "line 63: has 3 runs that begin at the leading edge (lines 1, 32, 63)",
        ),
        ("T\n30 31\n" + text_of(UPPER) + text_of(LOWER), "line 2: announces 30 and 31 points; 62"),
        (
            "T\n30 32\n" + text_of(UPPER) + text_of(LOWER),
            "line 34: begins its second surface after",
        ),
    ],
    ids=count(),
)
def test_what_is_no_outline_is_refused_with_reason_and_line(text, said):
    with pytest.raises(TableError) as caught:
        read(text)
    assert str(caught.value).startswith("my section.dat")
    assert said in str(caught.value)


def test_a_loop_without_a_gap_keeps_a_point_given_twice_for_the_solver_to_refuse():
    text = text_of(UPPER[::-1]) + text_of(LOWER)
    assert len(read(text).coordinates) == 62
