"""Results made up from closed forms, for tests of what is shown.

Nothing here is a check of any number: an ellipse for the loading, a parabola
for the drag, straight lines for the sections. The shapes, masks and texts are
those that the screen has to cope with.
"""

from __future__ import annotations

import dataclasses
import math

import numpy as np

from app.analysis.results import (
    AirResult,
    BalanceResult,
    DragParts,
    LandingResult,
    LiftCurveResult,
    Margin,
    MeasuredPoints,
    Origin,
    PlanformResult,
    PolarCurve,
    Results,
    SectionResult,
    SpanResult,
    StationRisk,
    SweepResult,
    TrimResult,
    Trust,
    Verdict,
)
from app.inputs import Inputs

GRAVITY = 9.80665
DENSITY = 1.21
VISCOSITY = 1.48e-5

DEFAULTS: dict[str, float | str] = {
    "mass_kg": 4.6,
    "cruise_speed_m_s": 17.0,
    "landing_speed_m_s": 14.5,
    "launch_speed_m_s": 13.5,
    "airspeed_error_m_s": 0.3,
    "span_m": 2.4,
    "root_chord_mm": 280.0,
    "tip_chord_mm": 200.0,
    "balance_percent": 34.0,
    "balance_forward_percent": 28.0,
    "span_max_m": 2.5,
}


def valid(count: int) -> np.ndarray:
    """Codes of that many trusted values."""
    return np.full(count, Trust.VALID, dtype=np.uint8)


def make_results(
    *, want: frozenset[str] = frozenset(), name: str = "Heronsgill 24", **changed: float | str
) -> Results:
    """Make results that answer to a few inputs."""
    values = {**DEFAULTS, **changed}
    plan = _planform(values)
    weight = float(values["mass_kg"]) * GRAVITY
    stall = math.sqrt(2.0 * weight / (DENSITY * plan.area_m2 * 1.14))
    landing = _landing(values, plan, weight, stall)
    sweep = _sweep(values, plan, weight)
    margins = _margins(values, landing, sweep)
    return Results(
        name=name,
        inputs=values,
        air=AirResult(120.0, 287.4, DENSITY, VISCOSITY, 339.9),
        sections=(
            _section("root", "E387", True),
            _section("tail", "NACA 0009", False),
        ),
        planform=plan,
        cruise=_trim(values, plan, weight),
        landing=landing,
        balance=_balance(values),
        margins=margins,
        sweep=sweep if "sweep" in want else None,
        lift_curve=_lift_curve() if "lift_curve" in want else None,
        reason="The middle of each half-wing runs out of lift first, "
        f"at {stall:.1f} m/s; landing at {values['landing_speed_m_s']:.1f} m/s leaves "
        f"{float(values['landing_speed_m_s']) - stall:.1f} m/s.",
        cautions=(
            "A sizing aid, not a certification.",
            "Verify by test before flight.",
            "Local rules decide.",
        ),
        solver_ms=9.0,
    )


def _planform(values: dict[str, float | str]) -> PlanformResult:
    half = float(values["span_m"]) / 2.0
    root, tip = float(values["root_chord_mm"]) / 1e3, float(values["tip_chord_mm"]) / 1e3
    back = 0.25 * (root - tip)
    taper = tip / root
    mean = 2.0 / 3.0 * root * (1.0 + taper + taper**2) / (1.0 + taper)
    mean_y = half / 3.0 * (1.0 + 2.0 * taper) / (1.0 + taper)
    mean_x = back * mean_y / half
    area = half * (root + tip)
    tail_half, tail_chord, tail_x = 0.286, 0.143, mean_x + 0.25 * mean + 0.82 - 0.036
    balance = float(values["balance_percent"]) / 100.0
    forward = float(values["balance_forward_percent"]) / 100.0
    return PlanformResult(
        wing_y=np.array([-half, 0.0, half, half, 0.0, -half, -half]),
        wing_x=np.array([back, 0.0, back, back + tip, root, back + tip, back]),
        tail_y=np.array([-1, 1, 1, -1, -1]) * tail_half,
        tail_x=np.array([0, 0, 1, 1, 0]) * tail_chord + tail_x,
        area_m2=area,
        aspect_ratio=4.0 * half**2 / area,
        taper=taper,
        mean_chord_m=mean,
        mean_chord_x_m=mean_x,
        mean_chord_y_m=mean_y,
        wing_loading_n_m2=float(values["mass_kg"]) * GRAVITY / area,
        tail_volume=0.082 * 0.82 / (area * mean),
        balance_x_m=mean_x + balance * mean,
        forward_balance_x_m=mean_x + forward * mean,
        neutral_point_x_m=mean_x + 0.49 * mean,
        tip_thickness_mm=0.091 * tip * 1e3,
        root_thickness_mm=0.091 * root * 1e3,
    )


