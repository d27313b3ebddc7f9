"""Builds function_reference.xlsx from the registry: every function live, beside its published value.

Run `python -m workbooks_demo.function_reference` to write the workbook, with its values, beside this script.
"""

from __future__ import annotations

from itertools import groupby
from pathlib import Path

from openpyxl import Workbook
from openpyxl.styles import Alignment
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.hyperlink import Hyperlink

from uffuncs.cell import call
from uffuncs.check_values import as_cell, checks_of, expected
from uffuncs.reference import example_cells, limit_texts, meaning_text, result_text
from uffuncs.registry import functions

from .layout import save, write_with_values

TITLES = ["Argument", "Example", "Unit", "Lowest", "Highest", "Default", "Meaning"]
WIDTHS = [30, 26, 18, 14, 14, 16, 92]
#: Where the ranges and the blocks stand, to the right of the text.
RANGES = 9
#: What a checked value is called, by its kind.
KINDS = {"printed": "Published value", "library": "Value of a general library", "derived": "Value derived from the source's equation",
         "memory": "Value from memory", "practice": "Common practice, no source", "regression": "Earlier output"}
CAUTIONED = {"integrity": "Direct integrity results and removal credit are set by the local regulator and by licensed practice; "
                          "this is a calculation aid."}


def build(path: Path) -> None:
    """Write the workbook, formulas only."""
    workbook = Workbook()
    index = workbook.active
    index.title = "Index"
    _head(index, "Function reference", "Every function with a live example and its published value. Generated; do not edit.", [34, 26, 40, 90])
    for n, text in enumerate(("Function", "Topic", "Result", "Summary"), 1):
        index.cell(4, n, text).style = "Headline 3"
    row = 5
    for topic, records in groupby(functions().values(), key=lambda r: r.topic):
        sheet = workbook.create_sheet(topic)
        _head(sheet, topic.capitalize(), CAUTIONED.get(topic, "An aid to calculation; local codes, the maker's limits and licensed "
                                                              "practice decide."), WIDTHS)
        if topic in CAUTIONED:
            sheet["A2"].style = "Warning Text"
        at = 4
        for record in records:
            for n, text in enumerate((record.worksheet_name, topic, result_text(record), record.summary), 1):
                index.cell(row, n, text).alignment = Alignment(vertical="top", wrap_text=n > 2)
            link = index.cell(row, 1)
            link.hyperlink = Hyperlink(ref=link.coordinate, location=f"'{topic}'!A{at}")
            index.cell(row, 1).style = "Hyperlink"
            row += 1
            at = _function(sheet, at, record) + 2
    index.freeze_panes = "B5"
    save(workbook, path)


def _head(sheet, title: str, purpose: str, widths: list[int]) -> None:
    sheet["A1"], sheet["A2"] = title, purpose
    sheet["A1"].style, sheet["A2"].style = "Title", "Explanatory Text"
    sheet.sheet_view.showGridLines = False
    for n, width in enumerate(widths, 1):
        sheet.column_dimensions[get_column_letter(n)].width = width
    page = sheet.page_setup
    page.orientation, page.paperSize, page.fitToWidth, page.fitToHeight = "landscape", 9, 1, 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True


def _function(sheet, row: int, record) -> int:
    """One function from a row on; gives the last row used."""
    for n in range(1, 8):
        sheet.cell(row, n).style = "Headline 2"
    sheet.cell(row, 1, record.worksheet_name)
    sheet.cell(row, 7, record.summary)
    lines = [("Equation", record.equation), ("Source", record.source), *(("Limits", text) for text in limit_texts(record))]
    for label, text in lines:
        row += 1
        sheet.cell(row, 1, label).style = "Explanatory Text"
        sheet.cell(row, 2, text)
    row += 1
    top = row
    for n, text in enumerate(TITLES, 1):
        sheet.cell(row, n, text).style = "Headline 3"
        sheet.cell(row, n).alignment = Alignment(horizontal="left" if n in (1, 3, 7) else "right", indent=int(n in (3, 7)))
    places, column, lowest = [], RANGES, row
    cells = example_cells(record)
    names = [a.name for a in record.arguments] + [f"further argument {n}" for n in range(1, 1 + len(cells) - len(record.arguments))]
    for n, name in enumerate(names):
        row += 1
        argument = record.arguments[n] if n < len(record.arguments) else None
        given = cells[n] if n < len(cells) else ""
        cell = sheet.cell(row, 2)
        if isinstance(given, list):
            rows = [r if isinstance(r, list) else [r] for r in given]
            for i, values in enumerate(rows):
                for j, value in enumerate(values):
                    sheet.cell(top + 1 + i, column + j, None if value == "" else value).style = "Input"
            sheet.cell(top, column, name).style = "Headline 3"
            place = f"{get_column_letter(column)}{top + 1}:{get_column_letter(column + len(rows[0]) - 1)}{top + len(rows)}"
            cell.value = f"range {place}"
            lowest = max(lowest, top + len(rows))
            column += len(rows[0]) + 1
        else:
            place = f"B{row}" if given != "" else ""
            cell.value = given if given != "" else None
            cell.style = "Input"
        cell.alignment = Alignment(horizontal="right")
        places.append(place)
        sheet.cell(row, 1, name)
        if argument is not None:
            low, high = (argument.quantity.low, argument.quantity.high) if argument.quantity else (None, None)
            for m, value in enumerate((argument.unit, low, high, None if argument.required else argument.default_text,
                                       meaning_text(argument)), 3):
                sheet.cell(row, m, value).alignment = Alignment(horizontal="left" if m in (3, 7) else "right", indent=int(m in (3, 7)))
    while places and not places[-1]:
        places.pop()
    formula = f"={record.worksheet_name}({','.join(places)})"
    return _result(sheet, max(row, lowest), record, cells, formula, column)


