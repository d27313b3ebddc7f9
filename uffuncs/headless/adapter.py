"""Between the engine's values and the cell contract: what a callback gets and gives back."""

import math

from ..cell import call
from ..errors import ErrorValue

LONGEST_TEXT = 32_767  # characters a cell can hold

KINDS = {
    "#NULL!": "Null",
    "#DIV/0!": "Div",
    "#VALUE!": "Value",
    "#REF!": "Ref",
    "#NAME?": "Name",
    "#NUM!": "Num",
    "#N/A": "Na",
    "#SPILL!": "Spill",
    "#CALC!": "Calc",
}
CODES = {kind: code for code, kind in KINDS.items()} | {"Circ": "#NUM!", "NImpl": "#NAME?", "Error": "#NAME?"}
OUTGOING = {code: {"type": "Error", "kind": kind} for code, kind in KINDS.items()}


class Recorder:
    """Remembers the failing calls while it is active; inactive it costs nothing."""

    def __init__(self):
        self.active = False
        self.cancelled = False
        self.gave_block = False  # whether any call gave more than one value
        self.failures = []  # (function, cells, result) in the order of evaluation
        self.failures_of = {}  # number of a cell -> its failures

    def begin(self, number):
        """From here on failures belong to the cell of this number."""
        self.failures = self.failures_of.setdefault(int(number), [])
        return 0.0


def adapted(name, recorder):
    """The callback of one uffuncs function."""

    def evaluate(*cells):
        for value in cells:
            kind = type(value)
            if kind is dict or kind is list:
                cells = [incoming(value) for value in cells]
                break
        if recorder.cancelled:
            return None
        result = call(name, cells)
        return result if type(result) is float else outgoing(name, cells, result, recorder)

    return evaluate


def incoming(value):
    """A value from the engine as a cell value; errors become ErrorValue also inside ranges."""
    kind = type(value)
    if kind is dict:
        return ErrorValue(CODES.get(value.get("kind"), "#VALUE!"))
    if kind is list:
        for row in value:
            if type(row) is list:
                for item in row:
                    if type(item) is dict:
                        return [[incoming(item) for item in row] for row in value]
    return value


def outgoing(name, cells, result, recorder):
    """A result of the cell contract as the engine takes it."""
    kind = type(result)
    if kind is str:
        if len(result) <= LONGEST_TEXT:
            return result
        result = too_long(name, result)
    elif kind is list:
        recorder.gave_block = True
        failed = False
        rows = []
        for row in result:
            out = []
            for item in row:
                if type(item) is str and len(item) > LONGEST_TEXT:
                    item = too_long(name, item)
                if isinstance(item, ErrorValue):
                    failed = True
                    item = OUTGOING[item.code]
                out.append(item)
            rows.append(out)
        if failed and recorder.active:
            recorder.failures.append((name, cells, result))
        return rows
    if isinstance(result, ErrorValue):
        if recorder.active:
            recorder.failures.append((name, cells, result))
        return OUTGOING[result.code]
    return result


def too_long(name, text):
    return ErrorValue(
        "#VALUE!", f"{name}: the text has {len(text):,} characters; a cell holds {LONGEST_TEXT:,}"
    )


def from_engine(value):
    """A cell's value as the engine gives it: float, text, boolean, ErrorValue, or None for a blank."""
    kind = type(value)
    if kind is float:
        return value if math.isfinite(value) else ErrorValue("#NUM!", "the result is too large for a number")
    if kind is str:
        return value if len(value) <= LONGEST_TEXT else too_long("the formula", value)
    if kind is bool or value is None:
        return value
    if kind is dict:
        return ErrorValue(CODES.get(value.get("kind"), "#VALUE!"))
    if kind is int:
        return float(value)
    if kind is list:
        return from_engine(value[0][0]) if value and value[0] else None
    return ErrorValue("#VALUE!", f"the engine gave a {kind.__name__}")
