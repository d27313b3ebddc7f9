"""What pywin32 makes of values between VBA and Python, and the cell contract's values as VBA's."""

from __future__ import annotations

import datetime
import decimal

from pyopenvba.interpreter._values import EMPTY, MISSING, VBAArray, VBAErrorValue

from uffuncs.errors import ErrorValue
from uffuncs.excel.adapter import ERROR_NUMBERS

CODES = {number: code for code, number in ERROR_NUMBERS.items()}


def to_python(value):
    """A Variant as pywin32 hands it to Python."""
    if isinstance(value, VBAArray):
        (low, high), *more = value.bounds
        if not more:
            return tuple(to_python(value.get([i])) for i in range(low, high + 1))
        left, right = more[0]
        return tuple(
            tuple(to_python(value.get([i, j])) for j in range(left, right + 1)) for i in range(low, high + 1)
        )
    if isinstance(value, VBAErrorValue):
        return -2146828288 + value.number
    if value is MISSING:
        return -2147352572
    if value is EMPTY:
        return None
    if isinstance(value, bool):
        return bool(value)
    if isinstance(value, float):
        return float(value)
    if isinstance(value, int):
        return int(value)
    if isinstance(value, str):
        return str(value)
    raise TypeError(f"{type(value).__name__} does not go through COM in this model")


def to_vba(value):
    """A value of Python as pywin32 hands it back, in a Variant; what it would refuse is an error here too."""
    kind = type(value)
    if kind in (list, tuple):
        if value and type(value[0]) in (list, tuple):
            if len({len(row) for row in value}) != 1:
                raise TypeError("rows of different lengths do not go through COM")
            array = VBAArray([(0, len(value) - 1), (0, len(value[0]) - 1)])
            for i, row in enumerate(value):
                for j, item in enumerate(row):
                    array.set([i, j], to_vba(item))
        else:
            array = VBAArray([(0, len(value) - 1)])
            for i, item in enumerate(value):
                array.set([i], to_vba(item))
        return array
    if kind not in (str, float, int, bool, type(None), datetime.datetime, decimal.Decimal):
        raise TypeError(f"{kind.__name__} does not go through COM")
    if kind not in (str, float):
        raise AssertionError(f"the door hands back numbers as float and texts only, not {kind.__name__}")
    return value


def as_cell_value(result):
    """What a cell would hold, as the cell contract has it: rows for a block, ErrorValue for an error."""
    if isinstance(result, VBAArray):
        if result.dimensions == 1:
            return [[as_cell_value(v) for v in result.items]]
        (low, high), (left, right) = result.bounds
        return [
            [as_cell_value(result.get([i, j])) for j in range(left, right + 1)] for i in range(low, high + 1)
        ]
    if isinstance(result, VBAErrorValue):
        return ErrorValue(CODES[result.number])
    return result
