"""The journal: what was taken is there, comes back equal, and nothing is ever lost."""

from __future__ import annotations

import errno
import os
import re
import threading
import tomllib
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import numpy as np
import pytest

from app import journal, journal_snapshot, safe_write
from app.file_lock import locked, try_lock
from app.journal import Journal, JournalError, default_folder, search
from app.journal_picture import is_planform_svg, planform_svg
from app.journal_snapshot import ENDING, read_snapshot, snapshot_text
from app.scenario_file import read_scenario
from scenarios import example_path
from tests.app.sample_results import make_results, with_nothing_found

DEMO = read_scenario(example_path())
TARN = read_scenario(example_path("tarn-ridge-18"))
RESULTS = make_results()


class Clock:
    """A time that rises by a second each time it is asked."""

    def __init__(self) -> None:
        self.time = datetime(2031, 5, 6, 7, 8, 9, tzinfo=UTC)

    def __call__(self) -> datetime:
        self.time += timedelta(seconds=1)
        return self.time


@pytest.fixture
def store(tmp_path):
    return Journal(tmp_path / "journal", version="1.2.3", now=Clock())


def take(store, name="First", note="", scenario=DEMO, results=RESULTS):
    return store.take(scenario, results, name=name, note=note)


def names(store) -> list[str]:
    listing = store.list()
    assert listing.messages == ()
    return [one.name for one in listing.snapshots]


def path_of(store, snapshot) -> Path:
    return store.folder / f"{snapshot.id}{ENDING}"


def test_a_journal_that_does_not_exist_yet_is_empty_and_stays_so(store):
    assert names(store) == []
    assert store.deleted().snapshots == ()
    assert not store.folder.exists()


def test_what_is_taken_is_listed_newest_first_and_comes_back_equal(store):
    first = take(store)
    second = take(store, name="Second", note="Two\nlines", scenario=TARN, results=other_results())
    assert store.list().snapshots == (second, first)
    assert Journal(store.folder).list().snapshots == (second, first)  # from the disk
    for scenario, snapshot in ((DEMO, first), (TARN, second)):
        again = store.restore(store.get(snapshot.id))
        assert again.freeze() == scenario.freeze()
        assert again.source_text == scenario.source_text


def other_results():
    values = TARN.values()
    keys = ("mass_kg", "landing_speed_m_s", "span_m", "root_chord_mm", "tip_chord_mm")
    changed = {key: values[key] for key in keys}
    changed |= {key: values[key] for key in make_results().inputs}
    return make_results(name="Tarn Ridge 18", **changed)


def test_it_keeps_name_note_time_version_sections_and_every_margin(store):
    snapshot = store.get(take(store, note="Why").id)
    assert (snapshot.name, snapshot.note, snapshot.version) == ("First", "Why", "1.2.3")
    assert snapshot.taken == datetime(2031, 5, 6, 7, 8, 10, tzinfo=UTC)
    assert snapshot.sections == ("E387", "NACA 0009")
    assert len(snapshot.figures) == len(RESULTS.margins)
    for figure, margin in zip(snapshot.figures, RESULTS.margins, strict=True):
        for name in ("key", "label", "value", "low", "high", "limit", "sense", "unit", "reason"):
            assert getattr(figure, name) == getattr(margin, name)
        assert figure.verdict == str(margin.verdict)
        assert figure.margin == margin.margin


def test_what_was_not_found_is_kept_as_not_found(store):
    snapshot = store.get(take(store, results=with_nothing_found(RESULTS)).id)
    values = [figure.value for figure in snapshot.figures]
    expected = [margin.value for margin in with_nothing_found(RESULTS).margins]
    np.testing.assert_array_equal(values, expected)
    assert np.isnan(values).any()


def test_the_file_is_plain_and_named_by_time_and_name(store):
    snapshot = take(store, name="Näher / am Ziel!")
    (path,) = store.folder.iterdir()
    assert re.fullmatch(r"20310506T070810Z-N-her-am-Ziel-[0-9a-f]{12}\.snapshot\.toml", path.name)
    content = tomllib.loads(path.read_text(encoding="utf-8"))
    assert content["name"] == "Näher / am Ziel!"
    assert content["figures"][0]["label"] == RESULTS.margins[0].label
    assert content["scenario"]["text"] == snapshot.bundle
    text = path.read_text(encoding="utf-8")
    assert "\nspan_m = 2.4\n" in text
    assert DEMO.sections["E387"].lift.text in text  # word for word
    assert snapshot_text(read_snapshot(text, name=snapshot.id)) == text


