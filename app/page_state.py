"""What the page starts from, and what its parts are told: plain data."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from app.analysis.results import Margin
from app.figures import words
from app.scenario import Field
from app.sheets.sheet import FieldGroup
from solver.errors import InputError

_SIGNS = {"at least": "≥", "at most": "≤"}


def margin_tile(margin: Margin) -> dict[str, object]:
    """Give one margin as the strip shows it.

    Parameters
    ----------
    margin : Margin
        From the results.

    Returns
    -------
    dict
        Words; and value and band as distances from the limit over the limit,
        positive where it is met, None where they were not found.
    """
    sign = 1.0 if margin.sense == "at least" else -1.0
    scale = abs(margin.limit) or 1.0

    def share(value: float) -> float | None:
        return sign * (value - margin.limit) / scale if math.isfinite(value) else None

    found = math.isfinite(margin.value)
    room = words.part(margin.margin, margin.value, margin.unit, sign=True) if found else ""
    value, limit = words.number(margin.value, margin.unit), words.given(margin.limit, margin.unit)
    return {
        "key": margin.key,
        "label": margin.label,
        "value": value,
        "limit": f"{_SIGNS[margin.sense]} {limit}",
        "margin": room,
        "said": f"{margin.label} {value}, {margin.sense} {limit}, {margin.verdict}",
        "verdict": str(margin.verdict),
        "at": share(margin.value),
        "low": share(margin.low),
        "high": share(margin.high),
    }


def field_groups(
    groups: Sequence[FieldGroup], fields: Mapping[str, Field], section_names: Sequence[str]
) -> list[dict[str, object]]:
    """Give the column of inputs: headings and what each field needs to be drawn.

    Parameters
    ----------
    groups : sequence of FieldGroup
        Of the open sheet.
    fields : mapping of str to Field
        Every input by name.
    section_names : sequence of str
        Sections with tables, offered where a section is asked for.

    Returns
    -------
    list of dict
        One a heading.
    """
    return [
        {
            "title": group.title,
            "open": group.open,
            "fields": [_field(fields[name], section_names) for name in group.names],
        }
        for group in groups
    ]


def _field(field: Field, section_names: Sequence[str]) -> dict[str, object]:
    number = field.kind == "number"
    return {
        "name": field.name,
        "label": field.label,
        "unit": field.unit,
        "kind": field.kind,
        "low": field.low if number else 0.0,
        "high": field.high if number else 0.0,
        "step": field.step if number else 0.0,
        "choices": list(section_names if field.kind == "section" else field.choices),
        "help": field.help,
        "allowed": field.requirement,
    }


def refusal(error: InputError, label: str) -> str:
    """Say in one sentence why a value was refused.

    Parameters
    ----------
    error : InputError
        Of the scenario or the analysis.
    label : str
        What the screen calls the field.

    Returns
    -------
    str
        Names field, value and what is allowed.
    """
    value = error.value
    number = isinstance(value, (int, float)) and not isinstance(value, bool)
    said = words.given(float(value)) if number else f"“{str(value)[:60]}”"  # type: ignore[arg-type]
    return f"{label} must be {error.requirement}; got {said}."


def station_words(row: Mapping[str, Any]) -> str:
    """Say what is known at the station pointed at.

    Parameters
    ----------
    row : mapping
        One row of the station table.

    Returns
    -------
    str
        One line.
    """
    return (
        f"{words.number(row['y'], 'm')}: "
        f"chord {words.number(1e3 * row['chord'], 'mm')}, at landing "
        f"Re {words.reynolds(1e3 * row['re_landing'])}, "
        f"lift {words.number(row['lift_landing'])} of {words.number(row['limit_landing'])}"
    )
