"""Array formulas, dynamic arrays, tables, omitted arguments and whole columns, through the engine."""

import openpyxl
import pytest
from headless_books import cell, members, reasons
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.table import Table

from uffuncs.cell import call

FLUXES = [call("UF_FLUX_DARCY", [float(p), 1.0, 5e12]) for p in (1, 2, 3)]
STEPS = call("UF_RESISTANCE_STEPS", [100.0, 40.0, 60.0, 90.0, 1.0])


def pressures(**more):
    return {"A1": 1, "A2": 2, "A3": 3} | more


def test_elementwise_array_formula(bench):
    report, values = bench.formulas(
        pressures(
            C1=ArrayFormula("C1:C5", "=UF_FLUX_DARCY(A1:A3,1,5E12)"), D1="=SUM(C1:C3)", D2="=COUNT(C1:C5)"
        )
    )
    assert [values[f"C{r}"] for r in range(1, 6)] == [*FLUXES, "#N/A", "#N/A"]
    assert values["D1"] == pytest.approx(sum(FLUXES)) and values["D2"] == 3
    assert "smaller than its range" in reasons(report)["S!C4"]
    formula = openpyxl.load_workbook(bench.folder / "out.xlsx")["S"]["C1"].value
    assert (formula.ref, formula.text) == ("C1:C5", "=UF_FLUX_DARCY(A1:A3,1,5E12)")


def test_single_values_rows_and_columns_repeat(bench):
    report, values = bench.formulas(
        pressures(
            C1=ArrayFormula("C1:D2", "=UF_FLUX_DARCY(1,1,5E12)"),
            F1=ArrayFormula("F1:G3", "=A1:A3*10"),
            I1=ArrayFormula("I1:J4", "=UF_RESISTANCE_STEPS(100,40,60,90,1)"),
        )
    )
    assert {values[k] for k in ("C1", "C2", "D1", "D2")} == {FLUXES[0]}
    assert [values[k] for k in ("F1", "G1", "F3", "G3")] == [10, 10, 30, 30]
    assert [[values[f"{c}{r}"] for c in "IJ"] for r in range(1, 5)] == STEPS


def test_failing_elements_stay_in_their_place(bench):
    report, values = bench.formulas(
        {
            "A1": 1,
            "A2": "wet",
            "A3": 3,
            "A4": None,
            "C1": ArrayFormula("C1:C4", "=UF_FLUX_DARCY(A1:A4,1,5E12)"),
        }
    )
    assert [values[f"C{r}"] for r in range(1, 5)] == [FLUXES[0], "#VALUE!", FLUXES[2], "#VALUE!"]
    why = reasons(report)
    assert "wet" in why["S!C2"] and "blank" in why["S!C4"]


def test_array_formula_that_fails_as_a_whole(bench):
    report, values = bench.formulas({"C1": ArrayFormula("C1:C3", "=NOSUCH(1)")})
    assert [values[f"C{r}"] for r in (1, 2, 3)] == ["#NAME?"] * 3
    assert [(u.name, u.cells) for u in report.unknown_functions] == [("NOSUCH", [("S", "C1")])]


def test_array_range_larger_than_the_engine_spills(bench):
    rows = 25_003
    report, values = bench.formulas(
        {
            "A1": 2,
            "C1": ArrayFormula(f"C1:C{rows}", "=UF_FLUX_DARCY(A1,1,5E12)"),
            "E1": ArrayFormula(f"E1:E{rows}", f"=ROW(A1:A{rows})*1"),
            "D1": f"=SUM(C1:C{rows})",
        }
    )
    assert values[f"C{rows}"] == FLUXES[1] and values["D1"] == pytest.approx(rows * FLUXES[1])
    assert [values[f"E{r}"] for r in (1, 10_000, 10_001, 20_001, rows)] == [1, 10_000, 10_001, 20_001, rows]


def dynamic(formula, area, value, further=""):
    return (
        f'<row r="1"><c r="A1"><v>1</v></c><c r="C1" cm="1"><f t="array" ref="{area}">{formula}</f><v>{value}</v></c></row>'
        f'<row r="2"><c r="A2"><v>2</v></c>{further}</row><row r="3"><c r="A3"><v>3</v></c></row>'
    )


def test_dynamic_array_grows_and_shrinks(bench):
    rows = dynamic("UF_FLUX_DARCY(A1:A3,1,5E12)", "C1:C2", 0, '<c r="C2" s="0"><v>0</v></c>')
    report, values = bench.rows(rows)
    assert [values[f"C{r}"] for r in (1, 2, 3)] == FLUXES
    data = members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"]
    assert b'cm="1"><f t="array" ref="C1:C3">' in data and b'<c r="C2" s="0"><v>' in data
    report, values = bench.rows(dynamic("UF_FLUX_DARCY(A1,1,5E12)", "C1:C2", 0, '<c r="C2"><v>7</v></c>'))
    assert values["C1"] == FLUXES[0] and "C2" not in values
    assert [(c.address, c.after) for c in report.changes] == [("C1", FLUXES[0]), ("C2", None)]
    assert b'<f t="array" ref="C1">' in members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"]


