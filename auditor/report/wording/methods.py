"""Ways of metering, efficiencies and ceilings as equations in words and symbols."""

# ruff: noqa: RUF001 - text for paper uses the trade's own signs

from __future__ import annotations

from typing import NamedTuple

from auditor.records.machines import (
    CeilingKind,
    CombustionAir,
    Constant,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    LiquidFuel,
    Power,
    SameAs,
    Shaft,
    ShareOf,
    Way,
)


class Method(NamedTuple):
    """One way of metering."""

    name: str
    words: str
    symbols: str
    standing: str
    """``measured``, ``computed`` (from several readings) or ``assumed``."""


WAYS: dict[type[Way], Method] = {
    GasVolume: Method(
        "gas volume",
        "Fuel power is the volume flow, brought to the state that the heating value is given for, times "
        "the heating value. Gauge pressures get the barometric pressure added; a meter that already "
        "reads at that state is taken as it is.",
        "P = V̇ · (p / p₀) · (T₀ / T) · (Z₀ / Z) · H",
        "computed",
    ),
    LiquidFuel: Method(
        "liquid fuel",
        "Fuel power is the mass flow times the heating value; a volume is turned into mass with the "
        "density at the temperature of the meter.",
        "P = ṁ · H,  ṁ = V̇ · ρ₀ / (1 + β · (T − T₀))",
        "computed",
    ),
    Power: Method(
        "power",
        "The reading itself; of an energy meter, the increase of its count over time.",
        "P = dE / dt",
        "measured",
    ),
    Shaft: Method("shaft", "Shaft power is torque times rotational speed.", "P = 2π · n · M", "measured"),
    FlowAndTemperatures: Method(
        "flow and temperatures",
        "Heat carried by a fluid is its mass flow times the enthalpy between inlet and outlet; a volume "
        "flow is turned into mass with the density at the place of the meter.",
        "Q̇ = ṁ · ∫ c(T) dT between inlet and outlet,  ṁ = V̇ · ρ(T at the meter)",
        "computed",
    ),
    FlueGasHeat: Method(
        "flue gas",
        "The flue-gas flow follows from the fuel and its dry oxygen; its heat is that flow times its "
        "heat capacity times the fall in temperature (to the reference temperature where no outlet is "
        "named).",
        "λ = 1 + (v / l) · O₂ / (O₂,air − O₂),  Q̇ = (ṁ fuel + λ · ṁ air,min) · c · (T in − T out)",
        "computed",
    ),
    CombustionAir: Method(
        "combustion air",
        "Sensible heat that the air brings along, against the reference temperature; negative for cold air.",
        "Q̇ = λ · ṁ air,min · c · (T air − T ref)",
        "computed",
    ),
    ShareOf: Method(
        "share", "A stated share of another stream of the same machine.", "P = share · P of", "assumed"
    ),
    Constant: Method(
        "constant", "A stated power while the machine runs, zero otherwise.", "P = constant", "assumed"
    ),
    SameAs: Method(
        "same as",
        "The very stream of another machine, seen from this side, with its readings and its uncertainty.",
        "P = P of the other machine",
        "computed",
    ),
}

EFFICIENCIES: dict[str, str] = {
    "gross": "η gross = W gross / (fuel in + heat in)",
    "net": "η net = (W gross − own use) / (fuel in + heat in)",
    "heat": "η heat = useful heat / (fuel in + heat in)",
    "total": "η total = (W gross + useful heat) / (fuel in + heat in)",
    "bound": "η bound = (W gross − power in) / (fuel in + heat in)",
}

BALANCE = (
    "residual = fuel in + heat in + power in − W gross − useful heat − rejected heat as metered − losses"
)
IMPLIED = "rejected heat, implied = fuel in + heat in + power in − W gross − useful heat − losses"

DEMANDED = "Q min = max(0, T₀ · (Q h / T h − Σ Q u / T u)), the rest = rejected heat, implied − Q min"

CEILINGS: dict[CeilingKind, tuple[str, str, tuple[str, ...]]] = {
    CeilingKind.TWO_RESERVOIRS: (
        "two-reservoir Carnot ceiling",
        "η ceiling = 1 − T cold / T hot, both absolute, from the inlet temperatures of source and sink",
        (
            "all heat enters at or below the source's temperature",
            "all heat leaves at or above the sink's temperature",
            "the power that enters the fluid is taken off the work before it is compared",
            "little heat is stored between the start and the end of what is compared",
        ),
    ),
    CeilingKind.FINITE: (
        "ceiling of a finite source and sink",
        "η ceiling = 1 − T cold / T hot with entropic mean temperatures T = Δh / Δs between inlet and "
        "outlet; for a constant heat capacity T = (T₁ − T₂) / ln(T₁ / T₂)",
        (
            "all heat enters from the named source, between its measured inlet and outlet temperatures",
            "all heat leaves to the named sinks, between their measured inlet and outlet temperatures",
            "the power that enters the fluid is taken off the work before it is compared",
            "little heat is stored between the start and the end of what is compared",
        ),
    ),
    CeilingKind.FUEL_EXERGY: (
        "fuel-exergy ceiling",
        "η ceiling = chemical exergy of the fuel / its heating value",
        (
            "all work comes from the fuel that is metered",
            "neither jacket nor exhaust is taken as a source of heat: for an engine that burns its fuel "
            "inside, their temperatures set no limit to its work",
        ),
    ),
}
"""Per kind of ceiling: its label, its equation, and what has to be true for it to bind."""
