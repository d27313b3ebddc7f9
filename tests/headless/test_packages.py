"""What spreadsheet programs save and openpyxl does not write."""

import pytest
from headless_books import MAIN, RELATION, PACKAGE, cell, members, parts_of, reasons, sheet_xml

from uffuncs.cell import call

FLUX = call("UF_FLUX_DARCY", [1.0, 1.0, 5e12])


def output_sheet(bench):
    return members(bench.folder / "out.xlsx")["xl/worksheets/sheet1.xml"].decode()


def test_shared_formulas(bench):
    rows = "".join(
        f'<row r="{r}">'
        + cell(f"A{r}", None, r)
        + (
            cell("B1", "_xll.UF_FLUX_DARCY(A1,1,5E12)", 0, "", ' t="shared" ref="B1:B3" si="0"')
            if r == 1
            else f'<c r="B{r}"><f t="shared" si="0"/><v>0</v></c>'
        )
        + "</row>"
        for r in (1, 2, 3)
    )
    report, values = bench.rows(rows)
    assert [values[f"B{r}"] for r in (1, 2, 3)] == [
        call("UF_FLUX_DARCY", [float(r), 1.0, 5e12]) for r in (1, 2, 3)
    ]
    assert (report.formulas, report.own_formulas, report.changed) == (3, 3, 3)
    assert f'<c r="B2"><f t="shared" si="0"/><v>{values["B2"]!r}</v></c>' in output_sheet(bench)


def test_failing_dependant_of_a_shared_formula_has_its_own_reason(bench):
    rows = (
        '<row r="1">'
        + cell("A1", None, 1)
        + cell("B1", "UF_FLUX_DARCY(A1,1,5E12)", None, "", ' t="shared" ref="B1:B2" si="4"')
        + "</row>"
        '<row r="2"><c r="A2" t="inlineStr"><is><t>wet</t></is></c><c r="B2"><f t="shared" si="4"></f></c></row>'
    )
    report, values = bench.rows(rows)
    assert values["B2"] == "#VALUE!" and "wet" in reasons(report)["S!B2"]


def test_empty_rows_cells_and_sheets(bench):
    sheets = {
        "S": sheet_xml('<row r="1"/><row r="2"><c r="A2"/><c r="B2" s="0"/>' + cell("C2", "1+1") + "</row>"),
        "empty": f'<worksheet xmlns="{MAIN}"><sheetData/></worksheet>',
    }
    report, values = bench.run(parts_of(sheets))
    assert values["S"] == {"C2": 2} and report.formulas == 1


def test_rows_and_cells_without_positions(bench):
    rows = (
        '<row><c><v>3</v></c><c><f>A1*2</f></c></row><row/><row><c t="inlineStr"><is><t>ab</t></is></c>'
        '<c><f>A3&amp;"&lt;"</f></c></row>'
    )
    report, values = bench.rows(rows)
    assert values["B1"] == 6 and values["B3"] == "ab<"


def test_prefixed_elements_comments_and_sections(bench):
    xml = (
        f'<x:worksheet xmlns:x="{MAIN}"><x:sheetData><!-- </x:c><x:f>9</x:f> --><x:row r="1">'
        '<x:c r="A1"><x:v><![CDATA[4]]></x:v></x:c><x:c r=\'B1\' t = "str"><x:f><![CDATA[IF(A1<5,"<f>","no")]]></x:f>'
        "<x:v>old</x:v></x:c></x:row></x:sheetData></x:worksheet>"
    )
    report, values = bench.run(parts_of({"S": xml}))
    assert values["S"]["B1"] == "<f>"
    assert output_sheet(bench) == xml.replace("<x:v>old</x:v>", "<x:v>&lt;f&gt;</x:v>")


def test_utf_16(bench):
    xml = sheet_xml('<row r="1">' + cell("A1", None, 4) + cell("B1", 'A1&"µ"') + "</row>").replace(
        "UTF-8", "UTF-16"
    )
    report, values = bench.run(parts_of({"S": xml.encode("utf-16")}))
    assert values["S"]["B1"] == "4µ"


def test_strict_namespace(bench):
    xml = (
        '<worksheet xmlns="http://purl.oclc.org/ooxml/spreadsheetml/main"><sheetData><row r="1">'
        + cell("A1", "UF_FLUX_DARCY(1,1,5E12)")
        + "</row></sheetData></worksheet>"
    )
    parts = parts_of({"S": xml})
    from uffuncs.headless import recalculate

    report = recalculate(bench.write(parts), bench.folder / "out.xlsx")
    assert report.errors == [] and f"<v>{FLUX!r}</v>" in output_sheet(bench)


