"""Wing: its shape from above and what happens along the span."""

from __future__ import annotations

from collections.abc import Sequence

import panel as pn

from app.analysis.results import Results
from app.figures import words
from app.figures.loading import Loading
from app.figures.planform import PlanformDrawing
from app.figures.span_plots import LocalLift, ReynoldsAlongSpan
from app.figures.wing_lift import WingLift
from app.sheets.numbers import lift_curve_numbers, span_numbers
from app.sheets.sheet import FieldGroup, Sheet, facts, note, title, words_card


class WingSheet(Sheet):
    """Planform, local lift and its limit, Reynolds number, loading, lift curve."""

    name = "Wing"
    want = frozenset({"lift_curve"})
    groups = (
        FieldGroup(
            "Wing",
            (
                "span_m",
                "root_chord_mm",
                "tip_chord_mm",
                "washout_deg",
                "sweep_deg",
                "dihedral_deg",
            ),
        ),
    )

    def build(self) -> Sequence[pn.viewable.Viewable]:
        """Make figures and words."""
        self.facts = words_card("wide")
        return [
            self.card(PlanformDrawing(self.station, height=388), shape="large"),
            self.card(LocalLift(self.station, "landing")),
            self.card(LocalLift(self.station, "cruise")),
            self.card(ReynoldsAlongSpan(self.station, ("cruise", "landing"))),
            self.card(Loading(self.station)),
            self.card(WingLift()),
            self.facts,
        ]

    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give the numbers behind the plots."""
        curve = results.lift_curve
        return [
            *span_numbers(results.landing.landing_span, "at landing"),
            *span_numbers(results.cruise.span, "in cruise"),
            *(lift_curve_numbers(curve) if curve is not None else []),
        ]

    def feed(self, results: Results) -> None:
        """Show results."""
        super().feed(results)
        plan, cruise = results.planform, results.cruise
        self.facts.blocks = [
            title("The wing in numbers"),
            facts(
                [
                    ("Area", words.number(plan.area_m2, "m²")),
                    ("Aspect ratio", words.number(plan.aspect_ratio)),
                    ("Taper, tip chord over root chord", words.number(plan.taper)),
                    ("Mean aerodynamic chord", words.number(1e3 * plan.mean_chord_m, "mm")),
                    ("Wing loading", words.number(plan.wing_loading_n_m2, "N/m²")),
                    ("Thickness at the root", words.number(plan.root_thickness_mm, "mm")),
                    ("Thickness at the tip", words.number(plan.tip_thickness_mm, "mm")),
                    ("Angle of attack in cruise", words.number(cruise.angle_deg, "deg")),
                    ("Lift to drag in cruise", words.number(cruise.lift_to_drag)),
                ]
            ),
            note(f"Cruise: {cruise.status}."),
        ]
