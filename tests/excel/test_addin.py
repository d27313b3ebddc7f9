"""The add-in's file, read back by programs that did not write it, and its VBA as text."""

from __future__ import annotations

import io
import re
import zipfile

import pytest

from tests.excel import needed

needed("xlwings", "pyopenvba", "oletools")

import warnings

import openpyxl

with warnings.catch_warnings():  # about its own parser
    warnings.simplefilter("ignore", DeprecationWarning)
    from oletools.olevba import VBA_Parser

from tests.excel.golden import FOLDER, texts
from uffuncs import excel
from uffuncs.excel import addin
from uffuncs.excel.adapter import category
from uffuncs.excel.errors import ExcelDoorError
from uffuncs.excel.names import (
    LONGEST_NAMES,
    LONGEST_TEXT,
    MOST_ARGUMENTS,
    argument_names,
)
from uffuncs.excel.vba_text import (
    FUNCTIONS_MODULE,
    functions_module,
    plain_ascii,
    this_workbook_module,
)
from uffuncs.registry import functions
from uffuncs.version import __version__

RECORDS = list(functions().values())


@pytest.fixture(scope="module")
def built(tmp_path_factory):
    return excel.build(tmp_path_factory.mktemp("built"))


@pytest.fixture(scope="module")
def modules(built):
    """Name to source, as olevba reads them."""
    reader = VBA_Parser(str(built[0]))
    found = {
        name.rpartition("/")[2]: code.replace("\r\n", "\n") for _, name, _, code in reader.extract_macros()
    }
    reader.close()
    return found


def test_files(built):
    folder = built[0].parent
    assert built == [folder / "uffuncs.xlam", folder / "uffuncs" / "uffuncs.conf"]
    assert sorted(p for p in folder.rglob("*") if p.is_file()) == sorted(built)  # no temporary file is left


def test_two_builds_are_the_same_bytes(built, tmp_path):
    for first, second in zip(built, excel.build(tmp_path / "deep" / "folder")):
        assert first.read_bytes() == second.read_bytes()


def test_an_earlier_build_is_replaced(tmp_path):
    (tmp_path / "uffuncs.xlam").write_text("old")
    assert zipfile.is_zipfile(excel.build(tmp_path)[0])


def test_modules_are_ours_alone(modules):
    assert set(modules) == {"ThisWorkbook", "Sheet2", FUNCTIONS_MODULE}
    assert re.sub(r"(?m)^Attribute VB_.*\n", "", modules["Sheet2"]).strip() == ""
    ours = functions_module(RECORDS).replace("\r\n", "\n")
    assert (
        modules[FUNCTIONS_MODULE].removeprefix(f'Attribute VB_Name = "{FUNCTIONS_MODULE}"\n').strip()
        == ours.strip()
    )
    ours = this_workbook_module(addin.xlwings_version()).replace("\r\n", "\n")
    assert modules["ThisWorkbook"].strip().endswith(ours.strip())


def test_a_formula_reaches_the_functions_and_nothing_else(modules):
    """A Public procedure of a standard module can be called from any cell of any workbook."""
    code = modules[FUNCTIONS_MODULE]
    procedures = re.findall(r"(?m)^(\w+ )?(Function|Sub|Property \w+) (\w+)", code)
    assert [name for scope, _, name in procedures if scope != "Private "] == list(functions())
    assert "Declare" not in code and not re.search(r"(?m)^(Public|Global) (?!Function UF_)", code)


def test_no_workbook_can_change_the_settings(modules):
    code = modules["ThisWorkbook"]
    assert "ActiveWorkbook" not in code and "Environ" not in code and "GetConfig" not in code
    assert re.findall(r"Open (.*) For", code) == [r'ThisWorkbook.Path & "\uffuncs\uffuncs.conf"']


def test_lines_are_within_the_limits_of_vba(modules):
    for code in modules.values():
        assert code.isascii()
        assert max(map(len, code.split("\n"))) <= 1023
        assert not re.search(r"(?:[^\n]* _\n){25}", code)


