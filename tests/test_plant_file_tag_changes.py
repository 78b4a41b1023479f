"""Headings and changes of a tag with dates: what they become, and every slip told at its line."""

from __future__ import annotations

import json
from datetime import UTC, datetime
from pathlib import Path

import pytest
from site_factory import GAS_ENGINE, changed

from auditor.plant_file import read_plant
from auditor.plant_file.schema import plant_schema
from auditor.records.errors import Fault, PlantFileError
from auditor.records.plant import Heading, Plant, Tag

SUPPLY = 'column = "S", unit = "degC", between = "step", hold = "1 min", range = [0, 130], standard = "0.1 K"'
POWER = 'column = "P", unit = "kW", between = "step", hold = "1 min", standard = "0.5 %"'


def us(text: str) -> int:
    """Instant of a moment in UTC."""
    return round(datetime.fromisoformat(text).replace(tzinfo=UTC).timestamp() * 1e6)


def plant(folder: Path, *edits: tuple[str, str]) -> Plant:
    """The small works with edits of its plant file."""
    (folder / "plant.toml").write_text(changed(GAS_ENGINE, *edits), encoding="utf-8")
    return read_plant(folder)


def faults(folder: Path, *edits: tuple[str, str]) -> tuple[Fault, ...]:
    """The faults that edits of the plant file make."""
    with pytest.raises(PlantFileError) as caught:
        plant(folder, *edits)
    return caught.value.faults


def supply(folder: Path, changes: str) -> Tag:
    """The supply temperature with changes."""
    return plant(folder, (SUPPLY, f"{SUPPLY}, changes = [{changes}]")).tags["supply"]


def test_one_heading_several_or_several_with_dates(tmp_path: Path) -> None:
    """A plain text stays as it is; a list keeps its order; dates are of the site's clock."""
    assert plant(tmp_path).tags["power"].headings == ()
    several = plant(tmp_path, ('column = "P"', 'column = ["PT101", "PT-101A"]')).tags["power"]
    assert several.column == "PT101"
    assert several.headings == (Heading("PT101"), Heading("PT-101A"))
    dated = (
        'column = [{ name = "PT101", until = 2026-07-10T08:00:00 }, { name = "PT-101A", from = 2026-07-10 }]'
    )
    for zone, early in (("UTC", 0), ("Europe/Stockholm", 2 * 3_600_000_000)):
        edits = (('column = "P"', dated), ('zone = "UTC"', f'zone = "{zone}"'))
        got = plant(tmp_path, *edits).tags["power"]
        assert got.headings == (
            Heading("PT101", None, us("2026-07-10T08:00:00") - early),
            Heading("PT-101A", us("2026-07-10") - early, None),
        )


def test_what_a_change_does_not_write_goes_on_in_SI(tmp_path: Path) -> None:
    """To kelvin and back: believable range and uncertainty are those of the sensor, not of the unit."""
    tag = supply(tmp_path, '{ from = 2026-07-20, unit = "K" }, { from = 2026-07-21T06:00:00, unit = "degC" }')
    kelvin, celsius = (change.tag for change in tag.changes)
    assert [change.from_us for change in tag.changes] == [us("2026-07-20"), us("2026-07-21T06:00:00")]
    assert (kelvin.unit, kelvin.scale, kelvin.offset) == ("K", 1.0, 0.0)
    assert kelvin.believable == tag.believable == pytest.approx((273.15, 403.15))
    assert kelvin.calibration == tag.calibration and not any(change.new_calibration for change in tag.changes)
    assert (celsius.scale, celsius.offset) == (tag.scale, tag.offset)
    spans = [(start, then.unit) for start, _, then in tag.stretches]
    assert spans[1:] == [(us("2026-07-20"), "K"), (us("2026-07-21T06:00:00"), "degC")]


def test_a_change_is_read_in_the_unit_of_then(tmp_path: Path) -> None:
    """Range in degF and resolution in the new unit; each change adds to the one before."""
    tag = supply(
        tmp_path,
        '{ from = 2026-07-20, unit = "degF", range = [32, 212], resolution = 0.9 },'
        ' { from = 2026-07-22, limit = "1 K", cut_off = 3 }'.replace(", cut_off = 3", ""),
    )
    first, second = (change.tag for change in tag.changes)
    assert first.believable == pytest.approx((273.15, 373.15))
    assert first.resolution == pytest.approx(0.5)
    assert second.unit == "degF" and second.resolution == first.resolution
    assert second.calibration is not None
    assert second.calibration.absolute == pytest.approx(1.0 / 3.0**0.5)  # rectangular
    assert [change.new_calibration for change in tag.changes] == [False, True]
    assert tag.changes[1].since == "2026-07-22"