def test_a_blank_name_takes_that_of_the_scenario(store):
    assert take(store, name="  ").name == "Heronsgill 24"


@pytest.mark.parametrize(
    ("name", "note", "words"),
    [
        ("x" * 121, "", "The name must have at most 120 characters; got 121."),
        ("a\nb", "", "The name must have no control characters; got 'a\\nb'."),
        ("a", "\x1b[2J", "The note must have no control characters"),
        ("a", "x" * 20_001, "The note must have at most 20000 characters"),
    ],
)
def test_texts_that_cannot_be_kept_are_said(store, name, note, words):
    with pytest.raises(JournalError, match=re.escape(words)):
        take(store, name=name, note=note)
    snapshot = take(store) if not store.folder.exists() else None
    with pytest.raises(JournalError, match=re.escape(words)):
        store.rename(snapshot, name=name, note=note)
    assert names(store) == ["First"]


@pytest.mark.parametrize(
    "text", ["<script>alert(1)</script>", "'''", '"""', "\\", "a'", "日本", "]"]
)
def test_any_text_comes_back_as_it_was(store, text):
    snapshot = take(store, name=text, note=f"{text}\n{text}")
    read = Journal(store.folder).get(snapshot.id)
    assert (read.name, read.note) == (text, f"{text}\n{text}")


def test_figures_of_other_inputs_are_not_kept_with_these(store):
    scenario = DEMO.copy()
    scenario.set_values({"span_m": 2.3})
    with pytest.raises(JournalError, match="The figures shown belong to other inputs; take the"):
        take(store, scenario=scenario)
    scenario.brief.landing_speed_m_s = 40.0
    with pytest.raises(JournalError):
        take(store, scenario=scenario)
    assert not store.folder.exists()


def test_search_finds_all_words_in_name_note_and_sections(store):
    take(store, name="Long wing", note="for the Net")
    take(store, name="Short wing", scenario=TARN, results=other_results())
    found = store.list().snapshots
    for words, expected in {
        "": ["Short wing", "Long wing"],
        "WING long": ["Long wing"],
        "net": ["Long wing"],
        "e387": ["Long wing"],
        "naca 2409": ["Short wing"],
        "wing e388": [],
    }.items():
        assert [one.name for one in search(found, words)] == expected


def test_rename_changes_name_and_note_and_nothing_else(store):
    snapshot = take(store, note="Why")
    renamed = store.rename(snapshot, name=" Better ")
    assert (renamed.name, renamed.note) == ("Better", "Why")
    assert store.rename(renamed, name="Better", note="").note == ""
    (listed,) = Journal(store.folder).list().snapshots
    assert (listed.id, listed.taken, listed.bundle, listed.figures) == (
        snapshot.id,
        snapshot.taken,
        snapshot.bundle,
        snapshot.figures,
    )


def test_delete_can_be_undone(store):
    first, second = take(store), take(store, name="Second")
    token = store.delete(first)
    assert names(store) == ["Second"]
    assert [one.name for one in store.deleted().snapshots] == ["First"]
    assert store.bring_back(token) == first
    assert names(store) == ["Second", "First"]
    assert store.deleted().snapshots == ()
    assert store.restore(second).freeze() == DEMO.freeze()


def test_deleting_the_same_file_twice_keeps_both(store):
    snapshot = take(store)
    path = path_of(store, snapshot)
    data = path.read_bytes()
    first = store.delete(snapshot)
    path.write_bytes(data.replace(b'"First"', b'"Again"'))  # a version control system brought it
    second = store.delete(store.get(snapshot.id))
    assert first != second
    assert {one.name for one in store.deleted().snapshots} == {"First", "Again"}
    assert store.bring_back(second).name == "Again"
    assert store.bring_back(first).name == "First"
    assert len(names(store)) == 2


@pytest.mark.parametrize("bad", ["", "../a", "a/b", ".lock", "a" * 200, "a\n", None, "..", "a.b"])
def test_an_id_cannot_lead_out_of_the_journal(store, bad, tmp_path):
    take(store)
    (tmp_path / f"a{ENDING}").write_text("secret", encoding="utf-8")
    for action in (store.get, store.bring_back):
        with pytest.raises(JournalError, match="That is not the name of a snapshot"):
            action(bad)


