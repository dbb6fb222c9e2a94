"""Stall speed in trim with its band, what is left above it, and where the risk lies."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from app.analysis.flight_stage import TRUST_WORDS, flight_trust, span_result
from app.analysis.results import LandingResult, Trust
from app.analysis.risk import station_risks
from app.inputs import BriefInputs
from solver.aircraft.configuration import Aircraft
from solver.aircraft.landing import (
    SpeedMargins,
    StallOnset,
    ratio_band,
    speed_margins,
)
from solver.aircraft.trim import Trimmed
from solver.section.packed import HELD, HIGH, LOW, NOMINAL

NAN = float("nan")

AILERON_FROM = 0.6
"""Share of the half-span outboard of which ailerons usually begin (common practice, no source)."""


@dataclass(frozen=True, eq=False)
class LandingFlight:
    """Solved states behind the landing sheet.

    Fields
    ------
    flight : Trimmed
        At landing speed and the forward balance point; batch shape ().
    onset : StallOnset
        Batch of four: low, nominal and high largest lift, and every section's lift
        held at the highest Reynolds number of its table.
    """

    flight: Trimmed
    onset: StallOnset

    @cached_property
    def nominal(self) -> StallOnset:
        """The nominal onset as a single state."""
        return self.onset.case(NOMINAL)

    @cached_property
    def high_reynolds(self) -> StallOnset:
        """The counterfactual onset as a single state."""
        return self.onset.case(HELD)


@dataclass(frozen=True)
class Ratio:
    """Speed over stall speed with its band; NaN where no onset was found."""

    value: float
    low: float
    high: float


def speed_ratio(solved: LandingFlight, *, speed: float, airspeed_error: float) -> Ratio:
    """V/Vs at one speed, with the band of polars and airspeed together.

    Parameters
    ----------
    solved : LandingFlight
    speed : float
        [m/s]
    airspeed_error : float
        [m/s]
    """
    if not bool(solved.onset.found[NOMINAL]):
        return Ratio(NAN, NAN, NAN)
    slow, nominal, fast = (_stall_speed(solved, band) for band in (HIGH, NOMINAL, LOW))
    ratio = speed / nominal

    def half_width(stall_speed: float) -> float:
        error = abs(stall_speed - nominal) / nominal
        return ratio_band(
            ratio, stall_speed_error=error, airspeed_error=airspeed_error, speed=speed
        )

    return Ratio(ratio, ratio - half_width(fast), ratio + half_width(slow))


def _stall_speed(solved: LandingFlight, band: int) -> float:
    """Stall speed at one end of the band; the nominal one where that end was not found."""
    index = band if bool(solved.onset.found[band]) else NOMINAL
    return float(solved.onset.speed[index])


def landing_result(
    solved: LandingFlight, aircraft: Aircraft, brief: BriefInputs, *, counterfactual: str
) -> LandingResult:
    """Everything the landing sheet states.

    Parameters
    ----------
    solved : LandingFlight
    aircraft : Aircraft
    brief : BriefInputs
    counterfactual : str
        The sentence on what the Reynolds number has to do with it.
    """
    found = bool(solved.onset.found[NOMINAL])
    nominal = solved.nominal
    landing = speed_ratio(
        solved, speed=brief.landing_speed_m_s, airspeed_error=brief.airspeed_error_m_s
    )
    launch = speed_ratio(
        solved, speed=brief.launch_speed_m_s, airspeed_error=brief.airspeed_error_m_s
    )
    left = speed_margins(solved.flight, nominal) if found else SpeedMargins(*[NAN] * 5)
    landing_span = span_result("landing", solved.flight.state, aircraft)
    trust = Trust(int(flight_trust(nominal.trimmed.state))) if found else Trust.NOT_CONVERGED
    start, end = (float(nominal.start), float(nominal.end)) if found else (NAN, NAN)
    high_ratio = NAN
    if bool(solved.high_reynolds.found):
        high_ratio = brief.landing_speed_m_s / float(solved.high_reynolds.speed)
    return LandingResult(
        stall_speed_low_m_s=_stall_speed(solved, HIGH) if found else NAN,
        stall_speed_m_s=float(nominal.speed) if found else NAN,
        stall_speed_high_m_s=_stall_speed(solved, LOW) if found else NAN,
        onset_lift_coefficient=float(nominal.lift_area) / aircraft.area,
        landing_ratio=landing.value,
        landing_ratio_low=landing.low,
        landing_ratio_high=landing.high,
        launch_ratio=launch.value,
        launch_ratio_low=launch.low,
        launch_ratio_high=launch.high,
        speed_to_lose_m_s=left.speed_to_lose,
        lift_margin_percent=100.0 * left.lift,
        angle_margin_deg=float(np.min(landing_span.knee_room_deg)),
        bank_deg=float(np.degrees(left.bank)),
        gust_m_s=left.gust,
        onset_from=start,
        onset_to=end,
        onset_words=onset_words(start, end),
        high_reynolds_ratio=high_ratio,
        counterfactual=counterfactual,
        landing_span=landing_span,
        onset_span=span_result("onset of stall", nominal.trimmed.state, aircraft),
        risks=station_risks(landing_span, solved.flight.state, aircraft),
        sentences=_sentences(brief, left, onset_words(start, end)) if found else (),
        status=TRUST_WORDS[trust],
        trust=trust,
    )


def onset_words(start: float, end: float) -> str:
    """Say where the stall begins, as a range and what that means."""
    if np.isnan(start) or np.isnan(end):
        return "the place where the stall begins was not found"
    middle = 0.5 * (start + end)
    span = f"between {100 * start:.0f} and {100 * end:.0f} % of the half-span"
    if end - start < 0.02:
        span = f"near {100 * middle:.0f} % of the half-span"
    if end > AILERON_FROM and middle > 0.5 * AILERON_FROM:
        return f"{span}, at the usual aileron: a wing may drop"
    if middle < 0.5 * AILERON_FROM:
        return f"{span}, inboard: benign"
    return f"{span}, in the middle of each half"


def _sentences(brief: BriefInputs, left: SpeedMargins, where: str) -> tuple[str, ...]:
    if left.speed_to_lose <= 0.0:
        return (
            f"At {brief.landing_speed_m_s:.1f} m/s the aircraft is already below its stall speed.",
            f"The stall begins {where}.",
        )
    return (
        f"From {brief.landing_speed_m_s:.1f} m/s the stall is {left.speed_to_lose:.1f} m/s away.",
        f"The stall begins {where}.",
        f"A level turn of {np.degrees(left.bank):.0f}° of bank, or a sharp-edged upward gust of "
        f"{left.gust:.1f} m/s (its lag left out), would use up the margin.",
    )
