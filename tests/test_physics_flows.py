"""Gas volumes, combustion, shafts and liquid fuels against handbooks and standards."""

from __future__ import annotations

import csv
import math
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

from auditor import physics
from auditor.physics.constants import (
    DRY_AIR_DENSITY_KG_PER_M3,
    MOLAR_GAS_CONSTANT_J_PER_MOLK,
    OXYGEN_OF_DRY_AIR,
    STANDARD_ATMOSPHERE_PA,
)

DATA = Path(__file__).parent / "data" / "physics_check_values.csv"
ROWS = list(csv.DictReader(DATA.read_text(encoding="utf-8").splitlines()))
NORMAL = {"reference_pressure_Pa": 101_325.0, "reference_temperature_K": 273.15}
METHANE_AIR, METHANE_DRY_FLUE_GAS = 9.5484, 8.5484  # m3 per m3, elementary stoichiometry


def first_number(row: dict[str, str]) -> float:
    """Read the number of ``O2=3 %`` or ``z=500 m``."""
    return float(row["inputs"].split("=")[1].split()[0])


def half_last_digit(printed: str) -> float:
    """Half a unit in the last digit that was printed."""
    exponent = Decimal(printed).as_tuple().exponent
    assert isinstance(exponent, int)
    return 0.5 * 10.0**exponent


@pytest.mark.parametrize("row", [r for r in ROWS if r["topic"] == "altitude"], ids=lambda r: r["inputs"])
def test_standard_atmosphere_table(row: dict[str, str]) -> None:
    """Mean air pressure at an altitude is that of the published table, to its last digit."""
    pressure = physics.pressure_at_altitude_Pa(first_number(row)) / float(row["to_si"])

    assert abs(pressure - float(row["printed"])) <= half_last_digit(row["printed"]), row["source"]


def test_standard_atmosphere_ends_where_its_layer_ends() -> None:
    """Above 11 km and below -2 km there is no answer."""
    pressure = physics.pressure_at_altitude_Pa([-2001.0, -2000.0, 11_000.0, 11_001.0, np.nan])

    assert np.isnan(pressure).tolist() == [True, False, False, True, True]


def test_gas_meter_in_normal_volume() -> None:
    """100 m3/h at 0.35 bar gauge and 15 degC are 127.54 m3/h normal, and 122.00 at 500 m."""
    # Worked by hand: 100 (1.36325/1.01325) (273.15/288.15); air pressure 0.954 bar at 500 m.
    sea = physics.absolute_pressure_Pa(0.35e5, 101_325.0)
    rounded = physics.absolute_pressure_Pa(0.35e5, 0.954e5)
    hill = physics.absolute_pressure_Pa(0.35e5, physics.pressure_at_altitude_Pa(500.0))

    at_sea = 100.0 * physics.reference_volume_ratio(sea, 288.15, **NORMAL)
    by_hand = 100.0 * physics.reference_volume_ratio(rounded, 288.15, **NORMAL)
    on_hill = 100.0 * physics.reference_volume_ratio(hill, 288.15, **NORMAL)
    gauge_as_absolute = 100.0 * physics.reference_volume_ratio(0.35e5, 288.15, **NORMAL)

    assert at_sea == pytest.approx(127.54, abs=0.005)
    assert gauge_as_absolute == pytest.approx(32.74, abs=0.005)
    assert by_hand == pytest.approx(122.00, abs=0.005)
    assert on_hill == pytest.approx(by_hand, rel=5e-4)  # 0.9546 bar rounded to three digits
    assert at_sea / gauge_as_absolute == pytest.approx(3.895, abs=5e-4)


def test_gas_meter_with_compression_factor() -> None:
    """1000 m3 at 3 bar gauge and 20 degC, Z 0.995 against 0.9977, are 3700.563 normal m3."""
    # Real-gas law, recomputed.
    ratio = physics.reference_volume_ratio(
        physics.absolute_pressure_Pa(3e5, 101_325.0),
        293.15,
        **NORMAL,
        compressibility_ratio=0.9977 / 0.995,
    )

    assert 1000.0 * ratio == pytest.approx(3700.5630, abs=5e-5)


