"""Every error cell says why, and where an error that is passed on comes from."""

from headless_books import cell, parts_of, reasons, sheet_xml
from openpyxl.worksheet.formula import ArrayFormula

from uffuncs.cell import call
from uffuncs.headless import report_lines
from uffuncs.headless.reasons import qualified


def by_address(report):
    return {error.address: error for error in report.errors}


def test_reason_is_that_of_the_function(bench):
    report, values = bench.formulas(
        {"A1": "wet", "B1": "=UF_FLUX_DARCY(A1,1,5E12)", "C1": "=UF_FLUX_DARCY(-1E9,1,5E12)"}
    )
    assert values["B1"] == "#VALUE!" and values["C1"] == "#NUM!"
    errors = by_address(report)
    assert errors["B1"].reason == call("UF_WHY", ["UF_FLUX_DARCY", "wet", 1.0, 5e12])
    assert errors["C1"].reason == call("UF_WHY", ["UF_FLUX_DARCY", -1e9, 1.0, 5e12])
    assert (
        errors["B1"].reason.startswith("UF_FLUX_DARCY: transmembrane_pressure") and errors["B1"].source == ""
    )
    assert errors["B1"].formula == "=UF_FLUX_DARCY(A1,1,5E12)"


def test_innermost_failing_function_is_named(bench):
    report, _ = bench.formulas(
        {
            "A1": '=UF_FLUX_FROM_FLOW(UF_FLOW_FROM_FLUX("wet",1),1)',
            "A2": '=UF_FLUX_FROM_FLOW(IFERROR(UF_FLOW_FROM_FLUX("wet",1),1),-1)',
            "A3": '=1+UF_FLUX_FROM_FLOW(1,UF_FLOW_FROM_FLUX(1,"wet"))',
        }
    )
    errors = by_address(report)
    assert errors["A1"].reason.startswith("UF_FLOW_FROM_FLUX: flux")
    assert errors["A2"].reason.startswith("UF_FLUX_FROM_FLOW: area")
    assert errors["A3"].reason.startswith("UF_FLOW_FROM_FLUX: area")


def test_recovered_errors_are_no_reason(bench):
    report, values = bench.formulas(
        {"A1": '=IFERROR(UF_FLUX_DARCY("wet",1,5E12),0)+1/0', "A2": '=IFERROR(UF_FLUX_DARCY("wet",1,5E12),0)'}
    )
    assert values["A2"] == 0 and [e.address for e in report.errors] == ["A1"]
    assert "zero" in by_address(report)["A1"].reason


def test_error_passed_on_names_the_cell_it_comes_from(bench):
    report, _ = bench.formulas(
        {
            "A1": '=UF_FLUX_DARCY("wet",1,5E12)',
            "A2": "=A1*2",
            "A3": "=SUM(A1:A2)+1",
            "A4": "=UF_FLUX_DARCY(A3,1,5E12)",
            "A5": "=bad",
            "B1": "=SUM(A:A)",
        },
        bad="S!$A$2",
    )
    errors = by_address(report)
    for address in ("A2", "A3", "A4", "A5", "B1"):
        assert errors[address].source == "S!A1", address
        assert errors[address].reason == "from S!A1: " + errors["A1"].reason
    assert errors["A1"].source == ""


def test_constant_error_cells_and_other_sheets(bench):
    sheets = {
        "in put": sheet_xml('<row r="1"><c r="A1" t="e"><v>#N/A</v></c>' + cell("B1", "1/0") + "</row>"),
        "out": sheet_xml(
            '<row r="1">'
            + cell("A1", "UF_FLUX_DARCY('in put'!A1,1,5E12)")
            + cell("B1", "'in put'!B1")
            + "</row>"
        ),
    }
    report, values = bench.run(parts_of(sheets))
    assert values["out"]["A1"] == "#N/A" and values["out"]["B1"] == "#DIV/0!"
    errors = {(e.sheet, e.address): e for e in report.errors}
    assert errors["out", "B1"].source == "in put!B1"
    assert errors["out", "A1"].reason


