"""The plant as declared in plant.toml, fully checked and converted to SI: site, exports, tags, substances."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from pathlib import Path

    from auditor.records.machines import Machine, Running
    from auditor.records.uncertain import Assumed, Uncertainty

Between = Literal["step", "line", "mean", "amount", "counter", "state"]
_EVER_US = (-(2**62), 2**62)
DateOrder = Literal[
    "year first", "day first", "month first", "epoch seconds", "epoch milliseconds", "spreadsheet days"
]
Thousands = Literal["space", "'", ".", ","]
"""Mark between groups of three digits; ``space`` is every blank, no-break and thin ones too."""


@dataclass(frozen=True)
class Rules:
    """Thresholds of coverage; each is printed in the report. Shares [1]."""

    tick_coverage: float = 0.50
    """A tick counts when at least this share of it is covered."""
    interval_coverage: float = 0.80
    """An interval is assessed when at least this share of its ticks is common to all inputs."""
    firm_coverage: float = 0.90
    """A period figure is firm from this coverage by energy on."""
    publish_coverage: float = 0.75
    """Below this coverage by energy a period figure is withheld."""


@dataclass(frozen=True)
class AirPressure:
    """Barometric pressure at the site: from a tag, or from the altitude by the standard atmosphere."""

    tag: str | None
    from_altitude: Assumed | None
    """Pressure [Pa]; None when a tag is named."""


@dataclass(frozen=True)
class Site:
    """The site and its clock."""

    name: str
    zone: str
    altitude_m: float | None
    air_pressure: AirPressure | None
    reference_temperature_K: float | None
    """Of heating values and of sensible heat leaving the site; needed by flue-gas streams."""
    tick_s: int
    interval_s: int


@dataclass(frozen=True)
class Quality:
    """Column of a long export that says whether its value is good."""

    column: str
    good: tuple[str, ...]
    """Codes of good values, verbatim; every other one is rejected and counted."""


@dataclass(frozen=True)
class LongLayout:
    """Column names of a long export: one row per stamp, tag and value."""

    stamp: str
    tag: str
    value: str
    quality: Quality | None = None


@dataclass(frozen=True)
class PairsLayout:
    """Every tag's column has a stamp column of its own, at its left; columns may differ in length."""


@dataclass(frozen=True)
class FilePerTag:
    """Every file holds one tag, named by the name of the file or by a line above its headings.

    Exactly one of the two patterns is given; ``{tag}`` in it stands for the name.
    """

    value: str
    """Heading of the value."""
    file_name: str | None
    preamble: str | None


@dataclass(frozen=True)
class Export:
    """One kind of export file: which files, whose clock, how stamps and numbers are written."""

    name: str
    files: tuple[str, ...]
    """Glob patterns below ``logs/``; where two patterns hold the same stamp, the earlier one wins."""
    clock: str
    """IANA zone, ``UTC``, or a fixed offset such as ``+01:00``."""
    repeated_hour: Literal["by order", "drop"]
    """How the hour that an autumn clock change repeats is resolved."""
    date_order: DateOrder
    decimal: Literal[".", ","]
    delimiter: str | None
    """Declared delimiter; None: found from the files."""
    encoding: str | None
    """Declared text encoding; None: found from the files."""
    layout: LongLayout | PairsLayout | FilePerTag | None
    """None: wide, one column per tag."""
    stamp_columns: tuple[str, ...]
    """Heading(s) of the stamp (date and time apart: two); empty: the first column."""
    sentinels: tuple[float, ...]
    """Raw numbers that stand for "no value"."""
    status_words: Mapping[str, float]
    """Words that stand for a raw number; every other word is missing, kept verbatim and counted."""
    when_stamps_repeat: Literal["keep first", "keep later", "reject both"]
    """Which of several *differing* values of one stamp is kept; equal ones are duplicates."""
    tags: tuple[str, ...]
    """Names of the tags read from this export, in the order of the plant file."""
    thousands: Thousands | None = None
    """Mark between groups of three digits; None: numbers are not grouped."""
    month_names: tuple[str, ...] = ()
    """Twelve names of months as the export writes them; English ones are known without."""


@dataclass(frozen=True)
class SpikeRule:
    """How far a sample may stand from its neighbours; exactly one of the two is given."""

    size: float | None
    """SI."""
    times_scatter: float | None
    """In multiples of the robust standard deviation of the samples before [1]."""


