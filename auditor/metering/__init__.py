"""Metering: from tick means of tags to watts of every stream that crosses a machine's boundary.

``meter`` runs once over all streams; ``meter_moved`` runs again over the streams that one source of
uncertainty touches. Each way of metering is a module with one function, found in the table ``WAYS``.
"""

from auditor.metering.meter import meter, meter_moved
from auditor.metering.settings import MeteringSettings
from auditor.metering.shifts import random_shift
from auditor.metering.ways import WAYS

__all__ = ["WAYS", "MeteringSettings", "meter", "meter_moved", "random_shift"]
