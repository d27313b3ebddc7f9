"""From Calc's values to the cell contract and back, in the user's own Python."""

from __future__ import annotations

from itertools import chain

import numpy as np

from ..cell import call
from ..declaration import Function, Tool
from ..errors import ErrorValue
from ..registry import functions
from .inside.frames import FLOATS, is_numeric
from .inside.values import ERROR_NUMBERS, error_block, error_name, trimmed
from .names import FURTHER

LONGEST_TEXT = 32_767  # characters a cell can hold


def stale(signatures: dict[str, list[str]]) -> list[str]:
    """Names whose arguments are others than those the add-in was built with."""
    known = functions()
    return [
        name
        for name, arguments in signatures.items()
        if name not in known or arguments != argument_names(known[name])
    ]


def argument_names(record: Function | Tool) -> list[str]:
    """The names of the arguments as the add-in offers them."""
    return [*record.argument_names, *[FURTHER[0]] * (isinstance(record, Tool) and record.variadic)]


def answer(name: str, cells) -> tuple[tuple, ...]:
    """The result of a function as rows of floats and texts; error values are NaNs that carry a code."""
    end = len(cells)
    while end and cells[end - 1] is None:
        end -= 1
    for cell in cells:
        kind = type(cell)
        if kind is not float and kind is not str and cell is not None:
            cells = [incoming(c) for c in trimmed(cells)]
            break
    result = call(name, cells[:end])
    if type(result) is float:
        return ((result,),)
    return outgoing(result)


def incoming(cell: object) -> object:
    """A value of Calc as a cell value: numbers of a range as an array, NaNs as the errors they stand for."""
    kind = type(cell)
    if kind is tuple:
        if not cell or not cell[0]:
            return None
        if not is_numeric(cell):
            return [[_number_or_error(v) for v in row] for row in cell]
        cell, kind = np.array(cell), np.ndarray
    if kind is np.ndarray:
        if np.isnan(cell).any():
            return [[_number_or_error(v) for v in row] for row in cell.tolist()]
        return cell
    return cell if kind is float or kind is str or cell is None else _other(cell)


def _other(cell: object) -> object:
    """Numbers of another kind: Calc hands over floats, but a macro may call with anything."""
    return float(cell) if isinstance(cell, (int, bool)) else str(cell)


def _number_or_error(value: object) -> object:
    return ErrorValue(error_name(value)) if value != value else value


def outgoing(result: object) -> tuple[tuple, ...]:
    """A result of the cell contract as Calc takes it."""
    if type(result) is not list:
        result = [[result]]
    if not result or not result[0]:
        return error_block("#VALUE!")
    if FLOATS.issuperset(map(type, chain.from_iterable(result))):
        return tuple(map(tuple, result))
    return tuple(tuple(map(_outgoing, row)) for row in result)


def _outgoing(value: object) -> float | str:
    if isinstance(value, ErrorValue):
        return ERROR_NUMBERS.get(value.code, ERROR_NUMBERS["#VALUE!"])
    if isinstance(value, str):
        return value if len(value) <= LONGEST_TEXT else ERROR_NUMBERS["#VALUE!"]
    return float(value)
