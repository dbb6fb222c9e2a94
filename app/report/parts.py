"""Pieces of a report that one scenario and several share."""

from __future__ import annotations

import math
from collections.abc import Sequence

from app.analysis.results import Margin, Results, SpanResult, Trust, Verdict
from app.figures import words
from app.report.markup import Html, Part, facts, join, sentences, table, tag
from app.report.order import FieldRow, Order, Shown

GROUPS = {
    "brief": "Brief",
    "wing": "Wing",
    "tail": "Tail and elevator",
    "body": "Body",
    "balance": "Balance",
    "propulsion": "Battery and propulsion",
}
MARKS = {
    Verdict.PASS: "M2.5 7.5 L6 11 L12 3.5",
    Verdict.WATCH: "M7 1.5 L13 12.5 L1 12.5 Z M7 5.5 L7 9",
    Verdict.FAIL: "M2.5 2.5 L11.5 11.5 M11.5 2.5 L2.5 11.5",
}
TRUST = {
    Trust.VALID: "valid",
    Trust.EXTRAPOLATED: "extrapolated",
    Trust.INDICATIVE: "indicative only",
    Trust.NOT_CONVERGED: "not found",
}


def verdict(which: Verdict) -> Html:
    """Write a verdict as mark, word and colour."""
    path = Html(
        '<svg viewBox="0 0 14 14" width="12" height="12" aria-hidden="true">'
        f'<path d="{MARKS[which]}" fill="none" stroke="currentColor" stroke-width="2"'
        ' stroke-linecap="round"'
        ' stroke-linejoin="round"/></svg>'
    )
    return tag("span", path, " ", str(which), cls=f"verdict {which}")


def section(name: str, heading: str, *parts: Part, cls: str = "") -> Html:
    """Make a part of the report with its heading."""
    return tag("section", tag("h2", heading), *parts, id=name, cls=cls or None)


def header(order: Order) -> Html:
    """Make the head of the report: title, who, when, note."""
    author = order.author.strip()
    stated = [tag("span", author)] if author else []
    stated.append(tag("time", order.made, id="made"))
    stated.append(tag("span", f"Halfspan {order.version}"))
    note = order.note.strip()
    kind = "Comparison of wings" if order.compares else "Why this wing"
    return tag(
        "header",
        tag("p", f"Halfspan report · {kind}", cls="mark"),
        tag("h1", order.title),
        tag("p", stated, cls="meta"),
        tag("p", note, cls="note-of-user") if note else None,
    )


def summary(margins: Sequence[Margin]) -> str:
    """Say in a few words how the requirements stand."""
    failing = sum(one.verdict is Verdict.FAIL for one in margins)
    watched = sum(one.verdict is Verdict.WATCH for one in margins)
    if failing:
        return f"{failing} of {len(margins)} requirements {'fails' if failing == 1 else 'fail'}"
    if watched:
        return f"No requirement fails; {watched} of {len(margins)} to watch"
    return f"All {len(margins)} requirements are met"


def worst(margins: Sequence[Margin]) -> Verdict:
    """Give the worst of the verdicts."""
    found = {one.verdict for one in margins}
    return next((one for one in (Verdict.FAIL, Verdict.WATCH) if one in found), Verdict.PASS)


def margin_table(margins: Sequence[Margin], *, above: str = "") -> Html:
    """Make the table of requirements with verdict and reason.

    A long reason that stands in the words `above` the table is not said twice.
    """
    rows: list[list[Part]] = []
    for one in margins:
        said = len(one.reason) > 120 and one.reason in above
        rows.append(
            [
                one.label,
                tag("b", words.number(one.value, one.unit)),
                gauge(one),
                f"{one.sense} {words.given(one.limit, one.unit)}",
                distance(one),
                verdict(one.verdict),
                tag("span", "As said above." if said else one.reason, cls="why"),
            ]
        )
    head = ["Requirement", "Value", "", "Limit", "Margin", "Verdict", "Why"]
    return table(head, rows, cls="margins")


def distance(margin: Margin) -> str:
    """Write how far a value is from its limit, positive when met, in the value's digits."""
    if not (math.isfinite(margin.value) and math.isfinite(margin.margin)):
        return words.NOT_FOUND
    _, _, decimals = words.number(abs(margin.value)).partition(".")
    text = f"{margin.margin:+.{len(decimals)}f}".replace("-", words.MINUS)
    return f"{text}{words.UNIT_SPACE}{margin.unit}" if margin.unit else text


