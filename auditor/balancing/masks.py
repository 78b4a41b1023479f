"""Which ticks count for which figure, and sums over them: frozen at the base run."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import reduce
from typing import TYPE_CHECKING

import numpy as np

from auditor.balancing.figures import RUNNING_SECONDS, Recipe
from auditor.records.balances import FigureSums, MachineFigures

if TYPE_CHECKING:
    from auditor.balancing.columns import Bools, Floats


@dataclass(frozen=True)
class Steps:
    """Ticks grouped into steps of the site's interval, steps into intervals of one machine."""

    ticks: int
    ticks_per_step: int
    steps_per_interval: int
    tick_s: float

    @property
    def starts(self) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
        """First tick of each step."""
        return np.arange(0, self.ticks, self.ticks_per_step)

    def by_step(self, per_tick: Floats | Bools) -> Floats:
        """Sum ticks into steps."""
        return np.add.reduceat(per_tick.astype(np.float64, copy=False), self.starts)

    def by_interval(self, per_step: Floats) -> Floats:
        """Sum steps (last axis) into intervals of the machine."""
        if self.steps_per_interval == 1:
            return per_step
        starts = np.arange(0, per_step.shape[-1], self.steps_per_interval)
        return np.add.reduceat(per_step, starts, axis=-1)

    def interval_of_tick(self) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
        """Index of the machine's interval that each tick lies in."""
        return np.arange(self.ticks) // (self.ticks_per_step * self.steps_per_interval)


@dataclass(frozen=True)
class Mask:
    """Ticks that count for a figure."""

    live: Bools
    """Known and not known to stand still: these ticks are summed."""
    seconds: Floats
    """Known or standing still, by step [s]."""
    running_seconds: Floats
    """Live time by step [s]."""


@dataclass(frozen=True)
class Row:
    """A figure with the places of its masks: for its interval value and for its period value."""

    recipe: Recipe
    interval_mask: int
    period_mask: int


def freeze(
    found: Sequence[Recipe], headline: str, known: Mapping[str, Bools], stopped: Bools, steps: Steps
) -> tuple[FrozenSums, Bools]:
    """Decide which ticks count for every figure.

    Parameters
    ----------
    found : sequence of Recipe
        The machine's figures.
    headline : str
        Key of the figure whose inputs define the common ticks.
    known : mapping of column to ndarray of bool, shape (T,)
    stopped : ndarray of bool, shape (T,)
        Known to stand still.
    steps : Steps

    Returns
    -------
    (sums, common)
        Masks by figure, and the ticks common to all inputs of the headline figure, shape (T,).
    """
    masks: list[Mask] = []
    places: dict[bytes, int] = {}

    def place(counted: Bools) -> int:
        name = np.packbits(counted).tobytes()
        if name not in places:
            places[name] = len(masks)
            live = counted & ~stopped
            masks.append(
                Mask(live, steps.by_step(counted) * steps.tick_s, steps.by_step(live) * steps.tick_s)
            )
        return places[name]

    own = {
        recipe.key: reduce(np.logical_and, (known[column] for column in recipe.columns)) | stopped
        for recipe in found
    }
    common = own[headline]
    has_common = steps.by_interval(steps.by_step(common)) > 0.0
    asked = common | ~has_common[steps.interval_of_tick()]
    rows = tuple(
        Row(
            recipe,
            interval_mask=place(own[recipe.key] & asked if recipe.is_power else own[recipe.key]),
            period_mask=place(own[recipe.key]),
        )
        for recipe in found
    )
    return FrozenSums(steps, tuple(masks), rows), common


@dataclass(frozen=True)
class FrozenSums:
    """Rows, masks and steps of one machine: with its columns they give its figures."""

    steps: Steps
    masks: tuple[Mask, ...]
    rows: tuple[Row, ...]

    def figures(self, machine: str, columns: Mapping[str, Floats]) -> MachineFigures:
        """Sum columns under the frozen masks into all figures of the machine."""
        sums = ColumnSums(self, columns)
        interval = [(row.recipe.key, row.recipe, row.interval_mask) for row in self.rows]
        period = [
            (row.recipe.energy_key if row.recipe.is_power else row.recipe.key, row.recipe, row.period_mask)
            for row in self.rows
        ]
        return MachineFigures(
            machine=machine,
            interval=sums.table(interval, energies=False),
            period=sums.table(period, energies=True),
            steps_per_interval=self.steps.steps_per_interval,
        )


class ColumnSums:
    """Sums of columns under masks by step, each computed once."""

    def __init__(self, frozen: FrozenSums, columns: Mapping[str, Floats]) -> None:
        self._frozen = frozen
        self._columns = columns
        self._known: dict[tuple[str, int], Floats] = {}

    def _sum(self, column: str, mask: int) -> Floats:
        if (column, mask) not in self._known:
            live = self._frozen.masks[mask].live
            steps = self._frozen.steps
            counted = np.where(live, self._columns[column], 0.0)
            self._known[column, mask] = steps.by_step(counted) * steps.tick_s
        return self._known[column, mask]

    def combination(self, terms: Mapping[str, float], mask: int) -> Floats:
        """Linear combination of columns, summed by step [unit of the columns times s]."""
        total = np.zeros(self._frozen.steps.starts.shape)
        for column, factor in terms.items():
            total += factor * self._sum(column, mask)
        return total

    def table(self, rows: Iterable[tuple[str, Recipe, int]], *, energies: bool) -> FigureSums:
        """Numerators and denominators of figures; powers as plain sums of energy if ``energies``."""
        listed = list(rows)
        plain = np.array([energies and recipe.is_power for _, recipe, _ in listed], dtype=bool)
        return FigureSums(
            keys=tuple(key for key, _, _ in listed),
            numerator=np.stack([self.combination(recipe.numerator, mask) for _, recipe, mask in listed]),
            denominator=np.stack(
                [
                    np.zeros(self._frozen.steps.starts.shape) if sums else self._denominator(recipe, mask)
                    for sums, (_, recipe, mask) in zip(plain, listed, strict=True)
                ]
            ),
            plain_sum=plain,
        )

    def _denominator(self, recipe: Recipe, mask: int) -> Floats:
        if not isinstance(recipe.denominator, str):
            return self.combination(recipe.denominator, mask)
        times = self._frozen.masks[mask]
        return times.running_seconds if recipe.denominator == RUNNING_SECONDS else times.seconds
