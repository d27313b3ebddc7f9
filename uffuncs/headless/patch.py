"""Write values into a worksheet part as cached values; every other byte stays as it is."""

import math
import re
from functools import lru_cache
from xml.sax.saxutils import escape

from ..errors import ErrorValue
from .package import UnreadableWorkbook
from .prepare import apply_edits
from .sheet import ARRAY, ATTRIBUTE, ATTRIBUTES, DYNAMIC, KEPT, decode_text, rows_and_cells
from .structure import address

SAME = 1e-12  # relative difference below which a number counts as unchanged in the report
CONTROL = re.compile("[\x00-\x08\x0b-\x1f\ud800-\udfff\ufffe\uffff]|_(?=x[0-9A-Fa-f]{4}_)")
#: Error codes newer than the file format: programs save #VALUE! for them, with a mark of their own beside it.
NOT_IN_FILES = ("#SPILL!", "#CALC!")
NOTHING = (b"n", None)


def encode(value):
    """(type, content) of a value: type b"n", b"str", b"b" or b"e"; content None for a blank."""
    if value is None:
        return NOTHING
    kind = type(value)
    if kind is float or kind is int:
        return (b"n", number_text(value)) if math.isfinite(value) else (b"e", b"#NUM!")
    if kind is bool:
        return b"b", b"1" if value else b"0"
    if isinstance(value, ErrorValue):
        return b"e", b"#VALUE!" if value.code in NOT_IN_FILES else value.code.encode()
    return b"str", escape(CONTROL.sub(_escaped, value)).encode()


def number_text(value):
    """Shortest text that reads back as the same number; whole numbers without a decimal point."""
    if value == 0:
        return b"0"
    if abs(value) < 1e15 and value == int(value):
        return b"%d" % int(value)
    return repr(float(value)).encode()


def _escaped(match):
    return f"_x{ord(match[0]):04X}_"


def patch_sheet(package, sheet, evaluation, strings, on_change):
    """The part with new cached values, or None where nothing changes.

    Each value that differs is told to on_change(row, column, before, after).
    """
    edits = []
    values = evaluation.values
    blocks = [
        cell
        for cell in sheet.cells
        if cell.kind in (ARRAY, DYNAMIC) and (sheet.name, cell.row, cell.column) in values
    ]
    for cell in sheet.cells:
        if cell.kind in KEPT:
            continue
        if (sheet.name, cell.row, cell.column) not in values:
            continue
        value = values[sheet.name, cell.row, cell.column]
        content = encode(value)
        formula = None
        if cell.kind == DYNAMIC:
            formula = _resized(
                sheet, cell, evaluation.spills.get((sheet.name, cell.row, cell.column), (1, 1))
            )
        same = cell.type == content[0] and cell.cached == content[1]
        if (
            not same
            and cell.cached is not None
            and cell.type == b"n" == content[0]
            and _number(cell.cached) == value
        ):
            same = True  # another spelling of the same number
        if same and formula is None:
            continue
        if not same:
            before = decode(package, sheet, cell, strings)
            if before is None or not alike(before, value):
                on_change(cell.row, cell.column, before, value)
        edits.append((cell.start, cell.end, _patched(sheet, cell, content, formula)))
    if blocks:
        edits += _patch_blocks(package, sheet, evaluation, blocks, strings, on_change)
    return apply_edits(sheet.data, edits) if edits else None


def _number(raw):
    try:
        return float(raw)
    except ValueError:
        return None


def decode(package, sheet, cell, strings):
    """The cached value of a cell as Python value; None where it has none."""
    if cell.cached is None:
        return None
    kind = cell.type
    if kind == b"n":
        return _number(cell.cached)
    text = decode_text(package, sheet.part, cell.cached)
    if kind == b"s":
        return strings(text)
    if kind == b"b":
        return text.strip() in ("1", "true")
    if kind == b"e":
        try:
            return ErrorValue(text.strip())
        except ValueError:
            return text
    return text


def alike(before, after):
    """Whether two values count as the same in the report of changes."""
    if isinstance(before, bool) or isinstance(after, bool):
        return before is after
    if isinstance(before, float) and isinstance(after, float):
        return before == after or abs(before - after) <= SAME * max(abs(before), abs(after))
    return type(before) is type(after) and before == after


def _patched(sheet, cell, content, formula=None):
    """The <c> element with a new type and value; attributes, formula and extensions as they were."""
    data, prefix = sheet.data, sheet.prefix
    opening = data[cell.start : cell.body]
    if cell.type != content[0] or b" vm" in opening:
        opening = _retyped(opening, content[0])
    if cell.usual:
        return (
            opening
            + data[cell.formula_start : cell.formula_end]
            + _value_xml(prefix, content)
            + b"</%sc>" % prefix
        )
    head = data[cell.body : cell.formula_start] + (formula or data[cell.formula_start : cell.formula_end])
    tail = _without_values(prefix, data[cell.formula_end : cell.end])
    return opening + head + _value_xml(prefix, content) + tail


def _value_xml(prefix, content):
    kind, text = content
    if text is None:
        return b""
    space = b' xml:space="preserve"' if kind == b"str" and text != text.strip() else b""
    return b"<%sv%s>%s</%sv>" % (prefix, space, text, prefix)


def _retyped(opening, kind):
    """The opening tag with another t attribute, and without the mark of a rich value (vm)."""
    pieces, position = [], 0
    for match in ATTRIBUTE.finditer(opening):
        if match[1] in (b"t", b"vm"):
            pieces.append(opening[position : match.start()].rstrip())
            position = match.end()
    end = len(opening) - (2 if opening.endswith(b"/>") else 1)
    pieces.append(opening[position:end].rstrip())
    if kind != b"n":
        pieces.append(b' t="%s"' % kind)
    return b"".join(pieces) + opening[end:]