def test_dynamic_array_is_referred_to_whole(bench):
    rows = dynamic("UF_FLUX_DARCY(A1:A3,1,5E12)", "C1:C3", 0, cell("E2", "SUM(_xlfn.ANCHORARRAY(C1))"))
    assert bench.rows(rows)[1]["E2"] == pytest.approx(sum(FLUXES))


def test_dynamic_array_that_is_blocked(bench):
    rows = dynamic("UF_FLUX_DARCY(A1:A3,1,5E12)", "C1", 0, cell("C2", "1+1"))
    report, values = bench.rows(rows)
    assert values["C2"] == 2 and [(e.address, e.code) for e in report.errors] == [("C1", "#SPILL!")]
    assert "more cells" in reasons(report)["S!C1"]
    assert values["C1"] == "#VALUE!"  # what programs save: the file format has no #SPILL!


def test_array_rows_are_added_where_the_file_has_none(bench):
    rows = (
        '<row r="1" spans="1:1"><c r="A1"><f t="array" ref="A1:C3">{1,2,3;4,5,6;7,8,9}</f></c></row>'
        '<row r="3" spans="2:2"/>'
    )
    report, values = bench.rows(rows)
    assert [[values[f"{c}{r}"] for c in "ABC"] for r in (1, 2, 3)] == [[1, 2, 3], [4, 5, 6], [7, 8, 9]]
    data = members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"]
    assert b'<row r="1" spans="1:3">' in data and b'<row r="3" spans="1:3">' in data


def test_plain_formula_with_several_values_shows_one(bench):
    report, values = bench.formulas(
        pressures(
            C3="=A1:A3*2",
            D2="=ABS(A1:A3)",
            E1="=UF_RESISTANCE_STEPS(100,40,60,90,1)",
            E2="kept",
            F1="=SUM(A1:A3)*2",
            G9="=A1:A3*2",
            H2="=area*2",
            I1="=SUM(E1:E4)",
        ),
        area="S!$A$1:$A$3",
    )
    assert (values["C3"], values["D2"], values["E1"], values["E2"], values["F1"]) == (
        6,
        2,
        STEPS[0][0],
        "kept",
        12,
    )
    assert values["G9"] == "#VALUE!" and values["H2"] == 4 and values["I1"] == STEPS[0][0]
    assert not {"C4", "E3", "F2"} & set(values)
    assert any("no array formulas" in note for note in report.notes)


def test_omitted_arguments_take_their_defaults(bench):
    report, values = bench.formulas(
        {
            "A1": "=UF_PERMEABILITY_AT(100,10,,)",
            "A2": "=UF_PERMEABILITY_AT(100,10)",
            "A3": "=UF_PERMEABILITY_AT(100,10,20)",
            "A4": "=UF_PERMEABILITY_AT(100,,20)",
            "A5": "=UF_PERMEABILITY_AT(100,B9,20)",
            "A6": "=UF_PERMEABILITY_AT(100,10,B9)",
        }
    )
    expected = call("UF_PERMEABILITY_AT", [100.0, 10.0])
    assert values["A1"] == values["A2"] == values["A6"] == expected
    assert values["A4"] == values["A5"] == "#VALUE!" and "blank" in reasons(report)["S!A4"]
    assert call("UF_PERMEABILITY_AT", [100.0, 10.0, 0.0]) != expected  # 0 would be another answer


def table_workbook():
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "it's"
    for row in (["pressure, bar", "flux"], [1, None], [2, None], [3, None], ["total", None]):
        sheet.append(row)
    for row in (2, 3, 4):
        sheet[f"B{row}"] = "=UF_FLUX_DARCY(Runs[[#This Row],[pressure, bar]],1,5E12)"
    sheet["B5"] = "=SUBTOTAL(109,Runs[flux])"
    table = Table(displayName="Runs", ref="A1:B5", totalsRowCount=1)
    table._initialise_columns()
    for column, name in zip(table.tableColumns, ("pressure, bar", "flux")):
        column.name = name
    sheet.add_table(table)
    other = book.create_sheet("other")
    other["A1"] = "=SUM(Runs[flux])"
    other["A2"] = "=Runs[[#Headers],[flux]]"
    other["A3"] = "=Runs[[#Totals],[flux]]"
    other["A4"] = "=COUNTA(Runs[#All])"
    other["A5"] = "=SUM('it''s'!B2:B4)"
    other["A6"] = "=SUM(fluxes)"
    other["A7"] = ArrayFormula("A7:A9", "=UF_FLUX_DARCY(Runs[pressure, bar],1,5E12)")
    book.defined_names["fluxes"] = DefinedName("fluxes", attr_text="Runs[flux]")
    return book


