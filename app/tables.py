"""Measured tables in: runs of a wind tunnel and section outlines, from CSV.

Columns come in any order and in the usual units. Headings are recognised where
they are usual ones; otherwise the caller says which column is what. Whatever cannot
be used raises :class:`TableError`, whose one sentence names the file, the line, the
column, the value and what is allowed.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from app.outline_table import read_outline
from app.table_text import Row, Table, TableError, TableText, read_table
from solver.errors import InputError
from solver.section.sweeps import SAME_REYNOLDS, Sweep

FloatArray = NDArray[np.float64]

HEADINGS: Mapping[str, tuple[str, ...]] = {
    "reynolds": ("re", "reynolds", "reynoldsnumber", "rey"),
    "angle": ("alpha", "angle", "angleofattack", "aoa", "incidence", "a"),
    "lift": ("cl", "lift", "liftcoefficient"),
    "drag": ("cd", "drag", "dragcoefficient"),
    "moment": ("cm", "cmc4", "cm25", "cm025", "moment", "momentcoefficient"),
    "sweep": ("sweep", "direction"),
}
"""Headings by quantity, lower case, without units and signs."""

ANGLE_UNITS = {"deg": np.pi / 180.0, "rad": 1.0}
REYNOLDS_UNITS = {"1": 1.0, "1e3": 1e3, "1e6": 1e6}

UNIT_WORDS: Mapping[str, str] = {
    "deg": "deg",
    "degree": "deg",
    "degrees": "deg",
    "°": "deg",
    "rad": "rad",
    "radian": "rad",
    "radians": "rad",
    "1": "1",
    "-": "1",
    "1e3": "1e3",
    "10^3": "1e3",
    "1000": "1e3",
    "k": "1e3",
    "thousand": "1e3",
    "1e6": "1e6",
    "10^6": "1e6",
    "1000000": "1e6",
    "m": "1e6",
    "million": "1e6",
}

RANGES: Mapping[str, tuple[float, float]] = {
    "reynolds": (1e3, 1e8),
    "angle": (-np.pi, np.pi),
    "lift": (-5.0, 5.0),
    "drag": (0.0, 5.0),
    "moment": (-3.0, 3.0),
}
"""What a table may hold, after units."""

RISING = {"up": True, "rising": True, "increasing": True, "1": True}
FALLING = {"down": False, "falling": False, "decreasing": False, "-1": False}
DIRECTIONS = {**RISING, **FALLING}

STATUS, MISSING = "status", "missing"
"""Heading of how a computed point ended, and what it says where there is no point."""


@dataclass(frozen=True)
class _Column:
    """One column of a table: where it is and what its numbers are multiplied with."""

    index: int
    heading: str
    scale: float | None


def read_lift_table(
    path: str | Path | TableText,
    columns: Mapping[str, str] | None = None,
    units: Mapping[str, str] | None = None,
) -> list[Sweep]:
    """Read lift runs.

    Parameters
    ----------
    path : str or pathlib.Path or TableText
        A CSV file of at most 8 MB with columns for Reynolds number, angle and lift,
        and where measured for moment, drag and the direction of the sweep.
    columns : mapping of str to str, optional
        Heading by quantity (``reynolds``, ``angle``, ``lift``, ``drag``, ``moment``,
        ``sweep``), for headings that are not usual ones.
    units : mapping of str to str, optional
        ``angle``: ``deg`` or ``rad``; ``reynolds``: ``1``, ``1e3`` or ``1e6``. By
        default what the heading says; else degrees, and the power of ten that makes
        Reynolds numbers of a drone.

    Returns
    -------
    list of Sweep
        One for each Reynolds number and direction, in the order of the file; rising
        where no direction is given. A lone reading joins the nearest run within 3 %.

    Raises
    ------
    TableError
        If anything in the file cannot be used.
    """
    return _read_runs(path, ("reynolds", "angle", "lift"), columns, units)


def read_drag_table(
    path: str | Path | TableText,
    columns: Mapping[str, str] | None = None,
    units: Mapping[str, str] | None = None,
) -> list[Sweep]:
    """Read drag runs.

    Parameters
    ----------
    path : str or pathlib.Path or TableText
        As for :func:`read_lift_table`, with a column for drag.
    columns, units : mapping of str to str, optional
        As for :func:`read_lift_table`.

    Returns
    -------
    list of Sweep
        As from :func:`read_lift_table`.

    Raises
    ------
    TableError
        If anything in the file cannot be used.
    """
    return _read_runs(path, ("reynolds", "angle", "lift", "drag"), columns, units)


def table_source(path: str | Path | TableText) -> str:
    """Read the comment lines of a table: where its numbers come from.

    Parameters
    ----------
    path : str or pathlib.Path or TableText

    Returns
    -------
    str
        The lines that begin with ``#``, without it, joined by line breaks.

    Raises
    ------
    TableError
        If the file cannot be read.
    """
    return "\n".join(read_table(path).comments)


def read_outline_table(
    path: str | Path | TableText, *, unnamed: str | None = None
) -> tuple[str, FloatArray]:
    """Read the outline of a section.

    Parameters
    ----------
    path : str or pathlib.Path or TableText
        A text of two columns, x and y, as :func:`app.outline_table.read_outline` takes it.
    unnamed : str, optional
        The name where the table gives none; that of the file unless given.

    Returns
    -------
    name : str
    coordinates : ndarray, shape (n, 2)
        Once round the section, in the unit of the file.

    Raises
    ------
    TableError
        If anything in the file cannot be used. Whether the outline is closed and
        sound is for its geometry to say.
    """
    found = read_outline(path, unnamed=unnamed)
    return found.name, found.coordinates


def _read_runs(
    path: str | Path | TableText,
    needed: Sequence[str],
    columns: Mapping[str, str] | None,
    units: Mapping[str, str] | None,
) -> list[Sweep]:
    table = _without_missing(read_table(path))
    found = _find_columns(table, columns or {}, units or {})
    for quantity in needed:
        if quantity not in found:
            usual = ", ".join(HEADINGS[quantity][:2])
            raise TableError(
                table.file,
                f"has no column for {quantity} (usual headings: {usual}); its headings are "
                f"{', '.join(table.headings)}",
                line=table.heading_line,
            )
    values = {
        quantity: _numbers(table, quantity, column)
        for quantity, column in found.items()
        if quantity != "sweep"
    }
    rising = [_direction(table, row, found.get("sweep")) for row in table.rows]
    return _runs(table, values, rising)


def _without_missing(table: Table) -> Table:
    """Leave out the points that a computation says it did not find."""
    if STATUS not in table.headings:
        return table
    place = table.headings.index(STATUS)
    rows = tuple(row for row in table.rows if row.fields[place] != MISSING)
    if not rows:
        raise TableError(table.file, f"has no rows but those whose {STATUS} is {MISSING}")
    return replace(table, rows=rows)


def _find_columns(
    table: Table, columns: Mapping[str, str], units: Mapping[str, str]
) -> dict[str, _Column]:
    for given, known in ((columns, HEADINGS), (units, ("angle", "reynolds"))):
        for quantity in given:
            if quantity not in known:
                raise TableError(
                    table.file, f"has no quantity {quantity!r}; allowed are {', '.join(known)}"
                )
    found: dict[str, _Column] = {}
    for index, heading in enumerate(table.headings):
        named = [quantity for quantity, text in columns.items() if text.strip() == heading]
        word, unit = _split_heading(heading)
        usual = [
            quantity
            for quantity, words in HEADINGS.items()
            if word in words and quantity not in columns
        ]
        for quantity in named or usual:
            if quantity in found:
                raise TableError(
                    table.file,
                    f"has two columns for {quantity}, {found[quantity].heading!r} and {heading!r}",
                    line=table.heading_line,
                )
            scale = _scale(table, quantity, heading, units.get(quantity, unit))
            found[quantity] = _Column(index, heading, scale)
    for quantity, text in columns.items():
        if quantity not in found:
            raise TableError(
                table.file,
                f"has no column {text!r}; its headings are {', '.join(table.headings)}",
                line=table.heading_line,
            )
    return found


def _split_heading(heading: str) -> tuple[str, str]:
    """Word and unit of a heading such as ``alpha_deg``, ``Re (1e6)`` or ``Re/1000``."""
    text = heading.strip().lower()
    match = re.fullmatch(r"(.+?)\s*(?:\(([^)]*)\)|\[([^\]]*)\]|/\s*([0-9^e]+))", text)
    unit = ""
    if match:
        text, unit = match.group(1), next(g for g in match.groups()[1:] if g is not None).strip()
    else:
        stem, _, last = text.rpartition("_")
        if stem and last in UNIT_WORDS:
            text, unit = stem, last
    return re.sub(r"[^a-z0-9]", "", text), unit


def _scale(table: Table, quantity: str, heading: str, unit: str) -> float | None:
    """Factor of a column's numbers; None where it is to be found from them."""
    if quantity not in ("angle", "reynolds"):
        return 1.0
    known = ANGLE_UNITS if quantity == "angle" else REYNOLDS_UNITS
    if not unit:
        return ANGLE_UNITS["deg"] if quantity == "angle" else None
    scale = known.get(UNIT_WORDS.get(unit.lower(), ""))
    if scale is None:
        raise TableError(
            table.file,
            f"has {quantity} in {unit!r}; allowed are {', '.join(known)}",
            line=table.heading_line,
            column=heading,
        )
    return scale


