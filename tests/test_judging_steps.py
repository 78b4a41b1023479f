"""Steps in a figure are found and dated; ramps, noise and daily cycles are not called steps."""

from __future__ import annotations

import numpy as np
import pytest

from auditor.judging.steps import largest_steps

QUARTER_US = 900_000_000
TIMES_US = np.arange(31 * 96) * QUARTER_US


def month(rng: np.random.Generator, level: float = 0.20, noise: float = 0.01) -> np.ndarray:
    """A month of quarter-hours with white noise and a daily cycle of 1 %."""
    day = 2.0 * np.pi * np.arange(TIMES_US.size) / 96.0
    return level * (1.0 + 0.01 * np.sin(day) + noise * rng.standard_normal(TIMES_US.size))


@pytest.mark.parametrize("height", [0.08, -0.074, 0.19])
def test_a_step_is_dated_to_the_hour(height: float) -> None:
    """A flow meter that reads 8 % high, or a power switched from net to gross, shows at its hour."""
    values = month(np.random.default_rng(7))
    at = 16 * 96 + 40
    values[at:] *= 1.0 + height
    (step,) = largest_steps(TIMES_US, values)
    assert abs(step.index - at) <= 4
    assert step.after / step.before - 1.0 == pytest.approx(height, abs=0.01)


def test_two_steps_are_both_found() -> None:
    """Steps further apart than the compared record are separate findings, in order of time."""
    values = month(np.random.default_rng(8))
    values[8 * 96 :] *= 1.05
    values[20 * 96 :] *= 0.95
    assert [round(step.index / 96) for step in largest_steps(TIMES_US, values)] == [8, 20]


def test_a_ramp_is_no_step() -> None:
    """Fouling of 12 % over a month changes the level, but never at once."""
    values = month(np.random.default_rng(9)) * np.linspace(1.0, 0.88, TIMES_US.size)
    assert largest_steps(TIMES_US, values) == []


def test_the_weather_of_every_day_is_no_step() -> None:
    """A daily swing of 10 % about a level that shifts by 4 % with a warm spell is weather."""
    values = month(np.random.default_rng(11))
    hour = np.arange(TIMES_US.size) % 96 / 4.0
    values *= 1.0 - 0.05 * np.cos(2.0 * np.pi * (hour - 15.0) / 24.0)
    days = np.arange(TIMES_US.size) / 96.0
    values *= 1.0 - 0.04 * np.clip((days - 10.0) / 1.5, 0.0, 1.0)
    assert largest_steps(TIMES_US, values) == []


@pytest.mark.parametrize("seed", range(10))
def test_clean_months_have_no_step(seed: int) -> None:
    """Noise and a daily cycle alone raise no finding."""
    assert largest_steps(TIMES_US, month(np.random.default_rng(seed))) == []


def test_too_short_a_record_has_no_step() -> None:
    """A day of data cannot tell a step from weather."""
    assert largest_steps(TIMES_US[:96], month(np.random.default_rng(1))[:96]) == []
