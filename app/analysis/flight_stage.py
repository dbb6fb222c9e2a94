"""Trimmed flight: one speed, many speeds, and along the span."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from app.analysis.results import (
    DragParts,
    LiftCurveResult,
    SpanResult,
    SweepResult,
    TrimResult,
    Trust,
)
from solver.aircraft.configuration import WING, Aircraft
from solver.aircraft.landing import StallOnset
from solver.aircraft.load import Load
from solver.aircraft.speed import Drive, LevelFlight, electric_power, endurance, level_flight
from solver.aircraft.stability import Stability
from solver.aircraft.trim import Trimmed
from solver.section.packed import HIGH, LOW, NOMINAL
from solver.wing.forces import station_forces
from solver.wing.influence import influence
from solver.wing.lifting_line import Flow, Loading, solve
from solver.wing.stall import Room, follow, least_angle_room, room, stalling_range

FloatArray = NDArray[np.float64]
TrustArray = NDArray[np.uint8]

SOLVED_SPEEDS, SHOWN_SPEEDS = 11, 41
"""Speeds solved, and speeds shown: a cubic spline through the former, where all of them
were found and none is stalled; a test holds what it adds."""
CURVE_FROM, CURVE_STEP, CURVE_POINTS = np.radians(-4.0), np.radians(1.0), 10
STALLED_STEP, STALLED_POINTS = np.radians(1.5), 5
"""How the lift curve is followed from the onset of stall on."""
SAFELY_BELOW = np.radians(1.0)
"""Distance from the onset up to which the angles need not be followed one by one [rad]."""


@dataclass(frozen=True, eq=False)
class Cruise:
    """Cruise for the band of drag (low, nominal and high lift), and its stability."""

    flights: LevelFlight
    stability: Stability
    power: tuple[float, float, float]
    drive: Drive

    @cached_property
    def flight(self) -> LevelFlight:
        """The nominal one."""
        return self.flights.case(NOMINAL)


def span_result(condition: str, state: Loading, aircraft: Aircraft) -> SpanResult:
    """One single flight along the half-wing, root to tip."""
    on_wing = aircraft.on_wing
    left: Room = room(state)
    low, high = room(state, band=LOW), room(state, band=HIGH)
    mean_chord = float(aircraft.wing.mean_chord)
    trust = station_trust(state)

    def of_wing(values: FloatArray) -> FloatArray:
        return np.array(values[..., on_wing])

    return SpanResult(
        condition=condition,
        y_m=of_wing(state.flow.lattice.point[:, 1]),
        chord_m=of_wing(state.flow.lattice.chord),
        reynolds=of_wing(state.flow.reynolds()),
        angle_deg=np.degrees(of_wing(state.section_angle)),
        lift=of_wing(state.lift),
        drag=of_wing(state.drag),
        loading=of_wing(state.lift * state.flow.lattice.chord / mean_chord),
        limit_low=of_wing(low.limit),
        limit=of_wing(left.limit),
        limit_high=of_wing(high.limit),
        room=of_wing(left.lift),
        knee_room_deg=np.degrees(of_wing(left.angle)),
        trust=trust[on_wing],
    )


def station_trust(state: Loading) -> TrustArray:
    """Trust code of every station; not converged outweighs all."""
    flow = state.flow
    codes = flow.polars.trust(state.section_angle, flow.reynolds())
    lost = ~np.asarray(state.converged)[..., None]
    return np.where(lost, np.uint8(Trust.NOT_CONVERGED), codes).astype(np.uint8)


def flight_trust(state: Loading) -> TrustArray:
    """Worst trust code of the wing's stations, shape of the batch."""
    on_wing = state.flow.lattice.surface == WING
    return np.asarray(station_trust(state)[..., on_wing].max(axis=-1))


TRUST_WORDS = {
    Trust.VALID: "inside the sections' data",
    Trust.EXTRAPOLATED: "some stations lie outside the Reynolds numbers or angles of their data",
    Trust.INDICATIVE: "some stations are past their stall: indicative only",
    Trust.NOT_CONVERGED: "no balanced flight was found at this speed",
}


