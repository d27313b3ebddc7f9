"""Recalculate workbooks without a spreadsheet program.

>>> from uffuncs.headless import recalculate
>>> report = recalculate("design.xlsx", "recalculated.xlsx")    # doctest: +SKIP
>>> report.formulas, len(report.errors)                         # doctest: +SKIP
(412, 0)
"""

from .package import UnreadableWorkbook
from .recalculate import recalculate
from .report import Change, ErrorCell, Report, UnknownFunction, report_lines

__all__ = [
    "Change",
    "ErrorCell",
    "Report",
    "UnknownFunction",
    "UnreadableWorkbook",
    "recalculate",
    "report_lines",
]
