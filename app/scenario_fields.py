"""The inputs of a scenario as a flat list, for all that shows or documents them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import param

from app.scenario_groups import GROUPS


@dataclass(frozen=True)
class Field:
    """One input, as everything that lists inputs sees it.

    Parameters
    ----------
    group, name, label, unit : str
        Where it lives, its name in file and code, its name and unit on screen.
    kind : str
        ``"number"``, ``"choice"`` or ``"section"``.
    default : float or str
        Value of a new scenario.
    low, high, step : float
        Bounds (both allowed) and the step of a slider, in `unit`; NaN unless a
        number.
    choices : tuple of str
        What a choice allows; empty otherwise.
    help : str
        One sentence.
    """

    group: str
    name: str
    label: str
    unit: str
    kind: str
    default: float | str
    low: float
    high: float
    step: float
    choices: tuple[str, ...]
    help: str

    @property
    def requirement(self) -> str:
        """What is allowed, worded to follow "must be"."""
        if self.kind == "choice":
            return f"one of {', '.join(self.choices)}"
        if self.kind == "section":
            return "the name of a section: one the scenario has tables for, or NACA and its digits"
        unit = f" {self.unit}" if self.unit else ""
        return f"a number between {self.low:g} and {self.high:g}{unit}"


def _field(group: str, parameter: Any) -> Field:  # noqa: ANN401 - any kind of parameter
    metadata = parameter.metadata or {}
    low, high = getattr(parameter, "bounds", None) or (math.nan, math.nan)
    choices = tuple(parameter.objects) if isinstance(parameter, param.Selector) else ()
    default = parameter.default
    kind = "choice" if choices else "section" if metadata.get("section") else "number"
    return Field(
        group=group,
        name=parameter.name,
        label=parameter.label,
        unit=metadata.get("unit", ""),
        kind=kind,
        default=float(default) if kind == "number" else default,
        low=float(low),
        high=float(high),
        step=float(metadata.get("step", math.nan)),
        choices=choices,
        help=parameter.doc,
    )


FIELDS: dict[str, Field] = {
    name: _field(group, cls.param[name])
    for group, cls in GROUPS.items()
    for name in cls.__annotations__
}


def field_list() -> tuple[Field, ...]:
    """List every input in the order of the groups and of the file.

    Returns
    -------
    tuple of Field
        Names are unique over all groups.
    """
    return tuple(FIELDS.values())