def trim_result(
    condition: str, flight: LevelFlight, aircraft: Aircraft, drive: Drive
) -> TrimResult:
    """One single trimmed flight in the units of the screen."""
    trimmed = flight.trimmed
    drag = flight.drag
    speed = float(trimmed.speed)
    trust = Trust(int(flight_trust(trimmed.state)))
    return TrimResult(
        condition=condition,
        speed_m_s=speed,
        angle_deg=float(np.degrees(trimmed.angle)),
        elevator_deg=float(np.degrees(trimmed.elevator)),
        lift_coefficient=float(trimmed.lift_area) / aircraft.area,
        tail_lift_n=float(trimmed.tail_lift),
        drag=DragParts(
            induced=float(flight.induced),
            profile=float(flight.profile),
            body=float(flight.body),
            trim_induced=float(flight.trim_induced),
            trim_profile=float(flight.trim_profile),
        ),
        lift_to_drag=float(trimmed.load.force / drag),
        electric_power_w=float(electric_power(drive, drag=drag, speed=np.asarray(speed))),
        trust=trust,
        status=TRUST_WORDS[trust],
        span=span_result(condition, trimmed.state, aircraft),
    )


def sweep_result(
    aircraft: Aircraft,
    load: Load,
    drive: Drive,
    *,
    lowest_speed: float,
    highest_speed: float,
    headwind: float,
) -> SweepResult:
    """Level flight over speed.

    Parameters
    ----------
    aircraft : Aircraft
    load : Load
    drive : Drive
    lowest_speed, highest_speed : float
        [m/s]
    headwind : float
        Taken off the speed over ground for the range [m/s].
    """
    # Even in 1/V: close together near the stall, where the drag bends most.
    solved = 1.0 / np.linspace(1.0 / lowest_speed, 1.0 / highest_speed, SOLVED_SPEEDS)
    flight = level_flight(aircraft, load, speed=solved)
    trust = flight_trust(flight.trimmed.state)
    trust = np.where(flight.converged, trust, Trust.NOT_CONVERGED).astype(np.uint8)
    parts = np.stack(
        [
            flight.induced,
            flight.profile,
            flight.body,
            flight.trim_induced + flight.trim_profile,
            np.degrees(flight.trimmed.elevator),
        ]
    )
    speed = solved
    if np.all(trust < Trust.INDICATIVE):
        speed = 1.0 / np.linspace(1.0 / lowest_speed, 1.0 / highest_speed, SHOWN_SPEEDS)
        parts = CubicSpline(-1.0 / solved, parts, axis=1)(-1.0 / speed)
        trust = trust[np.abs(solved[None, :] - speed[:, None]).argmin(axis=1)]
    return _sweep_of(speed, parts, trust, load=load, drive=drive, headwind=headwind)


def _sweep_of(
    speed: FloatArray,
    parts: FloatArray,
    trust: TrustArray,
    *,
    load: Load,
    drive: Drive,
    headwind: float,
) -> SweepResult:
    """Power, time and distance that go with the parts of the drag."""
    induced, profile, body, trimming, elevator = parts
    drag = induced + profile + body + trimming
    power = electric_power(drive, drag=drag, speed=speed)
    time = endurance(drive, power=power)
    distance = np.maximum(speed - headwind, 0.0) * time
    usable = trust < Trust.INDICATIVE
    return SweepResult(
        speed_m_s=speed,
        induced=induced,
        profile=profile,
        body=body,
        trim=trimming,
        total=drag,
        electric_power_w=power,
        lift_to_drag=load.force / drag,
        elevator_deg=elevator,
        endurance_h=time / 3600.0,
        range_km=1e-3 * distance,
        trust=trust,
        best_endurance_speed_m_s=_best(speed, time, usable),
        best_range_speed_m_s=_best(speed, distance, usable),
    )


