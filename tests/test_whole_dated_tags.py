"""A declared change of unit gives a demo month its hours back; a tag list audits like the plant file."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from site_factory import GAS_ENGINE, ROOT, audited, changed, export, figures, findings, instants, run

DEMO = ROOT / "sample_logs" / "emberlund"
CHANGES = "changes = [{ from = 2026-07-20, unit = 'K' }, { from = 2026-07-21T06:00:00, unit = 'degC' }]"
TRUTH = """
import json, sys
sys.path[:0] = [sys.argv[1], sys.argv[1] + "/.."]
import numpy as np
import waste_heat_truth as truth
from logger_tools import within
from waste_heat_logs import read_instruments
from waste_heat_plant import simulate
month = simulate()
readings = read_instruments(month)
kelvins = within(readings.minutes, *truth.KELVIN)
readings.values["TO-T1"] = readings.values["TO-T1"] - np.where(kelvins, 273.15, 0.0)
truth.KELVIN = (0, 0)
print(json.dumps(truth.truth_of(month, readings)["machines"]))
"""
"""The demo's own formulas, for a reader who knows which hours are in kelvin."""


def _declared() -> str:
    text = (DEMO / "plant.toml").read_text(encoding="utf-8")
    line = re.search(r"^tags[.]oil_hot.*[}]", text, re.MULTILINE)
    assert line is not None
    return text.replace(line[0], f"{line[0][:-1].rstrip()}, {CHANGES} }}")


@pytest.fixture(scope="module")
def month(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demo month with the thirty hours in kelvin declared."""
    folder = tmp_path_factory.mktemp("kelvin")
    shutil.copytree(DEMO / "logs", folder / "site" / "logs")
    (folder / "site" / "plant.toml").write_text(_declared(), encoding="utf-8")
    done = run("audit", folder / "site", "--out", folder / "out", "--month", "2026-07", "--quiet")
    assert done.code == 4, done.err  # an open balance: the oil flow reads 8 % high
    return folder / "out"


def test_the_hours_in_kelvin_come_back(month: Path) -> None:
    """No reading of the oil is out of range any more, and the coil's heat is covered like its source."""
    told = [each for each in findings(month) if each["code"] in ("out of range", "unit suspected")]
    assert not [each for each in told if each["tag"] == "oil_hot"]
    assert figures(month, "coil")["useful_heat_kWh"]["coverage_pct"] > 99.5


@pytest.mark.parametrize("machine", ["coil", "orc"])
def test_figures_are_those_of_the_instruments(month: Path, machine: str) -> None:
    """Every figure within its U of what the demo's own formulas make of the same readings."""
    done = subprocess.run(
        [sys.executable, "-c", TRUTH, str(DEMO)], capture_output=True, check=True, text=True
    )
    expected: dict[str, Any] = json.loads(done.stdout)[machine]["figures"]
    found = figures(month, machine)
    for key, each in expected.items():
        assert abs(found[key]["value"] - each["as_metered"]) <= max(found[key]["U"], 1e-9), key
        assert found[key]["coverage_pct"] == pytest.approx(each["coverage_pct"], abs=0.5), key


def test_what_no_fault_touches_holds_the_truth(month: Path) -> None:
    """Work, heat of the source and ceiling of the true plant lie within the published U."""
    truth = json.loads((DEMO / "truth.json").read_text(encoding="utf-8"))["machines"]
    for machine, key in (("orc", "work_gross_kWh"), ("orc", "ceiling_pct"), ("coil", "heat_in_kWh")):
        found = figures(month, machine)[key]
        assert abs(found["value"] - truth[machine]["figures"][key]["true"]) <= found["U"], key


def test_overlapping_headings_that_differ_are_a_conflict(tmp_path: Path) -> None:
    """Both headings hold the same stamps for ten minutes: equal ones are duplicates, one differs by 60 kW.

    The heading written first is kept, and the choice is worth 60 kW for a minute: 1 kWh.
    """
    plant = changed(
        GAS_ENGINE,
        ('column = "P"', 'column = ["P", "OR-P"]'),
        ('decimal = "."', 'decimal = "."\nwhen_stamps_repeat = "keep first"'),
    )
    seconds = instants("2025-06-03", "2025-06-04")
    old, new = (np.full(seconds.size, 1000.0) for _ in range(2))
    old[610:], new[:600], new[605] = np.nan, np.nan, 1060.0
    rest = {"G": 250.0, "F": 16.25, "S": 90.0, "R": 70.0}
    files = {"plant/a.csv": export(seconds, {"P": old, **rest, "OR-P": new})}
    out = audited(tmp_path, plant, files, "--from", "2025-06-03", "--to", "2025-06-03")
    assert figures(out)["work_gross_kWh"]["value"] == pytest.approx(24_000.0)
    (conflict,) = (each for each in findings(out) if each["code"] == "conflicting values")
    assert conflict["tag"] == "power" and conflict["energy_kWh"] == pytest.approx(1.0)
    assert not [each for each in findings(out) if each["code"] == "renamed column"]


def test_the_step_at_a_join_is_told(tmp_path: Path) -> None:
    """One file with the old heading, one with the new: both names, both readings and the step in the unit."""
    plant = changed(GAS_ENGINE, ('column = "S"', 'column = ["S", "S-neu"]'))
    rest = {"G": 250.0, "P": 1000.0, "F": 16.25, "R": 70.0}
    files = {
        "plant/a.csv": export(instants("2025-06-03", "2025-06-03T12:00"), {"S": 90.0, **rest}),
        "plant/b.csv": export(instants("2025-06-03T12:00", "2025-06-04"), {**rest, "S-neu": 92.5}),
    }
    out = audited(tmp_path, plant, files, "--from", "2025-06-03", "--to", "2025-06-03")
    assert len([each for each in findings(out) if each["code"] == "renamed column"]) == 1
    said = (out / "report.html").read_text(encoding="utf-8").replace("\u00a0", " ")
    assert "“S” ends and “S-neu” begins" in said
    assert "90.00 °C before, 92.50 °C after, a step of 2.500 °C" in said
