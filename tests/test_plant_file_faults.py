"""Typical slips in a plant file: each is told with its line, its key, the nearest valid word and a remedy."""

from __future__ import annotations

from pathlib import Path

import pytest

from auditor.plant_file import read_plant
from auditor.records.errors import Exit, Fault, PlantFileError

SAMPLES = Path(__file__).parent.parent / "sample_logs"


def _sample(name: str) -> str:
    return (SAMPLES / name / "plant.toml").read_text(encoding="utf-8")


def _faults(folder: Path, text: str) -> tuple[Fault, ...]:
    (folder / "plant.toml").write_text(text, encoding="utf-8")
    with pytest.raises(PlantFileError) as caught:
        read_plant(folder)
    assert caught.value.exit_code == Exit.USAGE
    return caught.value.faults


def _line_of(text: str, piece: str) -> int:
    before, found, _ = text.partition(piece)
    assert found, f"{piece} is not in the text"
    return before.count("\n") + 1


# sample, what stands there, what is written instead, key at fault, words of the message
SLIPS = [
    ("emberlund", 'decimal = ","', 'decimals = ","', "exports.furnace.decimals", ['nearest is "decimal"']),
    ("emberlund", 'between = "step"', 'between = "stepp"', "tags.exhaust_in.between", ['nearest is "step"']),
    ("emberlund", 'hold = "60 min"', 'hold = "60"', "tags.exhaust_in.hold", ["has no unit"]),
    ("emberlund", 'hold = "60 min"', "hold = 60", "tags.exhaust_in.hold", ["60 stands without a unit"]),
    (
        "emberlund",
        'hold = "60 min"',
        'hold = "60 K"',
        "tags.exhaust_in.hold",
        ["temperature", "time is needed"],
    ),
    ("emberlund", 'deadband = "5 K"', 'deadband = "5,0 K"', "tags.exhaust_in.deadband", ["decimal comma"]),
    (
        "emberlund",
        'standard = "3 %" } # averaging',
        'standard = "3 kW" } #',
        "exhaust_flow.standard",
        ["mass flow"],
    ),
    ("emberlund", 'unit = "kW"', 'unit = "kWatt"', "tags.gross_power.unit", ["not a known unit", '"kW"']),
    ("emberlund", 'unit = "kW"', 'unit = "mW"', "tags.gross_power.unit", ["milliwatt", '"MW" or "kW"']),
    ("emberlund", '"Europe/Stockholm"', '"Europe/Stokholm"', "site.zone", ['nearest is "Europe/Stockholm"']),
    ("emberlund", 'clock = "+01:00"', 'clock = "UTC+1"', "exports.power.clock", ["+01:00"]),
    ("emberlund", 'fluid = "thermal_oil"', 'fluid = "termal_oil"', "oil.fluid", ['nearest is "thermal_oil"']),
    ("emberlund", 'flow = "oil_flow"', 'flow = "oil_fow"', "streams.oil.flow", ['nearest is "oil_flow"']),
    ("emberlund", 'inlet = "oil_hot"', 'inlet = "oil_flow"', "streams.oil.inlet", ["mass flow", '"oil_hot"']),
    ("emberlund", 'role = "own use"', 'role = "own uses"', "own_use.role", ['nearest is "own use"']),
    ("emberlund", 'same_as = "orc.oil"', 'same_as = "orc.oill"', "oil.same_as", ['nearest is "oil"']),
    (
        "emberlund",
        'kind = "heat exchanger"',
        'kind = "heat exchange"',
        "coil.kind",
        ['nearest is "heat exchanger"'],
    ),
    ("emberlund", 'headline = "net"', 'headline = "nett"', "orc.headline", ['nearest is "net"']),
    ("emberlund", "until = 2026-07-28T11", "until = 2026-07-28T08", "distrust[0].until", ["is not after"]),
    (
        "emberlund",
        "from = 2026-07-28T09:00:00",
        'from = "2026-07-28"',
        "distrust[0].from",
        ["without quotes"],
    ),
    ("emberlund", 'column = "TO-T2"', 'column = "TO-T1"', "oil_cold.column", ['bound to the tag "oil_hot"']),
    ("emberlund", "range = [0, 300]", "range = [300, 0]", "own_power.range", ["[300.0, 0.0] is no range"]),
    (
        "emberlund",
        'interval = "15 min"',
        'interval = "25 min"',
        "site.interval",
        ["does not divide one hour"],
    ),
    (
        "emberlund",
        'tick_coverage = "50 %"',
        'tick_coverage = "150 %"',
        "rules.tick_coverage",
        ["more than all"],
    ),
    ("emberlund", "share = 0.3125", "share = 3.125", "feed.share", ["not between 0 and 1"]),
    ("emberlund", 'above = "20 kW"', 'above = "20 K"', "orc.running.above", ["temperature"]),
    ("emberlund", '"5 % of 1000 kW"', '"5 %"', "orc.steady.change_below", ["does not say of what"]),
    ("quillmere", 'pressure = "gauge", ', "", "gas_pressure.pressure", ['"gauge"', '"absolute"']),
    ("quillmere", 'unit = "bar"', 'unit = "barg"', "gas_pressure.unit", ['pressure = "gauge"']),
    ("quillmere", 'basis = "dry", ', "", "oxygen.basis", ['basis = "dry"']),
    ("quillmere", 'basis = "dry"', 'basis = "wet"', "oxygen.basis", ["wet"]),
    (
        "quillmere",
        'flow = "hot_flow", flow_at = "outlet"',
        'flow = "hot_flow"',
        "hot_water.flow_at",
        ["inlet"],
    ),
    ("quillmere", 'is = "closed"', 'is = "close"', "running.is", ['nearest is "closed"']),
    ("quillmere", 'at_most = "1300 kW"', "at_most = 1300", "generated.at_most", ["without a unit"]),
    (
        "quillmere",
        '"0 degC, 101.325 kPa, dry"',
        '"normal"',
        "natural_gas.volume_state",
        ["0 degC, 101.325 kPa"],
    ),
    ("quillmere", 'unit = "kWh/m3"', 'unit = "kWh/kg"', "natural_gas.unit", ["by volume"]),
    ("quillmere", "from = 2025-10-16", "from = 2025-09-16", "values[1].from", ["in order of time"]),
    ("quillmere", "higher = 11.20", "higher = 9.20", "values[0].higher", ["below the lower one"]),
    (
        "quillmere",
        'kind = "fuel exergy"',
        'kind = "fuel energy"',
        "ceiling.kind",
        ['nearest is "fuel exergy"'],
    ),
    (
        "quillmere",
        'of = "gas", oxygen',
        'of = "power", oxygen',
        "streams.air.of",
        ["no gas volume is metered"],
    ),
    ("quillmere", 'reference_temperature = "25 degC"', "", "site.reference_temperature", ["is missing"]),
    ("quillmere", 'at_most = "1300 kW"', 'at_most = "-1300 kW"', "generated.at_most", ["not above zero"]),
    ("quillmere", "exergy = { value = 1.04", "exergy = { value = -1", "exergy.value", ["not above zero"]),
    ("quillmere", 'minimum_load = "30 %"', 'minimum_load = "300 %"', "engine.minimum_load", ["no interval"]),
    ("quillmere", 'tag = "generated", change', 'tag = "breaker", change', "steady.tag", ["is a state"]),
    ("quillmere", 'within = "30 min"', 'within = "5 min"', "steady.within", ["shorter than one interval"]),
    ("quillmere", 'files = ["heat/*.csv"]', 'files = ["gas/*.zip"]', "exports.gas.files", ['export "heat"']),
]


