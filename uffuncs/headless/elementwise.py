"""Native functions of single values over ranges: the engine evaluates few of them element by element.

LEN over a range would silently give the length of the first cell, ABS an error. Such calls are renamed in
the engine's copy to a callback that has the engine evaluate the native function once for each element.
"""

import re

from .builtin import NOT_AVAILABLE
from .formula import tokens
from .intersection import RANGE, SCALAR_FUNCTIONS
from .structure import column_letters, column_number

EACH = "UF__EACH_"
ROWS, COLUMNS = "UF__ROWS", "UF__COLUMNS"
MOST_NUMBERS = 100_000  # rows or columns that ROW and COLUMN number

#: Evaluated element by element by the engine itself.
LIFTED_BY_ENGINE = frozenset({"IF", "IFERROR", "IFNA", "SIN", "COS", "TAN", "ATAN2"})
#: Functions whose result is a block whatever their arguments are.
BLOCKS = frozenset("""
    TRANSPOSE MMULT MINVERSE FILTER SORT SORTBY UNIQUE SEQUENCE RANDARRAY TREND GROWTH LINEST LOGEST FREQUENCY
    MUNIT VSTACK HSTACK TAKE DROP CHOOSECOLS CHOOSEROWS TOCOL TOROW WRAPROWS WRAPCOLS EXPAND TEXTSPLIT
    """.split())
AGGREGATES = re.compile(
    r"\b(?:SUM|SUMIFS?|AVERAGE|AVERAGEIFS?|MIN|MAX|COUNT|COUNTA|COUNTIFS?|COUNTBLANK|PRODUCT|STDEV|MEDIAN"
    r"|SUBTOTAL|ROWS|COLUMNS|INDEX|MATCH|VLOOKUP|HLOOKUP|SLOPE|INTERCEPT|RSQ|CORREL|LARGE|SMALL|AND|OR"
    r"|UF_(?=\w+\([^()\"]*\)\Z)\w+)\([^()\"]*\)",
    re.IGNORECASE,
)
PREFIX = re.compile(r"^(?:_xlfn\.|_xlws\.)+", re.IGNORECASE)
NUMBERED = re.compile(
    r"(ROW|COLUMN)\(\s*(?:(?:'(?:[^']|'')*'|[^\W\d][\w.]*)!)?"
    r"(\$?[A-Za-z]*\$?[0-9]*):(\$?[A-Za-z]*\$?[0-9]*)\s*\)",
    re.IGNORECASE,
)


def may_lift(formula):
    """A quick test: most formulas hold no range, or only inside a plain SUM and its like."""
    if ":" not in formula and "{" not in formula and "#" not in formula:
        return False
    rest = AGGREGATES.sub("0", formula)
    return ":" in rest or "{" in rest or "#" in rest


def lifted(formula, area_names=frozenset(), is_array=False, moves=False):
    """(formula with calls renamed, names of the native functions to lift).

    `is_array`: the formula was entered as an array formula; `moves`: it is shared and its references move.
    """
    out, used = [], set()
    frames = [_Frame("")]
    parts = list(tokens(formula))
    position, skip_to, previous = 0, 0, ("", "")
    for kind, text in parts:
        start, position = position, position + len(text)
        if start < skip_to:
            continue
        frame = frames[-1]
        if text == "(" or text == "{":
            called = previous[1] if text == "(" and previous[0] == "name" else ""
            frames.append(_Frame(PREFIX.sub("", called).upper(), len(out) - 1, text == "{"))
        elif text in (")", "}") and len(frames) > 1:
            closed = frames.pop()
            if closed.many and closed.name in SCALAR_FUNCTIONS and closed.name not in LIFTED_BY_ENGINE:
                out[closed.place] = EACH + closed.name.replace(".", "_")
                used.add(closed.name)
            frames[-1].many |= closed.gives_block()
        elif (
            kind == "name"
            and text.upper() in ("ROW", "COLUMN")
            and (is_array or len(frames) > 1)
            and not moves
        ):
            numbers = NUMBERED.match(formula, start)
            call = numbers and _numbered(*numbers.groups())
            if call:
                out.append(call)
                frame.many = True
                skip_to, previous = numbers.end(), ("other", ")")
                continue
        elif kind in ("name", "quoted", "number") or text == "$":
            match = RANGE.match(formula, start) if previous[1] not in ("!", ":", "$") else None
            if match:
                frame.many |= previous[1] != "@"
                out.append(match[0])
                skip_to, previous = match.end(), ("other", match[0])
                continue
            frame.many |= kind == "name" and text.casefold() in area_names and previous[1] != "@"
        elif text == "#" and previous[0] in ("name", "number"):
            frame.many = True
        out.append(text)
        if kind != "space":
            previous = (kind, text)
    return "".join(out), used


