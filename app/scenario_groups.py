"""Every input of a scenario: default, bounds, label, unit, step and help.

The one place where these are written. Widgets, file, command line, listing and
documents take them from here, mostly by way of :mod:`app.scenario_fields`; names
carry their unit and are the same everywhere.
"""

from __future__ import annotations

from typing import Any

import param


def _number(
    default: float, low: float, high: float, unit: str, step: float, label: str, help: str
) -> Any:  # noqa: ANN401 - a class attribute of type float, made by a descriptor
    return param.Number(
        default=default,
        bounds=(low, high),
        label=label,
        doc=help,
        metadata={"unit": unit, "step": step},
    )


def _choice(choices: tuple[str, ...], default: str, label: str, help: str) -> Any:  # noqa: ANN401
    return param.Selector(default=default, objects=list(choices), label=label, doc=help)


def _section(default: str, label: str, help: str) -> Any:  # noqa: ANN401
    return param.String(default=default, label=label, doc=help, metadata={"section": True})


class Brief(param.Parameterized):
    """The mission and its limits."""

    mass_kg: float = _number(
        4.6, 0.3, 30, "kg", 0.05, "Mass", "Mass at launch, everything on board."
    )
    cruise_speed_m_s: float = _number(
        17, 5, 45, "m/s", 0.1, "Cruise speed", "True airspeed of level cruise."
    )
    landing_speed_m_s: float = _number(
        14.5, 4, 40, "m/s", 0.1, "Landing speed", "True airspeed held on the approach to land."
    )
    launch_method: str = _choice(
        ("hand", "bungee", "catapult", "vehicle", "runway"),
        "catapult",
        "Launch method",
        "How the aircraft is brought to flying speed.",
    )
    launch_speed_m_s: float = _number(
        13.5, 3, 40, "m/s", 0.1, "Launch speed", "True airspeed at the moment of release."
    )
    landing_method: str = _choice(
        ("belly", "net", "parachute", "deep stall", "runway"),
        "belly",
        "Landing method",
        "How the aircraft is recovered.",
    )
    field_altitude_m: float = _number(
        120, -400, 6000, "m", 10, "Field altitude", "Pressure altitude of the field."
    )
    temperature_offset_K: float = _number(  # noqa: N815 - the unit's symbol
        0,
        -40,
        40,
        "K",
        1,
        "Temperature offset",
        "Air temperature above that of the standard atmosphere at this altitude.",
    )
    headwind_m_s: float = _number(
        0, 0, 20, "m/s", 0.5, "Headwind", "Wind against the aircraft, used for range."
    )
    airspeed_error_m_s: float = _number(
        0.3,
        0,
        5,
        "m/s",
        0.05,
        "Airspeed error",
        "How far the airspeed flown may be from the one meant; widens the landing band.",
    )
    landing_over_stall_min: float = _number(
        1.3, 1, 2, "", 0.01, "Landing over stall, least", "Least landing speed over stall speed."
    )
    launch_over_stall_min: float = _number(
        1.12, 1, 2, "", 0.01, "Launch over stall, least", "Least launch speed over stall speed."
    )
    static_margin_min_percent: float = _number(
        5,
        0,
        40,
        "%",
        0.5,
        "Static margin, least",
        "Least distance from balance point to neutral point, of the mean aerodynamic chord.",
    )
    elevator_left_min_percent: float = _number(
        20,
        0,
        90,
        "%",
        1,
        "Elevator left, least",
        "Least share of the elevator's travel that trimming for landing must leave.",
    )
    cruise_power_max_w: float = _number(
        140, 5, 5000, "W", 1, "Cruise power, most", "Most electric power in cruise."
    )
    endurance_min_h: float = _number(
        2, 0, 24, "h", 0.1, "Endurance, least", "Least time in the air at cruise speed."
    )
    span_max_m: float = _number(
        2.5, 0.3, 8, "m", 0.05, "Span, most", "Largest span that can be carried and launched."
    )


class Wing(param.Parameterized):
    """The wing."""

    span_m: float = _number(2.4, 0.4, 8, "m", 0.01, "Span", "Tip to tip, seen from above.")
    root_chord_mm: float = _number(
        280, 60, 1000, "mm", 1, "Root chord", "Chord at the plane of symmetry."
    )
    tip_chord_mm: float = _number(200, 40, 1000, "mm", 1, "Tip chord", "Chord at the tip.")
    washout_deg: float = _number(
        1.5,
        -5,
        10,
        "deg",
        0.1,
        "Washout",
        "Angle by which the tip is twisted nose down against the root, growing linearly.",
    )
    dihedral_deg: float = _number(
        2, 0, 20, "deg", 0.5, "Dihedral", "Angle by which each half-wing rises towards its tip."
    )
    sweep_deg: float = _number(
        0, -10, 30, "deg", 0.5, "Sweep", "Angle of the quarter-chord line, positive backwards."
    )
    root_section: str = _section(
        "E387",
        "Root section",
        "A section that the scenario has tables for, or NACA and its digits.",
    )
    tip_section: str = _section(
        "E387", "Tip section", "A section that the scenario has tables for, or NACA and its digits."
    )
    finish: str = _choice(
        ("moulded", "filmed", "taped", "bare foam"),
        "filmed",
        "Finish",
        "The wing's surface; wind-tunnel models are smoother than any of these.",
    )
    build_drag_factor: float = _number(
        1.15,
        1,
        2,
        "",
        0.01,
        "Build-drag factor",
        "Section drag as built over section drag of a polished wind-tunnel model.",
    )


