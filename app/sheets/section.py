"""Section: what the chosen section can give, and where that is known from."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import nullcontext

import numpy as np
import panel as pn

from app.analysis.results import Results, SectionResult, Trust
from app.components import Choice, Message
from app.figures import look, words
from app.figures.section_limits import LargestLift
from app.figures.section_plots import (
    ALL,
    LiftOverAngle,
    LiftOverDrag,
    MomentOverAngle,
    OutlineDrawing,
    SectionPlot,
    run_levels,
    run_marker,
)
from app.figures.station import Station
from app.sheets.numbers import section_numbers
from app.sheets.sheet import FieldGroup, Guard, Sheet, facts, note, sentences, title, words_card

TRUST_KEY = "Solid: inside the data. Dashed: extrapolated. Dotted: beyond stall, indicative only."


class SectionSheet(Sheet):
    """Outline, polars and largest lift of one section at a time."""

    name = "Section"
    groups = (FieldGroup("Sections", ("root_section", "tip_section", "tail_section", "finish")),)

    def __init__(self, station: Station, guard: Guard = nullcontext) -> None:
        super().__init__(station, guard)
        self.chosen = 0
        self.only: float = ALL

    def build(self) -> Sequence[pn.viewable.Viewable]:
        """Make figures and words."""
        self.which = Choice(
            self._choose_section, sizing_mode="stretch_width", css_classes=["halfspan-line"]
        )
        self.levels = Choice(
            self._choose_level, sizing_mode="stretch_width", css_classes=["halfspan-line"]
        )
        self.facts, self.findings = words_card("tall"), words_card("wide")
        self.choices = [self.which, self.levels]
        return [
            self.card(LiftOverAngle(self.station)),
            self.card(LiftOverDrag(self.station)),
            self.card(LargestLift(self.station)),
            self.card(MomentOverAngle()),
            self.card(OutlineDrawing()),
            self.facts,
            self.findings,
        ]

    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give the numbers behind the plots, of the curve brought forward or the first."""
        section = results.sections[self.chosen]
        curves = [curve for curve in section.curves if curve.reynolds == self.only]
        return section_numbers(section, next(iter([*curves, *section.curves]), None))

    def feed(self, results: Results) -> None:
        """Show results."""
        if self.chosen >= len(results.sections):
            self.chosen, self.only = 0, ALL
        section = results.sections[self.chosen]
        for plot in self.plots:
            if isinstance(plot, SectionPlot):
                plot.choose(self.chosen, self.only)
        super().feed(results)
        self.which.data = {
            "label": "Section",
            "options": [
                {"key": str(index), "text": f"{one.name}, {place_of(one, results)}: {one.origin}"}
                for index, one in enumerate(results.sections)
            ],
            "chosen": str(self.chosen),
        }
        self.levels.data = _levels(section, self.only)
        self.facts.blocks = _facts(section, place_of(section, results))
        self.findings.blocks = _findings(section)

    def _choose_section(self, message: Message) -> None:
        with self.guard():
            self.chosen, self.only = int(message["choose"]), ALL
            self._again()

    def _choose_level(self, message: Message) -> None:
        with self.guard():
            self.only = float(message["choose"])
            self._again()

    def _again(self) -> None:
        if self.results is not None:
            self.update(self.results)


def place_of(section: SectionResult, results: Results) -> str:
    """Say where a section is used.

    Parameters
    ----------
    section : SectionResult
        One of those in the results.
    results : Results
        A wing with one section at root and tip has it once.

    Returns
    -------
    str
        In words.
    """
    if section.role == "tail":
        return "tail"
    alone = sum(one.role != "tail" for one in results.sections) == 1
    return "whole wing" if alone else f"wing {section.role}"


def _levels(section: SectionResult, only: float) -> dict[str, object]:
    """List what can be brought forward: curves as a line, runs by their mark."""
    options: list[dict[str, str]] = [{"key": str(ALL), "text": "all"}]
    curves = [(curve.reynolds, "line") for curve in section.curves]
    runs = [(level, run_marker(section, level)) for level in run_levels(section)]
    for reynolds, mark in sorted(curves + runs):
        options.append(
            {
                "key": str(reynolds),
                "text": words.number(reynolds / 1e3),
                "colour": look.reynolds_colour(reynolds),
                "mark": mark,
                "title": "curve" if mark == "line" else "measured run",
            }
        )
    known = any(option["key"] == str(only) for option in options)
    return {
        "label": "Reynolds number [thousand], line: curve, mark: measured run",
        "options": options,
        "chosen": str(only if known else ALL),
    }


def _facts(section: SectionResult, place: str) -> list[dict[str, object]]:
    return [
        title(f"{section.name}: {place}"),
        facts(
            [
                ("Polar", section.origin),
                ("Thickness", words.number(section.thickness_percent, "% of chord")),
                ("Camber", words.number(section.camber_percent, "% of chord")),
                (
                    "Leading-edge radius",
                    words.number(section.leading_edge_radius_percent, "% of chord"),
                ),
                ("Zero-lift angle", words.number(section.zero_lift_angle_deg, "deg")),
                ("Moment about the quarter chord", words.number(section.moment_coefficient)),
                ("Reynolds numbers at landing", words.span_of(*section.landing_reynolds)),
                ("Reynolds numbers in cruise", words.span_of(*section.cruise_reynolds)),
            ]
        ),
        note(f"Source: {section.source}"),
    ]


def _findings(section: SectionResult) -> list[dict[str, object]]:
    items = list(section.findings)
    for first, last in section.unknown_reynolds:
        items.append(
            f"Between Reynolds numbers {words.span_of(first, last)} largest lift is not known: "
            "the lower of the two runs is used (hatched)."
        )
    if (np.asarray(section.limit_trust) == Trust.EXTRAPOLATED).any():
        items.append("Largest lift is extrapolated where its line is dashed.")
    return [
        title("What the data show"),
        sentences(items or ["Nothing out of the ordinary."]),
        note(TRUST_KEY),
        note(
            "Drag curves are as built: finish and build-drag factor included. "
            "Points are as measured on a smooth tunnel model."
        ),
        note("Disc: the station at landing. Diamond: the station in cruise."),
    ]
