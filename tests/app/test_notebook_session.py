"""One session without a browser: what it takes, refuses, keeps and says."""

from __future__ import annotations

import logging

import pytest
from bokeh.document import Document

from app import notebook
from app.journal_exchange import LARGEST_UPLOAD
from app.page_state import margin_tile
from app.scenario import Scenario
from app.session import NOTHING, WRONG, Session
from app.workspace import Workspace
from solver.errors import InputError
from tests.app.page_session import made_workspace
from tests.app.sample_results import make_results, with_nothing_found


def scenario() -> Scenario:
    made = Scenario(name="<b>Rook</b> & co")
    made.set_values({"root_section": "NACA 2412", "tip_section": "NACA 2412"})
    return made


@pytest.fixture
def workspace(tmp_path) -> Workspace:
    return made_workspace(scenario(), tmp_path)


@pytest.fixture
def session(workspace) -> Session:
    return Session(workspace.scenario.copy(), workspace)


def send(session: Session, **values: object) -> None:
    session.column._handle_msg({"values": values, "seq": 1})


def shown(session: Session, name: str) -> object:
    return session.column.state["values"][name]


def span_shown(session: Session) -> str:
    return next(m["value"] for m in session.strip.data["margins"] if m["key"] == "span")


def test_a_value_taken_reaches_scenario_strip_and_plots(session):
    before = session.sheets["Wing"].plots[0].outlines.data
    send(session, span_m=2.0)
    assert session.scenario.wing.span_m == 2.0
    assert shown(session, "span_m") == 2.0
    assert span_shown(session).startswith("2.00")
    assert session.sheets["Wing"].plots[0].outlines.data != before
    assert session.column.state["refusals"] == {}


@pytest.mark.parametrize("bad", [99.0, -1.0, "wide", float("nan"), None])
def test_a_value_refused_marks_its_field_and_changes_nothing_else(session, bad):
    runs, plots = len(session.analysis.runs), session.sheets["Wing"].plots[0].outlines.data
    send(session, span_m=bad)
    text = session.column.state["refusals"]["span_m"]["text"]
    assert text.startswith("Span must be a number between 0.4 and 8 m; got ")
    assert text.endswith(".")
    assert shown(session, "span_m") == 2.4
    assert len(session.analysis.runs) == runs
    assert session.sheets["Wing"].plots[0].outlines.data == plots


def test_a_good_value_clears_the_refusal_of_its_field(session):
    send(session, span_m=99.0)
    send(session, span_m=2.1)
    assert session.column.state["refusals"] == {}
    assert shown(session, "span_m") == 2.1


def test_a_value_that_waited_for_another_field_is_taken_with_it(session):
    send(session, landing_speed_m_s=18.0)
    assert "landing_speed_m_s" in session.column.state["refusals"]
    send(session, cruise_speed_m_s=19.0)
    assert session.column.state["refusals"] == {}
    assert shown(session, "landing_speed_m_s") == 18.0
    assert shown(session, "cruise_speed_m_s") == 19.0


def test_a_refusal_that_still_holds_stands_while_other_fields_change(session):
    send(session, landing_speed_m_s=18.0)
    send(session, mass_kg=5.0)
    assert "landing_speed_m_s" in session.column.state["refusals"]
    assert shown(session, "landing_speed_m_s") == 14.5
    assert shown(session, "mass_kg") == 5.0


def test_a_refusal_by_the_analysis_marks_the_field_and_takes_the_change_back(session):
    session.analysis.error = InputError("root_section", "NACA 9999", "a section that can be drawn")
    send(session, root_section="NACA 9912")
    assert "a section that can be drawn" in session.column.state["refusals"]["root_section"]["text"]
    assert shown(session, "root_section") == "NACA 2412"


def test_an_error_is_said_in_a_fixed_sentence_and_the_change_is_taken_back(session, caplog):
    before = session.results
    session.analysis.error = RuntimeError("<i>secret path</i>")
    with caplog.at_level(logging.ERROR):
        send(session, span_m=2.0)
    assert session.strip.data["notice"] == WRONG
    assert shown(session, "span_m") == 2.4
    assert session.results is before
    assert "secret path" in caplog.text
    session.analysis.error = None
    send(session, span_m=2.0)
    assert session.strip.data["notice"] == ""
    assert shown(session, "span_m") == 2.0


def test_a_figure_that_fails_gets_the_last_good_result_back(session, monkeypatch):
    plot = session.sheets["Wing"].plots[1]
    good, feed = repr(plot.lift.source.data), plot.update

    def fails_once(results):
        monkeypatch.setattr(plot, "update", feed)
        raise ZeroDivisionError

    monkeypatch.setattr(plot, "update", fails_once)
    send(session, mass_kg=6.0)
    assert session.strip.data["notice"] == WRONG
    assert repr(plot.lift.source.data) == good
    assert shown(session, "mass_kg") == 4.6


def test_every_message_is_answered_even_after_an_error(session, monkeypatch):
    answers = []
    monkeypatch.setattr(session.column, "_send_msg", answers.append)
    session.analysis.error = RuntimeError("boom")
    session.column._handle_msg({"values": {"span_m": 2.0}, "seq": 7})
    session.column._handle_msg({"nonsense": 1, "seq": 8})
    assert answers == [{"done": 7}, {"done": 8}]


