"""Points as the solver finds them: what the second residual leaves of every equation there."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import pytest

from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.boundary_layer.layout import LayerState
from solver.section.boundary_layer.point import (
    Conditions,
    SectionPanels,
    iterate,
    place_of_trip,
    read,
)
from solver.section.boundary_layer.solve import AT_REST, SHEET_AT_REST
from solver.section.boundary_layer.sweep import FOUND, solve_single
from solver.section.boundary_layer.wake_path import prepared
from solver.section.geometry import Outline, naca_outline
from solver.section.panelling import panel_nodes
from tests.published.measured_sections import outline
from tests.solver.section import second_residual as second
from tests.solver.section.second_residual import Side

pytestmark = [pytest.mark.usefixtures("compiled_kernels"), pytest.mark.slow]

CRITICAL = 9.0
STAGNATION_H = 2.2162
"""Of Hiemenz' layer, which the first two stations of a side are."""
MORE_STEPS = 40
"""Newton steps past the solver's end, to rounding."""


@dataclass(frozen=True)
class Case:
    """A point; angle in degrees, trips at shares of chord."""

    section: str
    angle: float
    reynolds: float
    trips: tuple[float, float] | None = None

    def outline(self) -> Outline:
        digits = self.section.isdigit()
        return naca_outline(self.section) if digits else outline(self.section)


BUBBLE = Case("sd7037", 4.0, 1e5)
LAMINAR = Case("naca0009", 0.5, 6e4)
LEVEL = Case("naca0009", 0.0, 6e4)
TRIPPED = Case("naca2414", 3.0, 2e5, (0.1, 0.2))
FAST = Case("2412", 2.0, 3e6)
LOADED = Case("s1223", 8.0, 2e5)
TWO = ("theta", "dstar")
CASES = (BUBBLE, LAMINAR, TRIPPED, FAST, LOADED)


@dataclass(frozen=True, eq=False)
class Found:
    """A point that was found."""

    panels: SectionPanels
    conditions: Conditions
    state: LayerState
    angle: float
    reynolds: float


@lru_cache(maxsize=8)
def solve(case: Case) -> Found:
    nodes = panel_nodes(case.outline())
    constants, shares = ClosureConstants(), case.trips or (None, None)
    upper = place_of_trip(nodes, shares[0], lower=False)
    lower = place_of_trip(nodes, shares[1], lower=True)
    conditions = Conditions(CRITICAL, upper, lower, constants)
    panels, angle = prepared(nodes, constants), float(np.radians(case.angle))
    state, ended = solve_single(panels, conditions, angle=angle, reynolds=case.reynolds)
    assert ended == FOUND
    assert state is not None
    return Found(panels, conditions, state, angle, case.reynolds)


@lru_cache(maxsize=8)
def refine(case: Case) -> Found:
    """Go on where the solver ends."""
    found = solve(case)
    same = found.panels, found.conditions, found.state.copy()
    for _ in range(MORE_STEPS):
        iterate(*same, angle=found.angle, reynolds=found.reynolds, iterations=1)
    return Found(*same, found.angle, found.reynolds)


# --- what is left


def sides(found: Found) -> tuple[Side, Side]:
    """Upper and lower side from the stagnation point to the trailing edge."""
    state, arc = found.state, found.panels.nodes.arc
    before, place = int(state.place[0]), state.place[1]
    theta, dstar, ue, shear = np.exp(state.stations.T)

    def side(at: np.ndarray) -> Side:
        xi, n = np.abs(arc[at] - place), state.amplification[at]
        return Side(xi, theta[at], dstar[at], ue[at], n, shear[at])

    return side(np.arange(before, -1, -1)), side(np.arange(before + 1, found.panels.count))


def trips(found: Found) -> tuple[float | None, float | None]:
    """Distances of the trips from the stagnation point."""
    place, conditions = found.state.place[1], found.conditions
    upper, lower = conditions.trip_upper, conditions.trip_lower
    return (None if upper is None else place - upper, None if lower is None else lower - place)


def wake(found: Found) -> Side:
    """The wake, beginning with what both sides bring."""
    count = found.panels.count
    ends = [
        second.begun(side, reynolds=found.reynolds, critical=CRITICAL, trip=trip)
        for side, trip in zip(sides(found), trips(found), strict=True)
    ]
    stations = np.exp(found.state.stations[count:].T)
    begins = np.array(second.joined(*ends))[:, None]
    theta, dstar, ue, shear = np.hstack([begins, stations])
    # Only logarithms of its places enter: they are counted from one chord on.
    xi = 1.0 + found.panels.influence(found.angle).wake.distance
    return Side(xi, theta, dstar, ue, np.full_like(xi, np.nan), shear)