def test_files_that_are_not_the_journals_are_left_alone(store):
    take(store)
    others = ["README.md", "a.toml", ".git", "photo.png", f"a\nb{ENDING}", f"link{ENDING}"]
    for name in others:
        (store.folder / name).write_text("mine", encoding="utf-8")
    (store.folder / f"link{ENDING}").unlink()
    (store.folder / f"link{ENDING}").symlink_to(store.folder / "a.toml")
    (store.folder / f"folder{ENDING}").mkdir()
    listing = store.list()
    assert [one.name for one in listing.snapshots] == ["First"]
    assert len(listing.messages) == 3
    assert all(" is not shown: it" in message for message in listing.messages)
    assert all(message.isprintable() for message in listing.messages)
    assert {one.name for one in store.folder.iterdir()} >= {*others, f"folder{ENDING}"}


def cut(text):
    return text[: len(text) // 2]


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (lambda t: "", "it is not a snapshot of Halfspan"),
        (cut, "is not TOML in line"),
        (lambda t: t.replace("snapshot = 1", "snapshot = 0"), "it is not a snapshot of Halfspan"),
        (lambda t: t.replace("\nspan_m = 2.4\n", "\nspan_m = 2.5\n"), "no longer the one that was"),
        (lambda t: t.replace('name = "First"', "name = 3"), "that should be text is not"),
        (lambda t: t.replace('name = "First"', 'name = "\\u001b"'), "its name must have no contro"),
        (lambda t: t.replace("taken = 2031-05-06T07:08:10Z", "taken = 3"), "its time is none"),
        (lambda t: t.replace("taken = ", "given = "), "something that belongs to a snapshot is mi"),
        (lambda t: re.sub("\nvalue = .*", "\nvalue = true", t, count=1), "is not a number"),
        (lambda t: re.sub("\nverdict = .*", '\nverdict = "?"', t, count=1), "has no verdict"),
        (lambda t: t.replace("[[figures]]", "[figures]", 1), "is not TOML"),
        (lambda t: t.replace("sections = [", "sections = 3 # ["), "is missing in it"),
        (lambda t: t + "\0", "is not TOML"),
    ],
    ids=range(13),
)
def test_a_damaged_file_is_set_aside_and_the_rest_is_listed(store, spoil, words):
    good, bad = take(store, name="Good"), take(store, name="First")
    path = path_of(store, bad)
    text = path.read_text(encoding="utf-8").replace("07:08:11Z", "07:08:10Z")
    spoiled = spoil(text)
    assert spoiled != text
    path.write_text(spoiled, encoding="utf-8")
    listing = store.list()
    assert listing.snapshots == (good,)
    (message,) = listing.messages
    assert message.startswith(f"{path.name} is damaged (")
    assert words in message
    assert message.endswith(f"it was moved to damaged/{path.name}.")
    assert message.isprintable()
    assert (store.folder / "damaged" / path.name).read_text(encoding="utf-8") == spoiled
    assert store.list().messages == ()


def test_two_damaged_files_of_one_name_are_both_kept(store):
    path = path_of(store, take(store))
    for text in ("one", "two"):
        path.write_text(text, encoding="utf-8")
        assert len(store.list().messages) == 1
    kept = [one.read_text(encoding="utf-8") for one in (store.folder / "damaged").iterdir()]
    assert sorted(kept) == ["one", "two"]


def test_bytes_that_are_not_text_and_huge_files_are_set_aside(store, monkeypatch):
    path = path_of(store, take(store))
    path.write_bytes(b"\xff\xfe")
    assert "(it is not text)" in store.list().messages[0]
    path.write_bytes(b"#" * 2001)
    monkeypatch.setattr(journal_snapshot, "LARGEST_SNAPSHOT", 2000)
    assert "(it has more than 0.002 MB)" in store.list().messages[0]


def test_a_snapshot_of_a_newer_halfspan_stays_where_it_is(store):
    path = path_of(store, take(store))
    text = path.read_text(encoding="utf-8").replace("snapshot = 1", "snapshot = 2")
    path.write_text(text, encoding="utf-8")
    listing = store.list()
    assert listing.snapshots == ()
    assert listing.messages == (f"{path.name} is not shown: a newer Halfspan has written it.",)
    assert path.exists()


