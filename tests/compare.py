"""Comparing cell values."""

from __future__ import annotations

import math

from uffuncs.errors import ErrorValue


def same(a, b, rel=1e-12) -> bool:
    """Equal cell values; floats within rounding."""
    if isinstance(a, list) and isinstance(b, list):
        return len(a) == len(b) and all(same(x, y, rel) for x, y in zip(a, b))
    if isinstance(a, float) and isinstance(b, float):
        return math.isclose(a, b, rel_tol=rel, abs_tol=1e-300)
    return isinstance(a, (str, ErrorValue)) and a == b
