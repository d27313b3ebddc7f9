"""Reading one cell: from a cell value to an argument's SI value or text."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from itertools import chain

import numpy as np

from .declaration import Argument
from .errors import CellError, ErrorValue, InvalidInput, OutOfBounds
from .units import compile_unit

#: What a range of cells arrives as.
RANGES = (list, tuple, np.ndarray)

_NUMBER_TEXT = re.compile(r"\s*([-+−]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+−]?\d+)?)\s*(.*?)\s*", re.DOTALL)
_UNCERTAIN = re.compile(r"±|\+/-|\.\.")


def make_reader(function: str, argument: Argument) -> Callable:
    """A function from a cell value to the argument's SI value (or text); raises UffuncsError."""
    if argument.kind in ("choice", "name", "labels"):
        return _text_reader(function, argument)
    q = argument.quantity
    name, scale, offset, low, high = f"{function}: {argument.name}", q.scale, q.offset, q.low, q.high
    default, required, whole = argument.default, argument.required, q.whole
    texts: dict[str, float] = {}  # unit texts met before: a column of formulas repeats them

    def read(cell):
        kind = type(cell)
        if kind is float or kind is int:
            if low <= cell <= high and not whole:
                return scale * cell + offset
            return checked(cell, cell)
        if kind is str and cell in texts:
            return texts[cell]
        return slow(cell)

    def checked(number, given):
        if not low <= number <= high:
            raise OutOfBounds(f"{name} must be {q.bounds_text}; got {_shown(given)}")
        if whole and number != math.floor(number):
            raise OutOfBounds(f"{name} must be a whole number; got {_shown(given)}")
        return scale * number + offset

    def from_text(cell):
        number, unit = split_number(name, cell, q.unit)
        if unit in ("", q.unit) and not q.absolute:
            return checked(number, cell)
        try:
            unit_scale, unit_offset = compile_unit(unit or q.unit, q.si_unit, q.absolute, q.unit)
        except InvalidInput as error:
            raise InvalidInput(f"{name}: {error}") from None
        value = unit_scale * number + unit_offset
        shown = q.from_si(value)
        if low < shown < high and not whole:
            return value
        # Twelve digits decide what a converted number such as "0.2 kbar" is on the bound itself.
        return checked(float(f"{shown:.12g}"), cell)

    def slow(cell):
        if is_blank(cell):
            if required:
                raise InvalidInput(f"{name} is blank; give a number in {q.unit}, or a text such as '1 {q.unit}'")
            return default
        if isinstance(cell, ErrorValue):
            raise _passed_on(name, cell)
        if isinstance(cell, (bool, np.bool_)):
            raise InvalidInput(f"{name} is {str(bool(cell)).upper()}; give a number in {q.unit}")
        if isinstance(cell, str):
            value = from_text(cell)
            if len(texts) >= 4096:
                texts.clear()
            texts[cell] = value
            return value
        if isinstance(cell, (np.floating, np.integer)):
            return read(cell.item())
        raise InvalidInput(f"{name}: {type(cell).__name__} is not a cell value")

    return read


def _text_reader(function: str, argument: Argument) -> Callable:
    name = f"{function}: {argument.name}"
    choices = {c.casefold(): c for c in argument.choices}

    def read(cell):
        if is_blank(cell):
            if argument.kind == "labels":
                return ""
            if argument.required:
                raise InvalidInput(f"{name} is blank; give {_listed(argument)}")
            return argument.default
        if isinstance(cell, ErrorValue):
            raise _passed_on(name, cell)
        if isinstance(cell, (bool, np.bool_)):
            raise InvalidInput(f"{name} is {str(bool(cell)).upper()}; give {_listed(argument)}")
        if not isinstance(cell, (str, int, float)):
            raise InvalidInput(f"{name}: {type(cell).__name__} is not a cell value")
        text = cell.strip() if isinstance(cell, str) else f"{cell:g}"
        if argument.kind == "choice":
            if text.casefold() not in choices:
                raise InvalidInput(f"{name} must be {_listed(argument)}; got {_shown(cell)}")
            return choices[text.casefold()]
        return text

    return read


def _passed_on(name: str, cell: ErrorValue) -> CellError:
    """An error cell comes out as it went in; its own reason, where it has one, says more than its place."""
    return CellError(cell if cell.reason else ErrorValue(cell.code, f"{name} is the error value {cell.code}"))


def _listed(argument: Argument) -> str:
    return "one of: " + ", ".join(argument.choices) if argument.choices else "a text"


def split_number(name: str, text: str, unit: str) -> tuple[float, str]:
    """A text such as "35 psi" as a number and its unit text.

    Raises
    ------
    InvalidInput
        Not a number, a decimal comma, or an uncertain value.
    """
    found = _NUMBER_TEXT.fullmatch(text)
    if not found:
        raise InvalidInput(f"{name}: {_shown(text)} is not a number with a unit, such as '1 {unit}'")
    number, rest = found[1].replace("−", "-"), found[2]
    if rest.startswith(","):
        raise InvalidInput(f"{name}: {_shown(text)} has a comma; write the number with a decimal point and no other mark")
    if _UNCERTAIN.search(rest):
        raise InvalidInput(f"{name}: {_shown(text)} is an uncertain value; only UF_UNCERTAINTY takes those")
    if (rest[:1].isdigit() and not rest.startswith("1/")) or rest[:1] in (".", "'"):
        raise InvalidInput(f"{name}: {_shown(text)} is not one number with a unit")
    return float(number), rest


def _shown(cell: object) -> str:
    if isinstance(cell, str):
        cell = cell if len(cell) <= 40 else cell[:39] + "…"
        return f"'{cell}'"
    return f"{cell:.12g}" if isinstance(cell, float) else str(cell)


def is_blank(cell: object) -> bool:
    return cell is None or (type(cell) is str and not cell.strip())


def unwrapped(cell: object) -> object:
    """A range of one cell counts as that cell; rows stay rows."""
    if type(cell) in RANGES:
        if isinstance(cell, np.ndarray):
            return cell.item() if cell.size == 1 else cell
        if len(cell) == 0:
            return None
        if not isinstance(cell[0], RANGES):
            cell = [cell]
        if len(cell) == 1 and len(cell[0]) == 1:
            return cell[0][0]
    return cell


def flattened(cell: object) -> list:
    if isinstance(cell, np.ndarray):
        return cell.ravel().tolist()
    if isinstance(cell, (list, tuple)):
        return list(chain.from_iterable(row if isinstance(row, (list, tuple)) else [row] for row in cell))
    return [cell]
