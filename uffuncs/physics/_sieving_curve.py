"""Measured sieving curves: the monotone curve through them, and the log-normal one fitted to them."""

from __future__ import annotations

import numpy as np

from ..errors import NoResult, NotAvailable
from ._line import fit_line


def monotone_curve(molar_mass: np.ndarray, rejection: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """ln M, and the least-squares rejections that nowhere fall with M (pool adjacent violators)."""
    masses, group = np.unique(molar_mass, return_inverse=True)
    counts = np.bincount(group)
    pools: list[list[float]] = []  # mean, weight and number of molar masses of each pool
    for mean, count in zip(np.bincount(group, rejection) / counts, counts):
        pools.append([mean, count, 1])
        while len(pools) > 1 and pools[-2][0] > pools[-1][0]:
            mean_2, weight_2, size_2 = pools.pop()
            mean_1, weight_1, size_1 = pools.pop()
            weight = weight_1 + weight_2
            pools.append([(mean_1 * weight_1 + mean_2 * weight_2) / weight, weight, size_1 + size_2])
    # Twelve digits: 70 % given as a text is not quite 0.7.
    return np.log(masses), np.round(np.repeat([p[0] for p in pools], [p[2] for p in pools]), 12)


def falls(molar_mass: np.ndarray, rejection: np.ndarray) -> bool:
    """Whether the rejection falls with molar mass anywhere."""
    order = np.lexsort((rejection, molar_mass))
    return np.any(np.diff(rejection[order]) < 0)


def fit_log_normal(x: np.ndarray, rejection: np.ndarray) -> tuple[float, float, float, float, float]:
    """Least squares of R on Φ[z_0.9 + (x − ln M_c)/s], x = ln M: M_c, s, their standard errors, r².

    Raises
    ------
    NotAvailable
        Too few points, or points that tell no spread, or no rise.
    NoResult
        The search does not settle.
    """
    from scipy.optimize import least_squares
    from scipy.special import ndtr, ndtri

    n = len(x)
    if n < 3:
        raise NotAvailable(f"{n} points; cut-off and spread with standard errors need three or more")
    if len(np.unique(x[(rejection > 0) & (rejection < 1)])) < 2:
        raise NotAvailable("cut-off and spread need rejections between 0 and 1 at two molar masses or more")
    z = ndtri(0.9)
    start = fit_line(x, ndtri(np.clip(rejection, 0.01, 0.99)), "molar mass")
    if start.slope <= 0:
        raise NotAvailable("the rejection does not rise with molar mass: this is no sieving curve")

    def rest(p):
        return ndtr(z + (x - p[0]) * np.exp(-p[1])) - rejection

    def slopes(p):
        u = z + (x - p[0]) * np.exp(-p[1])
        slope = -np.exp(-p[1] - 0.5 * u**2) / np.sqrt(2.0 * np.pi)
        return np.stack([slope, slope * (x - p[0])], axis=1)

    # The parameters ln M_c and ln s keep both positive.
    guess = [(z - start.intercept) / start.slope, -np.log(start.slope)]
    fit = least_squares(rest, guess, slopes, method="lm", xtol=1e-12, ftol=1e-14, gtol=1e-12)
    cut_off, spread = np.exp(fit.x)
    if not fit.success or not 1e-4 < spread < 20:
        raise NoResult("the fit finds no cut-off and spread; the points do not follow a sieving curve")
    rest_squares = fit.fun @ fit.fun
    total = np.sum((rejection - rejection.mean()) ** 2)
    errors = np.sqrt(np.diag(np.linalg.inv(fit.jac.T @ fit.jac)) * rest_squares / (n - 2))
    return cut_off, spread, cut_off * errors[0], spread * errors[1], 1.0 - rest_squares / total
