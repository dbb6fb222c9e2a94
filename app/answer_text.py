"""An analysis as text for a terminal: margins, reasons, figures, cautions."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterator, Sequence

from app.analysis.results import Margin, Results, Trust, Verdict

NOT_FOUND = "not found"

_TRUST_WORDS = {
    Trust.VALID: "",
    Trust.EXTRAPOLATED: "extrapolated",
    Trust.INDICATIVE: "indicative only",
}


def answer_text(results: Results, *, oddities: Sequence[str] = (), width: int = 92) -> str:
    """Word an analysis: margin table, reasons, main figures, cautions.

    Parameters
    ----------
    results : Results
        What was found.
    oddities : sequence of str
        Sentences about inputs that are allowed but rarely meant; they join the
        cautions.
    width : int
        Columns at which sentences are folded. Tables keep their own width.

    Returns
    -------
    str
        Lines without a trailing newline.
    """
    cautions = [*results.cautions, *oddities]
    parts = [
        f"{results.name}: {_summary(results.margins)}",
        _margin_table(results.margins),
        "Reasons\n" + "\n".join(_reasons(results, width)),
        "Main figures\n" + "\n".join(_aligned(list(_figures(results)))),
    ]
    if cautions:
        parts.append("Be careful\n" + "\n".join(_folded(text, width) for text in cautions))
    return "\n\n".join(parts)


def _summary(margins: Sequence[Margin]) -> str:
    failing = sum(margin.verdict is Verdict.FAIL for margin in margins)
    watched = sum(margin.verdict is Verdict.WATCH for margin in margins)
    if failing:
        return f"{failing} of {len(margins)} requirements {'fails' if failing == 1 else 'fail'}"
    if watched:
        return f"no requirement fails, {watched} of {len(margins)} to watch"
    return f"all {len(margins)} requirements are met"


def decimals(value: float) -> int:
    """Count the decimals that show a value with three significant figures.

    Parameters
    ----------
    value : float
        Finite. [any]

    Returns
    -------
    int
        0 to 6.
    """
    if value == 0.0:
        return 2
    # The exponent after rounding: 9.999 is shown as 10.0.
    return min(max(2 - int(f"{value:.2e}"[-3:]), 0), 6)


def number(value: float, unit: str = "", *, places: int | None = None) -> str:
    """Show a value with three significant figures and its unit.

    Parameters
    ----------
    value : float
        NaN is shown as not found. [`unit`]
    unit : str
        Appended after a space unless empty.
    places : int, optional
        Decimals to show instead.

    Returns
    -------
    str
        For example ``1.38`` or ``117 W``.
    """
    if not math.isfinite(value):
        return NOT_FOUND
    shown = f"{value:.{decimals(value) if places is None else places}f}"
    if float(shown) == 0.0:
        shown = shown.removeprefix("-")
    return f"{shown} {unit}".rstrip()


def _margin_table(margins: Sequence[Margin]) -> str:
    rows = [("Requirement", "Value", "Band", "Limit", "Margin", "Verdict")]
    rows += [_margin_row(margin) for margin in margins]
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]))]
    lines = []
    for row in rows:
        cells = [
            cell.ljust(wide) if column in (0, 3, 5) else cell.rjust(wide)
            for column, (cell, wide) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append("  ".join(cells).rstrip())
    return "\n".join(lines)


def _margin_row(margin: Margin) -> tuple[str, str, str, str, str, str]:
    unit = margin.unit
    limit = f"{margin.sense} {margin.limit:g} {unit}".rstrip()
    if not math.isfinite(margin.value):
        return margin.label, NOT_FOUND, "", limit, "", str(margin.verdict)
    places = decimals(margin.value)
    band = ""
    if math.isfinite(margin.low) and math.isfinite(margin.high) and margin.low != margin.high:
        band = f"{number(margin.low, places=places)} to {number(margin.high, places=places)}"
    return (
        margin.label,
        number(margin.value, unit),
        band,
        limit,
        _signed(margin.margin, places, unit),
        str(margin.verdict),
    )


def _signed(value: float, places: int, unit: str) -> str:
    """Show a margin with its sign, never rounded to nothing."""
    if not math.isfinite(value):
        return ""
    while value != 0.0 and places < 9 and float(f"{value:.{places}f}") == 0.0:
        places += 1
    return f"{value:+.{places}f} {unit}".rstrip()


def _folded(text: str, width: int, *, lead: str = "") -> str:
    return textwrap.fill(
        f"{lead}{text}",
        width,
        initial_indent="  ",
        subsequent_indent="    ",
        break_on_hyphens=False,
    )


def _reasons(results: Results, width: int) -> Iterator[str]:
    # The summary may quote one of the reasons below.
    if not any(margin.reason and margin.reason in results.reason for margin in results.margins):
        yield _folded(results.reason, width)
    for margin in results.margins:
        if margin.reason:
            yield _folded(margin.reason, width, lead=f"{margin.label} ({margin.verdict}): ")


def _aligned(rows: Sequence[tuple[str, str]]) -> list[str]:
    wide = max(len(label) for label, _ in rows)
    return [f"  {label:<{wide}}  {value}" for label, value in rows]


def _trusted(text: str, trust: Trust) -> str:
    if trust == Trust.NOT_CONVERGED:
        return NOT_FOUND
    words = _TRUST_WORDS[Trust(trust)]
    return f"{text} ({words})" if words else text


def _figures(results: Results) -> Iterator[tuple[str, str]]:
    yield from _landing_figures(results)
    yield from _cruise_figures(results)
    planform, balance = results.planform, results.balance
    yield (
        "Balance point, neutral point",
        _several("% of mean chord", balance.balance_percent, balance.neutral_point_percent),
    )
    yield (
        "Elevator in cruise, at landing with balance forward",
        _several(
            "deg", balance.elevator_cruise_deg, balance.elevator_landing_forward_deg, places=1
        ),
    )
    yield "Wing area", number(planform.area_m2, "m²")
    yield "Aspect ratio", number(planform.aspect_ratio)
    yield "Wing loading", number(planform.wing_loading_n_m2, "N/m²")
    yield "Air density at the field", number(results.air.density_kg_m3, "kg/m³")


def _landing_figures(results: Results) -> Iterator[tuple[str, str]]:
    landing = results.landing
    stall = number(landing.stall_speed_m_s, "m/s")
    low, high = sorted((landing.stall_speed_low_m_s, landing.stall_speed_high_m_s))
    if all(math.isfinite(speed) for speed in (low, landing.stall_speed_m_s, high)):
        places = decimals(landing.stall_speed_m_s)
        stall += f", {number(low, places=places)} to {number(high, places=places)}"
    yield "Stall speed in trim", _trusted(stall, landing.trust)
    yield "Stall begins", _trusted(landing.onset_words or NOT_FOUND, landing.trust)
    onset = number(landing.onset_lift_coefficient)
    yield "Lift coefficient there", _trusted(onset, landing.trust)
    for section in results.sections:
        low, high = section.landing_reynolds
        known = math.isfinite(low) and math.isfinite(high)
        span = f"{_rounded(low):,} to {_rounded(high):,}" if known else NOT_FOUND
        label = f"Reynolds numbers at landing, {section.role}"
        yield label, f"{span} ({section.name}, {section.origin})"


def _cruise_figures(results: Results) -> Iterator[tuple[str, str]]:
    cruise, drag = results.cruise, results.cruise.drag
    rows = (
        ("Lift over drag", number(cruise.lift_to_drag)),
        ("Drag", number(drag.total, "N")),
        (
            "  induced, profile, body, trim",
            _several(
                "N", drag.induced, drag.profile, drag.body, drag.trim_induced + drag.trim_profile
            ),
        ),
        ("Electric power", number(cruise.electric_power_w, "W")),
    )
    yield "Cruise at", number(cruise.speed_m_s, "m/s")
    for label, value in rows:
        yield f"  {label}", _trusted(value, cruise.trust)


def _rounded(value: float) -> int:
    """Round to three significant figures."""
    return int(float(f"{value:.2e}"))


def _several(unit: str, *values: float, places: int | None = None) -> str:
    """Show values side by side, all with the same decimals: those of the largest."""
    if places is None:
        finite = [abs(value) for value in values if math.isfinite(value)]
        places = min(decimals(max(finite)), 3) if finite else 0
    return f"{', '.join(number(value, places=places) for value in values)} {unit}"
