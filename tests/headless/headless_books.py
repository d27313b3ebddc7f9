"""Workbooks for the tests: built with openpyxl, or by hand where openpyxl cannot write what a program saves."""

import io
import zipfile
from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

import openpyxl

from uffuncs.headless import recalculate

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
RELATION = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"
DECLARATION = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'


def sheet_xml(rows, before="", after=""):
    return (
        f'{DECLARATION}<worksheet xmlns="{MAIN}" xmlns:r="{RELATION}">{before}<sheetData>{rows}</sheetData>{after}'
        "</worksheet>"
    )


def parts_of(sheets, settings="", names="", after=""):
    """The parts of a small workbook; `sheets` is {name: sheet XML}."""
    entries = "".join(
        f'<sheet name={quoteattr(name)} sheetId="{i}" r:id="rId{i}"/>' for i, name in enumerate(sheets, 1)
    )
    defined = "<definedNames>" + names + "</definedNames>" if names else ""
    overrides = "".join(
        f'<Override PartName="/xl/worksheets/sheet{i}.xml" ContentType="application/vnd.openxmlformats-officedocument.'
        'spreadsheetml.worksheet+xml"/>'
        for i in range(1, len(sheets) + 1)
    )
    relations = "".join(
        f'<Relationship Id="rId{i}" Type="{RELATION}/worksheet" Target="worksheets/sheet{i}.xml"/>'
        for i in range(1, len(sheets) + 1)
    )
    parts = {
        "[Content_Types].xml": f'{DECLARATION}<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">'
        '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        '<Default Extension="xml" ContentType="application/xml"/><Override PartName="/xl/workbook.xml" ContentType='
        '"application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"/>'
        + overrides
        + "</Types>",
        "_rels/.rels": f'{DECLARATION}<Relationships xmlns="{PACKAGE}"><Relationship Id="rId1" Type="{RELATION}/officeDocument" '
        'Target="xl/workbook.xml"/></Relationships>',
        "xl/workbook.xml": f'{DECLARATION}<workbook xmlns="{MAIN}" xmlns:r="{RELATION}">{settings}<sheets>{entries}</sheets>{defined}'
        f"{after}</workbook>",
        "xl/_rels/workbook.xml.rels": f'{DECLARATION}<Relationships xmlns="{PACKAGE}">{relations}</Relationships>',
    }
    for i, xml in enumerate(sheets.values(), 1):
        parts[f"xl/worksheets/sheet{i}.xml"] = xml
    return parts


def packed(parts):
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in parts.items():
            archive.writestr(zipfile.ZipInfo(name, (2020, 2, 29, 12, 30, 10)), data, zipfile.ZIP_DEFLATED)
    return buffer.getvalue()


def cell(reference, formula=None, value=None, attributes="", of_formula=""):
    """One <c> element."""
    f = "" if formula is None else f"<f{of_formula}>{escape(formula)}</f>"
    v = "" if value is None else f"<v>{escape(str(value))}</v>"
    return f'<c r="{reference}"{attributes}>{f}{v}</c>'


def members(path):
    with zipfile.ZipFile(path) as archive:
        return {info.filename: archive.read(info) for info in archive.infolist()}


def shown(path):
    """Cached values: {sheet: {address: value}}, blanks left out."""
    book = openpyxl.load_workbook(path, data_only=True)
    return {
        sheet.title: {c.coordinate: c.value for row in sheet.iter_rows() for c in row if c.value is not None}
        for sheet in book.worksheets
    }


class Bench:
    """A folder to recalculate workbooks in."""

    def __init__(self, folder: Path):
        self.folder = folder

    def save(self, book, name="in.xlsx"):
        path = self.folder / name
        book.save(path)
        return path

    def write(self, parts, name="in.xlsx"):
        path = self.folder / name
        path.write_bytes(parts if isinstance(parts, bytes) else packed(parts))
        return path

    def run(self, source, name="out.xlsx"):
        """(report, cached values of all sheets) after one recalculation; a second one must change nothing."""
        path = (
            source
            if isinstance(source, Path)
            else self.save(source) if isinstance(source, openpyxl.Workbook) else self.write(source)
        )
        target = self.folder / name
        report = recalculate(path, target)
        again = self.folder / ("again-" + name)
        second = recalculate(target, again)
        assert again.read_bytes() == target.read_bytes()
        assert (second.changed, second.filled) == (0, 0)
        return report, shown(target)

    def rows(self, rows, **more):
        """Recalculate one hand-made sheet S; (report, {address: value})."""
        report, values = self.run(parts_of({"S": sheet_xml(rows)}, **more))
        return report, values["S"]

    def formulas(self, cells, **names):
        """Recalculate {address: value or formula} written with openpyxl; (report, {address: value})."""
        book = openpyxl.Workbook()
        sheet = book.active
        sheet.title = "S"
        for place, value in cells.items():
            sheet[place] = value
        for name, definition in names.items():
            book.defined_names[name] = openpyxl.workbook.defined_name.DefinedName(name, attr_text=definition)
        report, values = self.run(book)
        return report, values["S"]


def reasons(report):
    return {f"{error.sheet}!{error.address}": error.reason for error in report.errors}
