"""A draft as the text of a plant file: proposals as keys, everything undecided as a marked blank."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from dataclasses import asdict
from typing import Any

from auditor.drafting.proposals import Appearance, Draft, ExportProposal, StampEvidence, TagProposal
from auditor.records.kinds import KINDS

BLANK = "#? "
"""A line that begins so is a blank: without these characters, and with its value, it is a key."""

_ADDS_UP = ("energy", "volume", "mass")
"""Kinds of quantity that a counter or an amount may be of."""

_HEAD = """\
# A first plant file, drafted from the exports alone.
#
# What the exports prove is written as a key, with the evidence behind it. Every line that begins with "#?"
# is a blank that no export can fill: take away the "#?" and write the value, or delete the line where its
# comment says that it does not apply. `auditor check SITE` names the keys that are still missing, those of a
# tag once its `between` is written. Delete the tags that you do not need: a column that no tag binds is noted
# and otherwise ignored. The names of exports and tags are yours to change.
#
# The blanks, and why they stay blank:
#   clock        whose clock the stamps are of: an IANA zone such as "Europe/Stockholm" (with summer time),
#                "UTC", or a fixed offset such as "+01:00" (winter time all year). An hour's error looks like
#                a poor machine.
#   between      what a value means between two stamps. "step": it holds until the next is stored (stored on
#                change); "line": it runs straight to the next (sampled); "mean" or "amount": the mean of, or
#                the total in, the stretch that the stamp marks; "counter": an index that counts up; "state":
#                a breaker, a mode. The same numbers fit several of these, and the energy depends on it: ask
#                who set up the logger.
#   stamp_marks  only with mean or amount: whether the stamp is the "start" or the "end" of its stretch.
#   hold         longest time between two samples that is still covered, such as "5 min"; optional with mean,
#                amount and counter.
#   standard     one standard uncertainty of the value, or `limit`, the class limit of the instrument. A bare
#                number is in the tag's own unit, "0.5 K" names it, "2 %" is of the reading, "2 % of 1200 kW"
#                of the span; of a tag in %, a bare number is points, and "2 % of reading" is of the reading.
#   pressure     "gauge" (against the air) or "absolute" (against vacuum). Taken wrongly, a gas volume is off
#                by a factor.
schema = 1

[site]
#? name =                  # name of the site in the report
#? zone =                  # IANA zone of the site: months, days and the report's clock
#? altitude =              # such as "85 m": only where a gauge pressure is used
"""

_TAIL = """\