def _numbers(table: Table, quantity: str, column: _Column) -> FloatArray:
    raw = np.array([table.number(row, column.index, column.heading) for row in table.rows])
    scale = column.scale
    if scale is None:
        largest = float(np.max(np.abs(raw), initial=0.0))
        scale = 1e6 if largest < 20.0 else 1e3 if largest < 5000.0 else 1.0
    values = np.asarray(raw * scale, dtype=np.float64)
    low, high = RANGES[quantity]
    wrong = ~((values >= low) & (values <= high))
    if quantity == "drag":
        wrong |= values <= 0.0
    if wrong.any():
        first = int(np.argmax(wrong))
        bounds = f"between {low / scale:.4g} and {high / scale:.4g}"
        raise TableError(
            table.file,
            f"must be {'above 0 and at most 5' if quantity == 'drag' else bounds}",
            line=table.rows[first].line,
            column=column.heading,
            value=table.rows[first].fields[column.index],
        )
    return values


def _direction(table: Table, row: Row, column: _Column | None) -> bool:
    if column is None:
        return True
    text = row.fields[column.index].lower()
    if text not in DIRECTIONS:
        raise TableError(
            table.file,
            f"must be one of {', '.join(DIRECTIONS)}",
            line=row.line,
            column=column.heading,
            value=row.fields[column.index],
        )
    return DIRECTIONS[text]


