"""The header without a browser: undo, names, snapshot, save, copy, recovery."""

from __future__ import annotations

import base64
import io
import zipfile
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from app.header import CHANGED_ELSEWHERE, packed_copy
from app.page_words import clock
from app.scenario import Scenario
from app.scenario_file import read_scenario
from app.scenario_save import write_scenario
from app.session import WRONG, Session
from scenarios import example_path
from solver.errors import InputError
from tests.app.page_session import made_workspace


def plain(name: str = "Rook") -> Scenario:
    scenario = Scenario(name=name)
    scenario.set_values({"root_section": "NACA 2412", "tip_section": "NACA 2412"})
    return scenario


@pytest.fixture
def opened(tmp_path):
    """A workspace on a file of its own."""
    file = tmp_path / "rook.toml"
    write_scenario(plain(), file)
    return made_workspace(read_scenario(file), tmp_path, file=file)


def begun(workspace, digest: str = "") -> Session:
    start = workspace.start(digest)
    return Session(start.scenario, workspace, notice=start.trouble)


@pytest.fixture
def session(opened):
    return begun(opened)


def send(session: Session, **values: object) -> None:
    session.column._handle_msg({"values": values, "seq": 1})


def ask(session: Session, **message: object) -> dict | None:
    """Send the header a message and give its answer."""
    answers: list[dict] = []
    session.strip._send_msg = answers.append
    session.strip._handle_msg({**message, "seq": 5})
    (answer,) = answers
    return answer.get("answer")


def head(session: Session) -> dict:
    return session.strip.header


def shown(session: Session, name: str) -> object:
    return session.column.state["values"][name]


def test_undo_and_redo_say_what_they_do_and_do_it(session):
    assert (head(session)["undo"], head(session)["redo"]) == ("", "")
    send(session, span_m=2.1)
    send(session, mass_kg=5.0)
    assert head(session)["undo"] == "Undo mass 4.60 to 5.00 kg"
    ask(session, step=-1)
    assert shown(session, "mass_kg") == 4.6
    assert session.results.inputs["mass_kg"] == 4.6
    assert head(session)["redo"] == "Redo mass 4.60 to 5.00 kg"
    ask(session, step=-1)
    assert shown(session, "span_m") == 2.4
    ask(session, step=2)
    assert (shown(session, "span_m"), shown(session, "mass_kg")) == (2.1, 5.0)


def test_more_steps_than_there_are_stop_at_the_end(session):
    send(session, span_m=2.1)
    ask(session, step=-50)
    assert shown(session, "span_m") == 2.4
    assert head(session)["undo"] == ""


def test_an_undo_that_cannot_be_solved_leaves_everything_as_it_was(session):
    send(session, span_m=2.1)
    session.analysis.error = RuntimeError("boom")
    ask(session, step=-1)
    assert session.strip.data["notice"] == WRONG
    assert shown(session, "span_m") == 2.1
    session.analysis.error = None
    ask(session, step=-1)
    assert shown(session, "span_m") == 2.4


def test_a_value_that_was_refused_is_gone_after_an_undo(session):
    send(session, span_m=2.1)
    send(session, mass_kg=999.0)
    assert "mass_kg" in session.column.state["refusals"]
    ask(session, step=-1)
    assert session.column.state["refusals"] == {}


def test_name_author_and_note_are_set_together_and_undone_together(session):
    given = {"name": " Jay ", "author": "A. Person", "note": "why\r\nand how"}
    assert ask(session, texts=given) == {}
    assert (head(session)["name"], head(session)["note"]) == ("Jay", "why\nand how")
    ask(session, step=-1)
    assert (head(session)["name"], head(session)["author"]) == ("Rook", "")


@pytest.mark.parametrize(
    ("texts", "said"),
    [
        ({"name": " ", "author": "", "note": ""}, "The name must not be blank"),
        ({"name": "a\x07b", "author": "", "note": ""}, "The name must have no control characters"),
        ({"name": "a", "author": "x" * 5000, "note": ""}, "The author must have at most"),
    ],
)
def test_a_text_that_cannot_be_kept_is_refused(session, texts, said):
    assert ask(session, texts=texts)["problem"].startswith(said)
    assert head(session)["name"] == "Rook"
    assert head(session)["undo"] == ""


def test_a_snapshot_is_on_the_disk_once_it_is_said(session):
    assert ask(session, snapshot={"name": "First", "note": "a\r\nb"}) == {}
    assert head(session)["said"] == "Kept “First” in the journal."
    (snapshot,) = session.workspace.journal.list().snapshots
    assert (snapshot.name, snapshot.note) == ("First", "a\nb")
    send(session, span_m=2.2)
    ask(session, step=-1)
    assert head(session)["said"] == ""


