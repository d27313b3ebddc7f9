"""Excel: Python's share of a call, through xlwings' own server code; COM and VBA come on top of it."""

from __future__ import annotations

import math
import sys
from importlib.util import find_spec

from tests.benchmarks.measure import Row, microseconds, seconds
from uffuncs.cell import call

MODULE = "uffuncs.excel.marked_functions"


def rows():
    if find_spec("xlwings") is None:
        yield Row("not measured: xlwings is not installed", math.nan, "")
        return
    server = _server()
    numbers = (2.0, 1.0, 5e12, 1e12)
    bare = microseconds(lambda: call("UF_FLUX_DARCY", list(numbers)))
    yield Row(
        "one cell, four numbers",
        microseconds(lambda: server.CallUDF(MODULE, "UF_FLUX_DARCY", numbers)),
        "µs",
    )
    yield Row("of that, the cell contract", bare, "µs")
    yield Row(
        "one cell that is an error",
        microseconds(lambda: server.CallUDF(MODULE, "UF_FLUX_DARCY", (-2.0, 1.0, 5e12, 1e12))),
        "µs",
    )

    columns = [
        tuple((start + step * r,) for r in range(5000))
        for start, step in ((0.5, 1e-3), (0.8, 1e-4), (1e12, 1e8), (1e11, 1e7))
    ]
    four = seconds(lambda: server.CallUDF(MODULE, "UF_FLUX_DARCY", columns))
    yield Row("one array formula, four columns of 5,000 rows", 1e3 * four, "ms")
    yield Row("the same, for each row", 1e6 * four / 5000, "µs")
    mixed = [tuple(((None,) if r % 50 == 0 else row) for r, row in enumerate(column)) for column in columns]
    yield Row(
        "the same with a blank in every 50th row",
        1e3 * seconds(lambda: server.CallUDF(MODULE, "UF_FLUX_DARCY", mixed)),
        "ms",
    )


def _server():
    if sys.platform != "win32":
        from tests.excel.pywin32 import xlwings_of_windows

        return xlwings_of_windows().server
    from uffuncs.excel.server import without_licensed_part

    without_licensed_part()
    from xlwings.com_server import XLPython

    return XLPython()
