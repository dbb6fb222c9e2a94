"""Tables that travel: put beside a scenario under names that say what they hold."""

from __future__ import annotations

import dataclasses
import re
from pathlib import Path

from app.safe_write import replace_file
from app.scenario import SectionFiles, TableFile
from app.scenario_error import ScenarioError, quoted
from app.scenario_migration import TABLE_KEYS
from app.table_text import TableError, read_table_text

FOLDER = "tables"


def put_beside(
    name: str, files: SectionFiles, folder: Path, *, before: Path | None, file: str
) -> SectionFiles:
    """Make sure that a folder has the tables of a section.

    A table that lies in the folder already, as it was read, stays where it is.
    Any other is written into ``tables``; there the start of its sha256 in the
    name keeps different tables apart and lets equal ones be shared.

    Parameters
    ----------
    name : str
        Of the section.
    files : SectionFiles
        Its tables.
    folder : pathlib.Path
        That of the scenario file, resolved.
    before : pathlib.Path or None
        Where the paths in `files` start.
    file : str
        What errors call the scenario.

    Returns
    -------
    SectionFiles
        Equal, with paths that start at `folder`.

    Raises
    ------
    ScenarioError
        If a table cannot have its place.
    OSError
        If it cannot be written.
    """
    stays = before is not None and before.resolve() == folder
    moved: dict[str, TableFile] = {}
    for entry in TABLE_KEYS:
        table: TableFile = getattr(files, entry)
        if stays and _holds(folder, table.path, table.digest):
            moved[entry] = table
            continue
        key = f"sections.{quoted(name)}.{entry}"
        moved[entry] = dataclasses.replace(table, path=_put(name, entry, table, folder, file, key))
    return SectionFiles(**moved, tables=files.tables)


def _put(name: str, entry: str, table: TableFile, folder: Path, file: str, key: str) -> str:
    stem = re.sub(r"[^A-Za-z0-9]+", "-", name).strip("-")[:40] or "section"
    place = folder / FOLDER
    place.mkdir(exist_ok=True)
    if not place.resolve().is_relative_to(folder):
        raise ScenarioError(
            file, key, f"cannot be written: {FOLDER}/ is a link that leads out of the folder"
        )
    # A file that was changed by hand keeps its name and its changes.
    for letters in (12, 64):
        path = f"{FOLDER}/{stem}-{entry}-{table.digest[:letters]}.csv"
        if _holds(folder, path, table.digest):
            return path
        if not (folder / path).exists():
            replace_file(folder / path, table.text.encode())
            return path
    raise ScenarioError(
        file, key, f"cannot be written: {path} was changed by hand; give that file another name"
    )


def _holds(folder: Path, path: str, digest: str) -> bool:
    """Whether a path leads to a table with that sha256, inside the folder."""
    place = folder / path
    try:
        return place.resolve().is_relative_to(folder) and read_table_text(place).digest == digest
    except (TableError, OSError):
        return False