def _span(
    condition: str,
    values: dict[str, float | str],
    plan: PlanformResult,
    *,
    lift: float,
    speed: float,
) -> SpanResult:
    half = float(values["span_m"]) / 2.0
    share = np.sin((np.arange(20) + 0.5) * math.pi / 40.0)
    root, tip = float(values["root_chord_mm"]) / 1e3, float(values["tip_chord_mm"]) / 1e3
    chord = root + (tip - root) * share
    loading = lift * 4.0 / math.pi * np.sqrt(1.0 - share**2)
    local = loading * plan.mean_chord_m / chord
    reynolds = speed * chord / VISCOSITY
    limit = 1.18 + 0.06 * np.log(reynolds / 2e5)
    return SpanResult(
        condition=condition,
        y_m=share * half,
        chord_m=chord,
        reynolds=reynolds,
        angle_deg=np.degrees(local / 6.0) - 3.4,
        lift=local,
        drag=0.011 + 0.004 * local**2,
        loading=loading,
        limit_low=limit - 0.05,
        limit=limit,
        limit_high=limit + 0.05,
        room=limit - local,
        knee_room_deg=np.degrees((limit - local) / 6.0),
        trust=valid(20),
    )


def _trim(values: dict[str, float | str], plan: PlanformResult, weight: float) -> TrimResult:
    speed = float(values["cruise_speed_m_s"])
    pressure = 0.5 * DENSITY * speed**2
    lift = weight / (pressure * plan.area_m2)
    parts = DragParts(
        induced=weight**2 / (pressure * math.pi * float(values["span_m"]) ** 2 * 0.97),
        profile=pressure * plan.area_m2 * 0.0135,
        body=pressure * 0.0075,
        trim_induced=0.01,
        trim_profile=0.02,
    )
    return TrimResult(
        condition="cruise",
        speed_m_s=speed,
        angle_deg=math.degrees(lift / 5.0) - 3.2,
        elevator_deg=-0.6,
        lift_coefficient=lift,
        tail_lift_n=-0.8,
        drag=parts,
        lift_to_drag=weight / parts.total,
        electric_power_w=parts.total * speed / 0.52 + 12.0,
        trust=Trust.VALID,
        status="converged",
        span=_span("cruise", values, plan, lift=lift, speed=speed),
    )


def _landing(
    values: dict[str, float | str], plan: PlanformResult, weight: float, stall: float
) -> LandingResult:
    speed = float(values["landing_speed_m_s"])
    lift = weight / (0.5 * DENSITY * speed**2 * plan.area_m2)
    ratio, launch = speed / stall, float(values["launch_speed_m_s"]) / stall
    return LandingResult(
        stall_speed_low_m_s=1.03 * stall,
        stall_speed_m_s=stall,
        stall_speed_high_m_s=0.97 * stall,
        onset_lift_coefficient=1.14,
        landing_ratio=ratio,
        landing_ratio_low=0.95 * ratio,
        landing_ratio_high=1.05 * ratio,
        launch_ratio=launch,
        launch_ratio_low=0.95 * launch,
        launch_ratio_high=1.05 * launch,
        speed_to_lose_m_s=speed - stall,
        lift_margin_percent=100.0 * (1.14 / lift - 1.0),
        angle_margin_deg=5.2,
        bank_deg=math.degrees(math.acos(min(1.0, 1.0 / ratio**2))),
        gust_m_s=1.9,
        onset_from=0.42,
        onset_to=0.61,
        onset_words="between 0.50 m and 0.73 m from the centre, ahead of the ailerons' inner ends",
        high_reynolds_ratio=1.02 * ratio,
        counterfactual="With the sections at their highest tabled Reynolds number the ratio would "
        f"be {1.02 * ratio:.2f}: the low Reynolds number is not what decides.",
        landing_span=_span("landing", values, plan, lift=lift, speed=speed),
        onset_span=_span("onset", values, plan, lift=1.14, speed=stall),
        risks=(
            StationRisk("root", 0.0, 2.6e5, Verdict.PASS, "Largest lift changes little here."),
            StationRisk(
                "tip", 1.2, 1.6e5, Verdict.WATCH, "Drag rises fast with lift near this number."
            ),
        ),
        sentences=(
            "Stall begins in the middle of each half-wing, which is benign.",
            "A sharp-edged gust of 1.9 m/s would use up the lift that is left; "
            "the slow growth of lift is not counted.",
        ),
        status="converged",
        trust=Trust.VALID,
    )


