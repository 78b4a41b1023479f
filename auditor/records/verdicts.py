"""Words of judgement: verdicts of an interval, statuses of a figure, gates, and their precedence."""

from __future__ import annotations

from enum import IntEnum, StrEnum


class Verdict(IntEnum):
    """Verdict of one interval. The order is the precedence: the first that applies is the verdict."""

    NOT_ASSESSED = 0
    STOPPED = 1
    LOW_LOAD = 2
    TRANSIENT = 3
    IMPOSSIBLE = 4
    OVER_CEILING_UNPROVEN = 5
    IMPLAUSIBLE = 6
    LOW = 7
    NO_CEILING = 8
    CREDIBLE = 9

    @property
    def word(self) -> str:
        """The word printed in tables and reports."""
        return _VERDICT_WORDS[self]


_VERDICT_WORDS = {
    Verdict.NOT_ASSESSED: "not assessed",
    Verdict.STOPPED: "stopped",
    Verdict.LOW_LOAD: "low load",
    Verdict.TRANSIENT: "transient",
    Verdict.IMPOSSIBLE: "impossible",
    Verdict.OVER_CEILING_UNPROVEN: "over ceiling, unproven",
    Verdict.IMPLAUSIBLE: "implausible",
    Verdict.LOW: "low",
    Verdict.NO_CEILING: "no ceiling",
    Verdict.CREDIBLE: "credible",
}


class Reason(StrEnum):
    """Why an interval got its verdict, or what a physics test found although an earlier word won."""

    MISSING_INPUT = "missing input"
    NEGATIVE_INPUT = "negative input"
    OVER_CEILING = "over ceiling beyond U"
    OVER_CEILING_WITHIN_U = "over ceiling within U"
    MORE_OUT_THAN_IN = "more energy out than in beyond U"
    ENTROPY_FALLS = "entropy falls beyond U"
    TEMPERATURE_CROSSING = "temperatures cross beyond U"
    ABOVE_BAND = "above the believable band"
    BELOW_BAND = "below the believable band"
    NO_CEILING_TEMPERATURES = "source not hotter than sink"
    NO_CEILING_FOR_KIND = "no ceiling for this kind"
    FUEL_EXERGY = "work above the fuel's exergy beyond U"


class Status(StrEnum):
    """How far a period figure may be believed."""

    FIRM = "firm"
    PROVISIONAL = "provisional"
    WITHHELD = "withheld"


class Closure(StrEnum):
    """What the first-law residual of a period says."""

    CLOSES = "closes within U"
    WATCH = "within 1.5 U: watch"
    OPEN = "does not close"
    NOT_TESTABLE = "not testable"
