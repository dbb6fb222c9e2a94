"""Scenario files: every wrong one gets one sentence that says what and where."""

from __future__ import annotations

import os
import pickle
import re
import time
from pathlib import Path

import pytest

from app.scenario import Scenario, field_list
from app.scenario_error import ScenarioError
from app.scenario_file import LARGEST_FILE, read_scenario, scenario_from_text
from scenarios import FOLDER, example_names, example_path
from solver.errors import InputError
from solver.section.geometry import naca_outline

WING = '[wing]\nroot_section = "NACA 4409"\ntip_section = "NACA 4409"\n'
MINIMAL = f"schema = 1\n{WING}"
TAILS = ("00", "01", "12", "29", "40", "41")
TABLE_KEYS = ("outline", "lift", "drag")


def refusal(text: str, folder: Path = Path()) -> ScenarioError:
    """Read a text that must be refused."""
    with pytest.raises(ScenarioError) as caught:
        scenario_from_text(text, file="a.toml", folder=folder)
    return caught.value


def wing(line: str) -> str:
    """Make a scenario with one more line under [wing]."""
    return f"{MINIMAL}{line}\n"


# The text, the key at fault, and a piece of the sentence.
WRONG = [
    ("= 3", "", "a.toml is not TOML in line 1, "),
    ("schema = 1\n[wing]\nspan_m = \n", "", "a.toml is not TOML in line 3, "),
    ("schema = 1\n[wing", "", "a.toml is not TOML in line 2, the end: "),
    ("schema = 1\nschema = 1\n", "", "a.toml is not TOML in line 2, "),
    ("schema = 1\n[wing]\n[wing]\n", "", "[wing] stands twice"),
    ("# nothing but this\n", "schema", "is missing; a scenario starts with the line schema = 2"),
    (WING, "schema", "is missing"),
    ("schema = 3\n", "schema", "must be at most 2; got 3, which a newer Halfspan has written"),
    ("schema = 0\n", "schema", "must be a whole number from 1 to 2; got 0"),
    ("schema = '1'\n", "schema", "must be a whole number from 1 to 2; got '1'"),
    ("schema = true\n", "schema", "must be a whole number from 1 to 2; got true"),
    ("schema = 1.0\n", "schema", "must be a whole number from 1 to 2; got 1"),
    ("schema = 1\n[wings]\n", "wings", "is not a known table (did you mean wing?); there are sc"),
    ("schema = 1\n[engine]\n", "engine", "is not a known table; there are scenario, brief, wing"),
    ("schema = 1\nspan_m = 2\n", "span_m", "is in the wrong place; it belongs in [wing]"),
    ("schema = 1\nwing = 3\n", "wing", "must be a table; got 3"),
    ("schema = 1\n[[wing]]\n", "wing", "must be a table; got a list"),
    (wing("spam_m = 2"), "wing.spam_m", "is not a known key (did you mean span_m?)"),
    (wing("x = 2"), "wing.x", "is not a known key; there are span_m, root_chord_mm"),
    (wing('"a b" = 2'), 'wing."a b"', "is not a known key"),
    (wing("mass_kg = 2"), "wing.mass_kg", "is in the wrong place; it belongs in [brief]"),
    (wing("span_m = 12"), "wing.span_m", "must be a number between 0.4 and 8 m; got 12"),
    (wing("span_m = 0"), "wing.span_m", "must be a number between 0.4 and 8 m; got 0"),
    (wing("span_m = '2'"), "wing.span_m", "must be a number between 0.4 and 8 m; got '2'"),
    (wing("span_m = true"), "wing.span_m", "must be a number between 0.4 and 8 m; got true"),
    (wing("span_m = nan"), "wing.span_m", "must be a number between 0.4 and 8 m; got nan"),
    (wing("span_m = -inf"), "wing.span_m", "must be a number between 0.4 and 8 m; got -inf"),
    (wing("span_m = [2]"), "wing.span_m", "must be a number between 0.4 and 8 m; got a list"),
    (wing("span_m = {m = 2}"), "wing.span_m", "0.4 and 8 m; got a table"),
    (wing("span_m = 2024-01-01"), "wing.span_m", "0.4 and 8 m; got 2024-01-01"),
    (wing(f"span_m = {'9' * 900}"), "wing.span_m", "0.4 and 8 m; got 99999"),
    (wing(f"span_m = {'9' * 5000}"), "", "has a whole number with thousands of digits"),
    (wing("finish = 'glossy'"), "wing.finish", "one of moulded, filmed, taped, bare foam; got"),
    (wing("finish = 3"), "wing.finish", "one of moulded, filmed, taped, bare foam; got 3"),
    (wing("tip_chord_mm = 900"), "wing.tip_chord_mm", "at most 1.5 times the root chord, 420 mm"),
    ("schema = 1\n", "wing.root_section", "is missing and its default does not fit"),
    ("schema = 1\n[wing]\nroot_section = 'NACA 4012'\n", "wing.root_section", "four digits: camb"),
    ("schema = 1\n[wing]\nroot_section = 'NACA 23612'\n", "wing.root_section", "five digits: li"),
    ("schema = 1\n[wing]\nroot_section = 'E388'\n", "wing.root_section", "NACA and its digits, o"),
    ("schema = 1\n[scenario]\ntitle = 'x'\n", "scenario.title", "there are name, author, note"),
    ("schema = 1\n[scenario]\nname = 3\n", "scenario.name", "must be a text; got 3"),
    ("schema = 1\n[scenario]\nname = ' '\n", "scenario.name", "must not be blank; got ' '"),
    ('schema = 1\n[scenario]\nname = "a\\u001b[2J"\n', "scenario.name", "no control characters"),
    ('schema = 1\n[scenario]\nname = "a\\nb"\n', "scenario.name", "no control characters"),
    (f"schema = 1\n[scenario]\nname = '{'x' * 121}'\n", "scenario.name", "at most 120 characters"),
    ("schema = 1\nsections = 3\n", "sections", "must be a table; got 3"),
    ("schema = 1\n[sections]\nE387 = 3\n", "sections.E387", "must be a table; got 3"),
    ("schema = 1\n[sections.E387]\noutlin = 'x'\n", "sections.E387.outlin", "did you mean outline"),
    ("schema = 1\n[sections.E387]\nlift = 'x'\n", "sections.E387.outline", "is missing; a section"),
    ("schema = 1\n[sections.' ']\n", "sections.\" \"", "printable name of 1 to 80 characters"),
    ("schema = 1\n" + "".join(f"[sections.a{i}]\n" for i in range(41)), "sections", "at most 40"),
    ("x = " + "[" * 5000, "", "a.toml is nested too deeply"),
    ("a." * 5000 + "a = 1", "", "a.toml is nested too deeply in line 1"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "key", "words"), WRONG, ids=range(len(WRONG)))