def test_line_ends_of_another_system_do_not_damage_a_snapshot(store):
    snapshot = take(store)
    path = path_of(store, snapshot)
    path.write_bytes(path.read_bytes().replace(b"\n", b"\r\n"))
    assert store.list().snapshots == (snapshot,)
    assert store.restore(store.get(snapshot.id)).freeze() == DEMO.freeze()


def test_a_scenario_that_can_no_longer_be_used_is_said(store):
    from dataclasses import replace

    snapshot = replace(take(store), bundle="schema = 9\n")
    with pytest.raises(JournalError, match=r"It cannot be restored: the snapshot “First”: schema"):
        store.restore(snapshot)


# Two windows, and disks that refuse


def test_two_windows_see_each_others_snapshots(store):
    other = Journal(store.folder)
    take(store)
    other.take(DEMO, RESULTS, name="Other")
    assert sorted(names(store)) == sorted(names(other)) == ["First", "Other"]


def test_a_snapshot_that_vanished_is_said(store):
    snapshot = take(store)
    Journal(store.folder).delete(snapshot)
    for action in (
        store.delete,
        lambda one: store.rename(one, name="New"),
        lambda s: store.get(s.id),
    ):
        with pytest.raises(JournalError, match="is no longer there; it was moved or deleted else"):
            action(snapshot)
    assert names(store) == []
    token = store.deleted().snapshots[0].id
    Journal(store.folder).bring_back(token)
    with pytest.raises(JournalError, match="is no longer there"):
        store.bring_back(token)
    assert names(store) == ["First"]


def test_a_name_given_in_another_window_is_not_overwritten(store):
    snapshot = take(store)
    Journal(store.folder).rename(snapshot, name="Theirs")
    with pytest.raises(JournalError, match="was changed in another window and is now “Theirs”"):
        store.rename(snapshot, name="Mine")
    (listed,) = store.list().snapshots
    assert store.rename(listed, name="Mine").name == "Mine"


def test_a_change_waits_for_another_window_and_brings_nothing_back(store):
    snapshot = take(store)
    said: list[str] = []

    def rename() -> None:
        try:
            store.rename(snapshot, name="Mine")
        except JournalError as error:
            said.append(str(error))

    waiting = threading.Thread(target=rename)
    with locked(store.folder / ".lock"):
        waiting.start()
        waiting.join(0.3)
        assert waiting.is_alive()
        path_of(store, snapshot).unlink()  # what the other window does meanwhile
    waiting.join(30.0)
    assert not waiting.is_alive()
    assert "is no longer there" in said[0]
    assert names(store) == []


def test_a_lock_is_held_by_one_and_let_go(tmp_path):
    held = try_lock(tmp_path / "lock")
    assert held is not None
    assert try_lock(tmp_path / "lock") is None
    held.release()
    held.release()
    again = try_lock(tmp_path / "lock")
    assert again is not None
    again.release()


def test_a_folder_that_went_is_said(store):
    snapshot = take(store)
    store.folder.rename(store.folder.with_name("elsewhere"))
    with pytest.raises(JournalError, match="folder is no longer there; nothing was changed"):
        store.delete(snapshot)
    assert names(store) == []


@pytest.mark.parametrize("step", ["open", "fsync", "replace"])
@pytest.mark.parametrize(
    ("number", "words"),
    [
        (errno.ENOSPC, "the disk is full; free some space and try again."),
        (errno.EROFS, "the folder is read-only; choose another one."),
        (errno.EACCES, "writing is not allowed there; choose another folder or change its"),
    ],
)
def test_a_disk_that_refuses_is_said_and_nothing_is_lost(store, step, number, words, monkeypatch):
    snapshot = take(store)
    before = sorted(store.folder.iterdir())

    def fail(*_arguments):
        raise OSError(number, os.strerror(number))

    def refused(action, start):
        with monkeypatch.context() as patch:
            patch.setattr(safe_write.os, step, fail)
            with pytest.raises(JournalError) as caught:
                action()
        assert str(caught.value).startswith(f"{start} in {store.folder}: {words}")
        assert "\n" not in str(caught.value)

    refused(lambda: take(store, name="Second"), "The snapshot could not be written")
    assert sorted(store.folder.iterdir()) == before
    if step != "fsync":  # of a file that is only moved nothing is written
        refused(lambda: store.delete(snapshot), "The snapshot could not be deleted")
    assert store.list().snapshots == (snapshot,)


