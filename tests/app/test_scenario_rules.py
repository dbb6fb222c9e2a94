"""Rules between fields: who is blamed, with which words, and what is only odd."""

from __future__ import annotations

import pytest

from app.scenario import FIELDS, Scenario
from app.scenario_rules import RULES
from solver.errors import InputError

# Each line: what to set on the defaults, who is blamed, and part of what is allowed.
REFUSED = [
    ({"landing_speed_m_s": 17.1}, "landing_speed_m_s", "at most the cruise speed, 17 m/s"),
    ({"cruise_speed_m_s": 14}, "cruise_speed_m_s", "at least the landing speed, 14.5 m/s"),
    ({"headwind_m_s": 17}, "headwind_m_s", "below the cruise speed, 17 m/s"),
    ({"headwind_m_s": 16, "airspeed_error_m_s": 5, "launch_speed_m_s": 9}, "airspeed_error_m_s",
     "at most half of the lowest speed asked for, 4.5 m/s"),
    ({"tip_chord_mm": 421}, "tip_chord_mm", "at most 1.5 times the root chord, 420 mm"),
    ({"root_chord_mm": 100}, "root_chord_mm", "at least the tip chord over 1.5, 133.3 mm"),
    ({"span_m": 0.7}, "span_m", "at least 3 times the mean chord, 0.72 m"),
    ({"span_m": 0.8, "root_chord_mm": 350}, "span_m", "at least 3 times"),
    ({"root_chord_mm": 1000, "tip_chord_mm": 700}, "root_chord_mm", "at most 900 mm"),
    ({"tail_arm_m": 0.2}, "tail_arm_m", "at least 0.2158 m"),
    ({"tail_area_m2": 2, "tail_arm_m": 0.3}, "tail_arm_m", "behind the wing"),
    ({"body_length_mm": 900, "body_nose_mm": 901}, "body_nose_mm", "within the body length"),
    ({"body_length_mm": 90, "body_width_mm": 130}, "body_width_mm", "at most the body length"),
    ({"balance_forward_percent": 34.5}, "balance_forward_percent", "at most 34 %"),
    ({"balance_percent": 27}, "balance_percent", "at least 28 %"),
]  # fmt: skip


@pytest.mark.parametrize(("values", "blamed", "allowed"), REFUSED)
def test_a_contradiction_blames_what_was_set_and_says_what_is_allowed(values, blamed, allowed):
    scenario = Scenario()
    before = scenario.values()
    with pytest.raises(InputError, match=blamed) as caught:
        scenario.set_values(values)
    assert caught.value.name == blamed
    assert allowed in caught.value.requirement
    assert scenario.values() == before


@pytest.mark.parametrize(
    "values",
    [
        {"landing_speed_m_s": 17},
        {"tip_chord_mm": 420},
        {"balance_forward_percent": 34},
        {"body_length_mm": 900, "body_nose_mm": 900, "body_width_mm": 900},
        {"body_nose_mm": 350},
        {"span_m": 0.72},
        {"airspeed_error_m_s": 5},
        {"landing_speed_m_s": 18, "cruise_speed_m_s": 19},
        {"span_m": 8, "span_max_m": 2.5},
    ],
)
def test_what_is_on_the_edge_or_only_poor_is_taken(values):
    scenario = Scenario()
    scenario.set_values(values)
    assert {name: scenario.values()[name] for name in values} == values


def test_the_least_tail_arm_puts_the_tails_leading_edge_at_the_wings_trailing_edge():
    scenario = Scenario()
    wing = scenario.wing
    mean_chord = (wing.root_chord_mm + wing.tip_chord_mm) / 2000
    tail_chord = (scenario.tail.tail_area_m2 / scenario.tail.tail_aspect_ratio) ** 0.5
    # Both quarter points: the wing's trailing edge is 3/4 of its chord behind, the tail's
    # leading edge 1/4 of its chord ahead.
    scenario.set_values({"tail_arm_m": 0.75 * mean_chord + 0.25 * tail_chord + 1e-9})
    with pytest.raises(InputError, match="tail_arm_m"):
        scenario.set_values({"tail_arm_m": 0.75 * mean_chord + 0.25 * tail_chord - 1e-4})


def test_every_rule_speaks_of_known_fields_and_holds_for_the_defaults():
    values = Scenario().values()
    for rule in RULES:
        assert rule.holds(values)
        assert set(rule.allowed) <= set(FIELDS)
        for words in rule.allowed.values():
            assert words(values)


@pytest.mark.parametrize(
    ("values", "name"),
    [
        ({"tip_chord_mm": 300}, "tip_chord_mm"),
        ({"washout_deg": -1}, "washout_deg"),
        ({"launch_method": "hand"}, "launch_speed_m_s"),
        ({"airspeed_error_m_s": 0}, "airspeed_error_m_s"),
        ({"build_drag_factor": 1}, "build_drag_factor"),
        ({"headwind_m_s": 9}, "headwind_m_s"),
        ({"tail_area_m2": 0.3}, "tail_area_m2"),
        ({"body_length_mm": 900}, "body_width_mm"),
        ({"body_width_mm": 90}, "body_width_mm"),
        ({"balance_forward_percent": 34}, "balance_forward_percent"),
    ],
)
def test_an_oddity_is_taken_and_said(values, name):
    scenario = Scenario()
    assert scenario.oddities() == ()
    scenario.set_values(values)
    (oddity,) = scenario.oddities()
    assert oddity.name == name
    assert oddity.sentence.endswith((".", "?"))
