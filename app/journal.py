"""The journal: a folder of snapshots, one plain file each.

There is no index: the folder is the journal. So two windows, two processes or a
version control system may work on it at once. A snapshot that was reported as
taken is on the disk.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path

import platformdirs

from app.analysis.results import Results
from app.journal_folder import DELETED, Listing, SnapshotFolder, vanished
from app.journal_picture import planform_svg
from app.journal_snapshot import (
    DamagedError,
    JournalError,
    NewerError,
    Snapshot,
    key_figure,
    new_id,
    read_snapshot,
    scenario_of,
    snapshot_text,
)
from app.scenario import SECTION_FIELDS, Scenario
from app.scenario_bundle import bundle_text
from app.scenario_error import ScenarioError
from app.scenario_file import text_problem

__all__ = ["Journal", "JournalError", "Listing", "Snapshot", "default_folder", "search"]


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
        self.files = SnapshotFolder(self.folder)

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
        try:
            read_snapshot(snapshot_text(snapshot), name=snapshot.id)
        except DamagedError as error:  # what is kept must be readable again
            raise JournalError(f"The snapshot could not be taken: {error}.") from error
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
        self.files.write(self.files.place(snapshot.id), snapshot_text(snapshot).encode())

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
        return self.files.listing()

    def deleted(self) -> Listing:
        """List what was deleted, as `list` does; the ids are those `bring_back` takes."""
        return self.files.listing(inside=DELETED)

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
        path = self.files.place(snapshot_id)
        try:
            return self.files.read(path)
        except FileNotFoundError:
            raise vanished(path) from None
        except OSError as error:
            raise self.files.refusal("The snapshot cannot be read", error) from error
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
        with self.files.holding("renamed"):
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
        with self.files.holding("deleted"):
            path = self.files.place(snapshot.id)
            return self.files.move(path, inside=DELETED, done="deleted")

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
        path = self.files.place(deleted_id, inside=DELETED)
        with self.files.holding("brought back"):
            found = self.files.move(path, inside="", done="brought back")
        return self.get(found)


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


def _require_texts(name: str, note: str) -> None:
    for what, text in (("name", name), ("note", note)):
        if problem := text_problem(what, text):
            raise JournalError(f"The {what} {problem}.")
