"""How keys and values are shown in messages: as the plant file writes them."""

from __future__ import annotations

import json
import re
from datetime import date

from auditor.plant_file.key_lines import KeyPath

_LONGEST_SHOWN = 60
"""Characters of a value; a fault should fit a screen."""


def key_text(path: KeyPath) -> str:
    """Write a path as in the file: ``fuels.natural_gas.values[1].lower``."""
    text = ""
    for part in path:
        if isinstance(part, int):
            text += f"[{part}]"
        else:
            bare = re.fullmatch(r"[A-Za-z0-9_-]+", part)
            text += ("." if text else "") + (part if bare else f'"{printable(part)}"')
    return text


def printable(text: str) -> str:
    """Write out the control characters of a text, for messages."""
    return "".join(character if character.isprintable() else repr(character)[1:-1] for character in text)


def toml_text(value: object) -> str:
    """Write a value as TOML does, on one line."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, list):
        return "[" + ", ".join(toml_text(item) for item in value) + "]"
    if isinstance(value, dict):
        pairs = ", ".join(f"{key_text((key,))} = {toml_text(item)}" for key, item in value.items())
        return f"{{ {pairs} }}" if pairs else "{}"
    return value.isoformat() if isinstance(value, date) else str(value)


def shown(value: object) -> str:
    """Show a value as found in the file, cut short when long."""
    text = toml_text(value)
    return text if len(text) <= _LONGEST_SHOWN else f"{text[: _LONGEST_SHOWN - 3]}..."
