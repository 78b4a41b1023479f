"""Creep at standstill and exports that contradict each other: from files to the published statement."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from site_factory import GAS_ENGINE, audited, changed, export, figures, findings, instants, one_day

QUARTER_HOURS = instants("2025-06-01", "2025-07-01", 900)
MONTHLY = changed(
    GAS_ENGINE.replace('hold = "1 min"', 'hold = "15 min"'),
    ('tick = "1 min"', 'tick = "15 min"'),
    ('interval = "15 min"', 'interval = "1 h"'),
)
"""The gas engine, logged every quarter of an hour."""


@pytest.mark.parametrize(
    ("creep_m3_per_h", "creep_kWh"), [(-0.8, 1600.0), (3.0, 6000.0), (0.0, None)], ids=str
)
def test_creep_at_standstill_stands_apart(
    tmp_path: Path, creep_m3_per_h: float, creep_kWh: float | None
) -> None:
    """June: 520 h at 250 m3/h are 130 000 m3, then 200 h of creep at 10 kWh/m3.

    By hand: 200 h x -0.8 m3/h = -160 m3 (-0.12 %), 1600 kWh; 200 h x 3 m3/h = 600 m3 (+0.46 %), 6000 kWh.
    Neither is fuel of the engine: 1 300 000 kWh and 40.0 % all the same.
    """
    still = np.arange(QUARTER_HOURS.size) >= 520 * 4
    columns = {"G": np.where(still, creep_m3_per_h, 250.0), "S": 90.0, "R": 70.0}
    columns |= {"P": np.where(still, 0.0, 1000.0), "F": np.where(still, 0.0, 16.25)}
    files = {"plant/a.csv": export(QUARTER_HOURS, columns)}
    out = audited(tmp_path, MONTHLY, files, "--month", "2025-06")
    found = figures(out)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(1_300_000.0, rel=1e-9)
    assert found["gross_pct"]["value"] == pytest.approx(40.0, rel=1e-9)
    told = findings(out)
    if creep_kWh is None:
        assert told == []
        return
    (creep,) = told
    assert (creep["code"], creep["stream"]) == ("creep at standstill", "fuel")
    assert creep["energy_kWh"] == pytest.approx(creep_kWh, rel=1e-9)
    assert creep["numbers"]["power_W"] == pytest.approx(creep_m3_per_h * 10_000.0, rel=1e-9)
    assert creep["numbers"]["standstill_s"] == 200 * 3600.0
    assert "leaks" in creep["check"]


DAY = "2025-06-03"
FULL_LOAD = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}


@pytest.mark.parametrize(
    ("first", "second", "energy_kWh"), [("month", "day", 24_000.0), ("day", "month", 23_990.0)]
)
def test_of_two_values_for_one_stamp_the_declared_one_counts(
    tmp_path: Path, first: str, second: str, energy_kWh: float
) -> None:
    """A daily export says 990 kW for one hour where the monthly one says 1000 kW.

    By hand: the pattern named first decides; the choice is worth 10 kWh; nothing is averaged to 995 kW.
    """
    minutes = instants(DAY, "2025-06-04")
    files = {
        "month/june.csv": export(minutes, FULL_LOAD),
        "day/03.csv": export(minutes[600:660], FULL_LOAD | {"P": 990.0}),
    }
    plant = changed(GAS_ENGINE, ('files = ["plant/*.csv"]', f'files = ["{first}/*.csv", "{second}/*.csv"]'))
    out = audited(tmp_path, plant, files, *one_day(DAY))
    assert figures(out)["work_gross_kWh"]["value"] == pytest.approx(energy_kWh, rel=1e-9)
    (conflict,) = findings(out)
    assert (conflict["code"], conflict["tag"]) == ("conflicting values", "power")
    assert conflict["energy_kWh"] == pytest.approx(10.0, rel=1e-9)
    assert conflict["numbers"]["count"] == 60
    assert conflict["file"].startswith(second) and conflict["words"]["kept"].startswith(first)
    assert conflict["from"].startswith(f"{DAY}T10:00")
