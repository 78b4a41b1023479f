"""From plant.toml on disk to the plant's record, or to every fault of the file at once."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any, TypeVar

from auditor.plant_file.evidence import with_evidence
from auditor.plant_file.faults import FaultBook
from auditor.plant_file.key_lines import KeyLines
from auditor.plant_file.part_reader import read_part
from auditor.plant_file.references import Declared
from auditor.plant_file.resolve_fluids import resolve_fluids
from auditor.plant_file.resolve_fuels import resolve_fuels, resolve_meters
from auditor.plant_file.resolve_machines import resolve_machines
from auditor.plant_file.resolve_site import (
    check_barometer,
    check_patterns,
    resolve_distrust,
    resolve_export,
    resolve_rules,
    resolve_site,
)
from auditor.plant_file.resolve_tags import resolve_tags
from auditor.plant_file.site_parts import PlantPart
from auditor.plant_file.tag_list import insert_tag_lists
from auditor.records.errors import Fault, PlantFileError
from auditor.records.machines import FlowAndTemperatures
from auditor.records.plant import Plant

_Record = TypeVar("_Record")

FILE_NAME = "plant.toml"


def read_plant(site: Path) -> Plant:
    """Read, check and convert the plant file of a site.

    Parameters
    ----------
    site : Path
        The folder that holds ``plant.toml``, or the file itself.

    Returns
    -------
    Plant
        Everything in SI, every name resolved. The built-in fluid ``water`` is among the fluids where a
        stream uses it.

    Raises
    ------
    PlantFileError
        With every fault of the file, in the order of its lines.
    """
    path = site / FILE_NAME if site.is_dir() else site
    text = _text(path)
    raw = _toml(path.name, text)
    book = FaultBook(path.name, KeyLines(text))
    lists = insert_tag_lists(raw, path.parent, book)
    return replace(_resolve(read_part(PlantPart, raw, (), book), path, text, book), tag_lists=lists)


def _text(path: Path) -> str:
    try:
        data = path.read_bytes()
    except FileNotFoundError as error:
        raise _single(path.name, f"there is no file {path.name} in {path.parent}", _WHERE) from error
    except OSError as error:
        raise _single(
            path.name, f"the file cannot be read: {error.strerror}", "check the file's rights"
        ) from error
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise _single(
            f"{path.name}:{line}", "a character here is not written in UTF-8", "save the file again as UTF-8"
        ) from error


_WHERE = "name the folder that holds plant.toml and logs/, or write a plant.toml there first"


def _toml(file_name: str, text: str) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        message = str(error)
        place = re.search(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)$", message)
        line = text.count("\n") + 1 if place is None or place[1] is None else int(place[1])
        column = "" if place is None or place[2] is None else f", column {place[2]}"
        found = message if place is None else message[: place.start()]
        raise _single(
            f"{file_name}:{line}{column}",
            f"this is no valid TOML: {found[:1].lower()}{found[1:]}",
            _toml_fix(found),
        ) from error


def _toml_fix(found: str) -> str:
    if "escape" in found.casefold() or "hex" in found.casefold():
        return "a backslash in double quotes begins an escape: write the text in single quotes"
    if "overwrite" in found or "twice" in found or "namespace" in found:
        return "a key or table is written twice: keep one of them"
    return "correct it: texts stand in quotes, lists in [ ], tables in { }; the decimal mark is a point"


def _single(where: str, found: str, fix: str) -> PlantFileError:
    return PlantFileError([Fault(where, found, fix)])


def _whole(records: Mapping[str, _Record | None]) -> dict[str, _Record]:
    return {name: record for name, record in records.items() if record is not None}


def _resolve(part: PlantPart, path: Path, text: str, book: FaultBook) -> Plant:
    zone = None if part.site is None else part.site.zone
    export_parts = part.exports or {}
    site, rules = resolve_site(part.site, book), resolve_rules(part.rules, book)
    tags = resolve_tags(export_parts, zone, book)
    exports = {name: resolve_export(name, export, book) for name, export in export_parts.items()}
    check_patterns(export_parts, book)
    check_barometer(part.site, tags, book)
    declared = Declared(
        site=site,
        tags=tags,
        fluids=resolve_fluids(part.fluids or {}, book),
        fuels=resolve_fuels(part.fuels or {}, zone, book),
        gas_meters=resolve_meters(part.gas_meters or {}, book),
        machines=part.machines or {},
    )
    machines = resolve_machines(declared, book)
    tags = with_evidence(export_parts, declared, book)
    distrust = resolve_distrust(part.distrust, zone, tags, book)
    book.close()
    used = {
        stream.way.fluid
        for machine in machines.values()
        for stream in machine.streams.values()
        if isinstance(stream.way, FlowAndTemperatures)
    }
    assert site is not None and rules is not None  # nothing is at fault, so nothing is missing
    return Plant(
        path=path,
        folder=path.parent,
        text=text,
        site=site,
        rules=rules,
        exports=_whole(exports),
        tags=_whole(tags),
        fluids=_whole(
            {name: fluid for name, fluid in declared.fluids.items() if name != "water" or name in used}
        ),
        fuels=_whole(declared.fuels),
        gas_meters=_whole(declared.gas_meters),
        machines=machines,
        distrust=distrust,
    )