@pytest.mark.parametrize(
    "written",
    [
        "_xll.UF_FLUX_DARCY(1,1,5E12)",
        "_xlfn.UF_FLUX_DARCY(1,1,5E12)",
        "[1]!UF_FLUX_DARCY(1,1,5E12)",
        r"'C:\add ins\uffuncs.xlam'!UF_FLUX_DARCY(1,1,5E12)",
        "uffuncs.xlam!UF_FLUX_DARCY(1,1,5E12)",
        "ORG.EXAMPLE.UF_FLUX_DARCY(1,1,5E12)",
        "uf_flux_darcy( 1 , 1 , 5E12 )",
        "_xll.ORG.UF_FLUX_DARCY(1,1,5E12)",
        "SUM(_xll.UF_FLUX_DARCY(1,1,5E12),0)",
        "'it''s here.xlam'!UF_FLUX_DARCY(1,1,5E12)",
    ],
)
def test_prefixes_before_the_name(bench, written):
    report, values = bench.rows('<row r="1">' + cell("A1", written) + "</row>")
    assert values["A1"] == FLUX and report.errors == [] and report.own_formulas == 1
    assert f"<f>{written}</f>" in output_sheet(bench)


def test_leading_equals_sign_in_the_file(bench):
    assert bench.rows('<row r="1">' + cell("A1", "=1+1") + "</row>")[1]["A1"] == 2


def test_sheet_names_with_quotes_and_other_scripts(bench):
    sheets = {
        "it's": sheet_xml(
            '<row r="1">' + cell("A1", None, 3) + cell("B1", "UF_FLUX_DARCY(-1,1,5E12)+A1") + "</row>"
        ),
        "膜 & <1>": sheet_xml(
            '<row r="1">' + cell("A1", "'it''s'!A1*2") + cell("B1", "'it''s'!B1") + "</row>"
        ),
    }
    report, values = bench.run(parts_of(sheets))
    assert values["膜 & <1>"]["A1"] == 6


@pytest.mark.parametrize(
    "iterate, value", [("", "#NUM!"), ('<calcPr iterate="1" iterateCount="200" iterateDelta="1e-9"/>', 2)]
)
def test_circular_references(bench, iterate, value):
    from uffuncs.headless import recalculate

    rows = '<row r="1">' + cell("A1", "B1/2+1") + cell("B1", "A1") + cell("C1", "A1*1") + "</row>"
    source = bench.write(parts_of({"S": sheet_xml(rows)}, after=iterate))
    report = recalculate(source, bench.folder / "out.xlsx")
    from headless_books import shown

    values = shown(bench.folder / "out.xlsx")["S"]
    if iterate:
        assert values["A1"] == pytest.approx(2, abs=1e-6) and report.errors == []
    else:
        assert values["A1"] == values["B1"] == "#NUM!"
        assert "circular" in reasons(report)["S!A1"] and reasons(report)["S!C1"].startswith(
            "from S!A1: circular"
        )


def test_cells_with_an_empty_formula_keep_their_values(bench):
    rows = (
        '<row r="1"><c r="A1"><f/><v>5</v></c><c r="B1"><f t="shared" si="9"/><v>6</v></c>'
        + cell("C1", "A1+B1")
        + "</row>"
    )
    report, values = bench.rows(rows)
    assert values == {"A1": 5, "B1": 6, "C1": 11} and report.formulas == 1


def test_mark_of_a_rich_value_goes_with_the_value(bench):
    """A saved #SPILL! is a #VALUE! with vm; kept beside a new value, a program would still show the error."""
    rows = (
        '<row r="1"><c r="A1" s="0" t="e" vm="1"><f>1+1</f><v>#VALUE!</v></c>'
        '<c r="B1" t="e" vm="1"><f>"a"+1</f><v>#VALUE!</v></c></row>'
    )
    bench.rows(rows)
    assert '<c r="A1" s="0"><f>1+1</f><v>2</v></c><c r="B1" t="e" vm="1">' in output_sheet(bench)


def test_what_if_tables_stay(bench):
    rows = (
        '<row r="1"><c r="A1"><f t="dataTable" ref="A1:A2" dt2D="0" dtr="0" r1="B1"/><v>5</v></c>'
        + cell("B1", "A1+1")
        + '</row><row r="2"><c r="A2"><v>6</v></c></row>'
    )
    report, values = bench.rows(rows)
    assert values == {"A1": 5, "B1": 6, "A2": 6} and report.formulas == 1 and "data table" in report.notes[0]


def test_external_reference_without_values(bench):
    rows = (
        '<row r="1">'
        + cell("A1", "[1]Sheet1!$A$1+1", 5)
        + cell("B1", "1+1")
        + cell("C1", "'[1]a b'!A1:A3")
        + '</row><row r="2">'
        + cell("A2", "IFERROR([1]Sheet1!A1,7)")
        + cell("B2", "A1+1")
        + "</row>"
    )
    report, values = bench.rows(rows)
    assert values == {"A1": "#REF!", "B1": 2, "C1": "#REF!", "A2": 7, "B2": "#REF!"}
    assert "another workbook" in report.notes[0] and reasons(report)["S!B2"].startswith("from S!A1")


