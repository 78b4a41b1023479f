"""Sense of a machine: what its kind can have, its ceiling, and what its streams point at."""

from __future__ import annotations

from pathlib import Path

import pytest

from auditor.plant_file import read_plant
from auditor.records.errors import PlantFileError
from auditor.records.machines import CeilingKind, Constant, LiquidFuel, Shaft

SAMPLES = Path(__file__).parent.parent / "sample_logs"


def _sample(name: str) -> str:
    return (SAMPLES / name / "plant.toml").read_text(encoding="utf-8")


def _read(folder: Path, text: str):
    (folder / "plant.toml").write_text(text, encoding="utf-8")
    return read_plant(folder)


def _changed(name: str, *pairs: tuple[str, str]) -> str:
    text = _sample(name)
    for there, instead in pairs:
        assert there in text, there
        text = text.replace(there, instead, 1)
    return text


def _said(folder: Path, text: str) -> dict[str, str]:
    with pytest.raises(PlantFileError) as caught:
        _read(folder, text)
    return {fault.where.partition(", ")[2]: f"{fault.found} | {fault.fix}" for fault in caught.value.faults}


def test_absent_heating_value_basis_is_refused(tmp_path):
    """Without lower or higher declared nothing is read: 40.0 % and 36.2 % are the same engine."""
    # 250 m3/h of gas at 10.00 (lower) or 11.06 kWh/m3 (higher) and 1000 kW: 40.0 % or 36.2 %.
    assert 1000 / (250 * 10.00) == pytest.approx(0.400, abs=5e-4)
    assert 1000 / (250 * 11.06) == pytest.approx(0.362, abs=5e-4)
    said = _said(tmp_path, _changed("quillmere", ('heating_value = "lower" ', "# ")))
    assert list(said) == ["machines.engine.heating_value"]
    assert '"lower"' in said["machines.engine.heating_value"]
    assert '"higher"' in said["machines.engine.heating_value"]


def test_a_basis_that_the_fuel_does_not_state_is_refused(tmp_path):
    """Judged on the higher heating value, every dated entry must have one."""
    text = _changed(
        "quillmere", ('heating_value = "lower"', 'heating_value = "higher"'), (", higher = 11.05", "")
    )
    assert list(_said(tmp_path, text)) == ["fuels.natural_gas.values[1].higher"]


@pytest.mark.parametrize("kind", ["two reservoirs", "finite source and sink"])
@pytest.mark.parametrize("source", ["hot_water", "exhaust"])
def test_jacket_or_exhaust_as_source_of_an_engine_is_refused(kind, source, tmp_path):
    """A gas engine is never held against its jacket or exhaust temperature, and the refusal says why."""
    # A jacket at 90 degC over a sink at 25 degC would allow 17.9 %, less than half of what such engines give.
    assert 1 - 298.15 / 363.15 == pytest.approx(0.179, abs=5e-4)
    ceiling = f'{{ kind = "{kind}", source = "{source}", sink = "low_water" }}'
    said = _said(tmp_path, _changed("quillmere", ('{ kind = "fuel exergy" } ', ceiling)))
    assert list(said) == ["machines.engine.ceiling.kind"]
    reason = said["machines.engine.ceiling.kind"]
    assert "Jacket and exhaust" in reason and "fuel exergy" in reason


def test_no_ceiling_must_be_said(tmp_path):
    """A machine that gives work may go without a ceiling, but only by the word none."""
    text = _changed("quillmere", ('{ kind = "fuel exergy" } ', '"none" '))
    assert _read(tmp_path, text).machines["engine"].ceiling is None
    assert list(_said(tmp_path, text.replace('ceiling = "none"', "#"))) == ["machines.engine.ceiling"]
    assert list(_said(tmp_path, text.replace('"none"', '"non"'))) == ["machines.engine.ceiling"]


