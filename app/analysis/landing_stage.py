"""Stall speed in trim with its band, what is left above it, and where the risk lies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.analysis.flight_stage import TRUST_WORDS, flight_trust, span_result
from app.analysis.results import LandingResult, SpanResult, StationRisk, Trust, Verdict
from app.inputs import BriefInputs
from solver.aircraft.configuration import Aircraft
from solver.aircraft.landing import (
    SpeedMargins,
    StallOnset,
    ratio_band,
    speed_margins,
)
from solver.aircraft.trim import Trimmed
from solver.section.packed import HELD, HIGH, LOW, NOMINAL, PackedPolars

NAN = float("nan")

PLACES = (("root", 0.0), ("quarter", 0.25), ("middle", 0.5), ("three quarters", 0.75), ("tip", 1.0))
AILERON_FROM = 0.6
"""Share of the half-span outboard of which ailerons usually begin (common practice, no source)."""

CRITICAL_REYNOLDS = 70e3
"""Below it a smooth section may not reattach (B. H. Carmichael, NASA CR 165803, 1981,
read second-hand)."""

DRAG_RISE = 2.0
"""Section drag over that at high Reynolds number from which a go-around is in doubt
(our choice)."""


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

    @property
    def nominal(self) -> StallOnset:
        """The nominal onset as a single state."""
        return self.onset.case(NOMINAL)

    @property
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
        risks=station_risks(landing_span, solved, aircraft),
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


def station_risks(
    span: SpanResult, solved: LandingFlight, aircraft: Aircraft
) -> tuple[StationRisk, ...]:
    """Low-Reynolds-number risk at five places of the half-wing, with the reason.

    Parameters
    ----------
    span : SpanResult
        At landing speed.
    solved : LandingFlight
    aircraft : Aircraft
    """
    half_span = 0.5 * float(np.asarray(aircraft.wing.span))
    return tuple(
        _station_risk(name, int(np.argmin(np.abs(span.y_m - share * half_span))), span, solved)
        for name, share in PLACES
    )


Concern = tuple[Verdict, str]


def _station_risk(name: str, index: int, span: SpanResult, solved: LandingFlight) -> StationRisk:
    polars = solved.flight.state.flow.polars
    section = int(polars.first[index] if polars.weight[index] < 0.5 else polars.second[index])
    reynolds = float(span.reynolds[index])
    concerns = (
        *_limit_concerns(polars.packed, reynolds, section),
        *_room_concerns(span, index),
        *_data_concerns(polars.packed, span, index, section),
        *_drag_concerns(solved, index, reynolds, section),
    )
    order = {Verdict.PASS: 0, Verdict.WATCH: 1, Verdict.FAIL: 2}
    return StationRisk(
        place=name,
        y_m=float(span.y_m[index]),
        reynolds=reynolds,
        level=max((level for level, _ in concerns), key=order.__getitem__, default=Verdict.PASS),
        reason="; ".join(text for _, text in concerns) or "none found",
    )


def _limit_concerns(packed: PackedPolars, reynolds: float, section: int) -> list[Concern]:
    """How the section's own largest lift behaves at 10 % less speed."""
    slower = 0.9 * reynolds
    if bool(np.any(packed.in_unknown(np.array([reynolds, slower]), section=section))):
        return [(Verdict.FAIL, "largest lift jumps between two runs here: not known")]
    limits = packed.limits(np.array([slower, reynolds]), band=NOMINAL, section=section)
    loss = 1.0 - float(limits.largest_lift[0] / limits.largest_lift[1])
    if loss <= 0.05:
        return []
    level = Verdict.FAIL if loss > 0.15 else Verdict.WATCH
    return [(level, f"10 % less speed costs {100 * loss:.0f} % of largest lift")]


def _room_concerns(span: SpanResult, index: int) -> list[Concern]:
    if span.room[index] < 0.0:
        return [(Verdict.FAIL, "past its largest lift")]
    if span.knee_room_deg[index] < 0.0:
        return [(Verdict.WATCH, "past the knee of its lift curve")]
    return []


def _data_concerns(
    packed: PackedPolars, span: SpanResult, index: int, section: int
) -> list[Concern]:
    concerns = []
    if packed.estimated[section]:
        concerns.append((Verdict.WATCH, "its polar is estimated, not measured"))
    elif span.trust[index] == Trust.EXTRAPOLATED:
        concerns.append((Verdict.WATCH, "outside the Reynolds numbers or angles measured"))
    if span.reynolds[index] < CRITICAL_REYNOLDS:
        concerns.append(
            (
                Verdict.WATCH,
                f"below about {CRITICAL_REYNOLDS:,.0f} a smooth section may not reattach",
            )
        )
    return concerns


def _drag_concerns(
    solved: LandingFlight, index: int, reynolds: float, section: int
) -> list[Concern]:
    rise = _drag_rise(solved, index, reynolds, section)
    if rise <= DRAG_RISE:
        return []
    text = f"drag is {rise:.1f} times that at high Reynolds number: the go-around suffers"
    return [(Verdict.WATCH, text)]


def _drag_rise(solved: LandingFlight, index: int, reynolds: float, section: int) -> float:
    """Section drag at landing over that at its highest tabled Reynolds number."""
    packed = solved.flight.state.flow.polars.packed
    angle = float(solved.flight.state.section_angle[index])
    here = packed.evaluate(angle, reynolds, band=NOMINAL, section=section)
    high = packed.evaluate(angle, packed.highest_reynolds[section], band=NOMINAL, section=section)
    return float(here.drag) / float(high.drag)
