"""Snapshots side by side: what differs, with its label and unit, and every margin."""

from __future__ import annotations

import dataclasses
import hashlib

import pytest

from app.journal import Journal, JournalError
from app.journal_compare import column_now, column_of, compare
from app.scenario import field_list
from app.scenario_bundle import bundle_text, scenario_from_bundle
from app.scenario_file import read_scenario
from scenarios import example_path
from tests.app.sample_results import make_results

DEMO = read_scenario(example_path())


@pytest.fixture
def store(tmp_path):
    return Journal(tmp_path)


def changed(**values):
    scenario = DEMO.copy()
    scenario.set_values(values)
    keys = make_results().inputs
    return scenario, make_results(**{name: scenario.values()[name] for name in keys})


def test_only_inputs_that_differ_are_shown_with_their_label_and_unit(store):
    one = store.take(*changed(), name="As drawn")
    two = store.take(*changed(finish="taped", span_m=2.3), name="Shorter")
    three = store.take(*changed(span_m=2.3), name="Shorter, filmed")
    found = compare([column_of(snapshot) for snapshot in (one, two, three)])
    assert found.names == ("As drawn", "Shorter", "Shorter, filmed")
    rows = [(row.name, row.group, row.label, row.unit, row.values) for row in found.inputs]
    assert rows == [
        ("span_m", "wing", "Span", "m", (2.4, 2.3, 2.3)),
        ("finish", "wing", "Finish", "", ("filmed", "taped", "filmed")),
    ]


def test_rows_stand_in_the_order_of_the_fields(store):
    columns = [
        column_now(*changed(), name="a"),
        column_now(*changed(avionics_w=13, span_m=2.3, mass_kg=4.5, tail_arm_m=0.9), name="b"),
    ]
    names = [row.name for row in compare(columns).inputs]
    assert names == [entry.name for entry in field_list() if entry.name in names]
    assert len(names) == 4


def test_every_margin_stands_side_by_side(store):
    scenario, results = changed(mass_kg=4.0)
    one = store.take(*changed(), name="As drawn")
    found = compare([column_of(one), column_now(scenario, results, name="now")])
    assert [row.key for row in found.margins] == [margin.key for margin in results.margins]
    for row, before, now in zip(
        found.margins, make_results().margins, results.margins, strict=True
    ):
        assert (row.label, row.unit) == (now.label, now.unit)
        assert [cell.value for cell in row.cells] == [before.value, now.value]
        assert [cell.verdict for cell in row.cells] == [before.verdict, now.verdict]
        assert [cell.margin for cell in row.cells] == [before.margin, now.margin]
    assert any(row.cells[0].value != row.cells[1].value for row in found.margins)


def test_a_margin_that_one_does_not_have_is_left_empty():
    whole, part = column_now(*changed(), name="a"), column_now(*changed(), name="b")
    part = dataclasses.replace(part, figures=part.figures[1:])
    rows = compare([part, whole]).margins
    assert {row.key for row in rows} == {figure.key for figure in whole.figures}
    (row,) = [row for row in rows if row.key == whole.figures[0].key]
    assert row.cells == (None, whole.figures[0])


def test_tables_of_one_name_that_differ_are_shown():
    text = bundle_text(DEMO)
    drag = DEMO.sections["E387"].drag
    shorter = drag.text.rstrip().rsplit("\n", 1)[0] + "\n"
    text = text.replace(drag.text, shorter)
    text = text.replace(drag.digest, hashlib.sha256(shorter.encode()).hexdigest())
    other = scenario_from_bundle(text, file="other")
    found = compare([column_now(s, make_results(), name="x") for s in (DEMO, other, DEMO)])
    (row,) = found.inputs
    assert (row.name, row.label) == ("sections.E387", "Tables of E387")
    assert row.values[0] == row.values[2] != row.values[1]
    assert all(len(str(value)) == 12 for value in row.values)


def test_tables_that_no_wing_uses_are_not_compared():
    other = DEMO.copy()
    other.sections = {**DEMO.sections, "Spare": DEMO.sections["E387"]}
    columns = [column_now(one, make_results(), name="x") for one in (DEMO, other)]
    assert compare(columns).inputs == ()


@pytest.mark.parametrize("number", [0, 1, 7])
def test_two_to_six_can_be_compared(number):
    column = column_now(*changed(), name="a")
    with pytest.raises(JournalError, match=f"Choose 2 to 6 snapshots to compare; got {number}."):
        compare([column] * number)
    assert len(compare([column] * 6).names) == 6


def test_a_snapshot_that_cannot_be_used_is_said(store):
    snapshot = dataclasses.replace(store.take(*changed(), name="a"), bundle="")
    with pytest.raises(JournalError, match="It cannot be restored"):
        column_of(snapshot)
