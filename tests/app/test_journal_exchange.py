"""Out of one journal and into another: everything comes along, nothing else gets in."""

from __future__ import annotations

import errno
import io
import os
import re
import zipfile
from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest

from app import journal_exchange, safe_write
from app.journal import Journal, JournalError
from app.journal_exchange import export_all, export_one, import_into
from app.journal_snapshot import ENDING, snapshot_text
from app.scenario_file import read_scenario
from scenarios import example_path
from tests.app.sample_results import make_results, with_nothing_found

DEMO = read_scenario(example_path())


@pytest.fixture
def full(tmp_path):
    start = datetime(2031, 5, 6, tzinfo=UTC)
    ticks = iter(range(1000))
    store = Journal(tmp_path / "from", now=lambda: start + timedelta(hours=next(ticks)))
    store.take(DEMO, make_results(), name="First", note="Why")
    store.take(DEMO, with_nothing_found(make_results()), name="Second")
    return store


@pytest.fixture
def empty(tmp_path):
    return Journal(tmp_path / "to")


def texts(store) -> dict[str, str]:
    return {one.id: snapshot_text(one) for one in store.list().snapshots}


def zipped(members: dict[str, bytes | str], **options) -> bytes:
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", **options) as archive:
        for name, data in members.items():
            archive.writestr(name, data)
    return packed.getvalue()


def refusal(store, data, file="upload.zip") -> str:
    with pytest.raises(JournalError) as caught:
        import_into(store, data, file=file)
    sentence = str(caught.value)
    assert sentence.startswith(f"'{file}' ")
    assert sentence.endswith(".")
    assert sentence.isprintable()
    assert not store.folder.exists() or store.list().snapshots == ()
    return sentence


def test_all_of_a_journal_comes_along(full, empty):
    data = export_all(full.list().snapshots)
    came = import_into(empty, data, file="journal.zip")
    assert len(came.snapshots) == 2
    assert (came.present, came.messages) == (0, ())
    assert texts(empty) == texts(full)
    for one in empty.list().snapshots:
        assert empty.restore(one).freeze() == DEMO.freeze()
    assert export_all(empty.list().snapshots) == data  # the same bytes for the same snapshots


def test_one_comes_along_as_the_file_that_it_is(full, empty):
    snapshot = full.list().snapshots[0]
    name, data = export_one(snapshot)
    assert data == (full.folder / name).read_bytes()
    came = import_into(empty, data, file=name)
    assert [one.id for one in came.snapshots] == [snapshot.id]
    assert texts(empty) == {snapshot.id: snapshot_text(snapshot)}


def test_what_is_there_already_is_not_taken_twice(full, empty):
    data = export_all(full.list().snapshots)
    import_into(empty, data, file="a.zip")
    again = import_into(empty, data, file="a.zip")
    assert (again.snapshots, again.present) == ((), 2)
    twice = zipped(
        {
            f"a{ENDING}": export_one(full.list().snapshots[0])[1],
            f"b{ENDING}": export_one(full.list().snapshots[0])[1],
        }
    )
    assert import_into(Journal(empty.folder), twice, file="b.zip").present == 2
    assert len(empty.list().snapshots) == 2


def test_another_snapshot_of_the_same_file_name_is_taken_beside_it(full, empty):
    snapshot = full.list().snapshots[0]
    import_into(empty, export_one(snapshot)[1], file=f"{snapshot.id}{ENDING}")
    other = replace(snapshot, name="Renamed elsewhere")
    came = import_into(empty, export_one(other)[1], file=f"{snapshot.id}{ENDING}")
    assert came.snapshots[0].id != snapshot.id
    assert {one.name for one in empty.list().snapshots} == {snapshot.name, "Renamed elsewhere"}


@pytest.mark.parametrize(
    "file", ["snapshot (1).toml", "../../x", "C:\\x", "", f".{ENDING}", "a\0b", "x" * 300]
)
def test_the_name_of_the_file_that_came_decides_nothing(file, full, empty, tmp_path):
    before = {path for path in tmp_path.rglob("*") if path.is_file()}
    came = import_into(empty, export_one(full.list().snapshots[0])[1], file=file)
    (new,) = (
        {path for path in tmp_path.rglob("*") if path.is_file()} - before - {empty.folder / ".lock"}
    )
    assert new == empty.folder / f"{came.snapshots[0].id}{ENDING}"


def test_a_packed_folder_gives_its_snapshots_and_says_what_was_left_out(full, empty):
    name, data = export_one(full.list().snapshots[0])
    packed = zipped(
        {
            f"My journal/{name}": data,
            "My journal/README.md": "mine",
            "My journal/.lock": "",
            f"My journal/deleted/gone{ENDING}": b"whatever",
            f"My journal/damaged/bad{ENDING}": b"whatever",
            f"__MACOSX/._{name}": b"whatever",
            f"My journal/rubbish{ENDING}": b"whatever",
        }
    )
    came = import_into(empty, packed, file="a.zip")
    assert [one.name for one in came.snapshots] == ["Second"]
    assert len(came.messages) == 2
    assert came.messages[0].startswith(f"'My journal/rubbish{ENDING}' was left out: ")
    assert came.messages[1] == "Left out: 3 files that are no snapshot of a journal."


