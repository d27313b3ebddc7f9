"""Find the formula cells of a worksheet part, with the byte spans that a patch needs.

The part has passed an XML parser before; here one regular expression walks over its bytes, because only byte
spans allow everything else to be left exactly as it is.
"""

import re
from dataclasses import dataclass, field

from .package import UnreadableWorkbook, parse_xml
from .structure import column_number, parse_area

ATTRIBUTE = re.compile(rb"""([\w:.-]+)\s*=\s*(?:"([^"]*)"|'([^']*)')""")
ATTRIBUTES = rb"""[^>"']*(?:(?:"[^"]*"|'[^']*')[^>"']*)*"""
POSITION = re.compile(rb"""(?:^|\s)r\s*=\s*["']([A-Za-z]{1,3})([0-9]{1,7})["']""")
ROW_NUMBER = re.compile(rb"""(?:^|\s)r\s*=\s*["']([0-9]{1,7})["']""")
HIDING = re.compile(rb"<!--.*?-->|<!\[CDATA\[.*?\]\]>|<\?.*?\?>", re.DOTALL)
ENTITY = re.compile("&(#[0-9]+|#x[0-9A-Fa-f]+|amp|lt|gt|quot|apos);")
ENTITIES = {"amp": "&", "lt": "<", "gt": ">", "quot": '"', "apos": "'"}
ROOT = re.compile(rb"<((?:[\w.-]+:)?)worksheet(?=[\s/>])")

NORMAL, SHARED, ARRAY, DYNAMIC, DATA_TABLE, EMPTY = (
    "normal",
    "shared",
    "array",
    "dynamic",
    "data table",
    "empty",
)
KEPT = (DATA_TABLE, EMPTY)  # kinds without a formula of their own: their values stay


@dataclass(slots=True, eq=False)
class FormulaCell:
    """One formula cell: where it stands, its formula as saved, and the spans of its bytes."""

    row: int
    column: int
    start: int  # span of the whole <c> element
    end: int
    body: int  # where the content after the opening tag begins
    formula_start: int  # span of the whole <f> element
    formula_end: int
    text: str  # "" for the dependants of a shared formula
    kind: str = NORMAL
    area: tuple | None = None  # of an array formula
    shared_index: str | None = None
    type: bytes = b"n"  # of the cached value
    cached: bytes | None = None  # raw bytes of the cached value; None where there is none
    usual: bool = False  # nothing but a formula and perhaps a value, in the usual form


@dataclass(slots=True)
class PlainCell:
    """A cell without formula, kept only where an array formula covers it."""

    row: int
    column: int
    start: int
    end: int
    type: bytes = b"n"
    cached: bytes | None = None
    body: int = 0


@dataclass(slots=True)
class RowSpan:
    """Byte spans of a row: opening tag, and where its content ends (None for a self-closing row)."""

    number: int
    start: int
    open_end: int
    content_end: int | None


@dataclass(slots=True)
class Sheet:
    """A worksheet part in UTF-8 and its formula cells in document order."""

    name: str
    part: str
    data: bytes
    masked: bytes = b""
    prefix: bytes = b""
    content: tuple[int, int] = (0, 0)  # span between <sheetData> and </sheetData>
    cells: list[FormulaCell] = field(default_factory=list)
    masters: dict[str, str] | None = None

    def formula_of(self, cell):
        """The text of a cell's formula; dependants of a shared formula give their master's text."""
        if cell.text or cell.kind != SHARED:
            return cell.text
        if self.masters is None:
            self.masters = {
                cell.shared_index: cell.text for cell in self.cells if cell.kind == SHARED and cell.text
            }
        return self.masters.get(cell.shared_index, "")

    def arrays(self):
        return [cell for cell in self.cells if cell.area is not None]


