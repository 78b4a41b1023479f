"""The random part of a tick mean: what shrinks with samples, what telescopes, what is no noise at all."""

from __future__ import annotations

import math
from statistics import NormalDist

import numpy as np
import pytest
from cleaning_factory import Row, Setting, make_tag, run, series

from auditor.cleaning.noise import MAD_TO_STANDARD
from auditor.records.uncertain import Uncertainty


def random_numbers() -> np.random.Generator:
    """The same numbers in every test, whichever tests run."""
    return np.random.default_rng(20260701)


def samples(values: np.ndarray, step_s: float) -> list[Row]:
    """Rows of a tag at a fixed step."""
    return series("x", [(step_s * place, float(value)) for place, value in enumerate(values)])


def test_ratio_of_standard_to_median_absolute_deviation() -> None:
    """1/Phi^-1(3/4) of the normal distribution (checked against the standard library)."""
    assert pytest.approx(1.0 / NormalDist().inv_cdf(0.75), rel=1e-14) == MAD_TO_STANDARD


@pytest.mark.parametrize("per_tick", [1, 4, 60])
def test_a_declared_random_part_falls_with_the_root_of_the_samples(per_tick: int) -> None:
    """S / sqrt(n), JCGM 100:2008 4.2.3; absolute and relative parts add in quadrature."""
    tag = make_tag("x", "step", random=Uncertainty(3.0, 0.04, "declared"), hold_s=120.0)
    table, _ = run(Setting([tag]), samples(np.full(60 * per_tick, 100.0), 60.0 / per_tick))
    assert table.noise[:, 0] == pytest.approx(5.0 / math.sqrt(per_tick), rel=1e-12)
    assert table.noise_lag1[0] == 0.0


@pytest.mark.parametrize("per_tick", [1, 6])
def test_scatter_is_estimated_from_the_ticks(per_tick: int) -> None:
    """White noise of standard deviation 2 leaves 2/sqrt(n) in the mean of n samples.

    The median of 1440 second differences scatters by about 4 %, the mean of ten days' by 1.3 %.
    """
    values = 500.0 + random_numbers().normal(0.0, 2.0, 14_400 * per_tick)
    tag = make_tag("x", "step", hold_s=120.0)
    table, _ = run(Setting([tag], hours=240.0), samples(values, 60.0 / per_tick))
    assert np.mean(table.noise[:, 0]) == pytest.approx(2.0 / math.sqrt(per_tick), rel=0.05)


def test_movement_of_the_process_is_no_noise() -> None:
    """A ramp has none; a slow swing of +-200 about noise of 1 is not taken for noise."""
    ramp = np.linspace(720.0, 1200.0, 1440)
    tag = make_tag("x", "step", hold_s=120.0)
    table, _ = run(Setting([tag], hours=24.0), samples(ramp, 60.0))
    assert table.noise[:, 0].max() < 1e-9
    swing = (
        1000.0
        + 200.0 * np.sin(np.arange(1440) / 1440 * 2 * math.pi * 6)
        + random_numbers().normal(0.0, 1.0, 1440)
    )
    table, _ = run(Setting([tag], hours=24.0), samples(swing, 60.0))
    assert table.noise[0, 0] == pytest.approx(1.0, rel=0.1)


def test_time_at_rest_does_not_hide_the_noise_of_running() -> None:
    """Exact zeros for most of the day leave the estimate to the rest of it."""
    values = np.where(np.arange(1440) < 1000, 0.0, 500.0 + random_numbers().normal(0.0, 2.0, 1440))
    table, _ = run(Setting([make_tag("x", "step", hold_s=120.0)], hours=24.0), samples(values, 60.0))
    assert table.noise[0, 0] == pytest.approx(2.0, rel=0.15)


def test_each_local_day_has_its_own_noise() -> None:
    """A sensor that becomes noisy on the second day is noisy on the second day."""
    values = random_numbers().normal(0.0, 1.0, 2880) * np.repeat([1.0, 10.0], 1440)
    table, _ = run(Setting([make_tag("x", "step", hold_s=120.0)], hours=48.0), samples(values, 60.0))
    assert table.noise[0, 0] == pytest.approx(1.0, rel=0.1)
    assert table.noise[-1, 0] == pytest.approx(10.0, rel=0.1)