@pytest.mark.parametrize(("sample", "there", "instead", "key", "words"), SLIPS)
def test_a_slip_is_told_with_line_key_and_remedy(sample, there, instead, key, words, tmp_path):
    """One slip gives one fault (or one more that follows from it), at its key, with the remedy."""
    text = _sample(sample)
    changed = text.replace(there, instead, 1)
    assert changed != text

    faults = _faults(tmp_path, changed)

    hits = [fault for fault in faults if key in fault.where]
    assert hits, [str(fault) for fault in faults]
    said = f"{hits[0].found} {hits[0].fix}"
    assert all(word in said for word in words), said
    assert len(faults) <= 2


def test_the_line_is_that_of_the_key(tmp_path):
    """A fault inside an inline table of a long list names the line that the key stands on."""
    text = _sample("quillmere").replace("lower = 9.965", "lower = -9.965")
    (fault, *_) = _faults(tmp_path, text)
    line = _line_of(text, "lower = -9.965")
    assert fault.where == f"plant.toml:{line}, fuels.natural_gas.values[1].lower"


def test_every_fault_of_a_file_is_told_at_once_in_order_of_lines(tmp_path):
    """Ten slips in ten places, of every kind, give ten faults, none hidden by another, sorted by line."""
    slips = (
        ('zone = "Europe/Copenhagen" ', 'zone = "Europe/Kopenhagen" '),  # a value that is checked by itself
        ('tick = "1 min"', 'tick = "7 min"'),  # a value that must suit others
        ('files = ["engine/*.csv.gz"]', 'files = "engine/*.csv.gz"'),  # a wrong type
        ('at_most = "90 kW"', 'at_most = "90 K"'),  # a wrong unit
        ('column = "EX-1", unit = "degC"', 'unit = "degC"'),  # a missing key
        ('basis = "dry", ', 'basis = "dry", drift = 3, '),  # an unknown key
        ('column = "HT-F"', 'column = "HT-S"'),  # a contradiction between two tags
        ('standard = "0.002 bar"', 'standard = "-0.002 bar"'),  # a negative uncertainty
        ('pressure = "gas_pressure"', 'pressure = "gas_presure"'),  # a name that points nowhere
        ('heating_value = "lower"                       # ', "# "),  # a decision that was not taken
    )
    text = _sample("quillmere")
    for there, instead in slips:
        assert text.count(there) >= 1, there
        text = text.replace(there, instead, 1)

    faults = _faults(tmp_path, text)

    assert len(faults) == len(slips), "\n".join(str(fault) for fault in faults)
    lines = [int(fault.where.partition(":")[2].partition(",")[0]) for fault in faults]
    assert lines == sorted(lines)


