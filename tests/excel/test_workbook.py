"""What the add-in's workbook does besides: texts for the function wizard, and binding of names."""

from __future__ import annotations

import pytest

from tests.excel import needed

needed("xlwings", "pyopenvba", stand_in=True)

from uffuncs.excel.adapter import category
from uffuncs.registry import functions

REBUILD = ("CalculateFullRebuild", {})


@pytest.fixture
def quiet(fresh):
    """A workbench after Excel has started with the add-in."""
    fresh.handle("Workbook_Open")
    fresh.asked.clear()
    return fresh


def test_wizard_gets_every_text(fresh):
    fresh.handle("Workbook_Open")
    assert [name for name, _ in fresh.asked] == ["MacroOptions"] * len(functions())
    for (_, given), record in zip(fresh.asked, functions().values()):
        assert given["Macro"] == f"'uffuncs.xlam'!{record.worksheet_name}"
        assert (given["Description"], given["Category"]) == (record.summary, category(record))
        descriptions = list(given["ArgumentDescriptions"].items) if "ArgumentDescriptions" in given else []
        assert descriptions[: len(record.arguments)] == [a.description for a in record.arguments]
        assert all(isinstance(d, str) and len(d) <= 255 for d in descriptions)


def test_wizard_is_told_once(quiet):
    quiet.handle("mExcel_WorkbookActivate", quiet.book)
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    assert quiet.asked == []


def test_wizard_is_told_later_when_excel_refuses_at_first(fresh):
    fresh.refused = 1
    fresh.handle("Workbook_Open")  # one attempt when Excel starts, one for each open workbook
    assert len(fresh.asked) == len(functions())
    fresh.asked.clear()
    fresh.handle("mExcel_WorkbookActivate", fresh.book)
    assert fresh.asked == []


def test_wizard_is_given_up_when_excel_goes_on_refusing(fresh):
    fresh.refused = 1000
    for _ in range(20):
        fresh.handle("mExcel_WorkbookActivate", fresh.book)
    assert 1000 - fresh.refused <= 6 and fresh.asked == []


def test_workbook_without_unbound_names_is_left_alone(quiet):
    quiet.fill("A1", 2.0)
    quiet.range("A2").vba_set("Formula", "=A1*2")
    quiet.range("A3").vba_set("Formula", "=1/0")
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    quiet.handle("mExcel_SheetCalculate", quiet.sheet)
    assert quiet.asked == []


def test_unbound_names_are_bound_once(quiet):
    quiet.range("B3").vba_set("Formula", "=1+uf_flux_darcy(2,1,5)")
    assert repr(quiet.range("B3").vba_get("Value2")) == "Error 2029"
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    assert quiet.asked == [REBUILD]
    # The interpreter binds nothing, so the cell still shows #NAME?: yet there is no second rebuild.
    quiet.handle("mExcel_SheetCalculate", quiet.sheet)
    quiet.handle("mExcel_WorkbookActivate", quiet.book)
    assert quiet.asked == [REBUILD]
    assert quiet.range("B3").vba_get("Formula").upper() == "=1+UF_FLUX_DARCY(2,1,5)"


def test_names_that_show_later_are_bound_when_they_show(quiet):
    """A workbook with cached values shows #NAME? only once an input changes."""
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    assert quiet.asked == []
    quiet.range("B3").vba_set("Formula", "=UF_FLUX_DARCY(2,1,5E12)")
    quiet.handle("mExcel_SheetCalculate", quiet.sheet)
    assert quiet.asked == [REBUILD]


def test_a_workbook_opened_again_is_looked_at_again(quiet):
    quiet.range("B3").vba_set("Formula", "=UF_FLUX_DARCY(2,1,5E12)")
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    assert quiet.asked == [REBUILD, REBUILD]


@pytest.mark.parametrize(
    "formula", ["=UF_NO_SUCH_FUNCTION(1)", "=NO_SUCH_NAME+1", '=NO_SUCH("UF_FLUX_DARCY")']
)
def test_names_that_are_not_ours_stay(quiet, formula):
    quiet.range("A1").vba_set("Formula", formula)
    assert repr(quiet.range("A1").vba_get("Value2")) == "Error 2029"
    quiet.handle("mExcel_WorkbookOpen", quiet.book)
    assert quiet.asked == []


def test_workbooks_open_before_the_add_in(fresh):
    fresh.range("A1").vba_set("Formula", "=UF_VERSION()")
    fresh.handle("Workbook_Open")
    assert REBUILD in fresh.asked
