"""A declared change of unit gives a demo month its hours back; a tag list audits like the plant file."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from site_factory import ROOT, figures, findings, run

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
    """No reading of the oil is out of range any more, and the coil's heat is covered as well as its source."""
    assert not [each for each in findings(month) if each["code"] in ("out of range", "unit suspected")]
    assert figures(month, "coil")["useful_heat_kWh"]["coverage_pct"] > 99.5


@pytest.mark.parametrize("machine", ["coil", "orc"])
def test_figures_are_those_of_the_instruments(month: Path, machine: str) -> None:
    """Every figure within its U of what the demo's own formulas make of the same readings."""
    done = subprocess.run([sys.executable, "-c", TRUTH, str(DEMO)], capture_output=True, check=True, text=True)
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
