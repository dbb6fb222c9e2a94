"""One snapshot of the journal: what it holds, and the one plain file it is.

The file is TOML made to be read and compared by a person: name, note and time
first, then the key figures, a picture of the planform, and the scenario word for
word with its tables inside.
"""

from __future__ import annotations

import hashlib
import re
import secrets
from collections.abc import Mapping
from dataclasses import dataclass, fields
from datetime import UTC, datetime
from typing import Any

from app.analysis.results import Margin, Verdict
from app.journal_picture import is_planform_svg
from app.scenario import Scenario
from app.scenario_bundle import LARGEST_BUNDLE, scenario_from_bundle
from app.scenario_error import ScenarioError
from app.scenario_file import parse, text_problem
from app.toml_text import block, line_string

FORMAT = 1
LARGEST_SNAPSHOT = LARGEST_BUNDLE + 1_000_000
"""Largest file of a snapshot [bytes]."""

ENDING = ".snapshot.toml"
"""Ending of a snapshot's file: only such files are the journal's."""

USABLE_ID = re.compile(r"[A-Za-z0-9][A-Za-z0-9-]{0,119}")
"""What a snapshot may be called on disk, without the ending."""

MOST_FIGURES = 100

_HEAD = """\
# A snapshot from a Halfspan journal.
# Name and note may be edited; the rest belongs together.
"""


class JournalError(ValueError):
    """Something the journal cannot do; the message is one sentence for the user."""


class DamagedError(JournalError):
    """A file that is no usable snapshot."""


class NewerError(JournalError):
    """A snapshot that a newer Halfspan has written."""


@dataclass(frozen=True)
class KeyFigure:
    """One margin as it was; the fields are those of `app.analysis.results.Margin`."""

    key: str
    label: str
    value: float
    low: float
    high: float
    limit: float
    sense: str
    unit: str
    verdict: str
    reason: str

    @property
    def margin(self) -> float:
        """Distance from the limit, positive when met, in `unit`."""
        return self.value - self.limit if self.sense == "at least" else self.limit - self.value


@dataclass(frozen=True)
class Snapshot:
    """A scenario as it was, with what it came to.

    Parameters
    ----------
    id : str
        Name of its file without the ending.
    name, note : str
        Plain text, to be escaped on a page.
    taken : datetime.datetime
        When, in UTC.
    version : str
        Of the Halfspan that took it.
    sections : tuple of str
        Names of the sections of wing and tail, each once.
    figures : tuple of KeyFigure
        The margins.
    picture : str
        The planform as SVG from `app.journal_picture`, safe to put into a page as
        it is; empty when the file had another.
    bundle : str
        The scenario with its tables, for `app.scenario_bundle.scenario_from_bundle`.
    """

    id: str
    name: str
    note: str
    taken: datetime
    version: str
    sections: tuple[str, ...]
    figures: tuple[KeyFigure, ...]
    picture: str
    bundle: str


def key_figure(margin: Margin) -> KeyFigure:
    """Keep one margin.

    Parameters
    ----------
    margin : Margin
        From the results.

    Returns
    -------
    KeyFigure
    """
    values = {entry.name: getattr(margin, entry.name) for entry in fields(KeyFigure)}
    numbers = {name: float(values[name]) for name in _NUMBERS}
    return KeyFigure(**{**values, **numbers, "verdict": str(margin.verdict)})


_NUMBERS = ("value", "low", "high", "limit")
_WORDS = ("key", "label", "sense", "unit", "verdict", "reason")


def snapshot_text(snapshot: Snapshot) -> str:
    """Word a snapshot as its file.

    Parameters
    ----------
    snapshot : Snapshot

    Returns
    -------
    str
        TOML; the id is not in it, since it is the file's name.
    """
    note = block(snapshot.note) if "\n" in snapshot.note else line_string(snapshot.note)
    lines = [
        _HEAD,
        f"snapshot = {FORMAT}",
        f"name = {line_string(snapshot.name)}",
        f"note = {note}",
        f"taken = {snapshot.taken.astimezone(UTC).isoformat().replace('+00:00', 'Z')}",
        f"halfspan = {line_string(snapshot.version)}",
        f"sections = [{', '.join(line_string(name) for name in snapshot.sections)}]",
    ]
    for figure in snapshot.figures:
        lines.append("\n[[figures]]")
        for entry in fields(KeyFigure):
            value = getattr(figure, entry.name)
            said = line_string(value) if isinstance(value, str) else repr(float(value))
            lines.append(f"{entry.name} = {said}")
    digest = hashlib.sha256(snapshot.bundle.encode()).hexdigest()
    lines += [
        "\n[picture]",
        f"svg = {block(snapshot.picture)}",
        "\n[scenario]",
        f"sha256 = {line_string(digest)}",
        f"text = {block(snapshot.bundle)}\n",
    ]
    return "\n".join(lines)