def _result(sheet, row: int, record, cells: list, formula: str, column: int) -> int:
    """The live formula, and its published value beside it."""
    found = checks_of(record.worksheet_name)
    result = call(record.worksheet_name, [as_cell(c) for c in cells])
    row += 1
    sheet.cell(row, 1, "Formula").style = "Explanatory Text"
    sheet.cell(row, 2, formula[1:]).style = "Explanatory Text"
    row += 1
    sheet.cell(row, 1, "Result")
    unit = sheet.cell(row, 3, record.result_unit if not record.block else "a block, to the right")
    unit.alignment = Alignment(horizontal="left", indent=1)
    if isinstance(result, list):
        first = row
        last_row, last_column = first + len(result) - 1, column + len(result[0]) - 1
        block = f"{get_column_letter(column)}{first}:{get_column_letter(last_column)}{last_row}"
        sheet[f"{get_column_letter(column)}{first}"] = ArrayFormula(block, formula)
        for cells_of_row in sheet[block]:
            for cell in cells_of_row:
                cell.style = "Calculation"
        for n, q in enumerate(getattr(record, "results", ())[: len(result[0])]):
            sheet.cell(first - 1, column + n, f"{q.name} [{q.unit}]").style = "Explanatory Text"
        at = found[0].cell if found else (1, 1)
        sheet.cell(row, 2, f"={get_column_letter(column + at[1] - 1)}{first + at[0] - 1}")
        row = max(row, last_row)
        live = f"B{first}"
    else:
        sheet.cell(row, 2, formula)
        live = f"B{row}"
    sheet[live].style = "Output"
    sheet[live].alignment = Alignment(horizontal="right")
    if found:
        row = _check(sheet, row, found[0], live, isinstance(result, str))
    return row


def _check(sheet, row: int, check, live: str, is_text: bool) -> int:
    """Printed value, difference, what rounding allows, verdict, source."""
    printed, tolerance = expected(check, is_text)
    first = row + 1
    sheet.cell(first, 1, KINDS[check.kind])
    sheet.cell(first, 2, printed if isinstance(printed, (float, str)) else str(printed)).style = "Input"
    sheet.cell(first, 7, f"{check.expected}; {check.source}{', ' + check.place if check.place else ''}")
    rows = [("", None)]
    if isinstance(printed, float):
        rows += [("Difference", f"={live}-B{first}"), ("Allowed by the printed digits", tolerance),
                 ("Within the printed digits?", f'=IF(ABS(B{first + 1})<=B{first + 2}*(1+1E-9)+1E-14*ABS(B{first}),"yes","no")')]
    else:
        rows += [("The same text?", f'=IF({live}=B{first},"yes","no")')]
    for n, (label, value) in enumerate(rows):
        if value is None:
            continue
        sheet.cell(first + n, 1, label)
        sheet.cell(first + n, 2, value).style = "Check Cell" if label.endswith("?") else "Calculation"
        sheet.cell(first + n, 2).alignment = Alignment(horizontal="right")
    if check.tolerance:
        sheet.cell(first + 2, 7, f"tolerance {check.tolerance}: {check.reason}")
    return first + len(rows) - 1


if __name__ == "__main__":
    write_with_values(build, Path(__file__).with_suffix(".xlsx"))
