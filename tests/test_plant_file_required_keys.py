"""Every required key of both sample sites, deleted in turn, is asked for by name."""

from __future__ import annotations

import copy
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from auditor.plant_file import read_plant
from auditor.plant_file.export_parts import tag_form
from auditor.plant_file.machine_parts import ceiling_form, stream_form
from auditor.plant_file.parts import Choice, Part, form_of, keys_of, required_keys
from auditor.plant_file.site_parts import PlantPart
from auditor.plant_file.substance_parts import fluid_form, fuel_form, meter_form
from auditor.plant_file.written import toml_text
from auditor.records.errors import Exit, PlantFileError

SAMPLES = Path(__file__).parent.parent / "sample_logs"
SITES = ("emberlund", "quillmere")
Path_ = tuple[str | int, ...]


def _data(site: str) -> dict[str, Any]:
    return tomllib.loads((SAMPLES / site / "plant.toml").read_text(encoding="utf-8"))


def _write(folder: Path, data: dict[str, Any]) -> Path:
    lines = (f"{key} = {toml_text(value)}" for key, value in data.items())
    (folder / "plant.toml").write_text("\n".join(lines), encoding="utf-8")
    return folder


def _without(data: dict[str, Any], path: Path_) -> dict[str, Any]:
    changed = copy.deepcopy(data)
    table: Any = changed
    for key in path[:-1]:
        table = table[key]
    del table[path[-1]]
    return changed


def _parts(
    model: type[Part], raw: Any, path: Path_ = ()
) -> Iterator[tuple[type[Part], dict[str, Any], Path_]]:
    """Every table of a file with its form, found from the models alone."""
    yield model, raw, path
    for key, value in raw.items():
        _, field = keys_of(model)[key]
        annotation, choice = form_of(field.annotation, field.metadata)
        if isinstance(value, dict) and choice is not None:
            yield from _parts(choice.pick(value), value, (*path, key))
        elif isinstance(annotation, type) and issubclass(annotation, Part):
            yield from _parts(annotation, value, (*path, key))
        elif isinstance(value, dict | list) and hasattr(annotation, "__args__"):
            element, inner = form_of(annotation.__args__[-1])
            items = value.items() if isinstance(value, dict) else enumerate(value)
            for name, item in items:
                if inner is not None:
                    yield from _parts(inner.pick(item), item, (*path, key, name))
                elif isinstance(element, type) and issubclass(element, Part):
                    yield from _parts(element, item, (*path, key, name))


def _required(site: str) -> list[Path_]:
    found = []
    for model, raw, path in _parts(PlantPart, _data(site)):
        for group in required_keys(model):
            found += [(*path, key) for key in group if key in raw]
    return found


# Keys that other parts of the file make necessary: the models alone cannot know.
MADE_NECESSARY: dict[str, list[Path_]] = {
    "emberlund": [
        ("machines", "orc", "headline"),
        ("machines", "orc", "rated_power"),
        ("machines", "orc", "ceiling"),
        ("machines", "orc", "streams", "power", "measured_at"),
    ],
    "quillmere": [
        ("site", "altitude"),
        ("site", "air_pressure"),
        ("site", "reference_temperature"),
        ("exports", "engine", "tags", "oxygen", "basis"),
        ("exports", "gas", "tags", "gas_pressure", "pressure"),
        ("fuels", "natural_gas", "air_demand"),
        ("fuels", "natural_gas", "flue_gas"),
        ("fuels", "natural_gas", "exergy"),
        ("machines", "engine", "heating_value"),
        ("machines", "engine", "headline"),
        ("machines", "engine", "rated_power"),
        ("machines", "engine", "ceiling"),
        ("machines", "engine", "streams", "hot_water", "flow_at"),
    ],
}


@pytest.mark.parametrize("site", SITES)
def test_each_required_key_deleted_is_named(site, tmp_path):
    """Without any one required key the file is refused (exit code 2), and the message names that key."""
    data = _data(site)
    read_plant(_write(tmp_path, data))  # whole it is accepted
    paths = _required(site) + MADE_NECESSARY[site]
    assert len(paths) > 100
    for path in paths:
        with pytest.raises(PlantFileError) as caught:
            read_plant(_write(tmp_path, _without(data, path)))
        assert caught.value.exit_code == Exit.USAGE
        key = str(path[-1])
        assert any(f'"{key}"' in fault.found for fault in caught.value.faults), (path, str(caught.value))


@pytest.mark.parametrize("site", SITES)
def test_what_is_never_guessed_is_among_the_required_keys(site):
    """Clock, meaning between stamps, uncertainty and the like have no default anywhere."""
    ends = {path[-1] for path in _required(site) + MADE_NECESSARY[site]}
    never_guessed = {
        "clock",
        "between",
        "standard",
        "headline",
        "unit",
        "hold",
        "date_order",
        "decimal",
        "kind",
    }
    if site == "quillmere":
        never_guessed |= {"heating_value", "pressure", "volume_state", "reads", "basis", "at_most", "flow_at"}
    assert never_guessed <= ends


@pytest.mark.parametrize("between", ["mean", "amount"])
def test_means_and_amounts_must_say_which_end_their_stamp_marks(between, tmp_path):
    """A mean or an amount without stamp_marks is refused; with it, it is read."""
    data = _data("quillmere")
    tag = {
        "column": "X",
        "unit": "kWh" if between == "amount" else "kW",
        "between": between,
        "standard": "1 %",
    }
    data["exports"]["engine"]["tags"]["extra"] = tag
    with pytest.raises(PlantFileError, match="stamp_marks"):
        read_plant(_write(tmp_path, data))
    tag["stamp_marks"] = "end"
    assert read_plant(_write(tmp_path, data)).tags["extra"].stamp_marks == "end"


@pytest.mark.parametrize("form", [tag_form, stream_form, ceiling_form, meter_form])
def test_an_undecided_table_asks_for_the_key_that_decides(form):
    """An empty table has the form that asks for the deciding key and knows all other keys."""
    undecided = form({})
    assert {"between", "by", "kind", "reads"} & {key for group in required_keys(undecided) for key in group}
    assert undecided.also_known


@pytest.mark.parametrize("pick", [fluid_form, fuel_form])
def test_fluids_and_fuels_have_a_form_even_when_empty(pick):
    """An empty fluid or fuel is read in a form that has required keys."""
    assert list(required_keys(Choice(pick).pick({})))
