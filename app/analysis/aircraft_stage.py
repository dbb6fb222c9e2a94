"""From the scenario's planform, tail and body to an aircraft and its drawing."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.analysis.results import PlanformResult
from app.inputs import Inputs
from solver.aircraft.configuration import Aircraft, Body, Elevator, assemble
from solver.section.packed import PackedPolars
from solver.wing.planform import TaperedSurface, surface_from_area

GRAVITY = 9.80665
"""Standard acceleration of free fall [m/s2], ISO 2533."""


@dataclass(frozen=True)
class ElevatorLoss:
    """What viscosity and the hinge gap leave of the ideal flap [-]."""

    viscous: float
    gap_debit: float

    @property
    def effectiveness(self) -> float:
        """Share of the ideal flap's effect [-]."""
        return self.viscous * (1.0 - self.gap_debit)


def wing_surface(inputs: Inputs) -> TaperedSurface:
    """Wing of the scenario."""
    wing = inputs.wing
    return TaperedSurface(
        span=wing.span_m,
        root_chord=1e-3 * wing.root_chord_mm,
        tip_chord=1e-3 * wing.tip_chord_mm,
        washout=np.radians(wing.washout_deg),
        dihedral=np.radians(wing.dihedral_deg),
        sweep=np.radians(wing.sweep_deg),
    )


def tail_surface(inputs: Inputs, wing: TaperedSurface) -> TaperedSurface:
    """Tail of the scenario, its arm measured from the wing's mean quarter chord."""
    tail = inputs.tail
    mean_quarter = float(wing.mean_leading_edge + 0.25 * wing.mean_aerodynamic_chord)
    return surface_from_area(
        tail.tail_area_m2,
        aspect_ratio=tail.tail_aspect_ratio,
        taper=tail.tail_taper,
        incidence=float(np.radians(tail.tail_incidence_deg)),
        mean_quarter_chord_x=mean_quarter + tail.tail_arm_m,
        root_z=tail.tail_height_m,
    )


def build_aircraft(inputs: Inputs, polars: PackedPolars, *, viscous_flap: float) -> Aircraft:
    """Assemble wing, tail, body and elevator."""
    wing = wing_surface(inputs)
    tail, body = inputs.tail, inputs.body
    loss = ElevatorLoss(viscous_flap, 0.01 * tail.hinge_gap_debit_percent)
    return assemble(
        wing,
        tail_surface(inputs, wing),
        polars=polars,
        body=Body(
            drag_area=body.body_drag_area_m2,
            length=1e-3 * body.body_length_mm,
            width=1e-3 * body.body_width_mm,
        ),
        elevator=Elevator(
            chord_fraction=0.01 * tail.elevator_chord_percent,
            travel=float(np.radians(tail.elevator_travel_deg)),
            effectiveness=loss.effectiveness,
        ),
        thrust_height=1e-3 * inputs.propulsion.thrust_line_offset_mm,
    )


def planform_result(
    inputs: Inputs, aircraft: Aircraft, *, neutral_point_x: float, thickness: tuple[float, float]
) -> PlanformResult:
    """Outlines from above and the points that matter, x behind the root's leading edge.

    Parameters
    ----------
    inputs : Inputs
    aircraft : Aircraft
    neutral_point_x : float
        [m]
    thickness : tuple of float
        Thickness over chord of root and tip section [-].
    """
    wing = aircraft.wing
    wing_y, wing_x = _outline(wing)
    tail_y, tail_x = _outline(aircraft.tail)
    area, chord = aircraft.area, aircraft.chord
    tail_area, arm = inputs.tail.tail_area_m2, inputs.tail.tail_arm_m
    return PlanformResult(
        wing_y=wing_y,
        wing_x=wing_x,
        tail_y=tail_y,
        tail_x=tail_x,
        area_m2=area,
        aspect_ratio=float(wing.aspect_ratio),
        taper=float(wing.taper),
        mean_chord_m=chord,
        mean_chord_x_m=float(wing.mean_leading_edge),
        mean_chord_y_m=0.5 * inputs.wing.span_m * float(wing.mean_fraction),
        wing_loading_n_m2=inputs.brief.mass_kg * GRAVITY / area,
        tail_volume=tail_area * arm / (area * chord),
        balance_x_m=aircraft.position(0.01 * inputs.balance.balance_percent),
        forward_balance_x_m=aircraft.position(0.01 * inputs.balance.balance_forward_percent),
        neutral_point_x_m=neutral_point_x,
        tip_thickness_mm=thickness[1] * inputs.wing.tip_chord_mm,
        root_thickness_mm=thickness[0] * inputs.wing.root_chord_mm,
    )


def _outline(surface: TaperedSurface) -> tuple[np.ndarray, np.ndarray]:
    """Closed polygon over both halves: y and x."""
    ends = np.array([0.0, 1.0])
    quarter, chord = surface.quarter_chord(ends), surface.chord(ends)
    lead = quarter[:, 0] - 0.25 * chord
    trail = lead + chord
    tip = quarter[1, 1]
    y = np.array([-tip, 0.0, tip, tip, 0.0, -tip, -tip])
    x = np.array([lead[1], lead[0], lead[1], trail[1], trail[0], trail[1], lead[1]])
    return y, x
