"""What all figures share: numbers in words, ranges, trust, station, look."""

from __future__ import annotations

import math
import re

import numpy as np
import pytest
from bokeh.models import Range1d
from hypothesis import given, settings
from hypothesis import strategies as st

from app.analysis.results import Trust
from app.figures import look, words
from app.figures.labels import Labels
from app.figures.plot import DASHES, NAMES, new_figure, split_by_trust
from app.figures.ranges import bounds, fit
from app.figures.station import Station, chord_ends, station_columns
from tests.app.sample_results import make_results

THIN, FIX = words.THIN_SPACE, words.UNIT_SPACE


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (1.3812, "", "1.38"),
        (1.3, "", "1.30"),
        (117.4, "W", f"117{FIX}W"),
        (0.0820, "m²", f"0.0820{FIX}m²"),
        (148123.0, "", f"148{THIN}000"),
        (-2.1, "deg", f"\N{MINUS SIGN}2.10{FIX}deg"),
        (0.0, "m", f"0{FIX}m"),
        (9.996, "", "10.0"),
        (999.6, "", "1000"),
        (4.56e-7, "N", f"4.56×10⁻⁷{FIX}N"),
        (-0.0, "", "0"),
    ],
)
def test_numbers_have_three_figures_and_their_unit(value, unit, text):
    assert words.number(value, unit) == text


@settings(deadline=None)  # a busy machine is not an error
@given(st.floats(min_value=1e-3, max_value=1e7))
def test_three_figures_are_within_half_a_unit_of_the_third(value):
    shown = float(words.number(value).replace(THIN, ""))
    # Half a unit of the third figure; the last bit of the division is allowed for.
    assert abs(shown - value) <= 0.5001 * 10.0 ** (math.floor(math.log10(value)) - 2)


@pytest.mark.parametrize("bad", [math.nan, math.inf, -math.inf])
def test_what_is_not_finite_is_never_written_as_a_number(bad):
    said = [words.number(bad, "N"), words.given(bad, "N"), words.part(bad, 1.0, "N")]
    assert said == [words.NOT_FOUND] * 3
    assert words.part(1.0, bad) == words.NOT_FOUND


def test_what_the_user_gave_is_shown_as_given():
    assert words.given(5.0, "%") == f"5{FIX}%"
    assert words.given(1.12) == "1.12"
    assert words.given(-0.5) == "\N{MINUS SIGN}0.5"


def test_a_difference_has_the_digits_of_the_value_it_belongs_to():
    assert words.part(0.0607, of=1.3607, sign=True) == "+0.06"
    assert words.part(-18.64, of=121.4, unit="W", sign=True) == f"\N{MINUS SIGN}19{FIX}W"
    assert words.part(-0.0004, of=3.25, unit="N") == f"0.00{FIX}N"


def test_a_range_with_equal_ends_is_one_number():
    assert words.span_of(1.004, 1.001) == "1.00"
    assert words.span_of(1.9e5, 2.7e5) == f"190{THIN}000 to 270{THIN}000"


codes = st.lists(st.sampled_from(list(Trust)), min_size=1, max_size=30)


@settings(deadline=None)  # a busy machine is not an error
@given(codes)
def test_every_found_point_is_drawn_and_no_lost_one_is(trust):
    values = np.arange(len(trust), dtype=float)
    parts = np.array(list(split_by_trust(values, np.array(trust)).values()))
    drawn = np.isfinite(parts).any(axis=0)
    assert (drawn == (np.array(trust) != Trust.NOT_CONVERGED)).all()
    seen = np.where(np.isfinite(parts), parts, values)
    assert (seen == values).all()


@settings(deadline=None)  # a busy machine is not an error
@given(codes)
def test_a_step_between_two_points_is_drawn_like_its_less_trusted_end(trust):
    trust = np.array(trust)
    parts = split_by_trust(np.ones(len(trust)), trust)
    finite = {name: np.isfinite(part) for name, part in parts.items()}
    for left in range(len(trust) - 1):
        pair = trust[left : left + 2]
        if (pair == Trust.NOT_CONVERGED).any():
            continue
        worse = NAMES[Trust(max(pair))]
        assert finite[worse][left]
        assert finite[worse][left + 1]


def test_the_three_kinds_of_trust_differ_in_dash():
    assert len(set(DASHES.values())) == 3


def test_a_range_stays_while_the_data_stay_inside():
    axis = Range1d(start=0.0, end=10.0)
    fit(axis, [0.5, 7.0])
    assert bounds(axis) == (0.0, 10.0)