@pytest.mark.parametrize(
    ("temperature_K", "pressure_Pa", "printed"),
    [
        (288.15, 101_325.0, 1.054915),  # m3 at 15 degC in one normal m3
        (288.70556, 14.73 * 6894.75729317, 37.23951 * 0.028316846592),  # ft3, 60 degF, 14.73 psia
        (288.70556, 14.696 * 6894.75729317, 37.32566 * 0.028316846592),
    ],
)
def test_one_normal_cubic_metre_at_other_reference_states(
    temperature_K: float, pressure_Pa: float, printed: float
) -> None:
    """The reference state is a matter of 5 %: ideal gas, recomputed from the exact definitions."""
    ratio = physics.reference_volume_ratio(101_325.0, 273.15, pressure_Pa, temperature_K)

    assert ratio == pytest.approx(printed, abs=1e-6)


def test_gas_pressure_that_cannot_be_is_one_missing_tick() -> None:
    """A vacuum beyond absolute zero loses its own tick and no other; kelvin below zero is a slip."""
    pressure = physics.absolute_pressure_Pa([-1.2e5, 0.1e5, np.nan], 101_325.0)
    assert np.isnan(pressure).tolist() == [True, False, True]

    ratio = physics.reference_volume_ratio([-5.0, 0.0, 1e5], 288.15, **NORMAL)
    assert np.isnan(ratio).tolist() == [True, True, False]
    with pytest.raises(ValueError, match="reference_volume_ratio needs kelvin"):
        physics.reference_volume_ratio(1e5, -15.0, **NORMAL)


@pytest.mark.parametrize("row", [r for r in ROWS if r["topic"] == "excess air"], ids=lambda r: r["inputs"])
def test_excess_air_of_methane(row: dict[str, str]) -> None:
    """Dry oxygen gives the excess air of the oxygen balance, not of its biased short form."""
    oxygen = first_number(row) / 100.0

    excess = physics.excess_air_ratio(oxygen, METHANE_DRY_FLUE_GAS, METHANE_AIR)

    # One more digit than half the last: the two volumes are printed to five digits only.
    assert abs(excess - float(row["printed"])) <= 2 * half_last_digit(row["printed"])
    assert OXYGEN_OF_DRY_AIR / (OXYGEN_OF_DRY_AIR - oxygen) > excess


def test_short_form_of_excess_air_is_biased() -> None:
    """At 13 % oxygen the short form says 2.636 where the balance says 2.465."""
    short = OXYGEN_OF_DRY_AIR / (OXYGEN_OF_DRY_AIR - 0.13)

    assert short == pytest.approx(2.636, abs=5e-4)
    assert physics.excess_air_ratio(0.13, METHANE_DRY_FLUE_GAS, METHANE_AIR) == pytest.approx(2.465, abs=5e-4)


def test_excess_air_closes_the_oxygen_balance() -> None:
    """The oxygen that comes in and is not burnt is the oxygen in the flue gas, by moles."""
    oxygen = np.linspace(0.0, 0.2, 21)
    excess = physics.excess_air_ratio(oxygen, METHANE_DRY_FLUE_GAS, METHANE_AIR)

    dry_flue_gas = METHANE_DRY_FLUE_GAS + (excess - 1.0) * METHANE_AIR
    unburnt = OXYGEN_OF_DRY_AIR * (excess - 1.0) * METHANE_AIR

    np.testing.assert_allclose(unburnt / dry_flue_gas, oxygen, atol=1e-15)


def test_oxygen_of_an_open_analyser_is_no_flue_gas() -> None:
    """Air, more than air, and less than nothing are missing, each in its own place."""
    excess = physics.excess_air_ratio([-0.001, 0.0, 0.095, 0.20946, 0.21, np.nan], 8.6, 9.6)

    assert np.isnan(excess).tolist() == [True, False, False, True, True, True]


def test_dry_air_density() -> None:
    """1.2929 kg/m3 is real dry air at 0 degC, and the ideal-gas law carries it to 25 degC."""
    from CoolProp.CoolProp import PropsSI

    temperature = np.array([273.15, 288.15, 298.15])
    reference = PropsSI("D", "T", temperature, "P", STANDARD_ATMOSPHERE_PA, "Air")
    ideal_molar_volume = MOLAR_GAS_CONSTANT_J_PER_MOLK * 273.15 / STANDARD_ATMOSPHERE_PA

    np.testing.assert_allclose(physics.dry_air_density_kg_per_m3(temperature), reference, rtol=1e-3)
    # ISO 6976:1995 clause 8: 28.9626 kg/kmol, compression factor 0.99941 (recalled).
    assert DRY_AIR_DENSITY_KG_PER_M3 == pytest.approx(0.0289626 / (0.99941 * ideal_molar_volume), abs=5e-5)
    # 22.413970 litres: ideal gas at 0 degC and one atmosphere, CODATA 2018.
    assert ideal_molar_volume * 1e3 == pytest.approx(22.413970, abs=5e-7)


