"""The air a drone flies in: ICAO standard atmosphere to the tropopause, warm and cold days."""

from __future__ import annotations

import math
from dataclasses import dataclass

from solver.errors import require_within

# ICAO Doc 7488/3, 1993, table of primary constants (the same as ISO 2533:1975).
SEA_LEVEL_TEMPERATURE = 288.15
"""[K]"""
SEA_LEVEL_PRESSURE = 101_325.0
"""[Pa]"""
STANDARD_GRAVITY = 9.80665
"""[m/s^2]"""
GAS_CONSTANT = 287.05287
"""Specific gas constant of dry air. [J/(kg K)]"""
LAPSE_RATE = 0.0065
"""Fall of temperature with geopotential altitude below 11 km. [K/m]"""
HEAT_RATIO = 1.4
"""Ratio of specific heats. [-]"""
SUTHERLAND_COEFFICIENT = 1.458e-6
"""[kg/(m s sqrt(K))]"""
SUTHERLAND_TEMPERATURE = 110.4
"""[K]"""

LOWEST_ALTITUDE, HIGHEST_ALTITUDE = -1000.0, 11_000.0
"""Range of geopotential altitude [m]; the upper end is the standard tropopause."""
LARGEST_OFFSET = 60.0
"""Largest temperature offset either way [K]."""


@dataclass(frozen=True)
class Air:
    """Air at one place on one day.

    Parameters
    ----------
    temperature : float
        [K]
    pressure : float
        [Pa]
    density : float
        [kg/m^3]
    dynamic_viscosity : float
        [Pa s]
    speed_of_sound : float
        [m/s]
    """

    temperature: float
    pressure: float
    density: float
    dynamic_viscosity: float
    speed_of_sound: float

    @property
    def kinematic_viscosity(self) -> float:
        """Dynamic viscosity over density [m^2/s]."""
        return self.dynamic_viscosity / self.density


def standard_atmosphere(altitude: float, *, temperature_offset: float = 0.0) -> Air:
    r"""Air at a geopotential altitude, on a standard, warmer or colder day.

    Dry, still air in hydrostatic balance with a temperature falling linearly.
    An offset warms the whole column at unchanged pressure: the altitude is then
    a pressure altitude, as an altimeter set to 1013.25 hPa shows it.

    Parameters
    ----------
    altitude : float
        Geopotential pressure altitude. [m] -1000 to 11000.
    temperature_offset : float, optional
        Air temperature less the standard one at that altitude. [K] -60 to 60.

    Returns
    -------
    Air
        Temperature, pressure, density, viscosity and speed of sound.

    Raises
    ------
    InputError
        If `altitude` or `temperature_offset` is not finite or out of range.

    Notes
    -----
    .. math::
       T_s = T_0 - \beta H, \quad p = p_0 (T_s/T_0)^{g_0/(\beta R)}, \quad
       T = T_s + \Delta T, \quad \rho = p/(R T),

       \mu = \beta_s T^{3/2}/(T + S), \quad a = \sqrt{\gamma R T}

    References
    ----------
    .. [1] ICAO Doc 7488/3, Manual of the ICAO Standard Atmosphere, 3rd ed.,
       1993: eqs. (12) pressure, (13) density, (18) speed of sound, (19) dynamic
       viscosity. Equation numbers from memory. The same as ISO 2533:1975.
    """
    require_within(LOWEST_ALTITUDE, HIGHEST_ALTITUDE, altitude=altitude)
    require_within(-LARGEST_OFFSET, LARGEST_OFFSET, temperature_offset=temperature_offset)
    standard_temperature = SEA_LEVEL_TEMPERATURE - LAPSE_RATE * altitude
    exponent = STANDARD_GRAVITY / (LAPSE_RATE * GAS_CONSTANT)
    pressure = SEA_LEVEL_PRESSURE * (standard_temperature / SEA_LEVEL_TEMPERATURE) ** exponent
    temperature = standard_temperature + temperature_offset
    return Air(
        temperature=temperature,
        pressure=pressure,
        density=pressure / (GAS_CONSTANT * temperature),
        dynamic_viscosity=SUTHERLAND_COEFFICIENT
        * temperature**1.5
        / (temperature + SUTHERLAND_TEMPERATURE),
        speed_of_sound=math.sqrt(HEAT_RATIO * GAS_CONSTANT * temperature),
    )