def as_workbook(path):
    """openpyxl opens workbooks only: the add-in, called one."""
    out = io.BytesIO()
    with zipfile.ZipFile(path) as old, zipfile.ZipFile(out, "w") as new:
        for name in old.namelist():
            content = old.read(name)
            new.writestr(name, content.replace(b".addin.macroEnabled.", b".sheet.macroEnabled."))
    return out


def test_package_reads_in_openpyxl(built):
    book = openpyxl.load_workbook(as_workbook(built[0]))
    assert (
        book.sheetnames == ["functions"]
        and book.properties.title == "uffuncs"
        and book.properties.creator == "uffuncs"
    )
    header, *rows = book["functions"].iter_rows(values_only=True)
    assert header[:5] == ("name", "category", "description", "arguments", "argument 1")
    assert [row[0] for row in rows] == list(functions())
    for row, record in zip(rows, RECORDS):
        descriptions = [v for v in row[4:] if v is not None]
        assert row[1:4] == (category(record), record.summary, len(descriptions))
        assert descriptions[: len(record.arguments)] == [a.description for a in record.arguments]
        assert len(descriptions) == len(argument_names(record))


def test_package_has_the_parts_of_the_template(built):
    with zipfile.ZipFile(built[0]) as package:
        assert package.testzip() is None
        names = package.namelist()
        assert len(names) == len(set(names)) == 11
        assert b"addin.macroEnabled" in package.read("[Content_Types].xml")
        everything = b"".join(package.read(n) for n in names if n.endswith((".xml", ".rels")))
    assert b"Users" not in everything and b"fullCalcOnLoad" not in everything


def test_settings(built):
    lines = built[1].read_text(encoding="ascii").splitlines()
    settings = dict(line.split("=", 1) for line in lines if not line.startswith("#"))
    assert settings["interpreter"] == "python" and settings["module"] == "uffuncs.excel.marked_functions"
    assert (
        settings["version"] == __version__ and settings["library64"] == f"xlwings64-{settings['xlwings']}.dll"
    )
    with pytest.raises(ExcelDoorError, match="plain letters"):
        addin.settings_bytes("C:\\Users\\Ωmega\\python.exe", {})


def test_texts_of_the_registry_are_within_the_limits_of_the_wizard():
    for record in RECORDS:
        names = argument_names(record)
        assert len(record.summary) <= LONGEST_TEXT and len(category(record)) <= LONGEST_TEXT
        assert all(len(a.description) <= LONGEST_TEXT for a in record.arguments)
        assert sum(map(len, names)) + len(names) <= LONGEST_NAMES and len(names) <= MOST_ARGUMENTS
        assert "caller" not in names


def test_summaries_lose_no_letter_in_the_code_page_of_vba():
    """Each character that ASCII has not is spelled; none is dropped without a word."""
    for record in RECORDS:
        for character in record.summary:
            assert plain_ascii(f"x{character}x") != "xx", (record.worksheet_name, character)


def test_golden_texts():
    for name, text in texts().items():
        assert (FOLDER / name).read_bytes().decode("ascii") == text, (
            f"{name} changed: python -m tests.excel.golden"
        )


def test_another_template_is_refused():
    with pytest.raises(ExcelDoorError, match="in another way"):
        addin.check_template("", "0.99.0")


@pytest.mark.parametrize("package", ["xlwings", "pyOpenVBA"])
def test_missing_package_is_one_line(package, monkeypatch, tmp_path):
    import sys
    from importlib import metadata

    def missing(name):
        raise metadata.PackageNotFoundError(name)

    if package == "xlwings":
        monkeypatch.setattr(metadata, "version", missing)
    else:
        monkeypatch.setitem(sys.modules, "pyopenvba", None)
    with pytest.raises(ExcelDoorError, match=package):
        excel.build(tmp_path)
    assert list(tmp_path.iterdir()) == []


def test_a_failed_move_leaves_the_old_file(tmp_path, monkeypatch):
    import os

    target = tmp_path / "uffuncs.xlam"
    target.write_text("old")

    def refused(source, destination):
        raise PermissionError(13, "in use", destination)

    monkeypatch.setattr(os, "replace", refused)
    with pytest.raises(PermissionError):
        addin.write_whole(target, b"new")
    assert target.read_text() == "old" and list(tmp_path.iterdir()) == [target]
