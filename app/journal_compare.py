"""Snapshots side by side: the inputs that differ, and what became of each margin."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from app.analysis.results import Results
from app.journal_snapshot import JournalError, KeyFigure, Snapshot, key_figure, scenario_of
from app.scenario import SECTION_FIELDS, Scenario, field_list

FEWEST, MOST = 2, 6


@dataclass(frozen=True)
class Column:
    """One of those compared.

    Parameters
    ----------
    name : str
        Plain text, to be escaped on a page.
    values : mapping of str to float or str
        Every field.
    tables : mapping of str to str
        A hash of the tables of each section of wing and tail that has some.
    figures : tuple of KeyFigure
        Its margins.
    """

    name: str
    values: Mapping[str, float | str]
    tables: Mapping[str, str]
    figures: tuple[KeyFigure, ...]


@dataclass(frozen=True)
class InputRow:
    """An input that is not the same in all.

    Parameters
    ----------
    name, group, label, unit : str
        As `app.scenario.Field` has them; for tables of a section ``sections.NAME``.
    values : tuple of float or str
        One for each column.
    """

    name: str
    group: str
    label: str
    unit: str
    values: tuple[float | str, ...]


@dataclass(frozen=True)
class MarginRow:
    """One margin.

    Parameters
    ----------
    key, label, unit : str
        As the first column that has it calls it.
    cells : tuple of KeyFigure or None
        One for each column; None where a column does not have it.
    """

    key: str
    label: str
    unit: str
    cells: tuple[KeyFigure | None, ...]


@dataclass(frozen=True)
class Comparison:
    """Two to six side by side.

    Parameters
    ----------
    names : tuple of str
        Of the columns.
    inputs : tuple of InputRow
        Those that differ, in the order of the fields; then the tables.
    margins : tuple of MarginRow
        All of them.
    """

    names: tuple[str, ...]
    inputs: tuple[InputRow, ...]
    margins: tuple[MarginRow, ...]


def column_of(snapshot: Snapshot) -> Column:
    """Make the column of a snapshot.

    Parameters
    ----------
    snapshot : Snapshot

    Returns
    -------
    Column

    Raises
    ------
    JournalError
        If its scenario cannot be used.
    """
    scenario = scenario_of(snapshot)
    return Column(snapshot.name, scenario.values(), _tables(scenario), snapshot.figures)


def column_now(scenario: Scenario, results: Results, *, name: str) -> Column:
    """Make the column of what is on the page.

    Parameters
    ----------
    scenario : Scenario
    results : Results
        Of it.
    name : str
        What it is called.

    Returns
    -------
    Column
    """
    figures = tuple(key_figure(margin) for margin in results.margins)
    return Column(name, scenario.values(), _tables(scenario), figures)


def compare(columns: Sequence[Column]) -> Comparison:
    """Put columns side by side.

    Parameters
    ----------
    columns : sequence of Column
        Two to six.

    Returns
    -------
    Comparison

    Raises
    ------
    JournalError
        If there are fewer or more.
    """
    if not FEWEST <= len(columns) <= MOST:
        raise JournalError(f"Choose {FEWEST} to {MOST} snapshots to compare; got {len(columns)}.")
    return Comparison(
        names=tuple(one.name for one in columns),
        inputs=(*_fields(columns), *_section_tables(columns)),
        margins=_margins(columns),
    )


def _tables(scenario: Scenario) -> dict[str, str]:
    used = {str(scenario.values()[name]) for name in SECTION_FIELDS}
    return {name: files.tables.digest for name, files in scenario.sections.items() if name in used}


def _fields(columns: Sequence[Column]) -> list[InputRow]:
    rows = []
    for entry in field_list():
        values = tuple(one.values[entry.name] for one in columns)
        if len(set(values)) > 1:
            rows.append(InputRow(entry.name, entry.group, entry.label, entry.unit, values))
    return rows


def _section_tables(columns: Sequence[Column]) -> list[InputRow]:
    """Rows for sections of one name that hold other tables."""
    rows = []
    for name in dict.fromkeys(name for one in columns for name in one.tables):
        found = [one.tables[name] for one in columns if name in one.tables]
        if len(set(found)) > 1:
            values = tuple(one.tables.get(name, "")[:12] for one in columns)
            rows.append(InputRow(f"sections.{name}", "sections", f"Tables of {name}", "", values))
    return rows


def _margins(columns: Sequence[Column]) -> tuple[MarginRow, ...]:
    found = [{figure.key: figure for figure in one.figures} for one in columns]
    first: dict[str, KeyFigure] = {}
    for figures in found:
        for key, figure in figures.items():
            first.setdefault(key, figure)
    return tuple(
        MarginRow(key, one.label, one.unit, tuple(figures.get(key) for figures in found))
        for key, one in first.items()
    )
