"""The scenario: what can be set, what is refused and by which name."""

from __future__ import annotations

import dataclasses
import math
import pickle

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.inputs import (
    BalanceInputs,
    BodyInputs,
    BriefInputs,
    PropulsionInputs,
    TailInputs,
    WingInputs,
)
from app.scenario import GROUPS, Scenario, field_list
from solver.errors import InputError

NUMBERS = [entry for entry in field_list() if entry.kind == "number"]
CHOICES = [entry for entry in field_list() if entry.kind == "choice"]
FROZEN = {
    "brief": BriefInputs,
    "wing": WingInputs,
    "tail": TailInputs,
    "body": BodyInputs,
    "balance": BalanceInputs,
    "propulsion": PropulsionInputs,
}

# By hand, from the requirements: a slip in the source would not be seen by comparing it to itself.
SPOT_CHECKS = {
    "mass_kg": (4.6, 0.3, 30, "kg"),
    "temperature_offset_K": (0, -40, 40, "K"),
    "span_m": (2.4, 0.4, 8, "m"),
    "washout_deg": (1.5, -5, 10, "deg"),
    "tail_area_m2": (0.082, 0.002, 2, "m²"),
    "balance_percent": (34, -20, 120, "%"),
    "peukert_exponent": (1.05, 1, 1.4, ""),
}


def flyable() -> Scenario:
    """Make a scenario that needs no table."""
    scenario = Scenario()
    scenario.set_values({"root_section": "NACA 4409", "tip_section": "NACA 2412"})
    return scenario


def test_names_are_unique_over_all_groups():
    names = [entry.name for entry in field_list()]
    assert len(names) == len(set(names)) == 50


@pytest.mark.parametrize("group", GROUPS)
def test_the_frozen_group_has_the_fields_of_the_one_that_is_set(group):
    declared = [entry.name for entry in field_list() if entry.group == group]
    assert [entry.name for entry in dataclasses.fields(FROZEN[group])] == declared


@pytest.mark.parametrize("entry", field_list(), ids=lambda entry: entry.name)
def test_every_field_explains_itself(entry):
    assert entry.label
    assert entry.help.endswith(".")
    assert entry.help[0].isupper()
    if entry.kind == "number":
        assert entry.low <= entry.default <= entry.high
        assert 0.0 < entry.step <= (entry.high - entry.low) / 10.0
    if entry.kind == "choice":
        assert entry.default in entry.choices


@pytest.mark.parametrize("entry", NUMBERS, ids=lambda entry: entry.name)
def test_the_unit_of_the_name_is_the_unit_of_the_field(entry):
    endings = {
        "_m_s": "m/s",
        "_percent": "%",
        "_m2": "m²",
        "_deg": "deg",
        "_kg": "kg",
        "_mm": "mm",
        "_wh": "Wh",
        "_K": "K",
    }
    stem = entry.name.removesuffix("_min").removesuffix("_max")
    for mark, unit in endings.items():
        if stem.endswith(mark) or f"{mark}_m" in stem:
            assert entry.unit == unit
            return
    last = {"_m": "m", "_w": "W", "_h": "h"}
    parts = entry.name.replace("_min_", "_").replace("_max_", "_")
    expected = next((unit for mark, unit in last.items() if parts.endswith(mark)), "")
    assert entry.unit == expected


@pytest.mark.parametrize("name", SPOT_CHECKS)
def test_bounds_and_defaults_are_those_asked_for(name):
    entry = next(one for one in field_list() if one.name == name)
    assert (entry.default, entry.low, entry.high, entry.unit) == SPOT_CHECKS[name]


@pytest.mark.parametrize("entry", NUMBERS, ids=lambda entry: entry.name)
@pytest.mark.parametrize(
    "value",
    ["below", "above", math.nan, math.inf, -math.inf, True, "3", None, 10**400, [1.0]],
    ids=str,
)
def test_an_unusable_number_is_refused_by_name_and_changes_nothing(entry, value):
    scenario = flyable()
    before, revision = scenario.values(), scenario.revision
    bad = {"below": math.nextafter(entry.low, -math.inf), "above": entry.high + 1e-9}.get(
        value if isinstance(value, str) else "", value
    )
    other = "mass_kg" if entry.name != "mass_kg" else "span_m"
    with pytest.raises(InputError, match=entry.name) as caught:
        scenario.set_values({other: 2.0, entry.name: bad})
    assert caught.value.name == entry.name
    assert f"between {entry.low:g} and {entry.high:g}" in caught.value.requirement
    assert scenario.values() == before
    assert scenario.revision == revision


@pytest.mark.parametrize("entry", CHOICES, ids=lambda entry: entry.name)
@pytest.mark.parametrize("value", ["", "rocket", 1, None, ["hand"]], ids=str)
def test_a_choice_takes_only_its_choices(entry, value):
    with pytest.raises(InputError, match=f"{entry.name} must be one of {entry.choices[0]}"):
        flyable().set_values({entry.name: value})