@dataclass(frozen=True)
class ChangeRule:
    """How much a value may change: ``size`` within ``within_s``, and in proportion over a longer time."""

    size: float
    """SI."""
    within_s: float


@dataclass(frozen=True)
class Heading:
    """One heading that a tag's column goes by, half-open in time where it has dates."""

    name: str
    from_us: int | None = None
    until_us: int | None = None


@dataclass(frozen=True)
class TagChange:
    """A tag as it is from one instant until its next change."""

    from_us: int
    since: str
    """The instant as the plant file writes it."""
    tag: Tag
    """Everything that holds from then on; its own headings and changes are empty."""
    new_calibration: bool
    """Its uncertainty was declared anew: another instrument, whose error has nothing to do with the one
    before."""


@dataclass(frozen=True)
class Tag:
    """One logged signal. Raw numbers become SI by ``scale * raw + offset``; limits below are SI already.

    A counter or an amount of energy becomes a power, one of volume a volume flow: the ``mean`` of such
    a tag in the tick table is a rate in ``si_unit`` per second.
    """

    name: str
    export: str
    column: str
    """Heading of the column; the name in the tag column (long) or of the file (one tag per file)."""
    unit: str
    """As written in the plant file; empty for a state."""
    quantity: str
    """Quantity kind of the *raw* value, a key of ``auditor.units``: ``temperature``, ``energy``..."""
    scale: float
    offset: float
    si_unit: str
    between: Between
    stamp_marks: Literal["start", "end"] | None
    """For ``mean`` and ``amount``: which end of its stretch the stamp marks."""
    hold_s: float
    """Longest time between two samples that is still covered (counter: over which a difference is spread)."""
    calibration: Uncertainty | None
    """None only for states."""
    random: Uncertainty | None = None
    """Declared random part of one sample; None: estimated from first differences."""
    deadband: float | None = None
    resolution: float | None = None
    full_scale: float | None = None
    """Reading at which a counter rolls over."""
    at_most: float | None = None
    """Largest believable rate of a counter [SI per second]."""
    believable: tuple[float, float] | None = None
    """Believable range, closed, in SI."""
    frozen_after_s: float | None = None
    spike: SpikeRule | None = None
    change_at_most: ChangeRule | None = None
    saturates_at: tuple[float | None, float | None] | None = None
    """Readings at which the instrument stays when the quantity goes on, below and above, SI."""
    not_zero_while: Running | None = None
    """Evidence against which an exact zero is not believed."""
    cut_off: float | None = None
    """Magnitude below which the value counts as zero (low-flow cut-off)."""
    pressure: Literal["gauge", "absolute"] | None = None
    basis: Literal["dry", "wet"] | None = None
    states: Mapping[str, str] | None = None
    """Raw text to state name, for ``between = "state"``."""
    same_quantity_as: str | None = None
    """Another tag that measures the same thing; the two are compared, and nothing else comes of it."""
    line: int = 0
    """Line of the plant file, for messages."""
    declared_in: str = "plant.toml"
    """The plant file, or the tag list that holds its row."""
    headings: tuple[Heading, ...] = ()
    """Every heading of its column, in the order of the plant file; empty: ``column`` alone, always."""
    changes: tuple[TagChange, ...] = ()
    """What is different from a date on, in order of time."""

    @property
    def stretches(self) -> tuple[tuple[int, int, Tag], ...]:
        """Half-open stretches [us] with the tag as it is in each, from ever to ever."""
        starts = (_EVER_US[0], *(change.from_us for change in self.changes))
        ends = (*starts[1:], _EVER_US[1])
        return tuple(zip(starts, ends, (self, *(change.tag for change in self.changes)), strict=True))

    @property
    def stands_by_design(self) -> bool:
        """Whether its values stay equal for good reason: a state, or a value stored only when it changes."""
        return self.between == "state" or (self.between == "step" and self.deadband is not None)

    @property
    def tick_columns(self) -> tuple[str, ...]:
        """Names of its columns in the tick table: one per state name for a state, else its own name.

        The ``mean`` of a state column is the share of covered time spent in that state.
        """
        if self.states is None:
            return (self.name,)
        names = dict.fromkeys(self.states.values())
        return tuple(f"{self.name}={state}" for state in names)


