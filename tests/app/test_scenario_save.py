"""Saving: what was written reads back equal, comments stay, nothing is left half done."""

from __future__ import annotations

import errno
import hashlib
import os
import re
import stat
import time
import tomllib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app import safe_write
from app.scenario import Scenario, field_list
from app.scenario_error import ScenarioError
from app.scenario_file import read_scenario, scenario_from_text
from app.scenario_save import scenario_text, write_scenario
from scenarios import FOLDER, example_names, example_path
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


@pytest.mark.parametrize("step", ["open", "fsync", "replace"])
@pytest.mark.parametrize(
    ("number", "words"),
    [
        (errno.ENOSPC, "the disk is full; free some space and try again"),
        (errno.EROFS, "the folder is read-only; choose another one"),
        (errno.EACCES, "writing is not allowed there; choose another folder or change its perm"),
        (errno.EBUSY, os.strerror(errno.EBUSY)),
    ],
)
def test_a_failure_on_the_way_leaves_the_old_file(step, number, words, tmp_path, monkeypatch):
    path = tmp_path / "a.toml"
    write_scenario(flyable(), path)
    old = path.read_bytes()

    def fail(*_arguments):
        raise OSError(number, os.strerror(number))

    scenario = flyable()
    scenario.set_values({"span_m": 2.2})
    with monkeypatch.context() as patch:
        patch.setattr(safe_write.os, step, fail)
        with pytest.raises(ScenarioError) as caught:
            write_scenario(scenario, path)
    assert str(caught.value).startswith(f"{path} cannot be written: {words}")
    assert path.read_bytes() == old
    assert [one.name for one in tmp_path.iterdir()] == ["a.toml"]
    assert scenario.source_text != old.decode()


def test_content_and_then_name_are_forced_to_the_disk_before_saving_ends(tmp_path, monkeypatch):
    steps = []
    fsync, replace = os.fsync, os.replace

    def noted_fsync(handle):
        steps.append("folder" if stat.S_ISDIR(os.fstat(handle).st_mode) else "content")
        fsync(handle)

    def noted_replace(source, target):
        steps.append("name")
        replace(source, target)

    monkeypatch.setattr(safe_write.os, "fsync", noted_fsync)
    monkeypatch.setattr(safe_write.os, "replace", noted_replace)
    write_scenario(flyable(), tmp_path / "a.toml")
    assert steps == ["content", "name", "folder"]


def test_what_a_dead_process_left_half_written_goes_after_a_day(tmp_path):
    old, new = (tmp_path / f".a.toml.{digit * 16}.part" for digit in "01")
    mine = tmp_path / ".notes.part"
    for path in (old, new, mine):
        path.touch()
    for path in (old, mine):
        os.utime(path, (time.time() - 90_000,) * 2)
    safe_write.sweep(tmp_path)
    assert sorted(tmp_path.iterdir()) == sorted([new, mine])


@pytest.mark.parametrize(
    ("place", "words"),
    [("none/a.toml", "cannot be written: its folder does not exist"), ("", "is a folder")],
)
def test_a_place_that_cannot_be_written_is_said(place, words, tmp_path):
    with pytest.raises(ScenarioError, match=words):
        write_scenario(flyable(), tmp_path / place)


def table_names(folder: Path) -> list[str]:
    """List the tables that lie beside a scenario."""
    return sorted(one.name for one in (folder / "tables").iterdir())


def test_saving_elsewhere_carries_the_tables_along(tmp_path):
    scenario = read_scenario(example_path())
    before = scenario.freeze()
    revision = scenario.revision
    write_scenario(scenario, tmp_path / "b.toml")
    assert scenario.revision == revision  # where tables lie is no input
    assert read_scenario(tmp_path / "b.toml").freeze() == scenario.freeze() == before
    names = table_names(tmp_path)
    assert len(names) == 3
    for name in names:
        data = (tmp_path / "tables" / name).read_bytes()
        entry, start = re.fullmatch(r"E387-(outline|lift|drag)-([0-9a-f]{12})\.csv", name).groups()
        assert hashlib.sha256(data).hexdigest().startswith(start)
        assert getattr(scenario.sections["E387"], entry).path == f"tables/{name}"
    write_scenario(scenario, tmp_path / "c.toml")
    assert read_scenario(tmp_path / "c.toml").freeze() == before
    assert table_names(tmp_path) == names  # shared


def test_the_folder_opens_wherever_it_is_moved(tmp_path, monkeypatch):
    scenario = read_scenario(example_path())
    (tmp_path / "here").mkdir()
    write_scenario(scenario, tmp_path / "here" / "b.toml")
    (tmp_path / "here").rename(tmp_path / "there")
    monkeypatch.chdir(tmp_path)
    assert read_scenario("there/b.toml").freeze() == scenario.freeze()
    assert read_scenario(tmp_path / "there" / "b.toml").freeze() == scenario.freeze()


def shorter_lift(path: Path) -> str:
    """Take the last point of a table away; give what is left."""
    shorter, _last = path.read_text(encoding="utf-8").rstrip().rsplit("\n", 1)
    path.write_text(shorter + "\n", encoding="utf-8")
    return shorter + "\n"


