"""The stages of an analysis and what each depends on.

    sections -> aircraft -> cruise -> landing -> balance -> margins

Each stage is found again only when the inputs it names have changed: a slider
for speed recomputes no polar and no planform. Curves that only an open sheet
shows are made when that sheet asks for them.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from app.analysis.aircraft_stage import GRAVITY, build_aircraft, planform_result
from app.analysis.flight_stage import (
    Cruise,
    flight_trust,
    lift_curve_result,
    sweep_result,
    trim_result,
)
from app.analysis.landing_stage import LandingFlight, landing_result
from app.analysis.memo import StageMemo
from app.analysis.results import (
    AirResult,
    BalanceResult,
    LiftCurveResult,
    PolarCurve,
    Results,
    SectionResult,
    SweepResult,
)
from app.analysis.section_stage import SectionData, section_data, section_results
from app.analysis.verdicts import judged
from app.inputs import Inputs, SectionSource
from solver.aircraft.configuration import Aircraft
from solver.aircraft.landing import stall_onset
from solver.aircraft.load import Load
from solver.aircraft.speed import Drive, electric_power, level_flight
from solver.aircraft.stability import stability
from solver.aircraft.trim import Trimmed, trim
from solver.atmosphere import Air, standard_atmosphere
from solver.section.finish import finish
from solver.section.packed import HELD, HIGH, LOW, NOMINAL, PackedPolars
from solver.section.packing import pack_with_held
from solver.section.thin_airfoil import viscous_flap_factor

NOTHING_EXTRA: frozenset[str] = frozenset()
EXTRAS = frozenset({"sweep", "lift_curve", "trim_curve"})
TRIM_SPEEDS = 6
BANDS = (LOW, NOMINAL, HIGH)

CAUTIONS = (
    "Estimates for sizing, not certification.",
    "Verify by test: stall and balance in flight at a safe height, before they are relied on.",
    "Local aviation rules and licensed practice decide what may fly, where and over whom.",
)


@dataclass(frozen=True, eq=False)
class Airframe:
    """The aircraft and the sections it is made of."""

    aircraft: Aircraft
    sections: tuple[SectionData, SectionData, SectionData]


class Analysis:
    """Turns inputs into results, remembering what earlier inputs already paid for."""

    def __init__(self) -> None:
        self._memo = StageMemo()

    def run(self, inputs: Inputs, *, want: frozenset[str] = NOTHING_EXTRA) -> Results:
        """Solve one scenario.

        Parameters
        ----------
        inputs : Inputs
        want : frozenset of str
            Any of :data:`EXTRAS`: what an open sheet shows beyond the margins.

        Returns
        -------
        Results

        Raises
        ------
        InputError
            If a section's digits or tables, or a value, cannot be used.
        """
        started = time.perf_counter()
        air = self._air(inputs)
        frame = self._airframe(inputs)
        cruise = self._cruise(inputs, frame, air)
        landing = self._landing(inputs, frame, air)
        sweep = self._sweep(inputs, frame, air, landing) if "sweep" in want else None
        curve = self._lift_curve(inputs, frame, landing) if "lift_curve" in want else None
        trim_curve = self._trim_curve(inputs, frame, air) if "trim_curve" in want else None
        cruise_result = trim_result("cruise", cruise.flight, frame.aircraft, drive_of(inputs))
        verdicts = judged(inputs, frame.aircraft, air, cruise=cruise, landing=landing)
        landed = landing_result(
            landing, frame.aircraft, inputs.brief, counterfactual=verdicts.counterfactual
        )
        balance = _balance_result(inputs, frame.aircraft, cruise, landing, trim_curve)
        return Results(
            name=inputs.name,
            inputs=inputs.values(),
            air=_air_result(inputs, air),
            sections=self._sections(inputs, frame, cruise, landing),
            planform=planform_result(
                inputs,
                frame.aircraft,
                neutral_point_x=frame.aircraft.position(0.01 * balance.neutral_point_percent),
                thickness=(frame.sections[0].thickness, frame.sections[1].thickness),
            ),
            cruise=cruise_result,
            landing=landed,
            balance=balance,
            margins=verdicts.margins,
            sweep=sweep,
            lift_curve=curve,
            reason=verdicts.reason,
            cautions=CAUTIONS,
            solver_ms=1e3 * (time.perf_counter() - started),
        )

    def _air(self, inputs: Inputs) -> Air:
        brief = inputs.brief
        key = (brief.field_altitude_m, brief.temperature_offset_K)
        return self._memo.get(
            "air", key, lambda: standard_atmosphere(key[0], temperature_offset=key[1])
        )

    def _section(self, source: SectionSource) -> SectionData:
        return self._memo.get("section", source, lambda: section_data(source))

    def _sections(
        self, inputs: Inputs, frame: Airframe, cruise: Cruise, landing: LandingFlight
    ) -> tuple[SectionResult, ...]:
        def remembered(which: tuple[int, float], make: Callable[[], PolarCurve]) -> PolarCurve:
            return self._memo.get("curve", (_packed_key(inputs), which), make)

        return section_results(
            frame.sections, cruise.flight.trimmed, landing.flight, remembered=remembered
        )

    def _packed(self, inputs: Inputs) -> PackedPolars:
        wing = inputs.wing

        def make() -> PackedPolars:
            surface = finish(wing.finish)
            return pack_with_held(
                [self._section(source).polar for source in inputs.sections],
                drag_factor=wing.build_drag_factor * surface.drag_factor,
                largest_lift_debit=surface.largest_lift_debit,
            )

        return self._memo.get("packed", _packed_key(inputs), make)

    def airframe(self, inputs: Inputs) -> Airframe:
        """Build the aircraft of a scenario and the sections it is made of."""
        return self._airframe(inputs)

    def _airframe(self, inputs: Inputs) -> Airframe:
        def make() -> Airframe:
            deflection = float(np.radians(0.5 * inputs.tail.elevator_travel_deg))
            viscous = float(viscous_flap_factor(deflection))
            aircraft = build_aircraft(inputs, self._packed(inputs), viscous_flap=viscous)
            root, tip, tail = (self._section(source) for source in inputs.sections)
            return Airframe(aircraft, (root, tip, tail))

        return self._memo.get("airframe", _frame_key(inputs), make)

    def _cruise(self, inputs: Inputs, frame: Airframe, air: Air) -> Cruise:
        brief, balance = inputs.brief, inputs.balance

        def make() -> Cruise:
            load = load_of(inputs, frame.aircraft, air, percent=balance.balance_percent)
            speed = np.full(len(BANDS), brief.cruise_speed_m_s)
            flights = level_flight(frame.aircraft, load, speed=speed, band=np.array(BANDS))
            power = electric_power(drive_of(inputs), drag=flights.drag, speed=speed)
            return Cruise(
                flights=flights,
                stability=stability(frame.aircraft, flights.trimmed.case(NOMINAL)),
                power=(float(power[LOW]), float(power[NOMINAL]), float(power[HIGH])),
                drive=drive_of(inputs),
            )

        key = (
            _flight_key(inputs),
            brief.cruise_speed_m_s,
            balance.balance_percent,
            inputs.propulsion,
        )
        return self._memo.get("cruise", key, make)

    def _landing(self, inputs: Inputs, frame: Airframe, air: Air) -> LandingFlight:
        speed, forward = inputs.brief.landing_speed_m_s, inputs.balance.balance_forward_percent
        load = load_of(inputs, frame.aircraft, air, percent=forward)
        key = (_flight_key(inputs), forward)
        onset = self._memo.get(
            "onset",
            key,
            lambda: stall_onset(frame.aircraft, load, band=np.array((*BANDS, HELD))),
        )
        flight = self._memo.get(
            "landing", (key, speed), lambda: trim(frame.aircraft, load, speed=speed)
        )
        return LandingFlight(flight=flight, onset=onset)

    def _sweep(
        self, inputs: Inputs, frame: Airframe, air: Air, landing: LandingFlight
    ) -> SweepResult:
        brief, percent = inputs.brief, inputs.balance.balance_percent
        found = bool(landing.nominal.found)
        lowest = 1.02 * float(landing.nominal.speed) if found else 0.6 * brief.landing_speed_m_s
        highest = max(1.5 * brief.cruise_speed_m_s, 1.3 * lowest)

        def make() -> SweepResult:
            return sweep_result(
                frame.aircraft,
                load_of(inputs, frame.aircraft, air, percent=percent),
                drive_of(inputs),
                lowest_speed=lowest,
                highest_speed=highest,
                headwind=brief.headwind_m_s,
            )

        key = (
            _flight_key(inputs),
            percent,
            inputs.propulsion,
            lowest,
            highest,
            brief.headwind_m_s,
        )
        return self._memo.get("sweep", key, make)

    def _lift_curve(
        self, inputs: Inputs, frame: Airframe, landing: LandingFlight
    ) -> LiftCurveResult:
        def make() -> LiftCurveResult:
            return lift_curve_result(frame.aircraft, landing.flight, onset=landing.nominal)

        key = (
            _flight_key(inputs),
            inputs.brief.landing_speed_m_s,
            inputs.balance.balance_forward_percent,
        )
        return self._memo.get("lift curve", key, make)

    def _trim_curve(self, inputs: Inputs, frame: Airframe, air: Air) -> Trimmed:
        """Flight over speed, shape (2, speeds): balanced as set, and forward."""
        brief, balance = inputs.brief, inputs.balance
        speed = np.linspace(brief.landing_speed_m_s, 1.3 * brief.cruise_speed_m_s, TRIM_SPEEDS)
        percents = (balance.balance_percent, balance.balance_forward_percent)
        points = np.array([frame.aircraft.position(0.01 * percent) for percent in percents])
        load = load_of(inputs, frame.aircraft, air, percent=percents[0])

        def make() -> Trimmed:
            speeds, balance_x = np.broadcast_arrays(speed, points[:, None])
            return trim(frame.aircraft, replace(load, balance_x=balance_x), speed=speeds)

        key = (_flight_key(inputs), brief.landing_speed_m_s, brief.cruise_speed_m_s, balance)
        return self._memo.get("trim curve", key, make)


def _packed_key(inputs: Inputs) -> tuple[object, ...]:
    """Everything the packed sections depend on."""
    return (inputs.sections, inputs.wing.finish, inputs.wing.build_drag_factor)


def _frame_key(inputs: Inputs) -> tuple[object, ...]:
    """Everything the airframe depends on."""
    return (
        inputs.sections,
        inputs.wing,
        inputs.tail,
        inputs.body,
        inputs.propulsion.thrust_line_offset_mm,
    )


def _flight_key(inputs: Inputs) -> tuple[object, ...]:
    """Everything that any flight depends on beside its speed and balance point."""
    brief = inputs.brief
    air = (brief.field_altitude_m, brief.temperature_offset_K)
    return (*_frame_key(inputs), brief.mass_kg, *air)


def load_of(inputs: Inputs, aircraft: Aircraft, air: Air, *, percent: float) -> Load:
    """Weight at a balance point given in percent of the mean aerodynamic chord."""
    return Load(
        force=inputs.brief.mass_kg * GRAVITY,
        density=air.density,
        kinematic_viscosity=air.kinematic_viscosity,
        balance_x=aircraft.position(0.01 * percent),
    )


def drive_of(inputs: Inputs) -> Drive:
    """Battery, motor and propeller of the scenario."""
    propulsion = inputs.propulsion
    return Drive(
        usable_energy=3600.0 * propulsion.battery_wh * 0.01 * propulsion.usable_percent,
        efficiency=propulsion.propulsive_efficiency,
        avionics_power=propulsion.avionics_w,
        peukert_exponent=propulsion.peukert_exponent,
    )


def _air_result(inputs: Inputs, air: Air) -> AirResult:
    return AirResult(
        altitude_m=inputs.brief.field_altitude_m,
        temperature_K=air.temperature,
        density_kg_m3=air.density,
        kinematic_viscosity_m2_s=air.kinematic_viscosity,
        speed_of_sound_m_s=air.speed_of_sound,
    )


def _balance_result(
    inputs: Inputs,
    aircraft: Aircraft,
    cruise: Cruise,
    landing: LandingFlight,
    curve: Trimmed | None,
) -> BalanceResult:
    balance, propulsion = inputs.balance, inputs.propulsion
    margin = 100.0 * cruise.stability.static_margin - propulsion.propeller_share_percent
    empty = np.empty(0)
    nominal, forward = (empty, empty) if curve is None else np.degrees(curve.elevator)
    no_trust = np.empty(0, dtype=np.uint8)
    return BalanceResult(
        neutral_point_percent=balance.balance_percent + margin,
        balance_percent=balance.balance_percent,
        forward_balance_percent=balance.balance_forward_percent,
        static_margin_percent=margin,
        body_share_percent=100.0 * cruise.stability.body_share,
        propeller_share_percent=propulsion.propeller_share_percent,
        body_known=aircraft.body.known,
        propeller_known=propulsion.propeller_share_percent > 0.0,
        elevator_cruise_deg=float(np.degrees(cruise.flight.trimmed.elevator)),
        elevator_landing_forward_deg=float(np.degrees(landing.flight.elevator)),
        elevator_travel_deg=inputs.tail.elevator_travel_deg,
        tail_lift_cruise_n=float(cruise.flight.trimmed.tail_lift),
        speed_m_s=empty if curve is None else curve.speed[0],
        elevator_nominal_deg=nominal,
        elevator_forward_deg=forward,
        trust=no_trust if curve is None else flight_trust(curve.state).max(axis=0),
    )