def test_a_machine_without_work_takes_no_ceiling_and_no_headline(tmp_path):
    """An exchanger has neither Carnot ceiling nor gross power; writing them is told."""
    ceiling = 'ceiling = { kind = "two reservoirs", source = "exhaust", sink = "oil" }'
    extra = f'kind = "heat exchanger"\nheadline = "net"\n{ceiling}\n#'
    said = _said(tmp_path, _changed("emberlund", ('kind = "heat exchanger"', extra)))
    assert set(said) == {"machines.coil.headline", "machines.coil.ceiling.kind"}


def test_sinks_may_be_several(tmp_path):
    """A ceiling may name a list of sinks; a source must bring heat in, with temperatures."""
    plant = _read(tmp_path, _changed("emberlund", ('sink = "air"', 'sink = ["air"]')))
    assert plant.machines["orc"].ceiling.sinks == ("air",)
    assert plant.machines["orc"].ceiling.kind is CeilingKind.FINITE
    said = _said(
        tmp_path, _changed("emberlund", ('source = "oil", sink = "air"', 'source = "air", sink = "drive"'))
    )
    assert "rejected heat" in said["machines.orc.ceiling.source"]
    assert "loss" in said["machines.orc.ceiling.sink"]


def test_a_ceiling_must_take_in_all_heat(tmp_path):
    """A second source, or a sink left out, would let a sound machine beat the ceiling of the rest."""
    second = _changed(
        "emberlund",
        (
            "streams.power   = ",
            'streams.extra = { role = "heat in", same_as = "coil.exhaust" }\nstreams.power   = ',
        ),
    )
    assert '"extra" brings heat in too' in _said(tmp_path, second)["machines.orc.ceiling.source"]
    left_out = _changed(
        "emberlund",
        (
            "streams.power   = ",
            'streams.warm = { role = "useful heat", same_as = "coil.exhaust" }\nstreams.power   = ',
        ),
    )
    assert 'sink = ["air", "warm"]' in _said(tmp_path, left_out)["machines.orc.ceiling.sink"]


def test_a_gauge_pressure_needs_the_air_pressure(tmp_path):
    """A gauge pressure at the gas meter asks for the site's air pressure; an absolute one does not."""
    air = 'air_pressure = { from = "altitude", standard = "0.9 kPa" } '
    text = _changed("quillmere", (air, "# "))
    said = _said(tmp_path, text)
    assert list(said) == ["site.air_pressure"] and "gas_pressure" in said["site.air_pressure"]
    plant = _read(tmp_path, text.replace('pressure = "gauge"', 'pressure = "absolute"'))
    assert plant.site.air_pressure is None


def test_a_barometer_must_read_absolute_pressure(tmp_path):
    """The air pressure may come from a tag, if that tag is an absolute pressure."""
    barometer = 'tags.barometer = { column = "P0", unit = "hPa", pressure = "absolute", between = "line", '
    barometer += 'hold = "1 h", standard = "1 hPa" }\ntags.breaker'
    text = _changed(
        "quillmere",
        ('{ from = "altitude", standard = "0.9 kPa" }', '{ tag = "barometer" }'),
        ("tags.breaker", barometer),
    )
    assert _read(tmp_path, text).site.air_pressure.tag == "barometer"
    assert list(_said(tmp_path, text.replace('"absolute"', '"gauge"'))) == ["site.air_pressure.tag"]


def test_a_correction_made_twice_is_refused(tmp_path):
    """A meter that reads at the fuel's state already takes no pressure, temperature or compressibility."""
    text = _changed("quillmere", ('reads = "operating volume"', 'reads = "already at the fuel\'s state"'))
    said = _said(tmp_path, text)
    keys = {"pressure", "temperature", "compressibility_ratio"}
    assert set(said) == {f"gas_meters.gas_meter.{key}" for key in keys}
    assert all("twice" in words for words in said.values())


def test_a_shared_stream_points_at_a_metered_one_of_another_machine(tmp_path):
    """same_as needs an existing machine and stream, not of itself, not shared again, and a fitting role."""
    cases = {
        'role = "useful heat", same_as = "orcc.oil"': "same_as",
        'role = "useful heat", same_as = "coil.exhaust"': "same_as",
        'role = "power in", same_as = "orc.oil"': "role",
        'role = "useful heat", same_as = "orc.oil", by = "power"': "by",
    }
    for written, key in cases.items():
        said = _said(tmp_path, _changed("emberlund", ('role = "useful heat", same_as = "orc.oil"', written)))
        assert f"machines.coil.streams.oil.{key}" in said, written


