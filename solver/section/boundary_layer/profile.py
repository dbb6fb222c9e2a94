"""The layers of one point, station by station."""

from __future__ import annotations

import numpy as np

from solver.section.boundary_layer.forces import wall_pressures
from solver.section.boundary_layer.layout import FloatArray, LayerState
from solver.section.boundary_layer.point import Conditions, SectionPanels
from solver.section.boundary_layer.readings import half_friction
from solver.section.boundary_layer.sweep import FOUND, LOST, solve_single
from solver.section.flow_results import Distributions, PointStatus


def profile(
    panels: SectionPanels, conditions: Conditions, *, angle: float, reynolds: float
) -> Distributions:
    """Solve one point and lay its layers out along body and wake.

    Parameters
    ----------
    panels : SectionPanels
    conditions : Conditions
    angle : float
        [rad]
    reynolds : float
        [-]

    Returns
    -------
    Distributions
    """
    state, ended = solve_single(panels, conditions, angle=angle, reynolds=reynolds)
    wake, nodes = panels.influence(angle).wake, panels.nodes
    columns = {
        "x": np.append(nodes.x, wake.x[1:]),
        "y": np.append(nodes.y, wake.y[1:]),
        "arc": np.append(nodes.arc, nodes.arc[-1] + wake.distance[1:]),
    }
    status = PointStatus.CONVERGED if ended == FOUND else PointStatus.APPROXIMATE
    if state is None or ended == LOST:
        status = PointStatus.MISSING
        nothing = np.full(panels.total, np.nan)
        for name in ("pressure", "speed", "theta", "dstar", "H", "friction", "amplification"):
            columns[name] = nothing.copy()
    else:
        columns |= _layers(panels, conditions, state, reynolds)
    for array in columns.values():
        array.setflags(write=False)
    return Distributions(
        angle=angle,
        reynolds=reynolds,
        status=status,
        body=panels.count,
        stagnation=-1 if state is None else int(state.place[0]),
        **columns,
    )


def _layers(
    panels: SectionPanels, conditions: Conditions, state: LayerState, reynolds: float
) -> dict[str, FloatArray]:
    count, behind = panels.count, panels.total - panels.count
    theta, dstar, speed = np.exp(state.stations[:, :3].T)
    wall = wall_pressures(state.stations, panels.curvature, conditions.constants.wall_curvature)
    half = half_friction(state.stations, state.laminar, count, reynolds)
    amplification = np.where(state.laminar[:count], state.amplification, np.nan)
    return {
        "pressure": np.append(wall, 1.0 - speed[count:] ** 2),
        "speed": speed,
        "theta": theta,
        "dstar": dstar,
        "H": dstar / theta,
        "friction": np.append(2.0 * half * speed[:count] ** 2, np.zeros(behind)),
        "amplification": np.append(amplification, np.full(behind, np.nan)),
    }