class Tail(param.Parameterized):
    """The horizontal tail and its elevator."""

    tail_area_m2: float = _number(
        0.082, 0.002, 2, "m²", 0.001, "Tail area", "Area of the horizontal tail, elevator included."
    )
    tail_arm_m: float = _number(
        0.82,
        0.1,
        5,
        "m",
        0.01,
        "Tail arm",
        "From the quarter point of the wing's mean aerodynamic chord to that of the tail.",
    )
    tail_aspect_ratio: float = _number(
        4, 1, 10, "", 0.1, "Tail aspect ratio", "Tail span squared over tail area."
    )
    tail_taper: float = _number(
        0.7, 0.2, 1, "", 0.05, "Tail taper", "Tip chord of the tail over its root chord."
    )
    tail_height_m: float = _number(
        0.08, -1, 1, "m", 0.01, "Tail height", "Height of the tail above the wing root."
    )
    tail_incidence_deg: float = _number(
        0, -10, 10, "deg", 0.1, "Tail incidence", "Angle of the tail to the wing root's chord line."
    )
    elevator_chord_percent: float = _number(
        30, 10, 60, "%", 1, "Elevator chord", "Chord of the elevator, of the tail's chord."
    )
    elevator_travel_deg: float = _number(
        20, 5, 40, "deg", 1, "Elevator travel", "Largest deflection to either side."
    )
    hinge_gap_debit_percent: float = _number(
        15,
        0,
        50,
        "%",
        1,
        "Hinge-gap debit",
        "Share of the elevator's effect that is lost through the gap at its hinge.",
    )
    tail_section: str = _section(
        "NACA 0009",
        "Tail section",
        "A section that the scenario has tables for, or NACA and its digits.",
    )


class Body(param.Parameterized):
    """The body, as far as it is known."""

    body_length_mm: float = _number(
        0, 0, 6000, "mm", 10, "Body length", "Length of the body; 0 while not given."
    )
    body_width_mm: float = _number(
        0, 0, 1500, "mm", 5, "Body width", "Largest width of the body; 0 while not given."
    )
    body_nose_mm: float = _number(
        0,
        0,
        4000,
        "mm",
        5,
        "Nose",
        "Part of the body ahead of the wing root's leading edge; 0 while not given.",
    )
    body_drag_area_m2: float = _number(
        0.0075,
        0,
        0.5,
        "m²",
        0.0001,
        "Body drag area",
        "Drag of body, fin and whatever sticks out, over dynamic pressure.",
    )


class Balance(param.Parameterized):
    """The balance point."""

    balance_percent: float = _number(
        34,
        -20,
        120,
        "%",
        0.5,
        "Balance point",
        "Behind the leading edge of the mean aerodynamic chord, of that chord.",
    )
    balance_forward_percent: float = _number(
        28,
        -20,
        120,
        "%",
        0.5,
        "Forward balance point",
        "The furthest forward that loading may put it; landing is judged there.",
    )


class Propulsion(param.Parameterized):
    """Battery, motor and propeller."""

    battery_wh: float = _number(
        333, 1, 20000, "Wh", 1, "Battery", "Energy of the full battery as labelled."
    )
    usable_percent: float = _number(
        80, 10, 100, "%", 1, "Usable share", "Share of the battery that a flight may use."
    )
    propulsive_efficiency: float = _number(
        0.52,
        0.1,
        0.95,
        "",
        0.01,
        "Propulsive efficiency",
        "Thrust times speed over electric power into the motor controller.",
    )
    avionics_w: float = _number(
        12, 0, 2000, "W", 1, "Avionics", "Electric power of everything but the motor."
    )
    peukert_exponent: float = _number(
        1.05,
        1,
        1.4,
        "",
        0.01,
        "Peukert exponent",
        "How strongly a larger current shrinks the battery; 1 for not at all.",
    )
    thrust_line_offset_mm: float = _number(
        0,
        -500,
        500,
        "mm",
        1,
        "Thrust-line offset",
        "Height of the thrust line above the balance point.",
    )
    propeller_share_percent: float = _number(
        0,
        0,
        10,
        "%",
        0.5,
        "Propeller share",
        "Static margin that the propeller takes, of the mean aerodynamic chord; 0 while not given.",
    )


GROUPS: dict[str, type[param.Parameterized]] = {
    "brief": Brief,
    "wing": Wing,
    "tail": Tail,
    "body": Body,
    "balance": Balance,
    "propulsion": Propulsion,
}

SECTION_FIELDS = ("root_section", "tip_section", "tail_section")
