"""The compiled boundary layer marched under given speeds, against computed layers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest

from solver.section.boundary_layer.cells import scratch
from solver.section.boundary_layer.layout import Regime, Stagnation, Stations, blank_state
from solver.section.boundary_layer.start import start_side
from tests.published.tables import numbers, rows
from tests.solver.section import second_closures as closures
from tests.solver.section.kernel_constants import constants

pytestmark = [pytest.mark.published, pytest.mark.slow]

FOLDER = "boundary_layer"
NEVER = 1e9
"""Amplification, or place of a trip, that is not reached."""


@dataclass(frozen=True, eq=False)
class Marched:
    """Stations of a side; speeds differ from the given ones where H was prescribed."""

    xi: np.ndarray
    theta: np.ndarray
    dstar: np.ndarray
    ue: np.ndarray
    amplification: np.ndarray
    turbulent_from: int
    reynolds: float

    @property
    def H(self) -> np.ndarray:
        return self.dstar / self.theta

    @property
    def Rt(self) -> np.ndarray:
        return self.reynolds * self.ue * self.theta


def march(
    xi: np.ndarray,
    ue: np.ndarray,
    *,
    reynolds: float = 1e5,
    critical: float = NEVER,
    trip: float = NEVER,
) -> Marched:
    """March a lower side whose stagnation point is at xi = 0."""
    count = len(xi) + 1
    state = blank_state(count, 0)
    state.stations[1:, 2] = np.log(ue)
    stations, regime = (
        Stations(np.append(0.0, xi), np.zeros(1)),
        Regime(reynolds, critical, constants()),
    )
    start_side(1, Stagnation(0, 0.0), stations, trip, regime, state, scratch())
    theta, dstar, speed = np.exp(state.stations[1:, :3].T)
    first = int(state.turbulent_from[1])
    return Marched(xi, theta, dstar, speed, state.amplification[1:], first - 1, reynolds)


def similar_layers() -> list[dict[str, float]]:
    wanted = (1.0, 0.5, 0.2, 0.0, -0.05, -0.1, -0.15)
    return [row for row in numbers(f"{FOLDER}/falkner_skan.csv") if row["beta"] in wanted]


@pytest.mark.parametrize("row", similar_layers(), ids=lambda row: f"beta={row['beta']:g}")
def test_speeds_that_are_powers_give_similar_layers(row):
    xi = np.geomspace(1e-3, 1.0, 200)
    layer = march(xi, xi ** row["m"])
    scale = np.sqrt(2.0 / (row["m"] + 1.0)) / np.sqrt(1e5 * layer.ue[-1] / xi[-1])
    # Model error of the closures: 1.1 % in H at the stagnation point, less elsewhere.
    assert layer.H[-1] == pytest.approx(row["H"], rel=0.012)
    assert layer.theta[-1] == pytest.approx(row["theta"] * scale, rel=0.01)


def howarth(cells: int) -> Marched:
    xi = np.append(np.geomspace(1e-5, 0.04, cells), np.linspace(0.04, 0.13, cells)[1:])
    return march(xi, 1.0 - xi)


def test_howarths_layer():
    layer = howarth(120)
    table = [row for row in numbers(f"{FOLDER}/howarth.csv") if row["x"] <= 0.1]
    assert len(table) == 10
    for row in table:
        theta = np.interp(row["x"], layer.xi, layer.theta) * np.sqrt(1e5)
        # Model error of the closures, growing towards separation.
        assert theta == pytest.approx(row["theta"], rel=0.006)
        assert np.interp(row["x"], layer.xi, layer.H) == pytest.approx(row["H"], rel=0.025)


def test_howarths_layer_separates_at_0_120():
    layer = howarth(240)
    let_go = layer.xi[int(np.argmax(np.abs(layer.ue - 1.0 + layer.xi) > 1e-12))]
    # The speed is let go where H passes 3.7: in the computed layer that is at 0.119;
    # model error 2 %.
    assert let_go == pytest.approx(0.120, abs=0.004)
    assert np.all(np.isfinite(layer.theta))
    assert np.all(np.diff(layer.theta) > 0.0)  # and the march goes on behind it


SLOWED = {
    "Tani U=1-x^2": lambda x: 1.0 - x**2,
    "Tani U=1-x^4": lambda x: 1.0 - x**4,
    "Tani U=1-x^8": lambda x: 1.0 - x**8,
    "U=sin x (cylinder potential 2 sin)": np.sin,
}


@pytest.mark.parametrize("case", SLOWED)
def test_laminar_separation(case):
    (row,) = [one for one in rows(f"{FOLDER}/laminar_separation.csv") if one["case"] == case]
    place = float(row["x_sep_numerical"])
    xi = np.append(np.geomspace(1e-5, 0.3 * place, 100), np.linspace(0.3, 1.05, 300)[1:] * place)
    speed = SLOWED[case](xi)
    layer = march(xi, speed)
    let_go = xi[int(np.argmax(np.abs(layer.ue / speed - 1.0) > 1e-12))]
    # Model error of the closures, and of taking H of 3.7 for separation: early by up
    # to 1 % of the way, late by up to 3 %.
    assert let_go == pytest.approx(place, rel=0.03)


@pytest.mark.parametrize("level", [4, 7, 9, 11])
def test_amplification_on_a_flat_plate(level):
    (row,) = [one for one in numbers(f"{FOLDER}/en_envelope.csv") if one["H"] == 2.591]
    xi = np.geomspace(1e-3, 1.0, 400)
    layer = march(xi, np.ones(400), reynolds=5e6)
    reached = np.interp(level, layer.amplification, layer.Rt)
    # Model error: the fit of the layer's growth along the plate is 2 % low, and
    # growth comes in over a ramp.
    assert reached == pytest.approx(row[f"Re_theta_N{level}"], rel=0.03)


@pytest.mark.parametrize("level", [4.0, 9.0])
def test_transition_comes_where_amplification_is_critical(level):
    xi = np.geomspace(1e-3, 1.0, 400)
    laminar = march(xi, np.ones(400), reynolds=5e6)
    found = march(xi, np.ones(400), reynolds=5e6, critical=level)
    assert found.turbulent_from == int(np.argmax(laminar.amplification > level))
    ahead = slice(0, found.turbulent_from)
    assert np.array_equal(found.theta[ahead], laminar.theta[ahead])
    assert found.H[-1] < 1.6 < 2.55 < laminar.H[-1]


def test_turbulent_flat_plate():
    xi = np.geomspace(1e-4, 1.0, 300)
    layer = march(xi, np.ones(300), reynolds=1e7, trip=0.005)
    assert xi[layer.turbulent_from - 1] <= 0.005 < xi[layer.turbulent_from]
    Rt, H = layer.Rt[layer.turbulent_from :], layer.H[layer.turbulent_from :]
    assert Rt[0] < 200.0
    table = [row for row in numbers(f"{FOLDER}/turbulent_flat_plate.csv") if row["Re_theta"] >= 700]
    assert len(table) == 8
    for row in table:
        shape = np.interp(row["Re_theta"], Rt, H)
        friction = closures.turbulent_friction(shape, np.array(row["Re_theta"]))
        # Oesterlund's correlation of measurements is good to 1 or 2 %; Green's and Head's
        # methods in the table are 3 to 10 % away from it.
        assert float(friction) == pytest.approx(row["cf_osterlund"], rel=0.04)
    # Drag of the whole plate by what it has taken from the stream, against friction summed.
    after = slice(layer.turbulent_from, None)
    friction = closures.turbulent_friction(layer.H[after], layer.Rt[after])
    summed = 0.5 * np.trapezoid(friction, xi[after])
    assert layer.theta[-1] - layer.theta[layer.turbulent_from] == pytest.approx(summed, rel=2e-3)
