"""Sheets of one look: label, symbol, value, unit, remark; Excel's own cell styles; a defined name for what others use."""

from __future__ import annotations

import tempfile
from pathlib import Path

from openpyxl import Workbook
from openpyxl.chart import ScatterChart, Series
from openpyxl.chart.axis import ChartLines
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.drawing.line import LineProperties
from openpyxl.styles import Alignment, Font
from openpyxl.utils import get_column_letter
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet

from uffuncs.files import write_into_place

LABEL, SYMBOL, VALUE, UNIT, REMARK = "A", "B", "C", "D", "E"
WIDTHS = {LABEL: 44, SYMBOL: 11, VALUE: 16, UNIT: 17, REMARK: 62}


class Page:
    """One sheet, filled from the top."""

    def __init__(self, workbook: Workbook, title: str, heading: str, purpose: str, widths: dict[str, float] | None = None):
        self.sheet: Worksheet = workbook.create_sheet(title)
        self.workbook = workbook
        self.title = title
        for column, width in {**WIDTHS, **(widths or {})}.items():
            self.sheet.column_dimensions[column].width = width
        self.sheet["A1"] = heading
        self.sheet["A1"].style = "Title"
        self.sheet["A2"] = purpose
        self.sheet["A2"].style = "Explanatory Text"
        self.sheet.sheet_view.showGridLines = False
        self.row = 4
        page = self.sheet.page_setup
        page.orientation, page.paperSize, page.fitToWidth, page.fitToHeight = "landscape", 9, 1, 1
        self.sheet.sheet_properties.pageSetUpPr.fitToPage = True

    def section(self, text: str) -> None:
        if self.row > 4:
            self.row += 1
        self.sheet[f"A{self.row}"] = text
        self.sheet[f"A{self.row}"].style = "Headline 2"
        for column in (SYMBOL, VALUE, UNIT, REMARK):
            self.sheet[f"{column}{self.row}"].style = "Headline 2"
        self.row += 1

    def line(self, style: str, label: str, symbol: str, value, unit: str, remark: str, name: str, number_format: str) -> str:
        """One row; gives the address of its value."""
        row = self.row
        for column, text in ((LABEL, label), (SYMBOL, symbol), (UNIT, unit), (REMARK, remark)):
            self.sheet[f"{column}{row}"] = text
        self.sheet[f"{SYMBOL}{row}"].font = Font(italic=True)
        self.sheet[f"{UNIT}{row}"].alignment = Alignment(horizontal="left", indent=1)
        self.sheet[f"{REMARK}{row}"].style = "Explanatory Text"
        cell = self.sheet[f"{VALUE}{row}"]
        cell.value, cell.style, cell.number_format = value, style, number_format
        cell.alignment = Alignment(horizontal="right")
        if name:
            self.name(name, f"${VALUE}${row}")
        self.row += 1
        return f"{VALUE}{row}"

    def name(self, name: str, address: str) -> None:
        """A defined name for a cell or range of this sheet, given absolute."""
        self.workbook.defined_names[name] = DefinedName(name, attr_text=f"'{self.title}'!{address}")

    def input(self, label, symbol, value, unit, remark="", name="", number_format="General"):
        return self.line("Input", label, symbol, value, unit, remark, name, number_format)

    def calculated(self, label, symbol, value, unit, remark="", name="", number_format="0.000"):
        return self.line("Calculation", label, symbol, value, unit, remark, name, number_format)

    def output(self, label, symbol, value, unit, remark="", name="", number_format="0.0"):
        return self.line("Output", label, symbol, value, unit, remark, name, number_format)

    def check(self, label, value, remark=""):
        return self.line("Check Cell", label, "", value, "", remark, "", "General")

    def text(self, text: str, style: str = "Normal") -> None:
        """A paragraph across the page."""
        self.sheet.merge_cells(f"{LABEL}{self.row}:{REMARK}{self.row}")
        cell = self.sheet[f"{LABEL}{self.row}"]
        cell.value, cell.style = text, style
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        self.sheet.row_dimensions[self.row].height = 15 * (1 + len(text) // 135)
        self.row += 1

    def header(self, names: list[str], units: list[str]) -> None:
        """Two heading rows of a table: quantities, and their units."""
        for offset, texts in ((0, names), (1, units)):
            for n, text in enumerate(texts, 1):
                cell = self.sheet.cell(self.row + offset, n, text)
                cell.style = "Headline 3" if offset == 0 else "Explanatory Text"
                cell.alignment = Alignment(wrap_text=True, horizontal="left" if n == 1 else "right", vertical="bottom")
        self.row += 2

    def cells(self, row: int, values: list, styles: list[str], formats: list[str]) -> None:
        for n, (value, style, number_format) in enumerate(zip(values, styles, formats), 1):
            cell = self.sheet.cell(row, n, value)
            cell.style, cell.number_format = style, number_format
            cell.alignment = Alignment(horizontal="right")

    def array(self, first: str, last: str, formula: str, number_format: str = "0.000", style: str = "Calculation") -> None:
        """One formula that fills a block."""
        self.sheet[first] = ArrayFormula(f"{first}:{last}", formula)
        for row in self.sheet[f"{first}:{last}"]:
            for cell in row:
                cell.style, cell.number_format = style, number_format


def scatter(page: Page, anchor: str, title: str, x_title: str, y_title: str, size=(17, 9.5)) -> ScatterChart:
    chart = ScatterChart()
    chart.title, chart.style, chart.scatterStyle = title, 2, "lineMarker"
    chart.x_axis.title, chart.y_axis.title = x_title, y_title
    chart.width, chart.height = size
    chart.x_axis.delete = chart.y_axis.delete = False  # shown also by programs that take a missing flag for true
    chart.legend.position = "b"
    chart.x_axis.number_format = chart.y_axis.number_format = "General"
    chart.x_axis.majorGridlines = None
    chart.y_axis.majorGridlines = ChartLines(spPr=GraphicalProperties(ln=LineProperties(solidFill="D9D9D9")))
    page.sheet.add_chart(chart, anchor)
    return chart


def add_series(chart: ScatterChart, x, y, title: str, color: str, marker: bool = False, dashed: bool = False) -> None:
    series = Series(y, x, title=title)
    series.smooth = False
    if marker:
        series.marker.symbol, series.marker.size = "circle", 7
        series.marker.graphicalProperties = GraphicalProperties(solidFill=color)
        series.marker.graphicalProperties.line.solidFill = color
        series.graphicalProperties.line.noFill = True
    else:
        series.marker.symbol = "none"
        series.graphicalProperties.line.solidFill = color
        series.graphicalProperties.line.width = 22000
        if dashed:
            series.graphicalProperties.line.dashStyle = "dash"
    chart.series.append(series)


def column_range(first_row: int, last_row: int, column: int) -> str:
    letter = get_column_letter(column)
    return f"${letter}${first_row}:${letter}${last_row}"


def save(workbook: Workbook, path: Path) -> None:
    """Write beside the target, then move into place."""
    write_into_place(Path(path), workbook.save)


def write_with_values(build, path: Path):
    """Build a workbook and recalculate it; the finished file is moved into place. Gives the report."""
    from uffuncs.headless import recalculate

    with tempfile.TemporaryDirectory() as scratch:
        bare = Path(scratch) / path.name
        build(bare)
        return recalculate(bare, path)
