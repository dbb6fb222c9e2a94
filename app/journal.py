"""The journal: a folder of snapshots, one plain file each.

There is no index: the folder is the journal. So two windows, two processes or a
version control system may work on it at once. A snapshot that was reported as
taken is on the disk.
"""

from __future__ import annotations

import os
import re
import secrets
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path

import platformdirs

from app.analysis.results import Results
from app.file_lock import locked
from app.journal_picture import planform_svg
from app.journal_snapshot import (
    ENDING,
    LARGEST_SNAPSHOT,
    USABLE_ID,
    DamagedError,
    JournalError,
    NewerError,
    Snapshot,
    key_figure,
    read_snapshot,
    snapshot_text,
)
from app.safe_write import disk_trouble, replace_file, sweep, sync_folder
from app.scenario import SECTION_FIELDS, Scenario
from app.scenario_bundle import bundle_text, scenario_from_bundle
from app.scenario_error import ScenarioError
from app.scenario_file import text_problem

__all__ = ["Journal", "JournalError", "Listing", "Snapshot", "default_folder", "search"]

DELETED, DAMAGED = "deleted", "damaged"
LOCK = ".lock"


@dataclass(frozen=True)
class Listing:
    """What a journal holds.

    Parameters
    ----------
    snapshots : tuple of Snapshot
        Newest first.
    messages : tuple of str
        One sentence for each file that could not be listed.
    """

    snapshots: tuple[Snapshot, ...]
    messages: tuple[str, ...] = ()


def default_folder() -> Path:
    """Say where the journal is unless told otherwise, whether or not it exists."""
    return Path(platformdirs.user_documents_dir()) / "Halfspan journal"


