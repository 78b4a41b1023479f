"""What cleaning notices by itself: gaps, words, ranges; and where the examples in the ledger come from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from cleaning_factory import Row, Setting, cells, make_block, make_tag, of_code, run, series, us

from auditor.cleaning import CleaningSettings, clean
from auditor.records.findings import FindingCode
from auditor.records.machines import (
    CombustionAir,
    FlowAndTemperatures,
    GasVolume,
    Machine,
    Power,
    Role,
    Running,
    SameAs,
    Stream,
    Way,
)
from auditor.records.plant import GasMeter, Plant
from auditor.records.samples import Disposition


def minutes(*names: str, without: range = range(0), last: int = 60) -> list[Row]:
    """One row a minute with every tag, some rows left out."""
    return [Row(60.0 * m, dict.fromkeys(names, 1.0)) for m in range(last) if m not in without]


def test_tags_of_an_export_that_vanish_together_share_a_finding() -> None:
    """One gap of the logger is one finding, with the largest energy that its tags touch."""
    tags = [
        make_tag("power", "line", hold_s=120.0, scale=1e6, si_unit="W"),
        make_tag("warmth", "step", hold_s=120.0),
        make_tag("slow", "step", hold_s=3600.0),
    ]
    rows = minutes("power", "warmth", "slow", without=range(20, 40))
    _, findings = run(Setting(tags), rows)
    (gap,) = of_code(findings, FindingCode.GAP)
    assert (gap.start_us, gap.end_us) == (us(19 * 60), us(40 * 60))
    assert gap.words == {"tags": "power, warmth", "kind": "gap"}
    assert gap.numbers == {"gap_s": 21 * 60.0, "tags": 2}
    assert gap.energy_J == pytest.approx(1e6 * 21 * 60.0)
    assert (gap.export, gap.tag) == ("logger", None)


def test_short_pauses_are_no_gaps() -> None:
    """Neither a few ticks nor anything within the hold is told of."""
    for hold_s, pause in ((60.0, 2), (600.0, 9)):
        rows = minutes("x", without=range(20, 20 + pause))
        _, findings = run(Setting([make_tag("x", "step", hold_s=hold_s)]), rows)
        assert not of_code(findings, FindingCode.GAP)


def test_late_start_and_early_end() -> None:
    """What is missing at the edges of the period has its own word."""
    rows = [row for row in minutes("x") if 600 <= row.second < 1800]
    _, findings = run(Setting([make_tag("x", "step", hold_s=120.0)]), rows)
    found = of_code(findings, FindingCode.GAP)
    assert [(gap.words["kind"], gap.numbers["gap_s"]) for gap in found] == [
        ("late start", 600.0),
        ("early end", 1860.0),
    ]
    assert found[0].tag == "x"


def test_an_export_without_any_sample_is_one_finding() -> None:
    """Absent blocks are like blocks without rows."""
    setting = Setting([make_tag("x", "step"), make_tag("y", "line")])
    for given in ({}, {"logger": [make_block([], ["x", "y"])]}):
        table, findings = clean(given, setting.settings, setting.grid)
        assert [finding.words["tags"] for finding in findings] == ["x, y"]
        assert table.cells.raw_cells.tolist() == [0, 0]


def test_many_gaps_are_told_of_in_few_findings() -> None:
    """The longest stand alone, the rest is summed up."""
    rows = series("x", [(600.0 * place, 1.0) for place in range(144)])
    _, findings = run(Setting([make_tag("x", "step", hold_s=60.0)], hours=24.0), rows)
    assert len(findings) == 20
    assert findings[-1].words["kind"] == "many"
    assert sum(finding.numbers["gap_s"] for finding in findings) == 144 * 600.0


def test_status_words_and_ranges_are_counted_per_tag_with_their_places() -> None:
    """Words stand verbatim, most frequent first; examples name file, line and raw text."""
    tag = make_tag("x", "step", believable=(0.0, 10.0), scale=2.0, hold_s=120.0)
    words = ["Störung", "Bad", "Bad", 6.0, 1.0, "", -1.5]
    table, findings = run(Setting([tag]), series("x", [(60.0 * m, cell) for m, cell in enumerate(words)]))
    (spoken,) = of_code(findings, FindingCode.STATUS_WORDS)
    (out,) = of_code(findings, FindingCode.OUT_OF_RANGE)
    assert spoken.numbers == {"count": 3}
    assert spoken.words == {"first": "Störung", "last": "Bad", "words": "Bad, Störung"}
    assert (spoken.file, spoken.line, spoken.start_us) == ("a/one.csv", 2, us(0.0))
    assert out.words == {"first": "6", "last": "-1.5"}
    assert (out.line, out.end_us) == (5, us(360.0) + 1)
    assert cells(table, "x") == {"used": 1, "empty": 1, "status word": 3, "out of range": 2}
    assert dict(table.cells.words["x"]) == {"Bad": 2, "Störung": 1}
    last = table.cells.last["x", Disposition.OUT_OF_RANGE]
    assert (last.file, last.line, last.instant_us, last.raw) == ("a/one.csv", 8, us(360.0), "-1.5")


def test_blocks_out_of_order_are_refused() -> None:
    """The contract of reading is checked, not trusted."""
    setting = Setting([make_tag("x", "step")])
    blocks = [make_block(minutes("x")[30:], ["x"]), make_block(minutes("x")[:30], ["x"])]
    with pytest.raises(ValueError, match="order of time"):
        clean({"logger": blocks}, setting.settings, setting.grid)


def test_rejects_are_found_by_file_and_line_in_any_order_of_rows() -> None:
    """Lines of a newest-first file fall while time rises; a reject still stands at its own stamp."""
    setting = Setting([make_tag("x", "step", hold_s=3600.0)])
    block = make_block(series("x", {0: 1.0, 600: "Bad", 1200: 2.0, 1800: 3.0}), ["x"])
    turned = replace(block, line=block.line[::-1].copy(), rejects=replace(block.rejects, line=np.array([4])))
    for given in (block, turned):
        table, _ = clean({"logger": [given]}, setting.settings, setting.grid)
        assert table.covered_s[:, 0].tolist() == [60.0] * 10 + [0.0] * 10 + [60.0] * 40
        assert table.cells.first["x", Disposition.STATUS_WORD].instant_us == us(600.0)


def test_a_reject_of_a_file_without_rows_breaks_nothing() -> None:
    """It is counted, but its time is not known."""
    setting = Setting([make_tag("x", "step", hold_s=3600.0)])
    block = make_block(series("x", {0: 1.0, 600: "Bad", 1200: 2.0}), ["x"])
    other = replace(block.rejects, source=np.array([1], dtype=np.int16))
    for line in (1, 3, 99):
        given = replace(block, rejects=replace(other, line=np.array([line])))
        table, _ = clean({"logger": [given]}, setting.settings, setting.grid)
        assert table.covered_s.sum() == 3600.0
        assert table.cells.first["x", Disposition.STATUS_WORD].instant_us is None
        assert cells(table, "x") == {"used": 2, "status word": 1}


def test_rows_far_outside_the_period_are_counted_and_left() -> None:
    """They cost nothing but their place in the ledger."""
    setting = Setting([make_tag("x", "line", hold_s=300.0)])
    rows = series("x", [(60.0 * m, 1.0) for m in range(-120, 180)])
    table, findings = run(setting, rows, [50, 110, 250])
    assert cells(table, "x") == {"used": 60, "outside period": 239, "carried in": 1}
    assert table.cells.first["x", Disposition.OUTSIDE_PERIOD].instant_us == us(-7200.0)
    assert table.cells.last["x", Disposition.OUTSIDE_PERIOD].instant_us == us(179 * 60.0)
    assert not findings


def plant_of(*machines: Machine) -> Plant:
    """A plant of which only machines and meters matter here."""
    meter = GasMeter("meter", "operating volume", "pressure", "gas_warmth", None)
    parts = {machine.name: machine for machine in machines}
    empty: dict[str, object] = dict.fromkeys(
        ("path", "folder", "text", "site", "rules", "exports", "tags", "fluids", "fuels")
    )
    return Plant(gas_meters={"meter": meter}, machines=parts, distrust=(), **empty)  # type: ignore[arg-type]


def machine_of(name: str, **ways: Way) -> Machine:
    """A machine with streams by name."""
    streams = {stream: Stream(stream, name, Role.HEAT_IN, way) for stream, way in ways.items()}
    fields: dict[str, object] = dict.fromkeys(
        ("title", "kind", "basis", "headline", "rated_power_W", "minimum_load", "steady", "ceiling")
    )
    return Machine(name=name, running=Running("power", 1.0, None), streams=streams, **fields)  # type: ignore[arg-type]


def test_settings_know_which_machines_use_a_tag() -> None:
    """Also through a gas meter, and through a stream shared with another machine."""
    coil = machine_of("coil", oil=SameAs("engine", "oil"), air=CombustionAir("gas", "oxygen", "outdoors"))
    engine = machine_of(
        "engine",
        gas=GasVolume("natural", "index", "meter"),
        oil=FlowAndTemperatures("flow", None, "hot", "cold", "oil"),
        power=Power("power", "terminals"),
    )
    settings = CleaningSettings.from_plant(plant_of(coil, engine))
    assert settings.users == {
        "flow": ("coil", "engine"),
        "hot": ("coil", "engine"),
        "cold": ("coil", "engine"),
        "oxygen": ("coil",),
        "outdoors": ("coil",),
        "index": ("engine",),
        "pressure": ("engine",),
        "gas_warmth": ("engine",),
        "power": ("engine",),
    }
    assert set(settings.running) == {"coil", "engine"}
