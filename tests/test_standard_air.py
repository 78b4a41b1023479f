"""Plant file and physics each hold the standard atmosphere, as neither may import the other: they agree."""

from __future__ import annotations

import numpy as np
import pytest

from auditor.physics import pressure_at_altitude_Pa
from auditor.plant_file.standard_air import standard_pressure_Pa


@pytest.mark.parametrize("altitude_m", [-400.0, 0.0, 40.0, 85.0, 500.0, 2000.0, 5000.0])
def test_both_formulas_give_the_same_pressure(altitude_m: float) -> None:
    """One formula (ISO 2533), written twice, to the last digits of a float."""
    assert standard_pressure_Pa(altitude_m) == pytest.approx(
        float(np.asarray(pressure_at_altitude_Pa(altitude_m))), rel=1e-12
    )
