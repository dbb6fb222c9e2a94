"""The keys of the JSON answer: as printed, and as docs/command-line.md lists them."""

from __future__ import annotations

import re

from scenarios import FOLDER

DOCS = FOLDER.parent / "docs"


def key_paths(value: object, path: str = "") -> set[str]:
    """List the keys of an answer as the documents write them."""
    if isinstance(value, dict):
        return set().union(
            *(key_paths(one, f"{path}.{key}" if path else key) for key, one in value.items())
        )
    if isinstance(value, list) and value and isinstance(value[0], dict):
        return set().union(*(key_paths(one, f"{path}[]") for one in value))
    return {path}


def documented() -> tuple[set[str], set[str]]:
    """Read the requirements' names and the keys from the two tables of the documents."""
    text = (DOCS / "command-line.md").read_text(encoding="utf-8")
    _, names, keys = re.split(r"^\| (?:NAME|key) \|.*$", text, flags=re.MULTILINE)
    rows = [re.findall(r"^\| `([^`]+)` \|", part, re.MULTILINE) for part in (names, keys)]
    if any(len(set(part)) != len(part) for part in rows):
        raise ValueError("a key is documented twice")
    return set(rows[0]), set(rows[1])


def generic(printed: set[str]) -> set[str]:
    """Put NAME and FIELD for the names of requirements and inputs."""
    keys = {re.sub(r"^inputs\.\w+$", "inputs.FIELD", key) for key in printed}
    return {re.sub(r"^margins\.\w+\.", "margins.NAME.", key) for key in keys}
