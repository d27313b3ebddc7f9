"""The osmotic-pressure model of the flux, solved: the J for which J + H(C_w) = L_p Δp.

H = L_p σ [π(C_w) − π(C_p)] is the flux that the osmotic pressure takes away; the film gives C_w = C_b/(R
e^(−x) + 1 − R), x = J/k, and C_p = (1 − R) C_w. A law of osmotic pressure is a function `terms` of C_w that
gives H and its first and second derivative with respect to ln C_w. The search starts at the surface
concentration whose osmotic pressure alone meets Δp: H is of the order of L_p Δp wherever it is evaluated, and
nothing overflows, however large L_p Δp/k.

Halley's steps, kept in a bracket; exponentials are what they solve best, and from this start two to five are
enough. `solve_one` is for one plain float, `solve_rows` for arrays; both do the same operations in the same
order.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

#: A step below this, relative to the smaller of 1 and J/k, is the last: its cube is the error that remains.
LAST_STEP = 1e-6
#: The same for a halving of the bracket, which leaves an error as large as itself; and what is rounding.
ROUNDING = 4e-16
#: Steps before halvings are mixed in, and the most there are.
FREE_STEPS, MOST_STEPS = 9, 200
#: The bracket's upper end above the start. With a second coefficient below 0 the start may lie below the
#: root, by ln(1/(1 − √3/2)) = 2.01 at most.
MARGIN = 2.1
#: Lowest C_b over C_w, so that e^(−J/k) stays an ordinary number.
LEAST = 1e-307
#: Rows solved at a time: the arrays stay in the processor's cache.
ROWS = 4096


def start_one(
    terms: Callable, rise: float, limit: float, transfer: float, bulk: float, rejection: float
) -> tuple[float, float]:
    """First x and upper end of the bracket.

    `rise` is C_b over the C_w whose osmotic pressure alone takes all the flux, `limit` is L_p Δp/k.
    """
    passed = 1.0 - rejection
    top = limit * (1.0 + 1e-9)
    if rise > passed or passed == 0.0:
        x = max(-math.log((max(rise, LEAST) - passed) / rejection), 0.0)
        if rise < LEAST and limit > x:  # the surface concentration is no number
            return math.nan, math.nan
        return min(x, limit), min(x + MARGIN, top)
    # C_w cannot exceed C_b/(1 − R), which leaves some flux: start at the bend of C_w(x), or where that leads.
    plateau = terms(bulk / passed)[0]
    return min(limit, max(limit - plateau / transfer, math.log(rejection / passed), 0.0)), top


def solve_one(
    terms: Callable, darcy: float, transfer: float, bulk: float, rejection: float, x: float, high: float,
    last_step: float = LAST_STEP,
) -> float:
    """Flux of one row; `darcy` is L_p Δp, which H at no flux does not reach."""
    passed, low = 1.0 - rejection, 0.0
    for step in range(MOST_STEPS):
        decay = rejection * math.exp(-x)
        modulus = 1.0 / (decay + passed)
        share = decay * modulus  # d ln C_w/dx
        h, h1, h2 = terms(bulk * modulus)
        excess = transfer * x + h - darcy
        slope = transfer + share * h1
        newton = excess / slope
        halley = 1.0 - 0.5 * newton * (share * (share * h2 - passed * modulus * h1)) / slope
        if excess > 0.0:
            high = x
        else:
            low = x
        new = x - newton / (halley if halley > 0.5 else 0.5)
        small = last_step
        if not low <= new <= high or (step > FREE_STEPS and step & 1):
            new, small = 0.5 * (low + high), ROUNDING
        if abs(new - x) <= small * (x if x < 1.0 else 1.0) + ROUNDING * x:
            return min(transfer * new, darcy)
        x = new
    return math.nan


def start_rows(terms: Callable, law: tuple, rise, limit, transfer, bulk, rejection):
    """start_one for arrays; `law` holds the arrays that `terms` takes after C_w."""
    passed = 1.0 - rejection
    top = limit * (1.0 + 1e-9)
    met = (rise > passed) | (passed == 0.0)
    x = np.maximum(-np.log(np.where(met, np.maximum(rise, LEAST) - passed, 1.0) / rejection), 0.0)
    x[met & (rise < LEAST) & (limit > x)] = np.nan
    high = np.minimum(x + MARGIN, top)
    if not met.all():
        rest = np.flatnonzero(~met)
        plateau = terms(bulk[rest] / passed[rest], *(part[rest] for part in law))[0]
        bend = np.log(rejection[rest] / passed[rest])
        x[rest] = np.maximum(np.maximum(limit[rest] - plateau / transfer[rest], bend), 0.0)
        high[rest] = top[rest]
    return np.minimum(x, limit), high


def solve_rows(
    terms: Callable, law: tuple, darcy, transfer, bulk, rejection, x, low, high, last_step: float = LAST_STEP
) -> np.ndarray:
    """solve_one for arrays; `low` may lie above 0."""
    flux = np.full(len(x), np.nan)
    for first in range(0, len(x), ROWS):
        part = slice(first, first + ROWS)
        row = (a[part] for a in (darcy, transfer, bulk, rejection, x))
        _solve_piece(terms, tuple(a[part] for a in law), *row, low[part].copy(), high[part].copy(), last_step,
                     flux[part])
    return flux


def _solve_piece(terms, law, darcy, transfer, bulk, rejection, x, low, high, last_step, flux):
    rows = np.arange(len(x))
    passed = 1.0 - rejection
    for step in range(MOST_STEPS):
        decay = rejection * np.exp(-x)
        modulus = 1.0 / (decay + passed)
        share = decay * modulus
        h, h1, h2 = terms(bulk * modulus, *law)
        excess = transfer * x + h - darcy
        slope = transfer + share * h1
        newton = excess / slope
        halley = 1.0 - 0.5 * newton * (share * (share * h2 - passed * modulus * h1)) / slope
        above = excess > 0.0
        np.copyto(high, x, where=above)
        np.copyto(low, x, where=~above)
        new = x - newton / np.maximum(halley, 0.5)
        astray = ~((low <= new) & (new <= high))
        if step > FREE_STEPS and step & 1:
            astray[:] = True
        small = last_step
        if astray.any():
            new[astray] = 0.5 * (low[astray] + high[astray])
            small = np.where(astray, ROUNDING, last_step)
        done = np.abs(new - x) <= small * np.minimum(x, 1.0) + ROUNDING * x
        x = new
        if done.any():
            flux[rows[done]] = np.minimum(transfer[done] * x[done], darcy[done])
            moving = ~done
            darcy, transfer, bulk, rejection, passed, x, low, high, rows = (
                a[moving] for a in (darcy, transfer, bulk, rejection, passed, x, low, high, rows))
            law = tuple(a[moving] for a in law)
            if len(x) == 0:
                return


def single_bracket(nodes: np.ndarray, excess: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Where the one root of each row lies, and how many solutions there are.

    Parameters
    ----------
    nodes : array, rows × points
        Rising x from 0, between which the excess is monotone (or which are dense).
    excess : array of that shape
        k x + H − L_p Δp.

    Returns
    -------
    tuple of arrays
        The ends of the first interval in which the sign changes, and the number of solutions. No flux is one
        of them where the osmotic pressure at no flux is not overcome.
    """
    above = excess >= 0.0
    change = above[:, 1:] != above[:, :-1]
    at = change.argmax(axis=1)
    row = np.arange(len(nodes))
    return nodes[row, at], nodes[row, at + 1], change.sum(axis=1) + above[:, 0]
