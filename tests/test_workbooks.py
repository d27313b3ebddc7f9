"""The demo workbooks: built, recalculated without a spreadsheet program, and right."""

from __future__ import annotations

import openpyxl
import pytest

from uffuncs.check_values import checks_of
from uffuncs.demo import KeyResults, build_and_recalculate, builder, key_results
from uffuncs.headless import recalculate
from uffuncs.registry import functions


@pytest.fixture(scope="module")
def design(tmp_path_factory):
    return build_and_recalculate(tmp_path_factory.mktemp("demo"))


@pytest.fixture(scope="module")
def reference(tmp_path_factory):
    folder = tmp_path_factory.mktemp("reference")
    builder("function_reference").build(folder / "bare.xlsx")
    report = recalculate(folder / "bare.xlsx", folder / "function_reference.xlsx")
    return report, openpyxl.load_workbook(folder / "function_reference.xlsx", data_only=True)


def test_the_design_has_no_error_and_every_check_is_ok(design):
    path, _, report = design
    assert report.errors == [] and report.unknown_functions == [] and report.formulas > 200
    checks = [cell for sheet in openpyxl.load_workbook(path, data_only=True) for row in sheet.iter_rows() for cell in row
              if cell.style == "Check Cell"]
    assert len(checks) >= 6
    for cell in checks:
        assert cell.value == "ok", f"{cell.parent.title}!{cell.coordinate} says {cell.value}"


def test_the_design_is_one_plant(design):
    """Balances over sheets, computed here by hand from the values in the cells."""
    path, results, _ = design
    book = openpyxl.load_workbook(path, data_only=True)

    def value(name):
        sheet, cell = book.defined_names[name].attr_text.replace("'", "").replace("$", "").split("!")
        return book[sheet][cell].value

    assert value("feed_flow") == pytest.approx(420 / 24 * (18 + 3.5) / 18, rel=1e-12)
    assert value("feed_flow") == pytest.approx(value("total_permeate") + value("final_retentate"), rel=1e-9)
    kept = value("final_retentate") * 75 / (value("feed_flow") * 6.2)
    assert value("cascade_yield") == pytest.approx(kept, rel=1e-9)
    assert value("mean_flux") == pytest.approx(1e3 * value("total_permeate") / value("total_area"), rel=1e-9)
    assert value("installed_area") == 16 * value("total_modules") >= 1.05 * value("total_area")
    osmotic = [value(f"osmotic_{n}") for n in (1, 2, 3)]
    pi_w, pi_p = (sum(b * c ** (n + 1) for n, b in enumerate(osmotic)) for c in (value("wall_concentration"), value("permeate_protein")))
    assert value("operating_flux") == pytest.approx(value("permeability") * (value("operating_pressure") - pi_w + pi_p), rel=1e-8)
    assert isinstance(results, KeyResults) and len(results.rows) == 13


def test_built_in_cell_styles_names_charts_and_units(design):
    path, _, _ = design
    book = openpyxl.load_workbook(path)
    styles = {cell.style for sheet in book for row in sheet.iter_rows() for cell in row}
    assert {"Input", "Calculation", "Output", "Check Cell"} <= styles
    assert sum(len(sheet._charts) for sheet in book) >= 4
    basis = book["Design basis"]
    for row in basis.iter_rows(min_row=4):
        if row[2].style == "Input":
            assert row[3].value, f"{row[0].value} has no unit"
    assert len(book.defined_names) > 40


def test_the_committed_design_is_up_to_date(design):
    path, _, _ = design
    from pathlib import Path

    committed = Path(__file__).parents[1] / "workbooks_demo" / "plant_design.xlsx"
    assert key_results(committed).rows == key_results(path).rows, "run python -m workbooks_demo.plant_design"


def test_every_function_is_in_the_reference_workbook(reference):
    report, book = reference
    assert report.unknown_functions == []
    index = book["Index"]
    assert [index.cell(r, 1).value for r in range(5, 5 + len(functions()))] == list(functions())
    for r in range(5, 5 + len(functions())):
        sheet, cell = index.cell(r, 1).hyperlink.location.replace("'", "").split("!")
        assert book[sheet][cell].value == index.cell(r, 1).value


def test_every_published_value_is_met_in_the_reference_workbook(reference):
    _, book = reference
    verdicts = {}
    for sheet in book.worksheets[1:]:
        name = None
        for row in sheet.iter_rows(max_col=2):
            label, value = row[0].value, row[1].value
            name = label if isinstance(label, str) and label in functions() else name
            if label in ("Within the printed digits?", "The same text?"):
                verdicts[name] = value
    assert verdicts == {name: "yes" for name in functions() if checks_of(name)}


def test_the_reference_workbook_shows_error_values_only_where_a_value_is_one(reference):
    report, _ = reference
    assert report.errors == [], report.errors[:5]


def test_the_integrity_sheet_carries_the_caution(reference):
    _, book = reference
    assert "set by the local regulator" in book["integrity"]["A2"].value


def test_the_committed_reference_is_up_to_date(reference):
    from pathlib import Path

    _, fresh = reference
    path = Path(__file__).parents[1] / "workbooks_demo" / "function_reference.xlsx"
    committed = openpyxl.load_workbook(path, data_only=True)
    for sheet in fresh:
        for row in sheet.iter_rows():
            if row[0].value == "Difference":
                continue  # the last digits of a difference are rounding, which machines do not share
            for cell in row:
                other = committed[sheet.title][cell.coordinate].value
                same = other == pytest.approx(cell.value, rel=1e-9, abs=1e-12) if isinstance(cell.value, float) else other == cell.value
                assert same, f"{sheet.title}!{cell.coordinate}: run python -m workbooks_demo.function_reference"
