"""Every figure and sheet, fed with good results, with none, and with odd text."""

from __future__ import annotations

import dataclasses
import json
import re
from collections.abc import Iterator

import numpy as np
import pytest
from bokeh.models import ColumnDataSource, Range1d, Text

from app.analysis.results import Results, Trust
from app.figures.balance_plots import ChordRuler, ElevatorOverSpeed
from app.figures.landing_plots import SpeedsOnOneAxis
from app.figures.loading import Loading
from app.figures.planform import PlanformDrawing
from app.figures.plot import Plot
from app.figures.ranges import bounds
from app.figures.section_limits import LargestLift
from app.figures.section_plots import LiftOverAngle, LiftOverDrag, MomentOverAngle, OutlineDrawing
from app.figures.span_plots import LocalLift, ReynoldsAlongSpan, RoomAlongSpan
from app.figures.speed_plots import (
    ENDURANCE,
    LIFT_TO_DRAG,
    POWER,
    RANGE,
    CurveOverSpeed,
    DragOverSpeed,
)
from app.figures.station import Station
from app.figures.wing_lift import WingLift
from app.scenario import field_list
from app.session import SHEETS
from app.sheets.sheet import BRIEF
from tests.app.sample_results import make_results, with_nothing_found

ALL = frozenset({"sweep", "lift_curve", "trim_curve"})
FIGURES = {
    "planform": lambda s: PlanformDrawing(s, height=300),
    "local lift at landing": lambda s: LocalLift(s, "landing"),
    "local lift in cruise": lambda s: LocalLift(s, "cruise"),
    "room": RoomAlongSpan,
    "reynolds": lambda s: ReynoldsAlongSpan(s, ("cruise", "landing")),
    "loading": Loading,
    "wing lift": lambda s: WingLift(),
    "outline": lambda s: OutlineDrawing(),
    "section lift": LiftOverAngle,
    "section drag": LiftOverDrag,
    "section moment": lambda s: MomentOverAngle(),
    "largest lift": LargestLift,
    "ruler": lambda s: ChordRuler(),
    "elevator": lambda s: ElevatorOverSpeed(),
    "drag": lambda s: DragOverSpeed(),
    **{
        curve.name: lambda s, curve=curve: CurveOverSpeed(curve)
        for curve in (POWER, LIFT_TO_DRAG, ENDURANCE, RANGE)
    },
    "speeds": lambda s: SpeedsOnOneAxis(),
}


@pytest.fixture(scope="module")
def good() -> Results:
    return make_results(want=ALL)


@pytest.fixture(scope="module")
def figures() -> dict[str, tuple[Station, Plot]]:
    made = {}
    for name, make in FIGURES.items():
        station = Station()
        made[name] = (station, make(station))
    return made


def texts_of(plot: Plot) -> Iterator[str]:
    for model in plot.model.references():
        if isinstance(model, ColumnDataSource) and "text" in model.data:
            yield from model.data["text"]


def sources_of(plot: Plot) -> list[ColumnDataSource]:
    return [m for m in plot.model.references() if isinstance(m, ColumnDataSource)]


def shown_by(plot: Plot) -> dict[str, str]:
    """Give what the sources hold; of words only the text, since their place follows the axes."""
    return {
        source.id: json.dumps(source.data.get("text", source.data)) for source in sources_of(plot)
    }


@pytest.mark.parametrize("name", FIGURES)
def test_figure_shows_results_in_columns_of_one_length_kept_as_lists(name, figures, good):
    station, plot = figures[name]
    station.update(good)
    plot.update(good)
    shown = [source for source in sources_of(plot) if any(len(c) for c in source.data.values())]
    assert shown
    for source in sources_of(plot):
        assert len({len(column) for column in source.data.values()}) <= 1
        # Arrays would be sent apart from the message, at several times the cost.
        assert {type(column) for column in source.data.values()} <= {list}


@pytest.mark.parametrize("name", FIGURES)
def test_figure_survives_nothing_found_and_recovers(name, figures, good):
    station, plot = figures[name]
    station.update(good)
    plot.update(good)
    before = shown_by(plot)
    lost = with_nothing_found(good)
    station.update(lost)
    plot.update(lost)
    assert not [text for text in texts_of(plot) if re.search(r"\b(nan|inf)", text)]
    station.update(good)
    plot.update(good)
    assert shown_by(plot) == before


@pytest.mark.parametrize("name", FIGURES)
def test_figure_has_explicit_ranges_a_name_and_a_description(name, figures):
    _, plot = figures[name]
    assert isinstance(plot.model.x_range, Range1d)
    assert isinstance(plot.model.y_range, Range1d)
    assert plot.model.name
    assert plot.model.html_attributes["role"] == "img"
    assert plot.model.html_attributes["aria-label"]
    assert not plot.model.legend


@pytest.mark.parametrize("name", FIGURES)
def test_words_on_the_figure_stand_inside_it(name, figures, good):
    station, plot = figures[name]
    station.update(good)
    plot.update(good)
    x_low, x_high = sorted(bounds(plot.x_range))
    y_low, y_high = sorted(bounds(plot.y_range))
    for renderer in plot.model.renderers:
        if isinstance(getattr(renderer, "glyph", None), Text):
            data = renderer.data_source.data
            for x, y, text in zip(data["x"], data["y"], data["text"], strict=True):
                assert x_low <= x <= x_high, text
                assert y_low <= y <= y_high, text


