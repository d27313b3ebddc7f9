"""The engine's own copy of a workbook: formulas rewritten where the engine reads them otherwise."""

import zipfile
from bisect import bisect_right
from xml.sax.saxutils import escape

from .builtin import FIT
from .elementwise import lifted, may_lift
from .intersection import intersected
from .sheet import ARRAY, DYNAMIC, KEPT, HIDING, SHARED, decode_text, rows_and_cells
from .structure import address

SPILL_LIMIT = 10_000  # cells the engine spills from one formula


def engine_copy(model, rewriter):
    """(package bytes, further formulas to set); the workbook's own bytes where nothing needs to change."""
    parts, further = {}, []
    for sheet in model.sheets:
        edits = list(_edits(model, sheet, rewriter, further))
        if edits:
            parts[sheet.part] = apply_edits(sheet.data, edits)
        elif sheet.part in model.package.transcoded:
            parts[sheet.part] = sheet.data  # the engine reads UTF-8
    if not parts:
        return model.package.stored, further
    return model.package.with_parts(parts, zipfile.ZIP_STORED), further


def apply_edits(data, edits):
    """Replace byte spans; edits are (start, end, bytes), insertions at one place keep their order."""
    pieces, position = [], 0
    for start, end, new in sorted(edits, key=lambda edit: edit[:2]):
        pieces += (data[position:start], new)
        position = end
    pieces.append(data[position:])
    return b"".join(pieces)


def _edits(model, sheet, rewriter, further):
    prefix = sheet.prefix
    children = _children(sheet)
    if children:
        cells = rows_and_cells(sheet)[1]
        anchors = {(cell.row, cell.column) for cell in sheet.cells}
        yield from (
            (cells[place].start, cells[place].end, b"")
            for place in children
            if place in cells and place not in anchors
        )
    for cell in sheet.cells:
        if cell.kind in KEPT:
            yield cell.formula_start, cell.formula_end, b""  # its values stay as they are
            continue
        formula = _for_engine(cell, sheet, rewriter) if cell.text else ""
        if cell.kind in (ARRAY, DYNAMIC):
            if cell.kind == ARRAY:
                formula = _fitted(sheet, cell, formula, further)
            yield cell.start, cell.end, _cell_xml(prefix, cell, b"", formula)
        elif cell.type == b"s" or b"<!" in sheet.data[cell.formula_start + 1 : cell.formula_end]:
            # The cached text may point outside the shared strings, which would stop the engine's reader.
            opening = _formula_opening(sheet, cell) if cell.kind == SHARED else b""
            yield cell.start, cell.end, _cell_xml(prefix, cell, opening, formula)
        elif formula != cell.text:
            yield (
                cell.formula_start,
                cell.formula_end,
                b"<%sf%s>%s</%sf>"
                % (prefix, _formula_opening(sheet, cell), escape(formula).encode(), prefix),
            )
    if sheet.masked is not sheet.data:
        yield from _plain_text(model, sheet)


def _for_engine(cell, sheet, rewriter):
    """The formula as the engine should read it."""
    formula = rewriter.rewrite(cell.text, sheet.name, cell.row)
    areas = rewriter.area_names
    if may_lift(formula) or areas and any(name in formula.casefold() for name in areas):
        is_array = cell.kind in (ARRAY, DYNAMIC)
        if not is_array:
            formula = intersected(formula, areas)
        formula, used = lifted(formula, areas, is_array, moves=cell.kind == SHARED)
        rewriter.lifted |= used
    return formula


def _children(sheet):
    """Cells that array formulas cover, their anchors left out."""
    covered = set()
    for cell in sheet.arrays():
        first_row, first_column, last_row, last_column = cell.area
        covered.update(
            (row, column)
            for row in range(first_row, last_row + 1)
            for column in range(first_column, last_column + 1)
        )
        covered.discard((cell.row, cell.column))
    return covered


def _fitted(sheet, cell, formula, further):
    """The formula wrapped so that its result fills the array's range; large ranges go in blocks of rows."""
    first_row, first_column, last_row, last_column = cell.area
    rows, columns = last_row - first_row + 1, last_column - first_column + 1
    if rows * columns <= SPILL_LIMIT:
        return f"{FIT}({formula},{rows},{columns})"
    step = max(1, SPILL_LIMIT // columns)
    for skip in range(step, rows, step):
        further.append(
            (sheet.name, first_row + skip, first_column, f"={FIT}({formula},{rows},{columns},{skip},{step})")
        )
    return f"{FIT}({formula},{rows},{columns},0,{step})"


def _formula_opening(sheet, cell):
    """The attributes of the <f> tag, as saved."""
    tag = sheet.data[cell.formula_start : cell.formula_end]
    return tag[len(b"<f") + len(sheet.prefix) : tag.index(b">")].rstrip(b"/")


def _cell_xml(prefix, cell, attributes, formula):
    place = address(cell.row, cell.column).encode()
    return b'<%sc r="%s"><%sf%s>%s</%sf></%sc>' % (
        prefix,
        place,
        prefix,
        attributes,
        escape(formula).encode(),
        prefix,
        prefix,
    )


def _plain_text(model, sheet):
    """Comments removed and CDATA sections written as plain text, outside formula cells."""
    spans = [(cell.start, cell.end) for cell in sheet.cells]
    starts = [start for start, _ in spans]
    for match in HIDING.finditer(sheet.data, sheet.data.find(b"?>") + 1):
        before = bisect_right(starts, match.start()) - 1
        if before >= 0 and match.start() < spans[before][1]:
            continue
        text = decode_text(model.package, sheet.part, match[0]) if match[0].startswith(b"<![CDATA[") else ""
        yield match.start(), match.end(), escape(text).encode()
