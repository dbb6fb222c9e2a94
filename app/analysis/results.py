"""What one analysis of a scenario found: frozen arrays, masks and texts.

Everything the screen, the command line or a report shows comes from here. The
module imports nothing of the solver, so that what shows a result cannot compute
one. SI units; angles in degrees, since this is where numbers leave the solver.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import IntEnum, StrEnum

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
TrustArray = NDArray[np.uint8]


class Trust(IntEnum):
    """How far one value of an array can be believed; the larger code wins."""

    VALID = 0
    EXTRAPOLATED = 1
    """Outside the Reynolds numbers or angles that the section's data cover."""
    INDICATIVE = 2
    """Beyond stall, where the method only sketches the trend."""
    NOT_CONVERGED = 3
    """No solution was found: the plot shows a gap."""


class Origin(IntEnum):
    """Where one cell of a section's table comes from."""

    MEASURED = 0
    COMPUTED = 1
    ESTIMATED = 2
    FILLED = 3


class Verdict(StrEnum):
    """The answer to one requirement."""

    PASS = "pass"
    WATCH = "watch"
    FAIL = "fail"


@dataclass(frozen=True)
class Margin:
    """How far one value is from its limit, and what that means.

    Fields
    ------
    key : str
        Stable name, for example ``landing_over_stall``.
    label : str
        What the screen calls it.
    value, low, high : float
        Nominal value and its band, in `unit`. NaN where it could not be found;
        `reason` then says why.
    limit : float
        The requirement, in `unit`.
    sense : str
        ``"at least"`` or ``"at most"``.
    unit : str
        Display unit of value, band and limit; empty for a ratio.
    verdict : Verdict
        Pass, watch or fail.
    reason : str
        One or two plain sentences.
    sheet : str
        Name of the sheet where it is explained.
    """

    key: str
    label: str
    value: float
    low: float
    high: float
    limit: float
    sense: str
    unit: str
    verdict: Verdict
    reason: str
    sheet: str

    @property
    def margin(self) -> float:
        """Distance from the limit, positive when met, in `unit`."""
        return self.value - self.limit if self.sense == "at least" else self.limit - self.value


@dataclass(frozen=True)
class AirResult:
    """The air at the field."""

    altitude_m: float
    temperature_K: float  # noqa: N815 - the unit's symbol
    density_kg_m3: float
    kinematic_viscosity_m2_s: float
    speed_of_sound_m_s: float


@dataclass(frozen=True)
class PolarCurve:
    """One section at one Reynolds number, over angle; arrays of shape (n,)."""

    reynolds: float
    angle_deg: FloatArray
    lift: FloatArray
    drag: FloatArray
    moment: FloatArray
    trust: TrustArray
    origin: TrustArray


@dataclass(frozen=True)
class MeasuredPoints:
    """The points of one wind-tunnel run, as read from the table; arrays (n,).

    A lift run has NaN in `drag`, a drag run NaN in `moment`: these mark absent
    columns and are never shown.
    """

    reynolds: float
    angle_deg: FloatArray
    lift: FloatArray
    drag: FloatArray
    moment: FloatArray
    rising: bool


@dataclass(frozen=True)
class SectionResult:
    """One section as used by the wing or the tail.

    `limit_*` arrays have shape (k,) over `limit_reynolds`; the three largest-lift
    arrays are the low, nominal and high ends of the confidence band.
    """

    role: str
    name: str
    origin: str
    source: str
    outline_x: FloatArray
    outline_y: FloatArray
    camber_x: FloatArray
    camber_y: FloatArray
    thickness_percent: float
    camber_percent: float
    leading_edge_radius_percent: float
    zero_lift_angle_deg: float
    moment_coefficient: float
    curves: tuple[PolarCurve, ...]
    points: tuple[MeasuredPoints, ...]
    limit_reynolds: FloatArray
    largest_lift_low: FloatArray
    largest_lift: FloatArray
    largest_lift_high: FloatArray
    knee_angle_deg: FloatArray
    limit_trust: TrustArray
    unknown_reynolds: tuple[tuple[float, float], ...]
    landing_reynolds: tuple[float, float]
    cruise_reynolds: tuple[float, float]
    findings: tuple[str, ...]


@dataclass(frozen=True)
class PlanformResult:
    """The wing and tail from above, and the points that balance them.

    Positions x are behind the leading edge of the wing root [m]; outlines are
    closed polygons over both halves, shape (n,).
    """

    wing_y: FloatArray
    wing_x: FloatArray
    tail_y: FloatArray
    tail_x: FloatArray
    area_m2: float
    aspect_ratio: float
    taper: float
    mean_chord_m: float
    mean_chord_x_m: float
    mean_chord_y_m: float
    wing_loading_n_m2: float
    tail_volume: float
    balance_x_m: float
    forward_balance_x_m: float
    neutral_point_x_m: float
    tip_thickness_mm: float
    root_thickness_mm: float


