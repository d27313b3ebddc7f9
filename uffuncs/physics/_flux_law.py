"""Flux against concentration, linear in ln C piece by piece: two pieces for the gel model, more if measured.

The pieces are kept apart, so that every integral is closed or converges to rounding, the kinks included.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..errors import NoResult, NotAvailable

#: Nearer than this to the gel concentration, relative, is reaching it: the flux is rounding error there.
GEL_CLEARANCE = 1e-12
#: Slack, relative, at the ends of measured points: a product of rounded numbers may sit on the end itself.
END_SLACK = 1e-9
#: 200 L/(m²·h), above which few ultrafiltration membranes run on clean water (common practice, no source).
HIGH_FLUX = 200e-3 / 3600

#: Nodes on 0 to 1 and weights of the Gauss–Legendre rule of 16 points.
_NODES = [(0.5 * (1.0 + float(x)), 0.5 * float(w)) for x, w in zip(*np.polynomial.legendre.leggauss(16))]


@dataclass(frozen=True)
class FluxLaw:
    """J against s = ln(C/reference), linear between knots; `logs` rises."""

    reference: float
    logs: tuple[float, ...]
    fluxes: tuple[float, ...]

    def log(self, concentration: float) -> float:
        return math.log(concentration / self.reference)

    def piece(self, log: float) -> int:
        """Index of the piece at `log`, the one to the right at a knot; the end pieces go on outside."""
        return min(max(bisect_right(self.logs, log) - 1, 0), len(self.logs) - 2)

    def slope(self, piece: int) -> float:
        """dJ/ds."""
        return (self.fluxes[piece + 1] - self.fluxes[piece]) / (self.logs[piece + 1] - self.logs[piece])

    def flux_on(self, piece: int, log: float) -> float:
        # From the right end: towards the gel concentration J and s go to 0 together, and lose no digits.
        return self.fluxes[piece + 1] - self.slope(piece) * (self.logs[piece + 1] - log)

    def flux(self, log: float) -> float:
        return self.flux_on(self.piece(log), log)


def gel_law(start: float, transfer: float, gel: float, maximum: float = math.inf) -> FluxLaw:
    """J = min(maximum, k ln(C_g/C)) from the concentration `start` on, which is above 0 and below `gel`."""
    lowest = math.log(start / gel)
    kink = -maximum / transfer
    if kink <= lowest:
        return FluxLaw(gel, (lowest, 0.0), (-transfer * lowest, 0.0))
    return FluxLaw(gel, (lowest, kink, 0.0), (maximum, maximum, 0.0))


def measured_law(concentration: np.ndarray, flux: np.ndarray) -> FluxLaw:
    """Measured points, joined by straight lines of J on ln C."""
    if len(concentration) < 2:
        raise NotAvailable("the measured flux needs two points or more")
    if min(concentration) <= 0:
        raise NoResult("a measured concentration is 0; the flux is interpolated on its logarithm")
    order = np.argsort(concentration)
    c, j = concentration[order], flux[order]
    if (same := np.flatnonzero(np.diff(c) == 0)).size:
        raise NotAvailable(f"two of the measured points have the concentration {c[same[0]]:.6g} g/L")
    reference = float(c[-1])
    return FluxLaw(reference, tuple(np.log(c / reference).tolist()), tuple(map(float, j)))


def drained(start: float, end: float, length: float) -> float:
    """∫ e^(−v)/J dv, v from 0 to `length`, J linear in v from `start` to `end`, both above 0; to rounding."""
    fall = start - end
    if min(start, end) >= 0.5 * abs(fall):  # the pole is far: the rule of 16 points converges to rounding
        return length * sum(w * math.exp(-length * x) / (start - fall * x) for x, w in _NODES)
    from scipy.special import exp1, expi

    # J differs threefold or more between the ends, so that these differences lose no digits.
    if fall > 0:
        z = end * length / fall
        return float(length / fall * math.exp(-z - length) * (expi(z + length) - expi(z)))
    z = start * length / -fall
    return float(length / -fall * math.exp(z) * (exp1(z) - exp1(z + length)))


def passed(start: float, end: float, length: float) -> float:
    """∫ dv/J for v from 0 to `length`, J linear in v from `start` to `end`, both above 0."""
    low, rise = min(start, end), abs(end - start)
    return length / low * (math.log1p(rise / low) * low / rise if rise > 0 else 1.0)


def along(
    law: FluxLaw, start: float, rate: float, length: float, integral: Callable, weight: Callable
) -> float:
    """Sum over the pieces of `law` of ∫ weight(v)/J(s) dv, s = start + rate·v, v from 0 to `length`.

    NaN where the law has no flux above 0.

    `integral` is `drained` or `passed`, `weight` its factor at the start of a piece.
    """
    first, last = law.logs[0], law.logs[-1]
    end = start + rate * length
    if min(start, end) < first - END_SLACK or max(start, end) > last + END_SLACK:
        return math.nan
    # In terms of v and not of s: a rate near 0 then costs no digits.
    pace = rate if abs(rate) > 1e-300 else 1e-300
    inner = sorted(v for v in ((s - start) / pace for s in law.logs[1:-1]) if 0.0 < v < length)
    total = 0.0
    for low, high in zip([0.0, *inner], [*inner, length]):
        piece = law.piece(start + rate * 0.5 * (low + high))
        j_low, j_high = law.flux_on(piece, start + rate * low), law.flux_on(piece, start + rate * high)
        if not (j_low > 0 and j_high > 0):
            return math.nan
        total += weight(low) * integral(j_low, j_high, high - low)
    return total
