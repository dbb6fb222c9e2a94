"""Working states: found again by their hash, nothing else is, and offered once after a crash."""

from __future__ import annotations

import errno
import hashlib
import os
import signal
import subprocess
import sys
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from app import safe_write
from app.autosave import Autosave, AutosaveError, default_folder
from app.scenario_bundle import bundle_text
from app.scenario_file import read_scenario
from scenarios import example_path

DEMO = read_scenario(example_path())
TARN = read_scenario(example_path("tarn-ridge-18"))
ROOT = Path(__file__).resolve().parents[2]


def with_span(span: float):
    scenario = TARN.copy()
    scenario.set_values({"span_m": span})
    return scenario


class Clock:
    """A time that is moved by hand."""

    def __init__(self) -> None:
        self.time = datetime(2031, 5, 6, 7, 8, 9, tzinfo=UTC)

    def __call__(self) -> datetime:
        self.time += timedelta(seconds=1)
        return self.time


@pytest.fixture
def store(tmp_path):
    one = Autosave(tmp_path / "sessions", now=Clock())
    yield one
    one.close()


def test_a_state_is_found_by_the_hash_of_its_text(store):
    digest = store.save(DEMO, session="a")
    assert digest == hashlib.sha256(bundle_text(DEMO).encode()).hexdigest()
    read = store.lookup(digest)
    assert read.freeze() == DEMO.freeze()
    assert read.source_text == DEMO.source_text
    assert store.keep(DEMO) == digest


def test_another_process_finds_it_too(store):
    digest = store.keep(DEMO)
    assert Autosave(store.folder).lookup(digest).freeze() == DEMO.freeze()


def test_looking_where_nothing_was_kept_makes_no_folder(store):
    with pytest.raises(AutosaveError, match="is no longer kept; open the scenario's file or a"):
        store.lookup("0" * 64)
    assert store.recover() is None
    store.settle("a")
    assert not store.folder.exists()


@pytest.mark.parametrize(
    "digest",
    ["", "0" * 63, "A" * 64, "../" + "0" * 61, "0" * 64 + "\n", "/etc/hostname", None, "é" * 64, 3],
)
def test_what_is_no_hash_is_refused_and_opens_nothing(digest, store, monkeypatch):
    store.keep(DEMO)

    def fail(*arguments, **_named):
        raise AssertionError(f"opened {arguments}")

    monkeypatch.setattr(Path, "open", fail)
    with pytest.raises(AutosaveError, match="does not name a working state; open a file instead"):
        store.lookup(digest)


def test_a_link_out_of_the_folder_is_not_followed(store, tmp_path):
    store.keep(DEMO)
    text = bundle_text(TARN)
    digest = hashlib.sha256(text.encode()).hexdigest()
    (tmp_path / "outside.toml").write_text(text, encoding="utf-8")
    (store.folder / f"{digest}.toml").symlink_to(tmp_path / "outside.toml")
    with pytest.raises(AutosaveError, match="no longer kept"):
        store.lookup(digest)


def test_a_damaged_state_is_said_and_kept_anew(store):
    digest = store.keep(DEMO)
    path = store.folder / f"{digest}.toml"
    path.write_bytes(path.read_bytes()[:-100])
    with pytest.raises(AutosaveError, match="was damaged on the disk"):
        store.lookup(digest)
    assert store.keep(DEMO) == digest
    assert store.lookup(digest).freeze() == DEMO.freeze()


def test_the_oldest_states_are_dropped_but_no_unsaved_one(tmp_path):
    store = Autosave(tmp_path / "sessions", most=4)
    unsaved = store.save(with_span(1.5), session="a")
    digests = []
    for number in range(6):
        digests.append(store.keep(with_span(1.6 + number / 100)))
        os.utime(store.folder / f"{digests[-1]}.toml", (1e9 + number, 1e9 + number))
    left = {path.stem for path in store.folder.glob("*.toml")}
    assert left == {unsaved, *digests[-3:]}
    store.keep(with_span(1.6 + 3 / 100))  # used again: no longer the oldest
    store.keep(with_span(1.7))
    assert digests[3] in {path.stem for path in store.folder.glob("*.toml")}
    store.close()


