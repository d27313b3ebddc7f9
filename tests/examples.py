"""Example calls of the functions: the arguments of their first published value, as numbers in worksheet units."""

from __future__ import annotations

from functools import lru_cache

from uffuncs.cell import call, compile_function
from uffuncs.check_values import checks_of
from uffuncs.declaration import Function
from uffuncs.errors import ErrorValue
from uffuncs.registry import functions

FUNCTIONS = [r for r in functions().values() if isinstance(r, Function)]
ELEMENTWISE = [r for r in FUNCTIONS if r.elementwise]


@lru_cache(maxsize=None)
def _example(name: str) -> tuple:
    record = functions()[name]
    for check in checks_of(name):
        cells = [*check.cells, *[None] * (len(record.arguments) - len(check.cells))]
        if not isinstance(call(name, cells), ErrorValue):
            return tuple(_number(record, i, c) for i, c in enumerate(cells))
    raise AssertionError(f"{name} has no published value with a result")


def example(record: Function) -> list:
    """Cells of a call that gives a result, one for each argument."""
    return list(_example(record.worksheet_name))


def _number(record: Function, i: int, cell):
    argument = record.arguments[i]
    if argument.kind != "number" or cell is None:
        return cell
    value = argument.quantity.from_si(compile_function(record.worksheet_name).readers[i](cell))
    return float(f"{value:.13g}")


def given_numbers(record: Function, cells: list) -> list[int]:
    """Places of the numeric arguments that are given."""
    return [i for i, a in enumerate(record.arguments) if a.kind == "number" and cells[i] is not None]
