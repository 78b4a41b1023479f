"""Physics of the audit: pure functions on SI numbers and arrays, unit in every name.

What they share: arguments broadcast like numpy arrays and scalars give
scalars; a missing reading (NaN) or one outside a function's stated range
gives NaN in its own place and never an exception; only what a program can get
wrong, such as a temperature of zero kelvin or below, is a `ValueError`.
"""

from auditor.physics.ceilings import (
    carnot_ceiling,
    ceiling_exists,
    entropic_mean_temperature_K,
    entropic_mean_temperature_of_carrier_K,
    finite_source_and_sink_ceiling,
)
from auditor.physics.combustion import (
    combustion_air_kg_per_s,
    dry_air_density_kg_per_m3,
    excess_air_ratio,
    flue_gas_kg_per_s,
    siegert_stack_loss,
)
from auditor.physics.gas_volume import (
    absolute_pressure_Pa,
    pressure_at_altitude_Pa,
    reference_volume_ratio,
)
from auditor.physics.liquids import (
    ConstantHeatCarrier,
    HeatCarrier,
    TabulatedHeatCarrier,
    WaterHeatCarrier,
    glycol_water,
)
from auditor.physics.reversed_cycles import (
    carnot_cooling_eer,
    carnot_heating_cop,
    lorenz_cooling_eer,
    lorenz_heating_cop,
)
from auditor.physics.second_law import (
    entropy_flow_W_per_K,
    entropy_generation_W_per_K,
    exergy_of_heat_W,
    fuel_exergy_W,
    mean_temperature_of_heats_K,
    smallest_rejection_W,
)
from auditor.physics.shaft import liquid_density_kg_per_m3, shaft_power_W
from auditor.physics.statistics import (
    effective_sample_count,
    first_difference_noise,
    lag_one_autocorrelation,
    standard_from_limit,
    standard_from_resolution,
)
from auditor.physics.water import (
    is_liquid_water,
    saturation_pressure_Pa,
    saturation_temperature_K,
    water_density_kg_per_m3,
    water_enthalpy_J_per_kg,
    water_entropy_J_per_kgK,
    water_heat_capacity_J_per_kgK,
)

__all__ = [
    "ConstantHeatCarrier",
    "HeatCarrier",
    "TabulatedHeatCarrier",
    "WaterHeatCarrier",
    "absolute_pressure_Pa",
    "carnot_ceiling",
    "carnot_cooling_eer",
    "carnot_heating_cop",
    "ceiling_exists",
    "combustion_air_kg_per_s",
    "dry_air_density_kg_per_m3",
    "effective_sample_count",
    "entropic_mean_temperature_K",
    "entropic_mean_temperature_of_carrier_K",
    "entropy_flow_W_per_K",
    "entropy_generation_W_per_K",
    "excess_air_ratio",
    "exergy_of_heat_W",
    "finite_source_and_sink_ceiling",
    "first_difference_noise",
    "flue_gas_kg_per_s",
    "fuel_exergy_W",
    "glycol_water",
    "is_liquid_water",
    "lag_one_autocorrelation",
    "liquid_density_kg_per_m3",
    "lorenz_cooling_eer",
    "lorenz_heating_cop",
    "mean_temperature_of_heats_K",
    "pressure_at_altitude_Pa",
    "reference_volume_ratio",
    "saturation_pressure_Pa",
    "saturation_temperature_K",
    "shaft_power_W",
    "siegert_stack_loss",
    "smallest_rejection_W",
    "standard_from_limit",
    "standard_from_resolution",
    "water_density_kg_per_m3",
    "water_enthalpy_J_per_kg",
    "water_entropy_J_per_kgK",
    "water_heat_capacity_J_per_kgK",
]