def test_what_did_not_converge_is_a_gap_and_extrapolation_is_apart(good):
    plot = CurveOverSpeed(POWER)
    plot.update(good)
    trust, data = good.sweep.trust, plot.line.source.data
    drawn = {name: np.isfinite(data[name]) for name in ("valid", "extrapolated", "indicative")}
    assert (trust == Trust.NOT_CONVERGED).any()
    assert not (np.any(list(drawn.values()), axis=0) & (trust == Trust.NOT_CONVERGED)).any()
    assert drawn["extrapolated"][trust == Trust.EXTRAPOLATED].all()
    assert not drawn["valid"][trust == Trust.EXTRAPOLATED].any()


def test_a_slider_step_moves_the_data_and_not_the_axes(good):
    plot = LocalLift(Station(), "landing")
    plot.update(good)
    ranges, before = bounds(plot.y_range), plot.lift.source.data["valid"]
    plot.update(make_results(mass_kg=4.65))
    assert bounds(plot.y_range) == ranges
    assert plot.lift.source.data["valid"] != before


def test_the_parts_of_drag_stack_up_to_the_whole(good):
    plot = DragOverSpeed()
    plot.update(good)
    found = good.sweep.trust != Trust.NOT_CONVERGED
    # The same four numbers added in another order: rounding only.
    np.testing.assert_allclose(plot.stack.data["trim_high"], good.sweep.total[found], rtol=1e-12)


def test_a_tail_section_shows_no_station_of_the_wing(good):
    plot = LiftOverAngle(Station())
    plot.choose(1)
    plot.update(good)
    assert [mark.visible for mark in plot.marks] == [False, False]
    plot.choose(0)
    plot.update(good)
    assert [mark.visible for mark in plot.marks] == [True, True]


def test_one_reynolds_number_brought_forward_leaves_the_others_pale(good):
    plot = LiftOverAngle(Station())
    section = good.sections[0]
    plot.choose(0, section.curves[0].reynolds)
    plot.update(good)
    alpha = plot.curves.data["alpha"]
    assert max(alpha) == 1.0
    assert alpha.count(1.0) < len(alpha)
    shown = set(plot.points.data["re"])
    assert len(shown) == 1


@pytest.mark.parametrize("kind", SHEETS, ids=lambda kind: kind.name)
def test_sheet_is_built_once_then_fed(kind, good):
    sheet = kind(Station())
    sheet.station.update(good)
    assert not sheet.built
    sheet.update(good)
    cards = list(sheet.grid)
    sheet.update(make_results(want=ALL, mass_kg=5.0))
    assert [id(card) for card in sheet.grid] == [id(card) for card in cards]
    names = [plot.model.name for plot in sheet.plots]
    assert len(names) == len(set(names))


@pytest.mark.parametrize("kind", SHEETS, ids=lambda kind: kind.name)
def test_sheet_says_nothing_that_is_not_a_number(kind, good):
    sheet = kind(Station())
    lost = with_nothing_found(good)
    sheet.station.update(lost)
    sheet.update(lost)
    said = json.dumps([card.blocks for card in sheet.grid if hasattr(card, "blocks")])
    assert said != "[]"
    assert not re.search(r"\b(nan|inf|NaN|Infinity)\b", said)


@pytest.mark.parametrize("kind", SHEETS, ids=lambda kind: kind.name)
def test_sheet_asks_only_for_what_it_shows(kind):
    sheet = kind(Station())
    results = make_results(want=kind.want)
    sheet.station.update(results)
    sheet.update(results)
    assert kind.want <= ALL


def test_every_input_has_one_place_beside_every_sheet_that_needs_it():
    brief = [name for group in BRIEF for name in group.names]
    own = [name for kind in SHEETS for group in kind.groups for name in group.names]
    known = {field.name for field in field_list()}
    assert set(brief) | set(own) == known
    assert len(brief) == len(set(brief))
    assert len(own) == len(set(own))
    for kind in SHEETS:
        shown = [n for group in kind(Station()).field_groups() for n in group.names]
        assert set(brief) <= set(shown)
        assert len(shown) == len(set(shown))


def test_findings_and_source_reach_the_section_sheet_as_written(good):
    odd = dataclasses.replace(
        good.sections[0], source="<img src=x>", findings=("<script>1</script> & more",)
    )
    results = dataclasses.replace(good, sections=(odd, *good.sections[1:]))
    sheet = SHEETS[0](Station())
    sheet.station.update(results)
    sheet.update(results)
    said = json.dumps([card.blocks for card in sheet.grid if hasattr(card, "blocks")])
    # Plain text goes out; the browser sets it as text (see the browser's tests).
    assert "<script>1</script> & more" in said
    assert "<img src=x>" in said


@pytest.mark.parametrize("kind", SHEETS, ids=lambda kind: kind.name)
def test_numbers_behind_the_plots_are_fed_only_while_open(kind, good):
    sheet = kind(Station())
    sheet.station.update(good)
    sheet.update(good)
    assert sheet.folded.blocks == []
    sheet.folded._handle_msg({"open": True, "seq": 1})
    first = json.dumps(sheet.folded.blocks)
    assert '"kind": "table"' in first
    assert not re.search(r"\b(nan|inf|NaN|Infinity)\b", first)
    sheet.folded._handle_msg({"open": False, "seq": 2})
    sheet.update(make_results(want=ALL, mass_kg=5.0))
    assert json.dumps(sheet.folded.blocks) == first


def test_a_table_says_which_rows_are_not_trusted(good):
    sheet = next(kind for kind in SHEETS if kind.name == "Speed and battery")(Station())
    head, rows = (sheet.numbers(good)[1][part] for part in ("head", "rows"))
    assert head[-1] == "trust"
    said = [row[-1] for row in rows]
    assert said.count("no solution") == int((good.sweep.trust == Trust.NOT_CONVERGED).sum())
    assert "extrapolated" in said
    assert all(row[5] == "" for row in rows if row[-1] == "no solution")
