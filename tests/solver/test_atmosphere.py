from __future__ import annotations

import math

import pytest

from solver.atmosphere import STANDARD_GRAVITY, standard_atmosphere
from solver.errors import InputError


@pytest.mark.parametrize("offset", [-40.0, 15.0, 40.0])
def test_an_offset_keeps_pressure_and_moves_density_as_a_perfect_gas(offset):
    standard = standard_atmosphere(2600.0)
    air = standard_atmosphere(2600.0, temperature_offset=offset)
    assert air.pressure == standard.pressure
    # Identity of the perfect gas: rounding only.
    assert air.density * air.temperature == pytest.approx(
        standard.density * standard.temperature, rel=1e-14
    )
    assert air.temperature - standard.temperature == pytest.approx(offset, abs=1e-9)


def test_warm_air_is_thinner_more_viscous_and_carries_sound_faster():
    cold, warm = (standard_atmosphere(1500.0, temperature_offset=dt) for dt in (-15.0, 15.0))
    assert warm.density < cold.density
    assert warm.dynamic_viscosity > cold.dynamic_viscosity
    assert warm.speed_of_sound > cold.speed_of_sound


@pytest.mark.parametrize("altitude", [-900.0, 0.0, 3000.0, 9000.0])
def test_pressure_is_in_hydrostatic_balance(altitude):
    # dp/dH = -rho g0, by a central difference over 2 m; its error is of the
    # order of (1/8000)^2 relative, far below the tolerance.
    step = 1.0
    low, high = (standard_atmosphere(altitude + dh).pressure for dh in (-step, step))
    here = standard_atmosphere(altitude)
    assert (high - low) / (2 * step) == pytest.approx(-here.density * STANDARD_GRAVITY, rel=1e-6)


def test_sound_at_the_freezing_point_as_in_textbooks():
    # 331.3 m/s at 273.15 K is the textbook value, to its four figures.
    offset = 273.15 - standard_atmosphere(0.0).temperature
    assert standard_atmosphere(0.0, temperature_offset=offset).speed_of_sound == pytest.approx(
        331.3, abs=0.05
    )


@pytest.mark.parametrize("bad", [-1000.1, 11_000.1, math.nan, math.inf, -math.inf])
def test_an_altitude_out_of_range_is_named(bad):
    with pytest.raises(InputError, match="altitude must be finite and between -1000") as caught:
        standard_atmosphere(bad)
    assert caught.value.name == "altitude"


@pytest.mark.parametrize("bad", [-60.1, 60.1, math.nan])
def test_a_temperature_offset_out_of_range_is_named(bad):
    with pytest.raises(InputError, match="temperature_offset must be finite") as caught:
        standard_atmosphere(0.0, temperature_offset=bad)
    assert caught.value.name == "temperature_offset"


@pytest.mark.parametrize(("altitude", "offset"), [(-1000.0, -60.0), (11_000.0, 60.0)])
def test_the_ends_of_the_ranges_are_allowed(altitude, offset):
    air = standard_atmosphere(altitude, temperature_offset=offset)
    assert 150.0 < air.temperature < 360.0
    assert air.density > 0.2
