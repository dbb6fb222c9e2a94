"""One wing's flight as a table in its own variables, for sliders in a report.

Drag, elevator and loading of a trimmed aircraft depend on two numbers only: the
lift coefficient and speed over viscosity. Mass, speed and altitude are read off
that table, since they do no more than lead to the two. Stall depends on one
number, the weight over density and viscosity squared. Both are interpolated with
cubics through four neighbours; :mod:`app.analysis.report_check` says how well.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.analysis.aircraft_stage import GRAVITY
from app.analysis.flight_stage import flight_trust
from app.analysis.report_reading import Axis, FlightTable, Reach
from app.analysis.results import Trust
from app.inputs import Inputs
from solver.aircraft.configuration import Aircraft
from solver.aircraft.landing import stall_onset
from solver.aircraft.load import Load
from solver.aircraft.speed import Drive, level_flight
from solver.atmosphere import standard_atmosphere
from solver.section.packed import HIGH, LOW, NOMINAL

FloatArray = NDArray[np.float64]

SHARES, SPEEDS, STALLS, ALTITUDES = 32, 14, 24, 61
"""How many lift coefficients, speeds over viscosity, weights and altitudes are tabled."""

COLUMNS = ("induced", "profile", "trim_induced", "trim_profile", "elevator_deg")
"""The first four are drag coefficients on the wing's area."""

MASS_FROM, MASS_TO = 0.75, 1.3
ALTITUDE_BELOW, ALTITUDE_ABOVE = 500.0, 2500.0
ALTITUDE_ENDS = (-400.0, 6000.0)
BANDS = (LOW, NOMINAL, HIGH)


def own_load(aircraft: Aircraft, force: FloatArray, *, percent: float) -> Load:
    """Load in the wing's own variables: density and viscosity are 1.

    Parameters
    ----------
    aircraft : Aircraft
    force : ndarray, shape (...)
        Weight over density and viscosity squared [-].
    percent : float
        Balance point, of the mean aerodynamic chord.

    Returns
    -------
    Load
    """
    return Load(
        force=force,
        density=1.0,
        kinematic_viscosity=1.0,
        balance_x=aircraft.position(0.01 * percent),
    )


def reach_of(inputs: Inputs, *, stall_speed: float) -> Reach:
    """Choose the ends of the sliders around a scenario.

    Parameters
    ----------
    inputs : Inputs
    stall_speed : float
        Of the scenario itself [m/s].

    Returns
    -------
    Reach
        The scenario lies inside all three.
    """
    brief = inputs.brief
    highest = max(1.5 * brief.cruise_speed_m_s, 1.3 * brief.landing_speed_m_s)
    low = max(ALTITUDE_ENDS[0], brief.field_altitude_m - ALTITUDE_BELOW)
    high = min(ALTITUDE_ENDS[1], brief.field_altitude_m + ALTITUDE_ABOVE)
    return Reach(
        mass=(
            _round(MASS_FROM * brief.mass_kg, up=False),
            _round(MASS_TO * brief.mass_kg, up=True),
        ),
        speed=(float(np.floor(0.95 * stall_speed)), float(np.ceil(highest))),
        altitude=(float(np.floor(low / 50.0) * 50.0), float(np.ceil(high / 50.0) * 50.0)),
    )


def _round(mass: float, *, up: bool) -> float:
    step = 0.1 if mass >= 1.0 else 0.01
    whole = np.ceil(mass / step - 1e-9) if up else np.floor(mass / step + 1e-9)
    return round(float(whole) * step, 2)


def flight_table(inputs: Inputs, aircraft: Aircraft, *, stall_speed: float) -> FlightTable | None:
    """Solve the table of one scenario.

    Parameters
    ----------
    inputs : Inputs
    aircraft : Aircraft
    stall_speed : float
        Of the scenario itself [m/s]; NaN where none was found.

    Returns
    -------
    FlightTable or None
        None where no onset of stall was found over the whole reach: without it
        nobody could say which flights there are.
    """
    if not np.isfinite(stall_speed):
        return None
    reach = reach_of(inputs, stall_speed=stall_speed)
    altitude = Axis(*reach.altitude, ALTITUDES)
    offset = inputs.brief.temperature_offset_K
    airs = [standard_atmosphere(float(h), temperature_offset=offset) for h in altitude.points]
    density = np.array([air.density for air in airs])
    viscosity = np.array([air.kinematic_viscosity for air in airs])
    thin = density * np.square(viscosity)
    weights = GRAVITY * np.array([reach.mass[0] / thin.max(), reach.mass[1] / thin.min()])
    fastest = reach.speed[1] / viscosity.min()
    found = _onsets(inputs, aircraft, weights=weights, fastest=fastest)
    if found is None:
        return None
    log_weight, stall, log_speed, knee = found
    least = GRAVITY * reach.mass[0] / (0.5 * density.max() * reach.speed[1] ** 2 * aircraft.area)
    share = Axis(0.9 * float(least / knee.max()), 1.0, SHARES)
    columns, lift, trust = _flights(inputs, aircraft, share=share, log_speed=log_speed, knee=knee)
    on_wing = aircraft.on_wing
    cosine = aircraft.lattice.cos_sweep[on_wing]
    chord = aircraft.lattice.chord
    reynolds = np.exp(log_speed.points)[:, None] * chord * np.square(aircraft.lattice.cos_sweep)
    limit = [
        aircraft.polars.limits(reynolds, band=band).largest_lift[:, on_wing] * np.square(cosine)
        for band in BANDS
    ]
    return FlightTable(
        reach=reach,
        area=aircraft.area,
        body=aircraft.body.drag_area / aircraft.area,
        share=share,
        log_speed=log_speed,
        log_weight=log_weight,
        knee=knee,
        columns=columns,
        lift=lift,
        limit=np.swapaxes(np.stack(limit), 1, 2),
        stall=stall,
        trust=trust,
        y_m=aircraft.lattice.point[on_wing, 1],
        altitude=altitude,
        density=density,
        viscosity=viscosity,
    )


