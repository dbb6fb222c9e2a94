"""Section outlines in: a list of points as people keep it, whatever stands above it.

Two columns, x and y, in any unit of length, with or without titles, headings and
comments. The points run once round the section from the trailing edge, or along both
surfaces from the leading edge; the second arrangement is joined to the first.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from app.table_text import NUMBER, TableError, TableText, read_table, read_table_text

FloatArray = NDArray[np.float64]

MOST_OUTLINE_POINTS = 2000
LONGEST_NAME = 60

HALF = 0.5
"""Of the extent in x: what starts below it starts at the leading edge, and a step over
more than it goes from one edge to the other."""

SAME_POINT = 1e-6
"""Distance over the extent in x below which two leading-edge points are one."""

FEWEST_COUNTED = 5
"""Whole numbers from here on, in the first row, may be counts of points."""


@dataclass(frozen=True, eq=False)
class OutlineTable:
    """The outline of a section as a file gives it.

    Fields
    ------
    name : str
        What the section is called.
    coordinates : ndarray, shape (n, 2)
        Once round the section, in the unit of the file.
    lines : tuple of int
        Where each point stands in the file, counted from 1.
    """

    name: str
    coordinates: FloatArray
    lines: tuple[int, ...]


@dataclass(frozen=True)
class _Line:
    """A line with something on it: its number from 1, its text, whether a gap precedes it."""

    number: int
    text: str
    after_gap: bool


def read_outline(path: str | Path | TableText, *, unnamed: str | None = None) -> OutlineTable:
    """Read the outline of a section.

    Parameters
    ----------
    path : str or pathlib.Path or TableText
        A text of two columns separated by commas, semicolons, tabs or spaces, or of
        more whose headings say which are x and y. Lines of words above the points are
        titles; a line ``# name: ...``, or else the first title, names the section.
    unnamed : str, optional
        The name where the table gives none; that of the file unless given.

    Returns
    -------
    OutlineTable
        Both surfaces listed from the leading edge are joined there.

    Raises
    ------
    TableError
        If anything in the file cannot be used. Whether the outline is closed and
        sound is for its geometry to say.
    """
    source = path if isinstance(path, TableText) else read_table_text(path)
    lines = _lines(source.text)
    separator = _separator(lines)
    head, body = _head_and_body(source.file, lines, separator)
    words = _words(head[-1].text) if head else []
    headed = {"x", "y"} <= set(words)
    if len(_fields(body[0].text, separator)) == 2 and not _lacks_a_column(words):
        points, rows, breaks = _pairs(source.file, body, separator)
        if headed and words.index("y") < words.index("x"):
            points = points[:, ::-1]
    else:
        points, rows, breaks = _columns(source, head)
    if len(points) > MOST_OUTLINE_POINTS:
        raise TableError(
            source.file, f"has {len(points)} points; an outline may have {MOST_OUTLINE_POINTS}"
        )
    points, rows = _arranged(source.file, points, rows, breaks)
    titles = head[:-1] if headed else head
    return OutlineTable(
        _name(source, titles) or unnamed or Path(source.file).stem, points, tuple(rows)
    )


def _lines(text: str) -> list[_Line]:
    """Lines that are neither blank nor comments."""
    found, gap = [], False
    for number, line in enumerate(text.splitlines(), start=1):
        kept = line.strip().strip("\x1a")  # old systems end a text with it
        if not kept:
            gap = True
        elif not kept.startswith("#"):
            found.append(_Line(number, kept, gap))
            gap = False
    return found


def _separator(lines: Sequence[_Line]) -> str | None:
    """The separator that makes numbers of most lines; None for runs of white space."""

    def rows(separator: str | None) -> int:
        return sum(len(_numbers(one.text, separator)) > 1 for one in lines)

    return max((";", ",", None), key=rows)


def _head_and_body(
    file: str, lines: Sequence[_Line], separator: str | None
) -> tuple[Sequence[_Line], Sequence[_Line]]:
    """Titles and headings, and what begins with the first point or under the headings."""
    for index, line in enumerate(lines):
        fields = _fields(line.text, separator)
        if len(_numbers(line.text, separator)) > 1:
            return lines[:index], lines[index:]
        if {"x", "y"} <= set(_words(line.text)) and index + 1 < len(lines):
            return lines[: index + 1], lines[index + 1 :]
        if len(fields) == 2 and "." in fields[0] and _number(fields[0], separator) is not None:
            raise _no_pair(file, line, separator)  # a point with a slip, not a title
    raise TableError(file, "has no points; an outline has two columns of numbers, x and y")


def _fields(text: str, separator: str | None) -> list[str]:
    kept = text if separator is None else text.removesuffix(separator)
    return [field.strip() for field in kept.split(separator)]


def _number(field: str, separator: str | None) -> float | None:
    plain = field if separator == "," else field.replace(",", ".")
    value = float(plain) if NUMBER.fullmatch(plain) else math.nan
    return value if math.isfinite(value) else None


def _numbers(text: str, separator: str | None) -> list[float]:
    """All fields of a line as numbers; none where one of them is not."""
    numbers = [_number(field, separator) for field in _fields(text, separator)]
    found = [number for number in numbers if number is not None]
    return found if len(found) == len(numbers) else []


def _words(line: str) -> list[str]:
    """Headings in a line, lower case, without units and signs; a title gives its words."""
    separator = next((one for one in (";", "\t", ",") if one in line), None)
    heads = [field.lower().split("/")[0] for field in line.split(separator)]
    return [re.sub(r"[^a-z0-9]", "", head) for head in heads]


def _lacks_a_column(words: Sequence[str]) -> bool:
    """Whether the line above the points is one of headings, without one for y."""
    return "x" in words and "y" not in words and all(re.fullmatch("[a-z]{1,2}", w) for w in words)


def _pairs(
    file: str, body: Sequence[_Line], separator: str | None
) -> tuple[FloatArray, list[int], dict[int, int | None]]:
    """Points, their lines, and where the list is broken by a gap (None) or by words (their line).

    Breaks are keyed by the number of points before them.
    """
    points: list[list[float]] = []
    rows: list[int] = []
    breaks: dict[int, int | None] = {}
    for line in body:
        numbers = _numbers(line.text, separator)
        if line.after_gap:
            breaks.setdefault(len(points), None)
        if len(numbers) == 2:
            points.append(numbers)
            rows.append(line.number)
        elif re.search("[a-z]", line.text, re.I) and not re.search(r"\d|nan|inf", line.text, re.I):
            breaks[len(points)] = line.number
        else:
            raise _no_pair(file, line, separator)
    return np.array(points, dtype=np.float64).reshape(-1, 2), rows, breaks


def _no_pair(file: str, line: _Line, separator: str | None) -> TableError:
    fields = _fields(line.text, separator)
    if len(fields) != 2:
        return TableError(
            file,
            "is not a point, two numbers x and y (comments begin with #)",
            line=line.number,
            value=line.text,
        )
    wrong = next(i for i, field in enumerate(fields) if _number(field, separator) is None)
    return TableError(
        file, "must be a finite number", line=line.number, column="xy"[wrong], value=fields[wrong]
    )


def _columns(
    source: TableText, head: Sequence[_Line]
) -> tuple[FloatArray, list[int], dict[int, int | None]]:
    """As `_pairs`, of a table whose headings say which columns are x and y."""
    lines = source.text.splitlines()
    for title in head[:-1]:
        lines[title.number - 1] = ""
    table = read_table(TableText(source.file, "\n".join(lines)))
    words = _words(";".join(table.headings))
    if not head or not {"x", "y"} <= set(words):
        headings = ", ".join(table.headings) if head else "none"
        raise TableError(
            table.file,
            f"has no columns x and y; its headings are {headings}",
            line=table.heading_line,
        )
    places = [words.index(axis) for axis in "xy"]
    points = [
        [table.number(row, place, axis) for place, axis in zip(places, "xy", strict=True)]
        for row in table.rows
    ]
    return np.array(points, dtype=np.float64), [row.line for row in table.rows], {}


def _name(source: TableText, titles: Sequence[_Line]) -> str:
    """What the text calls its section; empty where it does not."""
    comments = (line.strip()[1:].strip() for line in source.text.splitlines() if _is_note(line))
    said = next((one[5:] for one in comments if one.lower().startswith("name:")), "")
    title = next((one.text for one in titles if re.search("[a-z]", one.text, re.I)), "")
    shown = "".join(c if c.isprintable() else " " for c in said.strip() or title)
    return " ".join(shown.split())[:LONGEST_NAME]


def _is_note(line: str) -> bool:
    return line.lstrip().startswith("#")


def _arranged(
    file: str, points: FloatArray, rows: list[int], breaks: dict[int, int | None]
) -> tuple[FloatArray, list[int]]:
    """The points once round the section; refused where they do not run so."""
    counts = _counts(file, points, rows) if len(points) > 1 else None
    if counts is not None:
        points, rows = points[1:], rows[1:]
        breaks = {place - 1: line for place, line in breaks.items() if place > 1}
    if len(points) < 3:
        raise TableError(file, f"has {len(points)} points; an outline has three or more")
    x = points[:, 0]
    size = float(np.ptp(x))
    if x[0] - x.min() >= HALF * size:
        joint = _joint_at_nose(x, breaks)
        _refuse_second_start(file, x, rows)
        joined, order = points, np.arange(len(points))
    else:
        joint = _second_surface(file, x, rows)
        order = np.concatenate([np.arange(joint)[::-1], np.arange(joint, len(points))])
        joined = points[order]
    _refuse_words(file, breaks, joint)
    if counts is not None and joint is not None and counts[0] != joint:
        raise TableError(
            file,
            f"begins its second surface after {joint} points; the counts above say {counts[0]}",
            line=rows[joint],
        )
    if joint is not None and np.hypot(*(joined[joint] - joined[joint - 1])) <= SAME_POINT * size:
        order = np.delete(order, joint)
    return points[order], [rows[at] for at in order]


def _counts(file: str, points: FloatArray, rows: Sequence[int]) -> tuple[int, int] | None:
    """How many points the two surfaces have, where the first row says it."""
    first, others = points[0], points[1:]
    whole = bool(np.all(first == np.round(first)) and np.all(first >= FEWEST_COUNTED))
    if not whole:
        return None
    upper, lower = int(first[0]), int(first[1])
    if upper + lower == len(others):
        return upper, lower
    # No section has its trailing edge so high: these cannot be coordinates.
    if first[1] > HALF * np.ptp(others[:, 0]):
        raise TableError(
            file,
            f"announces {upper} and {lower} points; {len(others)} follow",
            line=rows[0],
        )
    return None


def _second_surface(file: str, x: FloatArray, rows: Sequence[int]) -> int:
    """Where the second surface begins in a list that begins at the leading edge."""
    size = float(np.ptp(x))
    starts = np.flatnonzero(np.diff(x) < -HALF * size) + 1
    if starts.size == 1:
        return int(starts[0])
    if starts.size > 1:
        lines = ", ".join(str(rows[at]) for at in (0, *starts))
        raise TableError(
            file,
            f"has {starts.size + 1} runs that begin at the leading edge (lines {lines}); "
            "a section has two surfaces",
            line=rows[int(starts[1])],
        )
    if x[-1] - x.min() >= HALF * size:
        raise TableError(
            file,
            "ends at the trailing edge after one surface; the other one is missing",
            line=rows[-1],
        )
    raise TableError(
        file,
        "begins at the leading edge and runs round the trailing edge; an outline runs from the "
        "trailing edge once round, or along both surfaces from the leading edge",
        line=rows[0],
    )


def _refuse_second_start(file: str, x: FloatArray, rows: Sequence[int]) -> None:
    half = x.min() + HALF * np.ptp(x)
    starts = np.flatnonzero(np.diff(x) > HALF * np.ptp(x)) + 1
    if starts.size and x[starts[0] :].min() < half:
        raise TableError(
            file,
            "goes back to the trailing edge in one step; an outline runs from the trailing edge "
            "once round, or along both surfaces from the leading edge",
            line=rows[int(starts[0])],
        )


def _joint_at_nose(x: FloatArray, breaks: dict[int, int | None]) -> int | None:
    """Where a list once round is broken at its leading edge, if it is."""
    near = x - x.min() <= HALF * np.ptp(x)
    inside = [place for place in breaks if 0 < place < len(x) and near[place]]
    return inside[0] if len(inside) == 1 else None


def _refuse_words(file: str, breaks: dict[int, int | None], joint: int | None) -> None:
    """Refuse words among the points, save where one surface ends and the next begins."""
    for place, line in breaks.items():
        if line is not None and place not in (0, joint):
            raise TableError(
                file,
                "has words among the points; only titles above them and comments that begin "
                "with # are passed over",
                line=line,
            )
