"""One session's working state, kept on disk a moment after each change."""

from __future__ import annotations

import secrets
import time
from collections.abc import Callable
from datetime import UTC, datetime

from app.autosave import AutosaveError, Unsaved
from app.history import State, state_of
from app.scenario import Scenario
from app.workspace import Workspace

QUIET = 0.25
"""A state is kept once nothing has changed for so long [s]..."""

LONGEST = 2.0
"""...or once so long has passed since the first change that is not kept [s]."""

Later = Callable[[Callable[[], None], int], object]
"""Calls something after so many milliseconds."""


class Keeper:
    """Keeps the working state of one session.

    Parameters
    ----------
    workspace : Workspace
        Where to.
    scenario : Scenario
        The session's own.
    later : callable, optional
        Calls back later; without one, a change is kept when `flush` is called.
    told : callable
        Told the hash of the state that is kept, and the trouble there was.
    clock : callable
        Seconds that only rise.
    """

    def __init__(
        self,
        workspace: Workspace,
        scenario: Scenario,
        *,
        later: Later | None = None,
        told: Callable[[str, str], None] = lambda digest, trouble: None,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self.workspace, self.scenario = workspace, scenario
        self.key = secrets.token_hex(8)
        self.digest = ""
        self.trail: set[str] = set()
        self.pending = False
        self.saved: State = workspace.saved
        self.file_text = workspace.file_text
        self._kept_in_journal: State | None = None
        self._later, self._told, self._clock = later, told, clock
        self._first = self._newest = 0.0
        self._changed_at = datetime.now(UTC)
        workspace.join(self)

    @property
    def is_saved(self) -> bool:
        """Whether the file holds just this."""
        return state_of(self.scenario) == self.saved

    @property
    def safe(self) -> bool:
        """Whether the file or a snapshot holds just this."""
        return state_of(self.scenario) in (self.saved, self._kept_in_journal)

    def touch(self) -> None:
        """Take note of a change; it is kept in a moment."""
        self._changed_at, self._newest = datetime.now(UTC), self._clock()
        if not self.pending:
            self.pending, self._first = True, self._newest
            self._wait()

    def flush(self) -> None:
        """Keep what has changed now."""
        if not self.pending:
            return
        self.pending = False
        autosave = self.workspace.autosave
        try:
            if self.safe:
                self.digest = autosave.keep(self.scenario)
                autosave.settle(self.key)
            else:
                self.digest = autosave.save(self.scenario, session=self.key)
        except AutosaveError as error:
            self._told(self.digest, str(error))
            return
        self.trail.add(self.digest)
        self._told(self.digest, "")

    def saved_to_file(self) -> None:
        """Take note that the file holds the present state."""
        self.workspace.was_saved(self.scenario)
        self.saved, self.file_text = self.workspace.saved, self.workspace.file_text
        self.touch()

    def saved_to_journal(self) -> None:
        """Take note that a snapshot holds the present state."""
        self._kept_in_journal = state_of(self.scenario)
        self.touch()

    def unsaved(self) -> Unsaved:
        """Describe the present state as one that was left behind."""
        return Unsaved(self.digest, self.scenario.name, self._changed_at)

    def _wait(self) -> None:
        if self._later is not None:
            self._later(self._tick, round(1e3 * QUIET))

    def _tick(self) -> None:
        now = self._clock()
        still = now - self._newest < 0.8 * QUIET and now - self._first < LONGEST
        if self.pending and still:
            self._wait()
        else:
            self.flush()
