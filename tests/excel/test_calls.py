"""Every function through the whole door: cells, the add-in's VBA, xlwings' server, the contract and back.

The result must be what the cell contract gives, with true error values.
"""

from __future__ import annotations

import pytest

from tests.excel import needed

needed("xlwings", "pyopenvba", stand_in=True)

from pyopenvba.interpreter._values import EMPTY, MISSING, VBAArray, VBAErrorValue

from tests.compare import same
from tests.examples import ELEMENTWISE, FUNCTIONS, example, given_numbers
from uffuncs.cell import call
from uffuncs.check_values import checks
from uffuncs.declaration import Tool
from uffuncs.errors import ERROR_CODES, ErrorValue
from uffuncs.registry import functions

RECORDS = list(functions().values())
TOOLS = [r for r in RECORDS if isinstance(r, Tool)]
CHECKED = [c for c in checks() if c.function in functions()]
#: Tried in every argument, and those tried in the first number only.
BAD = {"text": "no number", "boolean": True, "blank": None, "error": ErrorValue("#REF!")}
RARE = {"comma": "2,5", "dimension": "1 mol**3", "empty": ""}


def by_name(record):
    return record.worksheet_name


def agrees(excel, name, cells):
    """The cell shows what the contract gives for the same values, to the last digit."""
    expected, shown = call(name, cells), excel.call(name, cells)
    if isinstance(expected, list) and len(expected) == len(expected[0]) == 1:
        expected = expected[0][0]
    assert same(shown, expected, 0), (cells, shown, expected)
    return shown


@pytest.mark.parametrize("check", CHECKED, ids=lambda c: c.function)
def test_published_values(excel, check):
    agrees(excel, check.function, check.cells)


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_example_has_a_result(excel, record):
    shown = agrees(excel, record.worksheet_name, example(record))
    assert not isinstance(shown, ErrorValue)


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_bad_cells_are_true_errors(excel, record):
    cells = example(record)
    first = next((i for i, a in enumerate(record.arguments) if a.kind == "number"), None)
    for i, argument in enumerate(record.arguments):
        bad = BAD | RARE if i == first else dict(BAD)
        if argument.kind == "number":
            bad |= {"below": argument.quantity.low - 1, "above": 1.01 * argument.quantity.high + 1}
        for what, value in bad.items():
            shown = agrees(excel, record.worksheet_name, [*cells[:i], value, *cells[i + 1 :]])
            if argument.kind == "number" and what in ("text", "dimension", "boolean", "error"):
                assert isinstance(shown, ErrorValue), (argument.name, what)
                assert shown.code == ("#REF!" if what == "error" else "#VALUE!"), (argument.name, what)
            if what in ("below", "above"):
                assert shown == ErrorValue("#NUM!"), (argument.name, what)


@pytest.mark.parametrize("record", ELEMENTWISE, ids=by_name)
def test_range_with_bad_elements(excel, record):
    cells = example(record)
    for i in given_numbers(record, cells):
        column = [
            [cells[i]],
            ["no number"],
            [None],
            [ErrorValue("#DIV/0!")],
            [record.arguments[i].quantity.high * 1.01 + 1],
            [cells[i]],
        ]
        shown = agrees(excel, record.worksheet_name, [*cells[:i], column, *cells[i + 1 :]])
        assert shown[1][0] == ErrorValue("#VALUE!") and shown[3][0] == ErrorValue("#DIV/0!")
        assert shown[4][0] == ErrorValue("#NUM!") and not isinstance(shown[0][0], ErrorValue)
        row = [[cells[i], ErrorValue("#N/A"), cells[i]]]
        shown = agrees(excel, record.worksheet_name, [*cells[:i], row, *cells[i + 1 :]])
        assert shown[0][1] == ErrorValue("#N/A")


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_reasons(excel, record):
    agrees(excel, "UF_WHY", [record.worksheet_name, *example(record)])
    agrees(excel, "UF_WHY", [record.worksheet_name])
    agrees(excel, "UF_SOURCE", [record.worksheet_name])
    agrees(excel, "UF_ARGUMENTS", [record.worksheet_name])


@pytest.mark.parametrize("record", TOOLS, ids=by_name)
def test_tools_with_blanks_errors_and_numbers(excel, record):
    most = len(record.arguments)
    for value in (None, "", 5.0, True, "no such thing", ErrorValue("#NAME?")):
        if not (value in (None, "") and record.worksheet_name == "UF_FUNCTIONS"):
            agrees(excel, record.worksheet_name, [value] * most)


def test_all_functions_are_listed(excel):
    shown = agrees(excel, "UF_FUNCTIONS", [None])
    assert [row[0] for row in shown] == list(functions())