@dataclass(frozen=True)
class SpanResult:
    """One flight condition along the half-wing, root to tip; arrays (n,).

    `limit_*` is the largest section lift at the local Reynolds number, `room`
    the nominal limit less the local lift; `knee_room_deg` is the angle left to
    the knee of the lift curve.
    """

    condition: str
    y_m: FloatArray
    chord_m: FloatArray
    reynolds: FloatArray
    angle_deg: FloatArray
    lift: FloatArray
    drag: FloatArray
    loading: FloatArray
    limit_low: FloatArray
    limit: FloatArray
    limit_high: FloatArray
    room: FloatArray
    knee_room_deg: FloatArray
    trust: TrustArray


@dataclass(frozen=True)
class DragParts:
    """Drag split into its parts [N]; `trim_*` is what the tail's load adds."""

    induced: float
    profile: float
    body: float
    trim_induced: float
    trim_profile: float

    @property
    def total(self) -> float:
        """All of it [N]."""
        return self.induced + self.profile + self.body + self.trim_induced + self.trim_profile


@dataclass(frozen=True)
class TrimResult:
    """The aircraft in steady level flight at one speed."""

    condition: str
    speed_m_s: float
    angle_deg: float
    elevator_deg: float
    lift_coefficient: float
    tail_lift_n: float
    drag: DragParts
    lift_to_drag: float
    electric_power_w: float
    trust: Trust
    status: str
    span: SpanResult


@dataclass(frozen=True)
class LiftCurveResult:
    """Wing-and-tail lift over angle at landing speed; arrays (n,).

    `stalled_from`, `stalled_to` mark, as a share of the half-span, the stations
    within a per cent of their own limit at that angle (NaN where none is).
    """

    angle_deg: FloatArray
    lift_coefficient: FloatArray
    trust: TrustArray
    stalled_from: FloatArray
    stalled_to: FloatArray
    onset_angle_deg: float
    onset_lift_coefficient: float
    largest_lift_coefficient: float


@dataclass(frozen=True)
class SweepResult:
    """Level flight over speed; arrays (n,). Drag in N, power in W."""

    speed_m_s: FloatArray
    induced: FloatArray
    profile: FloatArray
    body: FloatArray
    trim: FloatArray
    total: FloatArray
    electric_power_w: FloatArray
    lift_to_drag: FloatArray
    elevator_deg: FloatArray
    endurance_h: FloatArray
    range_km: FloatArray
    trust: TrustArray
    best_endurance_speed_m_s: float
    best_range_speed_m_s: float


@dataclass(frozen=True)
class BalanceResult:
    """Longitudinal balance at cruise. Shares are percent of mean aerodynamic chord."""

    neutral_point_percent: float
    balance_percent: float
    forward_balance_percent: float
    static_margin_percent: float
    body_share_percent: float
    propeller_share_percent: float
    body_known: bool
    propeller_known: bool
    elevator_cruise_deg: float
    elevator_landing_forward_deg: float
    elevator_travel_deg: float
    tail_lift_cruise_n: float
    speed_m_s: FloatArray
    elevator_nominal_deg: FloatArray
    elevator_forward_deg: FloatArray
    trust: TrustArray


@dataclass(frozen=True)
class StationRisk:
    """Low-Reynolds-number risk at one place on the half-wing at landing speed."""

    place: str
    y_m: float
    reynolds: float
    level: Verdict
    reason: str


@dataclass(frozen=True)
class LandingResult:
    """Stall speed in trim at the forward balance point, and what is left above it.

    The three stall speeds are for the low, nominal and high largest lift of the
    sections. Ratios carry the whole band: polars, airspeed error, mass.
    """

    stall_speed_low_m_s: float
    stall_speed_m_s: float
    stall_speed_high_m_s: float
    onset_lift_coefficient: float
    landing_ratio: float
    landing_ratio_low: float
    landing_ratio_high: float
    launch_ratio: float
    launch_ratio_low: float
    launch_ratio_high: float
    speed_to_lose_m_s: float
    lift_margin_percent: float
    angle_margin_deg: float
    bank_deg: float
    gust_m_s: float
    onset_from: float
    onset_to: float
    onset_words: str
    high_reynolds_ratio: float
    counterfactual: str
    landing_span: SpanResult
    onset_span: SpanResult
    risks: tuple[StationRisk, ...]
    sentences: tuple[str, ...]
    status: str
    trust: Trust


@dataclass(frozen=True)
class Results:
    """Everything found about one scenario.

    `sweep` and `lift_curve` are None until a sheet that shows them asks.
    `inputs` holds the scenario's values by name, for stating what was solved.
    """

    name: str
    inputs: Mapping[str, float | str]
    air: AirResult
    sections: tuple[SectionResult, ...]
    planform: PlanformResult
    cruise: TrimResult
    landing: LandingResult
    balance: BalanceResult
    margins: tuple[Margin, ...]
    sweep: SweepResult | None
    lift_curve: LiftCurveResult | None
    reason: str
    cautions: tuple[str, ...]
    solver_ms: float
