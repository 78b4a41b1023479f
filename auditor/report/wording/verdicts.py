"""What verdicts, reasons, statuses and refusals mean."""

from __future__ import annotations

from auditor.records.errors import Exit
from auditor.records.plant import Rules
from auditor.records.verdicts import Closure, Reason, Status, Verdict
from auditor.report.numbers import percent

MEANINGS: dict[Verdict, str] = {
    Verdict.NOT_ASSESSED: "A reading that the figure needs is missing, rejected or without sense.",
    Verdict.STOPPED: "The machine stood still for most of the interval.",
    Verdict.LOW_LOAD: "It ran below the minimum load declared in the plant file.",
    Verdict.TRANSIENT: "It was starting, stopping or changing load, so that stored heat blurs the figure.",
    Verdict.IMPOSSIBLE: "The figure breaks the first or second law by more than its uncertainty. Ask which "
    "sensor is wrong before asking what is wrong with the machine.",
    Verdict.OVER_CEILING_UNPROVEN: "The figure lies above its ceiling, but by less than its uncertainty.",
    Verdict.IMPLAUSIBLE: "Allowed by the laws, but outside what machines of this kind do.",
    Verdict.LOW: "Below the machine's own declared baseline by more than the uncertainty.",
    Verdict.NO_CEILING: "The figure stands, but there is no ceiling to hold it against.",
    Verdict.CREDIBLE: "Complete, steady, below the ceiling and within the range of its kind.",
}

REASONS: dict[Reason, str] = {
    Reason.MISSING_INPUT: "an input is missing or rejected for too much of the interval",
    Reason.NEGATIVE_INPUT: "the input came out negative or zero while the machine ran",
    Reason.OVER_CEILING: "the efficiency is above its ceiling by more than the uncertainty of the difference",
    Reason.OVER_CEILING_WITHIN_U: "the efficiency is above its ceiling, by less than the uncertainty of "
    "the difference",
    Reason.MORE_OUT_THAN_IN: "more energy leaves than enters, beyond the uncertainty",
    Reason.ENTROPY_FALLS: "the measured heat flows would make entropy fall, beyond the uncertainty",
    Reason.TEMPERATURE_CROSSING: "the cold side leaves hotter than the hot side enters, or the hot side "
    "leaves colder than the cold side enters, beyond the uncertainty",
    Reason.ABOVE_BAND: "the efficiency is higher than machines of this kind reach",
    Reason.BELOW_BAND: "the efficiency is lower than machines of this kind show when they work",
    Reason.NO_CEILING_TEMPERATURES: "the source was not hotter than the sink, so that no ceiling exists",
    Reason.NO_CEILING_FOR_KIND: "a machine of this kind has no ceiling on its efficiency",
    Reason.FUEL_EXERGY: "the work exceeds the exergy of the fuel, beyond the uncertainty",
}

STATUSES: dict[Status, str] = {
    Status.FIRM: "covered well enough to be used as it stands",
    Status.PROVISIONAL: "usable with care: part of the energy behind it was not logged",
    Status.WITHHELD: "not published",
}

CLOSURES: dict[Closure, str] = {
    Closure.CLOSES: "closes within its uncertainty",
    Closure.WATCH: "is open by a little more than its uncertainty and needs watching",
    Closure.OPEN: "does not close",
    Closure.NOT_TESTABLE: "cannot be tested, because at least one stream is found by difference",
}

OVERALL: dict[Exit, tuple[str, str]] = {
    Exit.FIRM: ("Firm", "Every headline figure is covered well enough to be used as it stands."),
    Exit.PROVISIONAL: ("Provisional", "Part of the data is missing, so that figures may still move."),
    Exit.LOOK: (
        "A person must look before this is used",
        "Something in the logs cannot be true, or a balance does not close.",
    ),
}


def withheld(code: str, coverage: float, rules: Rules) -> str:
    """Reason of a refusal in words that stand in the place of the figure."""
    if code == "coverage":
        return (
            f"only {percent(coverage)} of the energy is covered by common readings; at least "
            f"{percent(rules.publish_coverage, 0)} is needed"
        )
    known = {
        "not testable": "a stream is found by difference, so that there is nothing to test it against",
        "no ceiling": "its ceiling could not be computed at any time of the period",
        "no input": "no input was logged that it could be counted against",
        "no common ticks": "its inputs were never logged at the same time",
    }
    return known.get(code, code)