def _sweep(values: dict[str, float | str], plan: PlanformResult, weight: float) -> SweepResult:
    speed = np.linspace(9.0, 25.0, 33)
    pressure = 0.5 * DENSITY * speed**2
    induced = weight**2 / (pressure * math.pi * float(values["span_m"]) ** 2 * 0.97)
    profile = pressure * plan.area_m2 * (0.012 + 0.006 * (weight / pressure / plan.area_m2) ** 2)
    body, trim = pressure * 0.0075, 0.02 + 0.4 / speed
    total = induced + profile + body + trim
    power = total * speed / 0.52 + 12.0
    endurance = 333.0 * 0.8 / power
    distance = endurance * speed * 3.6
    trust = np.where(speed < 10.6, Trust.NOT_CONVERGED, Trust.VALID).astype(np.uint8)
    trust[(speed >= 10.6) & (speed < 11.2)] = Trust.EXTRAPOLATED
    gap = trust == Trust.NOT_CONVERGED
    cut = [np.where(gap, np.nan, part) for part in (induced, profile, body, trim, total, power)]
    flown = np.where(gap, -np.inf, endurance)
    far = np.where(gap, -np.inf, distance)
    return SweepResult(
        speed_m_s=speed,
        induced=cut[0],
        profile=cut[1],
        body=cut[2],
        trim=cut[3],
        total=cut[4],
        electric_power_w=cut[5],
        lift_to_drag=weight / cut[4],
        elevator_deg=-4.0 + 0.2 * speed,
        endurance_h=np.where(gap, np.nan, endurance),
        range_km=np.where(gap, np.nan, distance),
        trust=trust,
        best_endurance_speed_m_s=float(speed[np.argmax(flown)]),
        best_range_speed_m_s=float(speed[np.argmax(far)]),
    )


def _balance(values: dict[str, float | str]) -> BalanceResult:
    speed = np.linspace(10.5, 25.0, 25)
    balance = float(values["balance_percent"])
    forward = float(values["balance_forward_percent"])
    return BalanceResult(
        neutral_point_percent=49.0,
        balance_percent=balance,
        forward_balance_percent=forward,
        static_margin_percent=49.0 - balance,
        body_share_percent=math.nan,
        propeller_share_percent=math.nan,
        body_known=False,
        propeller_known=False,
        elevator_cruise_deg=-0.6,
        elevator_landing_forward_deg=-4.4,
        elevator_travel_deg=20.0,
        tail_lift_cruise_n=-0.8,
        speed_m_s=speed,
        elevator_nominal_deg=1.5 - 20.0 * (49.0 - balance) / speed**1.8,
        elevator_forward_deg=1.5 - 20.0 * (49.0 - forward) / speed**1.8,
        trust=valid(25),
    )


def _lift_curve() -> LiftCurveResult:
    angle = np.linspace(-4.0, 16.0, 41)
    lift = 0.085 * (angle + 3.4)
    onset = 10.0
    lift = np.where(angle > onset, 1.139 + 0.04 * np.sin((angle - onset) * 0.6), lift)
    trust = np.where(angle > onset, Trust.INDICATIVE, Trust.VALID).astype(np.uint8)
    stalled = angle >= onset
    return LiftCurveResult(
        angle_deg=angle,
        lift_coefficient=lift,
        trust=trust,
        stalled_from=np.where(stalled, np.maximum(0.0, 0.45 - 0.04 * (angle - onset)), np.nan),
        stalled_to=np.where(stalled, np.minimum(1.0, 0.6 + 0.05 * (angle - onset)), np.nan),
        onset_angle_deg=onset,
        onset_lift_coefficient=1.139,
        largest_lift_coefficient=1.179,
    )


