"""The working state of every session, kept on disk and found again by its hash.

A state is one file, the text of :mod:`app.scenario_bundle` under the sha256 of
that text, so that equal states share a file and a damaged one is noticed. The
hash may stand in the address bar. Beside the states lies one small mark for each
session whose state nobody has saved; a mark whose process has died is what there
is to recover.
"""

from __future__ import annotations

import hashlib
import os
import re
import secrets
from collections.abc import Callable
from contextlib import suppress
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

import platformdirs

from app.file_lock import FileLock, try_lock
from app.safe_write import disk_trouble, replace_file, sweep
from app.scenario import Scenario
from app.scenario_bundle import LARGEST_BUNDLE, bundle_text, scenario_from_bundle
from app.scenario_error import ScenarioError

MOST_STATES = 200
"""States that are kept; beyond it the one that was used longest ago goes."""

_HASH = re.compile(r"[0-9a-f]{64}")
_SESSION = re.compile(r"[A-Za-z0-9]{1,64}")
_MARK = re.compile(r"(?P<run>[0-9a-f]{16})-(?P<session>[A-Za-z0-9]{1,64})\.unsaved")


class AutosaveError(ValueError):
    """A working state that cannot be kept or found; the message is one sentence."""


@dataclass(frozen=True)
class Unsaved:
    """A state that was left behind by a session whose process ended without saving it.

    Parameters
    ----------
    digest : str
        What `Autosave.lookup` takes.
    name : str
        Of the scenario; plain text, to be escaped on a page.
    time : datetime.datetime
        When it was last changed, in UTC.
    """

    digest: str
    name: str
    time: datetime


def default_folder() -> Path:
    """Say where states are kept unless told otherwise, whether or not it exists."""
    return Path(platformdirs.user_state_dir("halfspan", appauthor=False)) / "sessions"