@dataclass(frozen=True)
class Distrust:
    """A person's own exclusion of one tag for a stretch of time."""

    tag: str
    start_us: int
    end_us: int
    reason: str
    line: int


@dataclass(frozen=True)
class Fluid:
    """Properties of a liquid or gas that carries heat; exactly one way of giving the heat capacity."""

    name: str
    kind: Literal["water", "ethylene glycol", "propylene glycol", "declared"]
    mass_fraction: float | None
    """Of glycol in the mixture [1]."""
    heat_capacity: Assumed | None
    """Constant heat capacity [J/(kg K)]; with a table: the scale factor 1 with its standard [1]."""
    heat_capacity_table: tuple[tuple[float, float], ...] | None
    """Pairs (temperature [K], heat capacity [J/(kg K)]), rising in temperature."""
    density: Assumed | None
    """Constant density [kg/m3]; with a table: the scale factor 1 with its standard [1]."""
    density_table: tuple[tuple[float, float], ...] | None
    """Pairs (temperature [K], density [kg/m3]), rising in temperature."""


@dataclass(frozen=True)
class HeatingValue:
    """Heating values valid from one instant until the next entry, per m3 at the volume state or per kg."""

    from_us: int
    lower: Assumed | None
    higher: Assumed | None
    """[J/m3] or [J/kg]; at least the machine's basis is there."""
    source: str


@dataclass(frozen=True)
class VolumeState:
    """Reference state of a gas volume."""

    temperature_K: float
    pressure_Pa: float
    dry: bool
    declared: str


@dataclass(frozen=True)
class FlueGas:
    """Simple stated form: flue gas of a fuel from its air demand and dry oxygen."""

    air_demand: Assumed
    """Dry minimum air per fuel at the volume state [m3/m3], air at the same state."""
    dry_flue_gas: Assumed
    """Dry minimum flue gas per fuel [m3/m3]."""
    fuel_density: Assumed
    """Of the fuel at its volume state [kg/m3]."""
    heat_capacity: Assumed
    """Of the (wet) flue gas [J/(kg K)]."""


@dataclass(frozen=True)
class Fuel:
    """A fuel with dated heating values; gas (per volume at a stated state) or liquid (per mass)."""

    name: str
    phase: Literal["gas", "liquid"]
    volume_state: VolumeState | None
    """Gas only."""
    values: tuple[HeatingValue, ...]
    """In order of time."""
    value_standard: Assumed
    """One influence common to every machine that burns it: factor 1 with its relative standard."""
    density: Assumed | None = None
    """Liquid metered by volume: density [kg/m3] at ``density_temperature_K``."""
    density_temperature_K: float | None = None
    expansion: Assumed | None = None
    """Cubic expansion coefficient of a liquid fuel [1/K]."""
    flue_gas: FlueGas | None = None
    exergy: Assumed | None = None
    """Ratio of chemical exergy to the heating value named by ``exergy_of`` [1]."""
    exergy_of: Literal["lower", "higher"] | None = None


@dataclass(frozen=True)
class GasMeter:
    """How a gas meter's volume becomes a volume at the fuel's state."""

    name: str
    reads: Literal["operating volume", "already at the fuel's state"]
    pressure: str | None
    """Tag."""
    temperature: str | None
    """Tag."""
    compressibility_ratio: Assumed | None
    """Compression factor at the reference state over that at the meter [1]."""


@dataclass(frozen=True)
class Plant:
    """Everything the plant file says. Each room is handed only the slice it needs."""

    path: Path
    folder: Path
    """The site folder, which holds ``plant.toml`` and ``logs/``."""
    text: str
    """The file as read, for its digest and for the report's appendix."""
    site: Site
    rules: Rules
    exports: Mapping[str, Export]
    tags: Mapping[str, Tag]
    fluids: Mapping[str, Fluid]
    fuels: Mapping[str, Fuel]
    gas_meters: Mapping[str, GasMeter]
    machines: Mapping[str, Machine]
    """In the order of the plant file."""
    distrust: tuple[Distrust, ...]
    tag_lists: tuple[tuple[str, str], ...] = ()
    """Tag lists beside the plant file, each with its name and its text as read."""

    @property
    def whole_text(self) -> str:
        """The plant file with its tag lists behind it: what its digest is taken of."""
        return self.text + "".join(f"\n# {name}\n{text}" for name, text in self.tag_lists)
