"""From blocks of samples to the tick table: dispositions, time-weighted means, and the two exact ledgers.

``clean`` is the room's door. What a value means between stamps stands in :mod:`.sums` (step, state, line,
mean, amount) and :mod:`.counters`; which numbers are believed in :mod:`.judge`, :mod:`.repeats` and
:mod:`.frozen`; cutting at the edges of ticks in :mod:`.spans`. ``compare_clocks`` holds the clocks
of the exports against each other once all are cleaned.
"""

from auditor.cleaning.clean import clean
from auditor.cleaning.clock_compare import compare_clocks
from auditor.cleaning.grid import between_dates, calendar_month, make_grid, month_labels
from auditor.cleaning.settings import CleaningSettings

__all__ = [
    "CleaningSettings",
    "between_dates",
    "calendar_month",
    "clean",
    "compare_clocks",
    "make_grid",
    "month_labels",
]
