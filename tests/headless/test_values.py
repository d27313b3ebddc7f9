"""Values are written, everything else survives, and a second recalculation changes nothing."""

import datetime
import math
import signal
import zipfile
from xml.etree import ElementTree

import openpyxl
import pytest
from hypothesis import given
from hypothesis import strategies as st
from headless_books import cell, members, packed, parts_of, sheet_xml
from openpyxl.chart import LineChart, Reference
from openpyxl.comments import Comment
from openpyxl.formatting.rule import ColorScaleRule
from openpyxl.styles import Font, PatternFill
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.table import Table

from uffuncs.cell import call
from uffuncs.headless import recalculate
from uffuncs.headless.patch import encode, number_text
from uffuncs.headless.recalculate import read_model
from uffuncs.headless.structure import unescape_text


def design_workbook():
    """A small design sheet with everything a recalculation must leave alone."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "Design"
    sheet.append(["pressure", "flux", "double", "check"])
    for row, pressure in enumerate((0.5, 1.0, 1.5), 2):
        sheet.append(
            [pressure, f"=UF_FLUX_DARCY(A{row},1,5E12)", f"=B{row}*2", f'=IF(B{row}>50,"high","low")']
        )
    sheet["B2"].font = Font(bold=True, color="FF0000")
    sheet["C2"].fill = PatternFill("solid", fgColor="FFFF00")
    sheet["B3"].number_format = "0.0"
    sheet["B2"].comment = Comment("from the pilot", "reviewer")
    sheet.conditional_formatting.add(
        "B2:B4", ColorScaleRule(start_type="min", start_color="FFFFFF", end_type="max", end_color="00FF00")
    )
    validation = DataValidation(type="decimal", operator="between", formula1="0", formula2="5")
    sheet.add_data_validation(validation)
    validation.add("A2:A4")
    sheet.add_table(Table(displayName="Runs", ref="A1:D4"))
    chart = LineChart()
    chart.add_data(Reference(sheet, min_col=2, min_row=1, max_row=4), titles_from_data=True)
    sheet.add_chart(chart, "F2")
    book.defined_names["pressures"] = DefinedName("pressures", attr_text="Design!$A$2:$A$4")
    sheet["A6"] = "=SUM(pressures)"
    hidden = book.create_sheet("hidden")
    hidden.sheet_state = "hidden"
    hidden["A1"] = "=Design!B2+1"
    return book


def test_values_and_everything_else(bench):
    source = bench.save(design_workbook())
    report, values = bench.run(source)
    expected = call("UF_FLUX_DARCY", [1.0, 1.0, 5e12])
    assert values["Design"]["B3"] == expected
    assert values["Design"]["C3"] == 2 * expected
    assert values["Design"]["D3"] == "high" and values["Design"]["A6"] == 3
    assert values["hidden"]["A1"] == values["Design"]["B2"] + 1
    assert (report.formulas, report.own_formulas, report.errors) == (11, 3, [])
    before, after = members(source), members(bench.folder / "out.xlsx")
    assert list(before) == list(after)
    differing = {name for name in before if before[name] != after[name]}
    assert differing == {"xl/worksheets/sheet1.xml", "xl/worksheets/sheet2.xml"}
    book = openpyxl.load_workbook(bench.folder / "out.xlsx")
    sheet = book["Design"]
    assert sheet["B2"].font.bold and sheet["B2"].comment.text == "from the pilot" and len(sheet._charts) == 1
    assert sheet["B3"].value == "=UF_FLUX_DARCY(A3,1,5E12)" and sheet["B3"].number_format == "0.0"
    assert "Runs" in sheet.tables and sheet.data_validations.dataValidation and sheet.conditional_formatting


def test_dates_order_and_compression_of_members_stay(bench):
    source = bench.save(design_workbook())
    bench.run(source)
    with zipfile.ZipFile(source) as before, zipfile.ZipFile(bench.folder / "out.xlsx") as after:
        facts = [
            [(i.filename, i.date_time, i.compress_type, i.external_attr) for i in z.infolist()]
            for z in (before, after)
        ]
    assert facts[0] == facts[1]


def test_bytes_outside_the_values_stay(bench):
    rows = (
        '<row r="1" spans="1:3" ht="20.25" customHeight="1">'
        '<c r="A1" s="0"><v>4</v></c>  <c r="B1" s="0" t="str"><f ca="1">A1*2</f><v>old</v></c>'
        '<c r="C1"><f>A1+1</f><v>5</v></c></row>'
    )
    after = '<pageMargins left="0.7" right="0.7" top="0.75" bottom="0.75" header="0.3" footer="0.3"/>'
    source = bench.write(parts_of({"S": sheet_xml(rows, "<!-- note <c> -->", after)}))
    bench.run(source)
    old, new = (
        members(path)["xl/worksheets/sheet1.xml"].decode() for path in (source, bench.folder / "out.xlsx")
    )
    assert new == old.replace(
        '<c r="B1" s="0" t="str"><f ca="1">A1*2</f><v>old</v></c>',
        '<c r="B1" s="0"><f ca="1">A1*2</f><v>8</v></c>',
    )


def test_changed_and_filled_are_counted(bench):
    rows = (
        '<row r="1">'
        + cell("A1", "1+1", 2)
        + cell("B1", "1+1", 3)
        + cell("C1", "1+1")
        + cell("D1", '"a"', "a", ' t="str"')
        + cell("E1", "1=1", 0, ' t="b"')
        + cell("F1", "1/3", "0.33333333333333331")
        + "</row>"
    )
    report, values = bench.rows(rows)
    assert [(c.address, c.before, c.after) for c in report.changes] == [("B1", 3.0, 2.0), ("E1", False, True)]
    assert report.filled == 1 and values["E1"] is True


def test_workbook_without_formulas_is_copied(bench):
    source = bench.write(parts_of({"S": sheet_xml('<row r="1"><c r="A1"><v>4</v></c></row>')}))
    report, _ = bench.run(source)
    assert report.formulas == 0
    assert (bench.folder / "out.xlsx").read_bytes() == source.read_bytes()


@pytest.mark.parametrize(
    "formula, value",
    [
        ('"=1+1"', "=1+1"),
        ('"<a & b>"', "<a & b>"),
        ('"  two  "', "  two  "),
        ("1=1", True),
        ("1=2", False),
        ('"x"&CHAR(10)&"y"', "x\ny"),
        ('""', None),
        ("DATE(2020,1,1)+0.5", 43831.5),
        ('"µm · naïve 膜"', "µm · naïve 膜"),
        ("2^60", 2.0**60),
        ("1/3", 1 / 3),
        ("-0.1", -0.1),
        ("1E-300", 1e-300),
        ('REPT("a",40000)', "#VALUE!"),
        ("10^308*10", "#NUM!"),
    ],
)
def test_kinds_of_value(bench, formula, value):
    assert bench.formulas({"A1": "=" + formula})[1].get("A1") == value


def test_control_characters_are_escaped(bench):
    bench.formulas({"A1": '=CHAR(7)&"_x0041_"&CHAR(13)'})
    data = members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"]
    assert b"<v>_x0007__x005F_x0041__x000D_</v>" in data


def test_text_cell_of_a_formula_leaves_the_shared_strings(bench):
    parts = parts_of({"S": sheet_xml('<row r="1">' + cell("A1", "1+1", 77, ' t="s"') + "</row>")})
    report, values = bench.run(parts)
    assert values["S"]["A1"] == 2


@pytest.mark.parametrize(
    "number, text",
    [(0.0, b"0"), (-0.0, b"0"), (3.0, b"3"), (-12.5, b"-12.5"), (1e20, b"1e+20"), (0.1, b"0.1")],
)
def test_number_text(number, text):
    assert number_text(number) == text and float(text) == number


def test_dates_stay_serial_numbers(bench):
    report, values = bench.formulas(
        {"A1": datetime.datetime(2024, 5, 6, 12), "B1": "=A1+1", "C1": '=TEXT(A1,"yyyy")'}
    )
    assert values["C1"] == "2024"
    assert b"<f>A1+1</f><v>45419.5</v>" in members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"]


def test_1904_dates(bench):
    report, values = bench.rows(
        '<row r="1">' + cell("A1", "DATE(2020,1,1)") + cell("B1", "YEAR(42369)") + "</row>",
        settings='<workbookPr date1904="1"/>',
    )
    assert (
        b"<f>DATE(2020,1,1)</f><v>42369</v>" in members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"]
    )
    assert values["B1"] == 2020


def test_macros_are_kept_and_chart_sheets_passed_over(bench):
    book = design_workbook()
    chart = LineChart()
    chart.add_data(Reference(book["Design"], min_col=2, min_row=1, max_row=4))
    book.create_chartsheet("chart sheet", 0).add_chart(chart)
    parts = members(bench.save(book, "plain.xlsx"))
    parts["xl/vbaProject.bin"] = bytes(range(256)) * 40
    parts["[Content_Types].xml"] = (
        parts["[Content_Types].xml"]
        .replace(b"spreadsheetml.sheet.main+xml", b"ms-excel.sheet.macroEnabled.main+xml")
        .replace(b"vnd.openxmlformats-officedocument.ms-excel", b"vnd.ms-excel")
        .replace(
            b"</Types>",
            b'<Default Extension="bin" ContentType="application/vnd.ms-office.vbaProject"/></Types>',
        )
    )
    source = bench.write(packed(parts), "macro.xlsm")
    report, values = bench.run(source, "out.xlsm")
    assert values["Design"]["B3"] == call("UF_FLUX_DARCY", [1.0, 1.0, 5e12])
    assert members(bench.folder / "out.xlsm")["xl/vbaProject.bin"] == parts["xl/vbaProject.bin"]


def test_stages_are_told(bench):
    stages = []
    recalculate(bench.save(design_workbook()), bench.folder / "out.xlsx", progress=stages.append)
    assert stages == ["read", "load", "evaluate", "explain", "patch"]


@pytest.mark.skipif(not hasattr(signal, "SIGALRM"), reason="needs an alarm signal")
def test_interruption_ends_the_evaluation_and_writes_nothing(bench, monkeypatch):
    import time

    from uffuncs.headless import adapter

    calls = []

    def slow(name, cells):
        calls.append(name)
        time.sleep(0.01)
        return 1.0

    monkeypatch.setattr(adapter, "call", slow)
    book = openpyxl.Workbook()
    for row in range(1, 1001):
        book.active.cell(row, 1, f"=UF_FLUX_DARCY({row},1,5E12)")
    source = bench.save(book)
    previous = signal.signal(signal.SIGALRM, lambda *_: (_ for _ in ()).throw(KeyboardInterrupt))
    signal.setitimer(signal.ITIMER_REAL, 0.3)
    try:
        with pytest.raises(KeyboardInterrupt):
            recalculate(source, bench.folder / "out.xlsx")
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, previous)
    assert 0 < len(calls) < 1000
    assert [path.name for path in bench.folder.iterdir()] == ["in.xlsx"]


def test_another_engine_can_be_given(bench):
    """The interface is all an engine needs: here one that knows a single answer."""
    from uffuncs.headless.engine import Evaluation

    class Oracle:
        name = "oracle"

        def evaluate(self, model, progress=None):
            return Evaluation(
                {(sheet.name, cell.row, cell.column): 42.0 for sheet in model.sheets for cell in sheet.cells}
            )

    source = bench.write(parts_of({"S": sheet_xml('<row r="1">' + cell("A1", "1+1") + "</row>")}))
    report = recalculate(source, bench.folder / "out.xlsx", engine=Oracle())
    assert report.engine == "oracle"
    assert openpyxl.load_workbook(bench.folder / "out.xlsx", data_only=True)["S"]["A1"].value == 42


@given(st.text(max_size=60))
def test_any_text_comes_back(text):
    """Written as a spreadsheet program writes it and read by the rules of the format."""
    kind, content = encode(text)
    element = ElementTree.fromstring(b'<v xml:space="preserve">' + content + b"</v>")
    assert kind == b"str" and unescape_text(element.text or "") == text


@given(st.floats(allow_nan=True, allow_infinity=True))
def test_any_number_comes_back(number):
    kind, content = encode(number)
    assert (kind, content) == (b"e", b"#NUM!") if not math.isfinite(number) else float(content) == number


def test_cells_the_engine_gives_no_value_for_keep_theirs(bench):
    from uffuncs.headless.engine import Evaluation

    class Silent:
        name = "silent"

        def evaluate(self, model, progress=None):
            return Evaluation()

    rows = (
        '<row r="1">' + cell("A1", "1+1", 7) + '<c r="B1"><f t="array" ref="B1:B2">1+1</f><v>8</v></c></row>'
    )
    source = bench.write(parts_of({"S": sheet_xml(rows)}))
    report = recalculate(source, bench.folder / "out.xlsx", engine=Silent())
    assert report.changed == 0 and (bench.folder / "out.xlsx").read_bytes() == source.read_bytes()


@pytest.mark.parametrize("written", ["<v>2</v>", "<v></v>", "<v/>", "<v />", ""])
def test_usual_and_general_way_of_reading_agree(bench, written):
    """Nearly all cells take a quick way; the same cell with single quotes takes the general one."""
    quick = f'<c r="AB7" s="3" t="str"><f>A1&amp;"&lt;"</f>{written}</c>'
    slow = quick.replace('r="AB7"', "r='AB7'")
    found = []
    for rows in (quick, slow):
        parts = parts_of({"S": sheet_xml(f'<row r="7">{rows}</row>')})
        found.append(read_model(bench.write(parts)).sheets[0].cells[0])
    assert [cell.usual for cell in found] == [True, False]
    for name in ("row", "column", "start", "end", "formula_start", "formula_end", "text", "kind", "type"):
        assert getattr(found[0], name) == getattr(found[1], name)
    assert (found[0].cached or b"") == (found[1].cached or b"")
