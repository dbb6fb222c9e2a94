"""What must hold between fields, and what is merely odd.

A bound belongs to one field and is written with it in :mod:`app.scenario`; here
are the rules that tie two or more. A refusal is kept for values that contradict
each other or leave what the methods can answer; anything that flies, however
poorly, is solved. What is allowed but rarely meant is said as an oddity.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass
from typing import Any

from solver.errors import InputError

Values = Mapping[str, Any]

LARGEST_TIP_RATIO = 1.5
"""Largest tip chord over root chord; beyond it a typing error is likelier than a wing."""

LEAST_ASPECT_RATIO = 3.0
"""Below this a single lifting line is no longer a fair model (common practice, no source)."""


@dataclass(frozen=True)
class Rule:
    """One condition between fields.

    Parameters
    ----------
    holds : callable
        Whether the values keep the rule.
    allowed : mapping
        For each field that can be blamed, a callable that words what is
        allowed for it, to follow "must be".
    """

    holds: Callable[[Values], bool]
    allowed: Mapping[str, Callable[[Values], str]]


@dataclass(frozen=True)
class Oddity:
    """A value that is allowed but rarely meant, as one sentence."""

    name: str
    sentence: str


def _mean_chord(v: Values) -> float:
    """Mean chord of the wing [m]."""
    return float(v["root_chord_mm"] + v["tip_chord_mm"]) / 2000.0


def _least_arm(v: Values) -> float:
    """Shortest tail arm that keeps the tail behind the wing at their mean chords [m]."""
    tail_chord = (v["tail_area_m2"] / v["tail_aspect_ratio"]) ** 0.5
    return float(0.75 * _mean_chord(v) + 0.25 * tail_chord)


def _slowest(v: Values) -> float:
    return float(min(v["landing_speed_m_s"], v["launch_speed_m_s"]))


RULES: tuple[Rule, ...] = (
    Rule(
        lambda v: v["landing_speed_m_s"] <= v["cruise_speed_m_s"],
        {
            "landing_speed_m_s": lambda v: (
                f"at most the cruise speed, {v['cruise_speed_m_s']:g} m/s"
            ),
            "cruise_speed_m_s": lambda v: (
                f"at least the landing speed, {v['landing_speed_m_s']:g} m/s"
            ),
        },
    ),
    Rule(
        lambda v: v["headwind_m_s"] < v["cruise_speed_m_s"],
        {
            "headwind_m_s": lambda v: f"below the cruise speed, {v['cruise_speed_m_s']:g} m/s",
            "cruise_speed_m_s": lambda v: f"above the headwind, {v['headwind_m_s']:g} m/s",
        },
    ),
    Rule(
        lambda v: 2.0 * v["airspeed_error_m_s"] <= _slowest(v),
        {
            "airspeed_error_m_s": lambda v: (
                f"at most half of the lowest speed asked for, {_slowest(v) / 2.0:g} m/s"
            ),
            "landing_speed_m_s": lambda v: (
                f"at least twice the airspeed error, {2.0 * v['airspeed_error_m_s']:g} m/s"
            ),
            "launch_speed_m_s": lambda v: (
                f"at least twice the airspeed error, {2.0 * v['airspeed_error_m_s']:g} m/s"
            ),
        },
    ),
    Rule(
        lambda v: v["tip_chord_mm"] <= LARGEST_TIP_RATIO * v["root_chord_mm"],
        {
            "tip_chord_mm": lambda v: (
                f"at most {LARGEST_TIP_RATIO:g} times the root chord, "
                f"{LARGEST_TIP_RATIO * v['root_chord_mm']:g} mm"
            ),
            "root_chord_mm": lambda v: (
                f"at least the tip chord over {LARGEST_TIP_RATIO:g}, "
                f"{v['tip_chord_mm'] / LARGEST_TIP_RATIO:.4g} mm"
            ),
        },
    ),
    Rule(
        lambda v: v["span_m"] >= LEAST_ASPECT_RATIO * _mean_chord(v),
        {
            "span_m": lambda v: (
                f"at least {LEAST_ASPECT_RATIO:g} times the mean chord, "
                f"{LEAST_ASPECT_RATIO * _mean_chord(v):.4g} m, for a lifting line to hold"
            ),
            "root_chord_mm": lambda v: _chord_allowed(v, "tip_chord_mm"),
            "tip_chord_mm": lambda v: _chord_allowed(v, "root_chord_mm"),
        },
    ),
    Rule(
        lambda v: v["tail_arm_m"] >= _least_arm(v),
        {
            "tail_arm_m": lambda v: (
                f"at least {_least_arm(v):.4g} m, so that the tail lies behind the wing"
            ),
            **dict.fromkeys(
                ("root_chord_mm", "tip_chord_mm", "tail_area_m2"),
                lambda v: (
                    "small enough for the tail to lie behind the wing "
                    f"with a tail arm of {v['tail_arm_m']:g} m"
                ),
            ),
            "tail_aspect_ratio": lambda v: (
                "large enough for the tail to lie behind the wing "
                f"with a tail arm of {v['tail_arm_m']:g} m"
            ),
        },
    ),
    Rule(
        lambda v: not v["body_length_mm"] or v["body_nose_mm"] <= v["body_length_mm"],
        {
            "body_nose_mm": lambda v: f"within the body length, {v['body_length_mm']:g} mm",
            "body_length_mm": lambda v: (
                f"at least the nose, {v['body_nose_mm']:g} mm, or 0 for not given"
            ),
        },
    ),
    Rule(
        lambda v: not v["body_length_mm"] or v["body_width_mm"] <= v["body_length_mm"],
        {
            "body_width_mm": lambda v: f"at most the body length, {v['body_length_mm']:g} mm",
            "body_length_mm": lambda v: (
                f"at least the body width, {v['body_width_mm']:g} mm, or 0 for not given"
            ),
        },
    ),
    Rule(
        lambda v: v["balance_forward_percent"] <= v["balance_percent"],
        {
            "balance_forward_percent": lambda v: (
                f"at or ahead of the balance point, at most {v['balance_percent']:g} %"
            ),
            "balance_percent": lambda v: (
                "at or behind the forward balance point, "
                f"at least {v['balance_forward_percent']:g} %"
            ),
        },
    ),
)


def _chord_allowed(v: Values, other: str) -> str:
    most = 2000.0 * v["span_m"] / LEAST_ASPECT_RATIO - v[other]
    return (
        f"at most {most:.4g} mm, a mean chord of the span over {LEAST_ASPECT_RATIO:g}, "
        "for a lifting line to hold"
    )


def require_rules(values: Values, *, changed: Collection[str] = ()) -> None:
    """Refuse values that contradict each other.

    Parameters
    ----------
    values : mapping
        Every field of the scenario by name, each within its own bounds.
    changed : collection of str
        The fields just set: they are blamed before the others of a rule.

    Raises
    ------
    InputError
        Naming one field of the first rule that does not hold.
    """
    for rule in RULES:
        if not rule.holds(values):
            names = list(rule.allowed)
            blamed = next((name for name in names if name in changed), names[0])
            raise InputError(blamed, values[blamed], rule.allowed[blamed](values))


_ODDITIES: tuple[tuple[str, Callable[[Values], bool], str], ...] = (
    (
        "tip_chord_mm",
        lambda v: v["tip_chord_mm"] > v["root_chord_mm"],
        "The tip chord is larger than the root chord.",
    ),
    (
        "washout_deg",
        lambda v: v["washout_deg"] < 0.0,
        "The washout is negative: the tips meet the air at a larger angle than the root.",
    ),
    (
        "launch_speed_m_s",
        lambda v: v["launch_method"] == "hand" and v["launch_speed_m_s"] > 12.0,
        "A launch by hand faster than 12 m/s is more than an arm gives.",
    ),
    (
        "airspeed_error_m_s",
        lambda v: v["airspeed_error_m_s"] == 0.0,
        "An airspeed error of 0 leaves the largest part of the landing band out.",
    ),
    (
        "build_drag_factor",
        lambda v: v["build_drag_factor"] == 1.0 and v["finish"] != "moulded",
        "A build-drag factor of 1 is a polished wind-tunnel model, not a wing with this finish.",
    ),
    (
        "headwind_m_s",
        lambda v: v["headwind_m_s"] > 0.5 * v["cruise_speed_m_s"],
        "The headwind takes more than half of the cruise speed.",
    ),
    (
        "tail_area_m2",
        lambda v: v["tail_area_m2"] > 0.5 * v["span_m"] * _mean_chord(v),
        "The tail has more than half of the wing's area.",
    ),
    (
        "body_width_mm",
        lambda v: (v["body_length_mm"] > 0.0) != (v["body_width_mm"] > 0.0),
        "Only one of body length and width is given: the body's part in balance needs both.",
    ),
    (
        "balance_forward_percent",
        lambda v: v["balance_forward_percent"] == v["balance_percent"],
        "The balance point has no travel: loads and battery would have to sit exactly.",
    ),
)


def oddities(values: Values) -> tuple[Oddity, ...]:
    """Say what is allowed but rarely meant.

    Parameters
    ----------
    values : mapping
        Every field of the scenario by name, as `Inputs.values` gives them.

    Returns
    -------
    tuple of Oddity
        In the order of the fields; empty when nothing is odd.
    """
    return tuple(Oddity(name, text) for name, test, text in _ODDITIES if test(values))
