"""The sieving curve of a membrane: rejection against molar mass, and its cut-off."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import NotAvailable
from ..quantities import quantity
from .rejection import IUPAC
from ._sieving_curve import falls, fit_log_normal, monotone_curve

TOPIC = "rejection"

MICHAELS = ("Michaels, Analysis and prediction of sieving curves for ultrafiltration membranes: "
            "a universal correlation?, Sep. Sci. Technol. 15 (1980) 1305")


@worksheet_function(
    result="rejection",
    equation="R = Φ[z + ln(M/M_c)/s], Φ(z) = level",
    source=f"{MICHAELS}; the same with ln M in place of ln r",
    arguments={"cut_off": "Molar mass that is rejected to the level"},
    dimensional="the normal integral of SciPy takes plain numbers",
)
def rejection_curve(molar_mass: Number, cut_off: Number, spread: Number, level: Number = 0.9) -> Number:
    """Rejection of a molar mass by a membrane of known cut-off and spread.

    The sieving curve is a cumulative normal distribution in ln M. A spread of 0 is the sharp cut-off:
    nothing is rejected below it, everything above.
    """
    from scipy.special import ndtr, ndtri

    return ndtr(ndtri(level) + np.log(molar_mass / cut_off) / np.maximum(spread, 1e-300))


@worksheet_function(
    result="cut_off",
    equation="R(ln M_c) = level, R(ln M) straight between the measured points",
    source=f"{IUPAC}; interpolation and pooling: common practice, no source",
    refuses=[
        Rule(lambda molar_mass, rejection, level: level > monotone_curve(molar_mass, rejection)[1][-1],
             "no solute is rejected to {level}; measure a larger one: no extrapolation"),
        Rule(lambda molar_mass, rejection, level: level < monotone_curve(molar_mass, rejection)[1][0],
             "all solutes are rejected to more than {level}; measure a smaller one: no extrapolation"),
    ],
    cautions=[Rule(falls, "the rejection falls with molar mass somewhere; such points are pooled")],
    dimensional="logarithm of a molar mass, whose unit is put back by the exponential",
)
def cut_off(molar_mass: Column, rejection: Column, level: Number = 0.9) -> Number:
    """Molecular-weight cut-off by interpolation in a measured sieving curve.

    Straight lines in ln M between the points, in any order. Rejections of one molar mass are averaged;
    where the rejection falls with molar mass, the neighbours that disagree are pooled to their mean, which
    is the monotone curve nearest to the data by least squares. On a level stretch the smallest molar mass
    counts. No extrapolation.
    """
    logarithms, curve = monotone_curve(molar_mass, rejection)
    if len(curve) < 2:
        raise NotAvailable("one molar mass only; the interpolation needs two or more")
    level = np.round(level, 12)
    above = np.minimum(np.searchsorted(curve, level), len(curve) - 1)  # the first to reach the level
    below = np.maximum(above - 1, 0)
    rise = curve[above] - curve[below]
    share = np.clip((level - curve[below]) / np.where(rise > 0, rise, np.inf), 0.0, 1.0)
    found = np.exp(logarithms[below] + share * (logarithms[above] - logarithms[below]))
    return np.where((curve[0] <= level) & (level <= curve[-1]), found, np.nan)[()]


@worksheet_function(
    results=["cut_off", "spread",
             replace(quantity("standard_error"), unit="kDa", meaning="Standard error of the cut-off"),
             replace(quantity("standard_error"), meaning="Standard error of the spread"),
             "coefficient_of_determination"],
    equation="least squares of R on Φ[z_0.9 + ln(M/M_c)/s]",
    source=f"{MICHAELS}; the same with ln M in place of ln r",
    dimensional="logarithm of a molar mass, whose unit is put back by the exponential",
)
def cut_off_fit(molar_mass: Column, rejection: Column) -> tuple:
    """Cut-off at 90 % and spread fitted to a measured sieving curve, their standard errors, and r².

    Least squares on the rejections, all of one weight; the curve is that of rejection_curve. Standard
    errors by the linear approximation at the fit. Three points or more, two of them with a rejection
    between 0 and 1.
    """
    return fit_log_normal(np.log(molar_mass), rejection)
