"""Files of the first schema, and what the second one added: the sha256 of each table."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path

import pytest

from app import scenario_migration
from app.scenario_error import ScenarioError
from app.scenario_file import read_scenario, scenario_from_text
from app.scenario_migration import SCHEMA, TABLE_KEYS, migrate
from app.scenario_save import scenario_text, write_scenario
from scenarios import FOLDER, example_names, example_path

FIRST = """\
# An aircraft of somebody's own.
schema = 1  # written long ago

[wing]
span_m = 2.2  # by the van's length

[sections.E387]  # from the tunnel
outline = "measured/e387_outline.csv"
lift = "measured/e387_model_e_lift.csv"
drag = "measured/e387_model_e_drag.csv"  # drag too
"""


def from_first(text: str = FIRST, folder: Path = FOLDER):
    return scenario_from_text(text, file="a.toml", folder=folder)


def sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def current(**changed: str) -> str:
    """Word the same scenario in today's schema, with some sha256 changed or left out."""
    digests = {
        "outline": sha256(FOLDER / "measured" / "e387_outline.csv"),
        "lift": sha256(FOLDER / "measured" / "e387_model_e_lift.csv"),
        "drag": sha256(FOLDER / "measured" / "e387_model_e_drag.csv"),
    } | changed
    lines = [f"{entry}_sha256 = {value!r}" for entry, value in digests.items() if value is not None]
    return FIRST.replace("schema = 1", "schema = 2") + "\n".join(lines) + "\n"


def test_a_file_of_the_first_schema_is_what_the_same_file_of_the_second_is():
    first, second = from_first(), from_first(current())
    assert first.freeze() == second.freeze()
    assert first.sections == second.sections


def test_it_is_saved_as_the_second_with_its_comments(tmp_path):
    scenario = from_first()
    text = scenario_text(scenario)
    for comment in ("# An aircraft of", "schema = 2  # written long ago", "# by the van's length"):
        assert comment in text
    assert "[sections.E387]  # from the tunnel" in text
    assert 'e387_model_e_drag.csv"  # drag too' in text
    for entry in TABLE_KEYS:
        table = getattr(scenario.sections["E387"], entry)
        assert f'{entry}_sha256 = "{sha256(FOLDER / table.path)}"' in text
    write_scenario(scenario, tmp_path / "a.toml")
    assert read_scenario(tmp_path / "a.toml").freeze() == scenario.freeze()


def test_examples_are_of_todays_schema():
    for name in example_names():
        assert f"\nschema = {SCHEMA}\n" in example_path(name).read_text(encoding="utf-8")


def test_a_step_leads_from_every_schema_to_the_next():
    assert set(scenario_migration.STEPS) == set(range(1, SCHEMA))


def test_steps_are_taken_in_order_and_only_those_that_are_needed(monkeypatch):
    taken = []

    def step(number):
        def take(content, _digest_of):
            taken.append(number)
            return {**content, "seen": (*content.get("seen", ()), number)}

        return take

    monkeypatch.setattr(scenario_migration, "SCHEMA", 4)
    monkeypatch.setattr(scenario_migration, "STEPS", {n: step(n) for n in (1, 2, 3)})
    given = {"schema": 2, "wing": {}}
    assert migrate(given, schema=2, digest_of=lambda *_: "") == {
        "schema": 4,
        "wing": {},
        "seen": (2, 3),
    }
    assert given == {"schema": 2, "wing": {}}
    migrate(given, schema=1, digest_of=lambda *_: "")
    assert taken == [2, 3, 1, 2, 3]


@pytest.mark.parametrize(
    ("text", "key", "words"),
    [
        (FIRST.replace("e387_outline", "none"), "sections.E387.outline", "which does not exist"),
        (FIRST.replace('"measured/e387_outline.csv"', "3"), "sections.E387.outline", "got 3"),
        (
            FIRST.replace('"measured/e387_outline.csv"', '"../secret.csv"'),
            "sections.E387.outline",
            "got '../secret.csv'",
        ),
        (FIRST.replace("outline =", "outlin ="), "sections.E387.outlin", "did you mean outline"),
        ("schema = 1\nsections = 3\n", "sections", "must be a table; got 3"),
        ("schema = 1\n[sections]\nE387 = 3\n", "sections.E387", "must be a table; got 3"),
    ],
    ids=range(6),
)
def test_what_is_wrong_in_an_old_file_is_named_as_in_a_new_one(text, key, words):
    with pytest.raises(ScenarioError) as caught:
        from_first(text)
    assert caught.value.key == key
    assert words in str(caught.value)


@pytest.mark.parametrize("entry", TABLE_KEYS)
def test_a_table_that_is_not_the_one_of_the_sha256_is_refused(entry):
    with pytest.raises(ScenarioError) as caught:
        from_first(current(**{entry: "0" * 64}))
    right = sha256(FOLDER / getattr(from_first().sections["E387"], entry).path)
    assert caught.value.key == f"sections.E387.{entry}_sha256"
    for words in ("which was changed since; put the table back as it was or, if", right):
        assert words in str(caught.value)
    assert str(caught.value).isprintable()
    # The sentence's own advice works.
    assert from_first(current(**{entry: right})).freeze() == from_first().freeze()


@pytest.mark.parametrize(
    ("value", "words"),
    [
        (None, "is missing; write it, or write schema = 1 at the top and save the scenario once"),
        ("0" * 63, "must be the sha256 of the table, 64 of the letters 0-9 and a-f; got '0000"),
        ("A" * 64, "must be the sha256 of the table"),
        ("", "must be the sha256 of the table"),
    ],
)
def test_a_sha256_that_is_none_is_said(value, words):
    with pytest.raises(ScenarioError) as caught:
        from_first(current(lift=value))
    assert caught.value.key == "sections.E387.lift_sha256"
    assert words in str(caught.value)


@pytest.mark.parametrize("ends", ["\r\n", "\n"])
@pytest.mark.parametrize("mark", ["", "\ufeff"])
def test_line_ends_and_byte_order_marks_of_a_system_do_not_make_another_table(ends, mark, tmp_path):
    (tmp_path / "measured").mkdir()
    for path in (FOLDER / "measured").iterdir():
        text = mark + path.read_text(encoding="utf-8").replace("\n", ends)
        (tmp_path / "measured" / path.name).write_bytes(text.encode())
    moved = from_first(current(), folder=tmp_path)
    assert moved.freeze() == from_first().freeze()


def test_a_newer_schema_is_refused():
    with pytest.raises(ScenarioError, match="must be at most 2; got 3, which a newer Halfspan has"):
        from_first(re.sub("schema = 1", "schema = 3", FIRST))


def test_the_guide_shows_the_sha256_of_the_tables_that_ship():
    guide = (FOLDER.parent / "docs" / "scenario-file.md").read_text(encoding="utf-8")
    for line in current().splitlines():
        if "_sha256" in line:
            assert line.replace("'", '"') in guide
    assert f"`schema = {SCHEMA}` is the only line that must be there" in guide
