"""What the cell contract costs over the bare function: one cell, unit texts, a million rows."""

from __future__ import annotations

import numpy as np

import uffuncs
from tests.benchmarks.measure import Row, microseconds, seconds
from uffuncs.cell import call, compile_function

MILLION = 1_000_000


def rows():
    flux_darcy = uffuncs.flux_darcy
    bare = microseconds(lambda: flux_darcy(2e5, 1e-3, 5e12, 1e12))
    numbers = microseconds(lambda: call("UF_FLUX_DARCY", [2.0, 1.0, 5e12, 1e12]))
    texts = microseconds(lambda: call("UF_FLUX_DARCY", ["29 psi", "1 cP", "5e12 1/m", "1e12 1/m"]))
    fresh = iter(range(10**9))
    new_texts = microseconds(lambda: call("UF_FLUX_DARCY", [f"29.{next(fresh)} psi", "1 cP", "5e12 1/m", "1e12 1/m"]))
    yield Row("bare function, four numbers", bare, "µs")
    yield Row("checked call with four numbers, over the bare function", numbers - bare, "µs", 5)
    yield Row("the same with four unit texts met before", texts - bare, "µs", 10)
    yield Row("the same, one of the texts new in every call", new_texts - bare, "µs", 10)

    compiled = compile_function("UF_FLUX_DARCY")
    pressure, viscosity, resistance = (np.linspace(a, b, MILLION) for a, b in ((0.1, 5), (0.8, 1.2), (1e12, 5e12)))
    si_pressure, si_viscosity = pressure * 1e5, viscosity * 1e-3
    for label, bare_arguments, cells in (
        ("three columns", (si_pressure, si_viscosity, resistance), [pressure, viscosity, resistance]),
        ("one column", (si_pressure, 1e-3, 5e12), [pressure, 1.0, 5e12]),
    ):
        cells = cells + [None] * 4
        body = seconds(lambda a=bare_arguments: flux_darcy(*a), 15)
        checked = seconds(lambda c=cells: compiled.arrays(c), 15)
        yield Row(f"1,000,000 rows, {label}: checked over bare NumPy body", checked / body, "times", 2)
    block = [[p] for p in pressure.tolist()]
    yield Row("1,000,000 rows as a spreadsheet's list of rows, in and out", seconds(lambda: call("UF_FLUX_DARCY", [block, 1, 5e12]), 3), "s")
    yield Row("one cell of UF_SIEVING_PORE_SPREAD", microseconds(lambda: call("UF_SIEVING_PORE_SPREAD", [3, 5, 1.5])), "µs")
