"""What lies along a section at one point: pressures, layers and the wake."""

from __future__ import annotations

import numpy as np
import pytest

from solver.section.flow import (
    FlowSettings,
    PointStatus,
    SectionFlow,
    distributions,
    section_flow,
)
from solver.section.geometry import naca_outline

pytestmark = [pytest.mark.usefixtures("compiled_kernels"), pytest.mark.slow]

ITERATION = 2e-4
"""Of lift: iteration stops when thicknesses and speeds change by less than this."""
SECTION = naca_outline("2412")
ANGLE = np.radians(np.arange(0.0, 8.0, 1.0))
REYNOLDS = np.array([1e5, 2e5])


@pytest.fixture(scope="module")
def flow(compiled_kernels) -> SectionFlow:
    return section_flow(SECTION, angle=ANGLE, reynolds=REYNOLDS)


def test_pressures_along_the_section_give_the_lift_of_the_polar(flow):
    i = int(np.argmin(np.abs(ANGLE - np.radians(5.0))))
    one = distributions(SECTION, angle=float(ANGLE[i]), reynolds=float(REYNOLDS[1]))
    assert one.status == PointStatus.CONVERGED
    n = one.body
    mean = 0.5 * (one.pressure[1:n] + one.pressure[: n - 1])
    along, across = -np.sum(mean * np.diff(one.y[:n])), np.sum(mean * np.diff(one.x[:n]))
    lift = across * np.cos(one.angle) - along * np.sin(one.angle)
    assert lift == pytest.approx(flow.lift[i, 1], abs=ITERATION)


def test_layers_along_the_section_agree_with_its_stations(flow):
    i = int(np.argmin(np.abs(ANGLE - np.radians(3.0))))
    one = distributions(SECTION, angle=float(ANGLE[i]), reynolds=float(REYNOLDS[0]))
    n, stagnation = one.body, one.stagnation
    upper = np.arange(stagnation, -1, -1)
    lowest = int(np.argmin(one.speed[:n]))
    assert lowest in (stagnation, stagnation + 1)
    laminar = upper[np.isfinite(one.amplification[upper])]
    turn = flow.transition_upper[i, 0]
    assert one.x[laminar[-1]] < turn < one.x[laminar[-1] - 1]
    assert (one.amplification[laminar] <= FlowSettings().critical_amplification).all()
    parted = upper[one.friction[upper] < 0.0]
    assert flow.separation_upper[i, 0] < one.x[parted[0]]
    assert flow.reattachment_upper[i, 0] > one.x[parted[-1]]
    assert one.H[parted].max() > 4.0  # laminar layers part there


def test_the_wake_takes_up_what_both_sides_bring():
    one = distributions(SECTION, angle=0.05, reynolds=3e5)
    n = one.body
    assert len(one.x) > n + 10
    assert one.x[n:].max() == pytest.approx(2.0, abs=0.05)  # a chord long, nearly level
    assert np.diff(one.arc).min() > 0.0
    both = one.theta[0] + one.theta[n - 1]
    # The first wake panel is short: theta changes by little along it.
    assert one.theta[n] == pytest.approx(both, rel=0.05)
    assert not one.friction[n:].any()
    assert np.array_equal(one.H, one.dstar / one.theta)


def test_a_point_that_is_not_found_has_places_and_no_layers(monkeypatch):
    from solver.section.boundary_layer import point, solve, sweep

    monkeypatch.setattr(sweep, "iterate", lambda *_, **__: point.Outcome(solve.BROKEN, 1, 1.0))
    one = distributions(SECTION, angle=0.05, reynolds=3e5)
    assert one.status == PointStatus.MISSING
    assert one.stagnation == -1
    assert np.isfinite(one.x).all()
    assert np.isnan(one.speed).all()
    assert np.isnan(one.H).all()
