"""The JSON schema of the plant file, for editors that complete and check while one writes."""

from __future__ import annotations

from typing import Any

from pydantic.json_schema import GenerateJsonSchema

from auditor.plant_file.site_parts import PlantPart


def plant_schema() -> dict[str, Any]:
    """JSON schema of ``plant.toml`` (draft 2020-12).

    It knows keys, types, words and which keys are required. Units, references between tables and the
    sense of a machine are checked by the program alone.

    Returns
    -------
    dict
        Every key with its description and an example.
    """
    schema = PlantPart.model_json_schema(by_alias=True)
    return {
        "$schema": GenerateJsonSchema.schema_dialect,
        **_without_null(schema),
        "title": "plant.toml",
    }


def _without_null(node: Any) -> Any:
    """Leave out what no TOML file can write (null), and the titles made from field names."""
    if isinstance(node, list):
        return [_without_null(item) for item in node]
    if not isinstance(node, dict):
        return node
    kept = {key: _without_null(value) for key, value in node.items()}
    if isinstance(kept.get("title"), str):
        del kept["title"]
    if "default" in kept and kept["default"] is None:
        del kept["default"]
    options = kept.get("anyOf")
    if isinstance(options, list):
        options = [option for option in options if option != {"type": "null"}]
        if len(options) == 1:
            del kept["anyOf"]
            kept = {**options[0], **kept}
        else:
            kept["anyOf"] = options
    return kept
