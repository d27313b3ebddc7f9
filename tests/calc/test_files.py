"""Workbooks in .xlsx and .ods: opened, computed, saved and opened again; the functions keep their names."""

from __future__ import annotations

import zipfile

import openpyxl
import pytest
from calc_session import ODS, XLSX, Session, settings
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula

from uffuncs.calc.names import programmatic_name

FORMULAS = {
    "B1": '=UF_FLUX_DARCY("35 psi",1.002,5E12)',
    "B2": "=UF_FLUX_DARCY(A1,A2,5E12,,1E12)",
    "B3": '=IFERROR(UF_FLUX_DARCY(-1,1,5E12),"caught")',
    "B4": '="a text with UF_FLUX_DARCY(1) in it: "&UF_VERSION()',
    "B5": "=membrane_flux*2",
    "B6": "=SUM(UF_FLUX_DARCY(A1,1,5E12),uf_flux_darcy(A2,1,5E12))",
}


@pytest.fixture
def source(folder):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet["A1"], sheet["A2"] = 2, 1.5
    for place, formula in FORMULAS.items():
        sheet[place] = formula
    sheet["D1"] = ArrayFormula("D1:D2", "=UF_FLUX_DARCY(A1:A2,1,5E12)")
    book.defined_names["membrane_flux"] = DefinedName(
        "membrane_flux", attr_text="UF_FLUX_DARCY(Sheet!$A$1,1.002,5E12)"
    )
    path = folder / "source.xlsx"
    book.save(path)
    return path


@pytest.fixture
def expected(source, folder):
    from uffuncs.headless import recalculate

    recalculate(source, folder / "expected.xlsx")
    return values(folder / "expected.xlsx")


def values(path):
    sheet = openpyxl.load_workbook(path, data_only=True).active
    return {c.coordinate: c.value for row in sheet.iter_rows() for c in row if c.value is not None}


def about(found):
    return {place: v if isinstance(v, str) else pytest.approx(v, rel=1e-14) for place, v in found.items()}


def opened(calc, path):
    document = calc.open(path)
    document.calculateAll()
    return document


def test_xlsx_round_trip(calc, source, folder, expected):
    document = opened(calc, source)
    saved = calc.store(document, folder / "saved.xlsx", XLSX)
    document.close(True)
    assert values(saved) == about(expected)
    book = openpyxl.load_workbook(saved)
    sheet = book.active
    assert sheet["B1"].value == '=UF_FLUX_DARCY("35 psi",1.002,5000000000000)'
    assert sheet["B2"].value == "=UF_FLUX_DARCY(A1,A2,5000000000000,,1000000000000)"
    assert (
        sheet["D1"].value.text == "=UF_FLUX_DARCY(A1:A2,1,5000000000000)" and sheet["D1"].value.ref == "D1:D2"
    )
    assert book.defined_names["membrane_flux"].attr_text.startswith("UF_FLUX_DARCY(")
    again = opened(calc, saved)
    twice = calc.store(again, folder / "twice.xlsx", XLSX)
    again.close(True)
    assert values(twice) == values(saved)


def test_ods_round_trip(calc, source, folder, expected):
    document = opened(calc, source)
    saved = calc.store(document, folder / "saved.ods", ODS)
    document.close(True)
    content = zipfile.ZipFile(saved).read("content.xml").decode()
    assert f"of:={programmatic_name('UF_FLUX_DARCY')}(" in content
    again = opened(calc, saved)
    assert "UF_FLUX_DARCY" in calc_text(again, "B1")
    back = calc.store(again, folder / "back.xlsx", XLSX)
    again.close(True)
    assert values(back) == about(expected)


def calc_text(document, place):
    return document.Sheets.getByIndex(0).getCellRangeByName(place).FormulaLocal


def test_names_of_an_older_version_are_bound_on_loading(office, calc, source, tmp_path, expected):
    """Without names for .xlsx this program reads the functions as unknown, as 7.4 does, until bound."""
    calc.close()
    with Session(office, tmp_path, settings(tmp_path), compatibility_names=False) as session:
        document = session.open(source)
        sheet = document.Sheets.getByIndex(0)
        found = {place: sheet.getCellRangeByName(place).getError() for place in [*FORMULAS, "D1", "D2"]}
        assert found == dict.fromkeys(found, 0)
        assert sheet.getCellRangeByName("B2").Value == pytest.approx(expected["B2"], rel=1e-14)
        assert sheet.getCellRangeByName("D2").Value == pytest.approx(expected["D2"], rel=1e-14)
        assert sheet.getCellRangeByName("B3").String == "caught"
        document.close(True)
