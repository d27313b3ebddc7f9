"""The cell contract in the real program: units, blanks, ranges, error values, further arguments."""

from __future__ import annotations

import pytest

from uffuncs.cell import call

LONGEST = 1_048_576
FLUX = [1.0, 2.0, "35 psi", -1.0, None, "x", 3.0]


def put(sheet, place: str, formula: str):
    """The value and the error code of a formula."""
    cell = sheet.getCellRangeByName(place)
    cell.setFormula(formula)
    return (cell.String if cell.FormulaResultType2 == 2 else cell.Value), cell.getError()


def column(sheet, letter: str, values, first: int = 1):
    for row, value in enumerate(values, first):
        cell = sheet.getCellRangeByName(f"{letter}{row}")
        if isinstance(value, str):
            cell.setFormula(value) if value.startswith("=") else cell.setString(value)
        elif value is not None:
            cell.setValue(value)


def array(sheet, area: str, formula: str):
    """Values of an array formula, error codes in the place of errors."""
    cells = sheet.getCellRangeByName(area)
    cells.setArrayFormula(formula)
    rows = []
    for i in range(cells.Rows.Count):
        row = [cells.getCellByPosition(j, i) for j in range(cells.Columns.Count)]
        rows.append([f"error {c.getError()}" if c.getError() else c.Value for c in row])
    return rows


def test_unit_text_and_number(sheet):
    expected = call("UF_FLUX_DARCY", ["35 psi", 1.002, 5e12])
    assert put(sheet, "A1", '=UF_FLUX_DARCY("35 psi";1.002;5E12)') == (pytest.approx(expected, rel=1e-15), 0)
    column(sheet, "B", ["35 psi", "1.002"])
    assert put(sheet, "A1", "=uf_flux_darcy(B1;B2;5E12)") == (pytest.approx(expected, rel=1e-15), 0)


@pytest.mark.parametrize(
    "formula, error",
    [
        ("=UF_FLUX_DARCY(-1;1.002;5E12)", 503),
        ('=UF_FLUX_DARCY("2,4";1.002;5E12)', 519),
        ('=UF_FLUX_DARCY("2 kg";1.002;5E12)', 519),
        ("=UF_FLUX_DARCY(;1.002;5E12)", 519),
        ("=UF_FLUX_DARCY(2)", 519),
        ("=UF_FLUX_DARCY(1/0;1.002;5E12)", 532),
        ("=UF_FLUX_DARCY(NA();1.002;5E12)", 32767),
        ('=UF_SOURCE("UF_NOTHING")', 32767),
    ],
)
def test_true_error_values(sheet, formula, error):
    assert put(sheet, "A1", formula)[1] == error
    assert put(sheet, "A2", '=IFERROR(A1;"caught")') == ("caught", 0)


def test_optional_arguments_left_out(sheet):
    full = "=UF_FLUX_DARCY(2;1.002;5E12;0;1E12;0.5;1)"
    assert put(sheet, "A1", "=UF_FLUX_DARCY(2;1.002;5E12;;1E12;0.5)") == put(sheet, "A2", full)


def test_a_blank_cell_arrives_as_zero(sheet):
    """A known limit of the program: where zero is outside the bounds it shows #NUM!, else it counts as 0."""
    assert put(sheet, "A1", "=UF_FLUX_DARCY(2;Z1;5E12)")[1] == 503
    assert put(sheet, "A1", "=UF_FLUX_DARCY(Z1;1.002;5E12)") == (0.0, 0)


def test_true_arrives_as_one(sheet):
    """A known limit of the program: a boolean cannot be told from a number."""
    assert put(sheet, "A1", "=UF_FLUX_DARCY(TRUE();1.002;5E12)") == put(
        sheet, "A2", "=UF_FLUX_DARCY(1;1.002;5E12)"
    )


def test_errors_stay_in_their_places(sheet):
    column(sheet, "A", FLUX)
    column(sheet, "B", [1.0] * 7)
    codes = {"#NUM!": "error 503", "#VALUE!": "error 519"}
    expected = call("UF_FLUX_DARCY", [[[v] for v in FLUX], 1.0, 5e12])
    expected = [[codes.get(str(v), v) for v in row] for row in expected]
    assert array(sheet, "C1:C7", "=UF_FLUX_DARCY(A1:A7;B1:B7;5E12)") == expected
    assert array(sheet, "D1:D7", "=UF_FLUX_DARCY(A1:A7;1;5E12)") == expected
    assert [e for e in expected if isinstance(e[0], str)] == [["error 503"], ["error 519"], ["error 519"]]


def test_an_error_cell_in_a_range(sheet):
    """A known limit: the program refuses the whole call (Err:504); IFERROR makes the cell a blank text."""
    column(sheet, "A", [1.0, "=NA()", 2.0])
    assert array(sheet, "B1:B3", "=UF_FLUX_DARCY(A1:A3;1;5E12)") == [["error 504"]] * 3
    values = array(sheet, "C1:C3", '=UF_FLUX_DARCY(IFERROR(A1:A3;"");1;5E12)')
    assert values == [[pytest.approx(72)], ["error 519"], [pytest.approx(144)]]


