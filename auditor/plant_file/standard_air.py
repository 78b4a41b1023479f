"""Air pressure from the altitude of a site, for plant files without a barometer."""

from __future__ import annotations

SEA_LEVEL_PRESSURE_PA = 101_325.0
SEA_LEVEL_TEMPERATURE_K = 288.15
LAPSE_K_PER_M = -0.0065
GRAVITY_M_PER_S2 = 9.806_65
AIR_GAS_CONSTANT_J_PER_KGK = 287.052_87
EARTH_RADIUS_M = 6_356_766.0

LOWEST_ALTITUDE_M = -500.0
HIGHEST_ALTITUDE_M = 6_000.0
"""No plant stands lower or higher; the formula itself reaches from -2 km to 11 km."""


def standard_pressure_Pa(altitude_m: float) -> float:
    """Mean air pressure at an altitude, by the international standard atmosphere.

    ``p = p_0 (1 + L H / T_0) ** (-g / (R L))`` with the geopotential altitude
    ``H = r z / (r + z)``; lowest layer, so up to 11 km.

    Parameters
    ----------
    altitude_m : float [m]
        Geometric altitude above mean sea level.

    Returns
    -------
    float [Pa]
        A long-term mean: the weather moves the true pressure by about 1 %.

    Source
    ------
    ISO 2533:1975, equations (8) and (12), constants of its tables 1 and 2.

    Examples
    --------
    >>> round(standard_pressure_Pa(500.0))
    95461
    """
    geopotential_m = EARTH_RADIUS_M * altitude_m / (EARTH_RADIUS_M + altitude_m)
    warmth = 1.0 + LAPSE_K_PER_M * geopotential_m / SEA_LEVEL_TEMPERATURE_K
    exponent = -GRAVITY_M_PER_S2 / (AIR_GAS_CONSTANT_J_PER_KGK * LAPSE_K_PER_M)
    return float(SEA_LEVEL_PRESSURE_PA * warmth**exponent)
