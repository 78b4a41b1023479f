"""When a tag shows that something runs: the running rule of a machine, and what speaks against a zero."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from auditor.plant_file.export_parts import EvidencePart, ExportPart, PlainTag
from auditor.plant_file.faults import FaultBook, choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.machine_parts import RunningPart
from auditor.plant_file.references import Declared, find, level_of
from auditor.records.machines import Running
from auditor.records.plant import Tag


def running_rule(
    rule: RunningPart | EvidencePart, declared: Declared, place: KeyPath, book: FaultBook
) -> Running | None:
    """Make the record of a rule that names a tag and a value or a state."""
    if rule.above is not None:
        tag = number_tag(rule.tag, 'write is = "closed" in place of above', declared, (*place, "tag"), book)
        above = None if tag is None else book.attempt((*place, "above"), level_of, rule.above, tag)
        return Running(rule.tag, above, None)
    tag = find("tag", rule.tag, declared.tags, (*place, "tag"), book)
    if tag is None or rule.is_ is None:
        return None
    if tag.states is None:
        book.add(
            (*place, "is"), f'tag "{rule.tag}" is no state', 'write above = "20 kW", or name a state tag'
        )
    elif rule.is_ not in tag.states.values():
        states = dict.fromkeys(tag.states.values())
        book.add((*place, "is"), f'tag "{rule.tag}" has no state "{rule.is_}"', choices(rule.is_, states))
    return Running(rule.tag, None, rule.is_)


def number_tag(
    name: str | None, instead: str, declared: Declared, path: KeyPath, book: FaultBook
) -> Tag | None:
    """Look up a tag that must not be a state; ``instead`` is the remedy."""
    tag = find("tag", name, declared.tags, path, book)
    if tag is not None and tag.states is not None:
        book.add(path, f'tag "{name}" is a state, not a number', instead)
        return None
    return tag


def with_evidence(
    exports: Mapping[str, ExportPart], declared: Declared, book: FaultBook
) -> dict[str, Tag | None]:
    """Return all tags, each with what speaks against its zeros, now that every tag is known."""
    tags = dict(declared.tags)
    for export, export_part in exports.items():
        for name, part in (export_part.tags or {}).items():
            rule = part.not_zero_while if isinstance(part, PlainTag) else None
            if rule is None or rule.tag is None:
                continue
            place: KeyPath = ("exports", export, "tags", name, "not_zero_while")
            if rule.tag == name:
                book.add(
                    (*place, "tag"),
                    "a tag cannot speak against its own zeros",
                    "name another tag: a breaker, a speed",
                )
                continue
            evidence = running_rule(rule, declared, place, book)
            tag = tags.get(name)
            if tag is not None and tag.export == export:
                tags[name] = replace(tag, not_zero_while=evidence)
    return tags
