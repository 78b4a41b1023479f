"""What all exports of a site turned out to be, pooled over all files of each export."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from auditor.log_reading.aliases import by_heading, tag_of, unread_tags
from auditor.log_reading.dialect import (
    Dialect,
    duplicate_headings,
    heading_key,
    long_headings,
    unit_faults,
)
from auditor.log_reading.doubts import Proof, contradicted, grouped, mixed_dates
from auditor.log_reading.encoding import Encoding
from auditor.log_reading.file_per_tag import pattern_key
from auditor.log_reading.listing import READ_ERRORS, Claim, StoredFile, list_logs, reason_of
from auditor.log_reading.look import Look, OtherTag, look_at
from auditor.log_reading.resets import ANY_TIME, believed_range, range_of
from auditor.log_reading.unclaimed import unclaimed_files
from auditor.records.errors import Fault, PlantFileError
from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Export, FilePerTag, LongLayout, Tag


@dataclass(frozen=True)
class RecognisedFile:
    """One file of an export, ready to be read."""

    claim: Claim
    encoding: Encoding
    dialect: Dialect
    first_us: int
    last_us: int
    is_whole: bool
    """Its range and order are known of every line, not of samples only."""
    is_ordered: bool
    is_descending: bool
    stamp_format: str
    evidence: tuple[str, ...]
    proof: Proof
    """What the files of its export have proven together."""
    point: str = ""
    """With one file per tag: the name of its tag."""
    believed_us: tuple[int, int] = ANY_TIME
    """Stamps outside are those of a clock that was reset."""

    @property
    def path(self) -> str:
        """Path below ``logs/``."""
        return self.claim.stored.path

    @property
    def has_stamps(self) -> bool:
        """Whether any stamp was found; without one its range is empty."""
        return self.first_us <= self.last_us

    def lies_outside(self, window_us: tuple[int, int]) -> bool:
        """Whether the file is known to have no row inside a half-open stretch."""
        is_apart = self.last_us < window_us[0] or self.first_us >= window_us[1]
        return is_apart and self.has_stamps and (self.is_whole or self.is_ordered)


@dataclass(frozen=True)
class UnopenedFile:
    """A file that no export will read, and why."""

    stored: StoredFile
    export: str | None
    pattern: int | None
    reason: str


@dataclass(frozen=True)
class Recognition:
    """Everything that is known about the files below ``logs/`` before they are read."""

    logs: Path
    exports: Mapping[str, Export]
    tags: Mapping[str, Tag]
    """With a tag of its own for every further heading, as :func:`~auditor.log_reading.aliases.by_heading`."""
    files: Mapping[str, tuple[RecognisedFile, ...]]
    """Per export, in order of precedence: by pattern, then by path."""
    unopened: tuple[UnopenedFile, ...]
    findings: tuple[Finding, ...]

    def ranges(self) -> Iterator[tuple[str, int, int]]:
        """Give stored files with their first and last stamp; an archive with those of all its members."""
        spans: dict[str, tuple[int, int]] = {}
        for files in self.files.values():
            for file in files:
                if not file.has_stamps:
                    continue
                name = file.path.partition("!")[0] if file.claim.stored.member else file.path
                first_us, last_us = spans.get(name, (file.first_us, file.last_us))
                spans[name] = (min(first_us, file.first_us), max(last_us, file.last_us))
        for name, (first_us, last_us) in sorted(spans.items()):
            yield name, first_us, last_us


def recognise(logs: Path, exports: Mapping[str, Export], tags: Mapping[str, Tag]) -> Recognition:
    """List every file below ``logs/`` and recognise what each claimed one is.

    Parameters
    ----------
    logs : path
        The folder of exports; only ever read.
    exports, tags : mapping
        As the plant file declares them, by name.

    Raises
    ------
    PlantFileError
        With every fault at once: a file claimed twice, a heading that is in none of an export's files
        or bound and doubled, a unit row that differs, a date order or decimal mark that the data
        contradict, an export whose stamps cannot be read.
    """
    exports, tags = by_heading(exports, tags)
    listing = list_logs(logs, exports)
    faults: list[Fault] = []
    findings: list[Finding] = []
    unopened = [UnopenedFile(stored, None, None, stored.set_aside) for stored in listing.unclaimed]
    files: dict[str, tuple[RecognisedFile, ...]] = {}
    for claim, reason in listing.unreadable:
        unopened.append(UnopenedFile(claim.stored, claim.export or None, claim.pattern, reason))
        findings.append(_unreadable(claim, reason))
    for name, export in exports.items():
        claims = [claim for claim in listing.claims if claim.export == name]
        if not claims:
            findings.append(
                Finding(FindingCode.MISSING_EXPORT, export=name, words={"files": ", ".join(export.files)})
            )
            files[name] = ()
            continue
        pool = _Pool(export, {tag: tags[tag] for tag in export.tags})
        for claim in claims:
            pool.add(claim)
        faults += pool.faults()
        findings += pool.findings()
        unopened += pool.unopened
        files[name] = pool.files()
        if not files[name] and not pool.fields:
            findings.append(
                Finding(FindingCode.MISSING_EXPORT, export=name, words={"files": ", ".join(export.files)})
            )
    if faults:
        raise PlantFileError(faults)
    findings += unclaimed_files(listing)
    ordered = tuple(sorted(unopened, key=lambda file: file.stored.path))
    return Recognition(logs, exports, tags, files, ordered, tuple(findings))


class _Pool:
    """All files of one export, looked at one by one and judged together."""

    def __init__(self, export: Export, tags: Mapping[str, Tag]) -> None:
        self.export, self.tags = export, tags
        self.looks: list[Look] = []
        self.unopened: list[UnopenedFile] = []
        self.fields: list[str] = []
        """Fields of files without a heading row: where a misspelt heading may stand."""
        self.points: dict[str, None] = {}
        """With one file per tag: names that the files gave."""
        self._unreadable: list[Finding] = []

    def add(self, claim: Claim) -> None:
        try:
            look = look_at(claim, self.export, self.tags)
        except READ_ERRORS as error:
            self._refuse(claim, reason_of(error))
            return
        if isinstance(look, Look):
            self.looks.append(look)
            self.points[look.point] = None
        elif isinstance(look, OtherTag):
            self._pass_over(claim, look)
        else:
            self.fields += [field for field in look if field.isprintable()]
            self._refuse(claim, "no heading row")

    def _pass_over(self, claim: Claim, other: OtherTag) -> None:
        """Set aside a file of another tag, or one that does not say which tag it holds."""
        if other.name is None:
            self._refuse(claim, f'nothing in it fits "{other.pattern}", which would name its tag')
            return
        self.points[other.name] = None
        reason = f'it holds "{other.name}", which no tag of the plant file binds'
        self.unopened.append(UnopenedFile(claim.stored, claim.export, claim.pattern, reason))

    def _refuse(self, claim: Claim, reason: str) -> None:
        self.unopened.append(UnopenedFile(claim.stored, claim.export, claim.pattern, reason))
        self._unreadable.append(_unreadable(claim, reason))

    def faults(self) -> list[Fault]:
        """Everything that contradicts the plant file."""
        if not self.looks and not self.fields and not self.points:
            return []
        faults = self._missing_headings()
        for look in self.looks:
            where = f"logs/{look.claim.stored.path}:{look.dialect.heading_line}"
            for name, places in duplicate_headings(look.dialect, self.export, self.tags):
                at = " and ".join(str(place) for place in places)
                found = f'the heading "{name}" stands in columns {at}'
                faults.append(Fault(where, found, "give the two columns different headings in the export"))
            faults += unit_faults(look.dialect, look.head, look.claim.stored.path, self.tags)[0]
        return faults + self._contradictions()

    def findings(self) -> list[Finding]:
        """Return what is odd, but no fault."""
        bound_points = {look.point for look in self.looks}
        unclaimed = dict.fromkeys(point for point in self.points if point not in bound_points)
        for look in self.looks:
            if look.dialect.is_long:
                bound = {heading_key(tag.column) for tag in self.tags.values()}
                unclaimed |= dict.fromkeys(name for name in look.long_names if name and name not in bound)
            unclaimed |= dict.fromkeys(look.dialect.headings[place] for place in look.dialect.unclaimed)
        found = list(self._unreadable)
        if unclaimed:
            found.append(
                Finding(
                    FindingCode.UNCLAIMED_COLUMN,
                    export=self.export.name,
                    numbers={"count": len(unclaimed)},
                    words={"columns": ", ".join(unclaimed)},
                )
            )
        return found

    def files(self) -> tuple[RecognisedFile, ...]:
        """Return the files to be read, in order of precedence."""
        looks = sorted(self.looks, key=lambda look: (look.claim.pattern, look.claim.stored.path))
        believed_us = believed_range([days for look in looks for days in look.days])
        return tuple(self._file(look, believed_us) for look in looks)

    def _file(self, look: Look, believed_us: tuple[int, int]) -> RecognisedFile:
        is_told_apart = look.dialect.is_long or bool(look.point)
        missing = [] if is_told_apart else unread_tags(self.export.tags, look.dialect.columns)
        evidence = [f"{look.encoding.shown}: {look.encoding.evidence}", *look.dialect.evidence]
        evidence += unit_faults(look.dialect, look.head, look.claim.stored.path, self.tags)[1]
        if look.dates_proven:
            evidence.append(f"its stamps can only be read {self.export.date_order}, as declared")
        elif not self.export.date_order.startswith("epoch"):
            evidence.append(
                f"stamps are read {self.export.date_order}, as declared; this file alone would not prove it"
            )
        if look.decimal_proven:
            mark = "comma" if self.export.decimal == "," else "point"
            evidence.append(f"its numbers have a decimal {mark}, as declared")
        if look.point:
            key = pattern_key(self.export.layout) if isinstance(self.export.layout, FilePerTag) else ""
            evidence.append(f'it holds the tag "{look.point}" (found by {key})')
        if look.dialect.pair_stamps:
            evidence.append(f"{len(look.dialect.pair_stamps)} pairs of columns, a stamp left of each value")
        if missing:
            evidence.append(f"it has no column for {', '.join(missing)}")
        if not look.is_ordered:
            evidence.append(
                "its rows run from new to old" if look.is_descending else "its rows are not in order of time"
            )
        first_us, last_us = range_of(look.days, believed_us)
        return RecognisedFile(
            claim=look.claim,
            encoding=look.encoding,
            dialect=look.dialect,
            first_us=first_us,
            last_us=last_us,
            believed_us=believed_us,
            is_whole=look.is_whole,
            is_ordered=look.is_ordered,
            is_descending=look.is_descending,
            stamp_format=look.stamp_format,
            evidence=tuple(evidence),
            point=look.point,
            proof=self._proof(),
        )

    def _proof(self) -> Proof:
        return Proof(
            any(look.dates_proven for look in self.looks), any(look.decimal_proven for look in self.looks)
        )

    def _missing_headings(self) -> list[Fault]:
        export = self.export
        headings = list(
            dict.fromkeys([name for look in self.looks for name in look.dialect.headings] + self.fields)
        )
        names, where = headings, f"exports.{export.name}"
        wanted = [(f"plant.toml, {where}.stamp_columns", name) for name in export.stamp_columns]
        if isinstance(export.layout, LongLayout):
            named = long_headings(export.layout)
            wanted = [(f"plant.toml, {where}.layout.{key}", name) for key, name in named.items()]
        elif isinstance(export.layout, FilePerTag):
            if self.looks or self.fields:
                wanted.append((f"plant.toml, {where}.layout.value", export.layout.value))
        else:
            wanted += [(_place_of(tag), tag.column) for _, tag in self._lost(headings)]
        faults = [
            _no_heading(place, name, names, self)
            for place, name in wanted
            if heading_key(name) not in headings
        ]
        has_points = isinstance(export.layout, LongLayout) and all(look.is_whole for look in self.looks)
        if (has_points and self.looks) or isinstance(export.layout, FilePerTag):
            points = list(dict.fromkeys(name for look in self.looks for name in look.long_names))
            points += self.points
            faults += [_no_heading(_place_of(tag), tag.column, points, self) for _, tag in self._lost(points)]
        return faults

    def _lost(self, headings: Sequence[str]) -> list[tuple[str, Tag]]:
        """Tags of which none of the headings was found, with the first one."""
        found = {tag_of(name) for name, tag in self.tags.items() if heading_key(tag.column) in headings}
        return [(name, tag) for name, tag in self.tags.items() if tag_of(name) == name and name not in found]

    def _contradictions(self) -> list[Fault]:
        faults = []
        key = f"exports.{self.export.name}"
        proof = self._proof()
        flipped = next((look for look in self.looks if look.date_flips > 1), None)
        dated = next((look for look in self.looks if look.date_contradiction), None)
        if not proof.dates and dated is not None and dated.date_contradiction is not None:
            found = dated.date_contradiction
            path, order = dated.claim.stored.path, self.export.date_order
            faults.append(contradicted(path, found, f"{key}.date_order", order))
        elif flipped is not None and flipped.date_contradiction is not None:
            found = flipped.date_contradiction
            faults.append(mixed_dates(flipped.claim.stored.path, found, self.export))
        doubtful = next((look for look in self.looks if look.grouped), None)
        pointed = next((look for look in self.looks if look.decimal_contradiction), None)
        if doubtful is not None and doubtful.grouped is not None:
            faults.append(grouped(doubtful.claim.stored.path, doubtful.grouped, self.export))
        elif not proof.decimal and pointed is not None and pointed.decimal_contradiction is not None:
            found = pointed.decimal_contradiction
            path, mark = pointed.claim.stored.path, self.export.decimal
            faults.append(contradicted(path, found, f"{key}.decimal", mark))
        bad = next((look for look in self.looks if look.bad_stamp is not None), None)
        if (
            not faults
            and bad is not None
            and bad.bad_stamp
            and not any(look.has_stamps for look in self.looks)
        ):
            line, text = bad.bad_stamp
            faults.append(
                Fault(
                    f"logs/{bad.claim.stored.path}:{line}, {key}.date_order",
                    f'no stamp of this export can be read; the first is "{text}"',
                    f"declare the order of the date ({key}.date_order) and, where the stamp is not the first"
                    f" column, {key}.stamp; names of months that are not English need {key}.month_names",
                )
            )
        return faults


def _place_of(tag: Tag) -> str:
    """Where the column of a tag is declared."""
    if not tag.line:
        return f"{tag.declared_in}, exports.{tag.export}.tags.{tag.name}.column"
    if tag.declared_in != "plant.toml":
        return f"{tag.declared_in}:{tag.line}, column column"
    return f"plant.toml:{tag.line}, exports.{tag.export}.tags.{tag.name}.column"


def _no_heading(place: str, name: str, names: Sequence[str], pool: _Pool) -> Fault:
    near = difflib.get_close_matches(heading_key(name), list(names), 3, 0.5)
    files = len(pool.looks) + len(pool.unopened)
    nearest = "nearest: " + ", ".join(f'"{word}"' for word in near) if near else "there is none like it"
    return Fault(
        place,
        f'"{name}" is in none of the {files} files of export {pool.export.name}; {nearest}',
        "write the name exactly as it stands in the export, or correct the export's files",
    )


def _unreadable(claim: Claim, reason: str) -> Finding:
    return Finding(
        FindingCode.UNREADABLE_FILE,
        export=claim.export or None,
        file=claim.stored.path,
        words={"reason": reason},
    )
