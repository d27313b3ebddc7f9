"""Recalculation by an installed LibreOffice: its values and nothing else come into the package."""

from __future__ import annotations

import socket
import sys
import threading
from pathlib import Path

import openpyxl
import pytest
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula

sys.path.append(str(Path(__file__).parents[1] / "headless"))

from headless_books import packed, parts_of, sheet_xml

from uffuncs.calc import engine as calc_engine
from uffuncs.calc.office import OVERRIDE, Office
from uffuncs.headless import UnreadableWorkbook, recalculate
from uffuncs.headless.engine import engine_named

FORMULAS = {
    "B1": '=UF_FLUX_DARCY("35 psi",A1,5E12)',
    "B2": "=_xll.UF_FLUX_DARCY(A2,A1,5E12,,1E12)",
    "B3": "=UF_FLUX_DARCY(-1,1,5E12)",
    "B4": "=B3+1",
    "B5": '=IF(B1>100,"high","low")',
    "B6": "=B1>100",
    "B7": '=""',
    "B8": "=flux*2",
    "B9": "=NOBODYS(A1)",
    "B10": "=UF_NOBODYS(A1)",
    "B11": "=1/3",
    "B12": "=SUM(A1:A2)/0",
}


def build(path, formulas=FORMULAS):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet["A1"], sheet["A2"] = 1.002, 2
    for place, formula in formulas.items():
        sheet[place] = formula
    sheet["D1"] = ArrayFormula("D1:D3", "=UF_FLUX_DARCY(A1:A2,1,5E12)")
    book.defined_names["flux"] = DefinedName("flux", attr_text="UF_FLUX_DARCY(Sheet!$A$2,1.002,5E12)")
    book.save(path)
    return path


def shown(path):
    sheet = openpyxl.load_workbook(path, data_only=True).active
    return {c.coordinate: c.value for row in sheet.iter_rows() for c in row if c.value is not None}


@pytest.fixture(scope="module")
def both(office, folder):
    """The same workbook by both engines: (reports, values)."""
    source = build(folder / "in.xlsx")
    reports = {
        name: recalculate(source, folder / f"{name}.xlsx", engine=name) for name in ("formualizer", "calc")
    }
    return reports, {name: shown(folder / f"{name}.xlsx") for name in reports}, folder


def test_values_are_those_of_the_other_engine(both):
    _, values, _ = both
    assert values["calc"].keys() == values["formualizer"].keys()
    for place, value in values["formualizer"].items():
        other = values["calc"][place]
        assert other == (pytest.approx(value, rel=1e-14) if isinstance(value, float) else value), place
    assert values["calc"]["B6"] is True and values["calc"]["B3"] == "#NUM!" and values["calc"]["D3"] == "#N/A"


def test_report(both):
    reports, _, _ = both
    one, other = reports["formualizer"], reports["calc"]
    assert (other.engine, other.formulas, other.own_formulas) == ("calc", one.formulas, one.own_formulas)
    assert [(e.address, e.code) for e in other.errors] == [(e.address, e.code) for e in one.errors]
    assert {e.address: e.reason for e in other.errors}["B3"].startswith(
        "UF_FLUX_DARCY: transmembrane_pressure must be"
    )
    assert {u.name for u in other.unknown_functions} == {"NOBODYS", "UF_NOBODYS"}
    assert any(note.startswith("the values are those of LibreOffice") for note in other.notes)
    assert not any("differ" in note for note in other.notes)


def test_only_cached_values_change(both):
    *_, folder = both
    from uffuncs.headless.package import Package

    source, target = Package(folder / "in.xlsx"), Package(folder / "calc.xlsx")
    changed = [m.filename for m in source.members if source.read(m.filename) != target.read(m.filename)]
    assert changed == ["xl/worksheets/sheet1.xml"]
    book = openpyxl.load_workbook(folder / "calc.xlsx")
    assert book.active["B2"].value == FORMULAS["B2"] and book.active["D1"].value.ref == "D1:D3"


def test_a_second_run_changes_nothing(both):
    *_, folder = both
    report = recalculate(folder / "calc.xlsx", folder / "again.xlsx", engine="calc")
    assert (report.changed, report.filled) == (0, 0)
    assert (folder / "again.xlsx").read_bytes() == (folder / "calc.xlsx").read_bytes()


def test_names_renamed_as_for_an_older_version(both, monkeypatch):
    """This LibreOffice reads programmatic names too: the renaming for 7.4 can at least be computed here."""
    _, values, folder = both
    monkeypatch.setattr(Office, "version", lambda self: (7, 4))
    report = recalculate(folder / "in.xlsx", folder / "older.xlsx", engine="calc")
    assert shown(folder / "older.xlsx") == values["calc"]
    assert "the values are those of LibreOffice 7.4" in report.notes
    assert openpyxl.load_workbook(folder / "older.xlsx").active["B2"].value == FORMULAS["B2"]


