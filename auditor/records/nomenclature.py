"""One table of the figures this program computes: name, unit, meaning and sign.

Docs, tables, checks and the report read this table; no figure is described twice.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

QuantityKind = Literal["power", "energy", "fraction", "temperature", "temperature difference", "entropy rate"]


@dataclass(frozen=True)
class Term:
    """One figure."""

    key: str
    quantity: QuantityKind
    title: str
    meaning: str
    sign: str


_POWERS = (
    (
        "fuel_in",
        "fuel input",
        "Fuel power entering, on the machine's declared heating value.",
        "in is positive",
    ),
    (
        "fuel_in_higher",
        "fuel input, higher heating value",
        "The same fuel on its higher heating value.",
        "in is positive",
    ),
    (
        "fuel_in_lower",
        "fuel input, lower heating value",
        "The same fuel on its lower heating value.",
        "in is positive",
    ),
    (
        "fuel_exergy",
        "fuel exergy",
        "Chemical exergy of the fuel that enters.",
        "in is positive",
    ),
    (
        "heat_in",
        "heat input",
        "Heat entering from streams with the role heat in.",
        "in is positive",
    ),
    (
        "power_in",
        "power input",
        "Power that enters the working fluid; in the first law, not in an efficiency.",
        "in is positive",
    ),
    (
        "work_gross",
        "gross work",
        "Work delivered at the machine's terminals or shaft.",
        "out is positive",
    ),
    (
        "own_use",
        "own use",
        "Power taken by the machine's own auxiliaries.",
        "out of gross work is positive",
    ),
    ("work_net", "net work", "Gross work less own use.", "out is positive"),
    ("useful_heat", "useful heat", "Heat delivered to a consumer.", "out is positive"),
    (
        "rejected",
        "rejected heat, implied",
        "Input and power input less gross work, useful heat and losses.",
        "out is positive",
    ),
    (
        "rejected_measured",
        "rejected heat, measured",
        "Sum of the metered streams with the role rejected heat.",
        "out is positive",
    ),
    (
        "loss",
        "losses",
        "Streams with the role loss: they leave without being metered.",
        "out is positive",
    ),
    (
        "residual",
        "closure residual",
        "Input and power input less everything that leaves, rejected heat as metered.",
        "positive: energy in that is not accounted for",
    ),
    (
        "demanded_rejection",
        "rejection the second law demands",
        "Least heat a reversible engine between the same temperatures would reject.",
        "out is positive",
    ),
    (
        "unavoidable_rest",
        "rejection beyond the demanded",
        "Implied rejected heat less the rejection the second law demands.",
        "out is positive",
    ),
    (
        "energy_excess",
        "energy out beyond energy in",
        "Work and useful heat, with measured rejection, less input on the higher heating value.",
        "positive: more out than in",
    ),
)


_RATIOS = (
    Term(
        "gross",
        "fraction",
        "gross efficiency",
        "Gross work over fuel and heat input.",
        "positive",
    ),
    Term(
        "net",
        "fraction",
        "net efficiency",
        "Net work over fuel and heat input.",
        "positive",
    ),
    Term(
        "heat",
        "fraction",
        "heat efficiency",
        "Useful heat over fuel and heat input.",
        "positive",
    ),
    Term(
        "total",
        "fraction",
        "total efficiency",
        "Gross work and useful heat over fuel and heat input.",
        "positive",
    ),
    Term(
        "bound",
        "fraction",
        "efficiency the ceiling binds",
        "Gross work less the power that enters the working fluid, over fuel and heat input.",
        "positive",
    ),
    Term(
        "ceiling",
        "fraction",
        "ceiling",
        "Largest efficiency the laws of thermodynamics allow for the stated temperatures or fuel.",
        "positive",
    ),
    Term(
        "margin",
        "fraction",
        "margin",
        "The efficiency that the ceiling binds, less the ceiling.",
        "positive: above the ceiling",
    ),
    Term(
        "ceiling_share",
        "fraction",
        "share of ceiling",
        "Efficiency over its ceiling: a yardstick, never a saving.",
        "positive",
    ),
    Term(
        "entropy_generation_W_per_K",
        "entropy rate",
        "entropy generation",
        "Entropy leaving with rejected and useful heat, and with losses at the coldest stream's temperature, less entropy entering with heat.",
        "never negative in a real machine",
    ),
    Term(
        "source_temperature_K",
        "temperature",
        "source temperature",
        "Temperature of the ceiling's source: inlet, or entropic mean.",
        "absolute",
    ),
    Term(
        "sink_temperature_K",
        "temperature",
        "sink temperature",
        "Temperature of the ceiling's sink: inlet, or entropic mean.",
        "absolute",
    ),
    Term(
        "crossing_K",
        "temperature difference",
        "temperature crossing",
        "The warmed stream's hottest above the warming stream's hottest, or coldest below coldest, whichever is more.",
        "positive: crossed, which no exchanger can do",
    ),
)


def _terms() -> dict[str, Term]:
    terms = {}
    for key, title, meaning, sign in _POWERS:
        terms[f"{key}_W"] = Term(f"{key}_W", "power", title, meaning, sign)
        terms[f"{key}_J"] = Term(f"{key}_J", "energy", title, meaning, sign)
    return terms | {term.key: term for term in _RATIOS}


TERMS: dict[str, Term] = _terms()