def test_shares_of_each_other_are_refused(tmp_path):
    """A stream that is, through another, a share of itself is told once for each of them."""
    text = _changed(
        "emberlund",
        ('by = "share", of = "power"', 'by = "share", of = "feed"'),
        ('by = "share", of = "own_use"', 'by = "share", of = "drive"'),
    )
    said = _said(tmp_path, text)
    assert set(said) == {"machines.orc.streams.feed.of", "machines.orc.streams.drive.of"}
    assert "share of itself" in said["machines.orc.streams.feed.of"]


def test_roles_must_suit_the_way_and_the_kind(tmp_path):
    """Combustion air is no heat input of an efficiency, and an organic Rankine engine burns nothing."""
    said = _said(
        tmp_path,
        _changed(
            "quillmere",
            ('role = "power in", by = "combustion air"', 'role = "heat in", by = "combustion air"'),
        ),
    )
    assert "machines.engine.streams.air.role" in said
    said = _said(tmp_path, _changed("emberlund", ('kind = "organic Rankine engine"', 'kind = "gas engine"')))
    assert "machines.orc.streams.oil.role" in said
    assert "machines.orc.streams" in said  # no fuel in
    assert "machines.orc.ceiling.kind" in said


def test_a_net_headline_needs_an_own_use(tmp_path):
    """Net is gross less own use: without such a stream the headline cannot be net."""
    text = "\n".join(
        line
        for line in _sample("emberlund").splitlines()
        if not line.startswith(("streams.own_use", "streams.feed"))
    )
    assert list(_said(tmp_path, text)) == ["machines.orc.headline"]
    assert (
        _read(tmp_path, text.replace('headline = "net"', 'headline = "gross"')).machines["orc"].headline
        == "gross"
    )


def test_a_volume_flow_needs_a_density(tmp_path):
    """A declared fluid metered by volume must have a density; a mass flow takes no place of its meter."""
    by_volume = _changed(
        "emberlund",
        ('column = "TO-F",  unit = "kg/s"', 'column = "TO-F", unit = "m3/h"'),
        ('flow = "oil_flow"', 'flow = "oil_flow", flow_at = "inlet"'),
    )
    assert list(_said(tmp_path, by_volume)) == ["fluids.thermal_oil.density"]
    table = 'density = { temperatures = [20, 300], temperature_unit = "degC", values = [870, 680], '
    table += 'unit = "kg/m3", standard = "1 %" }\n'
    plant = _read(tmp_path, by_volume.replace("[fluids.furnace_exhaust]", table + "[fluids.furnace_exhaust]"))
    oil = plant.fluids["thermal_oil"]
    assert oil.density_table == ((293.15, 870.0), (573.15, 680.0))
    assert (oil.density.value, oil.density.standard) == pytest.approx((1.0, 0.01))
    said = _said(
        tmp_path, _changed("emberlund", ('flow = "oil_flow"', 'flow = "oil_flow", flow_at = "inlet"'))
    )
    assert list(said) == ["machines.orc.streams.oil.flow_at"]


