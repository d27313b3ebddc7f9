"""Functions that give a block: a cascade of stages, a profile along a module."""

from __future__ import annotations

from tests.benchmarks.measure import Row, microseconds
from uffuncs.cell import call

CASCADE = [20, 6, 90, 5, 25, 250]
PROFILE = [5, 20, 3, 0, 0.8, 0.8, 0.9, 0.4, 0.9, 10, 40, 1e-10, 1, 1000, 0.0045, -1.7e-6, 8e-8, 0.99, 100]


def rows():
    for label, cells in (("least area", CASCADE), ("least area, rejection 0.98", [*CASCADE, 0.98]),
                         ("least area, rejection 0.98, maximum flux", [*CASCADE, 0.98, 60]),
                         ("equal area", [*CASCADE, 0.98, None, "equal area"])):
        _sound(call("UF_STAGES", cells))
        yield Row(f"UF_STAGES, 5 stages, {label}", microseconds(lambda c=cells: call("UF_STAGES", c)) / 1e3, "ms", 20)
    _sound(call("UF_MODULE_PROFILE_SPACER", PROFILE))
    yield Row("UF_MODULE_PROFILE_SPACER, 100 points", microseconds(lambda: call("UF_MODULE_PROFILE_SPACER", PROFILE)) / 1e3, "ms", 20)


def _sound(block):
    assert all(isinstance(v, float) for row in block for v in row), block