def test_a_snapshot_that_cannot_be_taken_says_why(session):
    assert "name" in ask(session, snapshot={"name": "x" * 500, "note": ""})["problem"]
    session.workspace.journal.folder.write_text("in the way")
    assert "could not be written" in ask(session, snapshot={"name": "", "note": ""})["problem"]


def test_save_writes_the_opened_file_and_no_other(session, opened, tmp_path):
    before = sorted(path.name for path in tmp_path.iterdir())
    assert head(session)["saved"]
    send(session, span_m=2.2)
    assert not head(session)["saved"]
    assert ask(session, save=str(tmp_path / "elsewhere.toml")) == {}
    assert head(session)["saved"]
    assert head(session)["said"] == "Saved to rook.toml."
    assert read_scenario(opened.file).wing.span_m == 2.2
    assert sorted(path.name for path in tmp_path.iterdir()) == before
    # The next tab begins with what was saved.
    assert opened.start("").scenario.wing.span_m == 2.2


def test_save_does_not_overwrite_what_was_changed_elsewhere_without_asking(session, opened):
    other = begun(opened)
    send(other, mass_kg=5.0)
    assert ask(other, save=True) == {}
    send(session, span_m=2.2)
    assert ask(session, save=True) == {"problem": CHANGED_ELSEWHERE}
    assert read_scenario(opened.file).brief.mass_kg == 5.0
    assert ask(session, save=True) == {}
    assert read_scenario(opened.file).brief.mass_kg == 4.6


def test_saving_tables_that_came_from_elsewhere_is_no_step(session):
    session.replace(read_scenario(example_path()))  # its tables lie in another folder
    label = head(session)["undo"]
    assert ask(session, save=True) == {}
    saved = read_scenario(session.workspace.file)
    assert saved.freeze() == read_scenario(example_path()).freeze()
    assert head(session)["undo"] == label
    send(session, span_m=2.3)
    assert head(session)["undo"] == "Undo span 2.40 to 2.30 m"
    ask(session, step=-1)
    assert head(session)["saved"]


def test_a_scenario_brought_back_has_its_comments_where_no_file_is_open(tmp_path):
    session = begun(made_workspace(plain(), tmp_path))
    session.replace(read_scenario(example_path()))
    assert session.scenario.source_text == example_path().read_text(encoding="utf-8")


def test_where_no_file_was_opened_there_is_nothing_to_save_to(tmp_path):
    session = begun(made_workspace(plain(), tmp_path))
    assert head(session)["file"] == ""
    assert "save a copy" in ask(session, save=True)["problem"]


def test_a_copy_opens_elsewhere_with_its_tables(tmp_path):
    scenario = read_scenario(example_path())
    name, data = packed_copy(scenario)
    assert name == "Heronsgill-24.zip"
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        archive.extractall(tmp_path)
    assert read_scenario(tmp_path / "Heronsgill-24.toml").freeze() == scenario.freeze()


def test_a_copy_without_tables_is_one_file_whatever_the_name(session, tmp_path):
    ask(session, texts={"name": "../<b>x</b>", "author": "", "note": ""})
    given = ask(session, copy=True)["download"]
    assert given["name"] == "b-x-b.toml"
    target = tmp_path / "copy.toml"
    target.write_bytes(base64.b64decode(given["data"]))
    assert read_scenario(target).name == "../<b>x</b>"


def test_the_working_state_is_found_by_the_hash_in_the_address(session, opened):
    session.keeper.flush()
    at_first = session.strip.digest
    send(session, span_m=2.2)
    session.keeper.flush()
    assert session.strip.digest != at_first
    again = begun(opened, session.strip.digest)
    assert shown(again, "span_m") == 2.2
    assert not head(again)["saved"]
    assert ask(again, save=True) == {}
    assert read_scenario(opened.file).wing.span_m == 2.2


def test_a_reload_before_the_state_was_kept_shows_it_all_the_same(session, opened):
    session.keeper.flush()
    send(session, span_m=2.2)
    assert shown(begun(opened, session.strip.digest), "span_m") == 2.2


@pytest.mark.parametrize("named", ["0" * 64, "../../etc/passwd", "x"])
def test_an_address_that_names_nothing_says_so_and_shows_the_file(opened, named):
    session = begun(opened, named)
    assert "address" in session.strip.data["notice"]
    assert shown(session, "span_m") == 2.4


