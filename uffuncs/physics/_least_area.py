"""Intermediate concentrations of a feed-and-bleed cascade at which its total area is least.

Stage i takes r_i = C_(i-1)/C_i; per feed flow it passes (1 − r_i)/R and retains φ_i = 1 − (1 − r_i)/R; its
area per feed flow is (1 − r_i) g_i/R with g = 1/J at its own concentration. W_i is the area of stage i and
all after it, per feed flow of stage i: W_i = (1 − r_i) g_i/R + φ_i W_(i+1). With s = ln C, the area is
stationary in C_i where

    r_i g_i + (1 − r_i) g'_i − r_i W_(i+1) − φ_i r_(i+1) (g_(i+1) − W_(i+2)) = 0,   g' = dg/ds.

Two ways: for the gel law this gives r_i from what comes after it, so that one unknown, the last step, is shot
for from the end; for any piecewise linear law a search over a grid, then Newton's method on the pieces, kinks
included.

With R < 1 a stage can pass all its feed, at a concentration ratio of 1/(1 − R), and then nothing after it
needs any area: the area may fall towards a cascade that loses the whole product. Such an end is no minimum,
and only true minima count here.
"""

from __future__ import annotations

import math

import numpy as np

from ._flux_law import FluxLaw

_OVERSHOT = 1e9
#: At a minimum a concentration moved by its own step changes the area by less than this, relative.
STATIONARY = 1e-9


def least_area_logs(
    law: FluxLaw, first: float, last: float, stages: int, rejection: float
) -> list[float] | None:
    """ln(C/reference) at the outlets of all stages; `first` is that of the feed, `last` the one wanted.

    None where the area has no minimum, but falls towards a stage that passes all its feed.
    """
    if stages == 1:
        return [last]
    if all(law.slope(p) == 0 for p in range(law.piece(first), len(law.logs) - 1) if law.logs[p] < last):
        # One flux everywhere: equal ratios pass least, and with full retention any do.
        return [first + (last - first) * i / stages for i in range(1, stages)] + [last]
    pieces = len(law.logs) - 1
    gel = law.logs[-1] == law.fluxes[-1] == 0 and (pieces == 1 or (pieces == 2 and law.slope(0) == 0))
    if gel and (rejection == 1 or last - first < -math.log1p(-rejection)):  # no stage can pass all its feed
        found = _gel_logs(law, first, last, stages, rejection)
        if found is not None:
            return found
    return _searched_logs(law, first, last, stages, rejection)


# --- the gel law: shooting ----------------------------------------------------------------------------------


def _gel_logs(law: FluxLaw, first: float, last: float, stages: int, rejection: float) -> list[float] | None:
    """By shooting, in y = −s, where g = 1/y but for the factor k; None if it does not find the optimum."""
    kink = -law.logs[1] if len(law.logs) == 3 else math.inf
    found = _shot(-first, -last, stages, rejection)
    if found is not None and found[0] <= kink:  # the highest flux is met by no stage
        return [-y for y in found]
    if kink == math.inf:
        return None
    # The first stages at the highest flux, by equal ratios, the last of them on the kink, the rest below it:
    # how many is tried out. With full retention one is enough: all that pass at one flux are worth one.
    best, least = None, math.inf
    for flat in range(1, stages if rejection < 1 else 2):
        below = _shot(kink, -last, stages - flat, rejection)
        ratio = math.exp((kink + first) / flat)
        if below is None or not ratio > 1.0 - rejection:
            continue
        share = 1.0 - (1.0 - ratio) / rejection
        to_go = _area_per_feed([kink, *below], rejection, 1)
        area = (1.0 - share**flat) / kink + share**flat * to_go
        if area < least:
            best, least = (flat, ratio, share, below, to_go), area
    if best is None:
        return None
    flat, ratio, share, below, to_go = best
    # A minimum only if the area falls towards the kink from both sides, and equal ratios are the best.
    g, after, next_ratio = 1.0 / kink, _area_per_feed(below, rejection, 1), math.exp(below[0] - kink)
    slope = ratio * (g - to_go) - share * next_ratio * (1.0 / below[0] - after)
    if slope <= 0 <= slope + (1.0 - ratio) * g * g and (flat == 1 or to_go < g):
        return [first + (-kink - first) * i / flat for i in range(1, flat)] + [-kink, *(-y for y in below)]
    return None


def _area_per_feed(ys: list[float], rejection: float, start: int) -> float:
    """W of the stages from index `start` on, the stage before it being at ys[start − 1]."""
    area = 0.0
    for before, y in reversed(list(zip(ys[start - 1:], ys[start:]))):
        passed = -math.expm1(y - before) / rejection
        area = passed / y + (1.0 - passed) * area
    return area