class _Frame:
    """One open parenthesis: the function called, where its name stands, whether an argument has many."""

    __slots__ = ("name", "place", "many")

    def __init__(self, name, place=0, many=False):
        self.name, self.place, self.many = name, place, many

    def gives_block(self):
        if self.name in BLOCKS:
            return True
        return self.many and (not self.name or self.name in SCALAR_FUNCTIONS or self.name.startswith("UF_"))


def _numbered(function, first, last):
    """ROW(A1:A3) as a call that gives the numbers 1, 2, 3; None where the range is no plain one."""
    corners = []
    for corner in (first, last):
        letters, digits = re.fullmatch(r"\$?([A-Za-z]*)\$?([0-9]*)", corner).groups()
        corners.append(int(digits or 0) if function.upper() == "ROW" else column_number(letters))
    low, high = sorted(corners)
    if low < 1 or high - low >= MOST_NUMBERS:
        return None
    return f"{ROWS if function.upper() == 'ROW' else COLUMNS}({low},{high})"


def row_numbers(first, last):
    """The numbers of the rows of a range, as a column."""
    return [[float(number)] for number in range(int(first), int(last) + 1)]


def column_numbers(first, last):
    """The numbers of the columns of a range, as a row."""
    return [[float(number) for number in range(int(first), int(last) + 1)]]


def each(function):
    """A callback that evaluates a native function once for each element of its arguments."""

    def evaluate(*arguments):
        import formualizer

        blocks = [value if isinstance(value, list) else [[value]] for value in arguments]
        height = max((len(block) for block in blocks), default=1)
        width = max((len(block[0]) if block else 1 for block in blocks), default=1)
        inside, values = [], []
        for i in range(height):
            for j in range(width):
                element = [_element(block, i, j) for block in blocks]
                inside.append(NOT_AVAILABLE not in element)
                values.append(element)
        count = len(arguments)
        book = formualizer.Workbook()  # an engine of its own: this one is busy evaluating
        book.set_temporal_egress("serial")
        book.add_sheet("each")
        book.set_values_batch("each", 1, 1, values)
        letters = [column_letters(n) for n in range(1, count + 1)]
        book.set_formulas_batch(
            "each",
            1,
            count + 1,
            [
                [f"={function}({','.join(f'{letter}{row}' for letter in letters)})"]
                for row in range(1, len(values) + 1)
            ],
        )
        book.evaluate_all()
        results = [
            book.get_value("each", row, count + 1) if known else NOT_AVAILABLE
            for row, known in enumerate(inside, 1)
        ]
        rows = [results[i * width : (i + 1) * width] for i in range(height)]
        return rows[0][0] if height == width == 1 else rows

    return evaluate


def _element(block, i, j):
    """An element of a block; single rows and columns repeat, outside it is #N/A."""
    i = 0 if len(block) == 1 else i
    j = 0 if len(block[0]) == 1 else j
    return block[i][j] if i < len(block) and j < len(block[i]) else NOT_AVAILABLE
