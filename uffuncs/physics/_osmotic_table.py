"""Osmotic pressure from measured points: monotone cubic interpolation through them and the origin.

Piecewise cubics whose slope at a point is the weighted harmonic mean of its neighbours' (Fritsch & Butland):
no overshoot between points, hence no osmotic pressure that falls where the points do not.
"""

from __future__ import annotations

from bisect import bisect_right
from functools import lru_cache

import numpy as np

from ..errors import NoResult, NotAvailable


class OsmoticTable:
    """π(c) and its derivatives, for floats and for arrays, from the origin to the highest concentration."""

    def __init__(self, concentration: np.ndarray, pressure: np.ndarray):
        self.knots, self.pressures = concentration, pressure
        self.highest = float(concentration[-1])
        slopes = _knot_slopes(concentration, pressure)
        width = np.diff(concentration)
        mean = np.diff(pressure) / width
        second = (3.0 * mean - 2.0 * slopes[:-1] - slopes[1:]) / width
        third = (slopes[:-1] + slopes[1:] - 2.0 * mean) / width**2
        #: π = p + t (a + t (b + t c)) from the knot on the left, t = c − knot
        self.pieces = np.column_stack([pressure[:-1], slopes[:-1], second, third])
        self._knots, self._pressures = concentration.tolist(), pressure.tolist()
        self._pieces = self.pieces.tolist()
        #: whether c π′ nowhere falls: then π(C_w) − π(C_p) rises with C_w for every rejection
        self.steepens = self._steepens()

    @staticmethod
    def of(concentration: np.ndarray, pressure: np.ndarray) -> OsmoticTable:
        """The table of these points in any order, the origin added; the last ones are kept for the next cell.

        Raises
        ------
        NotAvailable
            No point, or two at one concentration.
        NoResult
            An osmotic pressure at no concentration, or one that falls as the concentration rises.
        """
        return _prepared(np.asarray(concentration, float).tobytes(), np.asarray(pressure, float).tobytes())

    def _steepens(self) -> bool:
        # d(c π′)/dc = π′ + c π″ is a parabola in t on each piece: its ends and its vertex decide.
        left, (_, a, b, c) = self.knots[:-1], self.pieces.T
        width = np.diff(self.knots)
        level, rise, bend = a + 2.0 * b * left, 4.0 * b + 6.0 * c * left, 9.0 * c
        vertex = np.clip(-rise / np.where(bend == 0.0, 1.0, 2.0 * bend), 0.0, width)
        lowest = min(float((level + t * (rise + t * bend)).min()) for t in (0.0 * width, vertex, width))
        return lowest >= -1e-12 * float(np.abs(level).max())

    def terms_one(self, c: float) -> tuple[float, float, float]:
        """π, c π′ and c (c π′)′ at one concentration."""
        i = min(bisect_right(self._knots, c), len(self._pieces)) - 1
        p, first, second, third = self._pieces[i]
        t = c - self._knots[i]
        slope = first + t * (2.0 * second + t * 3.0 * third)
        bend = 2.0 * second + 6.0 * t * third
        return p + t * (first + t * (second + t * third)), c * slope, c * (slope + c * bend)

    def terms(self, c: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """terms_one for arrays."""
        i = np.minimum(np.searchsorted(self.knots, c, side="right"), len(self.pieces)) - 1
        p, first, second, third = (self.pieces[:, n][i] for n in range(4))
        t = c - self.knots[i]
        slope = first + t * (2.0 * second + t * 3.0 * third)
        bend = 2.0 * second + 6.0 * t * third
        return p + t * (first + t * (second + t * third)), c * slope, c * (slope + c * bend)

    def about(self, pressure):
        """About the concentration of an osmotic pressure, by straight lines; the highest beyond the table."""
        if not isinstance(pressure, float):
            return np.interp(pressure, self.pressures, self.knots)
        right = bisect_right(self._pressures, pressure)
        if right == len(self._pressures):
            return self.highest
        (low, high), (start, end) = self._pressures[right - 1:right + 1], self._knots[right - 1:right + 1]
        return start + (pressure - low) / (high - low) * (end - start)


def _knot_slopes(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    width = np.diff(x)
    mean = np.diff(y) / width
    if len(mean) == 1:
        return np.array([mean[0], mean[0]])
    left, right = 2.0 * width[1:] + width[:-1], width[1:] + 2.0 * width[:-1]
    flat = (mean[:-1] == 0.0) | (mean[1:] == 0.0)
    before, after = np.where(flat, 1.0, mean[:-1]), np.where(flat, 1.0, mean[1:])
    inner = np.where(flat, 0.0, (left + right) / (left / before + right / after))
    return np.array([_end_slope(*width[:2], *mean[:2]), *inner, _end_slope(*width[:-3:-1], *mean[:-3:-1])])


def _end_slope(near_width: float, far_width: float, near: float, far: float) -> float:
    """Three-point slope at an end, cut so that the curve stays monotone."""
    return max(((2.0 * near_width + far_width) * near - near_width * far) / (near_width + far_width), 0.0)


@lru_cache(maxsize=32)
def _prepared(concentration: bytes, pressure: bytes) -> OsmoticTable:
    c, p = np.frombuffer(concentration), np.frombuffer(pressure)
    order = np.argsort(c, kind="stable")
    c, p = c[order], p[order]
    if (twice := np.flatnonzero(np.diff(c) == 0)).size:
        raise NotAvailable(f"two points of the osmotic table have the concentration {c[twice[0]]:.6g} g/L")
    if len(c) and c[0] == 0:
        if p[0] != 0:
            raise NoResult(f"the osmotic table has {p[0] / 1e5:.6g} bar at no concentration")
        c, p = c[1:], p[1:]
    if len(c) == 0:
        raise NotAvailable("the osmotic table needs a point above 0 g/L")
    c, p = np.concatenate(([0.0], c)), np.concatenate(([0.0], p))
    if (falls := np.flatnonzero(np.diff(p) < 0)).size:
        start, end = c[falls[0]:falls[0] + 2]
        raise NoResult(f"the osmotic pressures fall from {start:.6g} to {end:.6g} g/L; they must rise")
    return OsmoticTable(c, p)
