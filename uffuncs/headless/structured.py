"""Structured references of tables, written out as A1 references."""

import re

from .structure import column_letters

SPECIAL = {"#all", "#data", "#headers", "#totals", "#this row"}
UNESCAPE = re.compile(r"'(.)", re.DOTALL)
ITEM = re.compile(r"""\s*(?:\[(?P<bracketed>(?:'.|[^\[\]'])*)\]|(?P<mark>[,:@]))\s*""", re.DOTALL)
REFERENCE_ERROR = "#REF!"


def table_reference(table, bracket, sheet, row):
    """The A1 reference that `Table[...]` means in a cell on `row` of `sheet`; #REF! where it means none."""
    parsed = _parse(bracket)
    if parsed is None:
        return REFERENCE_ERROR
    items, columns = parsed
    rows = _rows(table, items, sheet, row)
    span = _columns(table, columns)
    if rows is None or span is None:
        return REFERENCE_ERROR
    # The row of [#This Row] stays relative, so that a shared formula moves with its cells.
    mark = "" if "#this row" in items else "$"
    prefix = "" if table.sheet == sheet else "'" + table.sheet.replace("'", "''") + "'!"
    first = f"${column_letters(span[0])}{mark}{rows[0]}"
    last = f"${column_letters(span[1])}{mark}{rows[1]}"
    return prefix + (first if first == last else f"{first}:{last}")


def _parse(bracket):
    """(special items, [first column, last column]) of the text in brackets; None where it is malformed."""
    inner = bracket[1:-1].strip() if bracket else ""
    if bracket and not bracket.endswith("]"):
        return None
    if not inner:
        return set(), []
    if inner.startswith("@"):
        rest = inner[1:].strip()
        if not rest:
            return {"#this row"}, []
        parsed = _parse(rest) if rest.startswith("[") and _whole(rest) else _parse(f"[{rest}]")
        return None if parsed is None else ({"#this row"} | parsed[0], parsed[1])
    if not inner.startswith("["):
        if inner.casefold() in SPECIAL:
            return {inner.casefold()}, []
        return set(), [_plain(inner)]
    items, columns, position = set(), [], 0
    while position < len(inner):
        match = ITEM.match(inner, position)
        if match is None or match.end() == position:
            return None
        content = match["bracketed"]
        if content is not None:
            if content.strip().casefold() in SPECIAL:
                items.add(content.strip().casefold())
            else:
                columns.append(_plain(content))
        elif match["mark"] == "@":
            items.add("#this row")
        position = match.end()
    return (items, columns) if len(columns) <= 2 else None


def _whole(text):
    """Whether one pair of brackets spans the text."""
    return ITEM.fullmatch(text) is not None


def _plain(name):
    return UNESCAPE.sub(r"\1", name.strip())


def _rows(table, items, sheet, row):
    first_data = table.first_row + table.header_rows
    last_data = table.last_row - table.totals_rows
    if "#this row" in items:
        return (row, row) if sheet == table.sheet and first_data <= row <= last_data else None
    if "#all" in items:
        return table.first_row, table.last_row
    spans = []
    if "#headers" in items and table.header_rows:
        spans.append((table.first_row, first_data - 1))
    if "#data" in items or not items:
        spans.append((first_data, last_data))
    if "#totals" in items and table.totals_rows:
        spans.append((last_data + 1, table.last_row))
    if not spans:
        return None
    return min(span[0] for span in spans), max(span[1] for span in spans)


def _columns(table, columns):
    if not columns:
        return table.first_column, table.last_column
    folded = [name.casefold() for name in table.columns]
    try:
        places = [folded.index(name.casefold()) for name in columns]
    except ValueError:
        return None
    return table.first_column + min(places), table.first_column + max(places)
