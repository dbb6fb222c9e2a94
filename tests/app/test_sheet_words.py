"""What the sheets say in words."""

from __future__ import annotations

from dataclasses import replace

from app.analysis.results import Verdict
from app.figures.station import Station
from app.sheets.balance import BalanceSheet
from app.sheets.landing import LandingSheet
from tests.app.sample_results import make_results


def rows_of(blocks: list[dict]) -> dict[str, list]:
    table = next(one for one in blocks if one["kind"] == "table")
    return {row[0]: row[1:] for row in table["rows"]}


def test_what_body_and_propeller_take_is_negative():
    results = make_results()
    balance = replace(
        results.balance,
        body_share_percent=1.95,
        propeller_share_percent=3.0,
        body_known=True,
        propeller_known=True,
    )
    sheet = BalanceSheet(Station())
    sheet.update(replace(results, balance=balance))
    rows = rows_of(sheet.shares.blocks)
    assert rows["what the body takes"] == ["−1.95\N{NO-BREAK SPACE}%"]
    assert rows["what the propeller takes"] == ["−3.00\N{NO-BREAK SPACE}%"]


def test_a_risk_is_low_watch_or_high():
    results = make_results()
    first = results.landing.risks[0]
    risks = tuple(replace(first, place=str(level), level=level) for level in Verdict)
    sheet = LandingSheet(Station())
    sheet.update(replace(results, landing=replace(results.landing, risks=risks)))
    said = {place: cells[2]["said"] for place, cells in rows_of(sheet.risks.blocks).items()}
    assert said == {"pass": "low", "watch": "watch", "fail": "high"}
