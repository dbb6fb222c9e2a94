"""A small aircraft with analytic sections, for tests of trim, speed and landing."""

from __future__ import annotations

import numpy as np
from scipy.optimize import brentq

from solver.aircraft.configuration import Aircraft, Body, Elevator, assemble
from solver.aircraft.load import Load
from solver.section.packed import SectionLimits, SectionValues
from solver.wing.planform import TaperedSurface, surface_from_area

DENSITY, VISCOSITY = 1.2, 1.5e-5
# Where the lift of AnalyticSections is 98 % of its peak, over the angle of the peak.
KNEE = float(brentq(lambda x: x * np.exp((1.0 - x**6) / 6.0) - 0.98, 0.5, 1.0))
MASS_FORCE = 40.0


class AnalyticSections:
    """Sections whose lift rounds off over angle and falls with Reynolds number.

    cl = a x exp(-(x/s)^6 / 6) with x the angle above zero lift: the peak lies at
    x = s, and s grows with Reynolds number to the power `growth`.
    """

    def __init__(self, *, camber_deg=3.0, moment=-0.06, growth=0.05, stall_deg=14.0, drag=0.01):
        self.names = ("wing", "wing", "tail")
        self.estimated = (False, False, False)
        self.zero = np.radians([-camber_deg, -camber_deg, 0.0])
        self.zero_lift_angle = np.broadcast_to(self.zero[None, :, None], (3, 3, 2))
        self.moment = np.array([moment, moment, 0.0])
        self.growth, self.stall, self.drag = growth, np.radians(stall_deg), drag
        self.slope = 2.0 * np.pi
        self.lowest_reynolds = np.full(3, 1e4)
        self.highest_reynolds = np.full(3, 1e6)

    def _stall(self, reynolds, band):
        shift = np.array([0.95, 1.0, 1.05])[np.asarray(band)]
        return self.stall * (np.asarray(reynolds) / 2e5) ** self.growth * shift

    def evaluate(self, angle, reynolds, *, band, section):
        x = np.asarray(angle) - self.zero[section]
        share = (x / self._stall(reynolds, band)) ** 6
        fade = np.exp(-share / 6.0)
        lift = self.slope * x * fade
        lift_slope = self.slope * fade * (1.0 - share)
        none = np.zeros_like(lift)
        drag = self.drag * (2e5 / np.asarray(reynolds)) ** 0.3 + 0.008 * lift**2
        return SectionValues(
            lift=lift,
            lift_slope=lift_slope,
            drag=drag + none,
            drag_slope=0.016 * lift * lift_slope,
            moment=self.moment[section] + none,
            moment_slope=none,
        )

    def limits(self, reynolds, *, band, section):
        stall = self._stall(reynolds, band) + 0.0 * self.zero[section]
        return SectionLimits(
            largest_lift=self.slope * stall * np.exp(-1.0 / 6.0),
            knee_angle=self.zero[section] + KNEE * stall,
            peak_angle=self.zero[section] + stall,
        )

    def trust(self, angle, reynolds, *, section):
        return np.zeros(np.broadcast_shapes(np.shape(angle), np.shape(reynolds)), np.uint8)


def small_aircraft(sections=None, *, tail_area=0.08, tail_height=0.06, **changes) -> Aircraft:
    shape = {"span": 2.2, "root_chord": 0.26, "tip_chord": 0.2, "washout": 0.02}
    wing = TaperedSurface(**{**shape, **changes})
    quarter = float(wing.mean_leading_edge + 0.25 * wing.mean_aerodynamic_chord)
    tail = surface_from_area(
        tail_area,
        aspect_ratio=4.0,
        taper=0.7,
        mean_quarter_chord_x=quarter + 0.8,
        root_z=tail_height,
    )
    return assemble(
        wing,
        tail,
        polars=sections or AnalyticSections(),
        body=Body(drag_area=0.006, length=0.9, width=0.12),
        elevator=Elevator(chord_fraction=0.3, travel=np.radians(20.0), effectiveness=0.6),
    )


def load(aircraft: Aircraft, *, balance=0.3, force=MASS_FORCE) -> Load:
    return Load(
        force=force,
        density=DENSITY,
        kinematic_viscosity=VISCOSITY,
        balance_x=aircraft.position(balance),
    )