def read_sheet(package, name, part):
    """The formula cells of one worksheet part."""
    data = package.read_xml(part)
    sheet = Sheet(name, part, data, data)
    if HIDING.search(data, data.find(b"?>") + 1):
        sheet.masked = HIDING.sub(_mask, data)
    root = ROOT.search(sheet.masked)
    if root is None:
        raise UnreadableWorkbook(f"{package.label}: the part {part} of sheet {name!r} is not a worksheet")
    sheet.prefix = root[1]
    opening = re.compile(rb"<%ssheetData(?=[\s/>])%s>" % (sheet.prefix, ATTRIBUTES)).search(sheet.masked)
    if opening is None or opening[0].endswith(b"/>"):
        return sheet
    closing = sheet.masked.find(b"</%ssheetData" % sheet.prefix, opening.end())
    sheet.content = (opening.end(), closing)
    if sheet.masked.find(b"<%sf" % sheet.prefix, *sheet.content) >= 0:
        sheet.cells = list(_formula_cells(package, sheet))
        for cell in sheet.cells:
            if not cell.text and cell.kind != DATA_TABLE and not sheet.formula_of(cell):
                cell.kind, cell.area = EMPTY, None
    return sheet


def _mask(match):
    """Comments and CDATA sections may hold text that looks like tags: hide it, byte for byte."""
    return b" " * len(match[0]) if match[0].startswith((b"<!--", b"<?")) else b"x" * len(match[0])


#: A formula cell in the form nearly all have; whatever differs takes the general way.
USUAL = (
    rb'<%(p)sc r="(?P<letters>[A-Z]{1,3})(?P<number>[0-9]{1,7})"(?: s="[0-9]+")?(?: t="(?P<type>[a-z]+)")?>'
    rb"(?P<f><%(p)sf>(?P<text>[^<]*)</%(p)sf>)(?:<%(p)sv>(?P<value>[^<]*)</%(p)sv>|<%(p)sv ?/>)?"
    rb"</%(p)sc>|"
)


def _cell_pattern(prefix, usual=b""):
    return re.compile(
        usual % {b"p": prefix} + rb"<%(p)srow(?=[\s/>])(?P<row>%(a)s)>"
        rb"|<%(p)sc(?=[\s/>])(?P<cell>%(a)s)(?:(?<=/)>|>(?P<body>.*?)</%(p)sc\s*>)"
        % {b"p": prefix, b"a": ATTRIBUTES},
        re.DOTALL,
    )


def _formula_cells(package, sheet):
    prefix, data = sheet.prefix, sheet.data
    formula_pattern = re.compile(
        rb"<%(p)sf(?=[\s/>])(%(a)s)(?:(?<=/)>|>(.*?)</%(p)sf\s*>)" % {b"p": prefix, b"a": ATTRIBUTES},
        re.DOTALL,
    )
    value_pattern = re.compile(
        rb"<%(p)sv(?=[\s/>])%(a)s(?:(?<=/)>|>(.*?)</%(p)sv\s*>)" % {b"p": prefix, b"a": ATTRIBUTES}, re.DOTALL
    )
    marker = b"<%sf" % prefix
    row = column = 0
    columns = {}
    unplaced = re.search(rb"<%sc(?=[\s/>])(?![^>]*\sr\s*=)" % prefix, sheet.masked) is not None
    for match in _cell_pattern(prefix, USUAL).finditer(sheet.masked, *sheet.content):
        if match.lastgroup == "f" or match.lastgroup == "value":
            letters, number, kind, _, text, value = match.groups()[:6]
            row, column = int(number), columns.get(letters) or columns.setdefault(
                letters, column_number(letters.decode())
            )
            _check_place(package, sheet, row, column)
            start, end = match.span("f")
            if sheet.masked is not data:
                text = data[slice(*match.span("text"))]
                value = data[slice(*match.span("value"))] if value is not None else None
            if not value and kind != b"str":
                value = None
            text = decode_text(package, sheet.part, text)
            yield FormulaCell(
                row,
                column,
                match.start(),
                match.end(),
                start,
                start,
                end,
                text.strip().removeprefix("="),
                type=kind or b"n",
                cached=value,
                usual=True,
            )
            continue
        if match["row"] is not None:
            row, column = _row_number(match["row"], row), 0
            continue
        body = match["body"]
        if not unplaced and (body is None or marker not in body):
            continue
        attributes = match["cell"]
        place = POSITION.search(attributes)
        if place is None:
            column += 1
        else:
            row, column = int(place[2]), column_number(place[1].decode())
        if body is None or marker not in body:
            continue
        formula = formula_pattern.search(sheet.masked, match.start("body"), match.end("body"))
        if formula is None:
            continue
        _check_place(package, sheet, row, column)
        text = decode_text(package, sheet.part, data[formula.start(2) : formula.end(2)]) if formula[2] else ""
        value = value_pattern.search(sheet.masked, formula.end(), match.end("body"))
        cell = FormulaCell(
            row,
            column,
            match.start(),
            match.end(),
            match.start("body"),
            formula.start(),
            formula.end(),
            text.strip().removeprefix("="),
        )
        if value is not None and value[1] is not None:
            cell.cached = data[value.start(1) : value.end(1)]
        if b"t" in attributes or b"cm" in attributes:
            named = read_attributes(attributes)
            cell.type = named.get(b"t", b"n")
        else:
            named = {}
        if not cell.cached and cell.type != b"str":
            cell.cached = None
        if formula[1].strip():
            _classify(cell, read_attributes(formula[1]), b"cm" in named)
        yield cell


