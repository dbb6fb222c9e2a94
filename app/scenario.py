"""The scenario: the one thing that changes, and the door to everything computed.

Its groups of parameters are written in :mod:`app.scenario_groups`, the rules
between fields in :mod:`app.scenario_rules`. What is computed starts from
:meth:`Scenario.freeze`.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Mapping
from contextlib import ExitStack
from dataclasses import dataclass, field
from functools import lru_cache
from numbers import Real
from pathlib import Path
from typing import Any

import param
from param.parameterized import batch_call_watchers

from app.inputs import (
    BalanceInputs,
    BodyInputs,
    BriefInputs,
    Inputs,
    PropulsionInputs,
    SectionSource,
    SectionTables,
    TailInputs,
    WingInputs,
)
from app.scenario_fields import FIELDS, Field, field_list
from app.scenario_groups import GROUPS, Balance, Body, Brief, Propulsion, Tail, Wing
from app.scenario_rules import Oddity, oddities, require_rules
from solver.errors import InputError

__all__ = [
    "FIELDS",
    "GROUPS",
    "Balance",
    "Body",
    "Brief",
    "Field",
    "Propulsion",
    "Scenario",
    "SectionFiles",
    "TableFile",
    "Tail",
    "Wing",
    "field_list",
]

SECTION_FIELDS = ("root_section", "tip_section", "tail_section")

_NACA = re.compile(r"NACA[ -]?(\d+)", re.IGNORECASE)

_NACA_FOUR = re.compile(r"(00|[1-9][1-9])(0[1-9]|[1-3]\d|40)")
_NACA_FIVE = re.compile(r"[1-6]([1-5]0|[2-5]1)(0[1-9]|[1-3]\d|40)")


@dataclass(frozen=True)
class TableFile:
    """One table of a section: where it lies, and its text.

    Parameters
    ----------
    path : str
        Relative to the scenario's folder, with forward slashes.
    digest : str
        Sha256 of the text: what the table is, wherever it lies.
    text : str
        Word for word, with plain line feeds.
    """

    path: str
    digest: str
    text: str = field(repr=False, compare=False)

    def __str__(self) -> str:
        return self.path


@dataclass(frozen=True)
class SectionFiles:
    """One section of the scenario: the files of its tables and what they hold.

    Parameters
    ----------
    outline, lift, drag : TableFile
        The files.
    tables : SectionTables
        What was read from them.
    """

    outline: TableFile
    lift: TableFile
    drag: TableFile
    tables: SectionTables


def _typed(parameter: object) -> Any:  # noqa: ANN401 - a descriptor: reading it gives the value
    return parameter


class Scenario(param.Parameterized):
    """Everything the user sets.

    Parameters
    ----------
    name, author, note : str
        What it is called, by whom, and why. Plain text: escape it on a page.
    brief, wing, tail, body, balance, propulsion
        The groups; each field is a parameter of its group.
    sections : dict of str to SectionFiles
        Sections that have tables, by name.
    folder : pathlib.Path or None
        Where the paths in `sections` start.
    revision : int
        Rises by one after every change, once for each `set_values`: the one
        parameter to watch.
    """

    name: str = _typed(param.String(default="Untitled", constant=False, doc="Name."))
    author: str = _typed(param.String(default="", doc="By whom."))
    note: str = _typed(param.String(default="", doc="Why."))
    brief: Brief = _typed(param.ClassSelector(class_=Brief, constant=True))
    wing: Wing = _typed(param.ClassSelector(class_=Wing, constant=True))
    tail: Tail = _typed(param.ClassSelector(class_=Tail, constant=True))
    body: Body = _typed(param.ClassSelector(class_=Body, constant=True))
    balance: Balance = _typed(param.ClassSelector(class_=Balance, constant=True))
    propulsion: Propulsion = _typed(param.ClassSelector(class_=Propulsion, constant=True))
    sections: dict[str, SectionFiles] = _typed(
        param.Dict(default={}, doc="Sections with tables, by name.")
    )
    folder: Path | None = _typed(param.ClassSelector(class_=Path, allow_None=True))
    revision: int = _typed(param.Integer(default=0, doc="Rises by one after every change."))

    def __init__(self, **values: object) -> None:
        groups = {name: cls() for name, cls in GROUPS.items()}
        super().__init__(**groups, **values)  # type: ignore[no-untyped-call]
        self.source_text = ""
        """The file it was read from, word for word, so that its comments survive saving."""
        self._setting = False
        for name, cls in GROUPS.items():
            getattr(self, name).param.watch(self._changed, list(cls.__annotations__))
        self.param.watch(self._changed, ["name", "sections"])

    def _changed(self, *_events: param.parameterized.Event) -> None:
        if not self._setting:
            self.revision += 1

    def values(self) -> dict[str, float | str]:
        """Every field by name, in the order of :func:`field_list`."""
        found: dict[str, float | str] = {}
        for entry in FIELDS.values():
            value = getattr(getattr(self, entry.group), entry.name)
            found[entry.name] = float(value) if entry.kind == "number" else value
        return found

    def check(self, values: Mapping[str, object]) -> dict[str, float | str]:
        """Say whether values could be set, without setting them.

        Parameters
        ----------
        values : mapping of str to float or str
            Fields by name.

        Returns
        -------
        dict
            The same fields as they would be set: numbers as float, section
            names in their usual spelling.

        Raises
        ------
        InputError
            Naming the first field that is unknown, of the wrong type, out of
            range, or in contradiction to another.
        """
        usable = {name: self._usable(name, value) for name, value in values.items()}
        require_rules({**self.values(), **usable}, changed=tuple(usable))
        return usable

    def set_values(self, values: Mapping[str, object]) -> None:
        """Set any number of fields at once, or none of them.

        Parameters
        ----------
        values : mapping of str to float or str
            Fields by name, over all groups.

        Raises
        ------
        InputError
            As :meth:`check`; nothing is changed then.
        """
        usable = self.check(values)
        before = self.values()
        if all(before[name] == value for name, value in usable.items()):
            return
        self._setting = True
        try:
            with ExitStack() as held:
                groups = {name: getattr(self, FIELDS[name].group) for name in usable}
                # Watchers of any group run when every group holds its new values.
                for group in set(groups.values()):
                    held.enter_context(batch_call_watchers(group))
                for name, value in usable.items():
                    setattr(groups[name], name, value)
        finally:
            self._setting = False
        self.revision += 1

    def copy(self) -> Scenario:
        """Make another scenario, equal in everything; nothing watches it."""
        other = Scenario(
            name=self.name,
            author=self.author,
            note=self.note,
            sections=dict(self.sections),
            folder=self.folder,
        )
        other.source_text = self.source_text
        for group, cls in GROUPS.items():
            values = {name: getattr(getattr(self, group), name) for name in cls.__annotations__}
            getattr(other, group).param.update(**values)
        return other

    def section_names(self) -> tuple[str, ...]:
        """Sections that have tables, in the order of the file."""
        return tuple(self.sections)

    def oddities(self) -> tuple[Oddity, ...]:
        """Say what is allowed but rarely meant, one sentence each."""
        return oddities(self.values())

    def freeze(self) -> Inputs:
        """Take the values as they are now.

        Returns
        -------
        Inputs
            Frozen, hashable, equal by value.

        Raises
        ------
        InputError
            Naming the first field that is out of range, in contradiction to
            another, or a section that is neither NACA nor has tables.
        """
        values = self.check(self.values())
        root, tip, tail = (self._source(str(values[name])) for name in SECTION_FIELDS)

        def group(cls: type) -> dict[str, Any]:
            return {name: values[name] for name in cls.__annotations__}

        return Inputs(
            name=self.name,
            brief=BriefInputs(**group(Brief)),
            wing=WingInputs(**group(Wing)),
            tail=TailInputs(**group(Tail)),
            body=BodyInputs(**group(Body)),
            balance=BalanceInputs(**group(Balance)),
            propulsion=PropulsionInputs(**group(Propulsion)),
            sections=(root, tip, tail),
        )

    def _source(self, name: str) -> SectionSource:
        if name in self.sections:
            return SectionSource(name=name, kind="table", tables=self.sections[name].tables)
        return SectionSource.naca(name)

    def _usable(self, name: str, value: object) -> float | str:
        entry = FIELDS.get(name)
        if entry is None:
            raise InputError(name, value, f"the value of a known field{nearest(name)}")
        if entry.kind == "number":
            return _usable_number(entry, value)
        if entry.kind == "choice":
            if value not in entry.choices:
                raise InputError(name, value, entry.requirement)
            return str(value)
        return self._usable_section(entry, value)

    def _usable_section(self, entry: Field, value: object) -> str:
        known = ", ".join(self.sections) or "none here"
        requirement = f"NACA and its digits, or a section with tables ({known})"
        if not isinstance(value, str):
            raise InputError(entry.name, value, requirement)
        if value in self.sections:
            return value
        found = _NACA.fullmatch(value.strip())
        if not found:
            raise InputError(entry.name, value, requirement)
        return f"NACA {usable_digits(entry.name, found.group(1))}"


def _usable_number(entry: Field, value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, Real):
        raise InputError(entry.name, value, entry.requirement)
    try:
        number = float(value) + 0.0  # a negative zero becomes a plain one
    except OverflowError:
        number = math.inf
    if not (math.isfinite(number) and entry.low <= number <= entry.high):
        raise InputError(entry.name, value, entry.requirement)
    return number


def usable_digits(name: str, digits: str) -> str:
    """Refuse NACA digits for which no outline is defined.

    Parameters
    ----------
    name : str
        The field they were given for.
    digits : str
        What follows ``NACA``.

    Returns
    -------
    str
        The digits.

    Raises
    ------
    InputError
        If they are neither four nor five usable digits.
    """
    known = (_NACA_FOUR if len(digits) == 4 else _NACA_FIVE).fullmatch(digits)
    if known and not _folds(digits):
        return digits
    if known:
        requirement = "NACA and the digits of a section whose outline does not fold over itself"
    elif len(digits) == 4:
        requirement = (
            "NACA and four digits: camber and its place both 0 or both 1 to 9, "
            "thickness 01 to 40 percent"
        )
    elif len(digits) == 5:
        requirement = (
            "NACA and five digits: lift digit 1 to 6, camber place 1 to 5, "
            "0 for plain or 1 for reflexed (place 2 to 5), thickness 01 to 40 percent"
        )
    else:
        requirement = "NACA and four or five digits"
    raise InputError(name, f"NACA {digits}", requirement)


@lru_cache(maxsize=256)
def _folds(digits: str) -> bool:
    """Whether a section is so thick and bent at its nose that its surfaces cross."""
    from solver.section.geometry import naca_outline

    try:
        naca_outline(digits)
    except InputError:
        return True
    return False


def nearest(name: str, known: tuple[str, ...] | None = None) -> str:
    """Suggest a known name in brackets, or nothing when none is near.

    Parameters
    ----------
    name : str
        What was written.
    known : tuple of str, optional
        What there is; the fields of a scenario unless given.

    Returns
    -------
    str
        For example ``" (did you mean span_m?)"``.
    """
    names = known if known is not None else tuple(FIELDS)
    found = difflib.get_close_matches(str(name), names, n=1)
    return f" (did you mean {found[0]}?)" if found else ""