def test_tables_by_structured_reference_and_by_address(bench):
    report, values = bench.run(table_workbook())
    total = sum(FLUXES)
    assert [values["it's"][f"B{r}"] for r in (2, 3, 4)] == FLUXES and values["it's"]["B5"] == pytest.approx(
        total
    )
    other = values["other"]
    assert other["A1"] == other["A3"] == other["A5"] == other["A6"] == pytest.approx(total)
    assert other["A2"] == "flux" and other["A4"] == 10
    assert [other[f"A{r}"] for r in (7, 8, 9)] == FLUXES
    assert report.errors == [] and report.own_formulas == 4


def test_whole_columns_come_without_their_blank_end(bench):
    report, values = bench.formulas(
        pressures(
            C1=ArrayFormula("C1:C3", "=UF_FLUX_DARCY(A:A,1,5E12)"),
            E500="=ROWS(A1:A500)",
            D1="=SUM(A:A)",
            D2='=COUNTIF(A:A,">1")',
            D3="=SUM(UF_FLUX_DARCY(A:A,1,5E12))",
        )
    )
    assert [values[f"C{r}"] for r in (1, 2, 3)] == FLUXES
    assert values["D1"] == 6 and values["D2"] == 2 and values["D3"] == pytest.approx(sum(FLUXES))


def test_matrix_functions(bench):
    report, values = bench.formulas(
        {
            "A1": 2,
            "B1": 1,
            "A2": 1,
            "B2": 3,
            "D1": "=MDETERM(A1:B2)",
            "E1": ArrayFormula("E1:F2", "=MINVERSE(A1:B2)"),
            "H1": ArrayFormula("H1:I2", "=MMULT(A1:B2,MINVERSE(A1:B2))"),
            "K1": "=MDETERM(A1:C2)",
            "K2": ArrayFormula("K2", "=MINVERSE({1,2;2,4})"),
            "K3": '=MDETERM({1,"x";2,3})',
            "K4": "=MMULT(A1:B2,A1:B1)",
            "K5": "=MDETERM(A1:A1)",
        }
    )
    assert values["D1"] == pytest.approx(5)
    assert [[values[f"{c}{r}"] for c in "EF"] for r in (1, 2)] == [
        pytest.approx([0.6, -0.2]),
        pytest.approx([-0.2, 0.4]),
    ]
    assert [[values[f"{c}{r}"] for c in "HI"] for r in (1, 2)] == [
        pytest.approx([1, 0]),
        pytest.approx([0, 1], abs=1e-12),
    ]
    assert (values["K1"], values["K2"], values["K3"], values["K4"]) == (
        "#VALUE!",
        "#NUM!",
        "#VALUE!",
        "#VALUE!",
    )
    assert values["K5"] == 2


def test_native_functions_over_ranges(bench):
    """The values a spreadsheet program shows for these formulas, worked out by hand."""
    report, values = bench.formulas(
        {
            "A1": -1.5,
            "A2": "four",
            "A3": 4,
            "B1": 10,
            "C1": "=SUMPRODUCT(LEN(A1:A3))",
            "C2": "=SUMPRODUCT(--ISNUMBER(A1:A3))",
            "C3": "=SUMPRODUCT(ROW(A1:A3)*2)",
            "C4": '=SUMPRODUCT((LEFT(A1:A3,1)="f")*1)',
            "C5": "=SUM(ABS({-1,2;-3,4}))",
            "C6": "=SUMPRODUCT(--ISBLANK(A1:A6))",
            "C7": "=SUM(IFERROR(ABS(A1:A3),100))",
            "C8": "=SUMPRODUCT(POWER({1;2},{1,2}))",
            "E1": ArrayFormula("E1:E3", "=ABS(A1:A3)"),
            "F1": ArrayFormula("F1:F3", '=TEXT(A1:A3,"0.0")'),
            "G1": "=LEN(A1:A3)",
            "G2": "=LEN(A1:A3)",
            "G3": "=A:A*2",
            "H1": "=ROUND(UF_FLUX_DARCY(B1:B1,1,5E12),0)",
        }
    )
    assert [values[f"C{r}"] for r in range(1, 9)] == [9, 2, 12, 1, 10, 3, 105.5, 8]
    assert [values[f"E{r}"] for r in (1, 2, 3)] == [1.5, "#VALUE!", 4]
    assert [values[f"F{r}"] for r in (1, 2, 3)] == ["-1.5", "four", "4.0"]
    assert (values["G1"], values["G2"], values["G3"], values["H1"]) == (4, 4, 8, 720)