def test_a_pressure_goes_over_to_absolute(tmp_path: Path) -> None:
    """Gauge and absolute are a property with a date like any other."""
    text = POWER.replace('"kW"', '"bar"') + ', pressure = "gauge"'
    made = f'tags.extra = {{ {text}, changes = [{{ from = 2026-07-20, pressure = "absolute" }}] }}\n[fluids'
    tag = plant(tmp_path, ("[fluids", made.replace('"P"', '"X"'))).tags["extra"]
    assert [then.pressure for _, _, then in tag.stretches] == ["gauge", "absolute"]


SLIPS = [
    (POWER, f"{POWER}, changes = [{{ unit = 'MW' }}]", "changes[0].from", '"from" is missing'),
    (POWER, f"{POWER}, changes = [{{ from = 2026-07-10 }}]", "changes[0]", "nothing is said to change"),
    (POWER, f"{POWER}, changes = [{{ from = '2026-07-10', unit = 'MW' }}]", "changes[0].from", "in quotes"),
    (
        POWER,
        f"{POWER}, changes = [{{ from = 2026-07-10, units = 'MW' }}]",
        "changes[0].units",
        "not known here",
    ),
    (POWER, f"{POWER}, changes = [{{ from = 2026-07-10, unit = 'K' }}]", "changes[0].unit", "measures power"),
    (POWER, f"{POWER}, changes = [{{ from = 2026-07-10, range = [5, 1] }}]", "changes[0].range", "no range"),
    (
        POWER,
        f"{POWER}, changes = [{{ from = 2026-07-10, standard = '1 K' }}]",
        "changes[0].standard",
        "power",
    ),
    (
        POWER,
        f"{POWER}, changes = [{{ from = 2026-07-10, unit = 'W' }}, {{ from = 2026-07-09, unit = 'kW' }}]",
        "changes[1].from",
        "not after 2026-07-10",
    ),
    (
        POWER,
        f"{POWER}, changes = [{{ from = 2026-07-10, limit = '1 %', standard = '1 %' }}]",
        "changes[0].limit",
        "both",
    ),
    ('column = "P"', 'column = ["P", "P"]', "power.column", "written twice"),
    ('column = "P"', "column = []", "power.column", "is empty"),
    ('column = "P"', 'column = ["PT101", "F"]', "flow.column", 'bound to the tag "power"'),
    ('column = "P"', "column = [{ from = 2026-07-10 }]", "power.column", '"name" is missing'),
    ('column = "P"', 'column = [{ name = "P", till = 2026-07-10 }]', "power.column", '"till" is not known'),
    (
        'column = "P"',
        'column = [{ name = "P", from = 2026-07-10, until = 2026-07-09 }]',
        "power.column",
        "ends before it begins",
    ),
]


@pytest.mark.parametrize(("old", "new", "key", "words"), SLIPS)
def test_each_slip_is_told_once_at_its_key(tmp_path: Path, old: str, new: str, key: str, words: str) -> None:
    """Line, key and what was found; nothing else is at fault."""
    (fault,) = faults(tmp_path, (old, new))
    where = GAS_ENGINE[: GAS_ENGINE.index('"P"' if "power" in key or "changes" in key else '"F"')]
    assert fault.where.startswith(f"plant.toml:{where.count(chr(10)) + 1}, "), fault
    assert fault.where.endswith(key), fault
    assert words in fault.found, fault
    assert fault.fix


def test_several_slips_are_told_at_once(tmp_path: Path) -> None:
    """Faults of two changes and of another tag come together; a date to add is written without quotes."""
    edits = (
        (POWER, f"{POWER}, changes = [{{ unit = 'MW' }}, {{ from = 2026-07-10, range = [5, 1] }}]"),
        ('column = "F", unit = "kg/s"', 'column = "F", unit = "kgg/s"'),
    )
    told = faults(tmp_path, *edits)
    assert [fault.where.rpartition(".")[2] for fault in told] == ["from", "range", "unit"]
    assert "from = 2026-07-10" in told[0].fix


def test_the_schema_knows_them() -> None:
    """Each kind of tag has its changes, and the heading its three ways of writing."""
    schema = json.dumps(plant_schema())
    for name in ("CounterTagChange", "MeanTagChange", "InstantTagChange", "NumberTagChange"):
        assert f"$defs/{name}" in schema
    column = plant_schema()["$defs"]["StepTag"]["properties"]["column"]
    assert [each.get("type") for each in column["oneOf"]] == ["string", "array"]
