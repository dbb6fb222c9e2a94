"""Undo and redo: every input comes back, a drag is one step, buttons say what they do."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.history import MOST_STEPS, History, apply, described, state_of
from app.scenario import Scenario, field_list
from app.scenario_file import read_scenario
from scenarios import example_path
from solver.errors import InputError

DEMO = read_scenario(example_path())


class Page:
    """A scenario, its history, and a clock that is moved by hand."""

    def __init__(self, **options: float) -> None:
        self.scenario = DEMO.copy()
        self.now = 0.0
        self.history = History(state_of(self.scenario), clock=lambda: self.now, **options)

    def set(self, *, after: float = 60.0, **values: object) -> None:
        self.now += after
        self.scenario.set_values(values)
        self.history.record(state_of(self.scenario))

    def undo(self) -> bool:
        return self._go(self.history.undo())

    def redo(self) -> bool:
        return self._go(self.history.redo())

    def _go(self, state) -> bool:
        if state is not None:
            apply(state, self.scenario)
            assert state_of(self.scenario) == state
        return state is not None


@pytest.fixture
def page():
    return Page()


def test_nothing_to_undo_or_redo_at_first(page):
    assert not page.undo()
    assert not page.redo()
    assert (page.history.undo_label, page.history.redo_label) == ("", "")


def test_back_and_forth(page):
    before = page.scenario.freeze()
    page.set(span_m=2.45)
    after = page.scenario.freeze()
    assert page.history.undo_label == "Undo span 2.40 to 2.45 m"
    assert page.undo()
    assert page.scenario.freeze() == before
    assert page.history.undo_label == ""
    assert page.history.redo_label == "Redo span 2.40 to 2.45 m"
    assert page.redo()
    assert page.scenario.freeze() == after
    assert not page.redo()


@pytest.mark.parametrize("entry", field_list(), ids=lambda entry: entry.name)
def test_every_input_can_be_undone(entry, page):
    before = page.scenario.freeze()
    old = page.scenario.values()[entry.name]
    candidates = [one for one in (*entry.choices, "NACA 2412") if one != old]
    if entry.kind == "number":
        candidates = [1.05 * old, 0.95 * old] if old else [entry.step]
    for value in candidates:
        try:
            page.set(**{entry.name: value})
        except InputError:
            continue
        break
    assert page.scenario.freeze() != before
    label = page.history.undo_label
    assert label.casefold().startswith(f"undo {entry.label} ".casefold())
    assert entry.unit in label
    assert page.undo()
    assert page.scenario.freeze() == before


def test_a_drag_of_one_slider_is_one_step(page):
    for number in range(41, 50):
        page.set(after=0.2, span_m=2.0 + number / 100)
    assert page.history.undo_label == "Undo span 2.40 to 2.49 m"
    page.undo()
    assert page.scenario.wing.span_m == 2.4
    assert not page.undo()


def test_a_pause_another_slider_a_button_and_undo_end_a_step(page):
    page.set(after=0.1, span_m=2.45)
    page.set(after=1.1, span_m=2.5)  # a pause
    page.set(after=0.1, mass_kg=4.5)  # another slider
    page.set(after=0.1, span_m=2.4)
    page.set(after=0.1, span_m=2.41, mass_kg=4.6)  # two at once
    page.set(after=0.1, span_m=2.42, mass_kg=4.7)
    labels = []
    while page.history.undo_label:
        labels.append(page.history.undo_label)
        page.undo()
    assert labels == [
        "Undo mass and span",
        "Undo mass and span",
        "Undo span 2.50 to 2.40 m",
        "Undo mass 4.60 to 4.50 kg",
        "Undo span 2.45 to 2.50 m",
        "Undo span 2.40 to 2.45 m",
    ]
    page.redo()
    page.set(after=0.1, span_m=2.46)
    page.undo()
    assert page.scenario.wing.span_m == 2.45


def test_a_step_can_be_ended_by_the_page(page):
    page.set(after=0.1, span_m=2.45)
    page.history.break_step()
    page.set(after=0.1, span_m=2.5)
    page.undo()
    assert page.scenario.wing.span_m == 2.45


def test_a_drag_back_to_where_it_began_is_no_step(page):
    page.set(mass_kg=4.5)
    page.set(span_m=2.5)
    page.set(after=0.1, span_m=2.4)
    assert page.history.undo_label == "Undo mass 4.60 to 4.50 kg"
    page.set(after=0.1, span_m=2.3)
    assert page.history.undo_label == "Undo span 2.40 to 2.30 m"
    page.undo()
    page.undo()
    assert page.scenario.freeze() == DEMO.freeze()


def test_what_was_set_to_what_it_was_is_no_step_and_keeps_redo(page):
    page.set(span_m=2.45)
    page.undo()
    page.set(span_m=2.4)
    assert page.redo()
    assert page.scenario.wing.span_m == 2.45


def test_a_change_after_undo_forgets_what_was_undone(page):
    page.set(span_m=2.45)
    page.set(mass_kg=4.5)
    page.undo()
    page.set(washout_deg=2.0)
    assert not page.redo()
    page.undo()
    assert (page.scenario.wing.span_m, page.scenario.brief.mass_kg) == (2.45, 4.6)


def test_the_number_of_steps_is_bounded():
    page = Page(most=5)
    for number in range(1, 12):
        page.set(span_m=2.0 + number / 100)
    undone = 0
    while page.undo():
        undone += 1
    assert undone == 5
    assert page.scenario.wing.span_m == 2.06
    assert MOST_STEPS >= 100


def test_name_note_and_sections_come_back(page):
    page.now += 60
    page.scenario.name, page.scenario.note = "Other", "Why not"
    page.history.record(state_of(page.scenario))
    assert page.history.undo_label == "Undo name and note"
    page.now += 60
    page.scenario.sections = {**page.scenario.sections, "Mine": page.scenario.sections["E387"]}
    page.history.record(state_of(page.scenario))
    assert page.history.undo_label == "Undo tables of Mine"
    page.set(root_section="Mine")
    assert page.history.undo_label == "Undo root section E387 to Mine"
    page.scenario.set_values({"root_section": "E387"})
    page.scenario.sections = DEMO.sections
    page.history.record(state_of(page.scenario))
    assert page.undo()  # to a section that is not there any more
    assert page.scenario.wing.root_section == "Mine"
    for _ in range(3):
        page.undo()
    assert page.scenario.freeze() == DEMO.freeze()
    assert (page.scenario.name, page.scenario.note) == (DEMO.name, DEMO.note)
    for _ in range(3):
        page.redo()
    assert page.scenario.wing.root_section == "Mine"


def test_a_state_that_is_refused_changes_nothing(page):
    page.scenario.sections = {**page.scenario.sections, "Mine": page.scenario.sections["E387"]}
    state = state_of(page.scenario)
    bad = type(state)({**state.values, "span_m": 99.0}, state.texts, dict(DEMO.sections))
    with pytest.raises(InputError):
        apply(bad, page.scenario)
    assert state_of(page.scenario) == state


def test_labels_show_as_many_decimals_as_were_typed(page):
    page.set(span_m=2.405)
    assert page.history.undo_label == "Undo span 2.400 to 2.405 m"
    page.set(finish="taped")
    assert page.history.undo_label == "Undo finish filmed to taped"
    page.set(peukert_exponent=1.1)
    assert page.history.undo_label.startswith("Undo Peukert exponent 1.05 to 1.10")
    page.scenario.name = "x" * 120
    page.history.record(state_of(page.scenario))
    assert len(page.history.undo_label) < 80


def test_many_changes_are_counted():
    first, other = Scenario(), Scenario()
    other.set_values({"mass_kg": 5, "span_m": 2.2, "root_chord_mm": 300, "tail_arm_m": 0.9})
    assert described(state_of(first), state_of(other)) == "mass, span and 2 more"
    other.set_values({"tail_arm_m": 0.82})
    assert described(state_of(first), state_of(other)) == "mass, span and root chord"


@settings(deadline=None, max_examples=40)
@given(
    moves=st.lists(
        st.tuples(st.sampled_from(["span_m", "mass_kg", "undo", "redo"]), st.integers(0, 9)),
        max_size=25,
    )
)
def test_any_walk_can_be_walked_back(moves):
    page = Page()
    first = state_of(page.scenario)
    for what, number in moves:
        if what in ("undo", "redo"):
            getattr(page, what)()
        else:
            low = {"span_m": 2.0, "mass_kg": 4.0}[what]
            page.set(after=number / 4, **{what: low + number / 20})
    last = state_of(page.scenario)
    undone = 0
    while page.undo():
        undone += 1
    assert state_of(page.scenario) == first
    for _ in range(undone):
        assert page.redo()
    assert state_of(page.scenario) == last