def _shot(first: float, last: float, stages: int, rejection: float) -> list[float] | None:
    """y at all outlets from the feed's and the last one's; None if no stationary cascade is met."""
    if stages == 1:
        return [last]
    from scipy.optimize import brentq

    def too_far(step: float) -> float:
        back = _backwards(last, step, stages, rejection, first)
        return _OVERSHOT if back is None else back[0] - first

    span = first - last
    if not too_far(span) >= 0:
        return None
    step = brentq(too_far, 0.0, span, xtol=1e-16 * span, rtol=1e-15)
    found = _backwards(last, step, stages, rejection, 2.0 * first)
    if found is None or abs(found[0] - first) > 1e-9 * span:
        return None
    return found[1:]


def _backwards(y: float, step: float, stages: int, rejection: float, limit: float) -> list[float] | None:
    """y from the feed's to the last one's, for the last stage's step; None once it goes beyond `limit`."""
    lost = (1.0 - rejection) / rejection
    found = [y + step, y]
    passed = -math.expm1(-step)
    g_next, after_next, after = 1.0 / y, 0.0, passed / (y * rejection)  # g_(i+1), W_(i+2), W_(i+1)
    for _ in range(stages - 1):
        y = found[0]
        if y > limit:
            return None
        g = 1.0 / y
        # r_i − 1 = excess/divisor: the condition solved for r_i, in differences that lose no digits.
        excess = -step * g * g_next - lost * passed * (g_next - after_next)
        divisor = g * g - g + (g_next - (1.0 - rejection) * after_next) / rejection
        if not 0.0 >= excess > -rejection * divisor:
            return None
        step, passed = -math.log1p(excess / divisor), -excess / divisor
        found.insert(0, y + step)
        after, after_next, g_next = passed * g / rejection + (1.0 - passed / rejection) * after, after, g
    return found


# --- any law: grid, then Newton on the pieces ---------------------------------------------------------------


def _searched_logs(
    law: FluxLaw, first: float, last: float, stages: int, rejection: float
) -> list[float] | None:
    """The best minimum that Newton's method finds from three starts; None if it finds none."""
    grid = _grid(law, first, last, min(100 + 20 * stages, 400))
    starts = [
        _best_on_grid(law, grid, stages, rejection),
        *([_best_on_grid(law, grid, stages, 1.0)] if rejection < 1 else []),
        [first + (last - first) * i / stages for i in range(1, stages)],
    ]
    best, least = None, math.inf
    for start in starts:
        steps = np.diff([first, *start, last])
        if steps.min() > 0 and -math.expm1(-steps.max()) < rejection:
            logs, area = _refined(law, first, np.array(start), last, rejection)
            if area < least:
                best, least = logs, area
    return best


def _grid(law: FluxLaw, first: float, last: float, count: int) -> np.ndarray:
    """Even steps of s, the knots, and even steps of ln J where it falls much."""
    points = [np.linspace(first, last, count), [s for s in law.logs if first < s < last]]
    low, high = law.flux(last), law.flux(first)
    if high > 2.0 * low:
        even = np.interp(np.geomspace(low, high, 80)[1:-1], *_rising(law, first, last))
        points.append(even)
    merged = np.unique(np.concatenate(points))
    return merged[(merged >= first) & (merged <= last)]


def _rising(law: FluxLaw, first: float, last: float) -> tuple[list[float], list[float]]:
    """(J, s) with J rising, of the lower envelope from the end: for even steps of ln J."""
    fluxes, logs = [law.flux(last)], [last]
    for s in [*(s for s in reversed(law.logs) if first < s < last), first]:
        if law.flux(s) > fluxes[-1]:
            fluxes.append(law.flux(s))
            logs.append(s)
    return fluxes, logs


def _best_on_grid(law: FluxLaw, grid: np.ndarray, stages: int, rejection: float) -> list[float]:
    """Outlets of all stages but the last, on the grid: dynamic programming from the last stage back."""
    flux = np.array([law.flux(s) for s in grid])
    passed = -np.expm1(np.minimum(grid[:, None] - grid[None, :], 0.0)) / rejection  # from row to column
    possible = np.triu(passed < 1.0, 1)
    area = np.where(possible, passed / flux[None, :], 1e200)
    share = np.where(possible, 1.0 - passed, 0.0)
    to_go = area[:, -1]
    choices = []
    for _ in range(stages - 1):
        through = area + share * to_go[None, :]
        choices.insert(0, through.argmin(axis=1))
        to_go = through.min(axis=1)
    at, found = 0, []
    for choice in choices:
        at = int(choice[at])
        found.append(float(grid[at]))
    return found