@pytest.mark.parametrize("declared", [True, False])
def test_quantisation_of_a_counter_telescopes(declared: bool) -> None:
    """Errors of whole steps: q/sqrt(6) over the tick, one tick against the next -1/2, by simulation.

    The error of a reading is rectangular, q/sqrt(12) (JCGM 100:2008 F.2.2.1: 0.29 of a step); that of a
    difference is sqrt(2) times that.
    """
    rate = 17.3 + random_numbers().uniform(-0.5, 0.5, 2880)
    true = np.concatenate(([0.4], 0.4 + np.cumsum(rate)))
    shown = np.floor(true)
    tag = make_tag("x", "counter", resolution=1.0 if declared else None, hold_s=120.0)
    table, _ = run(Setting([tag], hours=48.0), samples(shown, 60.0))
    error = table.mean[:, 0] - rate / 60.0
    predicted = float(np.median(table.noise[:, 0]))
    assert predicted == pytest.approx(1.0 / math.sqrt(6.0) / 60.0, rel=1e-9 if declared else 0.25)
    if declared:
        assert np.std(error) == pytest.approx(predicted, rel=0.05)
    assert np.corrcoef(error[:-1], error[1:])[0, 1] == pytest.approx(-0.5, abs=0.05)
    assert table.noise_lag1[0] == -0.5


def test_a_slow_input_counts_once_per_sample_not_once_per_tick() -> None:
    """Five ticks to a sample: with r = (m - 1)/(m + 1) the mean of a day has the error of its 288 samples."""
    values = random_numbers().normal(0.0, 3.0, 288)
    tag = make_tag("x", "step", hold_s=600.0, random=Uncertainty(3.0, 0.0, "declared"))
    table, _ = run(Setting([tag], hours=24.0), samples(values, 300.0))
    lag1 = table.noise_lag1[0]
    assert lag1 == pytest.approx(2.0 / 3.0)
    of_day = table.noise[0, 0] / math.sqrt(1440.0) * math.sqrt((1.0 + lag1) / (1.0 - lag1))
    assert of_day == pytest.approx(3.0 / math.sqrt(288.0), rel=1e-12)


def test_a_slow_input_is_estimated_at_its_own_step() -> None:
    """The scatter of samples every five minutes is seen although most ticks repeat their neighbour."""
    tag = make_tag("x", "step", hold_s=600.0)
    table, _ = run(Setting([tag], hours=48.0), samples(random_numbers().normal(0.0, 3.0, 576), 300.0))
    assert table.noise[0, 0] == pytest.approx(3.0, rel=0.15)


@pytest.mark.parametrize(
    ("between", "fields", "expected"),
    [
        ("step", {"deadband": 5.0}, 5.0 / math.sqrt(3.0)),
        ("step", {"resolution": 0.1}, 0.1 / math.sqrt(12.0)),
        ("step", {"deadband": 5.0, "resolution": 2.0}, math.sqrt(25.0 / 3.0 + 4.0 / 12.0)),
        ("amount", {"resolution": 6.0, "stamp_marks": "end"}, 6.0 / math.sqrt(12.0) / 60.0),
    ],
)
def test_dead_band_and_resolution_are_rectangular(
    between: str, fields: dict[str, object], expected: float
) -> None:
    """The dead band, or half a step of resolution, as limit over sqrt(3) (JCGM 100:2008 4.3.7)."""
    table, _ = run(Setting([make_tag("x", between, hold_s=120.0, **fields)]), samples(np.full(62, 7.0), 60.0))
    assert table.noise[1:, 0] == pytest.approx(np.full(59, expected), rel=1e-12)


def test_the_uncovered_part_of_a_tick_adds_the_usual_change_between_ticks() -> None:
    """A tick half covered stands for the whole with half the usual change of a minute."""
    ramp = [(30.0 * place, float(place)) for place in range(120)]  # rises by 2 in a minute
    rows = series("x", [pair for pair in ramp if pair[0] != 1830.0])
    table, _ = run(Setting([make_tag("x", "step", hold_s=30.0)]), rows)
    assert table.covered_s[30, 0] == 30.0
    change = MAD_TO_STANDARD * 2.0
    assert table.noise[30, 0] == pytest.approx(math.hypot(table.noise[29, 0], 0.5 * change), rel=1e-6)
    assert table.noise[29, 0] < 0.5


def test_states_have_no_noise_and_uncovered_ticks_no_number() -> None:
    """NaN goes with NaN."""
    tag = make_tag("x", "state", hold_s=600.0, states={"0": "off", "1": "on"})
    table, _ = run(Setting([tag]), samples(np.array([0.0, 1.0]), 600.0))
    assert (table.noise[:20] == 0.0).all()
    assert np.isnan(table.noise[20:]).all()
