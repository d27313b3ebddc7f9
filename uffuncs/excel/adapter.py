"""Between what Excel hands over and the cell contract; nothing is computed here."""

from __future__ import annotations

import datetime
import inspect
from collections.abc import Callable
from decimal import Decimal
from itertools import chain

from ..cell import call
from ..declaration import Function, Tool
from ..errors import ErrorValue
from .names import argument_names

#: Puts an error value apart from a text of the same letters; no cell's text starts with it.
MARK = "\x01"
LONGEST_CELL = 32_767  # characters

#: The number of each error value in Excel (XlCVError), and the whole number as which COM hands it over.
ERROR_NUMBERS = {
    "#NULL!": 2000,
    "#DIV/0!": 2007,
    "#VALUE!": 2015,
    "#REF!": 2023,
    "#NAME?": 2029,
    "#NUM!": 2036,
    "#N/A": 2042,
    "#SPILL!": 2045,
    "#CALC!": 2050,
}
_ERROR_BASE = -2146828288  # 0x800A0000
_ERRORS = {_ERROR_BASE + number: ErrorValue(code) for code, number in ERROR_NUMBERS.items()}
_MISSING = -2147352572  # DISP_E_PARAMNOTFOUND: an argument left out
_DAY_ZERO = datetime.datetime(1899, 12, 30)
_PLAIN = {float, str, bool, type(None)}


def incoming(value: object) -> object:
    """A value from Excel as a cell value: None for a blank, an ErrorValue, or rows of these."""
    kind = type(value)
    if kind is tuple or kind is list:
        rows = value if value and type(value[0]) in (tuple, list) else (value,)
        if _PLAIN.issuperset(map(type, chain.from_iterable(rows))):
            return rows
        return [[_single(v) for v in row] for row in rows]
    return value if kind is float else _single(value)


def _single(value: object) -> object:
    kind = type(value)
    if kind in _PLAIN:
        return value
    if kind is int:
        if value == _MISSING:
            return None
        if value & 0xFFFF0000 == 0x800A0000:
            # #GETTING_DATA, #FIELD!, #BUSY! and the like have no counterpart in the contract.
            return _ERRORS.get(value) or ErrorValue("#VALUE!", "an argument is an error value")
        return float(value)
    if isinstance(value, datetime.datetime):
        return (value.replace(tzinfo=None) - _DAY_ZERO) / datetime.timedelta(days=1)
    if isinstance(value, Decimal):
        return float(value)
    return ErrorValue("#VALUE!", f"{kind.__name__} is not a cell value")


def outgoing(result: object, mark: str) -> list[list]:
    """A result of the contract as rows of numbers and texts; error values as their code behind the mark."""
    rows = result if type(result) is list else [[result]]
    return [[v if type(v) is float else _out(v, mark) for v in row] for row in rows]


def _out(value: object, mark: str) -> object:
    if isinstance(value, ErrorValue):
        return mark + value.code
    if isinstance(value, str):
        if len(value) > LONGEST_CELL:
            return mark + "#VALUE!"
        return value.lstrip(MARK)
    return value


def worksheet_functions(decorator_module, mark: str) -> dict[str, Callable]:
    """Every function of the registry as one for xlwings, by its worksheet name.

    Arguments are passed raw: a blank as None, an error as its number, a range as rows. A conversion of
    xlwings' own would turn errors into texts and cost a pass over the range.
    """
    from ..registry import functions

    xw = decorator_module
    made = {}
    for name, record in functions().items():
        function = _function(record, mark)
        names = argument_names(record)
        descriptions = [a.description for a in record.arguments] + ["further cells"]
        for argument, description in zip(names, descriptions):
            function = xw.arg(argument, convert="raw", doc=description)(function)
        made[name] = xw.func(category=category(record))(xw.ret(convert="raw")(function))
    return made


def category(record: Function | Tool) -> str:
    """The function wizard's category."""
    return f"Ultrafiltration: {record.topic}"


def _function(record: Function | Tool, mark: str) -> Callable:
    name = record.worksheet_name

    def function(*cells):
        return outgoing(call(name, [incoming(c) for c in cells]), mark)

    names = argument_names(record)
    parameters = [
        inspect.Parameter(
            n,
            inspect.Parameter.POSITIONAL_OR_KEYWORD,
            default=inspect.Parameter.empty if a.required else None,
        )
        for n, a in zip(names, record.arguments)
    ]
    if len(names) > len(record.arguments):
        parameters.append(inspect.Parameter(names[-1], inspect.Parameter.VAR_POSITIONAL))
    function.__name__ = function.__qualname__ = name
    function.__doc__ = record.summary
    function.__signature__ = inspect.Signature(parameters)
    return function
