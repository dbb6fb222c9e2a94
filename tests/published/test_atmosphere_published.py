"""The atmosphere against ICAO's constants tabulated and against an independent package."""

from __future__ import annotations

import csv
from pathlib import Path

import ambiance
import pytest

from solver.atmosphere import standard_atmosphere

pytestmark = pytest.mark.published
TABLE = Path(__file__).parent / "data" / "wing" / "standard_atmosphere.csv"


def _rows() -> list[dict[str, float]]:
    lines = [line for line in TABLE.read_text().splitlines() if not line.startswith("#")]
    return [{key: float(value) for key, value in row.items()} for row in csv.DictReader(lines)]


@pytest.mark.parametrize("row", _rows(), ids=lambda row: f"{row['H_geopotential_m']:.0f}m")
def test_the_table_is_met_to_its_print_precision(row):
    air = standard_atmosphere(row["H_geopotential_m"])
    # Nine significant figures are printed: half a unit in the last is at most 5e-9.
    close = lambda value: pytest.approx(value, rel=5e-9)  # noqa: E731 - one tolerance, six uses
    assert air.temperature == close(row["T_K"])
    assert air.pressure == close(row["p_Pa"])
    assert air.density == close(row["rho_kgm3"])
    assert air.dynamic_viscosity == close(row["mu_Pas"])
    assert air.kinematic_viscosity == close(row["nu_m2s"])
    assert air.speed_of_sound == close(row["a_ms"])


@pytest.mark.parametrize("altitude", [-1000.0, -500.0, 0.0, 120.0, 2600.0, 6000.0, 10_900.0])
def test_an_independent_package_agrees(altitude):
    # The package is entered with geometric height; ICAO eq. (8) links the two.
    radius = 6_356_766.0
    other = ambiance.Atmosphere(radius * altitude / (radius - altitude))
    air = standard_atmosphere(altitude)
    # Both evaluate the same closed forms. Below sea level the package starts from
    # the pressure printed for -5 km, 1.77687e5 Pa: half a unit in its last figure
    # is 2.8e-6. Above, only rounding stands between the two.
    printed = 3e-6 if altitude < 0.0 else 1e-9
    assert air.temperature == pytest.approx(float(other.temperature[0]), rel=1e-12)
    assert air.pressure == pytest.approx(float(other.pressure[0]), rel=printed)
    assert air.density == pytest.approx(float(other.density[0]), rel=printed)
    assert air.dynamic_viscosity == pytest.approx(float(other.dynamic_viscosity[0]), rel=1e-12)
    assert air.speed_of_sound == pytest.approx(float(other.speed_of_sound[0]), rel=1e-12)
