"""A computed section polar as CSV: what made it, then a row a point."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from solver.section.flow import PointStatus, SectionFlow
from solver.section.geometry import Outline

COLUMNS = (
    "reynolds",
    "angle_deg",
    "cl",
    "cd",
    "cm",
    "transition_upper",
    "transition_lower",
    "status",
)
CAUTION = "computed, not measured: a sizing aid, verify by test"


@dataclass(frozen=True)
class MadeBy:
    """What a file says about how it came to be, beside the flow's own settings.

    Fields
    ------
    version : str
        Halfspan's.
    solver : str
        Version of the section solver, changed by any of its sources.
    outline : str
        What the outline is and where it came from.
    digest : str
        Of its coordinates, see `outline_digest`.
    turbulence : float
        Turbulence level that goes with the critical amplification factor [-].
    flap : sequence of float, or None
        Hinge as a share of chord, deflection in degrees, down positive.
    """

    version: str
    solver: str
    outline: str
    digest: str
    turbulence: float
    flap: Sequence[float] | None


def outline_digest(outline: Outline) -> str:
    """Name the shape of an outline.

    Parameters
    ----------
    outline : Outline

    Returns
    -------
    str
        Sha256, in hexadecimal, of its points on lines ``x,y`` with six decimals:
        chord 1, from the trailing edge over the upper surface.
    """
    points = zip(outline.x, outline.y, strict=True)
    text = "".join(f"{_plain(x, 6)},{_plain(y, 6)}\n" for x, y in points)
    return hashlib.sha256(text.encode()).hexdigest()


def section_csv(flow: SectionFlow, made_by: MadeBy) -> str:
    """Write a section's flow as CSV.

    Parameters
    ----------
    flow : SectionFlow
    made_by : MadeBy

    Returns
    -------
    str
        Comment lines, headings and a row for each Reynolds number and angle, both
        ascending. Empty cells where there is no value.
    """
    lines = [f"# {one}" for one in _comments(flow, made_by)]
    lines.append(",".join(COLUMNS))
    words = status_words()
    for j, reynolds in enumerate(flow.reynolds):
        for i, angle in enumerate(np.degrees(flow.angle)):
            values = (
                _cell(flow.lift[i, j], 4),
                _cell(flow.drag[i, j], 5),
                _cell(flow.moment[i, j], 4),
                _cell(flow.transition_upper[i, j], 4),
                _cell(flow.transition_lower[i, j], 4),
            )
            row = (f"{reynolds:.10g}", trimmed(angle), *values, words[int(flow.status[i, j])])
            lines.append(",".join(row))
    return "\n".join(lines) + "\n"


def status_words() -> dict[int, str]:
    """Words for how a point ended, by its number."""
    return {int(one): one.name.lower().replace("_", " ") for one in PointStatus}


def trimmed(value: float) -> str:
    """Write a number with up to six decimals, without zeros at its end."""
    text = _plain(value, 6)
    return text.rstrip("0").rstrip(".") if "." in text else text


def _cell(value: float, decimals: int) -> str:
    return _plain(value, decimals) if np.isfinite(value) else ""


def _plain(value: float, decimals: int) -> str:
    """A number without an exponent and without a sign on zero."""
    text = f"{value:.{decimals}f}"
    return text.lstrip("-") if float(text) == 0.0 else text


def _comments(flow: SectionFlow, made_by: MadeBy) -> list[str]:
    counts = ", ".join(
        f"{int(np.count_nonzero(flow.status == number))} {word}"
        for number, word in status_words().items()
    )
    trips = [
        f"{side} surface {f'forced at {trimmed(place)} chord' if place is not None else 'natural'}"
        for side, place in (
            ("upper", flow.settings.trip_upper),
            ("lower", flow.settings.trip_lower),
        )
    ]
    flap = "none"
    if made_by.flap is not None:
        hinge, deflection = made_by.flap
        flap = f"hinge at {trimmed(hinge)} chord, {trimmed(deflection)} deg, down positive"
    return [
        f"Halfspan {made_by.version}, section solver {made_by.solver}",
        CAUTION,
        f"outline: {made_by.outline}; sha256 of its coordinates {made_by.digest}",
        f"critical amplification factor {flow.settings.critical_amplification:.4g}, "
        f"which goes with a turbulence level of {100.0 * made_by.turbulence:.2g} percent",
        f"transition: {', '.join(trips)}",
        f"flap: {flap}",
        f"points: {counts}",
        "cm about the quarter chord, nose up positive; transition as a share of chord",
    ]
