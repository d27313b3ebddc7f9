"""Cell values at the border of Calc: error values are NaNs that carry a code; ranges are trimmed."""

import struct

CODES = {
    "#NULL!": 521,
    "#DIV/0!": 532,
    "#VALUE!": 519,
    "#REF!": 524,
    "#NAME?": 525,
    "#NUM!": 503,
    "#N/A": 32767,
}
NAMES = {code: name for name, code in CODES.items()}

#: Ranges at least this long are whole columns, or the rest of one; trailing blanks are no cells of theirs.
LONG = 500_000
#: The same for whole rows.
WIDE = 8_192


def error_number(name):
    """The NaN that Calc shows as an error value; newer error values count as #VALUE!."""
    return struct.unpack("<d", struct.pack("<Q", 0x7FF8000000000000 | CODES.get(name, 519)))[0]


ERROR_NUMBERS = {name: error_number(name) for name in CODES}


def error_name(number):
    """The error value that a NaN stands for."""
    code = struct.unpack("<Q", struct.pack("<d", number))[0] & 0xFFFFFFFF
    return NAMES.get(code, "#VALUE!" if code else "#NUM!")


def error_block(name):
    """An error value as the result of a whole call."""
    return ((ERROR_NUMBERS[name],),)


def trimmed(cells):
    """Whole columns and rows without the blanks at their ends; ranges of one length keep one length."""
    long = [c for c in cells if type(c) is tuple and (len(c) >= LONG or (c and len(c[0]) >= WIDE))]
    if not long:
        return cells
    rows, columns = {}, {}
    for c in long:
        height, width = len(c), len(c[0])
        if height >= LONG:
            rows[height] = max(rows.get(height, 1), _last_row(c))
        if width >= WIDE:
            columns[width] = max(columns.get(width, 1), _last_column(c))
    return tuple(_cut(c, rows, columns) if type(c) is tuple and c else c for c in cells)


def _cut(block, rows, columns):
    height, width = rows.get(len(block)), columns.get(len(block[0]))
    if height is not None:
        block = block[:height]
    return tuple(row[:width] for row in block) if width is not None else block


def _last_row(block):
    for n in range(len(block), 0, -1):
        for value in block[n - 1]:
            if value != "":
                return n
    return 1


def _last_column(block):
    last = 1
    for row in block:
        for n in range(len(row), last, -1):
            if row[n - 1] != "":
                last = n
                break
    return last
