"""Files of a month arrive in any order, late ones too: the end is the same bytes as one clean run."""

from __future__ import annotations

from itertools import permutations
from pathlib import Path

import pytest
from site_factory import GAS_ENGINE, changed, digests, export, instants, run, site

PLANT = changed(GAS_ENGINE, ('interval = "15 min"', 'interval = "1 h"'), ('tick = "1 min"', 'tick = "5 min"'))
COLUMNS = {"G": 250.0, "F": 16.25, "S": 90.0, "R": 70.0}
FILES = {
    f"plant/{name}.csv": export(instants(start, end), COLUMNS | {"P": power_kW})
    for name, start, end, power_kW in (
        ("2025-06-02", "2025-06-02", "2025-06-03", 1000.0),
        ("2025-06-03", "2025-06-03", "2025-06-04", 900.0),
        ("correction", "2025-06-03T12:00", "2025-06-03T13:00", 950.0),
    )
}
"""Two days, and a later file that contradicts an hour of the second."""


def published(place: Path) -> dict[str, str]:
    """Digests of all outputs of June."""
    return digests(place / "audit" / "2025-06")


@pytest.fixture(scope="module")
def clean(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """June audited once, with all of its files there."""
    place = site(tmp_path_factory.mktemp("clean") / "works", PLANT, FILES)
    run("nightly", place, "--quiet")
    return published(place)


@pytest.mark.parametrize("order", list(permutations(FILES)), ids=", then ".join)
def test_order_of_arrival_does_not_change_a_byte(
    tmp_path: Path, clean: dict[str, str], order: tuple[str, ...]
) -> None:
    """One more file each night: the last night publishes what one clean run would have."""
    place = site(tmp_path / "works", PLANT, {})
    for name in order:
        path = place / "logs" / name
        path.parent.mkdir(exist_ok=True)
        path.write_bytes(FILES[name])
        run("nightly", place, "--quiet")
    assert published(place) == clean
    assert "statement.json" in clean and "report.html" in clean