def layers_left(found: Found) -> dict[str, np.ndarray]:
    """What is left of the layers' equations in every cell, by name.

    The first cell of a side lies between the two stations of the stagnation point.
    """
    left: dict[str, np.ndarray] = {}
    for name, side, trip in zip(("upper", "lower"), sides(found), trips(found), strict=True):
        all_cells = second.wall_residuals(
            side, reynolds=found.reynolds, critical=CRITICAL, trip=trip
        )
        for equation in ("momentum", "shape", "growth", "lag"):
            left[f"{name} {equation}"] = getattr(all_cells, equation)[1:]
        exact = second.stagnation_theta(side.xi, side.ue, reynolds=found.reynolds)
        left[f"{name} stagnation"] = np.log(side.theta / exact)[:2]
        left[f"{name} stagnation H"] = (side.dstar / side.theta)[:2] - STAGNATION_H
    behind = second.wake_residuals(wake(found), reynolds=found.reynolds)
    for equation in ("momentum", "shape", "lag"):
        left[f"wake {equation}"] = getattr(behind, equation)
    return left


def signed_defects(found: Found) -> tuple[np.ndarray, np.ndarray]:
    """Mass defects along the order of the nodes, and those of the wake from its beginning."""
    count, before = found.panels.count, int(found.state.place[0])
    dstar, ue = np.exp(found.state.stations[:, 1:3].T)
    signed = dstar * ue * np.where(np.arange(len(ue)) <= before, -1.0, 1.0)
    return signed, np.append(signed[count - 1] - signed[0], signed[count:])


def coupling_left(found: Found) -> np.ndarray:
    """Speed at the edge of the layers, less that of the potential flow they displace."""
    flow = found.panels.influence(found.angle)
    signed, behind = signed_defects(found)
    potential = flow.along * np.cos(found.angle) + flow.across * np.sin(found.angle)
    potential = potential + flow.defect @ signed - flow.sheet @ (found.state.sheet * behind)
    return np.asarray(np.sign(signed) * np.exp(found.state.stations[:, 2]) - potential)


def place_left(found: Found) -> float:
    """Place of the stagnation point, less where the speed between its nodes vanishes."""
    before, arc = int(found.state.place[0]), found.panels.nodes.arc
    first, after = np.exp(found.state.stations[before : before + 2, 2])
    between = np.interp(0.0, [-first, after], arc[before : before + 2])
    return float(found.state.place[1] - between)


def sheet_left(found: Found) -> np.ndarray:
    """The wake's vortex sheet, less what the curvature of the flow along it makes of it.

    Of strength kappa (dstar + theta) ue; dstar at most 2.5 theta, and fading beyond.
    """
    flow, count = found.panels.influence(found.angle), found.panels.count
    signed, behind = signed_defects(found)
    across = flow.normal_along * np.cos(found.angle) + flow.normal_across * np.sin(found.angle)
    across = across + flow.normal_defect @ signed - flow.normal_sheet @ (found.state.sheet * behind)
    ue = np.exp(found.state.stations[count - 1 :, 2])
    path = np.arctan2(np.diff(flow.wake.y), np.diff(flow.wake.x))
    direction = path + np.arctan2(across, 0.5 * (ue[1:] + ue[:-1]))
    layer, distance = wake(found), flow.wake.distance
    half = np.maximum(0.02, layer.theta + layer.dstar)
    middle = 0.5 * (distance[1:] + distance[:-1])
    turn = np.interp(distance + half, middle, direction)
    turn = turn - np.interp(distance - half, middle, direction)
    H = layer.dstar / layer.theta
    thick = layer.theta * (1.0 + np.minimum(H, 2.5)) * np.minimum(1.0, 2.5 / H) ** 3
    mass = layer.dstar * np.append(behind[0] / layer.dstar[0], layer.ue[1:])
    return np.asarray(found.state.sheet * mass - turn / (2.0 * half) * thick * mass / layer.dstar)


# --- the tests


def names(case: Case) -> str:
    return f"{case.section} at {case.angle:g} and {case.reynolds:g}"


