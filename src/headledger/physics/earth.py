"""Local gravity, and the barometer where nobody read one."""

from __future__ import annotations

import numpy as np

EQUATOR_GRAVITY_M_S2 = 9.7803253359
SOMIGLIANA_K = 0.00193185265241
ECCENTRICITY_SQUARED = 0.00669437999014
SEMI_MAJOR_AXIS_M = 6_378_137.0
FLATTENING = 1.0 / 298.257223563
ROTATION_RATIO = 0.00344978650684
EARTH_RADIUS_M = 6_356_766.0
"""Of the standard atmosphere, to turn geometric into geopotential altitude. [m]"""


def gravity_m_s2(latitude_deg: float, altitude_m: float = 0.0) -> float:
    """Acceleration of gravity on the WGS 84 ellipsoid, with the free-air change of second order.

    Parameters
    ----------
    latitude_deg : float
        [deg]
    altitude_m : float
        Above sea level. [m]

    Returns
    -------
    float
        [m/s²]

    References
    ----------
    NIMA TR8350.2, Department of Defense World Geodetic System 1984 (2000), equations 4-1 and 4-3.
    """
    sine_squared = float(np.sin(np.radians(latitude_deg))) ** 2
    at_sea = (
        EQUATOR_GRAVITY_M_S2
        * (1.0 + SOMIGLIANA_K * sine_squared)
        / float(np.sqrt(1.0 - ECCENTRICITY_SQUARED * sine_squared))
    )
    linear = 2.0 / SEMI_MAJOR_AXIS_M * (1.0 + FLATTENING + ROTATION_RATIO - 2.0 * FLATTENING * sine_squared)
    return at_sea * (1.0 - linear * altitude_m + 3.0 * altitude_m**2 / SEMI_MAJOR_AXIS_M**2)


def standard_pressure_pa(altitude_m: float) -> float:
    """Pressure of the standard atmosphere below 11 km.

    Parameters
    ----------
    altitude_m : float
        Geometric altitude above sea level. [m]

    Returns
    -------
    float
        [Pa absolute]

    References
    ----------
    U.S. Standard Atmosphere 1976, equation 33a (ISO 2533:1975).
    """
    geopotential = EARTH_RADIUS_M * altitude_m / (EARTH_RADIUS_M + altitude_m)
    return float(101_325.0 * (1.0 - 0.0065 / 288.15 * geopotential) ** 5.255876)