def _runs(table: Table, values: Mapping[str, FloatArray], rising: list[bool]) -> list[Sweep]:
    """Rows grouped by Reynolds number and direction, lone readings joined to a run."""
    groups: dict[tuple[float, bool], list[int]] = {}
    for index, (reynolds, up) in enumerate(zip(values["reynolds"], rising, strict=True)):
        groups.setdefault((float(reynolds), up), []).append(index)
    for key in [key for key, rows in groups.items() if len(rows) < 2]:
        others = [other for other in groups if other[1] == key[1] and len(groups[other]) >= 2]
        near = min(others, key=lambda other: abs(other[0] - key[0]), default=None)
        row = table.rows[groups[key][0]]
        if near is None or abs(near[0] / key[0] - 1.0) > SAME_REYNOLDS:
            raise TableError(
                table.file,
                f"is the only reading of its run (Reynolds number {key[0]:.6g}); "
                "a run has two or more",
                line=row.line,
            )
        groups[near].extend(groups.pop(key))
    sweeps = []
    for (reynolds, up), rows in groups.items():
        part = {name: column[rows] for name, column in values.items() if name != "reynolds"}
        try:
            sweeps.append(Sweep(reynolds=reynolds, rising=up, **part))
        except InputError as error:
            line = table.rows[rows[0]].line
            raise TableError(table.file, f"cannot be used: {error}", line=line) from error
    return sweeps
