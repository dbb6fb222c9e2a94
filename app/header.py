"""The line with the scenario's name: undo, redo, snapshot, save, report, recovery."""

from __future__ import annotations

import io
import logging
import tempfile
import zipfile
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from app.autosave import AutosaveError
from app.history import state_of
from app.journal import JournalError
from app.page_words import clock, download, file_stem
from app.scenario_error import ScenarioError
from app.scenario_file import text_problem
from app.scenario_save import write_scenario
from solver.errors import InputError

if TYPE_CHECKING:
    from app.analysis.results import Results
    from app.scenario import Scenario
    from app.session import Session

LOG = logging.getLogger(__name__)

Message = Mapping[str, Any]
Answer = dict[str, object] | None

CHANGED_ELSEWHERE = (
    "The file was changed elsewhere since it was opened here. Save again to replace it, "
    "or save a copy."
)


class Header:
    """Takes what the user does in the header and says what it shows.

    Parameters
    ----------
    session : Session
        Whose header it is.
    """

    def __init__(self, session: Session) -> None:
        self.session = session
        self.said = self.busy = ""
        self._overwrite = False
        self._actions: dict[str, Callable[[Message], Answer]] = {
            "step": self._step,
            "texts": self._texts,
            "snapshot": self._snapshot,
            "save": self._save,
            "copy": self._copy,
            "left": self._left,
            "report": self._report,
        }
        self.show()

    def take(self, message: Message) -> Answer:
        """Do what a message asks for.

        Parameters
        ----------
        message : mapping
            One key names the action and holds what it needs.

        Returns
        -------
        dict or None
            ``problem``: a sentence why it could not be done. ``download``: a
            file for the user.
        """
        self.said = ""
        action = next(name for name in self._actions if name in message)
        answer = self._actions[action](message)
        self.show()
        return answer

    def show(self) -> None:
        """Show the present state."""
        session = self.session
        scenario, history, keeper = session.scenario, session.history, session.keeper
        file, left = session.workspace.file, session.workspace.left
        self.session.strip.header = {
            "name": scenario.name,
            "author": scenario.author,
            "note": scenario.note,
            "undo": history.undo_label,
            "redo": history.redo_label,
            "file": file.name if file is not None else "",
            "saved": keeper.is_saved,
            "left": f"You left off at {clock(left.time)} with “{left.name}”." if left else "",
            "said": self.said,
            "busy": self.busy,
        }

    def say(self, said: str) -> None:
        """Say quietly what was done; an empty sentence says nothing more."""
        self.said = said
        self.show()

    def _step(self, message: Message) -> Answer:
        self.session.step(max(-100, min(100, int(message["step"]))))
        return None

    def _texts(self, message: Message) -> Answer:
        texts = {
            name: str(message["texts"][name]).replace("\r\n", "\n").strip()
            for name in ("name", "author", "note")
        }
        for name, text in texts.items():
            if problem := text_problem(name, text):
                return {"problem": f"The {name} {problem}."}
        session = self.session

        def set_texts() -> None:
            for name, text in texts.items():
                setattr(session.scenario, name, text)

        session.history.break_step()
        session.change(set_texts)
        session.history.break_step()
        return {}

    def _snapshot(self, message: Message) -> Answer:
        session, given = self.session, message["snapshot"]
        if session.results is None:
            return {"problem": "There is nothing solved to keep."}
        try:
            taken = session.workspace.journal.take(
                session.scenario,
                session.results,
                name=str(given["name"]),
                note=str(given["note"]).replace("\r\n", "\n").strip(),
            )
        except JournalError as error:
            return {"problem": str(error)}
        session.keeper.saved_to_journal()
        self.said = f"Kept “{taken.name}” in the journal."
        return {}

    def _save(self, message: Message) -> Answer:
        session, file = self.session, self.session.workspace.file
        if file is None:
            return {"problem": "There is no file to save to; save a copy."}
        if not self._overwrite and not _is_as_read(file, session.keeper.file_text):
            self._overwrite = True
            return {"problem": CHANGED_ELSEWHERE}
        try:
            write_scenario(session.scenario, file)
        except ScenarioError as error:
            return {"problem": f"{error}."}
        self._overwrite = False
        session.history.amend(state_of(session.scenario))  # its tables may lie elsewhere now
        session.keeper.saved_to_file()
        self.said = f"Saved to {file.name}."
        return {}

    def _copy(self, message: Message) -> Answer:
        try:
            name, data = packed_copy(self.session.scenario)
        except ScenarioError as error:
            return {"problem": f"{error}."}
        return download(name, data)

    def _report(self, message: Message) -> Answer:
        session = self.session
        if session.results is None:
            return {"problem": "There is nothing solved to report."}
        return self.report([(session.scenario.copy(), session.results)])

    def report(self, pairs: Sequence[tuple[Scenario, Results]]) -> Answer:
        """Write a report beside the session and hand it over when it is done.

        Parameters
        ----------
        pairs : sequence of (Scenario, Results)
            One, or two to six that are compared; nobody changes them meanwhile.

        Returns
        -------
        dict or None
            ``problem`` where one is being written already.
        """
        if self.busy:
            return {"problem": "A report is being written; wait for it."}
        self.busy = "writing report"
        self.show()
        name = "comparison" if len(pairs) > 1 else file_stem(pairs[0][0].name)
        self.session.apart(
            lambda: _made_report(pairs), lambda made: self._reported(f"{name}.html", made)
        )
        return None

    def _reported(self, name: str, made: object) -> None:
        self.busy = ""
        if isinstance(made, bytes):
            self.said = f"The report is {name}, {len(made) / 1e6:.1f} MB, among your downloads."
            self.session.strip.hand_over(download(name, made))
        else:
            self.session.say(str(made))
        self.show()

    def _left(self, message: Message) -> Answer:
        session = self.session
        if message["left"] != "take":
            session.workspace.drop_left()
            return {}
        try:
            session.replace(session.workspace.take_left())
        except (AutosaveError, InputError) as error:
            return {"problem": str(error)}
        return {}