# --- what is audited: exports do not show it --------------------------------------------------------------
# Name each machine and the streams of energy that cross its boundary, by the tags above. With a fuel, gas
# volume or carrier fluid, tables [fuels.NAME], [gas_meters.NAME] and [fluids.NAME] belong here too;
# `auditor check --schema` prints every key. No export proves these, so they stay blank: the reference state
# of a gas volume (volume_state), whether a gas meter already reads at it (reads), the heating value and its
# basis, gross or net power.
#? [machines.NAME]
#? title =                 # its name in the report
#? kind =                  # {kinds}
#? headline =              # gross or net, of machines that give work
#? heating_value =         # lower or higher, of machines that burn fuel
#? running =               # such as {{ tag = "TAG", above = "20 kW" }}
#? ceiling =               # such as {{ kind = "finite source and sink", source = "STREAM", sink = "STREAM" }}
#? streams.NAME =          # such as {{ role = "work out", by = "power", tag = "TAG" }}
"""


def draft_text(draft: Draft) -> str:
    """Write a draft as the text of a plant file; the same draft gives the same text."""
    lines = [_HEAD.rstrip("\n")]
    for export in draft.exports:
        lines += _export_lines(export)
    lines.append(_TAIL.format(kinds=", ".join(KINDS)).rstrip("\n"))
    return "\n".join(lines) + "\n"


def draft_entries(draft: Draft) -> dict[str, Any]:
    """Return a draft as plain values for other programs; null is a blank."""
    exports = []
    for export in draft.exports:
        entry = asdict(export)
        stamps: StampEvidence = export.stamps
        entry["stamps"] = {**asdict(stamps), "step_s": stamps.step_s if stamps.step_s > 0.0 else None}
        entry["clock"] = None
        entry["tags"] = [
            {**asdict(tag), "appearance": tag.appearance.value, "between": None} for tag in export.tags
        ]
        exports.append(entry)
    skipped = [{"file": path, "reason": reason} for path, reason in draft.skipped]
    return {"exports": exports, "skipped": skipped}


def _export_lines(export: ExportProposal) -> Iterator[str]:
    stamps = export.stamps
    yield ""
    yield f"[exports.{_key(export.name)}]"
    files = _count(export.count, "file")
    yield _remark(f'{files}; stamps from "{stamps.first}" to "{stamps.last}" in the lines looked at')
    yield from (_remark(text) for text in export.remarks)
    yield f"files = [{', '.join(_text(pattern) for pattern in export.files)}]"
    yield _blank("clock", "; ".join(stamps.clock))
    if stamps.order is None:
        yield _blank("date_order", f"{stamps.because}: declare the order of the date")
    else:
        yield _filled("date_order", _text(stamps.order), stamps.because)
    if export.decimal is None:
        yield _blank("decimal", f'"." or ",": {export.decimal_because}')
    else:
        yield _filled("decimal", _text(export.decimal), export.decimal_because)
    yield f"delimiter = {_text('tab' if export.delimiter == chr(9) else export.delimiter)}"
    if export.layout is not None:
        stamp, tag, value = (_text(name) for name in export.layout)
        because = "one row for each stamp and tag: stamps come again under other names"
        yield _filled("layout", f"{{ stamp = {stamp}, tag = {tag}, value = {value} }}", because)
    if export.stamp:
        yield f"stamp = [{', '.join(_text(name) for name in export.stamp)}]"
    for entry in export.tags:
        yield ""
        yield from _tag_lines(export, entry)


def _tag_lines(export: ExportProposal, tag: TagProposal) -> Iterator[str]:
    is_state = tag.appearance is Appearance.STATE
    yield f"[exports.{_key(export.name)}.tags.{_key(tag.name)}]"
    yield _remark(f"looks like {_looks(tag)}: {tag.because}")
    yield f"column = {_text(tag.column)}"
    if tag.unit.unit:
        yield _filled("unit", _text(tag.unit.unit), tag.unit.because)
    else:
        yield _blank("unit", tag.unit.because + ("; not with a state" if is_state else ""))
    yield _blank("between", _between(tag))
    if is_state:
        texts = ", ".join(f'{_text(text)} = ""' for text in tag.texts)
        yield _blank(f"states = {{ {texts} }}" if texts else "states", "only with a state: name each text")
    if tag.appearance is Appearance.COUNTER:
        yield _blank("at_most", 'only with a counter: its largest believable rate, such as "1300 kW"')
    else:
        yield _blank("stamp_marks", "only with mean or amount: start or end")
    yield _blank("hold", _spacing(export.stamps))
    if tag.unit.quantity == "pressure":
        yield _blank("pressure", "gauge or absolute")
    if tag.unit.quantity == "fraction" and re.search("O2|CO|oxygen", tag.column, re.IGNORECASE):
        yield _blank("basis", "dry or wet: only where oxygen gives a flue-gas flow")
    yield _blank("standard", "or limit; not with a state" if is_state else "or limit")


def _looks(tag: TagProposal) -> str:
    quantity = tag.unit.quantity
    if quantity and tag.appearance is Appearance.LEVEL:
        return f"{'an' if quantity[0] in 'aeiou' else 'a'} {quantity}"
    if quantity and tag.appearance is Appearance.COUNTER:
        return f"{tag.appearance.value} of {quantity}"
    return tag.appearance.value


def _between(tag: TagProposal) -> str:
    adds_up = tag.unit.quantity in _ADDS_UP
    if tag.appearance is Appearance.COUNTER:
        if tag.unit.quantity and not adds_up:
            return (
                f"it counts up, but {tag.unit.quantity} is no counter that can be read: is this tag needed?"
            )
        return "counter, if it is an index that counts up"
    if tag.appearance is Appearance.STATE:
        return "state, if these texts stand for states; else step, line, mean or amount"
    if tag.appearance is Appearance.CONSTANT:
        return "cells that are all the same do not show it"
    if adds_up:
        return f"{tag.unit.quantity} that rises and falls: amount, if each row is the total of its stretch"
    return "step, line, mean or amount: the numbers do not show which"


def _spacing(stamps: StampEvidence) -> str:
    if not stamps.step_s > 0.0:
        return "the spacing of the rows is not known"
    seconds = stamps.step_s
    for size, unit in ((3600.0, "h"), (60.0, "min")):
        if seconds >= size and seconds % (size / 10) == 0.0:
            return f"rows are usually {seconds / size:g} {unit} apart"
    return f"rows are usually {seconds:g} s apart"


def _filled(key: str, value: str, because: str) -> str:
    return f"{key} = {value}".ljust(26) + f" # {_printable(because)}"


def _blank(key: str, why: str) -> str:
    wanted = key if "=" in key else f"{key} ="
    return f"{BLANK}{wanted}".ljust(26) + f" # {_printable(why)}"


def _remark(text: str) -> str:
    return f"# {_printable(text)}"


def _printable(text: str) -> str:
    return "".join(letter if letter.isprintable() else " " for letter in text)


def _key(name: str) -> str:
    return name if re.fullmatch(r"[A-Za-z0-9_-]+", name) else _text(name)


def _text(text: str) -> str:
    """Quote a text; what JSON writes as a string, TOML reads as the same."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
