"""What a report is asked to show: plain data, the same on both sides of a process."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from app.analysis.results import Results
from app.report.codec import CodecError, decode

LETTERS = "ABCDEF"


@dataclass(frozen=True)
class FieldRow:
    """One input as it stands: group, name, label, unit and value."""

    group: str
    name: str
    label: str
    unit: str
    value: float | str


@dataclass(frozen=True, eq=False)
class Shown:
    """One scenario of a report.

    Fields
    ------
    letter : str
        What plots call it where several are compared.
    name, author, note : str
        As the user typed them.
    fields : tuple of FieldRow
        Every input.
    oddities : tuple of str
        Inputs that are allowed but rarely meant.
    results : Results
        With every curve.
    table : mapping or None
        Behind the sliders; None where no stall was found.
    error : mapping or None
        Of the table, in percent, and the number of flights.
    drive : mapping
        Battery, motor and propeller.
    inputs_hash : str
        Sha256 over all inputs and tables.
    tables : tuple of (str, int, str)
        Path, size in bytes and sha256 of each table.
    """

    letter: str
    name: str
    author: str
    note: str
    fields: tuple[FieldRow, ...]
    oddities: tuple[str, ...]
    results: Results
    table: Mapping[str, Any] | None
    error: Mapping[str, Any] | None
    drive: Mapping[str, float]
    inputs_hash: str
    tables: tuple[tuple[str, int, str], ...]

    def field(self, name: str) -> FieldRow:
        """Give one input by its name."""
        return next(entry for entry in self.fields if entry.name == name)

    def value(self, name: str) -> float:
        """Give one number of the inputs by its name."""
        return float(self.field(name).value)


@dataclass(frozen=True, eq=False)
class Order:
    """A report to be built: its words, when and by what version, and its scenarios."""

    title: str
    author: str
    note: str
    made: str
    version: str
    shown: tuple[Shown, ...]
    cargo: str

    @property
    def compares(self) -> bool:
        """Whether there are several scenarios."""
        return len(self.shown) > 1


def order_from(content: Mapping[str, Any]) -> Order:
    """Read an order from plain data.

    Parameters
    ----------
    content : mapping
        As :func:`app.report.make.order_content` makes it.

    Returns
    -------
    Order
        Ready to be built.

    Raises
    ------
    CodecError
        If something is missing or is not what it should be.
    """
    try:
        return Order(
            **{key: str(content[key]) for key in ("title", "author", "note", "made", "version")},
            cargo=str(content["cargo"]),
            shown=tuple(
                _shown(letter, one)
                for letter, one in zip(LETTERS, content["scenarios"], strict=False)
            ),
        )
    except (KeyError, TypeError) as error:
        raise CodecError(f"the report's order is not whole: {error}") from error


def _shown(letter: str, one: Mapping[str, Any]) -> Shown:
    return Shown(
        letter=letter,
        name=str(one["name"]),
        author=str(one["author"]),
        note=str(one["note"]),
        fields=tuple(FieldRow(**row) for row in one["fields"]),
        oddities=tuple(one["oddities"]),
        results=decode(one["results"]),
        table=one["table"],
        error=one["error"],
        drive=one["drive"],
        inputs_hash=str(one["inputs_hash"]),
        tables=tuple((str(path), int(size), str(digest)) for path, size, digest in one["tables"]),
    )