def _section(role: str, name: str, cambered: bool) -> SectionResult:
    levels = np.array([1.0e5, 1.4e5, 2.0e5, 3.0e5, 5.0e5])
    camber = 0.032 if cambered else 0.0
    around = np.linspace(0.0, 2.0 * math.pi, 121)
    x = 0.5 * (1.0 + np.cos(around))
    half = (
        0.6
        * 0.45
        * (0.2969 * np.sqrt(x) - 0.126 * x - 0.3516 * x**2 + 0.2843 * x**3 - 0.1036 * x**4)
    )
    middle = 4.0 * camber * x * (1.0 - x)
    along = np.linspace(0.0, 1.0, 41)
    largest = (1.16 if cambered else 0.85) + 0.07 * np.log(levels / 2e5)
    curves = tuple(
        _curve(level, peak, cambered) for level, peak in zip(levels, largest, strict=True)
    )
    points = tuple(
        MeasuredPoints(
            reynolds=curve.reynolds * 1.01,
            angle_deg=curve.angle_deg[10:45:3],
            lift=curve.lift[10:45:3] + 0.01,
            drag=np.full(12, np.nan),
            moment=curve.moment[10:45:3],
            rising=True,
        )
        for curve in curves
    )
    trust = valid(5)
    trust[0] = Trust.EXTRAPOLATED
    return SectionResult(
        role=role,
        name=name,
        origin="measured" if cambered else "estimated",
        source="A wind tunnel made up for tests.",
        outline_x=x,
        outline_y=middle + np.where(around <= math.pi, half, -half),
        camber_x=along,
        camber_y=4.0 * camber * along * (1.0 - along),
        thickness_percent=9.06,
        camber_percent=100.0 * camber,
        leading_edge_radius_percent=1.12,
        zero_lift_angle_deg=-3.4 if cambered else 0.0,
        moment_coefficient=-0.081 if cambered else 0.0,
        curves=curves,
        points=points if cambered else (),
        limit_reynolds=levels,
        largest_lift_low=largest - 0.05,
        largest_lift=largest,
        largest_lift_high=largest + 0.05,
        knee_angle_deg=np.full(5, 9.5),
        limit_trust=trust,
        unknown_reynolds=((6.2e4, 8.0e4),) if cambered else (),
        landing_reynolds=(1.9e5, 2.7e5) if cambered else (1.2e5, 1.5e5),
        cruise_reynolds=(2.3e5, 3.2e5) if cambered else (1.5e5, 1.8e5),
        findings=(
            "Flat from 9.5 to 14 degrees: the knee, not the maximum, is used for angles.",
            "After a stall, come below 8.5 degrees to recover.",
        )
        if cambered
        else (),
    )


def _curve(reynolds: float, peak: float, cambered: bool) -> PolarCurve:
    angle = np.linspace(-8.0, 18.0, 53)
    attached = 0.105 * (angle + (3.4 if cambered else 0.0))
    lift = np.clip(attached, -0.6, None)
    stall_angle = float(np.interp(peak, attached, angle))
    lift = np.where(angle > stall_angle, peak - 0.02 * (angle - stall_angle), lift)
    trust = np.where(angle > stall_angle + 3.0, Trust.INDICATIVE, Trust.VALID).astype(np.uint8)
    trust[angle < -5.0] = Trust.EXTRAPOLATED
    drag = 0.008 * (2e5 / reynolds) ** 0.4 + 0.008 * (lift - 0.4) ** 2
    drag = drag + 0.012 * np.maximum(0.0, angle - stall_angle)
    return PolarCurve(
        reynolds=reynolds,
        angle_deg=angle,
        lift=lift,
        drag=drag,
        moment=np.full(53, -0.08 if cambered else 0.0) + 0.001 * angle,
        trust=trust,
        origin=np.full(53, Origin.MEASURED if cambered else Origin.ESTIMATED, dtype=np.uint8),
    )