GENSET = """
schema = 1
[site]
name = "Skerry Harbour"
zone = "Atlantic/Faroe"
[exports.panel]
files = ["panel/*.csv"]
clock = "UTC"
date_order = "year first"
decimal = "."
stamp = ["Date", "Time"]
delimiter = "tab"
tags.torque = { column = "TQ", unit = "kN m", between = "line", hold = "1 min", standard = "0.5 %" }
tags.speed = { column = "N", unit = "rpm", between = "line", hold = "1 min", limit = "1 rpm" }
tags.fuel = { column = "LS", unit = "l", between = "counter", at_most = "200 l/h", standard = "0.3 %" }
[exports.panel.tags.fuel_temperature]
column = "LT"
unit = "degC"
between = "mean"
stamp_marks = "end"
standard = "0.5 K"
[fluids.coolant]
kind = "ethylene glycol"
mass_fraction = "35 %"
[fuels.gas_oil]
unit = "MJ/kg"
standard = "0.5 %"
values = [{ from = 2026-01-01, lower = 42.7 }]
density = { value = "840 kg/m3", at = "15 degC", standard = "0.5 %" }
expansion = { value = "0.00083 1/K", limit = "5 %" }
exergy = { value = 1.065, of = "lower", standard = 0.01 }
[machines.genset]
kind = "diesel genset"
heating_value = "lower"
headline = "gross"
running = { tag = "speed", above = 500 }
ceiling = { kind = "fuel exergy" }
streams.shaft = { role = "work out", by = "shaft", torque = "torque", speed = "speed" }
[machines.genset.streams.fuel]
role = "fuel in"
by = "liquid fuel"
fuel = "gas_oil"
volume = "fuel"
temperature = "fuel_temperature"
[machines.genset.streams.radiation]
role = "loss"
by = "constant"
power = "12 kW"
standard = "4 kW"
source = "maker's sheet"
"""


def test_a_diesel_genset_by_shaft_and_litres(tmp_path):
    """Liquid fuel by volume with temperature, shaft power, glycol, tab and two stamp columns are read."""
    plant = _read(tmp_path, GENSET)
    machine, fuel = plant.machines["genset"], plant.fuels["gas_oil"]
    assert machine.streams["fuel"].way == LiquidFuel("gas_oil", None, "fuel", "fuel_temperature")
    assert machine.streams["shaft"].way == Shaft("torque", "speed")
    assert isinstance(machine.streams["radiation"].way, Constant)
    assert machine.streams["radiation"].way.power.standard == 4000.0
    assert machine.title == "genset"
    assert machine.running.above == pytest.approx(500.0 / 60.0)
    assert fuel.phase == "liquid" and fuel.volume_state is None
    assert fuel.values[0].lower.value == pytest.approx(42.7e6)
    assert fuel.density_temperature_K == pytest.approx(288.15)
    assert fuel.expansion.standard == pytest.approx(0.00083 * 0.05 / 3**0.5)
    assert plant.fluids["coolant"].mass_fraction == pytest.approx(0.35)
    assert plant.exports["panel"].delimiter == "\t"
    assert plant.exports["panel"].stamp_columns == ("Date", "Time")
    assert plant.tags["fuel_temperature"].hold_s == 3600.0


@pytest.mark.parametrize(
    ("there", "instead", "key"),
    [
        ('temperature = "fuel_temperature"', "", "streams.fuel.temperature"),
        ('expansion = { value = "0.00083 1/K", limit = "5 %" }', "", "streams.fuel.temperature"),
        ('density = { value = "840 kg/m3", at = "15 degC", standard = "0.5 %" }', "", "gas_oil.density"),
        ('torque = "torque"', 'torque = "speed"', "streams.shaft.torque"),
        ('mass_fraction = "35 %"', "mass_fraction = 0.9", "coolant.mass_fraction"),
        ("exergy = { value", "exergi = { value", "gas_oil.exergi"),
        ('standard = "4 kW"', "standard = 4", ""),
        ('unit = "l", between = "counter"', 'unit = "l/h", between = "counter"', "tags.fuel.unit"),
        ('clock = "UTC"', 'clock = "UTC"\nrepeated_hour = "drop"', "panel.repeated_hour"),
        ('date_order = "year first"', 'date_order = "epoch seconds"', ""),
        ('volume = "fuel"', 'mass = "fuel"', "fuel.mass"),
    ],
)
def test_slips_in_the_genset(there, instead, key, tmp_path):
    """A slip is told at its key; forms that mean the same thing are read."""
    assert there in GENSET
    text = GENSET.replace(there, instead, 1)
    if key:
        assert any(key in place for place in _said(tmp_path, text))
    else:
        assert _read(tmp_path, text).machines["genset"].streams