def gauge(margin: Margin) -> Html:
    """Draw a value with its band against its limit; what is not allowed is hatched."""
    if not (math.isfinite(margin.value) and math.isfinite(margin.limit)):
        return Html("")
    low = margin.low if math.isfinite(margin.low) else margin.value
    high = margin.high if math.isfinite(margin.high) else margin.value
    reach = max(abs(one - margin.limit) for one in (margin.value, low, high))
    reach = max(1.25 * reach, 0.15 * abs(margin.limit), 1e-9)

    def place(value: float) -> str:
        share = 0.5 + 0.5 * (value - margin.limit) / reach
        return f"{100 * min(max(share, 0.02), 0.98):.1f}"

    at_least = margin.sense == "at least"
    x = [float(place(one)) for one in (min(low, high), max(low, high))]
    lines = [
        f'<line class="{"hatch" if at_least else "free"}" x1="0" y1="6" x2="50" y2="6"/>',
        f'<line class="{"free" if at_least else "hatch"}" x1="50" y1="6" x2="100" y2="6"/>',
        f'<rect class="band" x="{x[0]}" y="3" width="{max(x[1] - x[0], 0.5):.1f}" height="6"/>',
        '<line class="limit" x1="50" y1="0" x2="50" y2="12"/>',
        f'<circle class="dot" cx="{place(margin.value)}" cy="6" r="3.4"/>',
    ]
    said = (
        f"{words.number(margin.value, margin.unit)}, {margin.sense} "
        f"{words.given(margin.limit, margin.unit)}"
    )
    return Html(
        f'<svg class="gauge {margin.verdict}" viewBox="0 0 100 12" role="img" '
        f'aria-label="{join(said)}">{"".join(lines)}</svg>'
    )


def field_value(row: FieldRow) -> str:
    """Write an input as it was set."""
    if isinstance(row.value, str):
        return row.value
    return words.given(float(row.value), row.unit)


def group_facts(shown: Shown, group: str) -> Html:
    """List the inputs of one group with their units."""
    return facts([(row.label, field_value(row)) for row in shown.fields if row.group == group])


def inputs(shown: Shown) -> Html:
    """List all inputs but the brief, by group."""
    return tag(
        "div",
        [
            tag("div", tag("h3", heading), group_facts(shown, group), cls="group")
            for group, heading in GROUPS.items()
            if group != "brief"
        ],
        cls="groups",
    )


def trusted(text: str, trust: Trust) -> str:
    """Say beside a value how far it can be believed; one that was not found is none."""
    if trust == Trust.NOT_CONVERGED or text == words.NOT_FOUND:
        return words.NOT_FOUND
    return text if trust == Trust.VALID else f"{text}, {TRUST[trust]}"


def stall_words(results: Results) -> str:
    """Write the stall speed, and how far it can be believed."""
    landing = results.landing
    return trusted(words.number(landing.stall_speed_m_s, "m/s"), landing.trust)


def cruise_words(results: Results, value: float, unit: str = "") -> str:
    """Write a value of the cruise, and how far it can be believed."""
    return trusted(words.number(value, unit), results.cruise.trust)


def planform_facts(results: Results) -> Html:
    """List what the planform amounts to."""
    plan, landing = results.planform, results.landing
    return facts(
        [
            ("Area", words.number(plan.area_m2, "m²")),
            ("Aspect ratio", words.number(plan.aspect_ratio)),
            ("Mean aerodynamic chord", words.number(1e3 * plan.mean_chord_m, "mm")),
            ("Wing loading", words.number(plan.wing_loading_n_m2, "N/m²")),
            ("Tail volume", words.number(plan.tail_volume)),
            ("Stall speed in trim", stall_words(results)),
            (
                "Its band",
                words.span_of(landing.stall_speed_low_m_s, landing.stall_speed_high_m_s, "m/s"),
            ),
            ("Stall begins", landing.onset_words),
            ("Lift to drag in cruise", cruise_words(results, results.cruise.lift_to_drag)),
            ("Air density at the field", words.number(results.air.density_kg_m3, "kg/m³")),
        ]
    )


def behind(results: Results) -> Html:
    """Say what stands behind the margins that decide: where and how it stalls."""
    landing = results.landing
    said = [*landing.sentences]
    if landing.counterfactual and landing.counterfactual not in results.reason:
        said.append(landing.counterfactual)
    said += [f"Cruise: {results.cruise.status}.", f"Stall: {landing.status}."]
    return tag("div", tag("h3", "What stands behind it"), sentences(said), cls="behind")


def save_button(key: str, said: str) -> Html:
    """Make a button that saves one of the file's tables."""
    return tag("p", tag("button", said, type="button", data_csv=key), cls="save")


def station_table(results: Results) -> Html:
    """Make the table of stations; the one pointed at is marked in the browser."""
    landing, cruise = results.landing.landing_span, results.cruise.span
    head = ["From the centre [m]", "Chord [mm]"]
    for said in ("landing", "cruise"):
        head += [f"Re, {said}", f"Lift, {said}", f"Limit, {said}", f"Room, {said}"]
    head.append("How sure")
    rows = []
    for at, place in enumerate(landing.y_m):
        row = [f"{place:.3f}", f"{1e3 * landing.chord_m[at]:.0f}"]
        for span in (landing, cruise):
            row += _station_cells(span, at)
        code = max(int(landing.trust[at]), int(cruise.trust[at]))
        rows.append([*row, TRUST[Trust(code)]])
    return tag("div", table(head, rows, cls="numbers stations"), cls="scroll")