def test_nothing_solved_at_the_start_is_said_and_can_be_mended(workspace):
    analysis = workspace.analysis
    analysis.error = RuntimeError("boom")
    session = Session(scenario(), workspace)
    assert session.strip.data["notice"] == NOTHING
    assert shown(session, "span_m") == 2.4
    analysis.error = None
    send(session, span_m=2.2)
    assert session.strip.data["notice"] == ""
    assert span_shown(session).startswith("2.20")


def test_only_the_open_sheet_is_built_and_asked_for(session):
    assert [name for name, sheet in session.sheets.items() if sheet.built] == ["Wing"]
    assert session.analysis.runs[-1] == session.sheets["Wing"].want
    session.tabs._handle_msg({"sheet": "Speed and battery", "seq": 1})
    assert session.analysis.runs[-1] == frozenset({"sweep"})
    wing = session.sheets["Wing"].plots[1].lift.source
    before = wing.data
    send(session, mass_kg=5.5)
    assert wing.data is before
    assert session.sheets["Speed and battery"].view.visible
    assert not session.sheets["Wing"].view.visible


def test_a_sheet_opened_again_shows_what_changed_meanwhile(session):
    before = session.sheets["Wing"].plots[1].lift.source.data
    session.tabs._handle_msg({"sheet": "Balance", "seq": 1})
    send(session, mass_kg=5.5)
    session.tabs._handle_msg({"sheet": "Wing", "seq": 2})
    assert session.sheets["Wing"].plots[1].lift.source.data != before


def test_the_station_goes_along_from_sheet_to_sheet(session):
    session.tabs._handle_msg({"station": 0.8, "seq": 1})
    share = session.open.station.share
    session.tabs._handle_msg({"sheet": "Section", "seq": 2})
    assert session.open.station.share == share
    assert session.open.station.held
    assert "at landing Re" in session.tabs.station["text"]


def test_a_margin_opens_its_sheet_and_its_reason(session):
    session.strip._handle_msg({"open": "endurance", "seq": 1})
    margin = next(m for m in session.results.margins if m.key == "endurance")
    assert session.tabs.active == margin.sheet == session.open.name
    assert session.strip.data["reason"] == margin.reason
    assert session.strip.data["chosen"] == "endurance"
    session.strip._handle_msg({"open": "", "seq": 2})
    assert session.strip.data["reason"] == session.results.reason
    assert session.open.name == margin.sheet


def test_inputs_beside_the_sheet_change_with_it(session):
    titles = [group["title"] for group in session.column.groups]
    session.tabs._handle_msg({"sheet": "Balance", "seq": 1})
    others = [group["title"] for group in session.column.groups]
    assert "Wing" in titles
    assert "Tail" in others
    assert "Wing" not in others
    assert titles[0] == others[0] == "Mission"


def test_the_cautions_are_at_the_foot_and_what_is_odd_before_them(session):
    assert session.footer.sentences == list(session.results.cautions)
    send(session, airspeed_error_m_s=0.0)
    first, *rest = session.footer.sentences
    assert first.startswith("An airspeed error of 0")
    assert rest == list(session.results.cautions)


def test_two_sessions_share_no_value(workspace):
    first, second = (Session(workspace.start("").scenario, workspace) for _ in range(2))
    send(first, span_m=1.9)
    assert first.scenario.wing.span_m == 1.9
    assert second.scenario.wing.span_m == workspace.scenario.wing.span_m == 2.4
    assert second.scenario.freeze() == workspace.scenario.freeze()


def test_a_tile_says_value_limit_margin_and_verdict():
    tile = margin_tile(make_results().margins[4])
    assert tile["key"] == "cruise_power"
    assert tile["limit"] == "≤ 140\N{NO-BREAK SPACE}W"
    assert tile["margin"].startswith("+")
    assert tile["verdict"] in tile["said"]
    # At most: less than the limit is to the good side.
    assert tile["at"] > 0.0


def test_a_tile_without_a_value_says_so_and_draws_nothing():
    tile = margin_tile(with_nothing_found(make_results()).margins[0])
    assert tile["value"] == "not found"
    assert tile["margin"] == ""
    assert tile["at"] is tile["low"] is tile["high"] is None


def test_the_page_fits_one_document(session):
    document = Document()
    session.layout().server_doc(document)
    assert len(document.roots) >= 1
    document.validate()


def test_the_server_listens_on_this_computer_and_for_its_own_page_only(workspace):
    server = notebook.make_server(workspace, port=0)
    try:
        assert server.address == "127.0.0.1"
        assert server._tornado._websocket_origins == {f"127.0.0.1:{server.port}"}
        assert server._tornado.settings["websocket_max_message_size"] == notebook.LARGEST_MESSAGE
        # An upload of the largest size comes as letters, four for three bytes.
        assert notebook.LARGEST_MESSAGE > LARGEST_UPLOAD * 4 / 3
    finally:
        server.stop()


def test_an_error_while_a_section_is_chosen_is_said(session, monkeypatch):
    session.tabs._handle_msg({"sheet": "Section", "seq": 1})
    sheet = session.sheets["Section"]
    sheet.which._handle_msg({"choose": "1", "seq": 2})
    assert session.strip.data["notice"] == ""
    sheet.which._handle_msg({"choose": "none such", "seq": 3})
    assert session.strip.data["notice"] == WRONG