def test_solving_and_uncertainty_take_further_cells(excel):
    shown = agrees(
        excel, "UF_SOLVE_FOR", ["UF_FLUX_DARCY", "transmembrane_pressure", "20 gfd", None, 1.002, 5e12]
    )
    assert 0.472 < shown < 0.473  # 20 gfd = 9.43e-6 m/s, times 1.002e-3 Pa·s and 5e12 1/m
    shown = agrees(
        excel, "UF_UNCERTAINTY", ["UF_FLUX_DARCY", "2.0 ± 0.1 bar", "1.8 .. 2.2 cP", "5e12 ± 10 % 1/m"]
    )
    assert len(shown[0]) == 4 + len(functions()["UF_FLUX_DARCY"].arguments)
    assert agrees(excel, "UF_WHY", ["UF_FLUX_DARCY", [[1.0, -1.0]], 1.0, 5e12])[0][0].startswith("ok")


def test_arguments_left_out_between_commas(excel):
    reason = excel.raw("UF_WHY", "UF_FLUX_DARCY", 2.0, MISSING, 5e12)
    assert reason == call("UF_WHY", ["UF_FLUX_DARCY", 2.0, None, 5e12]) and "blank" in reason
    assert excel.library.server.cells == ("UF_FLUX_DARCY", 2.0, None, 5e12)
    solved = excel.raw("UF_SOLVE_FOR", "UF_FLUX_DARCY", "transmembrane_pressure", 50.0, MISSING, 1.0, 5e12)
    assert same(
        solved, call("UF_SOLVE_FOR", ["UF_FLUX_DARCY", "transmembrane_pressure", 50.0, None, 1.0, 5e12]), 0
    )
    assert excel.raw("UF_QUANTITY", 2.0, "bar", MISSING) == "2.0 bar"
    assert same(
        excel.raw("UF_FLUX_DARCY", 2.0, 1.0, 5e12, MISSING), call("UF_FLUX_DARCY", [2.0, 1.0, 5e12]), 0
    )


@pytest.mark.parametrize("code", ERROR_CODES)
def test_each_error_value_comes_out_as_it_went_in(excel, code):
    assert agrees(excel, "UF_FLUX_DARCY", [ErrorValue(code), 1.0, 5e12]) == ErrorValue(code)
    assert agrees(excel, "UF_FLUX_DARCY", [[[1.0], [ErrorValue(code)]], 1.0, 5e12])[1][0] == ErrorValue(code)


def test_texts_that_look_like_errors_stay_texts(excel):
    """A text that only reads like an error value is none, neither on the way in nor on the way out."""
    shown = agrees(excel, "UF_WHY", ["#NUM!"])
    assert isinstance(shown, str)
    assert agrees(excel, "UF_FLUX_DARCY", ["#DIV/0!", 1.0, 5e12]) == ErrorValue("#VALUE!")


def test_values_computed_in_the_formula(excel):
    """Array constants and results of other functions come as arrays of VBA, a row as one of one dimension."""
    row = VBAArray([(1, 3)], items=[1.0, VBAErrorValue(2042), EMPTY])
    assert same(
        excel.raw("UF_FLUX_DARCY", row, 1.0, 5e12),
        call("UF_FLUX_DARCY", [[[1.0, ErrorValue("#N/A"), None]], 1.0, 5e12]),
        0,
    )
    column = VBAArray([(1, 2), (1, 1)], items=[1.0, 2.0])
    assert same(
        excel.raw("UF_FLUX_DARCY", column, 1.0, 5e12), call("UF_FLUX_DARCY", [[[1.0], [2.0]], 1.0, 5e12]), 0
    )
    assert same(excel.raw("UF_FLUX_DARCY", True, 1.0, 5e12), ErrorValue("#VALUE!"))


def test_several_areas_are_refused(excel):
    excel.fill("A1", 1.0)
    excel.fill("C1", 2.0)
    assert excel.raw("UF_FLUX_DARCY", excel.range("A1,C1"), 1.0, 5e12) == ErrorValue("#VALUE!")


def test_whole_columns_end_with_the_sheet(fresh):
    for r, value in enumerate((1.0, 2.0, -1.0), 1):
        fresh.fill(f"B{r}", value)
    fresh.fill("D7", "the last row in use")
    shown = fresh.raw("UF_FLUX_DARCY", fresh.range("B:B"), 1.0, 5e12)
    assert same(
        shown, call("UF_FLUX_DARCY", [[[1.0], [2.0], [-1.0], [None], [None], [None], [None]], 1.0, 5e12]), 0
    )
