"""Straight line by least squares, with what its user must know to trust it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import NotAvailable


@dataclass(frozen=True)
class Line:
    """y = intercept + slope·x, the standard errors of both, and r²."""

    slope: float
    intercept: float
    slope_error: float
    intercept_error: float
    r_squared: float


def fit_line(x: np.ndarray, y: np.ndarray, x_name: str) -> Line:
    """Ordinary least squares of y on x; r² is 0 where y does not vary at all.

    Raises
    ------
    NotAvailable
        Fewer than three points, or all at one x: the line or its standard errors cannot be told.
    """
    n = len(x)
    if n < 3:
        raise NotAvailable(f"{n} points; a straight line with standard errors needs three or more")
    centre, level = x.mean(), y.mean()
    dx, dy = x - centre, y - level
    width = dx @ dx
    if np.ptp(x) <= 1e-12 * np.abs(x).max():
        raise NotAvailable(f"all points have the same {x_name}; a line needs two different ones")
    slope = dx @ dy / width
    rest = dy - slope * dx
    variance = rest @ rest / (n - 2)
    total = dy @ dy
    return Line(
        slope,
        level - slope * centre,
        (variance / width) ** 0.5,
        (variance * (1.0 / n + centre**2 / width)) ** 0.5,
        1.0 - rest @ rest / total if total > 0 else 0.0,
    )
