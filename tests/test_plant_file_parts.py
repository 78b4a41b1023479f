"""Small pieces of the plant file's reader: lines of keys, local moments, the JSON schema, names."""

from __future__ import annotations

import json
import tomllib
from datetime import UTC, date, datetime, timedelta, timezone
from pathlib import Path
from typing import Any

import pytest

from auditor.plant_file import plant_schema, read_plant
from auditor.plant_file.clocks import instant_us
from auditor.plant_file.faults import choices, nearest
from auditor.plant_file.key_lines import KeyLines
from auditor.plant_file.leaves import role
from auditor.plant_file.parts import keys_of
from auditor.plant_file.site_parts import PlantPart, RulesPart
from auditor.plant_file.written import key_text, toml_text
from auditor.records.errors import PlantFileError
from auditor.records.machines import Role

SAMPLES = Path(__file__).parent.parent / "sample_logs"

EVERY_FORM = '''# a comment with = and [brackets]
title = "a \\" quote # no comment"   # comment
"quoted key".'single.dotted' = 1
many = [
  1,
  # between
  { deep = [ "x", """
two
lines""" ], other = 'C:\\' },
]
[table.inner]
a = 2026-07-28T09:00:00
b.c.d = true
[[list]]
n = 1
[[list]]
n = 2
[list.sub]
z = """" four quotes at the end""""
[[list.deeper]]
y = 1.5
'''


def test_lines_of_every_form_of_key():
    """Dotted, quoted and inline keys, lists over several lines and lists of tables have their own lines."""
    assert tomllib.loads(EVERY_FORM)["list"][1]["deeper"][0]["y"] == 1.5
    lines = KeyLines(EVERY_FORM)
    expected = {
        ("title",): 2,
        ("quoted key", "single.dotted"): 3,
        ("many", 0): 5,
        ("many", 1, "deep", 1): 7,
        ("many", 1, "other"): 9,
        ("table", "inner", "a"): 12,
        ("table", "inner", "b", "c", "d"): 13,
        ("list", 0, "n"): 15,
        ("list", 1, "n"): 17,
        ("list", 1, "sub", "z"): 19,
        ("list", 1, "deeper", 0, "y"): 21,
        ("list", 1, "deeper", 0, "missing"): 20,
        ("nowhere", "at", "all"): 1,
    }
    assert {path: lines.of(path) for path in expected} == expected


@pytest.mark.parametrize("site", ["emberlund", "quillmere"])
def test_every_key_of_the_samples_stands_on_its_line(site):
    """For each key of both samples, the line that is named holds that very key."""
    text = (SAMPLES / site / "plant.toml").read_text(encoding="utf-8")
    lines, rows = KeyLines(text), text.splitlines()

    def walk(value: Any, path: tuple[str | int, ...]) -> int:
        items = (
            value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
        )
        seen = 0
        for key, item in items:
            if isinstance(key, str):
                assert key in rows[lines.of((*path, key)) - 1]
                seen += 1
            seen += walk(item, (*path, key))
        return seen

    assert walk(tomllib.loads(text), ()) > 150


def _us(*moment: int) -> int:
    return round(datetime(*moment, tzinfo=UTC).timestamp() * 1e6)


def test_local_moments():
    """A bare date is local midnight, winter or summer; an offset is taken at its word."""
    assert instant_us(date(2025, 10, 1), "Europe/Copenhagen") == _us(2025, 9, 30, 22)
    assert instant_us(date(2025, 12, 1), "Europe/Copenhagen") == _us(2025, 11, 30, 23)
    stamped = datetime(2025, 10, 1, 6, tzinfo=timezone(timedelta(hours=-3)))
    assert instant_us(stamped, "Europe/Copenhagen") == _us(2025, 10, 1, 9)


def test_the_hour_that_happens_twice():
    """On 26 October 2025 at 03:00 clocks in Denmark went back: 02:30 was at 00:30 and at 01:30 UTC."""
    moment = datetime(2025, 10, 26, 2, 30)
    assert instant_us(moment, "Europe/Copenhagen") == _us(2025, 10, 26, 0, 30)
    assert instant_us(moment, "Europe/Copenhagen", later=True) == _us(2025, 10, 26, 1, 30)


def test_the_hour_that_never_happens():
    """On 29 March 2026 clocks in Sweden jump from 02:00 to 03:00: 02:30 becomes the instant of the jump."""
    for later in (False, True):
        skipped = instant_us(datetime(2026, 3, 29, 2, 30), "Europe/Stockholm", later=later)
        assert skipped == _us(2026, 3, 29, 1)


def test_an_exclusion_over_the_repeated_hour_covers_both_passings(tmp_path):
    """From and until inside the repeated hour cover its first and its second passing."""
    text = (SAMPLES / "quillmere" / "plant.toml").read_text(encoding="utf-8")
    text += '[[distrust]]\ntag = "oxygen"\nreason = "air"\n'
    text += "from = 2025-10-26T02:00:00\nuntil = 2025-10-26T02:30:00\n"
    (tmp_path / "plant.toml").write_text(text, encoding="utf-8")
    (distrust,) = read_plant(tmp_path).distrust
    assert (distrust.start_us, distrust.end_us) == (_us(2025, 10, 26, 0), _us(2025, 10, 26, 1, 30))


