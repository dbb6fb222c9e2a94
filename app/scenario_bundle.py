"""A scenario as one text that needs no other file: its tables ride inside.

The text is that of a scenario file, comments and all, followed by one table
``[tables.SHA256]`` for each table of its sections. Paths in it only remember
where the tables lay.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from app.scenario import Scenario, SectionFiles
from app.scenario_error import ScenarioError, ascii_safe, quoted, shown
from app.scenario_file import parse, scenario_from_content, to_current
from app.scenario_migration import TABLE_KEYS
from app.scenario_save import scenario_text
from app.scenario_sections import DIGEST
from app.table_text import LARGEST_FILE, TableText
from app.toml_text import escaped_block

LARGEST_BUNDLE = 24_000_000
"""Largest text that is written or read [characters]."""

HEADING = "# The tables of the sections, by the sha256 of their content.\n"


def bundle_text(scenario: Scenario, *, file: str = "scenario") -> str:
    """Word a scenario with its tables as one TOML text.

    Parameters
    ----------
    scenario : Scenario
        Must be valid as a whole.
    file : str
        What errors call it.

    Returns
    -------
    str
        The same for equal scenarios with equal comments; its line ends are
        plain line feeds.

    Raises
    ------
    ScenarioError
        If the scenario is not valid or its tables are too large.
    """
    head = scenario_text(scenario, file=file).replace("\r\n", "\n")
    text = head + _tail(scenario.sections)
    if len(text) > LARGEST_BUNDLE:
        raise ScenarioError(
            file,
            "sections",
            f"have tables of {len(text) / 1e6:.3g} MB; a scenario that is kept whole may have "
            f"{LARGEST_BUNDLE / 1e6:g} MB, so take out what no part of the aircraft uses",
        )
    parse(text, file)  # what is kept must be readable again
    return text


def scenario_from_bundle(text: str, *, file: str) -> Scenario:
    """Make a scenario from the text of `bundle_text`.

    Parameters
    ----------
    text : str
        TOML; of this schema or an older one that had tables inside.
    file : str
        What errors call it.

    Returns
    -------
    Scenario
        Valid as a whole; its `folder` is None, since it needs none.

    Raises
    ------
    ScenarioError
        If it cannot be used, or a table is not what its sha256 says.
    """
    if len(text) > LARGEST_BUNDLE:
        raise ScenarioError(
            file,
            "",
            f"has {len(text) / 1e6:.4g} MB; it may have at most {LARGEST_BUNDLE / 1e6:g} MB",
        )
    content = parse(text, file)
    source = _InlineTables(content.pop("tables", {}), file)
    scenario = scenario_from_content(to_current(content, file, source.digest_of), file, source)
    # Comments belong to what comes before the tables.
    tail = _tail(scenario.sections)
    scenario.source_text = text.removesuffix(tail) if not tail or text.endswith(tail) else ""
    return scenario


def _tail(sections: Mapping[str, SectionFiles]) -> str:
    texts = {}
    for files in sections.values():
        for entry in TABLE_KEYS:
            table = getattr(files, entry)
            texts[table.digest] = table.text
    if not texts:
        return ""
    parts = [
        f"\n[tables.{digest}]\ntext = {escaped_block(texts[digest])}\n" for digest in sorted(texts)
    ]
    return "\n" + HEADING + "".join(parts)


class _InlineTables:
    """Tables that ride inside the text."""

    def __init__(self, tables: object, file: str) -> None:
        self.file = file
        if not isinstance(tables, Mapping):
            raise ScenarioError(file, "tables", f"must be a table; got {shown(tables)}")
        self._texts = {digest: self._text(digest, entry) for digest, entry in tables.items()}

    def _text(self, digest: str, entry: Any) -> str:  # noqa: ANN401 - whatever TOML can hold
        key = f"tables.{quoted(digest)}"
        if not DIGEST.fullmatch(digest):
            raise ScenarioError(self.file, key, "must be named by the sha256 of its text")
        if not isinstance(entry, Mapping) or set(entry) != {"text"}:
            raise ScenarioError(self.file, key, "must hold its text, and nothing else")
        text = entry["text"]
        if not isinstance(text, str) or "\0" in text or len(text) > LARGEST_FILE:
            raise ScenarioError(
                self.file, key, f"must hold a text of at most {LARGEST_FILE / 1e6:g} MB"
            )
        if TableText("", text).digest != digest:
            raise ScenarioError(
                self.file,
                key,
                "does not hold the table it is named after, so the text was damaged or changed; "
                "use an undamaged copy",
            )
        return text

    def digest_of(self, _value: object, section: str, entry: str) -> str:
        """Refuse: texts with tables inside are younger than the sha256 beside each path."""
        raise ScenarioError(
            self.file,
            f"sections.{quoted(section)}.{entry}",
            "has no sha256; a scenario with its tables inside has schema = 2 or higher",
        )

    def find(self, path: str, digest: str, key: str) -> TableText:
        """Give the table with a sha256."""
        if digest not in self._texts:
            raise ScenarioError(
                self.file,
                f"{key}_sha256",
                f"names a table that is not inside, {ascii_safe(path)}; use an undamaged copy",
            )
        return TableText(path, self._texts[digest])
