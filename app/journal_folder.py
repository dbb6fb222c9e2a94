"""The folder of a journal: its files listed, read, moved, and held while they change.

There is no index. A file that is no usable snapshot is set aside, never deleted;
a file that is not the journal's is left alone.
"""

from __future__ import annotations

import os
import secrets
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from app.file_lock import locked
from app.journal_snapshot import (
    ENDING,
    LARGEST_SNAPSHOT,
    USABLE_ID,
    DamagedError,
    JournalError,
    NewerError,
    Snapshot,
    snapshot_from_bytes,
)
from app.safe_write import disk_trouble, replace_file, sweep, sync_folder
from app.scenario_error import ascii_safe

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


class SnapshotFolder:
    """A folder of snapshots and, inside, those that were deleted or damaged.

    Parameters
    ----------
    path : pathlib.Path
        Made when the first file is written.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self._seen: dict[str, tuple[tuple[int, int, int], Snapshot]] = {}

    def place(self, snapshot_id: str, *, inside: str = "") -> Path:
        """Say where the file of a snapshot is, or would be.

        Parameters
        ----------
        snapshot_id : str
            Perhaps from a page: anything that is not an id is refused.
        inside : str
            Empty, or the folder of the deleted ones.

        Returns
        -------
        pathlib.Path

        Raises
        ------
        JournalError
            If it is not an id.
        """
        if not isinstance(snapshot_id, str) or not USABLE_ID.fullmatch(snapshot_id):
            raise JournalError("That is not the name of a snapshot; list the journal again.")
        return self.path / inside / f"{snapshot_id}{ENDING}"

    def listing(self, *, inside: str = "") -> Listing:
        """List the snapshots, newest first, and set aside what is damaged.

        Parameters
        ----------
        inside : str
            Empty, or the folder of the deleted ones.

        Returns
        -------
        Listing

        Raises
        ------
        JournalError
            If the folder cannot be read; one that does not exist is empty.
        """
        found: list[Snapshot] = []
        messages: list[str] = []
        folder = self.path / inside
        try:
            paths = sorted(one for one in folder.iterdir() if one.name.endswith(ENDING))
        except FileNotFoundError:
            return Listing(())
        except OSError as error:
            raise self.refusal("The journal cannot be read", error) from error
        for path in paths:
            try:
                found.append(self.read(path))
            except FileNotFoundError:
                continue  # another window was faster
            except DamagedError as error:
                messages.append(self._set_aside(path, error))
            except NewerError as error:
                messages.append(f"{_said(path)} is not shown: {error}.")
            except OSError as error:
                messages.append(f"{_said(path)} is not shown: {disk_trouble(error)}.")
        found.sort(key=lambda one: (one.taken, one.id), reverse=True)
        return Listing(tuple(found), tuple(messages))

    def read(self, path: Path) -> Snapshot:
        """Read one file; again only when it has changed.

        Parameters
        ----------
        path : pathlib.Path
            In this folder.

        Returns
        -------
        Snapshot

        Raises
        ------
        OSError
            If it cannot be opened.
        DamagedError, NewerError
            If it is no usable snapshot.
        """
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

    def write(self, path: Path, data: bytes) -> None:
        """Put a file in place, on the disk when this returns.

        Parameters
        ----------
        path : pathlib.Path
            From `place`.
        data : bytes

        Raises
        ------
        JournalError
            If it cannot be written.
        """
        try:
            self.path.mkdir(parents=True, exist_ok=True)
            sweep(self.path)
            replace_file(path, data)
        except OSError as error:
            raise self.refusal("The snapshot could not be written", error) from error

    def move(self, path: Path, *, inside: str, done: str) -> str:
        """Move a file between the journal and its folder of deleted ones.

        Parameters
        ----------
        path : pathlib.Path
            From `place`.
        inside : str
            Where to: empty, or the folder of the deleted ones.
        done : str
            What was to be done with it, for the sentence.

        Returns
        -------
        str
            Its id there: another one when that was given already.

        Raises
        ------
        JournalError
            If it has vanished or cannot be moved.
        """
        target = self.path / inside
        try:
            target.mkdir(exist_ok=True)
            target = _free_place(target, path.name)
            os.replace(path, target)  # noqa: PTH105 - the one step that counts
            sync_folder(target.parent)
            sync_folder(path.parent)
        except FileNotFoundError:
            raise vanished(path) from None
        except OSError as error:
            raise self.refusal(f"The snapshot could not be {done}", error) from error
        return target.name.removesuffix(ENDING)

    @contextmanager
    def holding(self, done: str, *, make: bool = False) -> Iterator[None]:
        """Hold the journal against other windows while files are read and changed.

        Parameters
        ----------
        done : str
            What is to be done with a snapshot, for the sentence.
        make : bool
            Make the folder where there is none yet.

        Raises
        ------
        JournalError
            If the folder is gone or nothing may be written in it.
        """
        try:
            if make:
                self.path.mkdir(parents=True, exist_ok=True)
            lock = locked(self.path / LOCK)
            lock.__enter__()
        except FileNotFoundError:
            raise JournalError(
                "The journal's folder is no longer there; nothing was changed."
            ) from None
        except OSError as error:
            raise self.refusal(f"The snapshot could not be {done}", error) from error
        try:
            yield
        finally:
            lock.__exit__(None, None, None)

    def refusal(self, what: str, error: OSError) -> JournalError:
        """Say what the disk refused, where and why."""
        return JournalError(f"{what} in {self.path}: {disk_trouble(error)}.")

    def _set_aside(self, path: Path, error: DamagedError) -> str:
        try:
            folder = self.path / DAMAGED
            folder.mkdir(exist_ok=True)
            target = _free_place(folder, path.name)
            os.replace(path, target)  # noqa: PTH105 - the one step that counts
            sync_folder(folder)
        except OSError as refusal:
            return (
                f"{path.name} is damaged ({error}) and could not be set aside: "
                f"{disk_trouble(refusal)}."
            )
        return f"{path.name} is damaged ({error}); it was moved to {DAMAGED}/{target.name}."


def vanished(path: Path) -> JournalError:
    """Say that a snapshot's file is no longer where it was."""
    return JournalError(
        f"The snapshot {path.name.removesuffix(ENDING)} is no longer there; "
        "it was moved or deleted elsewhere."
    )


def _said(path: Path) -> str:
    """A file's name for a sentence: whoever made the file chose the name."""
    usable = USABLE_ID.fullmatch(path.name.removesuffix(ENDING))
    return path.name if usable else ascii_safe(path.name)


def _free_place(folder: Path, name: str) -> Path:
    """A name in a folder that no file has: the one asked for where it is free."""
    if not (folder / name).exists():
        return folder / name
    return folder / f"{name.removesuffix(ENDING)[:100]}-{secrets.token_hex(6)}{ENDING}"
