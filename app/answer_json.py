"""An analysis as one JSON object whose keys carry their units.

The keys are those of the results' fields; docs/command-line.md lists them all.
What could not be found is null: JSON has no NaN.
"""

from __future__ import annotations

import json
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import fields
from enum import IntEnum, StrEnum
from typing import Any

from app.analysis.results import DragParts, Margin, Results, TrimResult, Verdict

FORMAT = 1
"""Rises when a key is renamed, removed or changes its meaning."""

_UNIT_SUFFIXES = {"": "", "%": "_percent", "W": "_w", "h": "_h", "m": "_m", "m/s": "_m_s"}

_SECTION_KEYS = (
    "role",
    "name",
    "origin",
    "source",
    "thickness_percent",
    "camber_percent",
    "leading_edge_radius_percent",
    "zero_lift_angle_deg",
    "moment_coefficient",
    "unknown_reynolds",
    "landing_reynolds",
    "cruise_reynolds",
    "findings",
)


_PLAIN_TYPES = frozenset(
    {"float", "int", "bool", "str", "str | None", "float | None", "tuple[str, ...]"}
    | {"tuple[float, float]", "Trust", "Verdict"}
)


def answer_json(results: Results, *, version: str, oddities: Sequence[str] = ()) -> str:
    """Write an analysis as JSON.

    Parameters
    ----------
    results : Results
        What was found.
    version : str
        Halfspan's version, stated in the object.
    oddities : sequence of str
        Sentences about inputs that are allowed but rarely meant.

    Returns
    -------
    str
        One JSON object, indented.
    """
    return json.dumps(
        answer(results, version=version, oddities=oddities), indent=2, allow_nan=False
    )


def answer(results: Results, *, version: str, oddities: Sequence[str] = ()) -> dict[str, Any]:
    """Collect what the JSON object says.

    Parameters
    ----------
    results : Results
        What was found.
    version : str
        Halfspan's version.
    oddities : sequence of str
        Sentences about inputs that are allowed but rarely meant.

    Returns
    -------
    dict
        Of strings, numbers, booleans, None, lists and dicts.
    """
    verdicts = {margin.verdict for margin in results.margins}
    worst = next((v for v in (Verdict.FAIL, Verdict.WATCH) if v in verdicts), Verdict.PASS)
    return {
        "halfspan": version,
        "format": FORMAT,
        "name": results.name,
        "verdict": str(worst),
        "reason": results.reason,
        "cautions": list(results.cautions),
        "oddities": list(oddities),
        "margins": {margin_key(margin): _margin(margin) for margin in results.margins},
        "air": _scalars(results.air),
        "planform": _scalars(results.planform),
        "cruise": _trim(results.cruise),
        "landing": _scalars(results.landing),
        "balance": _scalars(results.balance),
        "sections": [
            {key: _plain(getattr(section, key)) for key in _SECTION_KEYS}
            for section in results.sections
        ],
        "risks": [_scalars(risk) for risk in results.landing.risks],
        "inputs": {name: _plain(value) for name, value in results.inputs.items()},
        "solver_ms": _plain(results.solver_ms),
    }


def margin_key(margin: Margin) -> str:
    """Name a requirement with the unit of its value.

    Parameters
    ----------
    margin : Margin
        One requirement.

    Returns
    -------
    str
        For example ``cruise_power_w``.
    """
    suffix = _UNIT_SUFFIXES.get(margin.unit)
    if suffix is None:
        suffix = "_" + re.sub(r"\W+", "_", margin.unit).strip("_")
    return margin.key if margin.key.endswith(suffix) else margin.key + suffix


def _margin(margin: Margin) -> dict[str, Any]:
    return {
        "label": margin.label,
        "verdict": str(margin.verdict),
        **{
            key: _plain(getattr(margin, key)) for key in ("value", "low", "high", "limit", "margin")
        },
        "sense": margin.sense,
        "reason": margin.reason,
    }


def _trim(trim: TrimResult) -> dict[str, Any]:
    drag = {f"{entry.name}_drag_n": getattr(trim.drag, entry.name) for entry in fields(DragParts)}
    return {
        **_scalars(trim),
        **{key: _plain(value) for key, value in drag.items()},
        "total_drag_n": _plain(trim.drag.total),
    }


def _scalars(result: Any) -> dict[str, Any]:  # noqa: ANN401 - any of the results' dataclasses
    """Take the numbers, words and lists of words; leave arrays and what is nested.

    By the fields' types, not their values, so that the keys are always the same.
    """
    return {
        entry.name: _plain(getattr(result, entry.name))
        for entry in fields(result)
        if str(entry.type) in _PLAIN_TYPES
    }


def _plain(value: Any) -> Any:  # noqa: ANN401 - whatever a result may hold
    if isinstance(value, IntEnum):
        return value.name.lower()
    if isinstance(value, StrEnum):
        return str(value)
    if isinstance(value, (tuple, list)):
        return [_plain(one) for one in value]
    if isinstance(value, Mapping):
        return {str(key): _plain(one) for key, one in value.items()}
    if value is None or isinstance(value, (str, bool, int)):
        return value
    # NumPy's scalars are not all floats to the writer of JSON.
    number = float(value)
    return number if math.isfinite(number) else None
