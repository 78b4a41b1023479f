"""Sentences for units, reference states and settings that look wrong: a question, and what answers it."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType

from auditor.records.findings import Finding
from auditor.records.plant import Plant
from auditor.report.clock import Clock
from auditor.report.numbers import percent, significant
from auditor.report.wording import names
from auditor.report.wording.data_findings import Text, many, size, subject, when

CAUSES: Mapping[str, tuple[str, str]] = MappingProxyType(
    {
        "normal or 15 degC": (
            "gas volume at 15 °C taken for volume at 0 °C, or the other way round",
            "read the reference state in the settings of the volume corrector",
        ),
        "normal or 20 degC": (
            "gas volume at 20 °C taken for volume at 0 °C, or the other way round",
            "read the reference state in the settings of the volume corrector",
        ),
        "heating value basis": (
            "higher heating value taken for the lower, or the other way round",
            "read on the supplier's sheet which heating value is meant",
        ),
        "decimal place": (
            "a prefix, a pulse's weight or a decimal place",
            "compare one hour of the log with the meter's own display",
        ),
        "factor 3.6": (
            "megajoules and kilowatt-hours, or tonnes per hour and kilograms per second",
            "compare the unit in the logger's settings with the meter's display",
        ),
        "quarter-hour energy": (
            "the energy of a quarter of an hour logged as power, or the other way round",
            "ask what the logger stores: a mean power or the energy of its interval",
        ),
        "transformer ratio": (
            "the ratio of a current or voltage transformer",
            "let a licensed electrician compare the plates of the transformers with the meter's settings",
        ),
        "phase or line voltage": (
            "phase voltage taken for line voltage",
            "let a licensed electrician compare the wiring of the meter with its settings",
        ),
        "pulse weight": ("a pulse's weight", "compare one hour of the log with the meter's own display"),
        "net or gross": (
            "net power on one side and gross power on the other: the own use makes just this difference",
            "ask where the meter takes its current and voltage from, and whether that was changed",
        ),
        "gauge pressure read as absolute": (
            "a gauge pressure declared as absolute",
            "read on the transmitter's plate whether it measures against the air",
        ),
        "absolute pressure read as gauge": (
            "an absolute pressure declared as gauge",
            "read on the transmitter's plate whether it measures against vacuum",
        ),
    }
)
"""Per cause: what it is, and the check that settles it."""

_NOTHING_DONE = "Nothing was corrected."


def unit_suspected(finding: Finding, plant: Plant) -> Text:
    """Put a suspected unit into words, by the comparison that it came from."""
    return _BY_EVIDENCE.get(finding.words.get("evidence", ""), _out_of_range)(finding, plant)


def _out_of_range(finding: Finding, plant: Plant) -> Text:
    declared = names.units(finding.words.get("declared", ""))
    other = names.units(finding.words.get("unit", "another unit"))
    against = f" instead of {declared}" if declared else ""
    first, last = finding.words.get("first"), finding.words.get("last")
    shown = f" (the first “{first}”, the last “{last}”)" if first is not None and last is not None else ""
    return (
        f"{subject(finding, plant)} may be logged in {other}{against}",
        f"{many(finding, 'reading')}{shown} {when(finding, plant)} make no sense as declared, but are usual "
        f"for this tag if they are {other}. Nothing was converted: they stay rejected."
        f"{size(finding, 'About {} passed in that time.')}",
        "Ask whether the logger or the transmitter was set up anew that day, and have the stretch exported "
        "again in the declared unit.",
    )


def _range(finding: Finding, plant: Plant) -> Text:
    first, last = finding.words.get("first"), finding.words.get("last")
    shown = f" (the first “{first}”, the last “{last}”)" if first is not None and last is not None else ""
    return (
        f"{subject(finding, plant)} may be logged in another unit for a time",
        f"{many(finding, 'reading')}{shown} {when(finding, plant)} lie outside the believable range, but are "
        f"usual for this tag once a familiar ratio is taken out. {_asked(finding)} Nothing was converted: "
        f"they stay rejected.{size(finding, 'About {} passed in that time.')}",
        _checks(finding),
    )


def _level(finding: Finding, plant: Plant) -> Text:
    suspects = names.listing([names.tag(plant, name) for name in finding.suspects])
    ratio, U = (finding.numbers.get(name, math.nan) for name in ("ratio", "ratio_U"))
    return (
        f"the {names.figure(finding.words.get('figure', ''))} of {names.machine(plant, finding.machine)} is "
        "no figure of a machine",
        f"Over the whole period it is {percent(ratio)} ± {percent(U)}, far from what machines of its kind "
        f"show; a ratio in {suspects} would explain it. {_asked(finding)} {_NOTHING_DONE}",
        _checks(finding),
    )


def _second_meter(finding: Finding, plant: Plant) -> Text:
    this, other = names.tag(plant, finding.tag), names.tag(plant, finding.words.get("other"))
    before, after = (finding.numbers.get(name, math.nan) for name in ("before", "after"))
    if math.isfinite(before * after):
        said = (
            f"From {_since(finding, plant)} the ratio of {this} to {other} changed from "
            f"{_number(before)} to {_number(after)}, that is by a factor of {_measured(finding)}."
        )
        title = f"the meters {this} and {other} part at one moment"
    else:
        said = f"The ratio of {this} to {other} is {_measured(finding)} all the time, and should be 1."
        title = f"the meters {this} and {other} do not agree"
    return title, f"{said} {_asked(finding)} {_NOTHING_DONE}", _checks(finding)


def _own_past(finding: Finding, plant: Plant) -> Text:
    suspects = names.listing([names.tag(plant, name) for name in finding.suspects])
    factor = finding.numbers.get("ratio", math.nan)
    either = "one of these reads" if len(finding.suspects) > 1 else "it reads"
    inverse = " or its inverse" if len(finding.suspects) > 1 else ""
    return (
        f"did a unit or a setting of {suspects} change?",
        f"From {_since(finding, plant)} on {either} {_more_or_less(factor)} at equal load, against "
        f"{names.tag(plant, finding.words.get('other'))}: a factor of {_measured(finding)}{inverse}. "
        f"{_asked(finding)} {_NOTHING_DONE}{size(finding, 'About {} passed since then.')}",
        _checks(finding),
    )


def _nameplate(finding: Finding, plant: Plant) -> Text:
    return (
        f"{subject(finding, plant)} does not fit the rated power of {names.machine(plant, finding.machine)}",
        f"In its best hours it shows {_measured(finding)} times the rated power. {_asked(finding)} "
        f"{_NOTHING_DONE}",
        _checks(finding),
    )


def _pressure_kind(finding: Finding, plant: Plant) -> Text:
    pressure_Pa, air_Pa = (finding.numbers.get(name, math.nan) for name in ("pressure_Pa", "air_Pa"))
    declared = plant.tags.get(finding.tag or "")
    kind = declared.pressure if declared is not None and declared.pressure else "one kind of"
    evidence = (
        "below the pressure of the air, which no gas pipe has"
        if kind == "absolute"
        else "about that of the air or above, and the efficiency is too low to be believed"
    )
    values = f" ({_number(pressure_Pa / 1e5)} bar, air {_number(air_Pa / 1e5)} bar)"
    return (
        f"{subject(finding, plant)} may be the other kind of pressure",
        f"It is declared as {kind} pressure and usually is {evidence}"
        f"{values if math.isfinite(pressure_Pa * air_Pa) else ''}. {_asked(finding)} As it stands the fuel "
        f"is counted {_measured(finding)} times too {'little' if kind == 'absolute' else 'much'}. "
        f"{_NOTHING_DONE}",
        _checks(finding),
    )


def _temperature_step(finding: Finding, plant: Plant) -> Text:
    unit = names.units(finding.words.get("unit", "another unit"))
    declared = names.units(finding.words.get("declared", ""))
    tag = plant.tags.get(finding.tag or "")
    before, after = (finding.numbers.get(name, math.nan) for name in ("before", "after"))
    levels = (
        f" from {_number((before - tag.offset) / tag.scale)} to {_number((after - tag.offset) / tag.scale)}"
        if tag is not None and math.isfinite(before * after)
        else ""
    )
    other = finding.words.get("other", "")
    beside = f", while {names.tag(plant, other)} stayed as it was" if other else ""
    return (
        f"{subject(finding, plant)} may be logged in {unit} for a time",
        f"Its level changes at one moment{levels}{beside}. The readings {when(finding, plant)} would fit the "
        f"others if they were {unit} instead of {declared or 'what is declared'}. Nothing was converted."
        f"{size(finding, 'About {} passed in that time.')}",
        "Ask whether the logger or the transmitter was set up anew that day, and hold a thermometer against "
        "the pipe.",
    )


def _more_or_less(factor: float) -> str:
    """``5.6 % more``; in words alone where the change is too large for percent."""
    if not math.isfinite(factor):
        return "differently"
    if not 0.5 < factor < 2.0:
        return "far more" if factor > 1.0 else "far less"
    return f"{percent(abs(factor - 1.0))} {'more' if factor > 1.0 else 'less'}"


def _since(finding: Finding, plant: Plant) -> str:
    if finding.start_us is None:
        return "one moment"
    return Clock(plant.site.zone).moment(finding.start_us)


def _number(value: float) -> str:
    return significant(value, 3)


def _measured(finding: Finding) -> str:
    """``1.055 ± 0.004``: the ratio with its uncertainty."""
    ratio, U = (finding.numbers.get(name, math.nan) for name in ("ratio", "ratio_U"))
    if not math.isfinite(ratio):
        return "some size"
    if not (math.isfinite(U) and U > 0.0):
        return significant(ratio, 4)
    places = min(max(1 - math.floor(math.log10(U)), 0), 4)
    return f"{ratio:.{places}f} ± {max(U, 10.0**-places):.{places}f}"


def _causes(finding: Finding) -> list[tuple[str, str]]:
    """Codes of the candidates with their ratios, nearest first."""
    listed = [each for each in finding.words.get("candidates", "").split("; ") if each]
    return [(code, ratio) for code, _, ratio in (each.partition("=") for each in listed)]


def _asked(finding: Finding) -> str:
    parts = [f"{CAUSES[code][0] if code in CAUSES else code} ({ratio})" for code, ratio in _causes(finding)]
    if not parts:
        return "That is no familiar ratio of units: what one of the two stands for has changed."
    return f"A familiar ratio: is it {'; or '.join(parts)}?"


def _checks(finding: Finding) -> str:
    checks = dict.fromkeys(CAUSES[code][1] for code, _ in _causes(finding) if code in CAUSES)
    said = "; else ".join(checks) or "ask what was changed on the meters that day"
    return f"{said[:1].upper()}{said[1:]}."


_BY_EVIDENCE: Mapping[str, Callable[[Finding, Plant], Text]] = MappingProxyType(
    {
        "range": _range,
        "second meter": _second_meter,
        "own past": _own_past,
        "level": _level,
        "nameplate": _nameplate,
        "pressure kind": _pressure_kind,
        "temperature step": _temperature_step,
    }
)
