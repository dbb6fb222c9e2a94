"""The Journal sheet without a browser."""

from __future__ import annotations

import base64
import io
import zipfile

import pytest

from app.journal import Journal
from app.journal_exchange import LARGEST_UPLOAD
from app.session import Session
from app.sheets.journal import MOST_SHOWN
from solver.errors import InputError
from tests.app.page_session import made_workspace
from tests.app.test_page_header import ask, begun, head, plain, send, shown

HARM = '<img src=x onerror="window.harmed=1">'


@pytest.fixture
def workspace(tmp_path):
    return made_workspace(plain(), tmp_path)


@pytest.fixture
def session(workspace) -> Session:
    made = begun(workspace)
    made.tabs._handle_msg({"sheet": "Journal", "seq": 1})
    return made


def tell(session: Session, **message: object) -> dict | None:
    """Send the list a message and give its answer."""
    answers: list[dict] = []
    session.kept.list._send_msg = answers.append
    session.kept.list._handle_msg({**message, "seq": 7})
    (answer,) = answers
    assert answer["done"] == 7
    return answer.get("answer")


def state(session: Session) -> dict:
    return session.kept.list.state


def names(session: Session) -> list[str]:
    return [one["name"] for one in state(session)["snapshots"]]


def keep(session: Session, name: str, note: str = "", **values: object) -> str:
    """Take a snapshot and give its id."""
    if values:
        send(session, **values)
    assert ask(session, snapshot={"name": name, "note": note}) == {}
    session.refresh()
    return next(one["id"] for one in state(session)["snapshots"] if one["name"] == name)


def test_an_empty_journal_says_where_it_would_be(session, workspace):
    assert state(session)["snapshots"] == []
    assert state(session)["folder"] == str(workspace.journal.folder)


def test_the_newest_comes_first_with_its_figures_and_its_shapes(session):
    keep(session, "First")
    keep(session, "Second", "why", span_m=2.2)
    assert names(session) == ["Second", "First"]
    row = state(session)["snapshots"][0]
    assert row["note"] == "why"
    assert [figure["label"] for figure in row["figures"]] == [
        margin.label for margin in session.results.margins
    ]
    assert {figure["verdict"] for figure in row["figures"]} <= {"pass", "watch", "fail"}
    assert len(row["paths"]) == 2
    assert all(set(path) <= set("MLZ-. 0123456789") for path in row["paths"])


def test_what_was_typed_stays_text(session):
    keep(session, HARM, HARM)
    row = state(session)["snapshots"][0]
    assert (row["name"], row["note"]) == (HARM, HARM)


def test_a_search_finds_by_name_note_and_section(session):
    keep(session, "First", "slow flight")
    keep(session, "Second", "glide")
    tell(session, search="FLIGHT slow")
    assert names(session) == ["First"]
    assert (state(session)["found"], state(session)["count"]) == (1, 2)
    tell(session, search="2412")
    assert len(names(session)) == 2
    tell(session, search=HARM)
    assert names(session) == []
    tell(session, search="")
    assert len(names(session)) == 2


def test_restore_is_one_step_that_can_be_undone(session):
    first = keep(session, "First")
    send(session, span_m=2.2, mass_kg=5.0)
    ask(session, texts={"name": "Other", "author": "", "note": ""})
    assert tell(session, restore=first) == {}
    assert (shown(session, "span_m"), head(session)["name"]) == (2.4, "Rook")
    assert "Restored “First”" in head(session)["said"]
    ask(session, step=-1)
    assert (shown(session, "span_m"), shown(session, "mass_kg")) == (2.2, 5.0)
    assert head(session)["name"] == "Other"


def test_a_snapshot_that_cannot_be_solved_changes_nothing(session):
    first = keep(session, "First")
    send(session, span_m=2.2)
    session.analysis.error = RuntimeError("boom")
    assert "problem" in tell(session, restore=first)
    assert shown(session, "span_m") == 2.2


def test_a_snapshot_that_the_analysis_refuses_says_why(session):
    first = keep(session, "First")
    session.analysis.error = InputError("span_m", 2.4, "another")
    for answer in (tell(session, restore=first), tell(session, compare=["now", first])):
        assert answer["problem"] == "“Rook” cannot be solved: span_m must be another; got 2.4."


def test_rename_and_note_reach_the_disk(session, workspace):
    first = keep(session, "First")
    assert tell(session, rename={"id": first, "name": "Better", "note": "a\r\nb"}) == {}
    (snapshot,) = workspace.journal.list().snapshots
    assert (snapshot.name, snapshot.note) == ("Better", "a\nb")
    assert "blank" in tell(session, rename={"id": first, "name": " ", "note": ""})["problem"]


def test_a_rename_does_not_overwrite_another_windows(session, workspace):
    first = keep(session, "First")
    other = Journal(workspace.journal.folder)
    other.rename(other.get(first), name="Theirs")
    given = {"id": first, "name": "Mine", "note": ""}
    assert "another window" in tell(session, rename=given)["problem"]
    assert names(session) == ["Theirs"]


def test_delete_can_be_undone(session):
    first = keep(session, "First")
    assert tell(session, remove=first) == {}
    assert names(session) == []
    deleted = state(session)["deleted"]
    assert deleted["name"] == "First"
    assert tell(session, undelete=deleted["id"]) == {}
    assert names(session) == ["First"]
    assert state(session)["deleted"] is None


