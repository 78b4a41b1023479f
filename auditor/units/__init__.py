"""Units at the edge: texts of loggers and plant files to SI, and SI to the scale of the report.

The only room that knows the unit library, and it loads it with the first
conversion, not with the import. Everything further in is plain numbers in SI.
"""

from auditor.units.amounts import Amount, Quantity, parse_quantity, parse_uncertainty
from auditor.units.conversions import Conversion, conversion
from auditor.units.display import DISPLAY, DisplayUnit, to_display
from auditor.units.spellings import (
    Meaning,
    Qualifier,
    UnitError,
    meanings,
    nearest,
    same_unit,
    split_qualifier,
    units_of,
)
from auditor.units.table import SI_UNITS

__all__ = [
    "DISPLAY",
    "SI_UNITS",
    "Amount",
    "Conversion",
    "DisplayUnit",
    "Meaning",
    "Qualifier",
    "Quantity",
    "UnitError",
    "conversion",
    "meanings",
    "nearest",
    "parse_quantity",
    "parse_uncertainty",
    "same_unit",
    "split_qualifier",
    "to_display",
    "units_of",
]
