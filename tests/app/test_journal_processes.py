"""Journals and processes: killed while they save, and several at once."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from app.journal import Journal, JournalError
from app.journal_snapshot import ENDING
from app.scenario_file import read_scenario
from scenarios import example_path
from tests.app.sample_results import make_results

ROOT = Path(__file__).resolve().parents[2]
KILLS = 50

pytestmark = pytest.mark.skipif(os.name != "posix", reason="forks and kills as POSIX has them")


@contextmanager
def taking(folder: Path) -> Iterator[subprocess.Popen[str]]:
    with subprocess.Popen(
        [sys.executable, "-m", "tests.app.taking_snapshots", str(folder)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
        cwd=ROOT,
    ) as process:
        yield process
        process.stdin.close()


def say(process: subprocess.Popen[str], line: str) -> None:
    process.stdin.write(f"{line}\n")
    process.stdin.flush()


def said(process: subprocess.Popen[str]) -> list[str]:
    return process.stdout.readline().split()


@pytest.mark.slow
def test_a_process_killed_while_saving_loses_no_snapshot_that_it_reported(tmp_path):
    folder = tmp_path / "journal"
    taken: set[str] = set()
    chance = random.Random(20310506)
    pace = 0.1  # how long one snapshot takes, as seen last [s]
    with taking(folder) as process:
        for number in range(KILLS):
            say(process, "0")
            child = int(said(process)[1])
            if number % 2 == 0:  # half of them have reported one by then
                started = time.monotonic()
                taken.add(said(process)[1])
                pace = time.monotonic() - started
            time.sleep(chance.uniform(0.0, pace))
            os.kill(child, signal.SIGKILL)
            while (words := said(process)) != ["ended"]:
                taken.add(words[1])
    listing = Journal(folder).list()
    there = {one.id for one in listing.snapshots}
    assert len(taken) >= KILLS / 2
    assert taken <= there
    assert listing.messages == ()  # nothing half written was ever called a snapshot
    assert len(there) <= len(taken) + KILLS  # one each may be on the disk and not reported yet
    strangers = {path.name for path in folder.iterdir()} - {f"{one}{ENDING}" for one in there}
    assert all(name.startswith(".") and name.endswith(".part") for name in strangers)
    last = max(listing.snapshots, key=lambda one: one.taken)
    assert Journal(folder).restore(last).freeze() == read_scenario(example_path()).freeze()


def test_processes_that_take_at_once_lose_nothing(tmp_path):
    folder = tmp_path / "journal"
    own = Journal(folder)
    scenario, results = read_scenario(example_path()), make_results()
    taken: set[str] = set()
    with taking(folder) as process:
        for _ in range(3):
            say(process, "6")
        for number in range(6):
            taken.add(own.take(scenario, results, name=f"Own {number}").id)
            assert own.list().messages == ()
        process.stdin.close()
        taken |= {line.split()[1] for line in process.stdout if line.startswith("took ")}
    assert len(taken) == 24
    assert {one.id for one in own.list().snapshots} == taken


RENAMING = """
import sys
from app.journal import Journal, JournalError
journal = Journal(sys.argv[1])
sys.stdin.readline()
done = 0
for snapshot in journal.list().snapshots:
    try:
        journal.rename(snapshot, name=snapshot.name + " by " + sys.argv[2])
        done += 1
    except JournalError as error:
        assert "in another window" in str(error) or "no longer there" in str(error), error
print(done)
"""


def test_renaming_at_once_and_deleting_resurrects_and_overwrites_nothing(tmp_path):
    folder = tmp_path / "journal"
    own = Journal(folder)
    scenario, results = read_scenario(example_path()), make_results()
    snapshots = [own.take(scenario, results, name=f"Number {n}") for n in range(12)]
    others = [
        subprocess.Popen(
            [sys.executable, "-c", RENAMING, str(folder), who],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
            cwd=ROOT,
        )
        for who in ("A", "B")
    ]
    for one in others:
        one.stdin.write("go\n")
        one.stdin.flush()
    deleted = 0
    for snapshot in snapshots[::3]:
        try:
            own.delete(snapshot)
            deleted += 1
        except JournalError as error:  # pragma: no cover - nobody else deletes
            raise AssertionError from error
    done = sum(int(one.communicate(timeout=60)[0]) for one in others)
    assert [one.returncode for one in others] == [0, 0]
    assert deleted == 4
    left, gone = own.list(), own.deleted()
    assert len(left.snapshots) == 8
    assert len(gone.snapshots) == 4
    assert left.messages == gone.messages == ()
    renamed = [one.name for one in (*left.snapshots, *gone.snapshots) if " by " in one.name]
    # Each counted rename is there; none was written over by the other window's.
    assert sum(name.count(" by ") for name in renamed) == done