def test_external_reference_with_stored_values(bench):
    parts = parts_of(
        {"S": sheet_xml('<row r="1">' + cell("A1", "[1]Sheet1!$A$1+1") + "</row>")}, names="", after=""
    )
    parts["xl/workbook.xml"] = parts["xl/workbook.xml"].replace(
        "</workbook>", '<externalReferences><externalReference r:id="rId9"/></externalReferences></workbook>'
    )
    parts["xl/_rels/workbook.xml.rels"] = parts["xl/_rels/workbook.xml.rels"].replace(
        "</Relationships>",
        f'<Relationship Id="rId9" Type="{RELATION}/externalLink" Target="externalLinks/externalLink1.xml"/></Relationships>',
    )
    parts["[Content_Types].xml"] = parts["[Content_Types].xml"].replace(
        "</Types>",
        '<Override PartName="/xl/externalLinks/externalLink1.xml" ContentType="application/vnd.'
        'openxmlformats-officedocument.spreadsheetml.externalLink+xml"/></Types>',
    )
    parts["xl/externalLinks/externalLink1.xml"] = (
        f'<externalLink xmlns="{MAIN}" xmlns:r="{RELATION}"><externalBook r:id="rId1"><sheetNames><sheetName val="Sheet1"/>'
        '</sheetNames><sheetDataSet><sheetData sheetId="0"><row r="1"><cell r="A1"><v>41</v></cell></row></sheetData>'
        "</sheetDataSet></externalBook></externalLink>"
    )
    parts["xl/externalLinks/_rels/externalLink1.xml.rels"] = (
        f'<Relationships xmlns="{PACKAGE}"><Relationship Id="rId1" Type="{RELATION}/externalLinkPath" Target="other.xlsx" '
        'TargetMode="External"/></Relationships>'
    )
    report, values = bench.run(parts)
    assert values["S"]["A1"] == 42


def test_formula_that_does_not_parse(bench):
    report, values = bench.rows(
        '<row r="1">' + cell("A1", "SUM(1,") + cell("B1", "1+1") + cell("C1", "A1+1") + "</row>"
    )
    assert values == {"A1": "#NAME?", "B1": 2, "C1": "#NAME?"}
    assert "cannot be read" in reasons(report)["S!A1"]


@pytest.mark.parametrize("depth", [40, 1000, 20000])
def test_deep_nesting_never_crashes(bench, depth):
    formula = "UF_FLUX_FROM_FLOW(" * depth + "1" + ",1)" * depth
    report, values = bench.rows('<row r="1">' + cell("A1", formula) + cell("B1", "1+1") + "</row>")
    assert values["B1"] == 2
    assert isinstance(values["A1"], (int, float)) or reasons(report)["S!A1"]


def test_long_chain_of_cells(bench):
    count = 3000
    rows = f'<row r="1">{cell("A1", None, 1)}</row>' + "".join(
        f'<row r="{r}">{cell(f"A{r}", f"UF_FLUX_FROM_FLOW(A{r - 1},1000)")}</row>' for r in range(2, count)
    )
    report, values = bench.rows(rows)
    assert values["A4"] == pytest.approx(1) and report.errors == []


def test_defined_names_that_hold_formulas(bench):
    names = (
        '<definedName name="flux">UF_FLUX_DARCY(S!$A$1,1,5E12)</definedName>'
        '<definedName name="twice">flux*2</definedName>'
        '<definedName name="flux" localSheetId="0">UF_FLUX_DARCY(2,1,5E12)</definedName>'
        '<definedName name="shifted">UF_FLUX_DARCY(S!A1,1,5E12)</definedName>'
    )
    sheets = {
        "S": sheet_xml(
            '<row r="1">' + cell("A1", None, 1) + cell("B1", "flux") + cell("C1", '"flux"') + "</row>"
        ),
        "T": sheet_xml(
            '<row r="1">'
            + cell("A1", "FLUX+0")
            + cell("B1", "twice")
            + cell("C1", "S!flux")
            + cell("D1", "shifted")
            + "</row>"
        ),
    }
    report, values = bench.run(parts_of(sheets, names=names))
    assert values["S"]["B1"] == pytest.approx(2 * FLUX) and values["S"]["C1"] == "flux"
    assert (
        values["T"]["A1"] == FLUX
        and values["T"]["B1"] == 2 * FLUX
        and values["T"]["C1"] == pytest.approx(2 * FLUX)
    )
    assert values["T"]["D1"] == "#NAME?" and "relative" in reasons(report)["T!D1"]
    assert report.own_formulas == 5