def test_a_wrong_file_gets_one_sentence(text, key, words):
    error = refusal(text)
    assert (error.file, error.key) == ("a.toml", key)
    assert words in str(error)
    assert str(error).startswith("a.toml")
    assert len(str(error)) < 400
    assert str(error).isprintable()  # one line, and nothing that moves a terminal's cursor


@pytest.mark.parametrize("entry", field_list(), ids=lambda entry: entry.name)
def test_every_field_refuses_what_is_not_its_kind(entry):
    base = f"schema = 1\n[{entry.group}]\n"
    for value, shown in (("[]", "a list"), ("false", "false"), ("nan", "nan"), ("''", "''")):
        error = refusal(f"{base}{entry.name} = {value}\n")
        assert error.key == f"{entry.group}.{entry.name}"
        assert str(error).endswith(f"; got {shown}")
        assert " must be " in str(error)


def test_an_error_survives_a_process_boundary():
    error = refusal("schema = 3\n")
    again = pickle.loads(pickle.dumps(error))
    assert (str(again), again.file, again.key) == (str(error), error.file, error.key)


def test_a_default_that_contradicts_what_is_given_blames_what_is_given():
    error = refusal(f"{MINIMAL}[brief]\ncruise_speed_m_s = 10\n")
    assert error.key == "brief.cruise_speed_m_s"
    assert "at least the landing speed, 14.5 m/s; got 10" in str(error)


def test_what_is_missing_takes_its_default():
    scenario = scenario_from_text(wing("span_m = 2"), file="a.toml", folder=Path())
    expected = Scenario().values() | {
        "span_m": 2.0,
        "root_section": "NACA 4409",
        "tip_section": "NACA 4409",
    }
    assert scenario.values() == expected
    assert (scenario.name, scenario.author, scenario.note) == ("Untitled", "", "")


@pytest.mark.parametrize(
    "text",
    [
        MINIMAL,
        "\ufeff" + MINIMAL,
        MINIMAL.replace("\n", "\r\n"),
        "schema = 1\nwing.root_section = 'naca4409'\nwing.tip_section = 'NACA-4409'\n",
        "schema = 1\nwing = {root_section = 'NACA 4409', tip_section = 'NACA 4409'}\n",
    ],
    ids=["plain", "byte-order mark", "carriage returns", "dotted", "inline"],
)
def test_any_spelling_of_the_same_is_the_same(text, tmp_path):
    path = tmp_path / "a.toml"
    path.write_bytes(text.encode())
    expected = scenario_from_text(MINIMAL, file="a.toml", folder=Path())
    assert read_scenario(path).freeze() == expected.freeze()


