"""The table behind a report's sliders, against full solves of the same flights."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from app.analysis.report_check import table_error
from app.analysis.report_part import plain_table, report_part
from app.analysis.report_table import flight_table
from app.analysis.stages import Analysis
from app.scenario_file import read_scenario
from scenarios import example_names, example_path

pytestmark = pytest.mark.slow


@pytest.fixture(scope="module", params=example_names())
def solved(request):
    inputs = read_scenario(example_path(request.param)).freeze()
    analysis = Analysis()
    results = analysis.run(inputs)
    aircraft = analysis.airframe(inputs).aircraft
    table = flight_table(inputs, aircraft, stall_speed=results.landing.stall_speed_m_s)
    return inputs, aircraft, results, table


def test_the_table_lies_within_a_percent_of_full_solves_in_between(solved):
    inputs, aircraft, _, table = solved
    # Other flights than those that the report itself is checked with.
    error = table_error(table, inputs, aircraft, flights=300, seed=7)
    assert error.flights > 150
    assert error.largest < 1.0, error


def test_the_check_sees_a_table_that_is_wrong_by_two_percent(solved):
    inputs, aircraft, _, table = solved
    wrong = dataclasses.replace(table, columns=1.02 * table.columns, lift=1.02 * table.lift)
    error = table_error(wrong, inputs, aircraft, flights=40, seed=7)
    assert 0.8 < error.drag < 2.1
    assert error.lift > 0.5


def test_at_the_design_the_table_says_what_the_analysis_says(solved):
    inputs, _, results, table = solved
    brief = inputs.brief
    read = table.at(
        speed=brief.cruise_speed_m_s, mass=brief.mass_kg, altitude=brief.field_altitude_m
    )
    cruise, landing = results.cruise, results.landing
    # Interpolation error, under 1 %; travel is 20 degrees.
    assert float(read.drag) == pytest.approx(cruise.drag.total, rel=0.01)
    assert float(read.lift_to_drag) == pytest.approx(cruise.lift_to_drag, rel=0.01)
    assert float(read.elevator_deg) == pytest.approx(cruise.elevator_deg, abs=0.2)
    assert read.lift == pytest.approx(cruise.span.lift, abs=0.01)
    assert read.limit == pytest.approx(cruise.span.limit, rel=0.01)
    expected = [
        landing.stall_speed_high_m_s,
        landing.stall_speed_m_s,
        landing.stall_speed_low_m_s,
    ]
    assert read.stall_speed == pytest.approx(expected, rel=0.01)


def test_the_scenario_lies_inside_the_sliders_and_stall_shows_as_a_share_above_one(solved):
    inputs, _, results, table = solved
    brief, reach = inputs.brief, table.reach
    assert reach.mass[0] < brief.mass_kg < reach.mass[1]
    assert reach.altitude[0] <= brief.field_altitude_m <= reach.altitude[1]
    assert reach.speed[0] < results.landing.stall_speed_m_s < brief.cruise_speed_m_s
    assert brief.cruise_speed_m_s < reach.speed[1]
    slow = 0.9 * results.landing.stall_speed_m_s
    read = table.at(speed=slow, mass=brief.mass_kg, altitude=brief.field_altitude_m)
    assert float(read.share) > 1.0


def test_without_a_stall_there_is_no_table(solved):
    inputs, aircraft, _, _ = solved
    assert flight_table(inputs, aircraft, stall_speed=np.nan) is None


def test_results_at_hand_are_completed_and_a_part_repeats_itself():
    inputs = read_scenario(example_path()).freeze()
    first = report_part(inputs)
    again = report_part(inputs, first.results)
    assert again.results is not None
    assert again.results.sweep is first.results.sweep  # nothing was solved twice
    assert plain_table(again.table) == plain_table(first.table)
    assert again.results.solver_ms == 0.0
