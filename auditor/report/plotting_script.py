"""The plotting script, compressed, and the digests by which the page allows its own scripts only."""

from __future__ import annotations

import base64
import hashlib
import zlib
from dataclasses import dataclass


@dataclass(frozen=True)
class PlottingScript:
    """The script of the installed plotting library, ready to be laid into a page."""

    packed: str
    """Base64 of the zlib-compressed script; the page unpacks it when it is opened."""
    digest: str
    """``sha256-...`` of the script itself, for the page's content policy."""
    licence: str
    """Its licence notice, kept readable beside the packed text."""


def plotting_script() -> PlottingScript:
    """Pack the script that belongs to the installed plotting library."""
    from plotly.offline import get_plotlyjs

    text: str = get_plotlyjs()
    packed = base64.b64encode(zlib.compress(text.encode(), 9)).decode()
    notice = text[: text.index("*/")].removeprefix("/**").replace("*", "").strip()
    return PlottingScript(packed, digest(text), " ".join(notice.split()))


def digest(script: str) -> str:
    """Name a script in a content policy by its SHA-256."""
    return f"sha256-{base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()}"
