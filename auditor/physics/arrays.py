"""What every physics function does with its arguments before it computes."""

from __future__ import annotations

from typing import Any, TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray: TypeAlias = NDArray[np.float64]
"""Result of a physics function: float64, 0-d (a numpy scalar) for scalars."""

BoolArray: TypeAlias = NDArray[np.bool_]
"""Companion mask: True where the number means something."""


def as_float(values: ArrayLike) -> FloatArray:
    """Return ``values`` as a float64 array, without copying where possible."""
    return np.asarray(values, dtype=np.float64)


def as_kelvin(values: ArrayLike, who: str) -> FloatArray:
    """Return absolute temperatures, refusing what cannot be one.

    Parameters
    ----------
    values : array_like [K]
        Absolute temperatures; NaN stands for "missing" and passes.
    who : str
        Name of the calling function, for the message.

    Returns
    -------
    ndarray [K]
        The same numbers as float64.

    Raises
    ------
    ValueError
        If one is zero or below. A kelvin cannot be, so the caller passed
        Celsius: a bug of the program, not of the plant. Readings below
        absolute zero are to be rejected as out of range before this.
    """
    kelvin = as_float(values)
    if np.any(kelvin <= 0.0):
        raise ValueError(
            f"{who} needs kelvin above zero, got {np.nanmin(kelvin):g}; was a Celsius column passed in?"
        )
    return kelvin


def scalar_or_array(values: Any) -> FloatArray:
    """Return a numpy scalar for a 0-d result and the array itself otherwise."""
    result: FloatArray = np.asarray(values, dtype=np.float64)[()]
    return result