def read_snapshot(text: str, *, name: str) -> Snapshot:
    """Read the file of a snapshot.

    Parameters
    ----------
    text : str
        Its content.
    name : str
        Its id.

    Returns
    -------
    Snapshot
        Whose scenario is the one that was kept; whether it can still be used is
        for `scenario_from_bundle` to say.

    Raises
    ------
    DamagedError
        If it is no snapshot or no longer the one that was written.
    NewerError
        If a newer Halfspan has written it.
    """
    try:
        content = parse(text, "the file")
    except ScenarioError as error:
        raise DamagedError(str(error)) from error
    kind = content.get("snapshot")
    if type(kind) is not int or kind < 1:
        raise DamagedError("it is not a snapshot of Halfspan")
    if kind > FORMAT:
        raise NewerError("a newer Halfspan has written it")
    try:
        return _snapshot(content, name)
    except (KeyError, TypeError) as error:
        raise DamagedError("something that belongs to a snapshot is missing in it") from error


def snapshot_from_bytes(data: bytes, *, name: str) -> Snapshot:
    """Read the bytes of a snapshot's file.

    Parameters
    ----------
    data : bytes
    name : str
        Its id.

    Returns
    -------
    Snapshot

    Raises
    ------
    DamagedError, NewerError
        As :func:`read_snapshot`.
    """
    if len(data) > LARGEST_SNAPSHOT:
        raise DamagedError(f"it has more than {LARGEST_SNAPSHOT / 1e6:g} MB")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise DamagedError("it is not text") from error
    return read_snapshot(text.replace("\r\n", "\n"), name=name)


def scenario_of(snapshot: Snapshot) -> Scenario:
    """Make the scenario of a snapshot; see `app.journal.Journal.restore`."""
    try:
        return scenario_from_bundle(snapshot.bundle, file=f"the snapshot “{snapshot.name}”")
    except ScenarioError as error:
        raise JournalError(f"It cannot be restored: {error}.") from error


def new_id(name: str, taken: datetime) -> str:
    """Make an id that sorts by time, reads as the name, and no other snapshot has.

    Parameters
    ----------
    name : str
    taken : datetime.datetime
        In UTC.

    Returns
    -------
    str
    """
    word = re.sub(r"[^A-Za-z0-9]+", "-", name).strip("-")[:40].strip("-") or "snapshot"
    return f"{taken:%Y%m%dT%H%M%SZ}-{word}-{secrets.token_hex(6)}"


def _snapshot(content: Mapping[str, Any], name: str) -> Snapshot:
    bundle = _text(content["scenario"]["text"])
    if hashlib.sha256(bundle.encode()).hexdigest() != content["scenario"]["sha256"]:
        raise DamagedError("its scenario is no longer the one that was kept")
    for what in ("name", "note"):
        if problem := text_problem(what, _text(content[what])):
            raise DamagedError(f"its {what} {problem}")
    taken = content["taken"]
    if not isinstance(taken, datetime) or taken.tzinfo is None:
        raise DamagedError("its time is none")
    picture = _text(content["picture"]["svg"])
    figures = content.get("figures", [])
    sections = content["sections"]
    if len(figures) > MOST_FIGURES or len(sections) > MOST_FIGURES:
        raise DamagedError("it has more figures or sections than a snapshot has")
    return Snapshot(
        id=name,
        name=content["name"],
        note=content["note"],
        taken=taken.astimezone(UTC),
        version=_text(content["halfspan"])[:40],
        sections=tuple(_text(one)[:80] for one in sections),
        figures=tuple(_figure(one) for one in figures),
        picture=picture if is_planform_svg(picture) else "",
        bundle=bundle,
    )


def _figure(content: Mapping[str, Any]) -> KeyFigure:
    read: dict[str, Any] = {}
    for name in _NUMBERS:
        if isinstance(content[name], bool) or not isinstance(content[name], (int, float)):
            raise DamagedError("one of its figures is not a number")
        read[name] = float(content[name])
    for name in _WORDS:
        read[name] = _text(content[name])[:2000]
    if read["verdict"] not in tuple(Verdict) or read["sense"] not in ("at least", "at most"):
        raise DamagedError("one of its figures has no verdict")
    return KeyFigure(**read)


def _text(value: object) -> str:
    if not isinstance(value, str):
        raise DamagedError("something that should be text is not")
    return value
