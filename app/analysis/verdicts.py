"""The requirements of the brief, judged, with the reason in plain words."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.analysis.aircraft_stage import GRAVITY
from app.analysis.flight_stage import Cruise, flight_trust
from app.analysis.landing_stage import LandingFlight, Ratio, speed_ratio
from app.analysis.results import Margin, Trust, Verdict
from app.inputs import BriefInputs, Inputs
from solver.aircraft.configuration import TAIL, Aircraft
from solver.aircraft.configuration import WING as WING_SURFACE
from solver.aircraft.speed import endurance
from solver.aircraft.trim import Trimmed
from solver.atmosphere import Air
from solver.decide.margins import FAIL, PASS, Judgement, Requirement, judge
from solver.wing.stall import least_angle_room

LANDING, WING, BALANCE, SPEED = "Launch and landing", "Wing", "Balance", "Speed and battery"
FLOOR = 1.2
"""Landing speed over stall below which nobody should plan (common practice, no source)."""

TAIL_REYNOLDS = 100e3
"""Below it tails are not linear about zero lift and their flaps weak: the symmetric
section and the flap among the measurements under tests/published show both."""

SWEEP_DOUBT = (
    "With sweep the neutral point may lie up to 4 % of chord further forward than stated (against "
    "Weissinger's extended lifting line at 30°)."
)


def margin(judgement: Judgement, *, sheet: str) -> Margin:
    """Put a judgement into the words of the results."""
    asked = judgement.requirement
    return Margin(
        key=asked.key,
        label=asked.label,
        value=judgement.value,
        low=judgement.low,
        high=judgement.high,
        limit=asked.limit,
        sense=asked.sense,
        unit=asked.unit,
        verdict=Verdict(judgement.verdict),
        reason=judgement.reason,
        sheet=sheet,
    )


def over_stall(
    requirement: Requirement,
    ratio: Ratio,
    *,
    doubts: tuple[str, ...],
    explanation: str,
) -> Margin:
    """Landing or launch speed over the stall speed."""
    if ratio.value < min(FLOOR, requirement.limit) and requirement.key == "landing_over_stall":
        explanation = (
            f"That is below {FLOOR:.1f}, the floor of common practice. {explanation}".rstrip()
        )
    judgement = judge(
        requirement,
        ratio.value,
        low=ratio.low,
        high=ratio.high,
        doubts=doubts,
        explanation=explanation,
        missing="No stall was met on the way up: the section's data end before its largest lift, "
        "or the tail cannot balance the wing there.",
    )
    return margin(judgement, sheet=LANDING)


def reynolds_sentence(solved: LandingFlight, brief: BriefInputs) -> str:
    """Say whether the low Reynolds number is to blame, by the counterfactual alone.

    The claim is made only where the same aircraft, its sections' lift taken at the
    highest Reynolds number of their tables, would turn the fail into a pass.
    """
    nominal = solved.nominal
    if not (bool(nominal.found) and bool(solved.high_reynolds.found)):
        return "Whether the low Reynolds number costs stall speed could not be worked out."
    stall, other = float(nominal.speed), float(solved.high_reynolds.speed)
    limit = brief.landing_over_stall_min
    ratio, other_ratio = brief.landing_speed_m_s / stall, brief.landing_speed_m_s / other
    facts = (
        f"with the sections' lift at the highest Reynolds number of their data the stall speed "
        f"would be {other:.1f} m/s instead of {stall:.1f} m/s, the ratio {other_ratio:.2f} "
        f"instead of {ratio:.2f}"
    )
    if ratio < limit <= other_ratio:
        return f"It is the low Reynolds number: {facts}, which would pass."
    if ratio < limit:
        return f"It is not the low Reynolds number alone: {facts}, which would still miss."
    return f"The low Reynolds number is not what decides here: {facts}."


def wing_loading_sentence(inputs: Inputs, *, area: float, density: float) -> str:
    """State the wing loading and the air, the other causes of a high stall speed."""
    loading = inputs.brief.mass_kg * GRAVITY / area
    return f"The wing carries {loading:.0f} N/m² in air of {density:.3f} kg/m³."


def signed(value: float) -> str:
    """One decimal with its sign, a minus where it is one."""
    return f"{value:+.1f}".replace("-", "−")


def ways_out(ratio: Ratio, brief: BriefInputs, *, speed: float, limit: float) -> str:
    """Smallest change of speed or mass that restores a speed ratio, to first order."""
    if np.isnan(ratio.value) or ratio.value >= limit:
        return ""
    more_speed = speed * (limit / ratio.value - 1.0)
    lighter = brief.mass_kg * (1.0 - (ratio.value / limit) ** 2)
    return (
        f"{more_speed:.2g} m/s more, or about {lighter:.2g} kg less or the same share "
        f"({100 * ((limit / ratio.value) ** 2 - 1.0):.0f} %) more wing area, would restore it."
    )


def limits_of(inputs: Inputs) -> dict[str, Requirement]:
    """Every requirement of the brief, by key."""
    brief = inputs.brief
    listed = (
        Requirement("landing_over_stall", "Landing over stall", brief.landing_over_stall_min,
                    "at least", "", 2),
        Requirement("launch_over_stall", "Launch over stall", brief.launch_over_stall_min,
                    "at least", "", 2),
        Requirement("static_margin", "Static margin", brief.static_margin_min_percent,
                    "at least", "%", 1),
        Requirement("elevator_left", "Elevator left", brief.elevator_left_min_percent,
                    "at least", "%", 0),
        Requirement("cruise_power", "Cruise power", brief.cruise_power_max_w, "at most", "W", 0),
        Requirement("endurance", "Endurance", brief.endurance_min_h, "at least", "h", 2),
        Requirement("span", "Span", brief.span_max_m, "at most", "m", 2),
    )  # fmt: skip
    return {requirement.key: requirement for requirement in listed}


@dataclass(frozen=True)
class Judged:
    """Every margin, and the sentences that go with them."""

    margins: tuple[Margin, ...]
    counterfactual: str
    reason: str


def judged(
    inputs: Inputs, aircraft: Aircraft, air: Air, *, cruise: Cruise, landing: LandingFlight
) -> Judged:
    """Judge a solved scenario against its brief.

    Parameters
    ----------
    inputs : Inputs
    aircraft : Aircraft
    air : Air
    cruise : Cruise
    landing : LandingFlight

    Returns
    -------
    Judged
    """
    asked = limits_of(inputs)
    counterfactual = reynolds_sentence(landing, inputs.brief)
    speeds = _speed_margins(inputs, aircraft, air, landing, counterfactual)
    margins = (
        *speeds,
        _static_margin(asked["static_margin"], inputs, aircraft, cruise),
        _elevator_left(asked["elevator_left"], inputs, cruise, landing),
        *_energy_margins(inputs, cruise),
        margin(judge(asked["span"], inputs.wing.span_m), sheet=WING),
    )
    return Judged(margins, counterfactual, summary(margins))


def _speed_margins(
    inputs: Inputs, aircraft: Aircraft, air: Air, landing: LandingFlight, counterfactual: str
) -> tuple[Margin, Margin]:
    """Landing and launch speed over the stall speed."""
    brief, asked = inputs.brief, limits_of(inputs)
    doubts = stall_doubts(landing)
    causes = wing_loading_sentence(inputs, area=aircraft.area, density=air.density)
    found = []
    for key, speed in (
        ("landing_over_stall", brief.landing_speed_m_s),
        ("launch_over_stall", brief.launch_speed_m_s),
    ):
        ratio = speed_ratio(landing, speed=speed, airspeed_error=brief.airspeed_error_m_s)
        limit = asked[key].limit
        explanation = ""
        if not np.isnan(ratio.value) and ratio.value < limit:
            out = ways_out(ratio, brief, speed=speed, limit=limit)
            blame = f"{counterfactual} " if key == "landing_over_stall" else ""
            explanation = f"{blame}{causes} {out}"
        found.append(over_stall(asked[key], ratio, doubts=doubts, explanation=explanation))
    return found[0], found[1]


def stall_doubts(landing: LandingFlight) -> tuple[str, ...]:
    """What forbids a pass on the stall speed: the data at the stations that stall."""
    state = landing.nominal.trimmed.state
    flow = state.flow
    on_wing = flow.lattice.surface == WING_SURFACE
    packed = flow.polars.packed
    sections = np.unique(np.concatenate([flow.polars.first[on_wing], flow.polars.second[on_wing]]))
    reynolds = flow.reynolds()[on_wing]
    doubts = []
    if any(packed.estimated[section] for section in sections):
        names = ", ".join(sorted({packed.names[s] for s in sections if packed.estimated[s]}))
        doubts.append(f"The polar of {names} is estimated, which cannot earn a pass.")
    if any(bool(np.any(packed.in_unknown(reynolds, section=section))) for section in sections):
        doubts.append(
            "At stall some stations lie where the section's largest lift jumps between two runs."
        )
    lowest = max(packed.lowest_reynolds[section] for section in sections)
    if bool(np.any(reynolds < lowest)):
        doubts.append(
            f"At stall some stations see Re {np.min(reynolds):,.0f}, below the {lowest:,.0f} "
            "where the section's data begin."
        )
    return tuple(doubts)


def _static_margin(
    asked: Requirement, inputs: Inputs, aircraft: Aircraft, cruise: Cruise
) -> Margin:
    debit = inputs.propulsion.propeller_share_percent
    value = 100.0 * cruise.stability.static_margin - debit
    doubts = []
    if not aircraft.body.known:
        doubts.append(
            "The body's length and width are not given; it usually takes 3 to 6 % of chord (from "
            "memory)."
        )
    if debit == 0.0:
        doubts.append(
            "The propeller's share is not given; it usually takes 2 to 4 % of chord (from memory)."
        )
    if inputs.wing.sweep_deg != 0.0:
        doubts.append(SWEEP_DOUBT)
    reynolds = lowest_tail_reynolds(cruise.flight.trimmed)
    if reynolds < TAIL_REYNOLDS:
        doubts.append(
            f"The tail works at Re {reynolds:,.0f}, where a section's slope about zero lift may be "
            "up to 30 % less than estimated (NACA 0009, measured)."
        )
    judgement = judge(
        asked,
        value if cruise.stability.converged else float("nan"),
        doubts=tuple(doubts),
        missing="No balanced cruise was found, so the neutral point is not known.",
    )
    return margin(judgement, sheet=BALANCE)


def lowest_tail_reynolds(flight: Trimmed) -> float:
    """Smallest Reynolds number along the tail [-]."""
    flow = flight.state.flow
    return float(np.min(flow.reynolds()[..., flow.lattice.surface == TAIL]))


def _elevator_left(
    asked: Requirement, inputs: Inputs, cruise: Cruise, landing: LandingFlight
) -> Margin:
    travel = inputs.tail.elevator_travel_deg
    flights = {
        "in cruise": cruise.flight.trimmed,
        "at landing speed, balance forward": landing.flight,
    }
    used = {
        name: float(np.degrees(flight.elevator)) if bool(flight.converged) else float("nan")
        for name, flight in flights.items()
    }
    left = {name: 100.0 * (1.0 - abs(value) / travel) for name, value in used.items()}
    lost = [name for name, value in left.items() if np.isnan(value)]
    worst = lost[0] if lost else min(left, key=left.__getitem__)
    doubts = []
    reynolds = lowest_tail_reynolds(landing.flight)
    if reynolds < TAIL_REYNOLDS:
        doubts.append(
            f"At Re {reynolds:,.0f} a real elevator may do only 0.6 of what it does at 300,000 "
            "(measured on the SD7037 with a flap, Summary of Low-Speed Airfoil Data, vol. 2)."
        )
    if any(
        bool(flight.converged) and float(least_angle_room(flight.state, surface=TAIL)) < 0.0
        for flight in flights.values()
    ):
        doubts.append("The tail itself is past the knee of its lift curve.")
    judgement = judge(
        asked,
        left[worst],
        doubts=tuple(doubts),
        explanation=f"The most is used {worst}: {signed(used[worst])}° of ±{travel:.0f}°.",
        missing=f"No balanced flight was found {worst}: the tail cannot hold the wing.",
    )
    return margin(judgement, sheet=BALANCE)


def _energy_margins(inputs: Inputs, cruise: Cruise) -> tuple[Margin, Margin]:
    """Cruise power and endurance, with the band of the polars' drag."""
    asked, drive = limits_of(inputs), cruise.drive
    most, power, least = cruise.power
    converged = bool(cruise.flight.converged)
    missing = "No balanced flight was found at cruise speed."
    doubts = cruise_doubts(cruise)
    judged_power = judge(
        asked["cruise_power"],
        power if converged else float("nan"),
        low=least,
        high=most,
        doubts=doubts,
        missing=missing,
    )
    hours = endurance(drive, power=np.array([most, power, least])) / 3600.0
    judged_time = judge(
        asked["endurance"],
        float(hours[1]) if converged else float("nan"),
        low=float(hours[0]),
        high=float(hours[2]),
        doubts=doubts,
        missing=missing,
    )
    return margin(judged_power, sheet=SPEED), margin(judged_time, sheet=SPEED)


def cruise_doubts(cruise: Cruise) -> tuple[str, ...]:
    """What forbids a pass on cruise: stations outside their data or stalled."""
    trust = int(flight_trust(cruise.flight.trimmed.state))
    if trust == Trust.INDICATIVE:
        return ("Some stations are past their stall at cruise speed: indicative only.",)
    if trust == Trust.EXTRAPOLATED:
        return ("Some stations lie outside their section's data at cruise speed.",)
    return ()


def summary(margins: tuple[Margin, ...]) -> str:
    """Put into one sentence what limits this wing."""
    failing = [m for m in margins if m.verdict == FAIL]
    if failing:
        first = failing[0]
        more = f" ({len(failing) - 1} more fail)" if len(failing) > 1 else ""
        return f"{first.label} fails{more}: {first.reason}"
    watching = [m for m in margins if m.verdict != PASS]
    if watching:
        first = watching[0]
        return f"Nothing fails; watch {first.label.lower()}: {first.reason}"
    tight = min(margins, key=lambda m: m.margin / max(abs(m.limit), 1e-9))
    return f"Every requirement is met; the tightest is {tight.label.lower()}: {tight.reason}"
