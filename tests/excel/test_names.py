"""What Excel and VBA allow as names: needs neither xlwings nor Excel."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace

import pytest

from uffuncs.excel.errors import ExcelDoorError
from uffuncs.excel.names import argument_names, check, reads_as_cell
from uffuncs.excel.vba_text import functions_module, plain_ascii
from uffuncs.registry import functions

FLUX = functions()["UF_FLUX_DARCY"]


@pytest.mark.parametrize(
    "name", ["UF1", "uf10", "LMH2020", "TMP1", "A1", "XFD1048576", "R1C1", "RC", "R", "C", "C2", "R5"]
)
def test_names_that_are_cells(name):
    assert reads_as_cell(name)


@pytest.mark.parametrize("name", ["UF_FLUX", "XFE1", "XFD1048577", "UF0", "FLUX20", "UF_1", "UF_LRV4"])
def test_names_that_are_none(name):
    assert not reads_as_cell(name)


def test_the_registry_passes():
    check(functions().values())


@pytest.mark.parametrize(
    "name, cause",
    [("UF1", "as a cell"), ("UF.FLUX", "VBA allows"), ("1UF", "VBA allows"), ("String", "VBA allows")],
)
def test_function_names_refused(name, cause):
    with pytest.raises(ExcelDoorError, match=cause):
        check([replace(FLUX, worksheet_name=name)])


def test_two_functions_that_differ_in_case_only():
    with pytest.raises(ExcelDoorError, match="twice"):
        check([FLUX, replace(FLUX, worksheet_name="uf_flux_darcy")])


def renamed(*names):
    return replace(FLUX, arguments=tuple(replace(FLUX.arguments[0], name=n) for n in names))


@pytest.mark.parametrize(
    "names, cause",
    [
        (("ufxCells",), "of the add-in itself"),
        (("UF_flux_darcy",), "of the add-in itself"),
        (("flux", "FLUX"), "one name"),
        (("2nd",), "VBA allows"),
        (("µ",), "VBA allows"),
        ([f"a{i}" for i in range(61)], "more than 60"),
    ],
)
def test_argument_names_refused(names, cause):
    with pytest.raises(ExcelDoorError, match=cause):
        check([renamed(*names)])


def test_texts_too_long_are_refused():
    with pytest.raises(ExcelDoorError, match="summary"):
        check([replace(FLUX, summary="x" * 256)])
    with pytest.raises(ExcelDoorError, match="description of flux"):
        check([replace(FLUX, arguments=(SimpleNamespace(name="flux", description="x" * 256),))])


def test_reserved_words_get_an_underscore():
    assert argument_names(renamed("function", "Caller", "single", "flux")) == [
        "function_",
        "Caller_",
        "single_",
        "flux",
    ]


def test_names_too_long_together_are_cut_at_their_longest_words():
    names = argument_names(renamed(*(f"concentration_of_component_number_{i}" for i in range(10))))
    assert sum(map(len, names)) + len(names) <= 254 and len(set(names)) == 10
    assert all(n.startswith("con") for n in names)
    with pytest.raises(ExcelDoorError, match="too long"):
        argument_names(renamed(*("ab_" * 20 + str(i) for i in range(10))))


def test_many_arguments_are_broken_into_lines_that_vba_takes():
    record = renamed(*(f"a{i}" for i in range(60)))
    code = functions_module([record])
    assert max(map(len, code.split("\r\n"))) <= 1023 and code.count(" _\r\n") >= 2


def test_quotes_and_characters_of_a_summary():
    code = functions_module([replace(FLUX, summary='A "so-called" flux, m³/(m²·s) ≥ 0 …')])
    assert 'VB_Description = "A ""so-called"" flux, m3/(m2*s) >= 0 ..."' in code
    assert plain_ascii("20 °C ± 1 µm × 3 – ε") == "20 deg C +/- 1 um x 3 - epsilon"
