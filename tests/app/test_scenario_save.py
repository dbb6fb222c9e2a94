"""Saving: what was written reads back equal, comments stay, nothing is left half done."""

from __future__ import annotations

import os
import stat
import tomllib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app import scenario_save
from app.scenario import Scenario, field_list
from app.scenario_error import ScenarioError
from app.scenario_file import read_scenario, scenario_from_text
from app.scenario_save import scenario_text, write_scenario
from scenarios import example_names, example_path
from solver.errors import InputError

MINIMAL = 'schema = 1\n[wing]\nroot_section = "NACA 4409"\ntip_section = "NACA 4409"\n'


def flyable() -> Scenario:
    """Make a scenario that needs no table."""
    return scenario_from_text(MINIMAL, file="a.toml", folder=Path())


def again(text: str) -> Scenario:
    """Read what was worded."""
    return scenario_from_text(text, file="again.toml", folder=Path())


def in_range(entry):
    """Draw anything a field might hold."""
    if entry.kind == "choice":
        return st.sampled_from(entry.choices)
    if entry.kind == "section":
        return st.sampled_from(["NACA 0009", "naca2412", "NACA 23012", "NACA 4415"])
    return st.floats(entry.low, entry.high)


TEXT = st.text(
    st.characters(blacklist_categories=["Cs"]) | st.sampled_from("\"'\\\n\t#=[]{}"), max_size=60
)
CHANGES = st.lists(
    st.sampled_from(field_list()).flatmap(
        lambda entry: st.tuples(st.just(entry.name), in_range(entry))
    ),
    max_size=12,
)


@settings(deadline=None)
@given(changes=CHANGES, name=TEXT, note=TEXT, commented=st.booleans())
def test_what_is_worded_reads_back_equal(changes, name, note, commented):
    scenario = read_scenario(example_path("tarn-ridge-18")) if commented else flyable()
    for field, value in changes:
        try:
            scenario.set_values({field: value})
        except InputError as error:
            assert error.name == field  # noqa: PT017 - refused by a rule between fields
    scenario.name, scenario.note = name, note
    try:
        text = scenario_text(scenario)
    except ScenarioError as error:
        # Only a text may be at fault, and then it would not have been read either.
        assert error.key in ("scenario.name", "scenario.note")  # noqa: PT017
        return
    read = again(text)
    assert read.freeze() == scenario.freeze()
    assert (read.name, read.author, read.note) == (name, scenario.author, note)
    assert scenario_text(read) == text


@pytest.mark.parametrize("name", example_names())
def test_an_unchanged_scenario_is_worded_as_it_was(name):
    scenario = read_scenario(example_path(name))
    assert scenario_text(scenario) == example_path(name).read_text(encoding="utf-8")


def test_comments_stay_and_only_what_changed_changes():
    path = example_path("tarn-ridge-18")
    scenario = read_scenario(path)
    scenario.set_values({"span_m": 1.65, "root_section": "NACA 2412"})
    before = path.read_text(encoding="utf-8").splitlines()
    after = scenario_text(scenario).splitlines()
    assert len(before) == len(after)
    changed = [line for old, line in zip(before, after, strict=True) if old != line]
    assert changed == [
        "span_m = 1.65",
        'root_section = "NACA 2412"  # no measurements: its polar is estimated',
    ]


@pytest.mark.parametrize(
    "text",
    [
        MINIMAL,
        "schema = 1\nwing.root_section = 'NACA 4409' # mine\nwing.tip_section = 'NACA 4409'\n",
        "schema = 1\nwing = {root_section = 'NACA 4409', tip_section = 'NACA 4409'} # mine\n",
        MINIMAL + "\n[tail]\n# mine\n\n[scenario]\n",
        MINIMAL.replace("\n", "\r\n"),
        "\ufeff" + MINIMAL,
        'schema = 1\n["wing"]\n"root_section"="NACA 4409"\n\'tip_section\'="NACA 4409"#mine',
        MINIMAL.replace('"NACA 4409"', "'''NACA 4409'''") + "[sections]\n",
    ],
    ids=["plain", "dotted", "inline", "empty tables", "returns", "mark", "quoted", "sections"],
)
def test_every_legal_spelling_can_be_saved_again(text):
    scenario = scenario_from_text(text.removeprefix("\ufeff"), file="a.toml", folder=Path())
    scenario.set_values({"tail_arm_m": 0.9, "span_m": 2.1, "tip_section": "NACA 2409"})
    worded = scenario_text(scenario)
    assert again(worded).freeze() == scenario.freeze()
    assert ("mine" in worded) == ("mine" in text)


def test_a_new_scenario_is_worded_whole_with_the_help_of_each_field():
    scenario = flyable()
    scenario.source_text = ""
    text = scenario_text(scenario)
    content = tomllib.loads(text)
    for entry in field_list():
        assert content[entry.group][entry.name] == scenario.values()[entry.name]
        assert f"# {entry.help}" in text


def test_what_contradicts_itself_is_not_saved(tmp_path):
    path = tmp_path / "a.toml"
    path.write_text("as it was", encoding="utf-8")
    scenario = flyable()
    scenario.brief.landing_speed_m_s = 30.0
    with pytest.raises(ScenarioError, match=r"brief\.landing_speed_m_s must be at most"):
        write_scenario(scenario, path)
    scenario = flyable()
    scenario.name = "a\x1b[2J"
    with pytest.raises(ScenarioError, match=r"scenario\.name must have no control characters"):
        write_scenario(scenario, path)
    assert path.read_text(encoding="utf-8") == "as it was"


