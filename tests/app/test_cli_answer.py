"""What an analysis looks like as text and as JSON."""

from __future__ import annotations

import dataclasses
import json
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.analysis.results import Results, Trust, Verdict
from app.answer_json import answer, answer_json, margin_key
from app.answer_text import NOT_FOUND, answer_text, number
from app.field_listing import markdown_table
from app.scenario import GROUPS, field_list
from tests.app.answer_keys import DOCS, documented, generic, key_paths
from tests.app.sample_results import make_results, with_nothing_found


def all_inputs(results: Results) -> Results:
    """Give made-up results the inputs of a whole scenario."""
    return dataclasses.replace(
        results, inputs={entry.name: entry.default for entry in field_list()}
    )


def test_the_documented_keys_are_the_real_ones():
    printed = json.loads(answer_json(all_inputs(make_results()), version="1"))
    names, keys = documented()
    assert set(printed["margins"]) == names
    assert generic(key_paths(printed)) == keys


def test_every_input_is_in_the_answer():
    printed = answer(all_inputs(make_results()), version="1")["inputs"]
    assert list(printed) == [entry.name for entry in field_list()]


def test_the_keys_do_not_depend_on_what_was_found():
    found, nothing = all_inputs(make_results()), all_inputs(with_nothing_found(make_results()))
    calm = dataclasses.replace(nothing, landing=dataclasses.replace(nothing.landing, sentences=()))
    assert key_paths(answer(found, version="1")) == key_paths(answer(calm, version="1"))


def test_json_has_null_for_what_was_not_found():
    text = answer_json(with_nothing_found(make_results()), version="1")
    assert "NaN" not in text
    printed = json.loads(text)
    assert printed["landing"]["stall_speed_m_s"] is None
    assert printed["margins"]["endurance_h"]["value"] is None
    assert printed["landing"]["trust"] == "not_converged"
    assert printed["verdict"] == "fail"


def test_json_takes_numpy_numbers_for_what_they_are():
    results = make_results()
    cruise = dataclasses.replace(results.cruise, speed_m_s=np.float32(17.5))
    printed = json.loads(answer_json(dataclasses.replace(results, cruise=cruise), version="1"))
    assert printed["cruise"]["speed_m_s"] == 17.5


def test_json_passes_on_values_unrounded():
    results = make_results()
    printed = json.loads(answer_json(results, version="1"))
    for margin in results.margins:
        assert printed["margins"][margin_key(margin)]["value"] == margin.value
        assert printed["margins"][margin_key(margin)]["margin"] == margin.margin
    total = results.cruise.drag.total
    parts = ("induced", "profile", "body", "trim_induced", "trim_profile")
    assert printed["cruise"]["total_drag_n"] == total
    summed = sum(printed["cruise"][f"{part}_drag_n"] for part in parts)
    assert summed == pytest.approx(total, rel=1e-12)  # the order of the sum


@pytest.mark.parametrize("worst", list(Verdict))
def test_the_verdict_of_all_is_the_worst(worst):
    results = make_results()
    calm = [dataclasses.replace(one, verdict=Verdict.PASS) for one in results.margins]
    calm[3] = dataclasses.replace(calm[3], verdict=worst)
    printed = answer(dataclasses.replace(results, margins=tuple(calm)), version="1")
    assert printed["verdict"] == worst


def table_rows(text: str) -> list[str]:
    """Cut the margin table out of the text."""
    lines = text.splitlines()
    start = next(i for i, line in enumerate(lines) if line.startswith("Requirement"))
    return lines[start : lines.index("", start)]


def test_the_table_has_a_line_for_each_requirement_and_lines_up():
    results = make_results()
    head, *rows = table_rows(answer_text(results))
    assert len(rows) == len(results.margins)
    place = head.index("Verdict")
    for row, margin in zip(rows, results.margins, strict=True):
        assert row.startswith(margin.label)
        assert row[place:] == str(margin.verdict)
        assert row[head.index("Limit") :].startswith(f"{margin.sense} {margin.limit:g}")


def test_a_margin_is_never_rounded_to_nothing():
    results = make_results()
    first = dataclasses.replace(results.margins[0], value=1.2996, verdict=Verdict.FAIL)
    text = answer_text(dataclasses.replace(results, margins=(first, *results.margins[1:])))
    assert "-0.0004" in table_rows(text)[1]


def test_text_never_shows_what_was_not_found_as_a_number():
    text = answer_text(with_nothing_found(make_results()))
    assert "nan" not in text.lower()
    for row in table_rows(text)[1:]:
        assert NOT_FOUND in row
    for label in ("Stall speed in trim", "Lift coefficient there", "  Lift over drag"):
        (line,) = [one for one in text.splitlines() if one.startswith(f"  {label}")]
        assert line.endswith(NOT_FOUND)


@pytest.mark.parametrize(
    ("trust", "words"),
    [(Trust.EXTRAPOLATED, "(extrapolated)"), (Trust.INDICATIVE, "(indicative only)")],
)
def test_text_says_what_is_extrapolated(trust, words):
    results = make_results()
    doubtful = dataclasses.replace(
        results, landing=dataclasses.replace(results.landing, trust=trust)
    )
    (line,) = [one for one in answer_text(doubtful).splitlines() if "Stall speed in trim" in one]
    assert line.endswith(words)
    assert words not in answer_text(results)


def test_reasons_cautions_and_oddities_are_all_said_and_folded():
    results = dataclasses.replace(make_results(), cautions=("A long caution " * 20,))
    text = answer_text(results, oddities=("Something odd.",), width=60)
    joined = " ".join(text.split())
    for margin in results.margins:
        assert " ".join(margin.reason.split()) in joined
    assert "Something odd." in joined
    prose = text.split("\n\n")
    for part in (prose[2], prose[4]):
        assert max(len(line) for line in part.splitlines()) <= 60


def test_a_reason_that_the_summary_quotes_is_said_once():
    results = make_results()
    quoted = results.margins[0].reason
    text = answer_text(dataclasses.replace(results, reason=f"Landing fails: {quoted}"))
    assert " ".join(text.split()).count(" ".join(quoted.split())) == 1


@pytest.mark.parametrize(
    ("value", "unit", "shown"),
    [
        (1.3837, "", "1.38"),
        (116.6, "W", "117 W"),
        (2.4, "m", "2.40 m"),
        (9.9996, "", "10.0"),
        (0.00752, "m²", "0.00752 m²"),
        (12345.6, "Wh", "12346 Wh"),
        (0.0, "%", "0.00 %"),
        (-0.0, "%", "0.00 %"),
        (-3.456, "deg", "-3.46 deg"),
        (math.nan, "m/s", NOT_FOUND),
        (math.inf, "m/s", NOT_FOUND),
    ],
)
def test_numbers_have_three_significant_figures(value, unit, shown):
    assert number(value, unit) == shown


@given(st.floats(1e-2, 1e5))
def test_a_shown_number_is_within_half_of_its_third_figure(value):
    # Half a unit of the third significant figure is at most 0.5 % of the value.
    assert float(number(value)) == pytest.approx(value, rel=0.00501)


@pytest.mark.parametrize("group", GROUPS)
def test_the_documents_list_the_fields_as_they_are(group):
    text = (DOCS / "scenario-file.md").read_text(encoding="utf-8")
    assert markdown_table(group) in text
