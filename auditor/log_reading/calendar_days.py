"""Days of the Gregorian calendar, by whole columns."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

_FIRST_YEAR, _LAST_YEAR = 1970, 2100
_DAYS = np.array([0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31], dtype=np.int64)


def is_date(year: NDArray[np.int64], month: NDArray[np.int64], day: NDArray[np.int64]) -> NDArray[np.bool_]:
    """Whether there is such a day, in a year that a logger can mean."""
    leap = (year % 4 == 0) & ((year % 100 != 0) | (year % 400 == 0))
    longest = _DAYS[np.clip(month, 0, 12)] + (leap & (month == 2))
    in_year: NDArray[np.bool_] = (month >= 1) & (month <= 12) & (day >= 1) & (day <= longest)
    in_year &= (year >= _FIRST_YEAR) & (year <= _LAST_YEAR)
    return in_year


def days_since_1970(
    year: NDArray[np.int64], month: NDArray[np.int64], day: NDArray[np.int64]
) -> NDArray[np.int64]:
    """Days since 1970-01-01 in the Gregorian calendar, counting years from March."""
    shifted = year - (month <= 2)
    in_year = (153 * (month + np.where(month > 2, -3, 9)) + 2) // 5 + day - 1
    return shifted * 365 + shifted // 4 - shifted // 100 + shifted // 400 + in_year - 719_468
