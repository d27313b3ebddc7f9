"""The osmotic-pressure flux: one cell, and 100,000 rows against a loop of scipy's brentq over them."""

from __future__ import annotations

import math
from functools import lru_cache
from time import perf_counter

import numpy as np

import uffuncs
from tests.benchmarks.measure import Row, microseconds, seconds
from uffuncs.cell import call

ROWS = 100_000
#: Rows that brentq is timed on; its time is scaled to all.
SAMPLE = 2_000
#: Osmotic coefficients of a protein, bar/(g/L)^n.
PROTEIN = (0.0044583, -1.722525e-06, 8.004675e-08)


@lru_cache(maxsize=1)
def columns() -> tuple[list, list]:
    """Pressure, permeability, transfer, concentration, coefficients, rejection: in cell units and in SI."""
    rng = np.random.default_rng(20)
    cells = [rng.uniform(low, high, ROWS) for low, high in ((0.2, 6), (20, 400), (5, 60), (1, 150))]
    cells += [*PROTEIN, rng.uniform(0.9, 1.0, ROWS)]
    scales = (1e5, 1e-8 / 3600, 1e-3 / 3600, 1.0, 1e5, 1e5, 1e5, 1.0)
    return cells, [cell * scale for cell, scale in zip(cells, scales)]


def scalar_bare() -> float:
    """µs of one call with plain floats."""
    row = [float(np.ravel(a)[0]) for a in columns()[1]]
    return microseconds(lambda: uffuncs.flux_osmotic(*row))


def scalar_cell(name: str = "UF_FLUX_OSMOTIC", cells: tuple = (2.0, 100.0, 20.0, 40.0, *PROTEIN)) -> float:
    """µs of one call from a cell."""
    return microseconds(lambda: call(name, list(cells)))


def array_seconds() -> float:
    """Seconds for all rows."""
    arguments = columns()[1]
    return seconds(lambda: uffuncs.flux_osmotic(*arguments), 5)


def brentq_seconds() -> tuple[float, float]:
    """Seconds of a loop of brentq for all rows, scaled from a sample, and the largest difference in flux."""
    from scipy.optimize import brentq

    arguments = columns()[1]
    sample = list(zip(*(np.broadcast_to(a, ROWS)[:SAMPLE].tolist() for a in arguments)))

    def flux(pressure, permeability, transfer, bulk, b1, b2, b3, rejection):
        passed, darcy = 1.0 - rejection, permeability * pressure

        def excess(j):
            c = bulk / (rejection * math.exp(-min(j / transfer, 200.0)) + passed)
            p = passed * c
            difference = c * (b1 + c * (b2 + c * b3)) - p * (b1 + p * (b2 + p * b3))
            return j - permeability * (pressure - difference)

        return 0.0 if excess(0.0) >= 0.0 else brentq(excess, 0.0, darcy, xtol=1e-16 * darcy, rtol=1e-12)

    best = math.inf
    for _ in range(3):
        start = perf_counter()
        found = [flux(*row) for row in sample]
        best = min(best, perf_counter() - start)
    ours = uffuncs.flux_osmotic(*(np.broadcast_to(a, ROWS)[:SAMPLE] for a in arguments))
    darcy = arguments[0][:SAMPLE] * arguments[1][:SAMPLE]
    return best * ROWS / SAMPLE, float(np.max(np.abs(ours - found) / np.maximum(found, 1e-4 * darcy)))


def rows():
    table = [[50.0], [100.0], [200.0], [400.0]], [[0.2286], [0.5087], [1.4631], [6.6307]]
    power = (2.0, 100.0, 20.0, 40.0, 2e-5, 2.1)
    array = array_seconds()
    loop, difference = brentq_seconds()
    yield Row("one call with plain floats", scalar_bare(), "µs", 40)
    yield Row("one cell, polynomial", scalar_cell(), "µs", 40)
    yield Row("one cell, power law", scalar_cell("UF_FLUX_OSMOTIC_POWER", power), "µs", 40)
    yield Row(
        "one cell, table of four points", scalar_cell("UF_FLUX_OSMOTIC_TABLE", (2, 100, 20, 40, *table)), "µs"
    )
    yield Row(f"{ROWS:,} rows", 1e3 * array, "ms")
    yield Row(f"the same by a loop of brentq, scaled from {SAMPLE:,} rows", 1e3 * loop, "ms")
    yield Row("loop of brentq over array", loop / array, "times", 30, least=True)
    yield Row("largest difference between the two, relative to max(J, 1e-4 L_p Δp)", difference, "-", 1e-11)
