"""What all sessions of one program share: analysis, journal, working states, the opened file."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Protocol

from app.analysis.results import Results
from app.autosave import Autosave, AutosaveError, Unsaved
from app.history import State, state_of
from app.inputs import Inputs
from app.journal import Journal
from app.scenario import Scenario

if TYPE_CHECKING:
    from app.keeper import Keeper


class Solves(Protocol):
    """What the page needs of the analysis."""

    def run(self, inputs: Inputs, *, want: frozenset[str]) -> Results:
        """Solve one scenario."""


@dataclass(frozen=True)
class Start:
    """What a session begins with.

    Parameters
    ----------
    scenario : Scenario
        The session's own.
    taken_up : bool
        Whether it is a working state that the address named.
    trouble : str
        Why the address could not be followed, as a sentence; or empty.
    """

    scenario: Scenario
    taken_up: bool = False
    trouble: str = ""


class Workspace:
    """One program's analysis, journal, working states and opened file.

    Parameters
    ----------
    scenario : Scenario
        What was opened; every session begins with a copy.
    analysis : Solves
        Shared, since it remembers.
    journal : Journal
        Where snapshots go.
    autosave : Autosave
        Where working states go; what a dead process left behind is taken from it.
    file : pathlib.Path, optional
        The scenario file that was opened and may be saved to; the only file
        outside the journal that the page ever writes.
    """

    def __init__(
        self,
        scenario: Scenario,
        analysis: Solves,
        *,
        journal: Journal,
        autosave: Autosave,
        file: Path | None = None,
    ) -> None:
        self.scenario, self.analysis = scenario, analysis
        self.journal, self.autosave, self.file = journal, autosave, file
        self.journal_messages: list[str] = []
        self.saved: State = state_of(scenario)
        self.file_text = scenario.source_text
        self.left: Unsaved | None = autosave.recover()
        self._left_by: Keeper | None = None
        self._keepers: list[Keeper] = []

    def start(self, digest: str) -> Start:
        """Say what a new session begins with.

        Parameters
        ----------
        digest : str
            The working state that the address names, or empty.

        Returns
        -------
        Start
            That state; or what was opened.
        """
        for keeper in tuple(self._keepers):
            # A reload in the middle of an edit: the address is a moment behind.
            if keeper.pending and keeper.digest == digest:
                keeper.flush()
                digest = keeper.digest
        if not digest:
            return Start(self.scenario.copy())
        try:
            found = self.autosave.lookup(digest)
        except AutosaveError as error:
            return Start(self.scenario.copy(), trouble=str(error))
        # Its tables may lie beside the file; saving looks before it believes that.
        found.folder = self.scenario.folder
        return Start(found, taken_up=True)

    def was_saved(self, scenario: Scenario) -> None:
        """Take note that a session wrote the file: new sessions begin with it."""
        self.scenario = scenario.copy()
        self.saved, self.file_text = state_of(scenario), scenario.source_text

    def join(self, keeper: Keeper) -> None:
        """Take note of a session that lives."""
        self._keepers.append(keeper)

    def leave(self, keeper: Keeper) -> None:
        """Take note of a session that ended: what nobody saved or took up is offered."""
        if keeper not in self._keepers:
            return
        keeper.flush()
        self._keepers.remove(keeper)
        if keeper.safe or any(keeper.digest in other.trail for other in self._keepers):
            self.autosave.settle(keeper.key)
        else:
            self.drop_left()
            self.left, self._left_by = keeper.unsaved(), keeper

    def take_left(self) -> Scenario:
        """Give the state that was left behind; it is offered no more.

        Returns
        -------
        Scenario

        Raises
        ------
        AutosaveError
            If there is none, or it cannot be used any more.
        """
        left = self.left
        self.drop_left()
        if left is None:
            raise AutosaveError("It was taken up or dismissed in another window.")
        return self.autosave.lookup(left.digest)

    def drop_left(self) -> None:
        """Offer what was left behind no more; its state stays findable by its hash."""
        if self._left_by is not None:
            self.autosave.settle(self._left_by.key)
        self.left = self._left_by = None

    def close(self) -> None:
        """End in peace, but keep what nobody saved for the next start to offer."""
        for keeper in tuple(self._keepers):
            self.leave(keeper)
        if self.left is None:
            self.autosave.close()