def _resolve(schema: dict[str, Any], node: dict[str, Any]) -> dict[str, Any]:
    while "$ref" in node:
        node = schema["$defs"][node["$ref"].rsplit("/", 1)[1]]
    return node


def _accepts(schema: dict[str, Any], node: dict[str, Any], value: Any) -> bool:
    """Whether a value fits a schema: the few words of the standard that ours uses."""
    node = _resolve(schema, node)
    if "anyOf" in node and not any(_accepts(schema, each, value) for each in node["anyOf"]):
        return False
    if "oneOf" in node and sum(_accepts(schema, each, value) for each in node["oneOf"]) != 1:
        return False
    if not all(_accepts(schema, each, value) for each in node.get("allOf", ())):
        return False
    if "const" in node and value != node["const"]:
        return False
    if "enum" in node and value not in node["enum"]:
        return False
    kinds = node.get("type", [])
    types = {"object": dict, "array": list, "string": str, "number": (int, float), "integer": int}
    if kinds and not any(
        isinstance(value, types[kind]) for kind in ([kinds] if isinstance(kinds, str) else kinds)
    ):
        return False
    if isinstance(value, list) and "items" in node:
        return all(_accepts(schema, node["items"], item) for item in value)
    if not isinstance(value, dict):
        return True
    keys = node.get("properties", {})
    others = node.get("additionalProperties", True)
    return all(key in value for key in node.get("required", ())) and all(
        _accepts(schema, keys[key], item)
        if key in keys
        else _accepts(schema, others, item)
        if isinstance(others, dict)
        else others
        for key, item in value.items()
    )


@pytest.mark.parametrize("site", ["emberlund", "quillmere"])
def test_the_schema_accepts_the_samples_and_refuses_a_slip(site):
    """Both samples fit the exported schema; an unknown key, a missing one and a doubled one do not."""
    schema = plant_schema()
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    text = (SAMPLES / site / "plant.toml").read_text(encoding="utf-8")
    data = json.loads(json.dumps(tomllib.loads(text), default=lambda moment: moment.isoformat()))
    assert _accepts(schema, schema, data)
    export = next(iter(data["exports"].values()))
    tag = next(iter(export["tags"].values()))
    for key, value in (("colum", "X"), ("limit", "1 %"), ("between", "sometimes")):
        broken = json.loads(json.dumps(data))
        next(iter(next(iter(broken["exports"].values()))["tags"].values()))[key] = value
        assert not _accepts(schema, schema, broken), key
    del tag["standard"]
    assert not _accepts(schema, schema, data)


def test_every_key_has_a_description_and_an_example():
    """Nothing in the schema is left without the words that remedies are made of."""
    schema = plant_schema()
    assert json.dumps(schema)  # plain JSON
    tables = [schema, *schema["$defs"].values()]
    for table in tables:
        for key, node in table.get("properties", {}).items():
            assert node.get("description"), key
            assert node.get("examples"), key
    assert '"null"' not in json.dumps(schema)


def test_nearest_words():
    """A near word is offered whatever its case, none where nothing is near, and long lists are cut."""
    assert nearest("Gros", ["gross", "net"]) == "gross"
    assert nearest("xyz", ["gross", "net"]) is None
    assert choices("x", [f"tag{n}" for n in range(40)]).endswith("and 28 more")
    assert key_text(("exports", "a b", "tags", 2, "unit")) == 'exports."a b".tags[2].unit'
    assert toml_text({"a b": [1, True, "x\n"]}) == '{ "a b" = [1, true, "x\\n"] }'


def test_roles_and_rules_agree_with_their_records():
    """Every role of the records can be written, and the rules' keys are the fields of their record."""
    from dataclasses import fields

    from auditor.records.plant import Rules

    assert [role(member.value) for member in Role] == list(Role)
    assert list(RulesPart.model_fields) == [field.name for field in fields(Rules)]
    assert "schema" in keys_of(PlantPart)


def test_empty_optional_tables_are_read_as_nothing(tmp_path):
    """An empty list of exclusions or table of fuels says nothing, but no machine at all is a fault."""
    text = (SAMPLES / "emberlund" / "plant.toml").read_text(encoding="utf-8")
    without = text.partition("[[distrust]]")[0]
    (tmp_path / "plant.toml").write_text("distrust = []\nfuels = {}\n" + without, encoding="utf-8")
    assert read_plant(tmp_path).distrust == ()
    (tmp_path / "plant.toml").write_text(
        "machines = {}\n" + without.partition("[machines")[0], encoding="utf-8"
    )
    with pytest.raises(PlantFileError, match="named tables belong"):
        read_plant(tmp_path)


def test_markup_in_a_name_is_data(tmp_path):
    """A tag may be named like a piece of markup; a dot in a machine's name is refused."""
    text = (SAMPLES / "emberlund" / "plant.toml").read_text(encoding="utf-8")
    marked = text.replace("tags.panel_power", "tags.'<script>alert(1)</script>'")
    (tmp_path / "plant.toml").write_text(marked, encoding="utf-8")
    assert "<script>alert(1)</script>" in read_plant(tmp_path).tags
    (tmp_path / "plant.toml").write_text(
        text.replace("[machines.coil]", "[machines.'coil.1']"), encoding="utf-8"
    )
    with pytest.raises(PlantFileError, match="holds a dot"):
        read_plant(tmp_path)