def test_saving_replaces_the_file_and_leaves_nothing_else(tmp_path):
    path = tmp_path / "a.toml"
    scenario = flyable()
    write_scenario(scenario, path)
    scenario.set_values({"span_m": 2.2})
    write_scenario(scenario, path)
    assert [one.name for one in tmp_path.iterdir()] == ["a.toml"]
    assert read_scenario(path).freeze() == scenario.freeze()
    assert scenario.folder == tmp_path
    assert scenario.source_text == path.read_text(encoding="utf-8")


@pytest.mark.skipif(os.name != "posix", reason="permissions as POSIX has them")
def test_permissions_stay_and_new_files_have_the_usual_ones(tmp_path):
    path, usual = tmp_path / "a.toml", tmp_path / "usual"
    usual.touch()
    write_scenario(flyable(), path)
    assert stat.S_IMODE(path.stat().st_mode) == stat.S_IMODE(usual.stat().st_mode)
    path.chmod(0o640)
    write_scenario(flyable(), path)
    assert stat.S_IMODE(path.stat().st_mode) == 0o640


def test_saving_through_a_link_keeps_the_link(tmp_path):
    (tmp_path / "real").mkdir()
    link = tmp_path / "link.toml"
    link.symlink_to(tmp_path / "real" / "a.toml")
    write_scenario(flyable(), link)
    assert link.is_symlink()
    assert read_scenario(tmp_path / "real" / "a.toml").freeze() == flyable().freeze()


@pytest.mark.parametrize("step", ["fsync", "replace"])
def test_a_failure_on_the_way_leaves_the_old_file(step, tmp_path, monkeypatch):
    path = tmp_path / "a.toml"
    write_scenario(flyable(), path)
    old = path.read_bytes()

    def fail(*_arguments):
        raise OSError(28, "No space left on device")

    if step == "fsync":
        monkeypatch.setattr(scenario_save.os, "fsync", fail)
    else:
        monkeypatch.setattr(Path, "replace", fail)
    scenario = flyable()
    scenario.set_values({"span_m": 2.2})
    with pytest.raises(ScenarioError, match="cannot be written: No space left on device"):
        write_scenario(scenario, path)
    assert path.read_bytes() == old
    assert [one.name for one in tmp_path.iterdir()] == ["a.toml"]


@pytest.mark.parametrize("place", ["none/a.toml", ""])
def test_a_place_that_cannot_be_written_is_said(place, tmp_path):
    with pytest.raises(ScenarioError, match=r"cannot be written: No such|is a folder"):
        write_scenario(flyable(), tmp_path / place)


def test_saving_elsewhere_carries_the_tables_along(tmp_path):
    scenario = read_scenario(example_path())
    before = scenario.freeze()
    path = tmp_path / "b.toml"
    write_scenario(scenario, path)
    assert read_scenario(path).freeze() == before
    names = sorted(one.name for one in (tmp_path / "measured").iterdir())
    assert names == ["e387_model_e_drag.csv", "e387_model_e_lift.csv", "e387_outline.csv"]
    write_scenario(scenario, tmp_path / "c.toml")
    assert read_scenario(tmp_path / "c.toml").freeze() == before


def test_another_table_of_the_same_name_is_not_overwritten(tmp_path):
    (tmp_path / "measured").mkdir()
    other = tmp_path / "measured" / "e387_model_e_lift.csv"
    other.write_text("mine", encoding="utf-8")
    with pytest.raises(ScenarioError, match=r"E387.*lift cannot be copied: .* save into another"):
        write_scenario(read_scenario(example_path()), tmp_path / "b.toml")
    assert other.read_text(encoding="utf-8") == "mine"
    assert not (tmp_path / "b.toml").exists()


def test_tables_are_not_carried_out_of_the_folder(tmp_path):
    (tmp_path / "away").mkdir()
    (tmp_path / "here").mkdir()
    (tmp_path / "here" / "measured").symlink_to(tmp_path / "away")
    with pytest.raises(ScenarioError, match="leads out of the folder"):
        write_scenario(read_scenario(example_path()), tmp_path / "here" / "b.toml")
    assert list((tmp_path / "away").iterdir()) == []


def test_tables_that_changed_on_disk_are_not_passed_off_as_those_that_were_read(tmp_path):
    write_scenario(read_scenario(example_path()), tmp_path / "b.toml")
    scenario = read_scenario(tmp_path / "b.toml")
    lift = tmp_path / "measured" / "e387_model_e_lift.csv"
    shorter, _last = lift.read_text(encoding="utf-8").rstrip().rsplit("\n", 1)
    lift.write_text(shorter + "\n", encoding="utf-8")
    (tmp_path / "other").mkdir()
    with pytest.raises(ScenarioError, match="have changed on disk since they were read"):
        write_scenario(scenario, tmp_path / "other" / "b.toml")


def test_sections_come_and_go_with_the_scenario(tmp_path):
    scenario = read_scenario(example_path())
    files = scenario.sections["E387"]
    write_scenario(scenario, tmp_path / "b.toml")
    scenario.sections = {"E387": files, 'My "own" section': files}
    scenario.set_values({"tip_section": 'My "own" section'})
    write_scenario(scenario, tmp_path / "b.toml")
    read = read_scenario(tmp_path / "b.toml")
    assert read.freeze() == scenario.freeze()
    assert "nvented survey aircraft" in read.source_text
    scenario.set_values({"root_section": "NACA 4409", "tip_section": "NACA 4409"})
    scenario.sections = {}
    write_scenario(scenario, tmp_path / "b.toml")
    read = read_scenario(tmp_path / "b.toml")
    assert read.section_names() == ()
    assert read.freeze() == scenario.freeze()