def test_broadcast_and_shapes_that_do_not_fit(sheet):
    values = array(sheet, "A1:B2", "=UF_FLUX_DARCY({1|2};{1.2;2.4};5E12)")
    assert values == [[pytest.approx(60), pytest.approx(30)], [pytest.approx(120), pytest.approx(60)]]
    assert array(sheet, "A4:A5", "=UF_FLUX_DARCY({1|2};{1|2|3};5E12)") == [["error 519"]] * 2


def test_an_array_formula_feeds_a_native_function(sheet):
    column(sheet, "A", [1.0, 2.0, 3.0])
    assert put(sheet, "B1", "=SUMPRODUCT(UF_FLUX_DARCY(A1:A3;1;5E12))")[0] == pytest.approx(432)


@pytest.mark.parametrize("areas", [("A:A", "B:B"), (f"A2:A{LONGEST}", f"B2:B{LONGEST}")])
def test_whole_columns(sheet, areas):
    column(sheet, "A", [1.0, 2.0, 3.0, 4.0], first=2)
    column(sheet, "B", [1.0, 1.0, 2.0], first=2)
    values = array(sheet, "D1:D6", f"=UF_FLUX_DARCY({areas[0]};{areas[1]};5E12)")
    found = [v[0] for v in values if not isinstance(v[0], str)]
    assert found == [pytest.approx(v) for v in (72, 144, 108)]


def test_whole_columns_of_a_fit(sheet):
    from uffuncs.check_values import checks
    from uffuncs.registry import functions

    check = next(
        c
        for c in checks()
        if [type(a) for a in c.arguments] == [list, list]
        and all(isinstance(v, (int, float)) for a in c.arguments for v in a)
        and not functions()[c.function].block
    )
    for letter, values in zip("AB", check.arguments, strict=True):
        column(sheet, letter, values)
    assert put(sheet, "D1", f"={check.function}(A:A;B:B)")[0] == pytest.approx(
        call(check.function, check.cells), rel=1e-14
    )


def test_further_arguments(sheet):
    value, error = put(
        sheet, "A1", '=UF_SOLVE_FOR("UF_FLUX_DARCY";"transmembrane_pressure";"20 gfd";;1.002;5E12)'
    )
    assert error == 0
    assert value == call(
        "UF_SOLVE_FOR", ["UF_FLUX_DARCY", "transmembrane_pressure", "20 gfd", None, 1.002, 5e12]
    )
    uncertain = ["UF_FLUX_DARCY", "2.0 ± 0.1 bar", "1.8 .. 2.2 cP", 5e12]
    row = array(sheet, "A2:K2", '=UF_UNCERTAINTY("UF_FLUX_DARCY";"2.0 ± 0.1 bar";"1.8 .. 2.2 cP";5E12)')[0]
    assert row == call("UF_UNCERTAINTY", uncertain)[0]


def test_why(sheet):
    text, _ = put(sheet, "A1", '=UF_WHY("UF_FLUX_DARCY";-1;1.002;5E12)')
    assert text == call("UF_WHY", ["UF_FLUX_DARCY", -1, 1.002, 5e12])
    column(sheet, "B", FLUX)
    cells = sheet.getCellRangeByName("C1:C7")
    cells.setArrayFormula('=UF_WHY("UF_FLUX_DARCY";B1:B7;1;5E12)')
    expected = call("UF_WHY", ["UF_FLUX_DARCY", [[v] for v in FLUX], 1.0, 5e12])
    assert [list(row) for row in cells.getDataArray()] == expected


def test_wizard_texts(calc):
    from uffuncs.calc.names import add_in_functions

    descriptions = calc.create("com.sun.star.sheet.FunctionDescriptions")
    shown = {}
    for i in range(descriptions.Count):
        entry = {p.Name: p.Value for p in descriptions.getByIndex(i)}
        shown[entry["Name"]] = entry
    for function in add_in_functions():
        entry = shown[function.name]
        assert entry["Description"] == function.description
        assert tuple((a.Name, a.Description) for a in entry["Arguments"] or ()) == function.arguments
    darcy = {a.Name: a.Description for a in shown["UF_FLUX_DARCY"]["Arguments"]}
    assert "[bar], 0 to 200; required" in darcy["transmembrane_pressure"]
    assert "[1/m]" in darcy["cake_resistance"] and "default 0" in darcy["cake_resistance"]


def test_two_documents_at_once(calc):
    one, other = calc.open(), calc.open()
    try:
        for document, pressure in ((one, 1), (other, 2)):
            sheet = document.Sheets.getByIndex(0)
            sheet.getCellRangeByName("A1").setValue(pressure)
            put(sheet, "B1", "=UF_FLUX_DARCY(A1;1;5E12)")
        one.Sheets.getByIndex(0).getCellRangeByName("A1").setValue(3)
        values = [d.Sheets.getByIndex(0).getCellRangeByName("B1").Value for d in (one, other)]
        assert values == [pytest.approx(216), pytest.approx(144)]
    finally:
        one.close(True)
        other.close(True)
