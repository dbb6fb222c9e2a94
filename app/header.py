"""The line with the scenario's name: undo, redo, snapshot, save, report, recovery."""

from __future__ import annotations

import base64
import io
import re
import tempfile
import zipfile
from collections.abc import Callable, Mapping
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from app.autosave import AutosaveError
from app.journal import JournalError
from app.scenario_error import ScenarioError
from app.scenario_file import text_problem
from app.scenario_save import write_scenario
from solver.errors import InputError

if TYPE_CHECKING:
    from app.session import Session

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
        self.said = ""
        self._overwrite = False
        self._actions: dict[str, Callable[[Message], Answer]] = {
            "step": self._step,
            "texts": self._texts,
            "snapshot": self._snapshot,
            "save": self._save,
            "copy": self._copy,
            "left": self._left,
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
        }

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
        session.keeper.saved_to_file()
        self.said = f"Saved to {file.name}."
        return {}

    def _copy(self, message: Message) -> Answer:
        try:
            name, data = packed_copy(self.session.scenario)
        except ScenarioError as error:
            return {"problem": f"{error}."}
        return download(name, data)

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


def clock(moment: datetime, now: datetime | None = None) -> str:
    """Write a time as this computer's clock shows it, with the day where it is another.

    Parameters
    ----------
    moment : datetime.datetime
        With its time zone.
    now : datetime.datetime, optional
        The present time, with its time zone.

    Returns
    -------
    str
        For example ``"14:32"`` or ``"3 Mar 2026, 14:32"``.
    """
    local = moment.astimezone()
    today = (now or datetime.now().astimezone()).astimezone()
    time = f"{local:%H:%M}"
    return time if local.date() == today.date() else f"{local.day} {local:%b %Y}, {time}"


def file_stem(name: str) -> str:
    """Make a name for a file out of a name: letters, digits and dashes."""
    return re.sub(r"[^A-Za-z0-9]+", "-", name).strip("-")[:60].strip("-") or "scenario"


def download(name: str, data: bytes) -> dict[str, object]:
    """Make the answer that hands the user a file."""
    return {"download": {"name": name, "data": base64.b64encode(data).decode()}}


def packed_copy(scenario: Any) -> tuple[str, bytes]:  # noqa: ANN401
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
