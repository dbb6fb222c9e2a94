"""Scenarios as TOML files: read with every refusal named, written atomically.

A file holds its ``schema``, the tables ``[scenario]``, one for each group of
fields and one ``[sections."NAME"]`` for each section that has tables. What is
missing takes its default; what an older schema wrote is brought to today's
first. What is wrong raises :class:`ScenarioError`, whose one sentence names the
file, the key, the value and what is allowed.
"""

from __future__ import annotations

import re
import stat
import tomllib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from app.scenario import FIELDS, GROUPS, Scenario
from app.scenario_error import (
    ScenarioError,
    ascii_safe,
    input_refusal,
    quoted,
    shown,
    unknown,
)
from app.scenario_migration import SCHEMA, DigestOf, migrate
from app.scenario_sections import FolderTables, TableSource, read_sections
from solver.errors import InputError

__all__ = ["ScenarioError", "read_scenario", "scenario_from_text"]

LARGEST_FILE = 1_000_000
"""Largest scenario file that is read [bytes]."""

TEXTS = {"name": 120, "author": 200, "note": 20_000}
"""The texts of ``[scenario]`` and their largest lengths [characters]."""

_LONG_KEY = re.compile(r"""(?<![\w"'-])(?:(?:[\w-]++|"[^"\n]*+"|'[^'\n]*+')[ \t]*+\.[ \t]*+){40}""")
"""Forty names joined by dots: no key of ours, and the parser's time grows with their square."""

TABLES = ("scenario", *GROUPS, "sections")


def read_scenario(path: str | Path) -> Scenario:
    """Read a scenario and the tables it names.

    Parameters
    ----------
    path : str or pathlib.Path
        A TOML file of at most 1 MB; its tables lie in the same folder or below.

    Returns
    -------
    Scenario
        Valid as a whole: its `freeze` does not raise.

    Raises
    ------
    ScenarioError
        If anything in the file, or a table it names, cannot be used.
    """
    path = Path(path)
    return scenario_from_text(_read_text(path), file=str(path), folder=path.parent)


def scenario_from_text(text: str, *, file: str, folder: Path) -> Scenario:
    """Make a scenario from the text of a file.

    Parameters
    ----------
    text : str
        TOML.
    file : str
        What errors call it.
    folder : pathlib.Path
        Where the paths of its tables start.

    Returns
    -------
    Scenario
        Valid as a whole.

    Raises
    ------
    ScenarioError
        As :func:`read_scenario`.
    """
    tables = FolderTables(folder, file)
    content = to_current(parse(text, file), file, tables.digest_of)
    scenario = scenario_from_content(content, file, tables)
    scenario.folder, scenario.source_text = folder, text
    return scenario


def to_current(content: Mapping[str, Any], file: str, digest_of: DigestOf) -> dict[str, Any]:
    """Bring the content of a file to today's schema.

    Parameters
    ----------
    content : mapping
        From `parse`.
    file : str
        What errors call it.
    digest_of : callable
        Finds the sha256 of a table by its path, section and entry.

    Returns
    -------
    dict

    Raises
    ------
    ScenarioError
        If its schema is missing, none, or newer than today's.
    """
    if "schema" not in content:
        raise ScenarioError(
            file, "schema", f"is missing; a scenario starts with the line schema = {SCHEMA}"
        )
    schema = content["schema"]
    if type(schema) is int and schema > SCHEMA:
        raise ScenarioError(
            file,
            "schema",
            f"must be at most {SCHEMA}; got {shown(schema)}, which a newer Halfspan has written",
        )
    if type(schema) is not int or schema < 1:
        raise ScenarioError(
            file, "schema", f"must be a whole number from 1 to {SCHEMA}; got {shown(schema)}"
        )
    return migrate(content, schema=schema, digest_of=digest_of)


def scenario_from_content(content: Mapping[str, Any], file: str, source: TableSource) -> Scenario:
    """Make a scenario from what a file says.

    Parameters
    ----------
    content : mapping
        From `to_current`.
    file : str
        What errors call it.
    source : TableSource
        Where its tables are.

    Returns
    -------
    Scenario
        Valid as a whole; without a folder.

    Raises
    ------
    ScenarioError
        As :func:`read_scenario`.
    """
    _require_tables(content, file)
    scenario = Scenario(
        **_texts(content.get("scenario", {}), file),
        sections=dict(read_sections(content.get("sections", {}), file, source)),
    )
    values = dict(_values(content, file))
    try:
        scenario.set_values(values)
        scenario.freeze()
    except InputError as error:
        refusal = input_refusal(error, file)
        if error.name in FIELDS and error.name not in values:
            refusal = ScenarioError(
                file, refusal.key, f"is missing and its default does not fit: it {refusal.message}"
            )
        raise refusal from error
    return scenario


