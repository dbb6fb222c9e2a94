"""Verdicts: what fails, what is to be watched, what passes."""

from __future__ import annotations

import pytest

from solver.decide.margins import Requirement, judge

RATIO = Requirement("landing_over_stall", "Landing over stall", 1.3, "at least", "", 2)
POWER = Requirement("cruise_power", "Cruise power", 120.0, "at most", "W", 0)


@pytest.mark.parametrize(
    ("asked", "value", "low", "high", "doubts", "verdict"),
    [
        (RATIO, 1.38, 1.31, 1.45, (), "pass"),
        (RATIO, 1.30, 1.30, 1.40, (), "pass"),
        (RATIO, 1.38, 1.29, 1.45, (), "watch"),
        (RATIO, 1.38, 1.31, 1.45, ("Estimated.",), "watch"),
        (RATIO, 1.28, 1.20, 1.40, (), "fail"),
        (RATIO, 1.28, 1.20, 1.40, ("Estimated.",), "fail"),
        (POWER, 110.0, 100.0, 119.0, (), "pass"),
        (POWER, 110.0, 100.0, 121.0, (), "watch"),
        (POWER, 121.0, 110.0, 130.0, (), "fail"),
    ],
)
def test_the_verdict(asked, value, low, high, doubts, verdict):
    found = judge(asked, value, low=low, high=high, doubts=doubts)
    assert found.verdict == verdict
    assert found.reason


def test_a_value_that_was_not_found_fails_and_says_why():
    found = judge(RATIO, float("nan"), missing="No stall was met.")
    assert (found.verdict, found.reason) == ("fail", "No stall was met.")


def test_the_reason_names_value_limit_and_unit():
    reason = judge(POWER, 130.0).reason
    assert "130 W" in reason
    assert "at most 120 W" in reason


def test_an_explanation_is_given_only_where_something_is_missed():
    assert "Because." in judge(RATIO, 1.2, explanation="Because.").reason
    assert "Because." not in judge(RATIO, 1.4, explanation="Because.").reason
