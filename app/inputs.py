"""What an analysis is given: the scenario's values, frozen.

A tree of frozen dataclasses, one per group of the scenario, equal and hashable
by value; measured tables take part by the hash of their content. Field names
are those of the scenario and of its file, with their unit at the end. Whoever
needs a default, a bound or a label asks :mod:`app.scenario`.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterator
from dataclasses import dataclass, field, fields
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from solver.section.sweeps import Sweep

FloatArray = NDArray[np.float64]

NACA_NAME = re.compile(r"NACA (\d{4,5})")


@dataclass(frozen=True)
class BriefInputs:
    """The mission and its limits."""

    mass_kg: float
    cruise_speed_m_s: float
    landing_speed_m_s: float
    launch_method: str
    launch_speed_m_s: float
    landing_method: str
    field_altitude_m: float
    temperature_offset_K: float  # noqa: N815 - the unit's symbol
    headwind_m_s: float
    airspeed_error_m_s: float
    landing_over_stall_min: float
    launch_over_stall_min: float
    static_margin_min_percent: float
    elevator_left_min_percent: float
    cruise_power_max_w: float
    endurance_min_h: float
    span_max_m: float


@dataclass(frozen=True)
class WingInputs:
    """The wing."""

    span_m: float
    root_chord_mm: float
    tip_chord_mm: float
    washout_deg: float
    dihedral_deg: float
    sweep_deg: float
    root_section: str
    tip_section: str
    finish: str
    build_drag_factor: float


@dataclass(frozen=True)
class TailInputs:
    """The horizontal tail and its elevator."""

    tail_area_m2: float
    tail_arm_m: float
    tail_aspect_ratio: float
    tail_taper: float
    tail_height_m: float
    tail_incidence_deg: float
    elevator_chord_percent: float
    elevator_travel_deg: float
    hinge_gap_debit_percent: float
    tail_section: str


@dataclass(frozen=True)
class BodyInputs:
    """The body; a length, width or nose of 0 is one that was not given."""

    body_length_mm: float
    body_width_mm: float
    body_nose_mm: float
    body_drag_area_m2: float


@dataclass(frozen=True)
class BalanceInputs:
    """The balance point and the furthest forward it may lie."""

    balance_percent: float
    balance_forward_percent: float


@dataclass(frozen=True)
class PropulsionInputs:
    """Battery, motor and propeller; a propeller share of 0 was not given."""

    battery_wh: float
    usable_percent: float
    propulsive_efficiency: float
    avionics_w: float
    peukert_exponent: float
    thrust_line_offset_mm: float
    propeller_share_percent: float


@dataclass(frozen=True, eq=False)
class SectionTables:
    """The measured tables of one section: read-only, equal when their content is.

    Parameters
    ----------
    outline_name : str
        The name that the outline's table gives.
    outline : numpy.ndarray, shape (n, 2)
        Coordinates as read: x and y, in any unit of length. [-]
    lift, drag : tuple of Sweep
        The wind-tunnel runs as read, whose arrays are read-only by themselves;
        either may be empty.
    source : str
        What the tables say about where they come from.
    digest : str
        Sha256 of all of it, found here.
    """

    outline_name: str
    outline: FloatArray
    lift: tuple[Sweep, ...]
    drag: tuple[Sweep, ...]
    source: str = ""
    digest: str = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "outline", _read_only(self.outline))
        object.__setattr__(self, "lift", tuple(self.lift))
        object.__setattr__(self, "drag", tuple(self.drag))
        content = hashlib.sha256(repr((self.outline_name, self.source)).encode())
        _hash_array(content, self.outline)
        for kind, runs in (("lift", self.lift), ("drag", self.drag)):
            for run in runs:
                content.update(kind.encode())
                _hash_sweep(content, run)
        object.__setattr__(self, "digest", content.hexdigest())

    def __eq__(self, other: object) -> bool:
        return isinstance(other, SectionTables) and self.digest == other.digest

    def __hash__(self) -> int:
        return hash(self.digest)


@dataclass(frozen=True)
class SectionSource:
    """Where the outline and the polar of one section come from.

    Parameters
    ----------
    name : str
        As the scenario names it.
    kind : str
        ``"naca"``: closed form from `digits`, polar estimated. ``"table"``:
        `tables` hold an outline and measured runs.
    digits : str
        The four or five digits, or empty.
    tables : SectionTables or None
        Present when `kind` is ``"table"``.
    """

    name: str
    kind: str
    digits: str = ""
    tables: SectionTables | None = None

    @classmethod
    def naca(cls, name: str) -> SectionSource:
        """Make a closed-form section from a name such as ``NACA 0009``."""
        found = NACA_NAME.fullmatch(name)
        return cls(name=name, kind="naca", digits=found.group(1) if found else "")


@dataclass(frozen=True)
class Inputs:
    """Everything one analysis depends on; equal and hashable by value.

    Parameters
    ----------
    name : str
        The scenario's name.
    brief, wing, tail, body, balance, propulsion
        The groups.
    sections : tuple of SectionSource
        Of the wing's root, the wing's tip and the tail, in this order.
    """

    name: str
    brief: BriefInputs
    wing: WingInputs
    tail: TailInputs
    body: BodyInputs
    balance: BalanceInputs
    propulsion: PropulsionInputs
    sections: tuple[SectionSource, SectionSource, SectionSource]

    @property
    def root_source(self) -> SectionSource:
        """The section at the wing's root."""
        return self.sections[0]

    @property
    def tip_source(self) -> SectionSource:
        """The section at the wing's tip."""
        return self.sections[1]

    @property
    def tail_source(self) -> SectionSource:
        """The section of the tail."""
        return self.sections[2]

    def values(self) -> dict[str, float | str]:
        """Every field of every group by its name, in the scenario's order."""
        return dict(self._pairs())

    def _pairs(self) -> Iterator[tuple[str, float | str]]:
        for group in (
            self.brief,
            self.wing,
            self.tail,
            self.body,
            self.balance,
            self.propulsion,
        ):
            for entry in fields(group):
                yield entry.name, getattr(group, entry.name)


def _read_only(array: FloatArray) -> FloatArray:
    copy = np.array(array, dtype=np.float64)
    copy.setflags(write=False)
    return copy


def _hash_array(content: hashlib._Hash, array: FloatArray) -> None:
    content.update(repr(array.shape).encode())
    # Adding zero makes -0.0 and 0.0, which are equal, hash alike.
    content.update((np.ascontiguousarray(array, dtype="<f8") + 0.0).tobytes())


def _hash_sweep(content: hashlib._Hash, run: Sweep) -> None:
    for entry in fields(run):
        value = getattr(run, entry.name)
        content.update(entry.name.encode())
        if isinstance(value, np.ndarray):
            _hash_array(content, value)
        else:
            content.update(repr(value).encode())