class Autosave:
    """The states of one process; make one when it starts and close it when it ends.

    Parameters
    ----------
    folder : pathlib.Path, optional
        Where; `default_folder` unless given. Made when the first state is kept.
    most : int
        States that are kept.
    now : callable
        The time, in UTC.
    """

    def __init__(
        self,
        folder: Path | None = None,
        *,
        most: int = MOST_STATES,
        now: Callable[[], datetime] = lambda: datetime.now(UTC),
    ) -> None:
        self.folder = folder or default_folder()
        self._most, self._now = most, now
        self._run = secrets.token_hex(8)
        self._lock: FileLock | None = None

    def save(self, scenario: Scenario, *, session: str) -> str:
        """Keep the state of a session, as one that nobody has saved.

        Parameters
        ----------
        scenario : Scenario
            Must be valid as a whole.
        session : str
            Tells sessions of this process apart: 1 to 64 letters and digits.

        Returns
        -------
        str
            Its hash, 64 hexadecimal letters, once it is on the disk.

        Raises
        ------
        AutosaveError
            If it cannot be written.
        """
        digest = self.keep(scenario)
        mark = f"{digest}\n{self._now().isoformat()}\n{scenario.name}\n"
        try:
            if self._lock is None:
                self._lock = try_lock(self.folder / f"{self._run}.running")
            replace_file(self._mark(session), mark.encode())
        except OSError as error:
            raise _not_kept(error) from error
        return digest

    def keep(self, scenario: Scenario) -> str:
        """Keep a state so that it is found by its hash, without calling it unsaved.

        Parameters
        ----------
        scenario : Scenario
            Must be valid as a whole.

        Returns
        -------
        str
            Its hash.

        Raises
        ------
        AutosaveError
            If it cannot be written.
        """
        try:
            data = bundle_text(scenario).encode()
        except ScenarioError as error:
            raise AutosaveError(f"The working state could not be kept: {error}.") from error
        digest = hashlib.sha256(data).hexdigest()
        path = self.folder / f"{digest}.toml"
        try:
            if _is(path, digest):
                with suppress(OSError):  # a state that can be read is kept, read-only disk or not
                    os.utime(path)
                return digest
            self.folder.mkdir(parents=True, exist_ok=True, mode=0o700)
            replace_file(path, data)
        except OSError as error:
            raise _not_kept(error) from error
        self._drop_oldest(digest)
        return digest

    def lookup(self, digest: str) -> Scenario:
        """Find a state by its hash.

        Parameters
        ----------
        digest : str
            From `save` or `keep`, perhaps by way of an address: anything else is refused.

        Returns
        -------
        Scenario
            Without a folder.

        Raises
        ------
        AutosaveError
            If there is no such state or it was damaged; nothing outside the
            folder is ever opened.
        """
        if not isinstance(digest, str) or not _HASH.fullmatch(digest):
            raise AutosaveError("The address does not name a working state; open a file instead.")
        path = self.folder / f"{digest}.toml"
        try:
            data = _read(path)
        except FileNotFoundError:
            raise AutosaveError(
                "The working state that the address names is no longer kept; "
                "open the scenario's file or a snapshot instead."
            ) from None
        except OSError as error:
            raise AutosaveError(
                f"The working state cannot be read: {disk_trouble(error)}."
            ) from error
        if hashlib.sha256(data).hexdigest() != digest:
            raise AutosaveError(
                "The working state that the address names was damaged on the disk; "
                "open the scenario's file or a snapshot instead."
            )
        try:
            return scenario_from_bundle(data.decode(), file="the working state")
        except (ScenarioError, UnicodeDecodeError) as error:
            raise AutosaveError(f"The working state cannot be used: {error}.") from error

    def settle(self, session: str) -> None:
        """Take note that a session has nothing unsaved: it was saved, or given up.

        Parameters
        ----------
        session : str
            As for `save`.
        """
        with suppress(OSError):
            self._mark(session).unlink(missing_ok=True)

    def recover(self) -> Unsaved | None:
        """Find the latest state that a dead process left unsaved, and say it once.

        States of processes that still run are theirs. Whatever is found, no mark
        of a dead process stays, so that the next call finds none of them; the
        states themselves are kept as any other.

        Returns
        -------
        Unsaved or None
            None where nothing was left behind.
        """
        found: list[Unsaved] = []
        for path in self._marks():
            match = _MARK.fullmatch(path.name)
            if match is None or not self._is_dead(match["run"]):
                continue
            unsaved = _read_mark(path)
            try:
                path.unlink()
            except OSError:
                continue  # somebody else was first, or the folder is read-only: not offered twice
            if unsaved is not None and (self.folder / f"{unsaved.digest}.toml").is_file():
                found.append(unsaved)
        self._forget_dead()
        return max(found, key=lambda one: one.time, default=None)

    def close(self) -> None:
        """End in peace: nothing of this process is to be recovered."""
        for path in self._marks():
            if path.name.startswith(f"{self._run}-"):
                with suppress(OSError):
                    path.unlink(missing_ok=True)
        if self._lock is not None:
            self._lock.release()
            self._lock = None
        with suppress(OSError):
            (self.folder / f"{self._run}.running").unlink(missing_ok=True)

    def _mark(self, session: str) -> Path:
        if not _SESSION.fullmatch(session):
            raise ValueError(f"session must be 1 to 64 letters and digits; got {session!r}")
        return self.folder / f"{self._run}-{session}.unsaved"

    def _marks(self) -> list[Path]:
        return sorted(self.folder.glob("*.unsaved"))

    def _is_dead(self, run: str) -> bool:
        """Whether the process of a mark no longer holds its lock."""
        if run == self._run:
            return False
        path = self.folder / f"{run}.running"
        if not path.exists():
            return True
        try:
            lock = try_lock(path)
        except OSError:
            return False
        if lock is None:
            return False
        lock.release()
        return True

    def _forget_dead(self) -> None:
        for path in self.folder.glob("*.running"):
            if self._is_dead(path.stem):
                with suppress(OSError):
                    path.unlink(missing_ok=True)

    def _drop_oldest(self, newest: str) -> None:
        """Keep the number of states bounded; a state that a mark names stays."""
        sweep(self.folder)
        marked = {one.digest for path in self._marks() if (one := _read_mark(path))}
        ages = []
        for path in self.folder.glob("*.toml"):
            if _HASH.fullmatch(path.stem) and path.stem not in marked and path.stem != newest:
                with suppress(OSError):
                    ages.append((path.stat().st_mtime_ns, path))
        ages.sort()
        room = max(self._most - len(marked | {newest}), 0)
        for _, path in ages[: max(len(ages) - room, 0)]:
            with suppress(OSError):
                path.unlink(missing_ok=True)


def _not_kept(error: OSError) -> AutosaveError:
    return AutosaveError(f"The working state could not be kept: {disk_trouble(error)}.")


def _read(path: Path) -> bytes:
    # A link could lead out of the folder.
    if path.is_symlink():
        raise FileNotFoundError(path)
    with path.open("rb") as stream:
        return stream.read(4 * LARGEST_BUNDLE + 1)


def _is(path: Path, digest: str) -> bool:
    try:
        return hashlib.sha256(_read(path)).hexdigest() == digest
    except OSError:
        return False


def _read_mark(path: Path) -> Unsaved | None:
    try:
        digest, time, name = path.read_text(encoding="utf-8").split("\n")[:3]
        found = Unsaved(digest=digest, name=name[:200], time=datetime.fromisoformat(time))
        return found if _HASH.fullmatch(digest) and found.time.tzinfo else None
    except (OSError, ValueError):
        return None
