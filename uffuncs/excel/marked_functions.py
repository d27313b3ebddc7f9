"""All functions for the add-in's wrappers, which turn marked texts into true error values."""

import xlwings

from .adapter import MARK, worksheet_functions

globals().update(worksheet_functions(xlwings, mark=MARK))
