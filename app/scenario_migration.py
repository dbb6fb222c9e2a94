"""How scenario files of older schemas become today's, one step after another.

Each step takes the content of one schema to that of the next, and knows nothing
of the others. A step changes only what it is about: what is wrong in a file is
left for the reader to name.

======  ==========================================================================
schema  what it brought
======  ==========================================================================
1       groups of fields, sections with the paths of their tables
2       the sha256 of each table beside its path, so that a table that was
        changed or mixed up is noticed
======  ==========================================================================
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

SCHEMA = 2
"""The schema that is written, and the newest that is read."""

TABLE_KEYS = ("outline", "lift", "drag")

Content = dict[str, Any]

DigestOf = Callable[[object, str, str], str]
"""Sha256 of the table with a path, as found today; section and entry say which table it is."""


def digest_key(entry: str) -> str:
    """Name the key of a table's sha256.

    Parameters
    ----------
    entry : str
        One of `TABLE_KEYS`.

    Returns
    -------
    str
    """
    return f"{entry}_sha256"


def migrate(content: Mapping[str, Any], *, schema: int, digest_of: DigestOf) -> Content:
    """Bring the content of a file to today's schema.

    Parameters
    ----------
    content : mapping
        As read; not changed.
    schema : int
        Its own, from 1 to `SCHEMA`.
    digest_of : callable
        Finds the sha256 of a table by its path, section and entry.

    Returns
    -------
    dict
        With ``schema`` at `SCHEMA`.

    Raises
    ------
    ScenarioError
        Of `digest_of`, when a table cannot be read.
    """
    current: Content = dict(content)
    for step in range(schema, SCHEMA):
        current = STEPS[step](current, digest_of)
    return {**current, "schema": SCHEMA}


def _add_digests(content: Content, digest_of: DigestOf) -> Content:
    """From 1 to 2: a table is what it holds today."""
    sections = content.get("sections")
    if not isinstance(sections, Mapping):
        return content
    found: dict[str, Any] = {}
    for name, table in sections.items():
        if isinstance(table, Mapping) and set(table) == set(TABLE_KEYS):
            digests = {
                digest_key(entry): digest_of(table[entry], name, entry) for entry in TABLE_KEYS
            }
            found[name] = {**table, **digests}
        else:
            found[name] = table
    return {**content, "sections": found}


STEPS: Mapping[int, Callable[[Content, DigestOf], Content]] = {1: _add_digests}
"""The step that leaves each schema."""
