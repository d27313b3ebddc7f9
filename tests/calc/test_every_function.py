"""Every function through the real program gives what the headless engine gives: value, text or error."""

from __future__ import annotations

import math

import openpyxl
import pytest
from calc_session import XLSX
from every_function import BAD, WHOLE, build

from uffuncs.headless import recalculate
from uffuncs.registry import functions


@pytest.fixture(scope="module")
def books(calc, folder):
    """Counts, formulas as built and as LibreOffice saves them, values of both engines."""
    source = folder / "every.xlsx"
    calls = build(source)
    report = recalculate(source, folder / "headless.xlsx")
    assert not report.unknown_functions
    document = calc.open(source)
    document.calculateAll()
    calc.store(document, folder / "calc.xlsx", XLSX)
    document.close(True)
    load = openpyxl.load_workbook
    return (
        calls,
        load(source),
        load(folder / "calc.xlsx"),
        load(folder / "headless.xlsx", data_only=True),
        load(folder / "calc.xlsx", data_only=True),
    )


def test_every_function_is_called(books):
    calls, source, *_ = books
    called = {row[0].value for title in (WHOLE, BAD) for row in source[title].iter_rows(max_col=1)}
    assert called >= set(functions())
    assert calls[WHOLE] >= len(functions()) and calls[BAD] > 5 * len(functions())


@pytest.mark.parametrize("title", [WHOLE, BAD])
def test_values_and_errors(books, title):
    _, source, _, headless, calc = books
    differing, compared = [], 0
    for row in headless[title].iter_rows(min_col=2):
        for cell in row:
            one, other = cell.value, calc[title][cell.coordinate].value
            compared += one is not None
            if not alike(one, other):
                formula = source[title].cell(cell.row, 2).value
                differing.append((cell.coordinate, getattr(formula, "text", formula), one, other))
    assert not differing[:10] and compared >= source[title].max_row - 1


def test_bad_arguments_are_errors(books):
    *_, calc = books
    values = [row[0].value for row in calc[BAD].iter_rows(min_row=2, min_col=2, max_col=2)]
    assert {v for v in values if isinstance(v, str) and v.startswith("#")} >= {"#VALUE!", "#NUM!", "#DIV/0!"}


def test_names_are_saved_unchanged(books):
    _, source, saved, *_ = books
    for title in (WHOLE, BAD):
        for row in source[title].iter_rows(min_col=2, max_col=2):
            before, after = (
                getattr(v, "text", v) for v in (row[0].value, saved[title][row[0].coordinate].value)
            )
            if isinstance(before, str):
                assert name_of(after) == name_of(before)


def name_of(formula: str) -> str:
    return formula.partition("(")[0]


def alike(one, other) -> bool:
    """Values of two programs; a file of LibreOffice holds fifteen digits."""
    if isinstance(one, (int, float)) and isinstance(other, (int, float)):
        return math.isclose(one, other, rel_tol=1e-13, abs_tol=1e-300)
    return one == other or (one in (None, "") and other in (None, ""))