def test_what_another_window_does_shows_when_looked_again(session, workspace):
    other = begun(workspace)
    ask(other, snapshot={"name": "Theirs", "note": ""})
    assert names(session) == []
    session.refresh()
    assert names(session) == ["Theirs"]
    before = state(session)
    session.refresh()
    assert state(session) is before  # nothing new: nothing is sent


def test_a_damaged_file_is_set_aside_and_said_and_stays_said(session, workspace):
    first = keep(session, "First")
    path = workspace.journal.folder / f"{first}.snapshot.toml"
    path.write_text("not a snapshot")
    session.refresh()
    session.refresh()
    assert names(session) == []
    assert "damaged" in " ".join(state(session)["messages"])


@pytest.mark.parametrize("bad", ["../../secret", "/etc/passwd", "", "a" * 500, "x\0y"])
@pytest.mark.parametrize("action", ["restore", "remove", "export", "undelete"])
def test_nothing_outside_the_journal_is_reached(session, tmp_path, action, bad):
    before = sorted(path for path in tmp_path.rglob("*") if path.is_file())
    assert "problem" in tell(session, **{action: bad})
    assert sorted(path for path in tmp_path.rglob("*") if path.is_file()) == before


def test_one_is_exported_and_taken_in_elsewhere(session, tmp_path):
    first = keep(session, "First", "why")
    given = tell(session, export=first)["download"]
    other = begun(made_workspace(plain(), tmp_path / "elsewhere"))
    other.tabs._handle_msg({"sheet": "Journal", "seq": 1})
    sent = {"name": given["name"], "data": given["data"]}
    assert tell(other, **{"import": sent})["said"] == "1 snapshot was taken in."
    assert names(other) == ["First"]
    assert "1 there already" in tell(other, **{"import": sent})["said"]


def test_all_are_exported_as_one_zip(session):
    keep(session, "First")
    keep(session, "Second", span_m=2.2)
    given = tell(session, export_all=True)["download"]
    with zipfile.ZipFile(io.BytesIO(base64.b64decode(given["data"]))) as archive:
        assert len(archive.namelist()) == 2


@pytest.mark.parametrize(
    ("data", "said"),
    [
        (base64.b64encode(b"nothing of ours").decode(), "cannot be taken in"),
        ("not base64!", "did not arrive whole"),
        ("A" * (LARGEST_UPLOAD * 4 // 3 + 8), "15 MB"),
    ],
    ids=["foreign", "broken", "large"],
)
def test_what_is_no_snapshot_is_refused_with_a_sentence(session, data, said):
    assert said in tell(session, **{"import": {"name": "x<b>.toml", "data": data}})["problem"]
    assert names(session) == []


def test_two_are_laid_side_by_side(session):
    first = keep(session, "First")
    second = keep(session, "Second", span_m=2.2)
    send(session, mass_kg=5.0)
    assert tell(session, compare=["now", second, first]) == {}
    assert session.kept.comparing.visible
    assert not session.kept.listing.visible
    data = session.kept.table.data
    assert [one["name"] for one in data["columns"]] == ["Rook", "Second", "First"]
    assert [one["letter"] for one in data["columns"]] == ["A", "B", "C"]
    assert data["columns"][0]["when"] == "on the page now"
    rows = {row["label"]: row for row in data["inputs"]}
    assert rows["Span"] == {"label": "Span", "unit": "m", "cells": ["2.2", "2.2", "2.4"]}
    assert rows["Mass"]["cells"] == ["5", "4.6", "4.6"]
    span = next(row for row in data["margins"] if row["label"] == "Span")
    assert [cell["value"] for cell in span["cells"]] == ["2.20", "2.20", "2.40"]
    assert {cell["verdict"] for cell in span["cells"]} <= {"pass", "watch", "fail"}
    for plot in session.kept.overlays[1:]:
        fed = [bool(line.source.data["x"]) for line in plot.lines]
        assert fed == [True] * 3 + [False] * 3
        assert plot.labels.source.data["text"] == ["A", "B", "C", "", "", ""]
    tips = [max(one.data["x"][0]) for one in session.kept.overlays[0].sources[:3]]
    assert tips == [1.1, 1.1, 1.2]
    # Fewer afterwards: what was drawn before goes.
    session.kept.table._handle_msg({"back": True, "seq": 9})
    assert session.kept.listing.visible
    assert tell(session, compare=[first, second]) == {}
    assert not session.kept.overlays[1].lines[2].source.data["x"]


@pytest.mark.parametrize("count", [0, 1, 7])
def test_fewer_than_two_or_more_than_six_are_refused(session, count):
    first = keep(session, "First")
    assert "2 to 6" in tell(session, compare=[first] * count)["problem"]
    assert session.kept.listing.visible


def test_a_report_that_compares_is_asked_for_what_is_shown(session):
    first = keep(session, "First")
    tell(session, compare=["now", first])
    asked = []
    session.header.report = lambda pairs: asked.append([one.name for one, _ in pairs])
    session.kept.table._handle_msg({"report": True, "seq": 9})
    assert asked == [["Rook", "Rook"]]


def test_a_long_journal_shows_its_newest(session, workspace):
    for at in range(3):
        keep(session, f"Number {at}")
    found = workspace.journal.list().snapshots
    session.kept._show(found * 40, 120, "")
    assert len(state(session)["snapshots"]) == MOST_SHOWN
    assert state(session)["found"] == 120