def test_a_crash_offers_the_latest_unsaved_state_once(tmp_path):
    clock = Clock()
    crashed = Autosave(tmp_path / "sessions", now=clock)
    crashed.save(with_span(1.5), session="a")
    crashed.save(with_span(1.6), session="b")
    latest = crashed.save(with_span(1.7), session="b")
    time = clock.time
    crashed.save(with_span(1.8), session="c")
    crashed.settle("c")
    running = Autosave(tmp_path / "sessions", now=clock)
    assert running.recover() is None  # the other still lives
    die(crashed)
    found = running.recover()
    assert (found.digest, found.name, found.time) == (latest, "Tarn Ridge 18", time)
    assert running.lookup(found.digest).wing.span_m == 1.7
    assert running.recover() is None
    assert Autosave(tmp_path / "sessions").recover() is None
    assert not list((tmp_path / "sessions").glob("*.running"))


def die(store: Autosave) -> None:
    """What the end of its process does to a store: its lock goes, its marks stay."""
    store._lock.release()


def test_an_orderly_end_leaves_nothing_to_recover(store):
    store.save(DEMO, session="a")
    store.close()
    assert Autosave(store.folder).recover() is None
    assert sorted(path.suffix for path in store.folder.iterdir()) == [".toml"]


def test_own_states_are_not_recovered(store):
    store.save(DEMO, session="a")
    assert store.recover() is None


def test_a_mark_that_is_damaged_or_whose_state_is_gone_is_passed_over(tmp_path):
    folder = tmp_path / "sessions"
    crashed = Autosave(folder, now=Clock())
    crashed.save(with_span(1.5), session="a")
    gone = crashed.save(with_span(1.6), session="b")
    crashed.save(with_span(1.7), session="c")
    (folder / f"{gone}.toml").unlink()
    (mark,) = folder.glob("*-c.unsaved")
    mark.write_text("rubbish", encoding="utf-8")
    (folder / "notes.unsaved").write_text("mine", encoding="utf-8")
    die(crashed)
    found = Autosave(folder).recover()
    assert Autosave(folder).lookup(found.digest).wing.span_m == 1.5
    assert [path.name for path in folder.glob("*.unsaved")] == ["notes.unsaved"]


SCRIPT = """
import sys
from app.autosave import Autosave
from app.scenario_file import read_scenario
scenario = read_scenario(sys.argv[2])
print(Autosave(sys.argv[1]).save(scenario, session="a"), flush=True)
sys.stdin.read()
"""


@pytest.mark.skipif(os.name != "posix", reason="a kill as POSIX has it")
def test_a_process_that_is_killed_leaves_its_state_to_be_recovered(tmp_path):
    code = SCRIPT.replace(
        "Autosave(sys.argv[1])", "Autosave(__import__('pathlib').Path(sys.argv[1]))"
    )
    with subprocess.Popen(
        [sys.executable, "-c", code, str(tmp_path), str(example_path("tarn-ridge-18"))],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
        cwd=ROOT,
    ) as process:
        digest = process.stdout.readline().strip()
        other = Autosave(tmp_path)
        assert other.recover() is None  # alive
        process.send_signal(signal.SIGKILL)
    found = other.recover()
    assert found.digest == digest
    assert other.lookup(digest).freeze() == TARN.freeze()


@pytest.mark.parametrize("step", ["open", "fsync", "replace"])
@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EROFS, errno.EACCES])
def test_a_disk_that_refuses_is_said_in_one_sentence(step, number, store, monkeypatch):
    def fail(*_arguments):
        raise OSError(number, os.strerror(number))

    with monkeypatch.context() as patch:
        store.folder.mkdir()
        patch.setattr(safe_write.os, step, fail)
        with pytest.raises(AutosaveError) as caught:
            store.save(DEMO, session="a")
    sentence = str(caught.value)
    assert sentence.startswith("The working state could not be kept: ")
    assert sentence.count(".") == 1
    assert not list(store.folder.glob("*.toml"))
    assert not list(store.folder.glob(".*"))
    assert store.save(DEMO, session="a")


def test_a_scenario_that_contradicts_itself_is_said(store):
    scenario = TARN.copy()
    scenario.brief.landing_speed_m_s = 40.0
    with pytest.raises(
        AutosaveError, match=r"could not be kept: scenario: brief\.landing_speed_m_s"
    ):
        store.save(scenario, session="a")


def test_a_session_must_have_a_plain_name(store):
    with pytest.raises(ValueError, match="session must be 1 to 64 letters and digits"):
        store.save(DEMO, session="../a")


def test_the_default_folder_is_the_users(monkeypatch, tmp_path):
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    if sys.platform == "linux":
        assert default_folder() == tmp_path / "halfspan" / "sessions"
    assert Autosave().folder == default_folder()
