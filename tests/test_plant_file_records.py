"""What a plant file says, in SI: uncertainties, limits, fuels, moments, and the places they came from."""

from __future__ import annotations

import math
from datetime import UTC, datetime
from pathlib import Path

import pytest

from auditor.plant_file import read_plant
from auditor.plant_file.standard_air import standard_pressure_Pa
from auditor.records.errors import PlantFileError
from auditor.records.kinds import KINDS
from auditor.records.machines import CeilingKind, Role, SameAs, ShareOf
from auditor.records.plant import Rules

SAMPLES = Path(__file__).parent.parent / "sample_logs"
KWH_J = 3.6e6


def _sample(name: str) -> str:
    return (SAMPLES / name / "plant.toml").read_text(encoding="utf-8")


def _read(folder: Path, text: str):
    (folder / "plant.toml").write_text(text, encoding="utf-8")
    return read_plant(folder)


@pytest.fixture(scope="module")
def emberlund():
    """The waste-heat site."""
    return read_plant(SAMPLES / "emberlund")


@pytest.fixture(scope="module")
def quillmere():
    """The gas-engine site, read by the path of its file."""
    return read_plant(SAMPLES / "quillmere" / "plant.toml")


def _us(*moment: int) -> int:
    return round(datetime(*moment, tzinfo=UTC).timestamp() * 1e6)


def test_class_limit_of_a_span_is_rectangular(emberlund):
    """A limit of 2 % of 1200 kW is 24 kW wide each way, 24/sqrt(3) kW of standard uncertainty."""
    # JCGM 100:2008, 4.3.7: u = a / sqrt(3) for a rectangular distribution of half-width a.
    calibration = emberlund.tags["panel_power"].calibration
    assert calibration.absolute == pytest.approx(24_000.0 / math.sqrt(3.0), rel=1e-12)
    assert calibration.relative == 0.0
    assert calibration.declared == "limit 2 % of 1200 kW"


def test_percent_of_reading_bare_number_and_kelvin(emberlund, quillmere):
    """Percent is of the reading, a bare number is in the tag's own unit, kelvin is a difference."""
    assert emberlund.tags["oil_flow"].calibration.relative == pytest.approx(0.02)
    assert quillmere.tags["oxygen"].calibration.absolute == pytest.approx(0.002)  # 0.2 points of percent
    assert emberlund.tags["oil_hot"].calibration.absolute == pytest.approx(0.5)
    assert emberlund.tags["exhaust_in"].deadband == pytest.approx(5.0)  # not 278.15


def test_parts_of_an_uncertainty_add_in_quadrature(tmp_path):
    """A list of 3 kW and 4 kW is 5 kW; a percentage beside them stays a share of the reading."""
    # JCGM 100:2008, 5.1.2: independent parts add as squares.
    text = _sample("emberlund").replace('limit = "2 % of 1200 kW"', 'standard = ["3 kW", 4, "1 %"]')
    calibration = _read(tmp_path, text).tags["panel_power"].calibration
    assert calibration.absolute == pytest.approx(5_000.0)
    assert calibration.relative == pytest.approx(0.01)


def test_percent_of_a_temperature_reading_is_refused(tmp_path):
    """2 % of 300 degC depends on where zero lies, so it is refused; 2 % of a span of 150 K is 3 K."""
    text = _sample("emberlund")
    with pytest.raises(PlantFileError, match="depends on its scale"):
        _read(tmp_path, text.replace('frozen_after = "2 h", standard = "0.5 K"', 'standard = "2 %"', 1))
    spread = _read(
        tmp_path, text.replace('frozen_after = "2 h", standard = "0.5 K"', 'standard = "2 % of 150 K"', 1)
    )
    assert spread.tags["oil_hot"].calibration.absolute == pytest.approx(3.0)


def test_counters_convert_to_joule_and_their_limits_to_watt(quillmere):
    """A counter in kWh is scaled to joule; its largest rate is in watt, its full scale in joule."""
    counter = quillmere.tags["generated"]
    assert (counter.scale, counter.offset, counter.si_unit) == (KWH_J, 0.0, "J")
    assert counter.at_most == pytest.approx(1.3e6)
    assert counter.full_scale == pytest.approx(9_999_999 * KWH_J)
    assert counter.resolution == pytest.approx(KWH_J)
    assert counter.hold_s == 900.0
    assert quillmere.tags["gas_index"].at_most == pytest.approx(400.0 / 3600.0)


