"""Published values that the functions are checked against: the data files of this folder, and the one runner for them.

Each entry names its source, the place in it, the inputs as cells hold them and the digits as printed; half a unit of the
last printed digit is the tolerance. Kinds:

printed     read in the source
library     computed by a general library, named as the source
derived     computed from the source's equation or from exact definitions, independently of this library
memory      from memory, the source not at hand
practice    common practice, no source
regression  this library's own earlier output: guards against change, proves nothing
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from ..cell import call
from ..declaration import Function
from ..errors import ErrorValue
from ..reading import split_number
from ..registry import find
from ..units import compile_unit

KINDS = ("printed", "library", "derived", "memory", "practice", "regression")
#: Kinds that count as a check against something outside this library.
OUTSIDE = ("printed", "library", "derived", "memory")

_KEYS = {"function", "source", "place", "kind", "arguments", "expected", "cell", "tolerance", "reason", "note"}
_DIGITS = re.compile(r"[-+]?(\d*)\.?(\d*)(?:[eE]([-+]?\d+))?")


@dataclass(frozen=True)
class Check:
    """One published value."""

    topic: str
    function: str
    source: str
    kind: str
    arguments: tuple
    expected: str
    place: str = ""
    cell: tuple[int, int] = (1, 1)
    tolerance: str = ""
    reason: str = ""
    note: str = ""

    @property
    def cells(self) -> list:
        """The arguments as cell values: a list stands for a column, a list of lists for a block."""
        return [as_cell(a) for a in self.arguments]


@dataclass(frozen=True)
class Outcome:
    """A check's printed value beside the computed one, both in the worksheet unit."""

    printed: float | str
    computed: object
    tolerance: float

    @property
    def difference(self) -> float | None:
        both = isinstance(self.printed, float) and isinstance(self.computed, float)
        return self.computed - self.printed if both else None

    @property
    def passed(self) -> bool:
        if self.difference is None:
            return type(self.printed) is type(self.computed) and self.printed == self.computed
        # The slack is for the conversion of the printed unit: a value may sit on the edge of its rounding.
        return abs(self.difference) <= self.tolerance * (1 + 1e-9) + 1e-14 * abs(self.printed)


class CheckFileError(ValueError):
    """An entry of a data file is incomplete or contradicts itself."""


@lru_cache(maxsize=1)
def checks() -> tuple[Check, ...]:
    """All entries of all data files.

    Raises
    ------
    CheckFileError
        Names the file, the entry and the fault.
    """
    import tomllib

    found = []
    for path in sorted(Path(__file__).parent.glob("*.toml")):
        for number, entry in enumerate(tomllib.loads(path.read_text(encoding="utf-8")).get("check", []), 1):
            fault = _fault(entry)
            if fault:
                raise CheckFileError(f"{path.name}, entry {number} ({entry.get('function')}): {fault}")
            entry["arguments"] = tuple(entry["arguments"])
            entry["cell"] = tuple(entry.get("cell", (1, 1)))
            found.append(Check(path.stem, **entry))
    return tuple(found)


def _fault(entry: dict) -> str:
    if unknown := set(entry) - _KEYS:
        return f"unknown keys {sorted(unknown)}"
    if missing := {"function", "source", "kind", "arguments", "expected"} - set(entry):
        return f"missing keys {sorted(missing)}"
    if entry["kind"] not in KINDS:
        return f"the kind must be one of {KINDS}"
    if entry.get("tolerance") and not entry.get("reason"):
        return "a tolerance of its own needs a reason"
    if not isinstance(entry["expected"], str):
        return "expected must be a text with the digits as printed"
    return ""


def checks_of(function: str) -> list[Check]:
    """The entries of one worksheet function, those read in print first."""
    return sorted((c for c in checks() if c.function == function), key=lambda c: KINDS.index(c.kind))


def run(check: Check) -> Outcome:
    """Compute the checked value through the cell contract."""
    result = call(check.function, check.cells)
    row, column = check.cell
    if isinstance(result, list):
        result = result[row - 1][column - 1] if row <= len(result) and column <= len(result[row - 1]) else ErrorValue("#N/A")
    printed, tolerance = expected(check, isinstance(result, str))
    return Outcome(printed, result, tolerance)


def expected(check: Check, is_text: bool = False) -> tuple[float | str, float]:
    """The printed value in the worksheet unit, and the tolerance; a text is compared as it stands."""
    text = check.expected.strip()
    if check.expected.startswith("#"):
        return ErrorValue(text), 0.0
    record = find(check.function)
    if is_text or not re.match(r"[-+−]?[\d.]", text):
        return text, 0.0
    number, unit = split_number(check.function, text, "")
    digits = text[: len(text) - len(unit)].strip().replace("−", "-")
    step = half_unit(digits)
    scale = 1.0
    if unit and isinstance(record, Function):
        values = [_choice_value(a) for a in check.arguments] + [None] * len(record.arguments)
        q = (record.result_quantity(values) if record.result_by
             else record.results[min(check.cell[1], len(record.results)) - 1])
        unit_scale, unit_offset = compile_unit(unit, q.si_unit, q.absolute)
        number = q.from_si(unit_scale * number + unit_offset)
        scale = unit_scale / q.scale
    tolerance = step * abs(scale)
    if check.tolerance:
        allowed, percent = split_number(check.function, check.tolerance, "%")
        tolerance = abs(number) * allowed / 100 if percent == "%" else allowed
    return float(number), tolerance


def half_unit(digits: str) -> float:
    """Half a unit of the last digit of a printed number."""
    _, decimals, exponent = _DIGITS.fullmatch(digits).groups()
    return 0.5 * 10.0 ** (int(exponent or 0) - len(decimals))


def _choice_value(argument: object) -> object:
    return argument.strip().casefold() if isinstance(argument, str) else argument


def as_cell(argument: object) -> object:
    """A value of a data file as a cell: a list is a column, a list of lists a block, "" a blank."""
    if not isinstance(argument, list):
        return None if argument == "" else argument
    rows = [row if isinstance(row, list) else [row] for row in argument]
    return [[None if v == "" else v for v in row] for row in rows]