def test_a_disk_that_fills_up_at_a_table_leaves_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "b.toml"
    write_scenario(flyable(), path)
    old = path.read_bytes()
    scenario = read_scenario(example_path())
    before, text = dict(scenario.sections), scenario.source_text
    replace, done = os.replace, []

    def fail_at_the_second(source, target):
        done.append(target)
        if len(done) == 2:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        replace(source, target)

    with monkeypatch.context() as patch:
        patch.setattr(safe_write.os, "replace", fail_at_the_second)
        with pytest.raises(ScenarioError, match="cannot be written: the disk is full"):
            write_scenario(scenario, path)
    assert path.read_bytes() == old
    assert (scenario.sections, scenario.source_text) == (before, text)
    assert scenario.folder == FOLDER
    write_scenario(scenario, path)
    assert read_scenario(path).freeze() == scenario.freeze()


def test_two_scenarios_with_other_tables_of_one_section_share_a_folder(tmp_path):
    first = read_scenario(example_path())
    write_scenario(first, tmp_path / "first.toml")
    (tmp_path / "away").mkdir()
    write_scenario(read_scenario(example_path()), tmp_path / "away" / "a.toml")
    text = (tmp_path / "away" / "a.toml").read_text(encoding="utf-8")
    (lift,) = (tmp_path / "away" / "tables").glob("*-lift-*")
    new = hashlib.sha256(shorter_lift(lift).encode()).hexdigest()
    text = re.sub(r'(lift_sha256 = )".*"', rf'\1"{new}"', text)
    (tmp_path / "away" / "a.toml").write_text(text, encoding="utf-8")
    second = read_scenario(tmp_path / "away" / "a.toml")
    assert second.freeze() != first.freeze()
    write_scenario(second, tmp_path / "second.toml")
    assert len(table_names(tmp_path)) == 4
    assert read_scenario(tmp_path / "first.toml").freeze() == first.freeze()
    assert read_scenario(tmp_path / "second.toml").freeze() == second.freeze()


def test_a_table_changed_by_hand_is_neither_overwritten_nor_passed_off(tmp_path):
    scenario = read_scenario(example_path())
    before = scenario.freeze()
    write_scenario(scenario, tmp_path / "b.toml")
    (lift,) = (tmp_path / "tables").glob("*-lift-*")
    changed = shorter_lift(lift)
    with pytest.raises(
        ScenarioError, match=r"E387\.lift_sha256 does not fit '.*', which was chang"
    ):
        read_scenario(tmp_path / "b.toml")
    write_scenario(scenario, tmp_path / "b.toml")
    assert read_scenario(tmp_path / "b.toml").freeze() == before
    assert lift.read_text(encoding="utf-8") == changed
    (longer,) = (one for one in (tmp_path / "tables").glob("*-lift-*") if one != lift)
    assert re.fullmatch(r"E387-lift-[0-9a-f]{64}\.csv", longer.name)
    shorter_lift(longer)
    with pytest.raises(ScenarioError, match=r"was changed by hand; give that file another name"):
        write_scenario(scenario, tmp_path / "b.toml")


def test_a_table_that_went_is_written_again_from_what_was_read(tmp_path):
    scenario = read_scenario(example_path())
    write_scenario(scenario, tmp_path / "b.toml")
    for path in (tmp_path / "tables").iterdir():
        path.unlink()
    write_scenario(scenario, tmp_path / "b.toml")
    assert read_scenario(tmp_path / "b.toml").freeze() == scenario.freeze()


def test_a_table_without_a_name_of_its_own_keeps_its_name_when_it_moves(tmp_path):
    (tmp_path / "measured").mkdir()
    for path in (FOLDER / "measured").iterdir():
        text = path.read_text(encoding="utf-8")
        (tmp_path / "measured" / path.name).write_text(
            re.sub("^# name:.*\n", "", text, flags=re.MULTILINE), encoding="utf-8"
        )
    text = example_path().read_text(encoding="utf-8").replace("schema = 2", "schema = 1")
    text = re.sub(r"^\w+_sha256 = .*\n", "", text, flags=re.MULTILINE)
    scenario = scenario_from_text(text, file="a.toml", folder=tmp_path)
    before = scenario.freeze()
    assert before.root_source.tables.outline_name == "E387"
    (tmp_path / "away").mkdir()
    write_scenario(scenario, tmp_path / "away" / "a.toml")
    assert read_scenario(tmp_path / "away" / "a.toml").freeze() == before


def test_tables_are_not_carried_out_of_the_folder(tmp_path):
    (tmp_path / "away").mkdir()
    (tmp_path / "here").mkdir()
    (tmp_path / "here" / "tables").symlink_to(tmp_path / "away")
    with pytest.raises(ScenarioError, match="leads out of the folder"):
        write_scenario(read_scenario(example_path()), tmp_path / "here" / "b.toml")
    assert list((tmp_path / "away").iterdir()) == []
    assert not (tmp_path / "here" / "b.toml").exists()


def test_a_section_of_any_name_gets_tables_of_a_plain_name(tmp_path):
    scenario = read_scenario(example_path())
    scenario.sections = {**scenario.sections, "../ \u00fcber/..": scenario.sections["E387"]}
    scenario.set_values({"tip_section": "../ \u00fcber/.."})
    write_scenario(scenario, tmp_path / "b.toml")
    assert read_scenario(tmp_path / "b.toml").freeze() == scenario.freeze()
    assert sorted(one.name for one in tmp_path.iterdir()) == ["b.toml", "tables"]
    assert all(re.fullmatch(r"[A-Za-z0-9-]+\.csv", name) for name in table_names(tmp_path))


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