def _best(speed: FloatArray, value: FloatArray, usable: NDArray[np.bool_]) -> float:
    """Speed of the largest usable value, by the parabola through its neighbours."""
    if not usable.any():
        return float("nan")
    index = int(np.argmax(np.where(usable, value, -np.inf)))
    inside = 0 < index < speed.size - 1 and bool(usable[index - 1] and usable[index + 1])
    if not inside:
        return float(speed[index])
    around = slice(index - 1, index + 2)
    bend, slope, _ = np.polyfit(speed[around] - speed[index], value[around], 2)
    return float(speed[index] - 0.5 * slope / bend) if bend < 0.0 else float(speed[index])


def lift_curve_result(aircraft: Aircraft, flight: Trimmed, *, onset: StallOnset) -> LiftCurveResult:
    """Lift of wing and tail over angle at one speed, elevator held where it trims.

    Parameters
    ----------
    aircraft : Aircraft
    flight : Trimmed
        A single flight, whose speed and elevator are held.
    onset : StallOnset
        The same aircraft where its first station stalls.
    """
    onset_angle = float(onset.trimmed.angle) if bool(onset.found) else 0.0
    below_onset = max(onset_angle - SAFELY_BELOW, CURVE_FROM + CURVE_STEP)
    first = np.linspace(CURVE_FROM, below_onset, CURVE_POINTS)
    beyond = below_onset + SAFELY_BELOW + STALLED_STEP * np.arange(STALLED_POINTS)
    angles = np.concatenate([first, beyond])
    field = influence(aircraft.lattice, wake_angle=angles)
    base = replace(flight.state.flow, band=NOMINAL)

    # Before the onset the solution is the only one, so all angles go at once; beyond
    # it each starts from the one below.
    below = solve(replace(base, influence=field.case(slice(first.size))), first)

    def flow_at(angle: float) -> Flow:
        return replace(base, influence=field.case(int(np.argmin(np.abs(angles - angle)))))

    branch = follow(flow_at, beyond, start=below.circulation[-1])
    states = (below, *branch.states)
    lift = np.concatenate([_lift_coefficient(state, aircraft) for state in states])
    ranges = [stalling_range(state) for state in states]
    room_left = np.concatenate([np.atleast_1d(least_angle_room(state)) for state in states])
    started = np.maximum.accumulate(room_left < 0.0)
    trust = np.concatenate([np.atleast_1d(flight_trust(state)) for state in states])
    trust = np.where(started & (trust < Trust.INDICATIVE), Trust.INDICATIVE, trust)
    return LiftCurveResult(
        angle_deg=np.degrees(np.concatenate([first, branch.angle])),
        lift_coefficient=lift,
        trust=trust.astype(np.uint8),
        stalled_from=np.concatenate([np.atleast_1d(low) for low, _ in ranges]),
        stalled_to=np.concatenate([np.atleast_1d(high) for _, high in ranges]),
        onset_angle_deg=float(np.degrees(onset.trimmed.angle)),
        onset_lift_coefficient=float(onset.trimmed.lift_area) / aircraft.area,
        largest_lift_coefficient=_first_peak(lift, trust < Trust.NOT_CONVERGED),
    )


def _lift_coefficient(state: Loading, aircraft: Aircraft) -> FloatArray:
    """Lift of the whole aircraft on the wing's area, at least one-dimensional [-]."""
    flow = state.flow
    forces = station_forces(
        flow.lattice,
        flow.influence,
        circulation=state.circulation,
        angle_of_attack=state.angle_of_attack,
    )
    return np.atleast_1d(np.sum(forces.lift, axis=-1)) / aircraft.area


def _first_peak(lift: FloatArray, converged: NDArray[np.bool_]) -> float:
    """First local maximum of the converged branch; its last value where it still rises."""
    values = lift[converged]
    if not values.size:
        return float("nan")
    falls = np.flatnonzero(np.diff(values) < 0.0)
    return float(values[falls[0]] if falls.size else values[-1])
