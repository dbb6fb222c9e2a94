"""Tables of a report as CSV: stations of the half-wing, and curves of the sections."""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Iterable, Sequence

from app.analysis.results import Origin, Results, Trust

_TRUST = {code: code.name.lower().replace("_", " ") for code in Trust}
_ORIGIN = {code: code.name.lower() for code in Origin}


def station_csv(results: Results) -> str:
    """Write what is known at each station, at landing and in cruise.

    Parameters
    ----------
    results : Results
        With both flights.

    Returns
    -------
    str
        CSV with a heading that carries the units; a value not found is empty.
    """
    head = ["condition", "y_m", "chord_m", "reynolds", "angle_deg", "lift_coefficient"]
    head += ["limit_low", "limit", "limit_high", "room", "drag_coefficient", "loading", "trust"]
    rows = []
    for span in (results.landing.landing_span, results.cruise.span):
        columns = [span.y_m, span.chord_m, span.reynolds, span.angle_deg, span.lift]
        columns += [span.limit_low, span.limit, span.limit_high, span.room, span.drag]
        for at, code in enumerate(span.trust):
            numbers = [float(column[at]) for column in (*columns, span.loading)]
            rows.append([span.condition, *map(_number, numbers), _TRUST[Trust(int(code))]])
    return _text(head, rows)


def polar_csv(results: Results) -> str:
    """Write the sections' curves at the Reynolds numbers that this wing meets.

    Parameters
    ----------
    results : Results
        With sections.

    Returns
    -------
    str
        CSV with a heading that carries the units.
    """
    head = ["role", "section", "reynolds", "angle_deg", "lift_coefficient"]
    head += ["drag_coefficient", "moment_coefficient", "origin_of_lift", "trust"]
    rows = []
    for section in results.sections:
        for curve in section.curves:
            for at, angle in enumerate(curve.angle_deg):
                numbers = [curve.reynolds, float(angle)]
                numbers += [float(one[at]) for one in (curve.lift, curve.drag, curve.moment)]
                words = [
                    _ORIGIN[Origin(int(curve.origin[at]))],
                    _TRUST[Trust(int(curve.trust[at]))],
                ]
                rows.append([_cell(section.role), _cell(section.name), *map(_number, numbers)])
                rows[-1] += words
    return _text(head, rows)


def _number(value: float) -> str:
    return f"{value:.6g}" if math.isfinite(value) else ""


def _cell(text: str) -> str:
    """Keep a spreadsheet from taking a text for a formula."""
    return f"'{text}" if text[:1] in "=+-@\t\r" else text


def _text(head: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\r\n")
    writer.writerow(head)
    writer.writerows(rows)
    return stream.getvalue()


def file_name(name: str, what: str) -> str:
    """Make a plain file name from a scenario's name.

    Parameters
    ----------
    name : str
        Any text.
    what : str
        What the file holds.

    Returns
    -------
    str
        Letters, digits and hyphens, ending in ``.csv``.
    """
    plain = re.sub(r"[^a-z0-9]+", "-", name.lower()).strip("-")[:60] or "halfspan"
    return f"{plain}-{what}.csv"
