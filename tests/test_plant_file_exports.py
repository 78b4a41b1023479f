"""How an export is written, as the plant file declares it: layouts, grouped digits, names of months."""

from __future__ import annotations

from pathlib import Path

import pytest

from auditor.plant_file import read_plant
from auditor.plant_file.schema import plant_schema
from auditor.records.errors import PlantFileError
from auditor.records.plant import Export, FilePerTag, LongLayout, PairsLayout, Quality

SAMPLE = Path(__file__).parent.parent / "sample_logs" / "quillmere" / "plant.toml"


def read_keys(folder: Path, keys: str) -> Export:
    """Add keys to the first export of a sound plant file, which has a decimal comma."""
    text = SAMPLE.read_text(encoding="utf-8")
    mark = 'decimal = ","\n'
    assert mark in text
    (folder / "plant.toml").write_text(text.replace(mark, mark + keys + "\n", 1), encoding="utf-8")
    plant = read_plant(folder)
    return next(export for export in plant.exports.values() if export.decimal == ",")


@pytest.mark.parametrize(
    ("keys", "layout"),
    [
        ("layout = { pairs = true }", PairsLayout()),
        (
            'layout = { stamp = "t", tag = "p", value = "v", quality = { column = "q", good = "192" } }',
            LongLayout("t", "p", "v", Quality("q", ("192",))),
        ),
        ('layout = { stamp = "t", tag = "p", value = "v" }', LongLayout("t", "p", "v")),
        (
            'layout = { tag_in_file_name = "x_{tag}_*.csv", value = "v" }',
            FilePerTag("v", "x_{tag}_*.csv", None),
        ),
        ('layout = { tag_in_preamble = "Point: {tag}", value = "v" }', FilePerTag("v", None, "Point: {tag}")),
    ],
)
def test_layouts(tmp_path: Path, keys: str, layout: object) -> None:
    """Every layout is read as declared."""
    assert read_keys(tmp_path, keys).layout == layout


def test_grouped_digits_and_month_names(tmp_path: Path) -> None:
    """Marks between digits and twelve names of months are read as declared."""
    names = [f"m{place}x" for place in "abcdefghijkl"]
    export = read_keys(tmp_path, f'thousands = "."\nmonth_names = {names}'.replace("'", '"'))
    assert export.thousands == "."
    assert export.month_names == tuple(names)


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ('thousands = ","', "cannot both group the digits and be the decimal mark"),
        ('thousands = "_"', "thousands"),
        ('month_names = ["jan"]', "are not twelve different names"),
        ('layout = { tag_in_file_name = "x.csv", value = "v" }', "does not say where the name of the tag"),
        (
            'layout = { tag_in_file_name = "{tag}.csv", tag_in_preamble = "{tag}", value = "v" }',
            'both "tag_in_file_name" and "tag_in_preamble" are written',
        ),
        ('layout = { tag_in_preamble = "Point: {tag}" }', 'the key "value" is missing'),
        ("layout = { pairs = false }", "pairs"),
        ('layout = { pairs = true }\nstamp = "t"', "the layout names the stamp already"),
        ('layout = { stamp = "t", tag = "p", value = "v", quality = { column = "q" } }', '"good" is missing'),
    ],
)
def test_slips(tmp_path: Path, keys: str, words: str) -> None:
    """A slip in one of these keys is told with its line and a remedy."""
    with pytest.raises(PlantFileError) as caught:
        read_keys(tmp_path, keys)
    assert words in str(caught.value)
    assert "plant.toml:" in str(caught.value)


def test_schema_knows_the_keys() -> None:
    """The JSON schema offers every layout to editors."""
    parts = plant_schema()["$defs"]
    assert {"LongLayoutPart", "PairsLayoutPart", "FilePerTagPart", "QualityPart"} <= parts.keys()
    assert {"thousands", "month_names"} <= parts["ExportPart"]["properties"].keys()
