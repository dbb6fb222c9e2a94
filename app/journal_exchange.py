"""Snapshots out of a journal and into another: one as its file, many as a zip.

What comes in may have been written by anybody. Nothing of it is unpacked by its
own path; everything is read within limits, and only what proves to be a snapshot
whose scenario can be used is written, under a name that the journal gives.
"""

from __future__ import annotations

import io
import zipfile
import zlib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import PurePosixPath

from app.journal import Journal
from app.journal_folder import DAMAGED, DELETED
from app.journal_snapshot import (
    ENDING,
    LARGEST_SNAPSHOT,
    USABLE_ID,
    DamagedError,
    JournalError,
    NewerError,
    Snapshot,
    new_id,
    scenario_of,
    snapshot_from_bytes,
    snapshot_text,
)
from app.scenario_error import ascii_safe

LARGEST_UPLOAD = 15_000_000
"""Largest file that is taken in [bytes]: what a browser hands over in one piece."""

LARGEST_UNPACKED = 100_000_000
"""Largest content of a zip, all files together [bytes]."""

MOST_MEMBERS = 1000
MOST_MESSAGES = 10

_BROKEN = (
    zipfile.BadZipFile,
    zlib.error,
    EOFError,
    NotImplementedError,
    RuntimeError,
    OSError,
    ValueError,
)


@dataclass(frozen=True)
class Imported:
    """What came of taking files in.

    Parameters
    ----------
    snapshots : tuple of Snapshot
        Now in the journal.
    present : int
        How many were there already, word for word.
    messages : tuple of str
        One sentence for each file that could not be taken, and one for the
        others that were left out.
    """

    snapshots: tuple[Snapshot, ...]
    present: int = 0
    messages: tuple[str, ...] = ()


def export_one(snapshot: Snapshot) -> tuple[str, bytes]:
    """Give a snapshot as a file.

    Parameters
    ----------
    snapshot : Snapshot

    Returns
    -------
    name : str
        What the file should be called: letters, digits, dashes and dots.
    data : bytes
        What the journal's own file holds.
    """
    return f"{snapshot.id}{ENDING}", snapshot_text(snapshot).encode()


def export_all(snapshots: Sequence[Snapshot]) -> bytes:
    """Give many snapshots as one zip.

    Parameters
    ----------
    snapshots : sequence of Snapshot

    Returns
    -------
    bytes
        The same for the same snapshots.
    """
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
        for snapshot in snapshots:
            name, data = export_one(snapshot)
            taken = max(snapshot.taken.timetuple()[:6], (1980, 1, 1, 0, 0, 0))
            entry = zipfile.ZipInfo(name, date_time=taken)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            archive.writestr(entry, data)
    return packed.getvalue()


def import_into(journal: Journal, data: bytes, *, file: str) -> Imported:
    """Take in a snapshot, or a zip of them.

    Parameters
    ----------
    journal : Journal
        Where to; what is there already is not taken twice.
    data : bytes
        The content of the file.
    file : str
        Its name, for the sentences.

    Returns
    -------
    Imported

    Raises
    ------
    JournalError
        If it is no such file, too large, made to do harm, or cannot be written.
        What was taken before the disk refused stays.
    """
    said = ascii_safe(file)
    if len(data) > LARGEST_UPLOAD:
        raise JournalError(
            f"{said} has {len(data) / 1e6:.3g} MB; at most {LARGEST_UPLOAD / 1e6:g} MB can be "
            "taken in at once, so export fewer snapshots into it."
        )
    if not data.startswith(b"PK"):
        try:
            found = _usable(data, file)
        except (DamagedError, NewerError) as error:
            raise JournalError(f"{said} cannot be taken in: {error}.") from error
        return _take_in(journal, [found], [])
    found_many: list[Snapshot] = []
    messages: list[str] = []
    foreign = 0
    for name, content in _members(data, said):
        if content is None:
            foreign += 1
            continue
        try:
            found_many.append(_usable(content, name))
        except (DamagedError, NewerError) as error:
            messages.append(f"{ascii_safe(name)} was left out: {error}.")
    if not found_many and not messages:
        raise JournalError(f"{said} has no snapshot in it; their names end in {ENDING}.")
    if foreign:
        files = "1 file that is" if foreign == 1 else f"{foreign} files that are"
        messages.append(f"Left out: {files} no snapshot of a journal.")
    if len(messages) > MOST_MESSAGES:
        more = len(messages) - MOST_MESSAGES + 1
        messages = [*messages[: MOST_MESSAGES - 1], f"{more} more files were left out."]
    return _take_in(journal, found_many, messages)