def test_two_faults_of_one_tag_are_both_told(tmp_path):
    """A missing key does not hide a wrong unit in the same table."""
    text = _sample("emberlund").replace('hold = "60 min", deadband = "5 K"', 'deadband = "5 kW"')
    where = [fault.where for fault in _faults(tmp_path, text)]
    assert any("exhaust_in.hold" in place for place in where)
    assert any("exhaust_in.deadband" in place for place in where)


def test_no_message_speaks_the_language_of_the_validating_library(tmp_path):
    """Messages carry no link, no class name and no wording of the library underneath."""
    text = "schema = 2\nsite = 3\nexports = {}\ndistrust = 1\n"
    text += "machines = { engine = { kind = 4, running = 'yes' } }\n"
    said = "\n".join(str(fault) for fault in _faults(tmp_path, text))
    for foreign in (
        "pydantic",
        "http",
        "Input should",
        "Field required",
        "type=",
        "Part",
        "NoneType",
        "Traceback",
    ):
        assert foreign not in said
    assert "schema" in said and "site" in said and "distrust" in said


@pytest.mark.parametrize(
    ("written", "key"),
    [
        (r'files = ["furnace\new.csv"]', "exports.furnace.files"),
        (r'files = ["furnace/\u0007*.csv"]', "exports.furnace.files"),
        ('files = ["../other/*.csv"]', "exports.furnace.files"),
        ("files = ['C:\\logs\\*.csv']", "exports.furnace.files"),
        ('files = ["/logs/*.csv"]', "exports.furnace.files"),
    ],
)
def test_paths_with_control_characters_or_outside_the_logs_are_refused(written, key, tmp_path):
    """A backslash in double quotes makes a tab or line end in a path: refused with the way to write it."""
    (fault,) = _faults(tmp_path, _sample("emberlund").replace('files = ["furnace/*.csv"]', written))
    assert key in fault.where
    assert "/" in fault.fix


def test_a_control_character_in_a_column_suggests_single_quotes(tmp_path):
    """The remedy for a heading eaten by an escape is to write it in single quotes."""
    (fault,) = _faults(tmp_path, _sample("emberlund").replace('"WX-T1"', r'"WX\temp"'))
    assert "exhaust_in.column" in fault.where
    assert r"\t" in fault.found
    assert "single quotes" in fault.fix


def test_broken_toml_names_line_and_column(tmp_path):
    """A syntax error is told with its place and without the parser's class."""
    text = _sample("emberlund").replace('decimal = ","', "decimal = ,")
    (fault,) = _faults(tmp_path, text)
    assert fault.where == f"plant.toml:{_line_of(text, 'decimal = ,')}, column 11"
    assert "TOML" in fault.found


def test_an_escape_that_toml_does_not_know_is_explained(tmp_path):
    """A Windows path in double quotes is no TOML; the remedy is single quotes."""
    (fault,) = _faults(tmp_path, _sample("emberlund").replace('"furnace/*.csv"', r'"C:\logs\*.csv"'))
    assert "single quotes" in fault.fix


def test_a_file_in_another_encoding_is_told_with_its_line(tmp_path):
    """A plant file saved as cp1252 is refused at the line of the first such letter."""
    text = _sample("emberlund").replace("Emberlund Glassworks", "Emberlund Glasbläserei")
    (tmp_path / "plant.toml").write_bytes(text.encode("cp1252"))
    with pytest.raises(PlantFileError) as caught:
        read_plant(tmp_path)
    (fault,) = caught.value.faults
    assert fault.where == f"plant.toml:{_line_of(text, 'Glasbläserei')}"
    assert "UTF-8" in fault.fix


def test_a_folder_without_plant_file_says_so(tmp_path):
    """A folder without plant.toml, and a path that is not there, are faults with a remedy."""
    for path in (tmp_path, tmp_path / "nothing" / "plant.toml"):
        with pytest.raises(PlantFileError) as caught:
            read_plant(path)
        (fault,) = caught.value.faults
        assert "plant.toml" in fault.where
        assert "logs" in fault.fix


def test_faults_survive_pickling(tmp_path):
    """The error can be handed from a worker process to its parent."""
    import pickle

    faults = _faults(tmp_path, _sample("emberlund").replace("schema = 1", "schema = 9"))
    error = pickle.loads(pickle.dumps(PlantFileError(faults)))
    assert error.faults == faults