def test_array_elements_have_their_own_reasons(bench):
    report, _ = bench.formulas(
        {"A1": -1e9, "A2": "wet", "C1": ArrayFormula("C1:C2", "=UF_FLUX_DARCY(A1:A2,1,5E12)"), "D1": "=C2+1"}
    )
    errors = by_address(report)
    assert "transmembrane_pressure must be" in errors["C1"].reason and "wet" in errors["C2"].reason
    assert errors["D1"].source == "S!C2"


def test_unknown_functions_are_listed_even_where_the_error_is_caught(bench):
    report, values = bench.formulas(
        {
            "A1": "=IFERROR(NOSUCH(1),5)",
            "A2": "=UF_NO_SUCH(1)+NOSUCH(2)",
            "A3": '="OTHER(1)"',
            "A4": "=BYROW(B1:C2,LAMBDA(r,SUM(r)))",
            "A5": "=nosuch(1)",
            "A6": "=SUM(1)",
        }
    )
    assert {u.name: [a for _, a in u.cells] for u in report.unknown_functions} == {
        "NOSUCH": ["A1", "A2", "A5"],
        "UF_NO_SUCH": ["A2"],
        "BYROW": ["A4"],
        "LAMBDA": ["A4"],
    }
    assert values["A1"] == 5 and values["A4"] == "#NAME?" and "UF_NO_SUCH" in reasons(report)["S!A2"]


def test_ten_thousand_errors(bench):
    cells = {"A1": '=UF_FLUX_DARCY("wet",1,5E12)'} | {f"A{r}": f"=A{r - 1}+1" for r in range(2, 5001)}
    cells |= {f"B{r}": f"=UF_FLUX_DARCY(A{r},1,5E12)" for r in range(1, 5001)}
    report, _ = bench.formulas(cells)
    assert len(report.errors) == 10_000 and report.seconds < 30
    assert all(error.source == "S!A1" for error in report.errors if error.address != "A1")


def test_reason_is_not_that_of_a_recovered_error_upstream(bench):
    """C1 reads a cell in which a uffuncs function failed unnoticed; its own error is another one."""
    report, values = bench.formulas(
        {
            "C1": '=UF_FLUX_DARCY(B9+"x",1,5E12)',
            "B9": '=IFERROR(UF_FLUX_FROM_FLOW("wet",1),1)',
            "A20": "=UF_FLUX_DARCY(A21,1,5E12)",
            "A21": '=UF_FLUX_FROM_FLOW("wet",1)',
        }
    )
    errors = by_address(report)
    assert "UF_FLUX_FROM_FLOW" not in errors["C1"].reason
    assert errors["A20"].source == "S!A21" and errors["A21"].reason.startswith(
        "UF_FLUX_FROM_FLOW: permeate_flow"
    )


def test_qualified():
    assert qualified(
        "=UF_X(A1,$B$2:C3,T!D4,'a b'!E5:F6,\"G7\",name,LOG10(A:A),J1#,@A1:A2)", "it's", {"name"}
    ) == (
        "=UF_X('it''s'!A1,'it''s'!$B$2:C3,T!D4,'a b'!E5:F6,\"G7\",'it''s'!name,LOG10('it''s'!A:A),'it''s'!J1#,@'it''s'!A1:A2)"
    )


def test_lines(bench):
    report, _ = bench.formulas(
        {"A1": '=UF_FLUX_DARCY("wet",1,5E12)', "A2": "=A1", "A3": "=NOSUCH(1)", "A4": "=NOSUCH(2)"}
    )
    lines = report_lines(report, most=1)
    assert "4 formulas (1 with uffuncs functions)" in lines[0] and "4 errors" in lines[0]
    assert lines[1].startswith("  S!A1  #VALUE!  UF_FLUX_DARCY: ") and lines[2] == "  and 3 more error cells"
    assert "NOSUCH: S!A3, S!A4" in lines[3]