@pytest.mark.parametrize("case", CASES, ids=names)
def test_little_is_left_where_the_solver_comes_to_rest(case):
    found = solve(case)
    # The last step changed everything by less than the share AT_REST, and Newton leaves
    # the square of that; but the first stations follow the stagnation point one step late.
    assert np.max(np.abs(coupling_left(found))) < AT_REST
    for name, left in layers_left(found).items():
        weight = np.ones_like(left)
        if name in ("upper momentum", "upper shape", "lower momentum", "lower shape"):
            # A speed that is off by AT_REST is so by more as a share where it is small,
            # times up to 2 + H in these equations.
            weight[0] = sides(found)[name.startswith("lower")].ue[1] / (2.0 + STAGNATION_H)
        applies = ~np.isnan(left)
        assert np.all(np.abs(left * weight)[applies] < AT_REST), name
    assert np.max(np.abs(sheet_left(found))) < SHEET_AT_REST


def test_a_stagnation_point_on_a_node_is_felt_by_its_neighbours_only():
    found = solve(LEVEL)
    before, near = int(found.state.place[0]), 4
    assert abs(found.state.place[1] - found.panels.nodes.arc[found.panels.count // 2]) < 1e-5
    coupling = np.abs(coupling_left(found))
    coupling[before - near : before + near + 2] = 0.0
    assert np.max(coupling) < AT_REST
    for name, left in layers_left(found).items():
        on_side = left[near:] if name.startswith(("upper", "lower")) else left
        applies = ~np.isnan(on_side)
        assert np.all(np.abs(on_side)[applies] < AT_REST), name
    # Both sides are alike in the end: their thickness forgets how it began.
    theta, dstar = (np.array([getattr(side, name)[-1] for side in sides(found)]) for name in TWO)
    assert theta[0] == pytest.approx(theta[1], rel=AT_REST)
    assert dstar[0] == pytest.approx(dstar[1], rel=AT_REST)


@pytest.mark.parametrize("case", CASES, ids=names)
def test_nothing_is_left_where_newtons_method_ends(case):
    found = refine(case)
    # What forty steps leave that converge linearly (a factor of 1/2 where slowest: at the
    # first stations and in the wake's sheet), 1e-3 at first; elsewhere rounding.
    for name, left in layers_left(found).items():
        applies = ~np.isnan(left)
        assert np.all(np.abs(left)[applies] < 1e-9), name
    assert np.max(np.abs(coupling_left(found))) < 1e-9
    assert abs(place_left(found)) < 1e-9
    assert np.max(np.abs(sheet_left(found))) < 1e-9


@pytest.mark.parametrize("case", CASES, ids=names)
def test_the_last_steps_move_no_force(case):
    (lift, drag, moment), last = forces(solve(case)), forces(refine(case))
    # By no more than the iteration stops at: lift and moment as speeds, drag as a thickness.
    assert lift == pytest.approx(last[0], abs=AT_REST)
    assert drag == pytest.approx(last[1], rel=AT_REST)
    assert moment == pytest.approx(last[2], abs=AT_REST)


def forces(found: Found) -> np.ndarray:
    """Lift, drag, moment."""
    same = found.panels, found.conditions, found.state
    return read(*same, angle=found.angle, reynolds=found.reynolds)[:3]


def test_drag_is_that_of_the_wakes_end():
    found = solve(FAST)
    assert forces(found)[1] == pytest.approx(second.drag(wake(found)), rel=1e-12)  # rounding


def test_the_points_have_what_they_were_chosen_for():
    upper, _ = sides(solve(BUBBLE))
    share = second.turbulent_share(upper, critical=CRITICAL)
    ahead = int(np.argmax(share > 0.0))
    assert 0.0 < share[ahead] < 1.0  # transition lies in a cell
    assert np.max((upper.dstar / upper.theta)[:ahead]) > 4.5  # growth in reversed flow
    for case in (LAMINAR, LEVEL):
        for side in sides(solve(case)):
            assert np.all(second.turbulent_share(side, critical=CRITICAL) == 0.0)
    lacking = [CRITICAL - side.amplification[-1] for side in sides(solve(LAMINAR))]
    assert 0.0 < min(lacking) < 4.0  # the wake begins with what these waves have
    for side, trip in zip(sides(solve(TRIPPED)), trips(solve(TRIPPED)), strict=True):
        share = second.turbulent_share(side, critical=CRITICAL, trip=trip)
        assert 0.0 < share[np.argmax(share > 0.0)] < 1.0
        assert np.max(side.amplification) < CRITICAL
    fast, _ = sides(solve(FAST))
    assert np.max(3e6 * fast.ue * fast.theta) > 5000.0
