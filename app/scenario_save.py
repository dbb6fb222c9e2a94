"""Scenarios written as TOML: comments kept, all or nothing.

The text a scenario was read from is changed in place, so that the comments of
whoever wrote it stay. Every text is read again before it is written: what is
saved is what would be loaded.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import tomlkit
from param.parameterized import discard_events
from tomlkit.exceptions import TOMLKitError
from tomlkit.items import Item, Table

from app.safe_write import disk_trouble, replace_file
from app.scenario import FIELDS, GROUPS, Scenario, SectionFiles
from app.scenario_error import ScenarioError, input_refusal
from app.scenario_file import TEXTS, text_problem
from app.scenario_migration import SCHEMA, TABLE_KEYS, digest_key
from app.tables_beside import put_beside
from solver.errors import InputError


def write_scenario(scenario: Scenario, path: str | Path) -> None:
    """Write a scenario, and beside it the tables that do not lie there yet.

    The file is replaced in one step: a reader sees the old or the new one,
    never half of it. Tables go into the folder ``tables`` beside the file, under
    names that hold the start of their sha256. Afterwards the scenario's
    `folder`, `source_text` and the paths in `sections` are those of the file.

    Parameters
    ----------
    scenario : Scenario
        Must be valid as a whole.
    path : str or pathlib.Path
        Where to; an existing file is replaced.

    Raises
    ------
    ScenarioError
        If the scenario is not valid, a table cannot be carried along, or the
        file cannot be written. An existing file is as it was then.
    """
    path = Path(path)
    file = str(path)
    scenario_text(scenario, file=file)  # refused before anything is written
    try:
        target = path.resolve()
        if target.is_dir():
            raise ScenarioError(file, "", "is a folder; a scenario is a TOML file")
        sections = {
            name: put_beside(name, files, target.parent, before=scenario.folder, file=file)
            for name, files in scenario.sections.items()
        }
        text = scenario_text(scenario, sections=sections, file=file)
        replace_file(target, text.encode())
    except OSError as error:
        raise ScenarioError(file, "", f"cannot be written: {disk_trouble(error)}") from error
    with discard_events(scenario):  # where tables lie is no input
        scenario.folder, scenario.sections = target.parent, sections
    scenario.source_text = text


def scenario_text(
    scenario: Scenario,
    *,
    sections: Mapping[str, SectionFiles] | None = None,
    file: str = "scenario",
) -> str:
    """Word a scenario as TOML, with the comments of the text it was read from.

    Parameters
    ----------
    scenario : Scenario
        Must be valid as a whole.
    sections : mapping of str to SectionFiles, optional
        The same sections with other paths.
    file : str
        What errors call it.

    Returns
    -------
    str
        Reads back as an equal scenario.

    Raises
    ------
    ScenarioError
        If the scenario is not valid.
    """
    content = _content(scenario, scenario.sections if sections is None else sections, file)
    for text in (_merged(scenario.source_text, content), _fresh(content)):
        # The reader's library is another one than the writer's: it has the last word.
        if text and tomllib.loads(text) == content:
            return text
    raise ScenarioError(file, "", "cannot be written as TOML that reads back the same")


def _content(scenario: Scenario, sections: Mapping[str, SectionFiles], file: str) -> dict[str, Any]:
    """Everything the file has to say, as the reader will see it."""
    try:
        scenario.freeze()
    except InputError as error:
        raise input_refusal(error, file) from error
    texts = {name: getattr(scenario, name) for name in TEXTS}
    for name, value in texts.items():
        if problem := text_problem(name, value):
            raise ScenarioError(file, f"scenario.{name}", problem)
    values = scenario.values()
    content: dict[str, Any] = {"schema": SCHEMA, "scenario": texts}
    for group, cls in GROUPS.items():
        content[group] = {name: _plain(values[name]) for name in cls.__annotations__}
    if sections:
        content["sections"] = {name: _paths(files) for name, files in sections.items()}
    return content


def _paths(files: SectionFiles) -> dict[str, str]:
    found = {}
    for entry in TABLE_KEYS:
        table = getattr(files, entry)
        found[entry], found[digest_key(entry)] = table.path, table.digest
    return found


def _plain(value: float | str) -> float | int | str:
    """Write 17 rather than 17.0: both read back as the same number."""
    return int(value) if isinstance(value, float) and value.is_integer() else value


def _item(value: Any) -> Item:  # noqa: ANN401 - whatever TOML can hold
    if isinstance(value, str) and "\n" in value and not value.startswith("\n"):
        return tomlkit.string(value, multiline=True)
    item: Item = tomlkit.item(value)
    return item


def _merged(text: str, content: Mapping[str, Any]) -> str:
    """Change the text so that it says `content`; empty when that cannot be done."""
    if not text:
        return ""
    try:
        document = tomlkit.parse(text)
        for name, table in content.items():
            if name == "sections":
                _merge_sections(document, table)
            elif isinstance(table, Mapping):
                if name not in document:
                    document[name] = _fresh_table(table)
                _merge_table(document[name], table)
            elif document.get(name) != table:
                document[name] = table
        if "sections" in document and "sections" not in content:
            del document["sections"]
        return tomlkit.dumps(document)
    except (TOMLKitError, LookupError, TypeError, ValueError, AttributeError):
        # Some legal spellings of TOML are beyond editing in place: start afresh.
        return ""


def _merge_table(table: Any, content: Mapping[str, Any]) -> None:  # noqa: ANN401 - tomlkit's kinds
    for name, value in content.items():
        if name not in table or table[name] != value:
            table[name] = _item(value)


def _merge_sections(document: tomlkit.TOMLDocument, content: Mapping[str, Any]) -> None:
    if "sections" not in document:
        document["sections"] = tomlkit.table(is_super_table=True)
    sections: Any = document["sections"]
    for name in [name for name in sections if name not in content]:
        del sections[name]
    for name, files in content.items():
        if name not in sections:
            sections[name] = _fresh_table(files)
        _merge_table(sections[name], files)


def _fresh(content: Mapping[str, Any]) -> str:
    document = tomlkit.document()
    document.add("schema", tomlkit.item(content["schema"]))
    for name, table in content.items():
        if name == "sections":
            sections = tomlkit.table(is_super_table=True)
            for section, files in table.items():
                sections[section] = _fresh_table(files)
            document[name] = sections
        elif isinstance(table, Mapping):
            document.add(tomlkit.nl())
            document.add(name, _fresh_table(table))
    return tomlkit.dumps(document)


def _fresh_table(content: Mapping[str, Any]) -> Table:
    table = tomlkit.table()
    for name, value in content.items():
        item = _item(value)
        if entry := FIELDS.get(name):
            item.comment(entry.help)
        table.add(name, item)
    return table
