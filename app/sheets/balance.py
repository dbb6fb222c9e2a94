"""Balance: the points on the chord, and what the elevator has to do."""

from __future__ import annotations

from collections.abc import Sequence

import panel as pn

from app.analysis.results import BalanceResult, Results
from app.figures import words
from app.figures.balance_plots import ChordRuler, ElevatorOverSpeed
from app.figures.planform import PlanformDrawing
from app.sheets.numbers import balance_numbers
from app.sheets.sheet import FieldGroup, Sheet, facts, note, table, title, words_card

NOT_GIVEN = "not given"


class BalanceSheet(Sheet):
    """Planform with its points, chord as a ruler, elevator over speed, contributions."""

    name = "Balance"
    want = frozenset({"trim_curve"})
    groups = (
        FieldGroup("Balance", ("balance_percent", "balance_forward_percent")),
        FieldGroup(
            "Tail",
            (
                "tail_area_m2",
                "tail_arm_m",
                "tail_incidence_deg",
                "elevator_chord_percent",
                "elevator_travel_deg",
                "hinge_gap_debit_percent",
                "tail_aspect_ratio",
                "tail_taper",
                "tail_height_m",
            ),
        ),
        FieldGroup(
            "Body and propeller",
            (
                "body_length_mm",
                "body_width_mm",
                "body_nose_mm",
                "propeller_share_percent",
                "thrust_line_offset_mm",
            ),
            open=False,
        ),
    )

    def build(self) -> Sequence[pn.viewable.Viewable]:
        """Make figures and words."""
        self.shares, self.trim = words_card(), words_card("wide")
        return [
            self.card(PlanformDrawing(self.station, height=388), shape="large"),
            self.card(ElevatorOverSpeed()),
            self.card(ChordRuler()),
            self.shares,
            self.trim,
        ]

    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give the numbers behind the plots."""
        return balance_numbers(results.balance)

    def feed(self, results: Results) -> None:
        """Show results."""
        super().feed(results)
        self.shares.blocks = _shares(results.balance)
        self.trim.blocks = _trim(results)


def _shares(balance: BalanceResult) -> list[dict[str, object]]:
    # A positive share is taken from the neutral point.
    body = words.number(-balance.body_share_percent, "%", sign=True)
    propeller = words.number(-balance.propeller_share_percent, "%", sign=True)
    rows = [
        ("Neutral point", words.number(balance.neutral_point_percent, "%")),
        ("what the body takes", body if balance.body_known else NOT_GIVEN),
        ("what the propeller takes", propeller if balance.propeller_known else NOT_GIVEN),
        ("Balance point", words.number(balance.balance_percent, "%")),
        ("Static margin", words.number(balance.static_margin_percent, "%")),
    ]
    blocks = [
        title("What makes up the static margin"),
        table(["", "of the mean aerodynamic chord"], rows),
    ]
    if not (balance.body_known and balance.propeller_known):
        missing = " and ".join(
            name
            for name, known in (
                ("the body's length and width", balance.body_known),
                ("the propeller's share", balance.propeller_known),
            )
            if not known
        )
        blocks.append(note(f"Until {missing} are given, the static margin is an upper end."))
    return blocks


def _trim(results: Results) -> list[dict[str, object]]:
    balance, cruise, plan = results.balance, results.cruise, results.planform
    return [
        title("In trim"),
        facts(
            [
                ("Elevator in cruise", words.number(balance.elevator_cruise_deg, "deg")),
                (
                    "Elevator at landing, forward balance point",
                    words.number(balance.elevator_landing_forward_deg, "deg"),
                ),
                (
                    "Elevator travel to either side",
                    words.number(balance.elevator_travel_deg, "deg"),
                ),
                (
                    "Tail lift in cruise, up",
                    words.number(balance.tail_lift_cruise_n, "N", sign=True),
                ),
                ("Angle of attack in cruise", words.number(cruise.angle_deg, "deg")),
                ("Tail volume", words.number(plan.tail_volume)),
                (
                    "Balance point behind the root's nose",
                    words.number(1e3 * plan.balance_x_m, "mm"),
                ),
            ]
        ),
    ]