def crashed(opened, folder: Path) -> object:
    """Another program on the same folders, after this one was killed."""
    if opened.autosave._lock is not None:
        opened.autosave._lock.release()
    return made_workspace(read_scenario(opened.file), folder, file=opened.file)


def test_what_a_crash_left_is_offered_and_taken_with_one_click(session, opened, tmp_path):
    send(session, span_m=2.2)
    session.keeper.flush()
    session = begun(crashed(opened, tmp_path))
    assert shown(session, "span_m") == 2.4
    assert head(session)["left"].startswith("You left off at ")
    assert ask(session, left="take") == {}
    assert shown(session, "span_m") == 2.2
    assert head(session)["left"] == ""
    assert head(session)["undo"] == "Undo span 2.40 to 2.20 m"
    ask(session, step=-1)
    assert shown(session, "span_m") == 2.4


def test_what_a_crash_left_can_be_dismissed(session, opened, tmp_path):
    send(session, span_m=2.2)
    session.keeper.flush()
    workspace = crashed(opened, tmp_path)
    session, other = begun(workspace), begun(workspace)
    assert ask(session, left="dismiss") == {}
    assert head(session)["left"] == ""
    assert "another window" in ask(other, left="take")["problem"]


def test_a_closed_tab_is_offered_to_the_next_unless_its_state_was_saved(session, opened):
    send(session, span_m=2.2)
    session.end()
    after = begun(opened)
    assert head(after)["left"]
    ask(after, left="take")
    ask(after, save=True)
    after.end()
    assert head(begun(opened))["left"] == ""


def test_a_tab_that_was_reloaded_is_not_offered_again(session, opened):
    send(session, span_m=2.2)
    session.keeper.flush()
    again = begun(opened, session.strip.digest)
    again.keeper.flush()
    session.end()
    assert opened.left is None


def test_a_snapshot_makes_a_state_safe(session, opened):
    send(session, span_m=2.2)
    ask(session, snapshot={"name": "", "note": ""})
    session.end()
    assert opened.left is None


def test_an_end_in_peace_leaves_only_what_nobody_saved(session, opened, tmp_path):
    opened.close()
    assert made_workspace(plain(), tmp_path).left is None
    workspace = made_workspace(read_scenario(opened.file), tmp_path, file=opened.file)
    send(begun(workspace), span_m=2.3)
    workspace.close()
    workspace.autosave._lock.release()
    assert made_workspace(plain(), tmp_path).left is not None


def test_a_state_that_cannot_be_kept_is_said(opened, tmp_path):
    session = begun(opened)
    session.keeper.flush()
    (tmp_path / "states").rename(tmp_path / "moved")
    (tmp_path / "states").write_text("in the way")
    send(session, span_m=2.2)
    session.keeper.flush()
    assert "could not be kept" in session.strip.data["notice"]
    assert shown(session, "span_m") == 2.2


def test_changes_are_kept_once_they_rest(opened):
    now, waiting = [0.0], []
    session = Session(
        opened.start("").scenario, opened, later=lambda call, after: waiting.append((call, after))
    )
    keeper = session.keeper
    keeper._clock = lambda: now[0]
    keeper.flush()
    waiting.clear()
    first = session.strip.digest
    send(session, span_m=2.2)
    (call, after) = waiting.pop()
    now[0] += 0.1
    send(session, span_m=2.25)
    assert waiting == []
    now[0] += after / 1e3 - 0.1
    call()
    assert session.strip.digest == first  # it moved a moment ago
    (call, after) = waiting.pop()
    now[0] += after / 1e3
    call()
    assert opened.start(session.strip.digest).scenario.wing.span_m == 2.25


def test_a_refused_working_state_changes_nothing(session, opened, tmp_path):
    send(session, span_m=2.2)
    session.keeper.flush()
    after = begun(crashed(opened, tmp_path))
    after.analysis.error = InputError("span_m", 2.2, "another")
    assert "span_m must be another" in ask(after, left="take")["problem"]
    assert shown(after, "span_m") == 2.4


def test_a_time_names_the_day_only_where_it_is_another():
    now = datetime(2026, 3, 4, 15, 0, tzinfo=UTC).astimezone()
    assert clock(now - timedelta(minutes=5), now) == f"{now - timedelta(minutes=5):%H:%M}"
    assert clock(now - timedelta(days=40), now).endswith(f"{now:%H:%M}")
    assert " 2026, " in clock(now - timedelta(days=40), now)