def test_flue_gas_of_a_gas_engine() -> None:
    """282.9 m3/h of natural gas at 9.5 % oxygen make about 1.80 kg/s of exhaust."""
    # Typical of a 1.2 MW gas engine: common practice, no source.
    fuel_m3_per_s = 282.9 / 3600.0
    excess = physics.excess_air_ratio(0.095, 8.6, 9.6)
    air = physics.combustion_air_kg_per_s(fuel_m3_per_s, excess, 9.6, 1.2929)

    exhaust = physics.flue_gas_kg_per_s(fuel_m3_per_s, 0.78, air)

    assert excess == pytest.approx(1.7435, abs=5e-4)
    assert exhaust == pytest.approx(1.80, abs=0.05)
    assert exhaust - air == pytest.approx(0.78 * fuel_m3_per_s)


def test_air_mass_of_methane_agrees_with_an_equilibrium_program() -> None:
    """Stoichiometric methane takes 17.24 kg of air per kilogram."""
    # 17.2396 by an equilibrium code with the GRI-3.0 mechanism, to 2e-3; methane as ideal gas.
    methane_density = 0.016043 * STANDARD_ATMOSPHERE_PA / (MOLAR_GAS_CONSTANT_J_PER_MOLK * 273.15)
    air = physics.combustion_air_kg_per_s(1.0, 1.0, METHANE_AIR, DRY_AIR_DENSITY_KG_PER_M3)

    assert air / methane_density == pytest.approx(17.2396, rel=2e-3)


def test_short_stack_formula_is_good_for_boilers_only() -> None:
    """It is within 0.2 points of an exact balance up to 200 degC and refuses to answer above."""
    # Printed: formula 8.2200 and 4.5667 %, exact balance of methane (NASA polynomials) 8.3243, 4.5854.
    loss = physics.siegert_stack_loss([473.15, 393.15, 723.15], 293.15, [0.03, 0.03, 0.08])

    assert 100.0 * loss[0] == pytest.approx(8.2200, abs=5e-5)
    assert 100.0 * loss[1] == pytest.approx(4.5667, abs=5e-5)
    assert abs(100.0 * loss[0] - 8.3243) < 0.2 and abs(100.0 * loss[1] - 4.5854) < 0.2
    assert np.isnan(loss[2])
    assert np.isnan(physics.siegert_stack_loss(400.0, 293.15, [0.21, -0.01, np.nan])).all()


def test_shaft_power_of_the_handbook_rule() -> None:
    """Kilowatts are newton metres times revolutions per minute over 9549.3."""
    # The engineer's rule P = M n / 9549; 30000 / pi = 9549.297.
    power = physics.shaft_power_W(9549.297, 1.0 / 60.0)

    assert power == pytest.approx(1000.0, abs=1e-3)
    assert physics.shaft_power_W(-100.0, 25.0) == pytest.approx(-5000.0 * math.pi)
    assert np.isnan(physics.shaft_power_W([1.0, np.nan], 25.0)).tolist() == [False, True]


def test_fuel_oil_volume_with_temperature() -> None:
    """Within 30 K of the reference the linear form is 0.1 % from the petroleum tables' equation."""
    # API MPMS chapter 11.1 (ASTM D1250-80, table 54B), fuel-oil constants recalled:
    # alpha = K0/rho^2 + K1/rho, VCF = exp(-alpha dT (1 + 0.8 alpha dT)).
    density = 840.0
    expansion = 186.9696 / density**2 + 0.4862 / density
    difference = np.linspace(-30.0, 30.0, 13)
    exponent = expansion * difference
    by_tables = density * np.exp(-exponent * (1.0 + 0.8 * exponent))

    linear = physics.liquid_density_kg_per_m3(288.15 + difference, density, 288.15, expansion)

    np.testing.assert_allclose(linear, by_tables, rtol=1e-3)
    assert np.isnan(physics.liquid_density_kg_per_m3(100.0, 840.0, 288.15, 0.01))