def test_formulas_as_a_program_saves_them(office, folder):
    """Shared formulas, dynamic arrays, prefixes, and a workbook that may hold macros."""
    shared = ' t="shared" ref="B1:B2" si="0"'
    rows = (
        f'<row r="1"><c r="A1"><v>1</v></c><c r="B1"><f{shared}>A1*2</f></c>'
        '<c r="C1" cm="1"><f t="array" ref="C1:C2">UF_FLUX_DARCY(A1:A2,1,5E12)</f><v>7</v></c>'
        '<c r="D1"><f>[1]!UF_FLUX_DARCY(A1,1,5E12)</f><v>7</v></c></row>'
        '<row r="2"><c r="A2"><v>2</v></c><c r="B2"><f t="shared" si="0"/><v>7</v></c></row>'
    )
    main = b"vnd.openxmlformats-officedocument.spreadsheetml.sheet.main"
    parts = {name: data.encode() for name, data in parts_of({"S": sheet_xml(rows)}).items()}
    types = parts["[Content_Types].xml"].replace(main, b"vnd.ms-excel.sheet.macroEnabled.main")
    source = folder / "macros.xlsm"
    source.write_bytes(packed(parts | {"[Content_Types].xml": types}))
    report = recalculate(source, folder / "macros_out.xlsm", engine="calc")
    assert not report.errors and "1 dynamic arrays keep the ranges they had" in report.notes
    assert shown(folder / "macros_out.xlsm") == {
        "A1": 1,
        "B1": 2,
        "C1": 72,
        "D1": 72,
        "A2": 2,
        "B2": 4,
        "C2": 144,
    }


def test_a_difference_is_told(both, monkeypatch):
    from uffuncs.headless.formualizer_engine import FormualizerEngine

    *_, folder = both
    evaluate = FormualizerEngine.evaluate

    def otherwise(self, model, progress=None):
        found = evaluate(self, model, progress)
        found.values["Sheet", 11, 2] *= 2
        return found

    monkeypatch.setattr(FormualizerEngine, "evaluate", otherwise)
    report = recalculate(folder / "in.xlsx", folder / "differing.xlsx", engine="calc")
    assert any(
        note.startswith("1 values differ from those of the engine formualizer; first Sheet!B11: 0.333")
        for note in report.notes
    )


def test_no_network(office, folder):
    """A workbook that asks for an address on the network is computed without it."""
    server = socket.create_server(("127.0.0.1", 0))
    server.settimeout(0.2)
    address, met, over = f"http://127.0.0.1:{server.getsockname()[1]}/x", [], threading.Event()

    def listen():
        while not over.is_set():
            try:
                connection, _ = server.accept()
                met.append(connection.recv(200))
                connection.close()
            except TimeoutError:
                pass

    thread = threading.Thread(target=listen)
    thread.start()
    try:
        source = build(
            folder / "network.xlsx",
            {
                "B1": f'=_xlfn.WEBSERVICE("{address}")',
                "B2": f"='{address}.xlsx'#$Sheet1.A1",
                "B3": "=UF_VERSION()",
                "B4": f'=HYPERLINK("{address}")',
                "B5": f'=DDE("soffice";"{address}";"A1")'.replace(";", ","),
            },
        )
        recalculate(source, folder / "network_out.xlsx", engine="calc")
        from uffuncs import __version__

        assert shown(folder / "network_out.xlsx")["B3"] == __version__
    finally:
        over.set()
        thread.join()
        server.close()
    assert met == []


@pytest.mark.parametrize("seconds", [0.01, 1.0])
def test_a_program_that_does_not_end(office, folder, monkeypatch, seconds):
    source = build(folder / "refused.xlsx")
    monkeypatch.setattr(calc_engine, "SECONDS", seconds)
    with pytest.raises(UnreadableWorkbook, match="has not finished within"):
        recalculate(source, folder / "refused_out.xlsx", engine="calc")
    assert not (folder / "refused_out.xlsx").exists()
    assert not [p for p in Path("/proc").glob("[0-9]*/cmdline") if b"UserInstallation" in read(p)]


def read(path):
    try:
        return path.read_bytes()
    except OSError:  # a process that has ended meanwhile
        return b""


def test_without_libreoffice(tmp_path, monkeypatch):
    monkeypatch.setenv(OVERRIDE, str(tmp_path / "nowhere"))
    source = build(tmp_path / "in.xlsx")
    with pytest.raises(UnreadableWorkbook, match="LibreOffice is not found; install it"):
        recalculate(source, tmp_path / "out.xlsx", engine="calc")
    assert not (tmp_path / "out.xlsx").exists()


def test_engines_by_name():
    assert engine_named("calc").name == "calc"
    with pytest.raises(UnreadableWorkbook, match="'formualizer' and 'calc'"):
        engine_named("other")