def test_many_bad_files_are_not_all_listed(full, empty):
    name, data = export_one(full.list().snapshots[0])
    packed = zipped({name: data} | {f"bad{n}{ENDING}": b"x" for n in range(40)})
    came = import_into(empty, packed, file="a.zip")
    assert len(came.snapshots) == 1
    assert len(came.messages) == journal_exchange.MOST_MESSAGES
    assert came.messages[-1] == "31 more files were left out."


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", "cannot be taken in: it is not a snapshot of Halfspan."),
        (b"GIF89a\xff", "cannot be taken in: it is not text."),
        (b"schema = 2\n", "cannot be taken in: it is not a snapshot of Halfspan."),
        (b"= 3", "cannot be taken in: the file is not TOML in line 1"),
        (b"snapshot = 2\n", "cannot be taken in: a newer Halfspan has written it."),
        (b"PK", "is a damaged zip; export it again."),
        (b"PK\x03\x04" + b"\0" * 100, "is a damaged zip; export it again."),
        (zipped({}), "has no snapshot in it; their names end in .snapshot.toml."),
        (zipped({"a.txt": "mine"}), "has no snapshot in it; their names end in .snapshot.toml."),
    ],
    ids=range(9),
)
def test_foreign_files_get_one_sentence(data, words, empty):
    assert words in refusal(empty, data)


@pytest.mark.parametrize(
    "name", ["../x", "a/../../x", "/etc/x", "C:/x", "..\\x", "a\\..\\..\\x", "\\x"]
)
def test_a_zip_that_leads_out_of_its_folder_is_refused_whole(name, full, empty, tmp_path):
    good, data = export_one(full.list().snapshots[0])
    before = set(tmp_path.rglob("*"))
    packed = zipped({good: data, f"{name}{ENDING}": data})
    assert "leads out of its folder" in refusal(empty, packed)
    assert "nothing of it was taken in" in refusal(empty, packed)
    assert set(tmp_path.rglob("*")) == before


def test_a_bomb_is_refused_by_what_comes_out_of_it(full, empty, monkeypatch):
    monkeypatch.setattr(journal_exchange, "LARGEST_UNPACKED", 3_000_000)
    monkeypatch.setattr(journal_exchange, "LARGEST_SNAPSHOT", 1_000_000)
    name, data = export_one(full.list().snapshots[0])
    bomb = zipped(
        {name: data} | {f"a{n}{ENDING}": b"#" * 900_000 for n in range(4)},
        compression=zipfile.ZIP_DEFLATED,
    )
    assert len(bomb) < 30_000
    assert "unpacks to more than 3 MB; nothing of it was taken in." in refusal(empty, bomb)


def test_sizes_that_a_zip_lies_about_do_not_help_it(empty, monkeypatch):
    monkeypatch.setattr(journal_exchange, "LARGEST_UNPACKED", 1_000_000)
    size = 5_000_000
    bomb = zipped({f"a{ENDING}": b"#" * size}, compression=zipfile.ZIP_DEFLATED)
    lie = bomb.replace(size.to_bytes(4, "little"), (100).to_bytes(4, "little"))
    assert lie != bomb
    # Read as the hundred bytes it claims, it is a damaged zip, whose check sum is wrong.
    assert "damaged" in refusal(empty, lie)


def test_too_many_files_and_too_large_a_file_are_said(empty, monkeypatch):
    packed = zipped({f"{n}{ENDING}": "" for n in range(journal_exchange.MOST_MEMBERS + 1)})
    assert "has 1001 files in it; at most 1000 can be taken in at once." in refusal(empty, packed)
    monkeypatch.setattr(journal_exchange, "LARGEST_UPLOAD", 1000)
    assert "has 0.00101 MB; at most 0.001 MB can be taken in at once" in refusal(empty, b"#" * 1010)


def test_a_locked_zip_is_said(full, empty):
    name, data = export_one(full.list().snapshots[0])
    packed = bytearray(zipped({name: data}))
    # The flag of encryption, in the heading of the file and in the list of files.
    packed[6] |= 1
    packed[packed.rindex(b"PK\x01\x02") + 8] |= 1
    assert f"is damaged or locked at '{name}'; export it again." in refusal(empty, bytes(packed))


def test_a_damaged_member_is_said(full, empty):
    packed = bytearray(export_all(full.list().snapshots))
    packed[300] ^= 0xFF
    assert "is damaged or locked at '" in refusal(empty, bytes(packed))


def test_a_snapshot_whose_scenario_cannot_be_used_is_not_taken_in(full, empty):
    snapshot = full.list().snapshots[0]
    bad = replace(snapshot, bundle=snapshot.bundle.replace("\nspan_m = 2.4\n", "\nspan_m = 24\n"))
    sentence = refusal(empty, export_one(bad)[1], file="a")
    assert "It cannot be restored: the snapshot “Second”: wing.span_m must be" in sentence


@pytest.mark.parametrize("step", ["open", "fsync", "replace"])
@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EROFS, errno.EACCES])
def test_a_disk_that_refuses_is_said(step, number, full, empty, monkeypatch):
    data = export_all(full.list().snapshots)

    def fail(*_arguments):
        raise OSError(number, os.strerror(number))

    with monkeypatch.context() as patch:
        patch.setattr(safe_write.os, step, fail)
        with pytest.raises(
            JournalError, match=r"The snapshot could not be (written|taken in) in .*"
        ):
            import_into(empty, data, file="a.zip")
    assert import_into(empty, data, file="a.zip").present == 0


def test_texts_of_snapshots_that_came_are_held_to_the_same_rules(full, empty):
    snapshot = full.list().snapshots[0]
    text = snapshot_text(snapshot)
    for given, words in (
        (text.replace('name = "Second"', 'name = "\\u001b[2J"'), "its name must have no control"),
        (text.replace('name = "Second"', f'name = "{"x" * 121}"'), "its name must have at most"),
        (re.sub("\nsections = .*", "\nsections = [3]", text), "should be text is not"),
    ):
        assert given != text
        assert words in refusal(empty, given.encode(), file="a")
