"""Messages between the add-in and its worker: a JSON head, and the numbers of ranges as raw bytes.

A value is a float, a text, None, or a block as a tuple of rows; error values are NaNs that carry a code.
"""

import json
import struct
from array import array
from itertools import chain

from .values import ERROR_NUMBERS, error_name

HEADER = struct.Struct("<II")
#: Most bytes of one message: six whole columns of numbers still fit.
MOST_BYTES = 1 << 26

FLOATS = {float}


class TooLong(ValueError):
    """A message is longer than MOST_BYTES."""


def packed(values, **more):
    """A message as bytes.

    Raises
    ------
    TooLong
        More than MOST_BYTES.
    """
    numbers = []
    head = {"values": [_encoded(v, numbers) for v in values]}
    if more:
        head.update(more)
    text = json.dumps(head, separators=(",", ":")).encode("utf-8")
    tail = b"".join(numbers)
    if len(text) + len(tail) > MOST_BYTES:
        raise TooLong("the ranges are too long for one call")
    return HEADER.pack(len(text), len(tail)) + text + tail


def unpacked(receive, block):
    """(values, further entries of the head) of the next message.

    `receive(n)` gives exactly n bytes or raises EOFError; `block(numbers, rows, columns)` makes a block of
    raw numbers.

    Raises
    ------
    TooLong
        The message announces more than MOST_BYTES.
    """
    head_length, tail_length = HEADER.unpack(receive(HEADER.size))
    if head_length + tail_length > MOST_BYTES:
        raise TooLong("a message announces %d bytes" % (head_length + tail_length))
    head = json.loads(receive(head_length))
    tail = memoryview(receive(tail_length)) if tail_length else memoryview(b"")
    values, position = [], 0
    for value in head.pop("values"):
        if type(value) is dict:
            if "shape" in value:
                rows, columns = value["shape"]
                end = position + 8 * rows * columns
                value, position = block(tail[position:end], rows, columns), end
            else:
                value = _decoded(value)
        values.append(value)
    return values, head


def tuple_block(numbers, rows, columns):
    """A block of raw numbers as a tuple of rows."""
    found = array("d")
    found.frombytes(numbers)
    return tuple(zip(*[iter(found)] * columns))


def is_numeric(block):
    """Whether a block holds floats only, and every row is as long as the first."""
    width = len(block[0])
    return FLOATS.issuperset(map(type, chain.from_iterable(block))) and all(
        len(row) == width for row in block
    )


def _encoded(value, numbers):
    kind = type(value)
    if kind is tuple and value and type(value[0]) is tuple:
        if value[0] and is_numeric(value):
            numbers.append(array("d", chain.from_iterable(value)).tobytes())
            return {"shape": [len(value), len(value[0])]}
        return {"rows": [[_error_or_value(v) for v in row] for row in value]}
    return _error_or_value(value)


def _error_or_value(value):
    return {"error": error_name(value)} if value != value else value


def _decoded(value):
    if "rows" in value:
        return tuple(tuple(_decoded(v) if type(v) is dict else v for v in row) for row in value["rows"])
    return ERROR_NUMBERS.get(value["error"], ERROR_NUMBERS["#VALUE!"])
