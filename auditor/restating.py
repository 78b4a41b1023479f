"""What a month that is published again changes: which inputs, and which headline figures."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from auditor.records.result import AuditResult


@dataclass(frozen=True)
class RestatedFigure:
    """One headline figure before and after; a value is None while it is withheld."""

    machine: str
    figure: str
    """Its key in statement.json."""
    unit: str
    old: float | None
    new: float | None
    old_status: str
    new_status: str

    @property
    def row(self) -> tuple[str, str, str, float | None, float | None, str, str]:
        """Machine, figure, unit, old and new value, old and new status."""
        return (
            *(self.machine, self.figure, self.unit),
            *(self.old, self.new),
            *(self.old_status, self.new_status),
        )

    def __str__(self) -> str:
        """``engine work_gross_kWh: 20000 kWh provisional -> 24000 kWh firm (+4000 kWh)``."""
        before, after = (
            f"{'withheld' if value is None else f'{_number(value)} {self.unit} {status}'}"
            for value, status in ((self.old, self.old_status), (self.new, self.new_status))
        )
        change = ""
        if self.old is not None and self.new is not None and self.old != self.new:
            change = f" ({self.new - self.old:+.6g} {self.unit})"
        return f"{self.machine} {self.figure}: {before} -> {after}{change}"


@dataclass(frozen=True)
class Restatement:
    """Why a month was published again, and what became of its headline figures."""

    reasons: tuple[str, ...]
    """Plain words: ``engine/late.csv is new``."""
    figures: tuple[RestatedFigure, ...]
    """Only those that changed, in the order of the report."""

    def lines(self, month: str) -> list[str]:
        """Lines of the run log: why, then each figure."""
        why = f": {'; '.join(self.reasons)}" if self.reasons else ""
        return [f"{month} published again{why}", *(f"{month} {figure}" for figure in self.figures)]


def restatement(before: Mapping[str, Any], now: Mapping[str, Any], result: AuditResult) -> Restatement:
    """Compare two statements of the same month.

    Parameters
    ----------
    before, now : mapping
        The contents of statement.json as published last, and as about to be published.
    result : AuditResult
        The audit that ``now`` states; says which figures stand on the first page.
    """
    return Restatement(tuple(_reasons(before, now)), tuple(_figures(before, now, result)))


def _reasons(before: Mapping[str, Any], now: Mapping[str, Any]) -> list[str]:
    old, new = ({entry["file"]: entry["sha256"] for entry in each["inputs"]} for each in (before, now))
    reasons = []
    for file in sorted(old.keys() | new.keys()):
        if file not in old:
            reasons.append(f"{file} is new")
        elif file not in new:
            reasons.append(f"{file} is gone")
        elif old[file] != new[file]:
            reasons.append(f"{file} has changed")
    if before["plant_file_sha256"] != now["plant_file_sha256"]:
        reasons.append("the plant file has changed")
    if before["version"] != now["version"]:
        reasons.append(f"the program is version {now['version']}, it was {before['version']}")
    if before["period"]["end"] != now["period"]["end"]:
        reasons.append(
            f"the month reaches to {now['period']['end']}, it reached to {before['period']['end']}"
        )
    return reasons


def _figures(before: Mapping[str, Any], now: Mapping[str, Any], result: AuditResult) -> list[RestatedFigure]:
    from auditor.report.sections.labels import headline_keys
    from auditor.report.statement import published_name

    found = []
    for name, balance in result.balances.items():
        old_figures = before["machines"].get(name, {}).get("figures", {})
        for key in headline_keys(result.plant.machines[name], balance):
            figure = published_name(key)[0]
            new, old = now["machines"][name]["figures"][figure], old_figures.get(figure)
            if old is None or (old["value"], old["status"]) == (new["value"], new["status"]):
                continue
            values = (old["value"], new["value"], old["status"], new["status"])
            found.append(RestatedFigure(name, figure, new["unit"], *values))
    return found


def _number(value: float) -> str:
    return f"{value:.6g}"
