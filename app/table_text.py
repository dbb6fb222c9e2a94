"""The text of a table: read within limits, split into rows, every field a number.

Nothing here knows what a column means.
"""

from __future__ import annotations

import csv
import hashlib
import math
import re
import stat
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

LARGEST_FILE = 8_000_000
"""Largest table that is read [bytes]."""

MOST_ROWS = 200_000
MOST_COLUMNS = 200
LONGEST_SHOWN = 40

NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")


class TableError(ValueError):
    """A table that cannot be used, in one sentence.

    Parameters
    ----------
    file : str
        The file, as the user named it.
    message : str
        What is wrong and what is allowed, to follow the place.
    line : int, optional
        Counted from 1.
    column : str, optional
        The column's heading.
    value : str, optional
        What was found there.
    """

    def __init__(
        self,
        file: str,
        message: str,
        *,
        line: int | None = None,
        column: str | None = None,
        value: str | None = None,
    ) -> None:
        self.file, self.message = file, message
        self.line, self.column, self.value = line, column, value
        place = [file]
        if line is not None:
            place.append(f"line {line}")
        if column is not None:
            place.append(f"column {shown(column)}")
        got = f"; got {shown(value)}" if value is not None else ""
        super().__init__(f"{', '.join(place)}: {message}{got}")

    def __reduce__(self) -> tuple[object, ...]:
        # Without this the error does not survive a process boundary.
        return _rebuilt, (self.file, self.message, self.line, self.column, self.value)


def _rebuilt(
    file: str, message: str, line: int | None, column: str | None, value: str | None
) -> TableError:
    return TableError(file, message, line=line, column=column, value=value)


def shown(text: str) -> str:
    """Quote a text of a file for a sentence: one line, cut when long.

    Parameters
    ----------
    text : str

    Returns
    -------
    str
    """
    return repr(text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 3] + "...")


@dataclass(frozen=True)
class TableText:
    """A table as text, wherever it came from.

    Fields
    ------
    file : str
        What errors call it.
    text : str
        Its content, with plain line feeds and no byte-order mark.
    """

    file: str
    text: str

    @cached_property
    def digest(self) -> str:
        """Sha256 of the text: the same whatever line ends a system gives its files."""
        return hashlib.sha256(self.text.encode()).hexdigest()


@dataclass(frozen=True)
class Row:
    """One row: the line it stands on, counted from 1, and its fields, trimmed."""

    line: int
    fields: tuple[str, ...]


@dataclass(frozen=True)
class Table:
    """Rows of equal length under headings.

    Fields
    ------
    file : str
    comments : tuple of str
        Lines that begin with ``#``, without it.
    headings : tuple of str
        Of the first row.
    heading_line : int
    rows : tuple of Row
        One or more.
    decimal_comma : bool
        Fields are not separated by commas, which may stand for decimal points.
    """

    file: str
    comments: tuple[str, ...]
    headings: tuple[str, ...]
    heading_line: int
    rows: tuple[Row, ...]
    decimal_comma: bool

    def number(self, row: Row, index: int, column: str) -> float:
        """Read one field as a number.

        Parameters
        ----------
        row : Row
        index : int
            Of the column.
        column : str
            What the error calls it.

        Returns
        -------
        float
            Finite.

        Raises
        ------
        TableError
            If the field is empty, text, not finite or not a number.
        """
        text = row.fields[index]
        plain = text.replace(",", ".") if self.decimal_comma else text
        value = float(plain) if NUMBER.fullmatch(plain) else math.nan
        if not math.isfinite(value):
            raise TableError(
                self.file, "must be a finite number", line=row.line, column=column, value=text
            )
        return value


def read_table_text(path: str | Path) -> TableText:
    """Read the text of a table.

    Parameters
    ----------
    path : str or pathlib.Path
        A regular file of at most 8 MB, UTF-8.

    Returns
    -------
    TableText

    Raises
    ------
    TableError
        If the file cannot be read, is too large or is not text.
    """
    text = _read_text(Path(path), str(path))
    return TableText(str(path), text.replace("\r\n", "\n"))


def read_table(path: str | Path | TableText) -> Table:
    """Read a table of comma-, semicolon-, tab- or space-separated fields.

    Parameters
    ----------
    path : str or pathlib.Path or TableText
        A regular file of at most 8 MB, UTF-8, or what such a file would hold; at
        most 200,000 rows.

    Returns
    -------
    Table

    Raises
    ------
    TableError
        If the file cannot be read, is too large, is not text, has no row beside its
        headings or has rows of other lengths.
    """
    source = path if isinstance(path, TableText) else read_table_text(path)
    file, lines = source.file, source.text.splitlines()
    comments = tuple(line.strip()[1:].strip() for line in lines if line.lstrip().startswith("#"))
    kept = [
        (number, line)
        for number, line in enumerate(lines, start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if not kept:
        raise TableError(file, "has no rows; a table has headings and rows of numbers")
    if len(kept) - 1 > MOST_ROWS:
        raise TableError(file, f"has {len(kept) - 1} rows; a table may have {MOST_ROWS}")
    separator = _separator(kept[0][1])
    rows = [Row(number, _fields(file, number, line, separator)) for number, line in kept]
    first, *others = rows
    if len(first.fields) > MOST_COLUMNS:
        raise TableError(
            file,
            f"has {len(first.fields)} columns; a table may have {MOST_COLUMNS}",
            line=first.line,
        )
    for row in others:
        if len(row.fields) != len(first.fields):
            raise TableError(
                file,
                f"has {len(row.fields)} fields; its headings are {len(first.fields)}",
                line=row.line,
            )
    if not others:
        raise TableError(file, "has headings only; a table has rows of numbers", line=first.line)
    return Table(file, comments, first.fields, first.line, tuple(others), separator != ",")


def _separator(line: str) -> str | None:
    """The separator of the headings' line; None for runs of spaces."""
    for separator in (";", "\t", ","):
        if separator in line:
            return separator
    return None


def _fields(file: str, number: int, line: str, separator: str | None) -> tuple[str, ...]:
    if separator is None:
        return tuple(line.split())
    try:
        (fields,) = csv.reader([line], delimiter=separator, strict=True)
    except (csv.Error, ValueError) as error:
        raise TableError(file, f"is not a row of a table: {error}", line=number) from error
    return tuple(field.strip() for field in fields)


def _read_text(path: Path, file: str) -> str:
    if "\0" in file:
        raise TableError(shown(file), "is not a usable file name")
    try:
        status = path.stat()
        if not stat.S_ISREG(status.st_mode):
            raise TableError(file, "is not a regular file; a table is a CSV file")
        if status.st_size > LARGEST_FILE:
            raise _too_large(file, status.st_size)
        with path.open("rb") as stream:
            data = stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise TableError(file, "does not exist; give the path of a CSV file") from None
    except OSError as error:
        raise TableError(file, f"cannot be read: {error.strerror}") from error
    if len(data) > LARGEST_FILE:
        raise _too_large(file, len(data))
    if not data.strip():
        raise TableError(file, "is empty; a table has headings and rows of numbers")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise TableError(
            file,
            f"has the byte 0x{data[error.start]:02x}, which is not UTF-8; a table is UTF-8 text",
            line=line,
        ) from error
    if "\0" in text:
        line = text[: text.index("\0")].count("\n") + 1
        raise TableError(file, "has a zero byte; a table is text", line=line)
    return text


def _too_large(file: str, size: int) -> TableError:
    return TableError(
        file, f"has {size / 1e6:.4g} MB; a table may have at most {LARGEST_FILE / 1e6:g} MB"
    )