def _made_report(pairs: Sequence[tuple[Scenario, Results]]) -> bytes | str:
    """Make a report and give it; or the sentence why there is none."""
    from app.report import ReportError, make_report

    with tempfile.TemporaryDirectory(prefix="halfspan-") as folder:
        try:
            path = make_report(pairs, output=Path(folder) / "report.html")
        except (ReportError, InputError) as error:
            return f"The report could not be written: {error}."
        except Exception:
            LOG.exception("a report failed")
            return "Something inside went wrong with the report. The log file has the details."
        return path.read_bytes()


def packed_copy(scenario: Scenario) -> tuple[str, bytes]:
    """Give a scenario as a file to keep: TOML, in a zip with its tables where it has some.

    Parameters
    ----------
    scenario : Scenario
        Must be valid as a whole; it stays as it is.

    Returns
    -------
    name : str
        What the file should be called.
    data : bytes
        Its content.

    Raises
    ------
    ScenarioError
        If it cannot be written.
    """
    stem = file_stem(scenario.name)
    with tempfile.TemporaryDirectory(prefix="halfspan-") as made:
        folder = Path(made)
        write_scenario(scenario.copy(), folder / f"{stem}.toml")
        files = sorted(path for path in folder.rglob("*") if path.is_file())
        if len(files) == 1:
            return files[0].name, files[0].read_bytes()
        packed = io.BytesIO()
        with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
            for path in files:
                archive.write(path, path.relative_to(folder).as_posix())
    return f"{stem}.zip", packed.getvalue()


def _is_as_read(file: Path, text: str) -> bool:
    """Whether a file still holds what was read from it, or has gone."""
    try:
        return file.read_bytes().decode("utf-8-sig").replace("\r\n", "\n") == text.replace(
            "\r\n", "\n"
        )
    except FileNotFoundError:
        return True
    except (OSError, UnicodeDecodeError):
        return False
