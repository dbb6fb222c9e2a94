"""The sections of a scenario file: their tables found, held to their sha256, and read."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from pathlib import Path, PurePosixPath
from typing import Any, Protocol

from app.inputs import SectionTables
from app.scenario import SectionFiles, TableFile
from app.scenario_error import ScenarioError, quoted, shown, unknown
from app.scenario_migration import TABLE_KEYS, digest_key
from app.table_text import TableError, TableText, read_table_text
from app.tables import read_drag_table, read_lift_table, read_outline_table, table_source

MOST_SECTIONS = 40

DIGEST = re.compile(r"[0-9a-f]{64}")
"""A sha256 as it is written: hexadecimal, lower case."""

_ALLOWED = "the path of a CSV file in the scenario's folder or below it"


class TableSource(Protocol):
    """Where the text of a scenario's tables comes from."""

    def find(self, path: str, digest: str, key: str) -> TableText:
        """Give the table with a path and, where it is stated, a sha256."""


class FolderTables:
    """Tables that lie beside a scenario file; each is read once.

    Parameters
    ----------
    folder : pathlib.Path
        Where paths start, and out of which none may lead.
    file : str
        What errors call the scenario.
    """

    def __init__(self, folder: Path, file: str) -> None:
        self.folder, self.file = folder, file
        self._read: dict[str, TableText] = {}

    def digest_of(self, value: object, section: str, entry: str) -> str:
        """Find the sha256 of a table by its path; see `scenario_migration.DigestOf`."""
        key = f"sections.{quoted(section)}.{entry}"
        return self.find(usable_path(value, self.file, key), "", key).digest

    def find(self, path: str, digest: str, key: str) -> TableText:
        """Read a table and hold it to its sha256.

        Parameters
        ----------
        path : str
            From `usable_path`.
        digest : str
            The sha256 it must have, or empty.
        key : str
            Where the path stands in the file.

        Returns
        -------
        TableText

        Raises
        ------
        ScenarioError
            If it cannot be read or is another table than it was.
        """
        if path not in self._read:
            place = self._inside(path, key)
            try:
                self._read[path] = read_table_text(place)
            except TableError as error:
                raise ScenarioError(self.file, key, f"cannot be used: {error}") from error
        table = self._read[path]
        if digest and table.digest != digest:
            raise ScenarioError(
                self.file,
                f"{key}_sha256",
                f"does not fit {shown(path)}, which was changed since; put the table back as it "
                f"was or, if the change is meant, write its new sha256 here: {table.digest}",
            )
        return table

    def _inside(self, value: str, key: str) -> Path:
        path = self.folder / value
        try:
            inside = path.resolve().is_relative_to(self.folder.resolve())
            if inside and path.is_file():
                return path
            exists = path.exists()
        except OSError as error:
            raise ScenarioError(
                self.file, key, f"cannot be read: {shown(value)}, {error.strerror}"
            ) from error
        where = "a link that leads out of it"
        if inside:
            where = f"which {'is not a file' if exists else 'does not exist'}"
        raise ScenarioError(self.file, key, f"must be {_ALLOWED}; got {shown(value)}, {where}")


def usable_path(value: object, file: str, key: str) -> str:
    """Refuse a path that could lead out of the scenario's folder.

    Parameters
    ----------
    value : object
        As the file has it.
    file, key : str
        What errors call them.

    Returns
    -------
    str
        The path, relative, with forward slashes.

    Raises
    ------
    ScenarioError
        If it is anything else.
    """
    if not isinstance(value, str) or not value or not value.isprintable() or len(value) > 1000:
        raise ScenarioError(file, key, f"must be {_ALLOWED}; got {shown(value)}")
    relative = PurePosixPath(value)
    # A backslash or a drive would be another path on another system.
    if relative.is_absolute() or ".." in relative.parts or "\\" in value or ":" in value:
        raise ScenarioError(file, key, f"must be {_ALLOWED}; got {shown(value)}")
    return value


def read_sections(
    tables: Mapping[str, Any], file: str, source: TableSource
) -> Iterator[tuple[str, SectionFiles]]:
    """Read the sections of a file of today's schema.

    Parameters
    ----------
    tables : mapping
        The content of ``[sections]``.
    file : str
        What errors call the scenario.
    source : TableSource
        Where the tables are.

    Yields
    ------
    name, files : str, SectionFiles

    Raises
    ------
    ScenarioError
        At the first thing that cannot be used.
    """
    if len(tables) > MOST_SECTIONS:
        raise ScenarioError(
            file, "sections", f"must have at most {MOST_SECTIONS} tables; got {len(tables)}"
        )
    known = tuple(key for entry in TABLE_KEYS for key in (entry, digest_key(entry)))
    for name, table in tables.items():
        key = f"sections.{quoted(name)}"
        if not name.strip() or len(name) > 80 or not name.isprintable():
            raise ScenarioError(file, key, "must have a printable name of 1 to 80 characters")
        if not isinstance(table, Mapping):
            raise ScenarioError(file, key, f"must be a table; got {shown(table)}")
        for entry in table:
            if entry not in known:
                raise unknown(file, key, entry, known)
        yield name, _section(name, table, file, source)


def _section(name: str, table: Mapping[str, Any], file: str, source: TableSource) -> SectionFiles:
    key = f"sections.{quoted(name)}"
    files: dict[str, TableFile] = {}
    texts: dict[str, TableText] = {}
    for entry in TABLE_KEYS:
        if entry not in table:
            raise ScenarioError(
                file, f"{key}.{entry}", "is missing; a section needs outline, lift and drag"
            )
        path = usable_path(table[entry], file, f"{key}.{entry}")
        digest = _digest(table, entry, file, key)
        texts[entry] = text = source.find(path, digest, f"{key}.{entry}")
        files[entry] = TableFile(path=path, digest=text.digest, text=text.text)
    return SectionFiles(**files, tables=_read(name, texts, file=file, key=key))


def _digest(table: Mapping[str, Any], entry: str, file: str, key: str) -> str:
    name = digest_key(entry)
    if name not in table:
        raise ScenarioError(
            file,
            f"{key}.{name}",
            "is missing; write it, or write schema = 1 at the top and save the scenario once",
        )
    value = table[name]
    if not isinstance(value, str) or not DIGEST.fullmatch(value):
        raise ScenarioError(
            file,
            f"{key}.{name}",
            f"must be the sha256 of the table, 64 of the letters 0-9 and a-f; got {shown(value)}",
        )
    return value


def _read(name: str, texts: Mapping[str, TableText], *, file: str, key: str) -> SectionTables:
    entry = "outline"
    try:
        # A name from the file's would change when a table moves to another folder.
        outline_name, outline = read_outline_table(texts["outline"], unnamed=name)
        entry = "lift"
        lift = tuple(read_lift_table(texts["lift"]))
        entry = "drag"
        drag = tuple(read_drag_table(texts["drag"]))
        said = [line for one in ("lift", "drag") for line in table_source(texts[one]).splitlines()]
    except TableError as error:
        raise ScenarioError(file, f"{key}.{entry}", f"cannot be used: {error}") from error
    return SectionTables(
        outline_name=outline_name,
        outline=outline,
        lift=lift,
        drag=drag,
        source="\n".join(dict.fromkeys(said)),
    )
