"""A scenario as one text: round trip, and every damaged or foreign one refused."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from app.scenario import field_list
from app.scenario_bundle import bundle_text, scenario_from_bundle
from app.scenario_error import ScenarioError
from app.scenario_file import read_scenario, scenario_from_text
from app.scenario_save import scenario_text, write_scenario
from app.toml_text import block, escaped_block, line_string
from scenarios import example_names, example_path
from solver.errors import InputError

BASE = {name: read_scenario(example_path(name)) for name in example_names()}


@pytest.fixture
def demo():
    return BASE["heronsgill-24"].copy()


def again(text: str):
    return scenario_from_bundle(text, file="a bundle")


def in_range(entry):
    if entry.kind == "choice":
        return st.sampled_from(entry.choices)
    if entry.kind == "section":
        return st.sampled_from(["NACA 0009", "NACA 2412", "NACA 23012"])
    return st.floats(entry.low, entry.high)


CHANGES = st.lists(
    st.sampled_from(field_list()).flatmap(
        lambda entry: st.tuples(st.just(entry.name), in_range(entry))
    ),
    max_size=8,
)


@settings(deadline=None, max_examples=40, suppress_health_check=[HealthCheck.too_slow])
@given(which=st.sampled_from(example_names()), changes=CHANGES, fresh=st.booleans())
def test_what_is_bundled_comes_back_equal(which, changes, fresh):
    scenario = BASE[which].copy()
    for field, value in changes:
        try:
            scenario.set_values({field: value})
        except InputError as error:
            assert error.name == field  # noqa: PT017 - refused by a rule between fields
    if fresh:
        scenario.source_text = ""
    text = bundle_text(scenario)
    read = again(text)
    assert read.freeze() == scenario.freeze()
    assert read.sections == scenario.sections
    assert (read.name, read.author, read.note) == (scenario.name, scenario.author, scenario.note)
    assert read.folder is None
    assert bundle_text(read) == text


TRICKY = st.text(
    st.sampled_from("\"'\\\n\t\r\x7f#=[]{}\u0085\u2028é")
    | st.characters(exclude_categories=["Cs"]),
    max_size=40,
)


@given(text=TRICKY)
def test_any_text_survives_being_written_as_toml(text):
    for write in (line_string, escaped_block, block):
        assert tomllib.loads(f"a = {write(text)}\nb = 1\n") == {"a": text, "b": 1}
    assert "'''" not in escaped_block(text) or "'''" in text
    assert "\n" not in line_string(text)


@pytest.mark.parametrize("text", ["'''", "a'", 'a"', '""""""', "\\", "\\u0041", "\r\n", "\x1b[2J"])
def test_texts_that_look_like_quotes_or_escapes_survive(text):
    for write in (line_string, escaped_block, block):
        assert tomllib.loads(f"a = {write(text)}") == {"a": text}


def test_tables_stand_in_it_word_for_word_once(demo):
    demo.sections = {"E387": demo.sections["E387"], "Other": demo.sections["E387"]}
    text = bundle_text(demo)
    for entry in ("outline", "lift", "drag"):
        table = getattr(demo.sections["E387"], entry)
        assert text.count(table.text) == 1
        assert f"[tables.{table.digest}]" in text
    assert again(text).freeze() == demo.freeze()


def test_comments_ride_along_and_come_out(demo, tmp_path):
    text = bundle_text(demo)
    assert text.startswith(scenario_text(demo))
    read = again(text)
    assert read.source_text == demo.source_text
    write_scenario(read, tmp_path / "a.toml")
    written = (tmp_path / "a.toml").read_text(encoding="utf-8")
    assert "# with the heavier of the two cameras" in written
    assert "[tables" not in written
    assert read_scenario(tmp_path / "a.toml").freeze() == demo.freeze()


def test_a_scenario_without_tables_is_the_text_of_its_file():
    scenario = BASE["tarn-ridge-18"].copy()
    assert bundle_text(scenario) == example_path("tarn-ridge-18").read_text(encoding="utf-8")


def test_carriage_returns_and_a_missing_last_line_end_do_no_harm():
    text = example_path().read_text(encoding="utf-8").rstrip().replace("\n", "\r\n")
    scenario = scenario_from_text(text, file="a.toml", folder=example_path().parent)
    bundle = bundle_text(scenario)
    assert "\r" not in bundle
    assert bundle_text(again(bundle)) == bundle
    assert again(bundle).freeze() == scenario.freeze()


def test_a_copy_that_was_edited_by_hand_is_read_and_loses_only_its_comments(demo):
    text = bundle_text(demo).replace("span_m = 2.4\n", "span_m = 2.3\n") + "\n# the end\n"
    read = again(text)
    assert read.wing.span_m == 2.3
    assert again(bundle_text(read)).freeze() == read.freeze()


def digest_of(text: str) -> str:
    return re.search(r"\[tables\.([0-9a-f]{64})\]", text)[1]


def drop_tables(text: str) -> str:
    return text[: text.index("[tables.")]


@pytest.mark.parametrize(
    ("spoil", "key", "words"),
    [
        (lambda t: t.replace("1.000000,0.000000", "1.000000,0.000001", 1), "tables.", "damaged or"),
        (drop_tables, "sections.E387.outline_sha256", "names a table that is not inside"),
        (lambda t: drop_tables(t) + "tables = 3\n", "sections.E387.tables", "is not a known key"),
        (lambda t: t.replace("[tables.", "[tables.x"), "tables.", "named by the sha256 of"),
        (lambda t: t + "more = 1\n", "tables.", "must hold its text, and nothing else"),
        (lambda t: t.replace("schema = 2", "schema = 1"), "sections.E387.outline_sha256", ""),
        (lambda t: t.replace("schema = 2", "schema = 3"), "schema", "a newer Halfspan has written"),
        (
            lambda t: t.replace('"measured/e387_outline', '"../x'),
            "sections.E387.outline",
            "got '..",
        ),
        (lambda t: t.replace("span_m = 2.4\n", "span_m = 24\n"), "wing.span_m", "got 24"),
        (lambda t: t[:-3], "", "is not TOML"),
        (lambda t: "", "schema", "is missing"),
    ],
    ids=range(11),
)
def test_a_bundle_that_is_damaged_or_foreign_gets_one_sentence(spoil, key, words, demo):
    text = spoil(bundle_text(demo))
    if words == "":
        # A hand that writes schema 1 over it changes nothing: the sha256 are there.
        assert again(text).freeze() == demo.freeze()
        return
    with pytest.raises(ScenarioError) as caught:
        again(text)
    assert caught.value.key.startswith(key)
    assert words in str(caught.value)
    assert str(caught.value).isprintable()
    assert len(str(caught.value)) < 400


def test_an_older_schema_without_sha256_cannot_have_its_tables_inside(demo):
    text = bundle_text(demo).replace("schema = 2", "schema = 1")
    text = re.sub(r"^\w+_sha256 = .*\n", "", text, flags=re.MULTILINE)
    with pytest.raises(ScenarioError, match="has no sha256; a scenario with its tables inside"):
        again(text)


def test_nothing_outside_the_text_is_opened(demo, monkeypatch):
    text = bundle_text(demo)

    def fail(*arguments, **_named):
        raise AssertionError(f"opened {arguments}")

    monkeypatch.setattr(Path, "open", fail)
    monkeypatch.setattr("builtins.open", fail)
    assert again(text).freeze() == demo.freeze()


def test_what_is_too_large_is_refused_when_kept_and_when_read(demo, monkeypatch):
    text = bundle_text(demo)
    monkeypatch.setattr("app.scenario_bundle.LARGEST_BUNDLE", len(text) - 1)
    with pytest.raises(ScenarioError, match="a scenario that is kept whole may have"):
        bundle_text(demo)
    with pytest.raises(ScenarioError, match="it may have at most"):
        again(text)


def test_a_table_that_could_not_be_read_again_is_refused_before_it_is_kept(demo, tmp_path):
    write_scenario(demo, tmp_path / "a.toml")
    (lift,) = (tmp_path / "tables").glob("*-lift-*")
    words = "# " + ".".join("x" * 60) + "\n"
    lift.write_text(words + lift.read_text(encoding="utf-8"), encoding="utf-8")
    text = (tmp_path / "a.toml").read_text(encoding="utf-8").replace("schema = 2", "schema = 1")
    text = re.sub(r"^\w+_sha256 = .*\n", "", text, flags=re.MULTILINE)
    scenario = scenario_from_text(text, file="a.toml", folder=tmp_path)
    with pytest.raises(ScenarioError, match="is nested too deeply in line"):
        bundle_text(scenario)
