"""A workbook that calls every function of the registry, with good and with bad arguments."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import openpyxl
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula

from tests.examples import example, given_numbers
from uffuncs.cell import call
from uffuncs.check_values import checks
from uffuncs.declaration import Function
from uffuncs.errors import ErrorValue
from uffuncs.reference import EXAMPLES, formula_text
from uffuncs.registry import functions

WHOLE = "published"
BAD = "bad arguments"


@dataclass(frozen=True)
class Raw:
    """An argument as formula text."""

    text: str


def build(path: Path) -> dict[str, int]:
    """Write the workbook; number of calls on each sheet."""
    book = openpyxl.Workbook()
    writer = _Writer(book)
    for name, cells in published_calls():
        writer.write(WHOLE, name, cells)
    for name, cells in bad_calls():
        writer.write(BAD, name, cells)
    book.save(path)
    return writer.rows


def published_calls():
    """Every published value, and every tool that has none."""
    for check in checks():
        yield check.function, list(check.arguments)
    for name, arguments in EXAMPLES.items():
        yield name, list(arguments)


def bad_calls():
    """For each argument of each function: a number below the bounds, a text, an error value, nothing."""
    for record in functions().values():
        if not isinstance(record, Function):
            continue
        cells = ["" if c is None else c for c in example(record)]
        for i, argument in enumerate(record.arguments):
            if argument.kind in ("column", "labels"):
                continue
            wrong = ["12 ducks", Raw("1/0")]
            if i in given_numbers(record, cells):
                low = argument.quantity.low
                wrong += [low - max(1.0, abs(low)), "", "7,5 " + argument.unit]
            for value in wrong:
                yield record.worksheet_name, [*cells[:i], value, *cells[i + 1 :]]


class _Writer:
    """One call a block of rows; ranges are written to a sheet of their own."""

    def __init__(self, book):
        self.book = book
        book.active.title = "ranges"
        self.ranges, self.column = book.active, 1
        self.rows: dict[str, int] = {}
        self.known: dict[str, str] = {}

    def write(self, title: str, name: str, arguments: list):
        sheet = self.book[title] if title in self.book.sheetnames else self.book.create_sheet(title)
        row = sheet.max_row + 1
        while arguments and arguments[-1] == "":
            arguments = arguments[:-1]
        formula = f"={name}({','.join(map(self._text, arguments))})"
        result = call(name, [_cell(a) for a in arguments])
        sheet.cell(row, 1, name)
        if isinstance(result, list):
            last = f"{get_column_letter(1 + len(result[0]))}{row + len(result) - 1}"
            sheet[f"B{row}"] = ArrayFormula(f"B{row}:{last}", formula)
            sheet.cell(row + len(result) - 1, 1, name)
        else:
            sheet.cell(row, 2, formula)
        self.rows[title] = self.rows.get(title, 0) + 1

    def _text(self, argument) -> str:
        if isinstance(argument, Raw):
            return argument.text
        if isinstance(argument, list):
            return self._range(argument)
        return formula_text(argument)

    def _range(self, block: list) -> str:
        rows = [row if isinstance(row, list) else [row] for row in block]
        key = repr(rows)
        if key not in self.known:
            for r, row in enumerate(rows, 1):
                for c, value in enumerate(row):
                    if value != "":
                        self.ranges.cell(r, self.column + c, value)
            width = max(map(len, rows))
            first, last = get_column_letter(self.column), get_column_letter(self.column + width - 1)
            self.known[key] = f"ranges!${first}$1:${last}${len(rows)}"
            self.column += width
        return self.known[key]


def _cell(argument):
    if isinstance(argument, Raw):
        return ErrorValue("#DIV/0!")
    if isinstance(argument, list):
        return [
            [None if v == "" else v for v in (row if isinstance(row, list) else [row])] for row in argument
        ]
    return None if argument == "" else argument