def _onsets(
    inputs: Inputs, aircraft: Aircraft, *, weights: FloatArray, fastest: float
) -> tuple[Axis, FloatArray, Axis, FloatArray] | None:
    """Stall over weight at the forward balance point, and the knee over speed at the other."""
    balance = inputs.balance
    log_weight = Axis(float(np.log(weights[0])), float(np.log(weights[1])), STALLS)
    forward = own_load(aircraft, np.exp(log_weight.points), percent=balance.balance_forward_percent)
    # A band at a time: each is a batch over weight.
    stalls = [stall_onset(aircraft, forward, band=band) for band in BANDS]
    if not all(bool(np.all(onset.found)) for onset in stalls):
        return None
    # The knee belongs to a speed, which is found from a weight: far enough for the fastest.
    slowest = float(np.exp(log_weight.first) / (0.5 * aircraft.area))
    force = np.geomspace(0.5 * slowest * aircraft.area * 0.9, 1.5 * aircraft.area * fastest**2, 40)
    onset = stall_onset(
        aircraft, own_load(aircraft, force, percent=balance.balance_percent), band=NOMINAL
    )
    if int(np.sum(onset.found)) < 8 or not bool(onset.found[0]):
        return None
    speed = onset.trimmed.speed[onset.found]
    knee = onset.trimmed.lift_area[onset.found] / aircraft.area
    first = float(np.log(speed[0]))
    log_speed = Axis(first, float(np.log(max(fastest, 1.2 * speed[0]))), SPEEDS)
    order = np.argsort(speed)
    at = np.interp(log_speed.points, np.log(speed[order]), knee[order])
    log_stall = np.log(np.stack([onset.speed for onset in stalls]))
    return log_weight, log_stall, log_speed, at


def _flights(
    inputs: Inputs, aircraft: Aircraft, *, share: Axis, log_speed: Axis, knee: FloatArray
) -> tuple[FloatArray, FloatArray, NDArray[np.uint8]]:
    speed = np.broadcast_to(np.exp(log_speed.points), (SHARES, SPEEDS)).ravel()
    lift_coefficient = (share.points[:, None] * knee).ravel()
    solved = solved_flights(inputs, aircraft, lift_coefficient=lift_coefficient, speed=speed)
    shape = (SHARES, SPEEDS)
    return (
        solved.columns.reshape(len(COLUMNS), *shape),
        solved.lift.reshape(-1, *shape),
        solved.trust.reshape(shape),
    )


@dataclass(frozen=True, eq=False)
class Solved:
    """Full solves of n flights: columns (5, n), local lift (stations, n), trust (n,)."""

    columns: FloatArray
    lift: FloatArray
    trust: NDArray[np.uint8]


def solved_flights(
    inputs: Inputs, aircraft: Aircraft, *, lift_coefficient: FloatArray, speed: FloatArray
) -> Solved:
    """Trim at given lift coefficients and speeds over viscosity.

    Parameters
    ----------
    inputs : Inputs
    aircraft : Aircraft
    lift_coefficient, speed : ndarray, shape (n,)
        [-], [1/m]

    Returns
    -------
    Solved
        NaN where nothing converged.
    """
    pressure_area = 0.5 * np.square(speed) * aircraft.area
    load = own_load(
        aircraft, lift_coefficient * pressure_area, percent=inputs.balance.balance_percent
    )
    flight = level_flight(aircraft, load, speed=speed)
    found = flight.converged
    parts = [
        getattr(flight, name) / pressure_area
        for name in ("induced", "profile", "trim_induced", "trim_profile")
    ]
    columns = np.stack([*parts, np.degrees(flight.trimmed.elevator)])
    lift = flight.trimmed.state.lift[:, aircraft.on_wing].T
    trust = flight_trust(flight.trimmed.state)
    return Solved(
        columns=np.where(found, columns, np.nan),
        lift=np.where(found, lift, np.nan),
        trust=np.where(found, trust, Trust.NOT_CONVERGED).astype(np.uint8),
    )


def drive_numbers(drive: Drive) -> dict[str, float]:
    """Battery, motor and propeller by name, as the report's sliders take them."""
    return {
        "usable_energy_j": drive.usable_energy,
        "efficiency": drive.efficiency,
        "avionics_w": drive.avionics_power,
        "peukert_exponent": drive.peukert_exponent,
    }
