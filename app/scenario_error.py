"""How a scenario file that cannot be used is named: one class, one wording."""

from __future__ import annotations

import re
from collections.abc import Mapping

from app.scenario import FIELDS, nearest
from solver.errors import InputError


class ScenarioError(ValueError):
    """A scenario file that cannot be used, in one sentence.

    Parameters
    ----------
    file : str
        The file, as the user named it.
    key : str
        The dotted key at fault; empty when it is the file as a whole.
    message : str
        What is wrong and what is allowed, to follow file and key.
    """

    def __init__(self, file: str, key: str, message: str) -> None:
        self.file, self.key, self.message = file, key, message
        super().__init__(f"{file}: {key} {message}" if key else f"{file} {message}")

    def __reduce__(self) -> tuple[type, tuple[str, str, str]]:
        # Without this the error does not survive a process boundary.
        return type(self), (self.file, self.key, self.message)


def input_refusal(error: InputError, file: str) -> ScenarioError:
    """Word a refused field as a fault of the file.

    Parameters
    ----------
    error : InputError
        Its name is a field of the scenario.
    file : str
        What the sentence calls the file.

    Returns
    -------
    ScenarioError
        With the dotted key of the field.
    """
    entry = FIELDS.get(error.name)
    key = f"{entry.group}.{entry.name}" if entry else error.name
    return ScenarioError(file, key, f"must be {error.requirement}; got {shown(error.value)}")


def shown(value: object) -> str:
    """Show a value in a sentence: as TOML would, on one line, cut when long.

    Parameters
    ----------
    value : object
        Anything that TOML can hold.

    Returns
    -------
    str
        At most about 60 characters.
    """
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, list):
        return "a list"
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        value = int(value)
    text = ascii_safe(value) if isinstance(value, str) else f"{value}"
    return text if len(text) <= 60 else f"{text[:57]}..."


def ascii_safe(text: str) -> str:
    """Quote a text so that no control character reaches a terminal."""
    return repr(text[:80])


def unknown(file: str, table: str, name: str, known: tuple[str, ...]) -> ScenarioError:
    """Word a table or key that is not known, with the nearest that is.

    Parameters
    ----------
    file : str
        What the sentence calls the file.
    table : str
        Where it stands; empty for the file itself.
    name : str
        What was written.
    known : tuple of str
        What there is in that place.

    Returns
    -------
    ScenarioError
        With the dotted key.
    """
    dotted = f"{table}.{quoted(name)}" if table else quoted(name)
    if (entry := FIELDS.get(name)) and entry.group != table:
        return ScenarioError(file, dotted, f"is in the wrong place; it belongs in [{entry.group}]")
    kind = "key" if table else "table"
    guess = nearest(name, known)
    allowed = f"there are {', '.join(known)}" if len(known) < 12 or not guess else ""
    allowed = allowed or "`halfspan fields` lists all"
    return ScenarioError(file, dotted, f"is not a known {kind}{guess}; {allowed}")


def quoted(name: str) -> str:
    """Write a key as TOML would: quoted unless it is a bare word."""
    if re.fullmatch(r"[A-Za-z0-9_-]{1,60}", name):
        return name
    return '"' + ascii_safe(name if len(name) <= 60 else f"{name[:57]}...")[1:-1] + '"'