def test_a_missing_file_is_said(tmp_path):
    with pytest.raises(ScenarioError, match=r"nowhere\.toml does not exist; give the path of a"):
        read_scenario(tmp_path / "nowhere.toml")


def test_a_folder_is_said(tmp_path):
    with pytest.raises(ScenarioError, match="is a folder; a scenario is a TOML file"):
        read_scenario(tmp_path)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="pipes with a name")
def test_a_pipe_is_refused_without_waiting_for_it(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(ScenarioError, match="is not a regular file"):
        read_scenario(tmp_path / "pipe")


@pytest.mark.parametrize("content", [b"", b"\n \n\t"])
def test_an_empty_file_is_said(content, tmp_path):
    path = tmp_path / "a.toml"
    path.write_bytes(content)
    with pytest.raises(ScenarioError, match=r"a\.toml is empty; a scenario starts with schema = 2"):
        read_scenario(path)


def test_bytes_that_are_not_utf8_are_named_with_their_line(tmp_path):
    path = tmp_path / "a.toml"
    path.write_bytes(MINIMAL.encode() + "# größer\n".encode("latin-1"))
    with pytest.raises(ScenarioError, match="line 5 has the byte 0xf6, which is not UTF-8"):
        read_scenario(path)


def test_a_path_that_no_system_takes_is_refused():
    with pytest.raises(ScenarioError, match="is not a usable file name"):
        read_scenario("a\0.toml")
    with pytest.raises(ScenarioError, match="cannot be read: "):
        read_scenario("x" * 5000)


def test_a_huge_file_is_refused_by_its_size_alone(tmp_path):
    path = tmp_path / "huge.toml"
    with path.open("wb") as stream:
        stream.truncate(400_000_000)  # sparse: no such bytes are on the disk
    with pytest.raises(ScenarioError, match=r"huge\.toml has 400 MB; .* at most 1 MB"):
        read_scenario(path)


def test_the_largest_file_that_is_read_is_read(tmp_path):
    path = tmp_path / "large.toml"
    path.write_text(MINIMAL + "#" * (LARGEST_FILE - len(MINIMAL)), encoding="utf-8")
    assert read_scenario(path).wing.root_section == "NACA 4409"
    path.write_text(MINIMAL + "#" * (LARGEST_FILE - len(MINIMAL) + 1), encoding="utf-8")
    with pytest.raises(ScenarioError, match="at most 1 MB"):
        read_scenario(path)


def test_a_key_of_a_hundred_thousand_parts_is_refused_at_once():
    # The parser's own time grows with the square: minutes, where this takes milliseconds.
    started = time.process_time()
    refusal("schema = 1\n" + "a . " * 100_000 + "a = 1")
    assert time.process_time() - started < 5.0


def test_usable_digits_are_those_that_have_an_outline():
    names = [f"NACA {camber:02d}{tail}" for camber in range(100) for tail in TAILS]
    names += [f"NACA {head:03d}{tail}" for head in range(1000) for tail in TAILS]
    scenario = Scenario()
    for name in names:
        try:
            naca_outline(name)
        except InputError:
            with pytest.raises(InputError, match="tail_section must be NACA and"):
                scenario.check({"tail_section": name})
        else:
            assert scenario.check({"tail_section": name}) == {"tail_section": name}


@pytest.fixture
def with_tables(tmp_path):
    """Put a scenario with the tables of E387 into a folder, of the schema without sha256."""
    folder = tmp_path / "mine"
    (folder / "measured").mkdir(parents=True)
    for path in (FOLDER / "measured").glob("e387_*.csv"):
        (folder / "measured" / path.name).write_bytes(path.read_bytes())
    path = folder / "a.toml"
    text = example_path().read_text(encoding="utf-8").replace("schema = 2", "schema = 1")
    path.write_text(re.sub(r"^\w+_sha256 = .*\n", "", text, flags=re.M), encoding="utf-8")
    return path


def without(path: Path, entry: str, value: str) -> None:
    """Replace one path of the section's tables."""
    text = path.read_text(encoding="utf-8")
    path.write_text(
        re.sub(rf"^{entry} = .*$", lambda _: f"{entry} = {value}", text, flags=re.MULTILINE),
        encoding="utf-8",
    )


@pytest.mark.parametrize("name", example_names())
def test_the_examples_are_usable_and_nothing_in_them_is_odd(name):
    scenario = read_scenario(example_path(name))
    assert scenario.freeze().name == scenario.name
    assert scenario.oddities() == ()
    assert "nvented" in scenario.note


def test_the_tables_are_read_and_take_part_in_equality(with_tables):
    first, second = read_scenario(with_tables).freeze(), read_scenario(example_path()).freeze()
    assert first == second
    assert hash(first) == hash(second)
    tables = first.root_source.tables
    assert tables is not None
    assert len(tables.lift) >= 5
    assert not tables.outline.flags.writeable
    assert not tables.lift[0].angle.flags.writeable
    lift = with_tables.parent / "measured" / "e387_model_e_lift.csv"
    text = lift.read_text(encoding="utf-8")
    shorter, _last = text.rstrip().rsplit("\n", 1)
    lift.write_text(shorter + "\n", encoding="utf-8")
    assert read_scenario(with_tables).freeze() != second


@pytest.mark.parametrize("entry", TABLE_KEYS)
@pytest.mark.parametrize(
    ("value", "words"),
    [
        ("'measured/none.csv'", "got 'measured/none.csv', which does not exist"),
        ("'measured'", "got 'measured', which is not a file"),
        ("'../outside.csv'", "got '../outside.csv'"),
        ("'measured/../../outside.csv'", "got 'measured/../../outside.csv'"),
        ("'/etc/hostname'", "got '/etc/hostname'"),
        ("'C:/outside.csv'", "got 'C:/outside.csv'"),
        ("'measured\\none.csv'", r"got 'measured\\none.csv'"),
        ("'link.csv'", "got 'link.csv', a link that leads out of it"),
        ("'away/outside.csv'", "got 'away/outside.csv', a link that leads out of it"),
        ("''", "got ''"),
        ("3", "got 3"),
        ('"a\\u0000b"', r"got 'a\x00b'"),
        (f"'{'x' * 900}'", "File name too long"),
    ],
    ids=range(13),
)
def test_a_table_outside_the_folder_or_missing_is_refused(entry, value, words, with_tables):
    folder = with_tables.parent
    outside = folder.parent / "outside.csv"
    outside.write_text("secret", encoding="utf-8")
    (folder / "link.csv").symlink_to(outside)
    (folder / "away").symlink_to(folder.parent)
    without(with_tables, entry, value)
    with pytest.raises(ScenarioError) as caught:
        read_scenario(with_tables)
    assert caught.value.key == f"sections.E387.{entry}"
    assert words in str(caught.value)
    assert str(caught.value).isprintable()
    assert "secret" not in str(caught.value)


def test_a_link_that_stays_in_the_folder_is_followed(with_tables):
    (with_tables.parent / "link.csv").symlink_to("measured/e387_outline.csv")
    without(with_tables, "outline", "'link.csv'")
    assert read_scenario(with_tables).freeze() == read_scenario(example_path()).freeze()


@pytest.mark.parametrize("entry", TABLE_KEYS)
@pytest.mark.parametrize("content", ["", "some words\n", "a,b\n1,2\n"], ids=range(3))
def test_an_unusable_table_is_named_with_its_key(entry, content, with_tables):
    (with_tables.parent / "bad.csv").write_text(content, encoding="utf-8")
    without(with_tables, entry, "'bad.csv'")
    with pytest.raises(ScenarioError) as caught:
        read_scenario(with_tables)
    assert caught.value.key == f"sections.E387.{entry}"
    assert "bad.csv" in str(caught.value)
    assert str(caught.value).isprintable()


def test_a_huge_table_is_refused_by_its_size_alone(with_tables):
    with (with_tables.parent / "huge.csv").open("wb") as stream:
        stream.truncate(400_000_000)
    without(with_tables, "lift", "'huge.csv'")
    with pytest.raises(ScenarioError, match=r"sections\.E387\.lift .*huge\.csv.*400"):
        read_scenario(with_tables)


def test_a_table_with_text_in_a_number_column_is_named_with_line_and_column(with_tables):
    lift = with_tables.parent / "measured" / "e387_model_e_lift.csv"
    lines = lift.read_text(encoding="utf-8").splitlines()
    cells = lines[-1].split(",")
    cells[-1] = "high"
    lines[-1] = ",".join(cells)
    lift.write_text("\n".join(lines) + "\n", encoding="utf-8")
    with pytest.raises(ScenarioError) as caught:
        read_scenario(with_tables)
    assert caught.value.key == "sections.E387.lift"
    for words in ("e387_model_e_lift.csv", f"line {len(lines)}", "high"):
        assert words in str(caught.value)
