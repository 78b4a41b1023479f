"""Statistics of sampled readings: noise, what is left of a sample count, limits as uncertainties."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import FloatArray, as_float, scalar_or_array

_QUARTILE_OF_NORMAL: Final = 0.6744897501960817
"""Half of a normal sample lies within this many standard deviations of its median."""


def first_difference_noise(samples: ArrayLike) -> FloatArray:
    """Noise of a reading as a standard deviation, untouched by movement of the process.

    ``s = median(|d - median(d)|) / (0.6745 sqrt(2))`` with the differences
    ``d`` of neighbouring samples: a slow ramp shifts all of them alike and a
    few jumps do not move a median, so what is left is the scatter of one
    sample about a smooth course. It assumes noise without memory; noise that
    is correlated from sample to sample with ``r`` reads low by
    ``sqrt(1 - r)``. A signal that mostly repeats its last value (dead band,
    coarse resolution) gives zero and needs a declared figure instead.

    Parameters
    ----------
    samples : array_like, shape (n,) or (n, k) [any unit]
        Readings in order of time, one column per signal. A difference over a
        NaN is left out.

    Returns
    -------
    ndarray, shape () or (k,) [unit of the samples]
        NaN where fewer than three differences are left.

    Source
    ------
    von Neumann, Kent, Bellinson and Hart, Annals of Mathematical Statistics 12
    (1941) 153, for the use of successive differences; Hampel, Journal of the American Statistical
    Association 69 (1974) 383, for the median absolute deviation.

    Examples
    --------
    >>> ramp = np.arange(1000.0)
    >>> first_difference_noise(ramp)
    np.float64(0.0)
    """
    differences = np.diff(as_float(samples), axis=0)
    spread = _median(np.abs(differences - _median(differences)))
    enough = np.sum(np.isfinite(differences), axis=0) >= 3
    noise = spread / (_QUARTILE_OF_NORMAL * math.sqrt(2.0))
    return scalar_or_array(np.where(enough, noise, np.nan))


def lag_one_autocorrelation(samples: ArrayLike) -> FloatArray:
    """Correlation of each sample with the one before it.

    ``r = sum((x_t - m)(x_{t-1} - m)) / sum((x_t - m)**2)``, scaled by the
    number of terms in each sum where samples are missing.

    Parameters
    ----------
    samples : array_like, shape (n,) or (n, k) [any unit]
        Readings at even steps, one column per signal; NaN is left out.

    Returns
    -------
    ndarray, shape () or (k,) [1]
        NaN for a constant signal or fewer than three pairs.

    Source
    ------
    Box, Jenkins and Reinsel, Time Series Analysis, chapter 2.

    Examples
    --------
    >>> lag_one_autocorrelation([1.0, -1.0, 1.0, -1.0, 1.0, -1.0]).round(2)
    np.float64(-1.0)
    """
    values = as_float(samples)
    known = np.isfinite(values)
    pairs = known[1:] & known[:-1]
    count, pair_count = np.sum(known, axis=0), np.sum(pairs, axis=0)
    filled = np.where(known, values, 0.0)
    mean = np.sum(filled, axis=0) / np.maximum(count, 1)
    deviation = np.where(known, values - mean, 0.0)
    variance = np.asarray(np.sum(deviation**2, axis=0) / np.maximum(count, 1))
    covariance = np.sum(deviation[1:] * deviation[:-1], axis=0) / np.maximum(pair_count, 1)
    correlation = np.full_like(variance, np.nan)
    np.divide(covariance, variance, out=correlation, where=(variance > 0.0) & (pair_count >= 3))
    return scalar_or_array(correlation)


def effective_sample_count(count: ArrayLike, autocorrelation: ArrayLike) -> FloatArray:
    """Count of independent samples that carry as much as ``count`` correlated ones.

    ``n_eff = n (1 - r) / (1 + r)``, at least one. A negative ``r`` is taken
    as zero: correlated noise is never used to claim more than was sampled.

    Parameters
    ----------
    count : array_like, shape (n,) or scalar [1]
        Samples in the mean.
    autocorrelation : array_like, shape (n,) or scalar [1]
        Correlation of neighbouring samples; 1 or more leaves one sample.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where an input is NaN; never above ``count``, never below one
        where there is a sample.

    Source
    ------
    Bayley and Hammersley, Supplement to the Journal of the Royal Statistical
    Society 8 (1946) 184, for a first-order process and a long mean.

    Examples
    --------
    >>> effective_sample_count(15.0, 0.5)
    np.float64(5.0)
    """
    samples = as_float(count)
    memory = np.clip(as_float(autocorrelation), 0.0, 1.0)
    independent = samples * (1.0 - memory) / (1.0 + memory)
    return scalar_or_array(np.maximum(independent, np.minimum(samples, 1.0)))


def standard_from_limit(limit: ArrayLike) -> FloatArray:
    """Uncertainty (one standard) that a class limit stands for, ``u = a / sqrt(3)``.

    Parameters
    ----------
    limit : array_like, shape (n,) or scalar [any unit]
        Half-width ``a`` of the interval that is said to hold the value.

    Returns
    -------
    ndarray, shape (n,) [unit of the limit]
        NaN where the limit is NaN.

    Source
    ------
    JCGM 100:2008, section 4.3.7 (rectangular distribution).

    Examples
    --------
    >>> standard_from_limit(0.3).round(4)
    np.float64(0.1732)
    """
    return scalar_or_array(as_float(limit) / math.sqrt(3.0))


def standard_from_resolution(resolution: ArrayLike) -> FloatArray:
    """Uncertainty (one standard) of a reading's last step, ``u = q / sqrt(12)``.

    Parameters
    ----------
    resolution : array_like, shape (n,) or scalar [any unit]
        Smallest step ``q`` that is shown or stored.

    Returns
    -------
    ndarray, shape (n,) [unit of the resolution]
        NaN where the resolution is NaN.

    Source
    ------
    JCGM 100:2008, section F.2.2.1.

    Examples
    --------
    >>> standard_from_resolution(1.0).round(4)
    np.float64(0.2887)
    """
    return scalar_or_array(as_float(resolution) / math.sqrt(12.0))


def _median(values: FloatArray) -> FloatArray:
    # np.nanmedian warns about a column of nothing but NaN; sorting puts NaN last without a word.
    ordered = np.sort(values, axis=0)
    count = np.sum(np.isfinite(values), axis=0)
    if len(ordered) == 0:
        return np.full(values.shape[1:], np.nan)
    low = np.expand_dims(np.maximum((count - 1) // 2, 0), 0)
    high = np.expand_dims(np.maximum(count // 2, 0), 0)
    high = np.minimum(high, np.maximum(np.expand_dims(count - 1, 0), 0))
    middle = np.take_along_axis(ordered, low, 0)[0] + np.take_along_axis(ordered, high, 0)[0]
    median: FloatArray = np.asarray(middle / 2.0)
    return median
