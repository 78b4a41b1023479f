"""Parts of the plant file about machines: their boundary, their streams, their gates and their ceiling."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Annotated, Any, ClassVar, Literal

from auditor.plant_file.leaves import (
    Duration,
    NameOrNames,
    OneLine,
    OwnUnitValue,
    Power,
    Ratio,
    RoleName,
    Share,
    Words,
)
from auditor.plant_file.parts import Choice, Part, keys_of, optional, required
from auditor.plant_file.substance_parts import Stated

_BY = "how the stream is metered"
_ROLE = "what the stream is in the balance of its machine"


class GasVolumeStream(Part):
    """Fuel power from a gas volume."""

    role: RoleName = required(_ROLE, "fuel in")
    by: Literal["gas volume"] = required(_BY, "gas volume")
    fuel: OneLine = required("name of the fuel", "natural_gas")
    volume: OneLine = required("tag of the gas volume or volume flow", "gas_index")
    meter: OneLine = required("name of the gas meter", "gas_meter")


class LiquidFuelStream(Part):
    """Fuel power from the mass of a liquid fuel, or from its volume and temperature."""

    either: ClassVar[tuple[tuple[str, str], ...]] = (("mass", "volume"),)

    role: RoleName = required(_ROLE, "fuel in")
    by: Literal["liquid fuel"] = required(_BY, "liquid fuel")
    fuel: OneLine = required("name of the fuel", "diesel")
    mass: OneLine | None = optional("tag of mass or mass flow", "fuel_mass")
    volume: OneLine | None = optional("tag of volume or volume flow", "fuel_volume")
    temperature: OneLine | None = optional(
        "tag of the fuel's temperature at the volume meter", "fuel_temperature"
    )


class PowerStream(Part):
    """Power from a tag of power, or of energy by counter or amount."""

    role: RoleName = required(_ROLE, "work out")
    by: Literal["power"] = required(_BY, "power")
    tag: OneLine = required("tag of power or of energy", "gross_power")
    measured_at: Words | None = optional(
        "where it is measured, for the table of the boundary; required for work out", "generator terminals"
    )


class ShaftStream(Part):
    """Shaft power from torque and rotational speed."""

    role: RoleName = required(_ROLE, "work out")
    by: Literal["shaft"] = required(_BY, "shaft")
    torque: OneLine = required("tag of the torque", "shaft_torque")
    speed: OneLine = required("tag of the rotational speed", "shaft_speed")


class FlowStream(Part):
    """Heat carried by a liquid or gas between two temperatures."""

    role: RoleName = required(_ROLE, "heat in")
    by: Literal["flow and temperatures"] = required(_BY, "flow and temperatures")
    flow: OneLine = required("tag of mass flow or volume flow", "oil_flow")
    flow_at: Literal["inlet", "outlet"] | None = optional(
        "where a volume-flow meter sits; required for a volume flow, none for a mass flow", "outlet"
    )
    inlet: OneLine = required("temperature tag where the carrier enters", "oil_hot")
    outlet: OneLine = required("temperature tag where the carrier leaves", "oil_cold")
    fluid: OneLine = required("name of the fluid; water is built in", "water")


class FlueGasStream(Part):
    """Sensible heat of flue gas, its flow from a fuel stream and dry oxygen."""

    role: RoleName = required(_ROLE, "rejected heat")
    by: Literal["flue gas"] = required(_BY, "flue gas")
    of: OneLine = required("the fuel stream of this machine that it comes from", "gas")
    oxygen: OneLine = required("tag of the oxygen in the dry flue gas", "oxygen")
    inlet: OneLine = required("temperature tag of the hot side", "exhaust_hot")
    outlet: OneLine = required('temperature tag of the cool side, or "reference"', "reference")


class CombustionAirStream(Part):
    """Sensible heat of the combustion air against the reference temperature; negative for cold air."""

    role: RoleName = required(_ROLE, "power in")
    by: Literal["combustion air"] = required(_BY, "combustion air")
    of: OneLine = required("the fuel stream of this machine that it burns", "gas")
    oxygen: OneLine = required("tag of the oxygen in the dry flue gas", "oxygen")
    temperature: OneLine = required("temperature tag of the air that enters", "ambient")


class ShareStream(Stated):
    """A stated share of another stream of the same machine."""

    role: RoleName = required(_ROLE, "loss")
    by: Literal["share"] = required(_BY, "share")
    of: OneLine = required("stream of this machine that it is a share of", "gas")
    share: Ratio = required("the share", 0.026)
    source: Words = required("where the number was taken from", "maker's sheet")


class ConstantStream(Stated):
    """A stated constant power while the machine runs."""

    role: RoleName = required(_ROLE, "loss")
    by: Literal["constant"] = required(_BY, "constant")
    power: Power = required("the power while the machine runs", "12 kW")
    source: Words = required("where the number was taken from", "insulation survey")


class SharedStream(Part):
    """The very stream of another machine, seen from this one's side."""

    refused: ClassVar[Mapping[str, str]] = MappingProxyType(
        {"by": "remove it: the stream is metered where it is declared, in the other machine"}
    )

    role: RoleName = required(_ROLE, "useful heat")
    same_as: OneLine = required("machine and stream that it is", "orc.oil")


