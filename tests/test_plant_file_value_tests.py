"""Keys of the value tests: read into SI, and refused with a remedy where they do not say enough."""

from __future__ import annotations

from pathlib import Path

import pytest
from site_factory import GAS_ENGINE, changed

from auditor.plant_file import read_plant
from auditor.records.errors import PlantFileError
from auditor.records.machines import Running
from auditor.records.plant import ChangeRule, SpikeRule, Tag

SUPPLY = 'column = "S", unit = "degC", between = "step", hold = "1 min"'


def supply(folder: Path, keys: str) -> Tag:
    """The supply temperature with some further keys."""
    text = changed(GAS_ENGINE, (SUPPLY, f"{SUPPLY}, {keys}"))
    (folder / "plant.toml").write_text(text, encoding="utf-8")
    return read_plant(folder).tags["supply"]


@pytest.mark.parametrize(
    ("keys", "field", "expected"),
    [
        ('spike = "5 K"', "spike", SpikeRule(5.0, None)),
        ("spike = 5", "spike", SpikeRule(5.0, None)),
        ('spike = "9 degF"', "spike", SpikeRule(pytest.approx(5.0), None)),
        ('spike = "6 times its scatter", resolution = 0.1', "spike", SpikeRule(None, 6.0)),
        ('change_at_most = "5 K/min"', "change_at_most", ChangeRule(5.0, 60.0)),
        ('change_at_most = "5 K / 30 s"', "change_at_most", ChangeRule(5.0, 30.0)),
        ('change_at_most = "90 K/h"', "change_at_most", ChangeRule(90.0, 3600.0)),
        ("saturates_at = [130]", "saturates_at", (None, pytest.approx(403.15))),
        ("saturates_at = [0, 130]", "saturates_at", (pytest.approx(273.15), pytest.approx(403.15))),
        (
            'not_zero_while = { tag = "power", above = "20 kW" }',
            "not_zero_while",
            Running("power", 20_000.0, None),
        ),
    ],
)
def test_value_tests_are_read_into_si(tmp_path: Path, keys: str, field: str, expected: object) -> None:
    """A size of a temperature is a difference, an end of its range a level."""
    assert getattr(supply(tmp_path, keys), field) == expected


@pytest.mark.parametrize(
    ("keys", "key", "words"),
    [
        ('spike = "6 times its scatter"', "supply.spike", "add the key resolution"),
        ('spike = "2 times its scatter", resolution = 0.1', "supply.spike", "ordinary noise"),
        ("spike = 0", "supply.spike", "above zero"),
        ('spike = "5 bar"', "supply.spike", '"bar" is a unit of pressure'),
        ('change_at_most = "5 K"', "supply.change_at_most", "5 K/min"),
        ('change_at_most = "5 bar/min"', "supply.change_at_most", '"bar" is a unit of pressure'),
        ('change_at_most = "0 K/min"', "supply.change_at_most", "not above zero"),
        ("saturates_at = [130, 0]", "supply.saturates_at", "[0, 700]"),
        ("saturates_at = []", "supply.saturates_at", "[0, 700]"),
        ('not_zero_while = { tag = "supply", above = 3 }', "not_zero_while.tag", "its own zeros"),
        ('not_zero_while = { tag = "powr", above = "20 kW" }', "not_zero_while.tag", '"power"'),
        ('not_zero_while = { tag = "power", is = "closed" }', "not_zero_while.is", "is no state"),
        ('not_zero_while = { tag = "power" }', "not_zero_while", "above"),
    ],
)
def test_what_does_not_say_enough_is_refused(tmp_path: Path, keys: str, key: str, words: str) -> None:
    """Each fault names its key and what to write."""
    with pytest.raises(PlantFileError) as caught:
        supply(tmp_path, keys)
    told = " ".join(f"{fault.where} {fault.found} {fault.fix}" for fault in caught.value.faults)
    assert key in told and words in told


@pytest.mark.parametrize("key", ["spike = 5", 'change_at_most = "5 kW/min"', "saturates_at = [700]"])
def test_a_counter_has_its_own_tests(tmp_path: Path, key: str) -> None:
    """Spikes of a counter are found by what it can count; the keys of levels are unknown there."""
    text = changed(
        GAS_ENGINE,
        ('column = "P", unit = "kW", between = "step", hold = "1 min"',
         f'column = "P", unit = "kWh", between = "counter", at_most = "1200 kW", {key}'),
    )  # fmt: skip
    (tmp_path / "plant.toml").write_text(text, encoding="utf-8")
    with pytest.raises(PlantFileError) as caught:
        read_plant(tmp_path)
    assert any(key.partition(" ")[0] in fault.where for fault in caught.value.faults)