def _without_values(prefix, tail):
    """What follows the formula, without cached values of any form."""
    return _value_pattern(prefix).sub(b"", tail)


@lru_cache(maxsize=8)
def _value_pattern(prefix):
    return re.compile(
        rb"<%(p)s(?P<n>v|is)(?=[\s/>])%(a)s(?:(?<=/)>|>.*?</%(p)s(?P=n)\s*>)"
        % {b"p": prefix, b"a": ATTRIBUTES},
        re.DOTALL,
    )


def _resized(sheet, cell, size):
    """The <f> element of a dynamic array with another range; None where the range stays."""
    last = (cell.row + size[0] - 1, cell.column + size[1] - 1)
    if cell.area[2:] == last:
        return None
    first = address(cell.row, cell.column)
    reference = (first if size == (1, 1) else f"{first}:{address(*last)}").encode()
    element = sheet.data[cell.formula_start : cell.formula_end]
    end = element.index(b">")
    return (
        re.sub(rb"""(\sref\s*=\s*)(?:"[^"]*"|'[^']*')""", rb'\g<1>"%s"' % reference, element[:end])
        + element[end:]
    )


def _patch_blocks(package, sheet, evaluation, blocks, strings, on_change):
    """Edits for the cells that array formulas cover now, or covered before."""
    rows, cells = rows_and_cells(sheet)
    anchors = {(cell.row, cell.column) for cell in sheet.cells}
    new, old = {}, set()
    for cell in blocks:
        old |= _places(cell.row, cell.column, *cell.area[2:])
        if cell.kind == ARRAY:
            last = cell.area[2:]
        else:
            size = evaluation.spills.get((sheet.name, cell.row, cell.column), (1, 1))
            last = (cell.row + size[0] - 1, cell.column + size[1] - 1)
        for place in _places(cell.row, cell.column, *last):
            new[place] = evaluation.values.get((sheet.name, *place))
    edits, missing = [], {}
    for place in sorted((old | set(new)) - anchors):
        content = encode(new.get(place))
        cell = cells.get(place)
        if cell is None:
            if content[1] is not None:
                missing.setdefault(place[0], []).append((place[1], content))
                on_change(*place, None, new[place])
            continue
        if cell.type == content[0] and cell.cached == content[1]:
            continue
        before = decode(package, sheet, cell, strings)
        if not (content[0] == b"n" == cell.type and before == new.get(place)):
            if not alike(before, new.get(place)):
                on_change(*place, before, new.get(place))
            edits.append((cell.start, cell.end, _patched_plain(sheet, cell, content)))
    return edits + _inserted(package, sheet, rows, cells, missing)


def _places(row, column, last_row, last_column):
    return {(r, c) for r in range(row, last_row + 1) for c in range(column, last_column + 1)}


def _patched_plain(sheet, cell, content):
    prefix, data = sheet.prefix, sheet.data
    opening = _retyped(data[cell.start : cell.body], content[0])
    if opening.endswith(b"/>"):
        return (
            opening
            if content[1] is None
            else opening[:-2].rstrip() + b">" + _value_xml(prefix, content) + b"</%sc>" % prefix
        )
    return opening + _value_xml(prefix, content) + _without_values(prefix, data[cell.body : cell.end])


def _inserted(package, sheet, rows, cells, missing):
    """New cells for array values where the part has no cell yet; rows are opened or added as needed."""
    prefix = sheet.prefix
    by_number = {row.number: row for row in rows}
    in_row = {}
    for cell in cells.values():
        in_row.setdefault(cell.row, []).append((cell.column, cell.start))
    edits = []
    for number, entries in missing.items():
        entries.sort()
        row = by_number.get(number)
        new = {
            column: b'<%sc r="%s"%s>%s</%sc>'
            % (
                prefix,
                address(number, column).encode(),
                b"" if content[0] == b"n" else b' t="%s"' % content[0],
                _value_xml(prefix, content),
                prefix,
            )
            for column, content in entries
        }
        if row is None:
            after = min((known for known in by_number if known > number), default=None)
            place = by_number[after].start if after else sheet.content[1]
            edits.append(
                (place, place, b'<%srow r="%d">%s</%srow>' % (prefix, number, b"".join(new.values()), prefix))
            )
            continue
        opening = _wider(sheet.data[row.start : row.open_end], min(new), max(new))
        if row.content_end is None:
            edits.append(
                (
                    row.start,
                    row.open_end,
                    opening[:-2].rstrip() + b">" + b"".join(new.values()) + b"</%srow>" % prefix,
                )
            )
            continue
        if opening != sheet.data[row.start : row.open_end]:
            edits.append((row.start, row.open_end, opening))
        present = sorted(in_row.get(number, []))
        for column, xml in new.items():
            place = next((start for other, start in present if other > column), row.content_end)
            edits.append((place, place, xml))
    if edits and sheet.content == (0, 0):
        raise UnreadableWorkbook(f"{package.label}: sheet {sheet.name!r} has no cells to write to")
    return edits


def _wider(opening, first, last):
    """The row's opening tag with its hint of used columns widened."""

    def widened(match):
        low, high = int(match[2]), int(match[3])
        return b"%s%d:%d%s" % (match[1], min(low, first), max(high, last), match[4])

    return re.sub(rb"""(\sspans\s*=\s*["'])(\d+):(\d+)(["'])""", widened, opening)