@pytest.mark.parametrize("data", [[0.5, 12.0], [-3.0, 9.0], [4.0, 4.5]])
def test_a_range_moves_when_data_leave_it_or_hardly_fill_it(data):
    axis = Range1d(start=0.0, end=10.0)
    fit(axis, data)
    start, end = bounds(axis)
    assert (start, end) != (0.0, 10.0)
    assert start <= min(data)
    assert max(data) <= end
    assert max(data) - min(data) >= 0.3 * (end - start)


def test_a_downward_range_stays_downward():
    axis = Range1d(start=1.0, end=0.0)
    fit(axis, [-1.0, 3.0])
    start, end = bounds(axis)
    assert start > 3.0 > -1.0 > end


@pytest.mark.parametrize("data", [[], [math.nan, math.nan]])
def test_nothing_found_leaves_the_range_alone(data):
    axis = Range1d(start=0.0, end=1.0)
    fit(axis, data)
    assert bounds(axis) == (0.0, 1.0)


@settings(deadline=None)  # a busy machine is not an error
@given(st.lists(st.floats(-1e6, 1e6, allow_nan=False), min_size=2, max_size=8))
def test_a_range_always_holds_the_data_and_what_is_included(data):
    axis = Range1d(start=0.0, end=1.0)
    fit(axis, data, include=(0.0,))
    start, end = bounds(axis)
    # Rounding to a step of the axis may lose the last bit of a bound.
    slack = 1e-9 * max(1.0, end - start)
    assert start - slack <= min([*data, 0.0])
    assert max([*data, 0.0]) <= end + slack


def test_chord_ends_follow_a_swept_tapered_outline():
    plan = make_results().planform
    lead, trail = chord_ends(plan, np.array([0.0, 0.6, 1.2]))
    # Root 280 mm, tip 200 mm, straight quarter-chord line without sweep.
    np.testing.assert_allclose(lead, [0.0, 0.01, 0.02], atol=1e-12)
    np.testing.assert_allclose(trail, [0.28, 0.25, 0.22], atol=1e-12)


def test_the_station_keeps_its_share_when_the_span_changes():
    station = Station()
    station.update(make_results())
    station.point_at(0.75)
    station.update(make_results(span_m=1.8))
    near = np.asarray(station.table.data["share"])
    # The nearest of twenty stations; they are at most 0.08 of the half-span apart.
    assert abs(station.share - 0.75) <= 0.5 * np.max(np.diff(near))
    assert station.held
    assert station.row["y"] == pytest.approx(station.share * 0.9)


def test_the_station_tells_when_the_browser_moved_it():
    told = []
    station = Station(lambda: told.append(station.share))
    station.update(make_results())
    row = {name: [column[3]] for name, column in station.table.data.items()}
    station.marker.data = {"held": [0], **row}
    assert told[-1] == pytest.approx(station.table.data["share"][3])
    assert not station.held


def test_station_columns_are_lists_of_one_length():
    columns = station_columns(make_results())
    assert {type(column) for column in columns.values()} == {list}
    assert {len(column) for column in columns.values()} == {20}
    assert columns["re_landing"][0] == pytest.approx(
        make_results().landing.landing_span.reynolds[0] / 1e3
    )


def test_the_theme_and_the_marks_take_every_value_from_the_tokens():
    assert look.colour("today") == look.tokens()["plot-today"]
    attributes = look.theme()._json["attrs"]
    assert attributes["Title"]["text_font_size"] == look.token("plot-title")


def test_colours_of_reynolds_numbers_run_from_slow_to_fast():
    assert look.reynolds_colour(1e4) == look.colour("slow")
    assert look.reynolds_colour(1e7) == look.colour("fast")
    assert re.fullmatch("#[0-9a-f]{6}", look.reynolds_colour(1.5e5))


@pytest.mark.parametrize("name", sorted(path.name for path in look.STATIC.glob("*.js")))
def test_no_script_sets_html_or_asks_another_host(name):
    script = look.static_text(name)
    assert not re.search(r"innerHTML|outerHTML|insertAdjacentHTML|document\.write|eval\(", script)
    addresses = set(re.findall(r"https?://[^\s\"']+", script))
    # The name of the drawing namespace is never fetched.
    assert addresses <= {"http://www.w3.org/2000/svg"}


@pytest.mark.parametrize("name", sorted(path.name for path in look.STATIC.glob("*.css")))
def test_no_style_sheet_loads_anything(name):
    assert not re.search(r"@import|url\(", look.static_text(name))


def test_words_on_paper_never_become_fewer_rows():
    labels = Labels(new_figure("words", "Words", x_label="x [-]", y_label="y [-]"), chips=True)
    labels.feed([(0.0, 0.0, "one", "#000000"), (1.0, 1.0, "two", "#000000")])
    labels.feed([(0.5, 0.5, "alone", "#000000")])
    data = labels.source.data
    assert list(data["text"]) == ["alone", ""]
    assert math.isnan(data["x"][1])