def _read_text(path: Path) -> str:
    file = str(path)
    if "\0" in file:
        raise ScenarioError(ascii_safe(file), "", "is not a usable file name")
    try:
        status = path.stat()
        if stat.S_ISDIR(status.st_mode):
            raise ScenarioError(file, "", "is a folder; a scenario is a TOML file")
        if not stat.S_ISREG(status.st_mode):
            raise ScenarioError(file, "", "is not a regular file; a scenario is a TOML file")
        if status.st_size > LARGEST_FILE:
            raise _too_large(file, status.st_size)
        with path.open("rb") as stream:
            data = stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise ScenarioError(file, "", "does not exist; give the path of a TOML file") from None
    except OSError as error:
        raise ScenarioError(file, "", f"cannot be read: {error.strerror}") from error
    if len(data) > LARGEST_FILE:
        raise _too_large(file, len(data))
    if not data.strip():
        raise ScenarioError(file, "", f"is empty; a scenario starts with schema = {SCHEMA}")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise ScenarioError(
            file,
            "",
            f"line {line} has the byte 0x{data[error.start]:02x}, which is not UTF-8; "
            "a scenario is UTF-8 text",
        ) from error


def _too_large(file: str, size: int) -> ScenarioError:
    return ScenarioError(
        file,
        "",
        f"has {size / 1e6:.4g} MB; a scenario may have at most {LARGEST_FILE / 1e6:g} MB",
    )


def parse(text: str, file: str) -> dict[str, Any]:
    """Read TOML, and word what is wrong with it.

    Parameters
    ----------
    text : str
        TOML, of a length that was looked at before.
    file : str
        What errors call it.

    Returns
    -------
    dict

    Raises
    ------
    ScenarioError
        If it is not TOML.
    """
    if found := _LONG_KEY.search(text):
        line = text.count("\n", 0, found.start()) + 1
        raise ScenarioError(
            file, "", f"is nested too deeply in line {line}; keys have at most three parts"
        )
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise ScenarioError(
            file, "", "is nested too deeply; a scenario has tables and keys only"
        ) from None
    except tomllib.TOMLDecodeError as error:
        found = re.fullmatch(r"(.*?)\s*\(at (.*)\)", str(error).splitlines()[0])
        what, where = found.groups() if found else (str(error).splitlines()[0], "")
        if where == "end of document":
            where = f"line {text.count(chr(10)) + 1}, the end"
        place = f" in {where}" if where else ""
        if twice := re.fullmatch(r"Cannot declare \((.*?),?\) twice", what):
            what = f"[{twice[1].replace(chr(39), '').replace(', ', '.')}] stands twice"
        raise ScenarioError(
            file, "", f"is not TOML{place}: {what[:1].lower()}{what[1:]}"
        ) from error
    except ValueError:
        raise ScenarioError(
            file, "", "has a whole number with thousands of digits, which is not read"
        ) from None


def _require_tables(content: Mapping[str, Any], file: str) -> None:
    for name, value in content.items():
        if name == "schema":
            continue
        if name not in TABLES:
            raise unknown(file, "", name, TABLES)
        if not isinstance(value, Mapping):
            raise ScenarioError(file, quoted(name), f"must be a table; got {shown(value)}")


def _texts(table: Mapping[str, Any], file: str) -> dict[str, str]:
    texts: dict[str, str] = {}
    for name, value in table.items():
        key = f"scenario.{name}"
        if name not in TEXTS:
            raise unknown(file, "scenario", name, tuple(TEXTS))
        if not isinstance(value, str):
            raise ScenarioError(file, key, f"must be a text; got {shown(value)}")
        if problem := text_problem(name, value):
            raise ScenarioError(file, key, problem)
        texts[name] = value
    return texts


def text_problem(name: str, value: str) -> str:
    """Say what is wrong with a text of ``[scenario]``, or nothing.

    Parameters
    ----------
    name : str
        ``name``, ``author`` or ``note``.
    value : str
        The text.

    Returns
    -------
    str
        Empty when it is usable.
    """
    most = TEXTS[name]
    if len(value) > most:
        return f"must have at most {most} characters; got {len(value)}"
    if name == "name" and not value.strip():
        return f"must not be blank; got {shown(value)}"
    allowed = "\n\t" if name == "note" else ""
    if any(not (letter.isprintable() or letter in allowed) for letter in value):
        return f"must have no control characters; got {shown(value)}"
    if _LONG_KEY.search(value):
        return "must not have forty words joined by dots"
    return ""


def _values(content: Mapping[str, Any], file: str) -> Iterator[tuple[str, object]]:
    for group, cls in GROUPS.items():
        known = tuple(cls.__annotations__)
        for name, value in content.get(group, {}).items():
            if name not in known:
                raise unknown(file, group, name, known)
            yield name, value
