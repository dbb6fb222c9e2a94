"""Launch and landing: how far from stall, where it begins, and the risks."""

from __future__ import annotations

from collections.abc import Sequence

import panel as pn

from app.analysis.results import LandingResult, Results, Verdict
from app.figures import words
from app.figures.landing_plots import SpeedsOnOneAxis
from app.figures.span_plots import LocalLift, ReynoldsAlongSpan, RoomAlongSpan
from app.sheets.numbers import span_numbers
from app.sheets.sheet import (
    FIELD,
    LIMITS,
    MISSION,
    FieldGroup,
    Sheet,
    facts,
    note,
    sentences,
    table,
    title,
    words_card,
)

RISK_WORDS = {Verdict.PASS: "low", Verdict.WATCH: "watch", Verdict.FAIL: "high"}


class LandingSheet(Sheet):
    """Speeds on one axis, lift and its limit along the span, risks, sentences."""

    name = "Launch and landing"

    def field_groups(self) -> tuple[FieldGroup, ...]:
        """Give the inputs beside this sheet; launch, landing and field stand open."""
        return (MISSION, FieldGroup(f"{FIELD.title} ", FIELD.names), LIMITS)

    def build(self) -> Sequence[pn.viewable.Viewable]:
        """Make figures and words."""
        self.margins, self.said = words_card("full"), words_card("tall")
        self.risks = words_card("wide")
        return [
            self.card(SpeedsOnOneAxis(), shape="wide"),
            self.said,
            self.card(LocalLift(self.station, "landing")),
            self.card(RoomAlongSpan(self.station)),
            self.card(ReynoldsAlongSpan(self.station, ("landing",))),
            self.risks,
            self.margins,
        ]

    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give the numbers behind the plots."""
        return [
            *span_numbers(results.landing.landing_span, "at landing"),
            *span_numbers(results.landing.onset_span, "at the onset of stall"),
        ]

    def feed(self, results: Results) -> None:
        """Show results."""
        super().feed(results)
        landing = results.landing
        self.said.blocks = [
            title("What it means"),
            sentences([*landing.sentences, landing.counterfactual]),
            note(f"Stall: {landing.status}."),
        ]
        self.margins.blocks = _margins(landing)
        self.risks.blocks = [
            title("Low-Reynolds-number risk along the half-wing at landing"),
            table(
                ["place", "from the centre", "Reynolds number", "risk", "reason"],
                [
                    (
                        risk.place,
                        words.number(risk.y_m, "m"),
                        words.reynolds(risk.reynolds),
                        {"verdict": str(risk.level), "said": RISK_WORDS[risk.level]},
                        risk.reason,
                    )
                    for risk in landing.risks
                ],
            ),
        ]


def _margins(landing: LandingResult) -> list[dict[str, object]]:
    ends = sorted((landing.stall_speed_low_m_s, landing.stall_speed_high_m_s))
    return [
        title("What is left at landing speed"),
        facts(
            [
                ("Stall speed in trim", words.number(landing.stall_speed_m_s, "m/s")),
                ("its band", words.span_of(ends[0], ends[1], "m/s")),
                ("Landing speed over stall", words.number(landing.landing_ratio)),
                (
                    "its band",
                    words.span_of(landing.landing_ratio_low, landing.landing_ratio_high),
                ),
                ("Speed to lose", words.number(landing.speed_to_lose_m_s, "m/s")),
                ("Lift left", words.number(landing.lift_margin_percent, "%")),
                ("Angle left to the knee", words.number(landing.angle_margin_deg, "deg")),
                ("Bank in a level turn", words.number(landing.bank_deg, "deg")),
                ("Sharp-edged gust", words.number(landing.gust_m_s, "m/s")),
                (
                    "Ratio at high Reynolds number",
                    words.number(landing.high_reynolds_ratio),
                ),
            ]
        ),
    ]