def _refined(
    law: FluxLaw, first: float, logs: np.ndarray, last: float, rejection: float
) -> tuple[list[float], float]:
    """Newton's method, each concentration on one piece of the law, kinks as bounds.

    Gives the outlets and the area per feed flow, which is infinite where the method ends at no minimum.
    """
    knots = law.logs
    pieces = [law.piece(s) for s in logs]
    area, slopes = _area_and_slopes(law, first, logs, last, pieces, rejection)
    for _ in range(100):
        # A concentration on a knot moves to the next piece only if the area falls on into it.
        free = np.ones(len(logs), bool)
        for i, s in enumerate(logs):
            for at, ahead, sign in ((pieces[i] + 1, 1, -1.0), (pieces[i], -1, 1.0)):
                if s == knots[at] and sign * slopes[i] > 0:
                    other = pieces[i] + ahead
                    if 0 <= other < len(knots) - 1:
                        moved = [*pieces[:i], other, *pieces[i + 1:]]
                        if sign * _area_and_slopes(law, first, logs, last, moved, rejection)[1][i] > 0:
                            pieces = moved
                            slopes = _area_and_slopes(law, first, logs, last, pieces, rejection)[1]
                            break
                    free[i] = False
                    break
        move = np.zeros(len(logs))
        if free.any():
            move[free] = _newton_step(law, first, logs, last, pieces, rejection, slopes, np.flatnonzero(free))
        low = np.array([knots[p] for p in pieces])
        high = np.array([knots[p + 1] for p in pieces])
        size = 1.0
        for _ in range(50):
            trial = np.clip(logs + size * move, low, high)
            steps = np.diff([first, *trial, last])
            if steps.min() > 0 and -math.expm1(-steps.max()) < rejection:
                new_area, new_slopes = _area_and_slopes(law, first, trial, last, pieces, rejection)
                if new_area <= area * (1.0 + 1e-13):
                    break
            size *= 0.5
        else:
            break
        change = np.abs(trial - logs).max()
        logs, area, slopes = trial, new_area, new_slopes
        if change <= 1e-14 * (last - first):
            break
    steps = np.diff([first, *logs, last])
    if (np.abs(slopes) * np.minimum(steps[1:], steps[:-1]))[free].max(initial=0.0) > STATIONARY * area:
        area = math.inf
    return [*map(float, logs), last], area


def _newton_step(law, first, logs, last, pieces, rejection, slopes, free) -> np.ndarray:
    """Newton's step for the free concentrations; downhill even where the area is not convex."""
    steps = np.diff([first, *logs, last])
    scale = np.minimum(steps[1:], steps[:-1])[free]  # steps may differ by powers of ten
    hessian = np.empty((len(free), len(free)))
    for column, i in enumerate(free):
        h = 1e-6 * min(steps[i], steps[i + 1])
        up, down = logs.copy(), logs.copy()
        up[i] += h
        down[i] -= h
        difference = (_area_and_slopes(law, first, up, last, pieces, rejection)[1]
                      - _area_and_slopes(law, first, down, last, pieces, rejection)[1])
        hessian[:, column] = difference[free] / (2.0 * h)
    scaled = hessian * scale[:, None] * scale[None, :]
    values, vectors = np.linalg.eigh(0.5 * (scaled + scaled.T))
    curvature = np.maximum(np.abs(values), 1e-12 * max(np.abs(values).max(), 1e-300))
    return -scale * (vectors @ ((vectors.T @ (slopes[free] * scale)) / curvature))


def _area_and_slopes(law, first, logs, last, pieces, rejection) -> tuple[float, np.ndarray]:
    """Total area per feed flow, and its derivatives by the intermediate s, each on its own piece."""
    s = [first, *map(float, logs), last]
    n = len(s) - 1
    g, slope = [0.0] * (n + 1), [0.0] * (n + 1)
    for i in range(1, n):
        g[i] = 1.0 / law.flux_on(pieces[i - 1], s[i])
        slope[i] = -law.slope(pieces[i - 1]) * g[i] * g[i]
    g[n] = 1.0 / law.flux(last)
    passed = [0.0] + [-math.expm1(s[i - 1] - s[i]) for i in range(1, n + 1)]
    flow = [1.0] * n
    for i in range(1, n):
        flow[i] = flow[i - 1] * (1.0 - passed[i] / rejection)
    to_go = [0.0] * (n + 3)
    for i in range(n, 0, -1):
        to_go[i] = passed[i] * g[i] / rejection + (1.0 - passed[i] / rejection) * to_go[i + 1]
    slopes = np.empty(n - 1)
    for i in range(1, n):
        r, r_next = 1.0 - passed[i], 1.0 - passed[i + 1]
        share = 1.0 - passed[i] / rejection
        slopes[i - 1] = flow[i - 1] / rejection * (
            r * (g[i] - to_go[i + 1]) + passed[i] * slope[i] - share * r_next * (g[i + 1] - to_go[i + 2]))
    return to_go[1], slopes
