"""Several wings side by side: what differs, and what it does to each margin."""

from __future__ import annotations

from app.analysis.results import Margin
from app.figures import words
from app.report import parts
from app.report.charts import Charts
from app.report.live import Live, plot_place
from app.report.markup import Html, Part, join, table, tag
from app.report.order import Order, Shown
from app.report.overlay import overlays
from app.report.parts import section


def compared(order: Order, charts: Charts, live: Live) -> Html:
    """Make the body of a report on two to six scenarios.

    Parameters
    ----------
    order : Order
        What is compared.
    charts : Charts
        Takes the figures in.
    live : Live
        The sliders.

    Returns
    -------
    Html
        Everything between head and cautions.
    """
    planforms, *others = overlays(charts, order)
    return join(
        section("verdict", "Margins side by side", _verdicts(order), _margins(order)),
        section("differences", "What differs", _differences(order)),
        section("wing", "The wings", plot_place(planforms, wide=True), _wing_numbers(order)),
        section("live", "What if", live.markup()),
        section(
            "plots",
            "Over each other",
            tag("div", [plot_place(name) for name in others], cls="plots"),
        ),
        section("reasons", "Why, for each", [_reasons(one) for one in order.shown]),
        section("stations", "Stations", [_stations(at, one) for at, one in enumerate(order.shown)]),
        section("sections", "Sections", [_sections(at, one) for at, one in enumerate(order.shown)]),
        section("inputs", "Inputs that all share", _shared(order)),
    )


def name_of(one: Shown) -> str:
    """Name a scenario with its letter."""
    return f"{one.letter} {one.name}"


def _verdicts(order: Order) -> Html:
    rows = [
        tag(
            "li",
            parts.verdict(parts.worst(one.results.margins)),
            " ",
            tag("b", name_of(one)),
            f": {parts.summary(one.results.margins).lower()}.",
            tag("span", f" {one.note}", cls="note-of-user") if one.note.strip() else None,
        )
        for one in order.shown
    ]
    return tag("ul", rows, cls="verdicts")


def _margins(order: Order) -> Html:
    by_key = [{margin.key: margin for margin in one.results.margins} for one in order.shown]
    rows: list[list[Part]] = []
    for margin in order.shown[0].results.margins:
        found = [margins.get(margin.key) for margins in by_key]
        rows.append([margin.label, *[_margin_cell(one) for one in found]])
    head = ["Requirement", *[name_of(one) for one in order.shown]]
    return tag("div", table(head, rows, cls="side-by-side even"), cls="scroll")


def _margin_cell(margin: Margin | None) -> Html:
    if margin is None:
        return Html("")
    limit = f"{margin.sense} {words.given(margin.limit, margin.unit)}"
    return join(
        tag("b", words.number(margin.value, margin.unit)),
        " ",
        parts.verdict(margin.verdict),
        parts.gauge(margin),
        tag("small", limit),
    )


def _differences(order: Order) -> Html:
    rows: list[list[Part]] = []
    for row in order.shown[0].fields:
        found = [one.field(row.name) for one in order.shown]
        if len({entry.value for entry in found}) > 1:
            rows.append([row.label, *[parts.field_value(entry) for entry in found]])
    if len({one.tables for one in order.shown}) > 1:
        said = [", ".join(path for path, _, _ in one.tables) or "none" for one in order.shown]
        rows.append(["Tables of sections", *said])
    if not rows:
        return tag("p", "Nothing: their inputs are the same.")
    head = ["Input", *[name_of(one) for one in order.shown]]
    return tag("div", table(head, rows, cls="numbers even"), cls="scroll")


def _shared(order: Order) -> Html:
    rows: list[list[Part]] = []
    for row in order.shown[0].fields:
        if len({one.field(row.name).value for one in order.shown}) == 1:
            group = parts.GROUPS.get(row.group, row.group)
            rows.append([row.label, parts.field_value(row), group])
    return tag("div", table(["Input", "Value", "Of"], rows, cls="numbers even"), cls="scroll")


def _wing_numbers(order: Order) -> Html:
    listed = (
        ("Area", lambda r: words.number(r.planform.area_m2, "m²")),
        ("Aspect ratio", lambda r: words.number(r.planform.aspect_ratio)),
        ("Mean aerodynamic chord", lambda r: words.number(1e3 * r.planform.mean_chord_m, "mm")),
        ("Wing loading", lambda r: words.number(r.planform.wing_loading_n_m2, "N/m²")),
        ("Stall speed in trim", parts.stall_words),
        ("Stall begins", lambda r: r.landing.onset_words),
        ("Lift to drag in cruise", lambda r: parts.cruise_words(r, r.cruise.lift_to_drag)),
        ("Power in cruise", lambda r: parts.cruise_words(r, r.cruise.electric_power_w, "W")),
    )
    rows: list[list[Part]] = [
        [label, *[value(one.results) for one in order.shown]] for label, value in listed
    ]
    head = ["", *[name_of(one) for one in order.shown]]
    return tag("div", table(head, rows, cls="numbers even"), cls="scroll")


def _reasons(one: Shown) -> Html:
    rows: list[list[Part]] = [
        [margin.label, parts.verdict(margin.verdict), margin.reason]
        for margin in one.results.margins
    ]
    return tag(
        "div",
        tag("h3", name_of(one)),
        table(["Requirement", "Verdict", "Why"], rows, cls="risks"),
        cls="one-section",
    )


def _stations(at: int, one: Shown) -> Html:
    return tag(
        "details",
        tag("summary", name_of(one)),
        parts.station_table(one.results),
        parts.save_button(f"stations-{at}", "Save as CSV"),
        open=True,
    )


def _sections(at: int, one: Shown) -> Html:
    shown = [
        tag(
            "div",
            tag("h4", f"{each.name}, {each.role}, ", tag("em", each.origin)),
            parts.section_facts(one.results, index),
        )
        for index, each in enumerate(one.results.sections)
    ]
    return tag(
        "div",
        tag("h3", name_of(one)),
        shown,
        parts.save_button(f"polars-{at}", "Save the curves as CSV"),
        cls="one-section",
    )