def test_an_absolute_uncertainty_of_a_counter_is_one_of_its_rate(tmp_path):
    """A constant error of an index cancels in differences, so it is refused; a span is a rate."""
    text = _sample("quillmere")
    rate = 'at_most = "1300 kW", standard = "0.5 %"'
    with pytest.raises(PlantFileError, match="cancels in its differences"):
        _read(tmp_path, text.replace(rate, 'at_most = "1300 kW", standard = 5'))
    plant = _read(tmp_path, text.replace(rate, 'at_most = "1300 kW", standard = "0.5 % of 1200 kW"'))
    assert plant.tags["generated"].calibration.absolute == pytest.approx(6_000.0)


def test_ranges_and_thresholds_are_levels(emberlund, quillmere):
    """A believable range of a temperature is a level in kelvin; a low-flow cut-off is a size."""
    assert emberlund.tags["exhaust_in"].believable == pytest.approx((273.15, 973.15))
    assert quillmere.tags["low_flow"].cut_off == pytest.approx(0.5 / 3600.0)
    assert quillmere.tags["gas_pressure"].believable == pytest.approx((-1e4, 1e5))
    assert quillmere.tags["gas_pressure"].pressure == "gauge"


def test_a_log_in_fahrenheit_has_the_same_limits(tmp_path, emberlund):
    """The same tag declared in degF gives the same range in kelvin and the same dead band."""
    text = _sample("emberlund").replace(
        'unit = "degC", between = "step", hold = "60 min", deadband = "5 K", range = [0, 700]',
        'unit = "degF", between = "step", hold = "60 min", deadband = 9, range = [32, 1292]',
    )
    tag, same = _read(tmp_path, text).tags["exhaust_in"], emberlund.tags["exhaust_in"]
    assert tag.believable == pytest.approx(same.believable)
    assert tag.deadband == pytest.approx(same.deadband)
    # 212 degF is 373.15 K by the definition of the scale (NIST SP 811, appendix B.8).
    assert tag.scale * 212.0 + tag.offset == pytest.approx(373.15)


def test_fuel_values_state_and_their_one_common_influence(quillmere):
    """Heating values become joule per cubic metre at 0 degC; one factor carries their uncertainty."""
    fuel = quillmere.fuels["natural_gas"]
    assert fuel.phase == "gas"
    assert (fuel.volume_state.temperature_K, fuel.volume_state.pressure_Pa) == (273.15, 101_325.0)
    assert fuel.volume_state.dry
    first, second = fuel.values
    assert first.lower.value == pytest.approx(10.10 * KWH_J)
    assert second.higher.value == pytest.approx(11.05 * KWH_J)
    assert first.lower.standard == 0.0
    assert fuel.value_standard.key == "fuels.natural_gas.value_standard"
    assert (fuel.value_standard.value, fuel.value_standard.standard) == pytest.approx((1.0, 0.004))
    # Copenhagen is two hours ahead of UTC in October before the clocks change.
    assert second.from_us == _us(2025, 10, 15, 22)
    assert fuel.flue_gas.fuel_density.standard == pytest.approx(0.0078)
    assert fuel.exergy.value == 1.04 and fuel.exergy_of == "lower"


def test_air_pressure_follows_from_the_altitude(quillmere):
    """Without a barometer the mean pressure of the standard atmosphere is assumed, with its spread."""
    pressure = quillmere.site.air_pressure.from_altitude
    assert pressure.key == "site.air_pressure"
    assert pressure.value == pytest.approx(standard_pressure_Pa(40.0))
    assert pressure.standard == pytest.approx(900.0)


@pytest.mark.parametrize(
    ("altitude_m", "printed_Pa"),
    [(0.0, 101_325.0), (500.0, 95_461.0), (1_000.0, 89_876.0), (2_000.0, 79_501.0), (5_000.0, 54_048.0)],
)
def test_standard_atmosphere(altitude_m, printed_Pa):
    """The pressure agrees with the printed table to its last digit."""
    # ISO 2533:1975, table of pressure by geometric altitude (values from memory, as also printed in the
    # U.S. Standard Atmosphere 1976, which is the same in this layer): 954.61, 898.76, 795.01, 540.48 hPa.
    assert standard_pressure_Pa(altitude_m) == pytest.approx(printed_Pa, abs=0.6)


