"""What the tools share: a function by its name, calls element by element, plain numbers."""

from __future__ import annotations

import math
from collections.abc import Callable, Collection, Sequence

from ..declaration import Function, Tool
from ..errors import CellError, ErrorValue, InvalidInput, NotAvailable, UffuncsError
from ..grids import elements
from ..reading import is_blank, split_number, unwrapped
from ..registry import find, near_names

OWN = "This library"
FUNCTION_NAME = ("function", 'Name of a worksheet function, such as "UF_FLUX_DARCY"')


def function_named(name: object) -> Function | Tool:
    """The record of a function given as text.

    Raises
    ------
    NotAvailable
        No such function; the reason lists near matches.
    """
    if isinstance(name, ErrorValue):
        raise CellError(name)
    if not isinstance(name, str):
        raise InvalidInput(f"the function's name must be a text such as \"UF_FLUX_DARCY\"; got {name}")
    record = find(name)
    if record is None:
        near = near_names(name)
        hint = f"; did you mean {' or '.join(near)}?" if near else "; UF_FUNCTIONS lists all"
        raise NotAvailable(f"there is no function '{name[:40]}'{hint}")
    return record


def element_by_element(function: Callable, cells: Sequence, whole: Collection[int] = ()):
    """Call a function of cells for each element of the ranges among them, broadcast; `whole` ones are passed as they are.

    Raises
    ------
    InvalidInput
        The ranges do not fit together in shape. What goes wrong in an element stays in its place.
    """
    cells = [c if i in whole else unwrapped(c) for i, c in enumerate(cells)]
    if not any(isinstance(c, (list, tuple)) for i, c in enumerate(cells) if i not in whole):
        return function(*cells)
    return [[_value_or_error(function, element) for element in row] for row in elements(cells, whole)]


def _value_or_error(function: Callable, cells: list):
    try:
        return function(*cells)
    except UffuncsError as error:
        return error.as_cell()


def plain_number(name: str, cell: object) -> float:
    """A number without a unit.

    Raises
    ------
    InvalidInput
        Blank, a boolean, or a text that is more than a number.
    """
    if isinstance(cell, ErrorValue):
        raise CellError(cell)
    if is_blank(cell):
        raise InvalidInput(f"{name} is blank")
    if isinstance(cell, bool):
        raise InvalidInput(f"{name} is {str(cell).upper()}; give a number")
    if isinstance(cell, str):
        cell, unit = split_number(name, cell, "1")
        if unit:
            raise InvalidInput(f"{name} carries the unit '{unit[:20]}'; give the number alone")
    number = float(cell)
    if not math.isfinite(number):
        raise InvalidInput(f"{name} is {number}; give a finite number")
    return number


def plain_text(name: str, cell: object) -> str:
    """A text.

    Raises
    ------
    InvalidInput
        Anything else.
    """
    if isinstance(cell, ErrorValue):
        raise CellError(cell)
    if not isinstance(cell, str):
        raise InvalidInput(f"{name} must be a text; got {cell}")
    return cell.strip()
