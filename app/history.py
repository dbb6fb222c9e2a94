"""Undo and redo over everything a scenario holds.

A history is a line of states and a place on it. Moves of one input that follow
each other closely are one step, so that a drag of a slider is undone at once.
It knows neither the page nor the scenario's file.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

from app.scenario import FIELDS, Field, Scenario, SectionFiles

MOST_STEPS = 200
MERGE_WITHIN = 1.0
"""Longest pause between two moves of one input that are one step [s]."""

MOST_NAMED = 2
TEXTS = ("name", "author", "note")
PROPER_NAMES = ("Peukert",)


@dataclass(frozen=True)
class State:
    """Everything that can be undone.

    Parameters
    ----------
    values : dict of str to float or str
        Every field by name.
    texts : dict of str to str
        Name, author and note.
    sections : dict of str to SectionFiles
        Sections with tables.
    """

    values: Mapping[str, float | str]
    texts: Mapping[str, str]
    sections: Mapping[str, SectionFiles] = field(default_factory=dict)

    def changes(self, other: State) -> frozenset[str]:
        """Name what another state holds otherwise: fields, texts, ``sections``."""
        found = {name for name, value in self.values.items() if other.values.get(name) != value}
        found |= {name for name, value in self.texts.items() if other.texts.get(name) != value}
        if dict(self.sections) != dict(other.sections):
            found.add("sections")
        return frozenset(found)


def state_of(scenario: Scenario) -> State:
    """Take the state of a scenario as it is now.

    Parameters
    ----------
    scenario : Scenario

    Returns
    -------
    State
        Nothing that happens to the scenario changes it.
    """
    return State(
        values=scenario.values(),
        texts={name: getattr(scenario, name) for name in TEXTS},
        sections=dict(scenario.sections),
    )


def apply(state: State, scenario: Scenario) -> None:
    """Bring a scenario into a state.

    Parameters
    ----------
    state : State
        Of this scenario, now or earlier.
    scenario : Scenario
        What is changed.

    Raises
    ------
    InputError
        If the scenario refuses a value; nothing is changed then.
    """
    before = dict(scenario.sections)
    wanted = dict(state.sections)
    if wanted != before:
        # A section may be named before and after: both have to be there meanwhile.
        scenario.sections = {**before, **wanted}
    try:
        scenario.set_values(state.values)
    except Exception:
        if wanted != before:
            scenario.sections = before
        raise
    if dict(scenario.sections) != wanted:
        scenario.sections = wanted
    for name, text in state.texts.items():
        if getattr(scenario, name) != text:
            setattr(scenario, name, text)


class History:
    """States one after another, and the one that holds now.

    Parameters
    ----------
    state : State
        The first.
    most : int
        Steps that can be undone; older ones are forgotten.
    merge_within : float
        Longest pause between two moves of the same input that are one step [s].
    clock : callable
        Seconds that only rise.
    """

    def __init__(
        self,
        state: State,
        *,
        most: int = MOST_STEPS,
        merge_within: float = MERGE_WITHIN,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self._states = [state]
        self._place = 0
        self._most, self._merge_within, self._clock = most, merge_within, clock
        self._moving: frozenset[str] = frozenset()
        self._moved = 0.0

    @property
    def state(self) -> State:
        """The state that holds now."""
        return self._states[self._place]

    def record(self, state: State) -> None:
        """Take note of a change that was made; what was undone before is forgotten.

        Parameters
        ----------
        state : State
            After the change; one that equals the present is no change.
        """
        changed = self.state.changes(state)
        if not changed:
            return
        now = self._clock()
        # One input only: two at once come from a button, and that is a step by itself.
        joins = (
            len(changed) == 1
            and changed == self._moving
            and now - self._moved <= self._merge_within
        )
        before = self._states[: self._place if joins else self._place + 1]
        self._moving, self._moved = changed, now
        if joins and not before[-1].changes(state):
            self._moving = frozenset()  # back where the moves began: no step at all
            self._states = before
        else:
            self._states = [*before, state][-self._most - 1 :]
        self._place = len(self._states) - 1

    def break_step(self) -> None:
        """End the present step: the next change is one by itself."""
        self._moving = frozenset()

    def amend(self, state: State) -> None:
        """Take the present state for another that means the same, which is no step.

        Parameters
        ----------
        state : State
            For example with other paths of its tables, after they were saved.
        """
        self._states[self._place] = state

    def undo(self) -> State | None:
        """Go one step back.

        Returns
        -------
        State or None
            The state that holds now; None where there is nothing to undo.
        """
        return self._step(-1)

    def redo(self) -> State | None:
        """Go one step forward again.

        Returns
        -------
        State or None
            The state that holds now; None where there is nothing to redo.
        """
        return self._step(1)

    def _step(self, by: int) -> State | None:
        self.break_step()
        if not 0 <= self._place + by < len(self._states):
            return None
        self._place += by
        return self.state

    @property
    def undo_label(self) -> str:
        """What undo would take back, for example ``Undo span 2.40 to 2.45 m``; or empty."""
        if self._place == 0:
            return ""
        return f"Undo {described(self._states[self._place - 1], self.state)}"

    @property
    def redo_label(self) -> str:
        """What redo would do again, in the same words; or empty."""
        if self._place + 1 == len(self._states):
            return ""
        return f"Redo {described(self.state, self._states[self._place + 1])}"


def described(before: State, after: State) -> str:
    """Say what changed from one state to another, short enough for a button.

    Parameters
    ----------
    before, after : State

    Returns
    -------
    str
        For example ``span 2.40 to 2.45 m``; plain text, to be escaped on a page.
    """
    changed = before.changes(after)
    order = [*FIELDS, "sections", *TEXTS]
    names = [name for name in order if name in changed]
    if len(names) == 1:
        return _one(names[0], before, after)
    said = [_label(name) for name in names]
    if len(said) > MOST_NAMED + 1:
        said = [*said[:MOST_NAMED], f"{len(said) - MOST_NAMED} more"]
    return f"{', '.join(said[:-1])} and {said[-1]}" if said else "nothing"


def _one(name: str, before: State, after: State) -> str:
    if name == "sections":
        was, now = before.sections, after.sections
        touched = sorted(one for one in {**was, **now} if was.get(one) != now.get(one))
        return f"tables of {_cut(', '.join(touched))}"
    if name == "note":
        return "note"
    if name in TEXTS:
        return f"{name} {_cut(before.texts[name])} to {_cut(after.texts[name])}"
    entry = FIELDS[name]
    old, new = _values(entry, before.values[name], after.values[name])
    unit = f" {entry.unit}" if entry.unit else ""
    return f"{_label(name)} {old} to {new}{unit}"


def _label(name: str) -> str:
    if name not in FIELDS:
        return {"sections": "tables"}.get(name, name)
    label = FIELDS[name].label
    return label if label.startswith(PROPER_NAMES) else label[:1].lower() + label[1:]


def _values(entry: Field, before: float | str, after: float | str) -> tuple[str, str]:
    if entry.kind != "number":
        return _cut(str(before)), _cut(str(after))
    # As many decimals as the slider's step has, or as were typed.
    decimals = max(_decimals(float(value)) for value in (before, after, entry.step))
    return f"{float(before):.{decimals}f}", f"{float(after):.{decimals}f}"


def _decimals(number: float) -> int:
    return len(f"{number:.5f}".rstrip("0").partition(".")[2])


def _cut(text: str) -> str:
    return text if len(text) <= 30 else f"{text[:27]}..."
