"""Calibration after an exchange of the instrument: independent of the one before."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from metering_factory import START_US, TICK_US, make_machine, make_settings, make_tag, make_ticks, stream_W
from site_factory import (
    GAS_ENGINE,
    POWER_TAG,
    audited,
    changed,
    export,
    figures,
    findings,
    instants,
    statement,
)

from auditor.metering import meter, meter_moved
from auditor.records.machines import Power, Role, Running
from auditor.records.plant import Tag, TagChange
from auditor.records.powers import Move
from auditor.records.uncertain import Uncertainty


def exchanged(tag: Tag, tick: int, relative: float) -> Tag:
    """The tag with another instrument from a tick on."""
    then = replace(tag, calibration=Uncertainty(0.0, relative, "declared anew"))
    return replace(tag, changes=(TagChange(START_US + TICK_US * tick, "2025-10-02", then, True),))


def test_each_calibration_moves_its_own_stretch() -> None:
    """Moving the first leaves the ticks after the exchange as they are, and the other way round."""
    tag = exchanged(make_tag("power", relative=0.01), 2, 0.02)
    machine = make_machine(
        "m",
        {"power": (Role.WORK_OUT, Power("power", "generator terminals"))},
        running=Running("power", 1.0, None),
    )
    settings = make_settings([tag], machine)
    ticks = make_ticks({"power": 100.0}, ticks=4)
    table, _ = meter(ticks, settings)
    keys = ["calibration:power", "calibration:power@2025-10-02"]
    assert [source.key for source in table.all_sources] == keys
    moved = [stream_W(meter_moved(ticks, settings, Move(key, 1.0), table), "m.power") for key in keys]
    assert moved[0] == pytest.approx(np.array([101.0, 101.0, 100.0, 100.0]))
    assert moved[1] == pytest.approx(np.array([100.0, 100.0, 102.0, 102.0]))


def test_an_exchange_outside_the_period_is_no_source() -> None:
    """Only the instrument that was read in the period can be off."""
    tag = exchanged(make_tag("power", relative=0.01), -5, 0.02)
    machine = make_machine(
        "m",
        {"power": (Role.WORK_OUT, Power("power", "generator terminals"))},
        running=Running("power", 1.0, None),
    )
    table, _ = meter(make_ticks({"power": 100.0}, ticks=4), make_settings([tag], machine))
    assert [source.key for source in table.all_sources] == ["calibration:power@2025-10-02"]


@pytest.mark.parametrize(
    ("changes", "percent"),
    [("", 0.60), (', changes = [{ from = 2025-06-04, standard = "0.3 %" }]', 0.3 * 2.0 / np.sqrt(2.0))],
)
def test_half_and_half_of_two_meters(tmp_path: Path, changes: str, percent: float) -> None:
    """Own working: u = 0.3 % coherent over two equal days gives U = 0.60 %; two meters 0.42 %.

    ``sqrt((0.3 % E/2)**2 + (0.3 % E/2)**2) = 0.212 % E``, k = 2: JCGM 100:2008, 5.1.2.
    """
    tag = POWER_TAG.replace('"0.5 %" }', f'"0.3 %"{changes} }}')
    files = {
        "plant/a.csv": export(
            instants("2025-06-03", "2025-06-05"), {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
        )
    }
    plant = changed(GAS_ENGINE, (POWER_TAG, tag))
    out = audited(tmp_path, plant, files, "--from", "2025-06-03", "--to", "2025-06-04")
    work = figures(out)["work_gross_kWh"]
    assert work["value"] == pytest.approx(48_000.0)
    assert 100.0 * work["U"] / work["value"] == pytest.approx(percent, rel=1e-6)
    assert f"{percent:.2f}" == ("0.42" if changes else "0.60")
    page = (out / "report.html").read_text(encoding="utf-8")
    assert ("from 2025-06-04 on" in page) == bool(changes)
    assert statement(out) and not [each for each in findings(out) if each["code"] == "counter reset"]