class Journal:
    """Snapshots in one folder.

    Parameters
    ----------
    folder : pathlib.Path or str, optional
        `default_folder` unless given. Made when the first snapshot is taken.
    version : str
        Of Halfspan, to be kept with each snapshot.
    now : callable
        The time, in UTC.
    """

    def __init__(
        self,
        folder: Path | str | None = None,
        *,
        version: str = "",
        now: Callable[[], datetime] = lambda: datetime.now(UTC),
    ) -> None:
        self.folder = Path(folder) if folder is not None else default_folder()
        self._version, self._now = version, now
        self._seen: dict[str, tuple[tuple[int, int, int], Snapshot]] = {}

    def take(self, scenario: Scenario, results: Results, *, name: str, note: str = "") -> Snapshot:
        """Keep a scenario with what it came to.

        Parameters
        ----------
        scenario : Scenario
            Must be valid as a whole.
        results : Results
            Of this scenario, as it is now.
        name : str
            1 to 120 characters on one line; where blank, that of the scenario.
        note : str
            Up to 20,000 characters.

        Returns
        -------
        Snapshot
            Once it is on the disk.

        Raises
        ------
        JournalError
            If name or note cannot be used, the results are of other inputs, or
            the file cannot be written.
        """
        name = name.strip() or scenario.name
        _require_texts(name, note)
        values = scenario.values()
        if any(values.get(field, value) != value for field, value in results.inputs.items()):
            raise JournalError(
                "The figures shown belong to other inputs; take the snapshot again once they "
                "are solved."
            )
        try:
            bundle = bundle_text(scenario)
        except ScenarioError as error:
            raise JournalError(f"The snapshot could not be taken: {error}.") from error
        taken = self._now().astimezone(UTC)
        snapshot = Snapshot(
            id=new_id(name, taken),
            name=name,
            note=note,
            taken=taken,
            version=self._version,
            sections=tuple(dict.fromkeys(str(values[one]) for one in SECTION_FIELDS)),
            figures=tuple(key_figure(margin) for margin in results.margins),
            picture=planform_svg(results.planform),
            bundle=bundle,
        )
        self.write(snapshot)
        return snapshot

    def write(self, snapshot: Snapshot) -> None:
        """Put a snapshot's file in place.

        Parameters
        ----------
        snapshot : Snapshot
            A new one, or one of which name or note have changed.

        Raises
        ------
        JournalError
            If the file cannot be written.
        """
        data = snapshot_text(snapshot).encode()
        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            sweep(self.folder)
            replace_file(self._path(snapshot.id), data)
        except OSError as error:
            raise self._refusal("The snapshot could not be written", error) from error

    def list(self) -> Listing:
        """List every snapshot, newest first.

        A file that is damaged is moved into the folder ``damaged``, never
        deleted, and the rest is listed.

        Returns
        -------
        Listing

        Raises
        ------
        JournalError
            If the folder cannot be read; one that does not exist is empty.
        """
        return self._listing(self.folder)

    def deleted(self) -> Listing:
        """List what was deleted, as `list` does; the ids are those `bring_back` takes."""
        return self._listing(self.folder / DELETED)

    def get(self, snapshot_id: str) -> Snapshot:
        """Read one snapshot again.

        Parameters
        ----------
        snapshot_id : str
            Its id, perhaps from a page: anything else is refused.

        Returns
        -------
        Snapshot

        Raises
        ------
        JournalError
            If it is no longer there or cannot be read.
        """
        path = self._path(snapshot_id)
        try:
            return self._read(path)
        except FileNotFoundError:
            raise _vanished(snapshot_id) from None
        except OSError as error:
            raise self._refusal("The snapshot cannot be read", error) from error
        except (DamagedError, NewerError) as error:
            raise JournalError(f"{path.name} cannot be read: {error}.") from error

    def restore(self, snapshot: Snapshot) -> Scenario:
        """Make the scenario of a snapshot.

        Parameters
        ----------
        snapshot : Snapshot
            From this journal.

        Returns
        -------
        Scenario
            Equal to the one that was kept; without a folder.

        Raises
        ------
        JournalError
            If it cannot be used.
        """
        return scenario_of(snapshot)

    def rename(self, snapshot: Snapshot, *, name: str, note: str | None = None) -> Snapshot:
        """Give a snapshot another name, or another note.

        Parameters
        ----------
        snapshot : Snapshot
            As it was listed: what another window has changed since is not
            overwritten.
        name, note : str
            As for `take`; the note stays unless given.

        Returns
        -------
        Snapshot

        Raises
        ------
        JournalError
            If they cannot be used, the snapshot has vanished or changed, or the
            file cannot be written.
        """
        note = snapshot.note if note is None else note
        name = name.strip()
        _require_texts(name, note)
        with self._locked("renamed"):
            present = self.get(snapshot.id)
            if (present.name, present.note) != (snapshot.name, snapshot.note):
                raise JournalError(
                    f"“{snapshot.name}” was changed in another window and is now "
                    f"“{present.name}”; look at it and rename it again."
                )
            renamed = replace(present, name=name, note=note)
            self.write(renamed)
        return renamed

    def delete(self, snapshot: Snapshot) -> str:
        """Move a snapshot into the folder ``deleted``.

        Parameters
        ----------
        snapshot : Snapshot
            From this journal.

        Returns
        -------
        str
            What `bring_back` takes to undo it.

        Raises
        ------
        JournalError
            If it has vanished or cannot be moved.
        """
        with self._locked("deleted"):
            return self._move(self._path(snapshot.id), self.folder / DELETED, "deleted")

    def bring_back(self, deleted_id: str) -> Snapshot:
        """Undo a deletion.

        Parameters
        ----------
        deleted_id : str
            From `delete` or `deleted`.

        Returns
        -------
        Snapshot
            Back in the journal.

        Raises
        ------
        JournalError
            If it has vanished or cannot be moved.
        """
        name = self._path(deleted_id).name
        with self._locked("brought back"):
            found = self._move(self.folder / DELETED / name, self.folder, "brought back")
        return self.get(found)

    # How it is done

    def _path(self, snapshot_id: str) -> Path:
        if not isinstance(snapshot_id, str) or not USABLE_ID.fullmatch(snapshot_id):
            raise JournalError("That is not the name of a snapshot; list the journal again.")
        return self.folder / f"{snapshot_id}{ENDING}"

    def _listing(self, folder: Path) -> Listing:
        found: list[Snapshot] = []
        messages: list[str] = []
        try:
            paths = sorted(one for one in folder.iterdir() if one.name.endswith(ENDING))
        except FileNotFoundError:
            return Listing(())
        except OSError as error:
            raise self._refusal("The journal cannot be read", error) from error
        for path in paths:
            try:
                found.append(self._read(path))
            except FileNotFoundError:
                continue  # another window was faster
            except DamagedError as error:
                messages.append(self._set_aside(path, error))
            except NewerError as error:
                messages.append(f"{path.name} is not shown: {error}.")
            except OSError as error:
                messages.append(f"{path.name} is not shown: {disk_trouble(error)}.")
        found.sort(key=lambda one: (one.taken, one.id), reverse=True)
        return Listing(tuple(found), tuple(messages))

    def _read(self, path: Path) -> Snapshot:
        if path.is_symlink() or not path.is_file():
            if not path.exists():
                raise FileNotFoundError(path)
            raise NewerError("it is not a regular file")
        name = path.name.removesuffix(ENDING)
        if not USABLE_ID.fullmatch(name):
            raise NewerError("its name is not one that the journal gives")
        status = path.stat()
        stamp = (status.st_ino, status.st_mtime_ns, status.st_size)
        if (seen := self._seen.get(str(path))) and seen[0] == stamp:
            return seen[1]
        with path.open("rb") as stream:
            data = stream.read(LARGEST_SNAPSHOT + 1)
        snapshot = snapshot_from_bytes(data, name=name)
        self._seen[str(path)] = (stamp, snapshot)
        return snapshot

    def _set_aside(self, path: Path, error: DamagedError) -> str:
        try:
            place = self.folder / DAMAGED
            place.mkdir(exist_ok=True)
            target = _free_place(place, path.name)
            os.replace(path, target)  # noqa: PTH105 - the one step that counts
            sync_folder(self.folder)
        except OSError as refusal:
            return (
                f"{path.name} is damaged ({error}) and could not be set aside: "
                f"{disk_trouble(refusal)}."
            )
        return f"{path.name} is damaged ({error}); it was moved to {DAMAGED}/{target.name}."

    def _move(self, path: Path, place: Path, done: str) -> str:
        try:
            place.mkdir(exist_ok=True)
            target = _free_place(place, path.name)
            os.replace(path, target)  # noqa: PTH105 - the one step that counts
            sync_folder(place)
            sync_folder(path.parent)
        except FileNotFoundError:
            raise _vanished(path.name.removesuffix(ENDING)) from None
        except OSError as error:
            raise self._refusal(f"The snapshot could not be {done}", error) from error
        return target.name.removesuffix(ENDING)

    @contextmanager
    def _locked(self, done: str) -> Iterator[None]:
        """Hold the journal against other windows while a file is read and changed."""
        try:
            lock = locked(self.folder / LOCK)
            lock.__enter__()
        except FileNotFoundError:
            raise JournalError(
                "The journal's folder is no longer there; nothing was changed."
            ) from None
        except OSError as error:
            raise self._refusal(f"The snapshot could not be {done}", error) from error
        try:
            yield
        finally:
            lock.__exit__(None, None, None)

    def _refusal(self, what: str, error: OSError) -> JournalError:
        return JournalError(f"{what} in {self.folder}: {disk_trouble(error)}.")


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
        As `app.journal_snapshot.read_snapshot`.
    """
    if len(data) > LARGEST_SNAPSHOT:
        raise DamagedError(f"it has more than {LARGEST_SNAPSHOT / 1e6:g} MB")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise DamagedError("it is not text") from error
    return read_snapshot(text.replace("\r\n", "\n"), name=name)


def scenario_of(snapshot: Snapshot) -> Scenario:
    """Make the scenario of a snapshot; see `Journal.restore`."""
    try:
        return scenario_from_bundle(snapshot.bundle, file=f"the snapshot “{snapshot.name}”")
    except ScenarioError as error:
        raise JournalError(f"It cannot be restored: {error}.") from error


def search(snapshots: Sequence[Snapshot], words: str) -> tuple[Snapshot, ...]:
    """Find snapshots by words in their name, note or section names.

    Parameters
    ----------
    snapshots : sequence of Snapshot
        In the order that is kept.
    words : str
        All of them must occur, upper and lower case alike; none finds all.

    Returns
    -------
    tuple of Snapshot
    """
    wanted = words.casefold().split()

    def text(one: Snapshot) -> str:
        return "\n".join((one.name, one.note, *one.sections)).casefold()

    return tuple(one for one in snapshots if all(word in text(one) for word in wanted))


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


def _require_texts(name: str, note: str) -> None:
    for what, text in (("name", name), ("note", note)):
        if problem := text_problem(what, text):
            raise JournalError(f"The {what} {problem}.")


def _vanished(snapshot_id: str) -> JournalError:
    return JournalError(
        f"The snapshot {snapshot_id} is no longer there; "
        "it was renamed, moved or deleted elsewhere."
    )


def _free_place(folder: Path, name: str) -> Path:
    """A name in a folder that no file has: the one asked for where it is free."""
    if not (folder / name).exists():
        return folder / name
    return folder / f"{name.removesuffix(ENDING)[:100]}-{secrets.token_hex(6)}{ENDING}"