def _usable(data: bytes, name: str) -> Snapshot:
    """Read a snapshot and see that its scenario can be restored."""
    snapshot = snapshot_from_bytes(data, name="incoming")
    try:
        scenario_of(snapshot)
    except JournalError as error:
        raise DamagedError(str(error).rstrip(".")) from error
    stem = PurePosixPath(name.replace("\\", "/")).name.removesuffix(ENDING)
    usable = USABLE_ID.fullmatch(stem)
    return replace(snapshot, id=stem if usable else new_id(snapshot.name, snapshot.taken))


def _members(data: bytes, said: str) -> Iterator[tuple[str, bytes | None]]:
    """Unpack a zip within limits: name and content, None where it is no snapshot's file."""
    try:
        archive = zipfile.ZipFile(io.BytesIO(data))
    except _BROKEN as error:
        raise JournalError(f"{said} is a damaged zip; export it again.") from error
    with archive:
        members = [one for one in archive.infolist() if not one.is_dir()]
        if len(members) > MOST_MEMBERS:
            raise JournalError(
                f"{said} has {len(members)} files in it; at most {MOST_MEMBERS} can be taken in "
                "at once."
            )
        for one in members:
            if _leads_out(one.filename) or _leads_out(one.orig_filename):
                raise JournalError(
                    f"{said} has a file in it that leads out of its folder, "
                    f"{ascii_safe(one.orig_filename)}; nothing of it was taken in."
                )
        left = LARGEST_UNPACKED
        for one in members:
            path = PurePosixPath(one.filename)
            if not path.name.endswith(ENDING) or path.name.startswith("."):
                yield one.filename, None
                continue
            if path.parent.name in (DELETED, DAMAGED):
                continue  # a whole journal that somebody packed
            content = _content(archive, one, min(left, LARGEST_SNAPSHOT) + 1, said)
            left -= len(content)
            if left < 0:
                raise JournalError(
                    f"{said} unpacks to more than {LARGEST_UNPACKED / 1e6:g} MB; "
                    "nothing of it was taken in."
                )
            yield one.filename, content


def _leads_out(name: str) -> bool:
    path = PurePosixPath(name.replace("\\", "/"))
    return path.is_absolute() or ".." in path.parts or ":" in name or "\0" in name


def _content(archive: zipfile.ZipFile, member: zipfile.ZipInfo, most: int, said: str) -> bytes:
    try:
        # What a zip says about its sizes may be untrue: only what is read counts.
        with archive.open(member) as stream:
            return stream.read(most)
    except _BROKEN as error:
        raise JournalError(
            f"{said} is damaged or locked at {ascii_safe(member.filename)}; export it again."
        ) from error


def _take_in(journal: Journal, found: Sequence[Snapshot], messages: Sequence[str]) -> Imported:
    present = 0
    taken: list[Snapshot] = []
    with journal.files.holding("taken in", make=True):
        there = {_words(one) for one in journal.list().snapshots}
        for snapshot in found:
            words = _words(snapshot)
            if words in there:
                present += 1
                continue
            there.add(words)
            name = snapshot.id
            if journal.files.place(name).exists():
                name = new_id(snapshot.name, snapshot.taken)
            journal.write(named := replace(snapshot, id=name))
            taken.append(named)
    return Imported(tuple(taken), present, tuple(messages))


def _words(snapshot: Snapshot) -> str:
    """All of a snapshot but its id: what makes two the same."""
    return snapshot_text(snapshot)
