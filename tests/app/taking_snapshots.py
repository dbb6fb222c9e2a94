"""A process that takes snapshots until it is killed, for tests of the journal.

Started with the folder of a journal, it waits for lines; for each it forks a child
that takes snapshots as fast as it can, writing the id of each to standard output
once it was taken, and says when that child has ended. A line may give the number
of snapshots after which the child ends by itself.
"""

from __future__ import annotations

import os
import sys

from app import journal
from app.journal import Journal
from app.scenario_bundle import bundle_text
from app.scenario_file import read_scenario
from scenarios import example_path
from tests.app.sample_results import make_results


def main() -> None:
    """Fork a child for each line."""
    folder = sys.argv[1]
    scenario, results = read_scenario(example_path()), make_results()
    # Worded once: most of the time is spent writing then, which is what is to be disturbed.
    text = bundle_text(scenario)
    journal.bundle_text = lambda _scenario: text
    for line in sys.stdin:
        most = int(line.strip() or 0)
        gate, opened = os.pipe()
        child = os.fork()
        if child == 0:
            os.read(gate, 1)  # its number is said before it says anything
            take(Journal(folder), scenario, results, most)
        say(f"pid {child}")
        os.write(opened, b"x")
        os.close(gate)
        os.close(opened)
        if most == 0:
            os.waitpid(child, 0)
            say("ended")
    while True:
        try:
            os.wait()
        except ChildProcessError:
            return


def take(store: Journal, scenario: object, results: object, most: int) -> None:
    """Take snapshots; never returns."""
    number = 0
    while not most or number < most:
        number += 1
        say(f"took {store.take(scenario, results, name=f'Number {number}').id}")
    os._exit(0)


def say(text: str) -> None:
    """Write one line in one piece, whatever happens next."""
    os.write(1, f"{text}\n".encode())


if __name__ == "__main__":
    main()