def test_assumed_numbers_are_named_by_their_place_and_unique(emberlund, quillmere):
    """The key of every assumed number is its place in the file, and no two share one."""
    feed = emberlund.machines["orc"].streams["feed"].way
    assert isinstance(feed, ShareOf)
    assert feed.share.key == "machines.orc.streams.feed.share"
    assert (feed.share.value, feed.share.standard) == (0.3125, 0.03)
    assert feed.share.source.startswith("motor list")
    assert emberlund.fluids["thermal_oil"].heat_capacity.key == "fluids.thermal_oil.heat_capacity"
    assert emberlund.fluids["thermal_oil"].heat_capacity.value == pytest.approx(2350.0)
    fuel, meter = quillmere.fuels["natural_gas"], quillmere.gas_meters["gas_meter"]
    assumed = [
        quillmere.site.air_pressure.from_altitude,
        fuel.value_standard,
        *(number for entry in fuel.values for number in (entry.lower, entry.higher)),
        fuel.flue_gas.air_demand,
        fuel.flue_gas.dry_flue_gas,
        fuel.flue_gas.fuel_density,
        fuel.flue_gas.heat_capacity,
        fuel.exergy,
        meter.compressibility_ratio,
        *(
            stream.way.share
            for stream in quillmere.machines["engine"].streams.values()
            if isinstance(stream.way, ShareOf)
        ),
    ]
    keys = [number.key for number in assumed]
    assert len(set(keys)) == len(keys)


def test_machines_streams_and_ceiling(emberlund):
    """Streams keep the order of the file; a shared stream points at the other machine."""
    engine, coil = emberlund.machines["orc"], emberlund.machines["coil"]
    assert list(engine.streams) == ["oil", "power", "own_use", "feed", "drive", "air"]
    assert engine.ceiling.kind is CeilingKind.FINITE
    assert (engine.ceiling.source, engine.ceiling.sinks) == ("oil", ("air",))
    assert engine.running.above == pytest.approx(20e3)
    assert engine.steady.change_below == pytest.approx(50e3) and engine.steady.within_s == 1800.0
    assert engine.rated_power_W == 1e6 and engine.minimum_load == pytest.approx(0.3)
    assert coil.streams["oil"].way == SameAs("orc", "oil")
    assert coil.streams["oil"].role is Role.USEFUL_HEAT
    assert coil.ceiling is None and coil.headline is None and coil.basis is None


def test_water_is_built_in_where_it_is_used(emberlund, quillmere):
    """Water needs no declaration, and is listed only where a stream uses it."""
    assert quillmere.fluids["water"].kind == "water"
    assert "water" not in emberlund.fluids


def test_exclusions_are_on_the_site_clock(emberlund):
    """From 09:00 to 11:30 in Stockholm's summer is 07:00 to 09:30 UTC."""
    (distrust,) = emberlund.distrust
    assert (distrust.start_us, distrust.end_us) == (_us(2026, 7, 28, 7), _us(2026, 7, 28, 9, 30))
    assert distrust.reason == "sensor moved for calibration"


def test_lines_are_those_of_the_file(emberlund):
    """Tags, machines and exclusions remember the line that they stand on."""
    lines = emberlund.text.splitlines()
    assert "WX-T1" in lines[emberlund.tags["exhaust_in"].line - 1]
    assert lines[emberlund.machines["orc"].line - 1] == "[machines.orc]"
    assert "same_as" in lines[emberlund.machines["coil"].streams["oil"].line - 1]
    assert lines[emberlund.distrust[0].line - 1] == "[[distrust]]"


def test_rules_written_in_the_sample_are_the_built_in_ones(emberlund, quillmere):
    """The sample that spells the coverage rules out, and the one that does not, have the same."""
    assert emberlund.rules == quillmere.rules == Rules()


def test_a_file_with_byte_order_mark_and_windows_line_ends(tmp_path, emberlund):
    """A file saved by a Windows editor gives the same plant, lines included."""
    data = "\ufeff" + _sample("emberlund").replace("\n", "\r\n")
    (tmp_path / "plant.toml").write_bytes(data.encode("utf-8"))
    plant = read_plant(tmp_path)
    assert plant.tags == emberlund.tags
    assert plant.machines == emberlund.machines


def test_every_kind_of_machine_has_its_row():
    """Bands lie between nothing and a little above one, and ceilings belong to kinds that give work."""
    for name, kind in KINDS.items():
        assert kind.name == name
        assert bool(kind.ceilings) == kind.gives_work
        assert (Role.WORK_OUT in kind.roles) == kind.gives_work
        assert (Role.FUEL_IN in kind.roles) == kind.burns_fuel
        assert all(0.0 <= low < high <= 1.1 for low, high in kind.bands.values())
        assert kind.reason and kind.bands_from
