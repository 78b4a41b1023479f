"""The Jinja environment of all pages: escaping always on, and an error for every missing value."""

from __future__ import annotations

from functools import cache

from jinja2 import Environment, FileSystemLoader, StrictUndefined

from auditor.resources import folder


def source(name: str) -> str:
    """Return a file of the templates as it stands, with line ends that do not depend on the checkout."""
    return (folder("report_templates") / name).read_text(encoding="utf-8").replace("\r\n", "\n")


@cache
def environment() -> Environment:
    """Return the environment; escaping does not depend on a template's name."""
    return Environment(
        loader=FileSystemLoader(folder("report_templates")),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
