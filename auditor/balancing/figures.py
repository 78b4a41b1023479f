"""Figures of a machine as sums of columns over sums of columns: each is written down once, here."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from auditor.balancing.layout import Layout

SECONDS = "seconds"
"""Denominator of mean powers: time known to the figure, standstill included."""
RUNNING_SECONDS = "running seconds"
"""Denominator of mean temperatures: time known to the figure without standstill."""


@dataclass(frozen=True)
class Recipe:
    """One figure: ``sum(numerator) / sum(denominator)``, both linear in the machine's columns."""

    key: str
    """Of the nomenclature; powers end in ``_W``."""
    numerator: Mapping[str, float]
    """Column to coefficient."""
    denominator: Mapping[str, float] | str
    """Column to coefficient, or one of the two times."""

    @property
    def is_power(self) -> bool:
        """A mean power over the interval, an energy over the period."""
        return self.denominator == SECONDS and self.key.endswith("_W")

    @property
    def energy_key(self) -> str:
        """Key of a power's energy over the period."""
        return self.key.removesuffix("_W") + "_J"

    @property
    def columns(self) -> tuple[str, ...]:
        """Columns that must be known for the figure to be known, in a fixed order."""
        below = () if isinstance(self.denominator, str) else tuple(self.denominator)
        return tuple(dict.fromkeys((*self.numerator, *below)))


def recipes(layout: Layout, columns: Collection[str]) -> tuple[Recipe, ...]:
    """All figures that a machine with these columns can have.

    ==================  =============================================================================
    work_net            gross work - own use
    rejected            input + power in - gross work - useful heat - losses
    residual            rejected (implied) - rejected (measured)
    unavoidable_rest    rejected (implied) - rejection demanded
    energy_excess       gross work + useful heat + rejected (measured) - input (higher) - power in
    gross, net          work / input
    heat, total         useful heat / input; gross work and useful heat / input
    bound               (gross work - power in) / input
    ceiling             ceiling work / input
    margin              bound - ceiling
    ceiling_share       bound / ceiling
    ==================  =============================================================================

    Input is fuel on the declared basis and heat. The power that enters the fluid is taken off before an
    efficiency is held against a ceiling, because the ceiling binds the net work of the working fluid.

    Parameters
    ----------
    layout : Layout
    columns : collection of str
        Names of the columns of the machine.

    Returns
    -------
    tuple of Recipe
        In the order of the nomenclature; a figure the machine cannot have is left out.
    """
    found = (*_powers(layout, columns), *_ratios(layout, columns), *_second_law(columns))
    return tuple(Recipe(key, MappingProxyType(top), bottom) for key, top, bottom in found)


_Found = list[tuple[str, dict[str, float], dict[str, float] | str]]


def _powers(layout: Layout, columns: Collection[str]) -> _Found:
    def of(**terms: float) -> dict[str, float]:
        return {column: factor for column, factor in terms.items() if column in columns}

    plain = (
        ("fuel_in_W", "fuel"),
        ("fuel_in_higher_W", "fuel_higher"),
        ("fuel_in_lower_W", "fuel_lower"),
        ("fuel_exergy_W", "fuel_exergy"),
        ("heat_in_W", "heat"),
        ("power_in_W", "power_in"),
        ("work_gross_W", "work"),
        ("own_use_W", "own_use"),
        ("useful_heat_W", "useful"),
        ("rejected_measured_W", "rejected"),
        ("loss_W", "loss"),
        ("demanded_rejection_W", "demanded"),
    )
    found: _Found = [(key, {column: 1.0}, SECONDS) for key, column in plain if column in columns]
    implied = of(fuel=1.0, heat=1.0, power_in=1.0, work=-1.0, useful=-1.0, loss=-1.0)
    has_input = "fuel" in columns or "heat" in columns
    if _has_net(layout, columns):
        found.append(("work_net_W", of(work=1.0, own_use=-1.0), SECONDS))
    if has_input and ("rejected" in columns or not layout.testable):
        found.append(("rejected_W", implied, SECONDS))
    if has_input and layout.testable:
        found.append(("residual_W", implied | of(rejected=-1.0), SECONDS))
    if "demanded" in columns:
        found.append(("unavoidable_rest_W", implied | of(demanded=-1.0), SECONDS))
    if has_input and ("fuel" not in columns or "fuel_higher" in columns):
        out = of(work=1.0, useful=1.0, rejected=1.0)
        found.append(("energy_excess_W", out | of(fuel_higher=-1.0, heat=-1.0, power_in=-1.0), SECONDS))
    return found


def _has_net(layout: Layout, columns: Collection[str]) -> bool:
    """Own use is metered, or the plant file calls the work that is metered net already."""
    return "work" in columns and ("own_use" in columns or layout.machine.headline == "net")


def _ratios(layout: Layout, columns: Collection[str]) -> _Found:
    def of(**terms: float) -> dict[str, float]:
        return {column: factor for column, factor in terms.items() if column in columns}

    entering = of(fuel=1.0, heat=1.0)
    if not entering:
        return []
    found: _Found = []
    works, heats = "work" in columns, "useful" in columns
    bound = of(work=1.0, power_in=-1.0)
    if works:
        found.append(("gross", of(work=1.0), entering))
    if _has_net(layout, columns):
        found.append(("net", of(work=1.0, own_use=-1.0), entering))
    if heats:
        found.append(("heat", of(useful=1.0), entering))
    if works and heats:
        found.append(("total", of(work=1.0, useful=1.0), entering))
    if works:
        found.append(("bound", bound, entering))
    if "ceiling_work" in columns:
        found.append(("ceiling", of(ceiling_work=1.0), entering))
    if works and "ceiling_work" in columns:
        found.append(("margin", bound | of(ceiling_work=-1.0), entering))
        found.append(("ceiling_share", bound, of(ceiling_work=1.0)))
    return found


def _second_law(columns: Collection[str]) -> _Found:
    found: _Found = []
    if "entropy" in columns:
        found.append(("entropy_generation_W_per_K", {"entropy": 1.0}, SECONDS))
    if "source_heat" in columns:
        found.append(("source_temperature_K", {"source_heat": 1.0}, {"heat": 1.0}))
        found.append(("sink_temperature_K", {"sink_heat": 1.0}, {"heat": 1.0}))
    if "crossing" in columns:
        found.append(("crossing_K", {"crossing": 1.0}, RUNNING_SECONDS))
    return found


def headline_key(layout: Layout, found: Collection[str]) -> str:
    """Figure on page one: the declared efficiency, or the heat efficiency of a machine without work.

    A machine without either is covered where its input is known.
    """
    for key in (layout.machine.headline, "heat", "fuel_in_W", "heat_in_W"):
        if key is not None and key in found:
            return key
    return next(iter(found))
