"""The renaming for LibreOffice before 25.2, on packages: names change, everything else stays."""

from __future__ import annotations

import openpyxl
import pytest
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula

from uffuncs.calc.names import add_in_functions, programmatic_name
from uffuncs.calc.renaming import plain_names, programmatic_names, renamed, renamed_package, worksheet_names
from uffuncs.headless.recalculate import read_model

DARCY = programmatic_name("UF_FLUX_DARCY")


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("UF_FLUX_DARCY(A1,1,5E12)*2", f"{DARCY}(A1,1,5E12)*2"),
        ("uf_flux_darcy(1)", f"{DARCY}(1)"),
        ('"UF_FLUX_DARCY(1)"&UF_FLUX_DARCY("UF_WHY(""x"")")', f'"UF_FLUX_DARCY(1)"&{DARCY}("UF_WHY(""x"")")'),
        ("_xll.UF_FLUX_DARCY(1)", f"{DARCY}(1)"),
        ("[1]!UF_FLUX_DARCY(1)", f"{DARCY}(1)"),
        ("1+'C:\\files\\old.xlam'!UF_FLUX_DARCY(1)", f"1+{DARCY}(1)"),
        ("'UF_FLUX_DARCY(1)'!A1+UF_total", "'UF_FLUX_DARCY(1)'!A1+UF_total"),
        ("SUM(A1:A3)", "SUM(A1:A3)"),
    ],
)
def test_formulas(formula, expected):
    assert renamed(formula, programmatic_names) == expected


def test_every_name_comes_back():
    back = worksheet_names()
    for f in add_in_functions():
        formula = f'1+{f.name}(A1,"{f.name}(")'
        there = renamed(formula, programmatic_names)
        assert there != formula and renamed(there, back) == formula
        assert renamed(f"_xll.{f.name.lower()}(A1)", plain_names) == f"{f.name}(A1)"


@pytest.fixture
def source(tmp_path):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet["A1"] = "UF_FLUX_DARCY(1)"
    sheet["B1"] = '=UF_FLUX_DARCY(2,1,5E12)&" <&> "'
    sheet["B2"] = "=SUM(A1:A9)"
    sheet["C1"] = ArrayFormula("C1:C2", "=UF_FLUX_DARCY(B1:B2,1,5E12)")
    book.defined_names["flux"] = DefinedName("flux", attr_text="UF_FLUX_DARCY(Sheet!$A$1,1,5E12)")
    path = tmp_path / "source.xlsx"
    book.save(path)
    return path


def test_packages_there_and_back(source, tmp_path):
    there, back = tmp_path / "there.xlsx", tmp_path / "back.xlsx"
    there.write_bytes(renamed_package(read_model(source), programmatic_names))
    book = openpyxl.load_workbook(there)
    sheet = book.active
    assert sheet["A1"].value == "UF_FLUX_DARCY(1)" and sheet["B2"].value == "=SUM(A1:A9)"
    assert sheet["B1"].value == f'={DARCY}(2,1,5E12)&" <&> "'
    assert (sheet["C1"].value.text, sheet["C1"].value.ref) == (f"={DARCY}(B1:B2,1,5E12)", "C1:C2")
    assert book.defined_names["flux"].attr_text == f"{DARCY}(Sheet!$A$1,1,5E12)"
    back.write_bytes(renamed_package(read_model(there), worksheet_names()))
    one, other = read_model(source).package, read_model(back).package
    assert [m.filename for m in one.members] == [m.filename for m in other.members]
    assert all(one.read(m.filename) == other.read(m.filename) for m in one.members)


def test_nothing_to_rename_is_the_same_file(tmp_path):
    book = openpyxl.Workbook()
    book.active["A1"] = "=1+1"
    path = tmp_path / "plain.xlsx"
    book.save(path)
    assert renamed_package(read_model(path), programmatic_names) == path.read_bytes()
