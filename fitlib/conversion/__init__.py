"""The calibration function in use: a reading becomes a value with its uncertainty, or a verdict that says why not."""

from fitlib.conversion.function import CalibrationFunction, load_function
from fitlib.conversion.readings import Readings, read_readings
from fitlib.conversion.record import Conversion
from fitlib.conversion.table import ConversionTable, answers_table, conversion_table
from fitlib.conversion.words import rounded, with_unit

__all__ = [
    "CalibrationFunction",
    "Conversion",
    "ConversionTable",
    "Readings",
    "answers_table",
    "conversion_table",
    "load_function",
    "read_readings",
    "rounded",
    "with_unit",
]