def _check_place(package, sheet, row, column):
    if not (1 <= row <= 1_048_576 and 1 <= column <= 16_384):
        raise UnreadableWorkbook(f"{package.label}: sheet {sheet.name!r} has a cell outside the worksheet")


def _row_number(attributes, previous):
    found = ROW_NUMBER.search(attributes)
    return int(found[1]) if found else previous + 1


def _classify(cell, attributes, has_metadata):
    kind = attributes.get(b"t", b"normal")
    if kind == b"shared":
        cell.kind, cell.shared_index = SHARED, attributes.get(b"si", b"").decode()
    elif kind == b"array":
        cell.kind = DYNAMIC if has_metadata else ARRAY
        area = parse_area(attributes.get(b"ref", b"").decode())
        cell.area = area if area and area[:2] == (cell.row, cell.column) else (cell.row, cell.column) * 2
    elif kind == b"dataTable":
        cell.kind = DATA_TABLE


def read_attributes(text):
    """Attributes of an opening tag as bytes, prefixes kept, entities left as they are."""
    return {name: double or single for name, double, single in ATTRIBUTE.findall(text)}


def decode_text(package, part, raw):
    """The text of an element's content."""
    if b"<" not in raw:
        text = raw.decode("utf-8")
        return ENTITY.sub(_character, text) if "&" in text else text
    pieces = []
    parse_xml(b"<x>" + raw + b"</x>", package.label, part, text=pieces.append)
    return "".join(pieces)


def _character(match):
    code = match[1]
    if code.startswith("#"):
        return chr(int(code[2:], 16) if code[1] == "x" else int(code[1:]))
    return ENTITIES[code]


def rows_and_cells(sheet):
    """Every row span and plain cell span of a sheet, for the few sheets that hold array formulas."""
    rows, cells = [], {}
    prefix = sheet.prefix
    closing = b"</%srow" % prefix
    value_pattern = re.compile(
        rb"<%(p)sv(?=[\s/>])%(a)s>(.*?)</%(p)sv\s*>" % {b"p": prefix, b"a": ATTRIBUTES}, re.DOTALL
    )
    row = column = 0
    for match in _cell_pattern(prefix).finditer(sheet.masked, *sheet.content):
        if match["row"] is not None:
            row, column = _row_number(match["row"], row), 0
            end = None if match["row"].endswith(b"/") else sheet.masked.find(closing, match.end())
            rows.append(RowSpan(row, match.start(), match.end(), end))
            continue
        place = POSITION.search(match["cell"])
        column += 1
        if place is not None:
            row, column = int(place[2]), column_number(place[1].decode())
        cell = PlainCell(row, column, match.start(), match.end(), body=match.end())
        cell.type = read_attributes(match["cell"]).get(b"t", b"n")
        if match["body"] is not None:
            cell.body = match.start("body")
            value = value_pattern.search(sheet.masked, match.start("body"), match.end("body"))
            cell.cached = value and sheet.data[value.start(1) : value.end(1)]
        cells[row, column] = cell
    return rows, cells