def _margins(
    values: dict[str, float | str], landing: LandingResult, sweep: SweepResult
) -> tuple[Margin, ...]:
    power = float(
        np.interp(float(values["cruise_speed_m_s"]), sweep.speed_m_s, sweep.electric_power_w)
    )
    hours = 333.0 * 0.8 / power
    rows = (
        (
            "landing_over_stall",
            "Landing over stall",
            landing.landing_ratio,
            0.05,
            1.3,
            "at least",
            "",
            "Launch and landing",
            0.05,
        ),
        (
            "launch_over_stall",
            "Launch over stall",
            landing.launch_ratio,
            0.05,
            1.12,
            "at least",
            "",
            "Launch and landing",
            0.05,
        ),
        (
            "static_margin",
            "Static margin",
            49.0 - float(values["balance_percent"]),
            1.0,
            5.0,
            "at least",
            "%",
            "Balance",
            30.0,
        ),
        ("elevator_left", "Elevator left", 78.0, 2.0, 20.0, "at least", "%", "Balance", 5.0),
        (
            "cruise_power",
            "Cruise power",
            power,
            6.0,
            140.0,
            "at most",
            "W",
            "Speed and battery",
            5.0,
        ),
        ("endurance", "Endurance", hours, 0.1, 2.0, "at least", "h", "Speed and battery", 0.1),
        (
            "span",
            "Span",
            float(values["span_m"]),
            0.0,
            float(values["span_max_m"]),
            "at most",
            "m",
            "Wing",
            0.0,
        ),
    )
    margins = []
    for key, label, value, half, limit, sense, unit, sheet, watch in rows:
        room = value - limit if sense == "at least" else limit - value
        verdict = Verdict.FAIL if room < 0.0 else Verdict.WATCH if room < watch else Verdict.PASS
        margins.append(
            Margin(
                key=key,
                label=label,
                value=value,
                low=value - half,
                high=value + half,
                limit=limit,
                sense=sense,
                unit=unit,
                verdict=verdict,
                reason=f"{label} is {value:.3g} {unit}; {sense} {limit:g} {unit} is asked for.",
                sheet=sheet,
            )
        )
    return tuple(margins)


def with_nothing_found(results: Results) -> Results:
    """Make the same results with every solution missing."""

    def blank(span: SpanResult) -> SpanResult:
        count = len(span.y_m)
        gone = np.full(count, np.nan)
        return dataclasses.replace(
            span,
            angle_deg=gone,
            lift=gone,
            drag=gone,
            loading=gone,
            limit_low=gone,
            limit=gone,
            limit_high=gone,
            room=gone,
            knee_room_deg=gone,
            trust=np.full(count, Trust.NOT_CONVERGED, dtype=np.uint8),
        )

    landing = dataclasses.replace(
        results.landing,
        landing_span=blank(results.landing.landing_span),
        onset_span=blank(results.landing.onset_span),
        trust=Trust.NOT_CONVERGED,
        status="no stall speed was found",
        **{
            field.name: math.nan
            for field in dataclasses.fields(results.landing)
            if field.type == "float"
        },
    )
    sweep = results.sweep
    if sweep is not None:
        gone = np.full(len(sweep.speed_m_s), np.nan)
        columns = (
            "induced",
            "profile",
            "body",
            "trim",
            "total",
            "electric_power_w",
            "lift_to_drag",
            "elevator_deg",
            "endurance_h",
            "range_km",
        )
        sweep = dataclasses.replace(
            sweep,
            **dict.fromkeys(columns, gone),
            best_endurance_speed_m_s=math.nan,
            best_range_speed_m_s=math.nan,
            trust=np.full(len(gone), Trust.NOT_CONVERGED, dtype=np.uint8),
        )
    margins = tuple(
        dataclasses.replace(
            margin,
            value=math.nan,
            low=math.nan,
            high=math.nan,
            verdict=Verdict.FAIL,
            reason="No solution was found.",
        )
        for margin in results.margins
    )
    return dataclasses.replace(
        results,
        cruise=dataclasses.replace(
            results.cruise, span=blank(results.cruise.span), trust=Trust.NOT_CONVERGED
        ),
        landing=landing,
        sweep=sweep,
        margins=margins,
    )


class SampleAnalysis:
    """Answers like the real analysis, from the closed forms above."""

    def __init__(self) -> None:
        self.runs: list[frozenset[str]] = []
        self.error: Exception | None = None

    def run(self, inputs: Inputs, *, want: frozenset[str] = frozenset()) -> Results:
        """Make results, or raise what a test put in `error`."""
        self.runs.append(want)
        if self.error is not None:
            raise self.error
        known = inputs.values()
        return make_results(want=want, name=inputs.name, **{key: known[key] for key in DEFAULTS})
