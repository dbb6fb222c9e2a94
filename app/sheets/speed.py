"""Speed and battery: drag, power, time and distance over speed."""

from __future__ import annotations

from collections.abc import Sequence

import panel as pn

from app.analysis.results import DragParts, Results
from app.figures import words
from app.figures.speed_plots import (
    ENDURANCE,
    LIFT_TO_DRAG,
    POWER,
    RANGE,
    CurveOverSpeed,
    DragOverSpeed,
)
from app.sheets.numbers import sweep_numbers
from app.sheets.sheet import FieldGroup, Sheet, facts, note, table, title, words_card


class SpeedSheet(Sheet):
    """Drag split, power, lift to drag, endurance and range; today's drag as a table."""

    name = "Speed and battery"
    want = frozenset({"sweep"})
    groups = (
        FieldGroup(
            "Battery and motor",
            (
                "battery_wh",
                "usable_percent",
                "propulsive_efficiency",
                "avionics_w",
                "peukert_exponent",
            ),
        ),
        FieldGroup("Drag", ("body_drag_area_m2", "build_drag_factor")),
    )

    def build(self) -> Sequence[pn.viewable.Viewable]:
        """Make figures and words."""
        self.parts, self.best = words_card("tall"), words_card("wide")
        return [
            self.card(DragOverSpeed()),
            self.card(CurveOverSpeed(POWER)),
            self.card(CurveOverSpeed(ENDURANCE)),
            self.card(CurveOverSpeed(LIFT_TO_DRAG)),
            self.card(CurveOverSpeed(RANGE)),
            self.parts,
            self.best,
        ]

    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give the numbers behind the plots."""
        return sweep_numbers(results.sweep) if results.sweep is not None else []

    def feed(self, results: Results) -> None:
        """Show results."""
        super().feed(results)
        self.parts.blocks = _parts(results.cruise.drag, results.cruise.status)
        sweep, cruise = results.sweep, results.cruise
        if sweep is None:
            return
        self.best.blocks = [
            title("In cruise, and the best speeds"),
            facts(
                [
                    ("Cruise speed", words.number(cruise.speed_m_s, "m/s")),
                    ("Lift coefficient", words.number(cruise.lift_coefficient)),
                    ("Lift to drag", words.number(cruise.lift_to_drag)),
                    ("Electric power", words.number(cruise.electric_power_w, "W")),
                    ("Longest in the air at", words.number(sweep.best_endurance_speed_m_s, "m/s")),
                    ("Furthest at", words.number(sweep.best_range_speed_m_s, "m/s")),
                ]
            ),
            note("Range counts the headwind; endurance does not."),
        ]


def _parts(drag: DragParts, status: str) -> list[dict[str, object]]:
    total = drag.total
    parts = (
        ("Induced", drag.induced),
        ("Wing and tail sections", drag.profile),
        ("Body", drag.body),
        ("Trim, induced", drag.trim_induced),
        ("Trim, sections", drag.trim_profile),
        ("All", total),
    )
    rows = [
        (
            name,
            words.part(part, total, "N"),
            words.part(100.0 * part / total if total else float("nan"), 10.0, "%"),
        )
        for name, part in parts
    ]
    return [
        title("Drag in cruise"),
        table(["part", "drag", "share"], rows),
        note(f"Cruise: {status}."),
    ]
