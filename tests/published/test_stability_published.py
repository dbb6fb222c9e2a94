"""The neutral point against a published rule for small aircraft.

M. Drela, MIT 16.Unified Lab 11 Notes, Basic Aircraft Design Rules, 16 Apr 2009,
eq. (5): x_np/c = 1/4 + (1 + 2/A)/(1 + 2/A_h) (1 - 4/(A + 2)) V_h.
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from solver.aircraft.configuration import Body
from solver.aircraft.stability import stability
from solver.aircraft.trim import trim
from tests.aircraft_cases import AnalyticSections, load, small_aircraft

pytestmark = pytest.mark.published

TAIL_ARM = 0.8


@pytest.mark.parametrize("tail_area", [0.04, 0.06, 0.08, 0.1])
@pytest.mark.parametrize("span", [1.8, 2.2, 3.0])
def test_the_neutral_point_follows_the_rule(tail_area, span):
    aircraft = small_aircraft(
        AnalyticSections(growth=0.0), tail_area=tail_area, tail_height=0.15, span=span
    )
    aircraft = dataclasses.replace(aircraft, body=Body(drag_area=0.006))
    found = stability(aircraft, trim(aircraft, load(aircraft), speed=20.0))
    assert found.converged
    aspect_ratio, tail_aspect_ratio = float(aircraft.wing.aspect_ratio), 4.0
    volume = tail_area * TAIL_ARM / (aircraft.area * aircraft.chord)
    slopes = (1.0 + 2.0 / aspect_ratio) / (1.0 + 2.0 / tail_aspect_ratio)
    rule = 0.25 + slopes * (1.0 - 4.0 / (aspect_ratio + 2.0)) * volume
    # The rule takes the downwash far behind an elliptic wing and slopes 2 pi A/(A + 2):
    # at these arms the near field and the height of the tail move it by 4 % of chord.
    assert 0.3 + found.static_margin == pytest.approx(rule, abs=0.04)


def test_a_bigger_tail_moves_it_aft_in_proportion():
    margins = []
    for tail_area in (0.04, 0.06, 0.08):
        aircraft = small_aircraft(AnalyticSections(growth=0.0), tail_area=tail_area)
        margins.append(
            stability(aircraft, trim(aircraft, load(aircraft), speed=20.0)).static_margin
        )
    steps = np.diff(margins)
    # Linear in the tail's area but for the lift it adds itself.
    assert steps[1] == pytest.approx(steps[0], rel=0.15)
