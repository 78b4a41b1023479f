"""Pairs of thermometers that are perhaps swapped: asked about by the role of the stream, never corrected."""

from __future__ import annotations

import numpy as np
import pytest
from metering_factory import (
    CELSIUS,
    declared_fluid,
    make_machine,
    make_settings,
    make_tag,
    make_ticks,
    stream_W,
)

from auditor.metering import meter
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import FlowAndTemperatures, Role, Running

TICKS = 120


def asked(role: Role, inlet_C: object, outlet_C: object, flow: object = 2.0) -> list[Finding]:
    """Questions about one stream of 4 kJ/(kg K) over two hours."""
    way = FlowAndTemperatures("flow", None, "cold_pipe", "hot_pipe", "fluid")
    machine = make_machine("unit", {"heat": (role, way)}, running=Running("speed", 1.0, None))
    tags = [make_tag(name) for name in ("flow", "cold_pipe", "hot_pipe", "speed")]
    settings = make_settings(tags, machine, fluids={"fluid": declared_fluid(4000.0)})
    means = {
        "flow": flow,
        "cold_pipe": np.asarray(inlet_C) + CELSIUS,
        "hot_pipe": np.asarray(outlet_C) + CELSIUS,
        "speed": 10.0,
    }
    table, findings = meter(make_ticks(means, ticks=TICKS), settings)
    found = [each for each in findings if each.code is FindingCode.SWAPPED_PAIR]
    if found:
        assert (stream_W(table, "unit.heat") < 0.0).any()
    return found


@pytest.mark.parametrize(
    ("role", "inlet_C", "outlet_C", "question"),
    [
        (Role.USEFUL_HEAT, 70.0, 90.0, False),
        (Role.USEFUL_HEAT, 90.0, 70.0, True),
        (Role.REJECTED_HEAT, 25.0, 32.0, False),
        (Role.REJECTED_HEAT, 32.0, 25.0, True),
        (Role.HEAT_IN, 275.0, 185.0, False),
        (Role.HEAT_IN, 185.0, 275.0, True),
    ],
)
def test_which_pipe_is_the_warmer_one_is_by_role(
    role: Role, inlet_C: float, outlet_C: float, question: bool
) -> None:
    """Common practice, no source: heating supply above return, cooling return above supply, source cooled."""
    found = asked(role, inlet_C, outlet_C)
    assert bool(found) is question
    if question:
        (finding,) = found
        assert finding.numbers["share_of_time"] == 1.0
        assert finding.numbers["apart_K"] == pytest.approx(abs(outlet_C - inlet_C))
        assert finding.energy_J == pytest.approx(2.0 * 4000.0 * abs(outlet_C - inlet_C) * TICKS * 60.0)
        assert finding.suspects == ("cold_pipe", "hot_pipe")


def test_less_than_most_of_the_time_or_within_a_kelvin_is_no_question() -> None:
    """Storage that discharges for an hour of two; thermometers that cross by 0.5 K; a flow that stands."""
    wrong_half = np.where(np.arange(TICKS) < TICKS // 2, 90.0, 50.0)
    assert not asked(Role.USEFUL_HEAT, wrong_half, 70.0)
    assert not asked(Role.USEFUL_HEAT, 70.5, 70.0)
    assert not asked(Role.USEFUL_HEAT, 90.0, 70.0, flow=0.0)
