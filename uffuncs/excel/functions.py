"""All functions for xlwings' own "Import Functions"; an error comes out as text such as #NUM!.

Set "UDF Modules" of a workbook to `uffuncs.excel.functions` and click "Import Functions". xlwings' wrappers
cannot give true error values; those of the add-in (`uffuncs install excel`) can.
"""

import xlwings

from .adapter import worksheet_functions

globals().update(worksheet_functions(xlwings, mark=""))
