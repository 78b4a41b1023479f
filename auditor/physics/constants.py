"""Constants of nature and of convention, each with its source.

Exact values are those of the SI of 2019 (BIPM, The International System of
Units, 9th edition); nothing here comes from an older set of constants. The
water formulation keeps the gas constant of its own release and has it beside
its coefficients, because mixing the two would lose its published digits.
"""

from __future__ import annotations

from typing import Final

# --- exact by definition of the SI (2019) -----------------------------------

ZERO_CELSIUS_K: Final = 273.15
"""0 degC in kelvin, exact. BIPM, SI Brochure (9th ed.), section 2.3.1."""

MOLAR_GAS_CONSTANT_J_PER_MOLK: Final = 6.02214076e23 * 1.380649e-23
"""Avogadro times Boltzmann constant, exact since 2019: 8.314 462 618 ... J/(mol K)."""

# --- conventional, without uncertainty --------------------------------------

STANDARD_ATMOSPHERE_PA: Final = 101_325.0
"""Standard atmosphere. 10th CGPM (1954), resolution 4."""

STANDARD_GRAVITY_M_PER_S2: Final = 9.80665
"""Standard acceleration of free fall. 3rd CGPM (1901)."""

# --- standard atmosphere, ISO 2533:1975, section 2 (constants of the model) -----

SEA_LEVEL_TEMPERATURE_K: Final = 288.15
TROPOSPHERE_LAPSE_K_PER_M: Final = -0.0065
AIR_GAS_CONSTANT_J_PER_KGK: Final = 287.05287
"""Specific gas constant of dry air as ISO 2533 fixes it (not recomputed from the SI)."""
EARTH_RADIUS_M: Final = 6_356_766.0
"""Nominal radius that turns a geometric into a geopotential altitude."""

# --- dry air, measured ------------------------------------------------------

OXYGEN_OF_DRY_AIR: Final = 0.20946
"""Mole fraction of oxygen in dry air, 20.946 %.

Rounded to 20.95 % in most handbooks (the 0.004 points move an excess-air
ratio by less than 0.1 % below 15 % oxygen). Value from memory of handbook
tables of dry air; its spread between tables is about 0.0001.
"""

DRY_AIR_DENSITY_KG_PER_M3: Final = 1.2929
"""Density of dry air at 0 degC and 101.325 kPa, as a real gas.

ISO 6976:1995, clause 8: molar mass 28.9626 kg/kmol over the ideal molar
volume 22.4141 m3/kmol and compression factor 0.99941. (As an ideal gas it
would be 1.2922.)
"""
