"""The plant file as a whole, and its parts about the site, the rules and a person's own exclusions."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from auditor.plant_file.export_parts import ExportPart
from auditor.plant_file.leaves import Altitude, Duration, Moment, OneLine, Share, Temperature, Words, Zone
from auditor.plant_file.machine_parts import MachinePart
from auditor.plant_file.parts import Choice, Part, optional, required
from auditor.plant_file.substance_parts import (
    CorrectedMeter,
    DeclaredFluid,
    GasFuel,
    GlycolFluid,
    LiquidFuelPart,
    OperatingMeter,
    Stated,
    fluid_form,
    fuel_form,
    meter_form,
)


class AltitudePressure(Stated):
    """Air pressure by the standard atmosphere; the uncertainty is what the weather does to it."""

    from_: Literal["altitude"] = required(
        "the air pressure follows from the altitude", "altitude", alias="from"
    )


class BarometerPressure(Part):
    """Air pressure from a logged tag."""

    tag: OneLine = required("tag of the absolute air pressure", "barometer")


def air_pressure_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of the air pressure: a barometer as soon as a tag is named."""
    return BarometerPressure if "tag" in raw else AltitudePressure


class SitePart(Part):
    """The site and its clock."""

    name: OneLine = required("name of the site in the report", "Emberlund Glassworks")
    zone: Zone = required("IANA zone of the site: months, days and the report's clock", "Europe/Stockholm")
    altitude: Altitude | None = optional("altitude above sea level", "85 m")
    air_pressure: Annotated[AltitudePressure | BarometerPressure, Choice(air_pressure_form)] | None = (
        optional(
            "air pressure at the site; needed as soon as a gauge pressure is used",
            {"from": "altitude", "standard": "0.9 kPa"},
        )
    )
    reference_temperature: Temperature | None = optional(
        "of heating values and of sensible heat; needed by flue-gas and combustion-air streams",
        "25 degC",
    )
    tick: Duration = optional("step of the base grid; divides one hour", "1 min", default="1 min")
    interval: Duration = optional(
        "length of one audit interval; a whole number of ticks that divides one hour",
        "15 min",
        default="15 min",
    )


class RulesPart(Part):
    """Thresholds of coverage; each is printed in the report."""

    tick_coverage: Share = optional(
        "a tick counts when at least this share of it is covered", "50 %", default="50 %"
    )
    interval_coverage: Share = optional(
        "an interval is assessed when at least this share of its ticks count", "80 %", default="80 %"
    )
    firm_coverage: Share = optional(
        "a period figure is firm from this coverage by energy on", "90 %", default="90 %"
    )
    publish_coverage: Share = optional(
        "below this coverage by energy a period figure is withheld", "75 %", default="75 %"
    )


class DistrustPart(Part):
    """A person's own exclusion of one tag for a stretch of time."""

    tag: OneLine = required("the tag that is not to be believed", "air_in")
    from_: Moment = required(
        "first moment, on the site's clock; a bare date means midnight", "2026-07-28T09:00:00", alias="from"
    )
    until: Moment = required("moment from which it is believed again", "2026-07-28T11:30:00")
    reason: Words = required("why; it is printed in the report", "sensor moved for calibration")


class PlantPart(Part):
    """A whole plant file."""

    schema_version: Literal[1] = required("version of this file's form", 1, alias="schema")
    site: SitePart = required(
        "the site and its clock", {"name": "Emberlund Glassworks", "zone": "Europe/Stockholm"}
    )
    rules: RulesPart = optional("thresholds of coverage", {"tick_coverage": "50 %"}, default={})
    exports: dict[str, ExportPart] = required("one table for each kind of export file", {"power": {}})
    fluids: dict[str, Annotated[DeclaredFluid | GlycolFluid, Choice(fluid_form)]] | None = optional(
        "liquids and gases that carry heat; water is built in", {"thermal_oil": {}}
    )
    fuels: dict[str, Annotated[GasFuel | LiquidFuelPart, Choice(fuel_form)]] | None = optional(
        "fuels with dated heating values", {"natural_gas": {}}
    )
    gas_meters: dict[str, Annotated[OperatingMeter | CorrectedMeter, Choice(meter_form)]] | None = optional(
        "how a gas meter's volume becomes a volume at the fuel's state", {"gas_meter": {}}
    )
    machines: dict[str, MachinePart] = required("what is audited", {"engine": {}})
    distrust: list[DistrustPart] | None = optional("a person's own exclusions", [])
