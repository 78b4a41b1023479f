"""Noise, autocorrelation and limits against the GUM, statsmodels and simulated processes."""

from __future__ import annotations

import math

import numpy as np
import pytest

from auditor import physics


def first_order_process(correlation: float, length: int, rng: np.random.Generator) -> np.ndarray:
    """Return a stationary first-order process of unit variance."""
    from scipy.signal import lfilter

    shocks = rng.standard_normal(length + 500) * math.sqrt(1.0 - correlation**2)
    return lfilter([1.0], [1.0, -correlation], shocks)[500:]


def test_first_differences_find_the_noise_and_not_the_process() -> None:
    """Noise of 2 kW on a ramp, a slow swing and a few steps is found as 2 kW within 2 %."""
    rng = np.random.default_rng(1)
    t = np.arange(50_000)
    noise = rng.normal(0.0, 2.0, t.size)
    process = 720.0 + 0.01 * t + 200.0 * np.sin(t / 3000.0) + 100.0 * (t // 10_000)

    assert physics.first_difference_noise(noise + process) == pytest.approx(2.0, rel=0.02)
    # A load that rises steadily from 720 to 1200 kW has no noise at all, whatever its scatter.
    assert physics.first_difference_noise(np.linspace(720.0, 1200.0, 15)) < 1e-9


def test_first_difference_noise_is_a_scaled_median_absolute_deviation() -> None:
    """For whole columns with gaps it is scipy's robust scale of the differences over sqrt(2)."""
    from scipy.stats import median_abs_deviation

    rng = np.random.default_rng(2)
    samples = rng.normal(0.0, [1.0, 5.0, 0.1], (4000, 3))
    samples[rng.random(samples.shape) < 0.1] = np.nan

    scale = median_abs_deviation(np.diff(samples, axis=0), axis=0, scale="normal", nan_policy="omit")

    noise = physics.first_difference_noise(samples)
    np.testing.assert_allclose(noise, scale / math.sqrt(2.0), rtol=1e-12)


def test_too_few_differences_give_no_noise() -> None:
    """Nothing, one sample, a column of gaps: NaN and no warning; a repeated value gives zero."""
    columns = np.array([[1.0, np.nan, 7.0], [2.0, np.nan, 7.0], [np.nan, np.nan, 7.0], [3.0, 1.0, 7.0]])

    noise = physics.first_difference_noise(columns)

    assert np.isnan(noise).tolist() == [True, True, False]
    assert noise[2] == 0.0
    assert np.isnan(physics.first_difference_noise([]))
    assert np.isnan(physics.first_difference_noise(np.empty((0, 2)))).all()


def test_lag_one_autocorrelation_is_that_of_statsmodels() -> None:
    """The same coefficient but for the number of terms; missing samples do not bias it."""
    from statsmodels.tsa.stattools import acf

    rng = np.random.default_rng(3)
    process = first_order_process(0.8, 20_000, rng)
    gappy = np.where(rng.random(process.size) < 0.2, np.nan, process)

    assert physics.lag_one_autocorrelation(process) == pytest.approx(
        acf(process, nlags=1, adjusted=True)[1], abs=1e-6
    )
    assert physics.lag_one_autocorrelation(gappy) == pytest.approx(0.8, abs=0.02)
    assert np.isnan(physics.lag_one_autocorrelation([5.0, 5.0, 5.0, 5.0, 5.0]))
    assert np.isnan(physics.lag_one_autocorrelation([1.0, np.nan, 2.0, np.nan, 3.0]))


@pytest.mark.parametrize(("correlation", "factor"), [(0.5, 1.7), (0.8, 3.0), (0.9, 4.4)])
def test_correlated_noise_averages_out_more_slowly(correlation: float, factor: float) -> None:
    """The standard error of a long mean grows by sqrt((1 + r)/(1 - r)): 1.7, 3.0, 4.4."""
    count, means = 500, 2000
    rng = np.random.default_rng(4)
    process = first_order_process(correlation, count * means, rng).reshape(means, count)

    observed = np.std(process.mean(axis=1))
    effective = physics.effective_sample_count(count, correlation)

    assert math.sqrt(count / effective) == pytest.approx(factor, abs=0.06)
    assert observed == pytest.approx(1.0 / math.sqrt(effective), rel=0.05)


def test_effective_count_claims_neither_more_nor_less_than_there_is() -> None:
    """Never above the samples, never below one of them, nothing where there is none."""
    counts = physics.effective_sample_count([10.0, 10.0, 10.0, 0.0, 10.0], [-0.5, 0.0, 1.2, 0.5, np.nan])

    np.testing.assert_array_equal(counts, [10.0, 10.0, 1.0, 0.0, np.nan])


@pytest.mark.parametrize(
    ("limit", "printed", "half_digit"),
    [
        (0.40e-6, 0.23e-6, 0.005e-6),  # JCGM 100:2008 section 4.3.7, example 1 (recalled)
        (2e-6, 1.2e-6, 0.05e-6),  # JCGM 100:2008 section H.1.3.3: coefficient of the standard
        (1e-6, 0.58e-6, 0.005e-6),  # JCGM 100:2008 section H.1.3.5: difference of coefficients
        (0.05, 0.029, 0.0005),  # JCGM 100:2008 section H.1.3.6: difference of temperatures
    ],
)
def test_limits_become_the_standard_uncertainties_of_the_guide(
    limit: float, printed: float, half_digit: float
) -> None:
    """A rectangular limit is divided by the square root of three, as the guide prints it."""
    assert abs(physics.standard_from_limit(limit) - printed) <= half_digit


def test_resolution_becomes_a_standard_uncertainty() -> None:
    """A last digit of one unit is 0.29 of a unit, and so is the scatter of rounded numbers."""
    # JCGM 100:2008 section F.2.2.1: 0.29 of the resolution.
    rng = np.random.default_rng(5)
    values = rng.uniform(0.0, 1000.0, 100_000)

    assert physics.standard_from_resolution(1.0) == pytest.approx(0.29, abs=0.005)
    assert np.std(np.round(values) - values) == pytest.approx(physics.standard_from_resolution(1.0), rel=0.01)
