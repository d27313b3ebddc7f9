"""What the workbook part and its relationships say: sheets, tables, defined names, calculation settings."""

import posixpath
import re
from dataclasses import dataclass, field

from .package import UnreadableWorkbook, local, parse_xml

OFFICE_DOCUMENT = "/officeDocument"
WORKSHEET = "/worksheet"
TABLE = "/table"
SHARED_STRINGS = "/sharedStrings"
EXTERNAL_LINK = "/externalLink"


@dataclass(slots=True)
class Table:
    """A table of a worksheet: its range in rows and columns from 1, and its column names."""

    name: str
    sheet: str
    first_row: int
    first_column: int
    last_row: int
    last_column: int
    columns: list[str]
    header_rows: int = 1
    totals_rows: int = 0


@dataclass(slots=True)
class DefinedName:
    """A defined name; `sheet` is None where it holds for the whole workbook."""

    name: str
    sheet: str | None
    definition: str


@dataclass(slots=True)
class Structure:
    """The parts of a workbook that matter to a recalculation."""

    workbook_part: str
    sheets: dict[str, str]  # worksheet name -> part, in the workbook's order
    other_sheets: list[str]  # chart sheets and the like, which hold no cells
    names: list[DefinedName] = field(default_factory=list)
    tables: dict[str, Table] = field(default_factory=dict)  # by casefolded name
    shared_strings_part: str | None = None
    external_links: int = 0
    date_1904: bool = False
    iterate: bool = False


def read_structure(package):
    """The structure of a checked package."""
    workbook_part = _workbook_part(package)
    relations = _relations(package, workbook_part)
    found = Structure(workbook_part, {}, [])
    entries, name = [], None

    def start(tag, attributes):
        nonlocal name
        tag = local(tag)
        if tag == "sheet":
            relation = next((value for key, value in attributes.items() if local(key) == "id"), "")
            entries.append((attributes.get("name", ""), relation))
        elif tag == "definedName":
            name = [attributes.get("name", ""), attributes.get("localSheetId"), []]
        elif tag == "workbookPr":
            found.date_1904 = attributes.get("date1904") in ("1", "true")
        elif tag == "calcPr":
            found.iterate = attributes.get("iterate") in ("1", "true")

    def text(piece):
        if name is not None:
            name[2].append(piece)

    def end(tag):
        nonlocal name
        if local(tag) == "definedName" and name is not None:
            names.append(name)
            name = None

    names = []
    parse_xml(package.read_xml(workbook_part), package.label, workbook_part, start, end, text)
    for title, relation in entries:
        kind, target = relations.get(relation, ("", None))
        if not kind.endswith(WORKSHEET):
            found.other_sheets.append(title)
            continue
        part = package.find(target)
        if part is None:
            raise UnreadableWorkbook(f"{package.label}: the part {target} of sheet {title!r} is missing")
        found.sheets[title] = part
    for title, scope, pieces in names:
        sheet = entries[int(scope)][0] if scope and scope.isdigit() and int(scope) < len(entries) else None
        found.names.append(DefinedName(title, sheet, "".join(pieces).strip().removeprefix("=")))
    for kind, target in relations.values():
        if kind.endswith(SHARED_STRINGS):
            found.shared_strings_part = package.find(target)
        elif kind.endswith(EXTERNAL_LINK):
            found.external_links += 1
    for title, part in found.sheets.items():
        for kind, target in _relations(package, part).values():
            if kind.endswith(TABLE) and (table := package.find(target)):
                entry = _read_table(package, table, title)
                if entry:
                    found.tables[entry.name.casefold()] = entry
    return found


def _workbook_part(package):
    if package.find("xl/workbook.bin"):
        raise UnreadableWorkbook(
            f"{package.label}: is a binary workbook (.xlsb); open it in a spreadsheet program "
            "and save it as .xlsx"
        )
    if "mimetype" in package or "content.xml" in package:
        raise UnreadableWorkbook(
            f"{package.label}: is an OpenDocument file (.ods); open it in a spreadsheet program "
            "and save it as .xlsx"
        )
    relations = _relations(package, "")
    for kind, target in relations.values():
        if kind.endswith(OFFICE_DOCUMENT):
            part = package.find(target)
            if part and part.lower().endswith(".xml") and b"workbook" in package.read_xml(part)[:4000]:
                return part
    raise UnreadableWorkbook(
        f"{package.label}: the package has no workbook part, so it is not an .xlsx workbook"
    )


def _relations(package, part):
    """Relationship id -> (type, target part) of a part; links to the outside are left out."""
    folder, file = posixpath.split(part)
    source = package.find(posixpath.join(folder, "_rels", file + ".rels"))
    found = {}
    if source is None:
        return found

    def start(tag, attributes):
        target = attributes.get("Target", "")
        if local(tag) != "Relationship" or attributes.get("TargetMode") == "External":
            return
        path = (
            target.lstrip("/")
            if target.startswith("/")
            else posixpath.normpath(posixpath.join(folder, target))
        )
        found[attributes.get("Id", "")] = (attributes.get("Type", ""), path)

    parse_xml(package.read_xml(source), package.label, source, start)
    return found


def _read_table(package, part, sheet):
    found = {"columns": []}

    def start(tag, attributes):
        tag = local(tag)
        if tag == "table":
            found.update(attributes)
        elif tag == "tableColumn":
            found["columns"].append(unescape_text(attributes.get("name", "")))

    parse_xml(package.read_xml(part), package.label, part, start)
    area = parse_area(found.get("ref", ""))
    name = found.get("displayName") or found.get("name")
    if area is None or not name:
        return None
    return Table(
        name,
        sheet,
        *area,
        found["columns"],
        _count(found.get("headerRowCount"), 1),
        _count(found.get("totalsRowCount"), 0),
    )


def _count(text, default):
    return int(text) if text and text.isdigit() else default


def unescape_text(text):
    """Undo the _xHHHH_ escapes that workbooks use for control characters."""

    if "_x" not in text:
        return text
    return re.sub(r"_x([0-9A-Fa-f]{4})_", lambda match: chr(int(match[1], 16)), text)


def column_letters(number):
    """Column 28 is AB."""
    letters = ""
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def column_number(letters):
    """AB is column 28."""
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - 64
    return number


def parse_cell(reference):
    """(row, column) of a reference such as $B$7, or None."""
    text = reference.replace("$", "")
    digits = text.lstrip("ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz")
    letters = text[: len(text) - len(digits)]
    if not (letters and len(letters) <= 3 and digits.isascii() and digits.isdigit()):
        return None
    row, column = int(digits), column_number(letters)
    return (row, column) if 1 <= row <= 1_048_576 and column <= 16_384 else None


def parse_area(reference):
    """(first row, first column, last row, last column) of a reference such as B2:D9, or None."""
    first, _, last = reference.partition(":")
    start, end = parse_cell(first), parse_cell(last or first)
    if start is None or end is None:
        return None
    return min(start[0], end[0]), min(start[1], end[1]), max(start[0], end[0]), max(start[1], end[1])


def address(row, column):
    """A1 text of a cell."""
    return f"{column_letters(column)}{row}"