def test_an_unknown_field_is_refused_with_the_nearest_one():
    with pytest.raises(InputError, match="did you mean span_m"):
        flyable().set_values({"spam_m": 2.0})


@pytest.mark.parametrize(
    ("given_name", "kept"),
    [("NACA 0009", "NACA 0009"), ("naca2412", "NACA 2412"), ("NACA-23012", "NACA 23012")],
)
def test_naca_names_are_kept_in_one_spelling(given_name, kept):
    scenario = flyable()
    scenario.set_values({"tail_section": given_name})
    source = scenario.freeze().tail_source
    assert (source.name, source.kind, source.digits) == (kept, "naca", kept.split()[1])


@pytest.mark.parametrize(
    "name",
    [
        "NACA 12",
        "NACA 123456",
        "NACA 4012",  # camber without a place
        "NACA 0409",  # a place without camber
        "NACA 2400",
        "NACA 2460",
        "NACA 23612",
        "NACA 21112",  # no reflexed mean line that far forward
        "NACA",
        "NACA 24I2",
        "NACA 2412 x",
        "E388",
        "",
        2412,
        None,
    ],
)
def test_a_section_that_is_not_known_is_refused(name):
    with pytest.raises(InputError, match="tail_section must be NACA and"):
        flyable().set_values({"tail_section": name})


def test_a_new_scenario_says_that_its_section_has_no_tables():
    with pytest.raises(InputError, match=r"root_section must be .*\(none here\); got 'E387'"):
        Scenario().freeze()


def test_inputs_are_equal_and_hash_alike_by_value():
    first, second = flyable(), flyable()
    assert first.freeze() == second.freeze()
    assert hash(first.freeze()) == hash(second.freeze())
    second.set_values({"span_m": 2.41})
    assert first.freeze() != second.freeze()
    second.set_values({"span_m": 2.4})
    assert first.freeze() == second.freeze()


def test_inputs_cannot_be_changed_and_survive_pickling():
    inputs = flyable().freeze()
    with pytest.raises(dataclasses.FrozenInstanceError):
        inputs.wing.span_m = 3.0  # type: ignore[misc]
    assert pickle.loads(pickle.dumps(inputs)) == inputs


def test_inputs_hold_plain_numbers_whatever_was_set():
    scenario = flyable()
    scenario.set_values({"span_m": np.float32(2.5), "washout_deg": -0.0, "sweep_deg": 3})
    wing = scenario.freeze().wing
    assert (type(wing.span_m), type(wing.sweep_deg)) == (float, float)
    assert math.copysign(1.0, wing.washout_deg) == 1.0


def test_inputs_list_every_value_in_the_order_of_the_fields():
    assert list(flyable().freeze().values()) == [entry.name for entry in field_list()]


def test_several_values_are_set_in_one_revision_and_seen_together():
    scenario = flyable()
    start, seen = scenario.revision, []
    scenario.param.watch(lambda _event: seen.append(scenario.freeze()), "revision")
    scenario.wing.param.watch(lambda _event: seen.append(scenario.freeze()), "span_m")
    scenario.set_values({"mass_kg": 3.0, "span_m": 2.2, "battery_wh": 200})
    assert scenario.revision == start + 1
    assert len(seen) == 2
    for inputs in seen:
        assert (inputs.brief.mass_kg, inputs.wing.span_m) == (3.0, 2.2)
        assert inputs.propulsion.battery_wh == 200.0


def test_setting_what_is_already_so_is_no_change():
    scenario = flyable()
    start = scenario.revision
    scenario.set_values({"span_m": scenario.wing.span_m})
    assert scenario.revision == start


def test_a_parameter_set_by_itself_counts_as_a_change():
    scenario = flyable()
    start = scenario.revision
    scenario.wing.span_m = 2.3
    scenario.name = "Another"
    assert scenario.revision == start + 2


def test_a_copy_is_equal_and_goes_its_own_way():
    scenario = flyable()
    scenario.name, scenario.source_text = "Original", "schema = 1"
    copy = scenario.copy()
    assert copy.freeze() == scenario.freeze()
    assert (copy.name, copy.source_text) == ("Original", "schema = 1")
    copy.set_values({"span_m": 2.0})
    assert scenario.wing.span_m == 2.4


def test_freezing_refuses_what_a_parameter_let_through():
    scenario = flyable()
    scenario.brief.landing_speed_m_s = 18.0
    with pytest.raises(InputError, match="landing_speed_m_s must be at most the cruise speed"):
        scenario.freeze()


@settings(deadline=None)  # a busy machine is not a fault
@given(data=st.data())
def test_any_value_within_its_bounds_is_taken_or_refused_by_a_rule(data):
    entry = data.draw(st.sampled_from(NUMBERS))
    value = data.draw(st.floats(entry.low, entry.high))
    scenario = flyable()
    refusal = None
    try:
        scenario.set_values({entry.name: value})
    except InputError as error:
        refusal = error
    if refusal is None:
        assert scenario.freeze().values()[entry.name] == value
    else:
        assert refusal.name == entry.name
        assert not refusal.requirement.startswith("a number between")