def _station_cells(span: SpanResult, at: int) -> list[str]:
    if span.trust[at] == Trust.NOT_CONVERGED:
        return ["not found", "", "", ""]
    numbers = (span.lift[at], span.limit[at], span.room[at])
    return [
        words.reynolds(float(span.reynolds[at])),
        *(f"{value:.2f}".replace("-", words.MINUS) for value in numbers),
    ]


def risk_table(results: Results) -> Html:
    """Make the table of low-Reynolds-number risk along the half-wing."""
    rows: list[list[Part]] = [
        [
            risk.place,
            words.number(risk.y_m, "m"),
            words.reynolds(risk.reynolds),
            verdict(risk.level),
            risk.reason,
        ]
        for risk in results.landing.risks
    ]
    head = ["Place", "From the centre", "Reynolds number", "Risk", "Why"]
    return table(head, rows, cls="risks")


def section_facts(results: Results, index: int) -> Html:
    """Say what is known of a section, where from and how surely."""
    one = results.sections[index]
    middle = math.sqrt(one.landing_reynolds[0] * one.landing_reynolds[1])
    listed = [
        ("Used at", one.role),
        ("Polar", one.origin),
        ("Thickness", words.number(one.thickness_percent, "%")),
        ("Camber", _camber(one.camber_percent)),
        ("Zero-lift angle", words.number(one.zero_lift_angle_deg, "deg")),
        ("Moment about the quarter chord", words.number(one.moment_coefficient)),
        ("Reynolds numbers at landing", _re_span(one.landing_reynolds)),
        ("Reynolds numbers in cruise", _re_span(one.cruise_reynolds)),
        ("Largest lift at landing", _limit_words(results, index, middle)),
    ]
    return join(
        facts(listed),
        tag("p", tag("b", "Source: "), one.source, cls="source") if one.source else None,
        sentences(one.findings) if one.findings else None,
    )


def _camber(percent: float) -> str:
    """Write camber; what a symmetric outline has by rounding is none."""
    return "none" if abs(percent) < 0.005 else words.number(percent, "%")


def _re_span(ends: tuple[float, float]) -> str:
    if not all(math.isfinite(one) for one in ends):
        return words.NOT_FOUND
    return f"{words.reynolds(ends[0])} to {words.reynolds(ends[1])}"


def _limit_words(results: Results, index: int, reynolds: float) -> str:
    one = results.sections[index]
    if not (math.isfinite(reynolds) and one.limit_reynolds.size):
        return words.NOT_FOUND
    at = int(abs(one.limit_reynolds - reynolds).argmin())
    low, mid, high = (
        float(values[at])
        for values in (one.largest_lift_low, one.largest_lift, one.largest_lift_high)
    )
    sure = "" if one.limit_trust[at] == Trust.VALID else ", extrapolated"
    return f"{mid:.2f}, between {low:.2f} and {high:.2f}{sure}"


def cautions(order: Order) -> Html:
    """List what to be careful about."""
    said: dict[str, None] = {}
    for one in order.shown:
        lead = f"{one.letter}: " if order.compares else ""
        for sentence in one.results.cautions:
            said.setdefault(sentence)
        for sentence in one.oddities:
            said.setdefault(f"{lead}{sentence}")
    return section("cautions", "Cautions", sentences(list(said)))


def computed(order: Order) -> Html:
    """Say how it was computed, and what this file is."""
    rows: list[list[Part]] = []
    for one in order.shown:
        name = f"{one.letter} {one.name}" if order.compares else one.name
        rows.append([f"Inputs of {name}", "", tag("code", one.inputs_hash)])
        rows += [
            [path, f"{size:,} bytes", tag("code", digest)] for path, size, digest in one.tables
        ]
    return section(
        "computed",
        "How it was computed",
        tag(
            "p",
            f"Halfspan {order.version}, {order.made}. A lifting line whose sections follow their "
            "own polars at their own Reynolds numbers, with wing, tail and elevator trimmed "
            "together; stall where the first station reaches the knee of its section, in trim at "
            "the forward balance point. The methods and their sources come with Halfspan "
            "(docs/methods.md).",
        ),
        tag("div", table(["What", "Size", "Sha256"], rows, cls="hashes"), cls="scroll"),
        sentences(_file_sentences(order)),
        cls="small",
    )


def _file_sentences(order: Order) -> list[str]:
    held = "Its scenarios ride" if order.compares else "Its scenario rides"
    return [
        f"{held} inside this file, tables and all: halfspan open FILE reads it back.",
        "Nothing is loaded from anywhere: a policy in the file's head forbids it, and lists by "
        "hash the only scripts that may run. The drawing library needs to turn small scripts "
        "into functions ('unsafe-eval') and to write styles, which the policy allows.",
        "The same scenario and version give the same file apart from the time stated above.",
        "Solid lines are valid, dashed ones extrapolated, dotted ones indicative; a gap was not "
        "found. Hatched is what cannot be reached or is not allowed.",
    ]