AnyStream = (
    GasVolumeStream
    | LiquidFuelStream
    | PowerStream
    | ShaftStream
    | FlowStream
    | FlueGasStream
    | CombustionAirStream
    | ShareStream
    | ConstantStream
    | SharedStream
)
_STREAM_FORMS: Mapping[str, type[Part]] = MappingProxyType(
    {
        "gas volume": GasVolumeStream,
        "liquid fuel": LiquidFuelStream,
        "power": PowerStream,
        "shaft": ShaftStream,
        "flow and temperatures": FlowStream,
        "flue gas": FlueGasStream,
        "combustion air": CombustionAirStream,
        "share": ShareStream,
        "constant": ConstantStream,
    }
)


class UndecidedStream(Part):
    """A stream that does not say how it is metered."""

    also_known: ClassVar[frozenset[str]] = frozenset(
        key for form in _STREAM_FORMS.values() for key in keys_of(form)
    )

    either: ClassVar[tuple[tuple[str, str], ...]] = (("by", "same_as"),)

    role: RoleName = required(_ROLE, "heat in")
    by: (
        Literal[
            "gas volume",
            "liquid fuel",
            "power",
            "shaft",
            "flow and temperatures",
            "flue gas",
            "combustion air",
            "share",
            "constant",
        ]
        | None
    ) = optional(_BY, "flow and temperatures")
    same_as: OneLine | None = optional("machine and stream that it is", "orc.oil")


def stream_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a stream, from how it is metered."""
    return SharedStream if "same_as" in raw else _STREAM_FORMS.get(str(raw.get("by")), UndecidedStream)


class RunningPart(Part):
    """When the machine runs."""

    either: ClassVar[tuple[tuple[str, str], ...]] = (("above", "is"),)

    tag: OneLine = required("tag that tells it", "gross_power")
    above: OwnUnitValue | None = optional("it runs while the tag is above this value", "20 kW")
    is_: OneLine | None = optional("it runs while the state tag is in this state", "closed", alias="is")


class SteadyPart(Part):
    """When an interval counts as steady."""

    tag: OneLine = required("tag whose interval means are compared", "gross_power")
    change_below: OwnUnitValue = required("largest change of its interval means", "5 % of 1000 kW")
    within: Duration = required("time around the interval in which they are compared", "30 min")


class FuelExergyCeiling(Part):
    """Held against the chemical exergy of the fuel."""

    refused: ClassVar[Mapping[str, str]] = MappingProxyType(
        dict.fromkeys(("source", "sink"), "remove it: the ceiling by fuel exergy has no source and no sink")
    )

    kind: Literal["fuel exergy"] = required("which limit the machine is held against", "fuel exergy")


class ReservoirCeiling(Part):
    """Held against the temperatures of its own streams."""

    kind: Literal["two reservoirs", "finite source and sink"] = required(
        "which limit the machine is held against", "finite source and sink"
    )
    source: OneLine = required("heat-in stream whose temperatures are the source", "oil")
    sink: NameOrNames = required("stream, or list of streams, whose temperatures are the sink", "air")


class UndecidedCeiling(Part):
    """A ceiling that does not say which limit it is."""

    also_known: ClassVar[frozenset[str]] = frozenset(keys_of(ReservoirCeiling))

    kind: Literal["two reservoirs", "finite source and sink", "fuel exergy"] = required(
        "which limit the machine is held against", "finite source and sink"
    )


def ceiling_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a ceiling, from its kind."""
    forms: Mapping[str, type[Part]] = {
        "two reservoirs": ReservoirCeiling,
        "finite source and sink": ReservoirCeiling,
        "fuel exergy": FuelExergyCeiling,
    }
    return forms.get(str(raw.get("kind")), UndecidedCeiling)


class MachinePart(Part):
    """One machine: a boundary with streams."""

    title: OneLine | None = optional("its name in the report; the name of the table without it", "Gas engine")
    kind: OneLine = required("kind of machine", "gas engine")
    heating_value: Literal["lower", "higher"] | None = optional(
        "heating-value basis of the headline figure; required where fuel burns", "lower"
    )
    headline: Literal["gross", "net"] | None = optional(
        "the figure on page one; required for a machine that gives work; net needs an own-use stream", "net"
    )
    rated_power: Power | None = optional("rated gross power", "1000 kW")
    minimum_load: Share | None = optional(
        "share of the rated power below which an interval is called low load", "30 %"
    )
    running: RunningPart = required("when the machine runs", {"tag": "gross_power", "above": "20 kW"})
    steady: SteadyPart | None = optional(
        "when an interval counts as steady; always without it",
        {"tag": "gross_power", "change_below": "5 % of 1000 kW", "within": "30 min"},
    )
    ceiling: (
        Annotated[
            Literal["none"] | FuelExergyCeiling | ReservoirCeiling, Choice(ceiling_form, words=("none",))
        ]
        | None
    ) = optional(
        'the limit it is held against, or "none"; required for a machine that gives work',
        {"kind": "finite source and sink", "source": "oil", "sink": "air"},
    )
    streams: dict[str, Annotated[AnyStream, Choice(stream_form)]] = required(
        "what crosses its boundary, by name",
        {
            "power": {
                "role": "work out",
                "by": "power",
                "tag": "gross_power",
                "measured_at": "generator terminals",
            }
        },
    )