def test_a_damaged_file_on_a_read_only_disk_is_said_and_the_rest_listed(store, monkeypatch):
    good, bad = take(store, name="Good"), take(store)
    path_of(store, bad).write_text("rubbish", encoding="utf-8")

    def fail(*_arguments):
        raise OSError(errno.EROFS, os.strerror(errno.EROFS))

    monkeypatch.setattr(safe_write.os, "replace", fail)
    listing = store.list()
    assert listing.snapshots == (good,)
    assert listing.messages[0].endswith(
        "could not be set aside: the folder is read-only; choose another one."
    )
    assert path_of(store, bad).exists()


def test_a_file_where_the_folder_should_be_is_said(tmp_path):
    (tmp_path / "journal").write_text("mine", encoding="utf-8")
    store = Journal(tmp_path / "journal")
    with pytest.raises(JournalError, match=r"The journal cannot be read in .*: what should be its"):
        store.list()
    with pytest.raises(
        JournalError, match=r"The snapshot could not be written in .*: what should be its"
    ):
        take(store)


def test_times_are_kept_in_utc_whatever_the_clock_says(tmp_path):
    zone = timezone(timedelta(hours=-5))
    store = Journal(tmp_path, now=lambda: datetime(2031, 1, 1, 22, 0, 0, 123, tzinfo=zone))
    snapshot = take(store)
    assert snapshot.id.startswith("20310102T030000Z-")
    read = Journal(tmp_path).get(snapshot.id)
    assert read.taken == snapshot.taken == datetime(2031, 1, 2, 3, 0, 0, 123, tzinfo=UTC)


def test_the_default_folder_is_one_the_user_sees(monkeypatch, tmp_path):
    monkeypatch.setattr(journal.platformdirs, "user_documents_dir", lambda: str(tmp_path))
    assert default_folder() == tmp_path / "Halfspan journal"
    assert Journal().folder == default_folder()


# The picture


def test_the_picture_shows_wing_and_tail_to_one_scale():
    picture = planform_svg(RESULTS.planform)
    assert is_planform_svg(picture)
    paths = re.findall(r'd="M([^"]*)Z"', picture)
    assert len(paths) == 2
    spans = []
    for path in paths:
        points = np.array([[float(n) for n in one.split()] for one in path.split(" L")])
        assert (points >= 0).all()
        assert (points <= [160, 72]).all()
        spans.append(np.ptp(points, axis=0))
    plan = RESULTS.planform
    true = [
        np.array([np.ptp(y), np.ptp(x)])
        for y, x in ((plan.wing_y, plan.wing_x), (plan.tail_y, plan.tail_x))
    ]
    scale = spans[0][0] / true[0][0]
    # Points are written to a tenth of a pixel, so that a length may be off by as much.
    np.testing.assert_allclose(spans, np.array(true) * scale, atol=0.2)
    assert max(spans[0][0] / 152, spans[1][1] / 64) <= 1.01


def test_outlines_that_were_not_found_are_left_out():
    from dataclasses import replace

    plan = RESULTS.planform
    part = planform_svg(replace(plan, tail_x=np.full_like(plan.tail_x, np.nan)))
    assert part.count("<path") == 1
    none = planform_svg(
        replace(plan, tail_x=np.array([]), tail_y=np.array([]), wing_x=plan.wing_x * np.nan)
    )
    assert is_planform_svg(part)
    assert is_planform_svg(none)


@pytest.mark.parametrize(
    "spoil",
    [
        lambda p: p.replace("</svg>", "<script>alert(1)</script></svg>"),
        lambda p: p.replace("<svg ", "<svg onload='alert(1)' "),
        lambda p: p.replace(' d="M', ' d="javascript:'),
        lambda p: p.replace("currentColor", "url(http://a.example/x)"),
        lambda p: p + "<img src=x>",
        lambda p: "<b>" + p,
        lambda p: p.replace("Z", "Z\n", 1),
        lambda p: "",
    ],
    ids=range(8),
)
def test_a_picture_that_somebody_else_drew_is_not_shown(store, spoil):
    picture = planform_svg(RESULTS.planform)
    assert not is_planform_svg(spoil(picture))
    snapshot = take(store)
    path = path_of(store, snapshot)
    text = path.read_text(encoding="utf-8")
    path.write_text(text.replace(snapshot.picture, spoil(picture)), encoding="utf-8")
    (listed,) = Journal(store.folder).list().snapshots
    assert listed.picture == ""
    assert listed.name == "First"
