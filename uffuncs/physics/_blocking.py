"""The four blocking laws in one form, and their fit to a flux decline."""

from __future__ import annotations

import numpy as np

from ..errors import NotAvailable

#: law -> m = 2 − n of Hermia's d²t/dV² = k (dt/dV)^n
LAWS = {"complete": 0.0, "standard": 0.5, "intermediate": 1.0, "cake": 2.0}


def decline(m: float, x):
    """J/J_0 at the reduced time x = k J_0^m t: (1 + m x)^(−1/m), and e^(−x) for m = 0."""
    return np.exp(-x) if m == 0 else (1.0 + m * x) ** (-1.0 / m)


def fit_laws(time: np.ndarray, flux: np.ndarray) -> tuple:
    """Law, J_0, k, their standard errors, r², residual standard deviation: one entry a law, best first.

    Raises
    ------
    NotAvailable
        Too few points or times, a flux that does not fall, or a J_0 that the points do not tell.
    """
    times = len(np.unique(time))
    if times < 3:
        raise NotAvailable(f"points at {times} times; the fit needs three different times or more")
    if (time - time.mean()) @ (flux - flux.mean()) >= 0:
        raise NotAvailable("the flux does not fall with time: no blocking can be told")
    rows = sorted(((law, *_fit(law, m, time, flux)) for law, m in LAWS.items()), key=lambda row: row[-1])
    law, *numbers = zip(*rows)
    return list(law), *map(np.array, numbers)


def _fit(law: str, m: float, time: np.ndarray, flux: np.ndarray) -> tuple[float, ...]:
    """J = a·decline(c t): the best c of a coarse grid, then least squares in ln a and ln c."""
    from scipy.optimize import least_squares

    t, j = time / time.max(), flux / flux.max()

    def rest(p):
        return np.exp(p[0]) * decline(m, np.exp(p[1]) * t) - j

    def slopes(p):
        x = np.exp(p[1]) * t
        y = decline(m, x)
        return np.exp(p[0]) * np.stack([y, -x * y ** (1.0 + m)], axis=1)

    grid = np.geomspace(1e-6, 1e6, 145)
    shapes = decline(m, grid[:, None] * t)
    size = np.sum(shapes**2, axis=1)
    size[size == 0] = np.inf  # a decline that is over before the first point
    best = int(np.argmax((shapes @ j) ** 2 / size))  # the best a for each c is known
    scale = shapes[best] @ j / size[best]
    guess = [np.log(scale), np.log(grid[best])]
    fit = least_squares(rest, guess, slopes, method="lm", xtol=1e-13, ftol=1e-15, gtol=1e-13)
    normal = fit.jac.T @ fit.jac
    if not fit.success or np.linalg.cond(normal) > 1e12 or not np.all(np.abs(fit.x) < 30):
        raise NotAvailable(f"{law} law: the points do not tell J_0 and k; give some nearer to the start")
    n = len(t)
    rest_squares = fit.fun @ fit.fun
    covariance = np.linalg.inv(normal) * rest_squares / (n - 2)
    initial = np.exp(fit.x[0]) * flux.max()
    k = np.exp(fit.x[1]) / time.max() / initial**m  # ln k = ln c − m ln J_0 − ln t_max
    errors = [covariance[0, 0], covariance[1, 1] - 2 * m * covariance[0, 1] + m**2 * covariance[0, 0]]
    initial_error, k_error = np.array([initial, k]) * np.sqrt(errors)
    r_squared = 1.0 - rest_squares / np.sum((j - j.mean()) ** 2)
    return initial, k, initial_error, k_error, r_squared, (rest_squares / (n - 2)) ** 0.5 * flux.max()
