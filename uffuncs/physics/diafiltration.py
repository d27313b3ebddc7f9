"""Diafiltration at constant volume: diavolumes, washing-out, the best concentration, time, purity."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..quantities import quantity
from ._elements import above_zero, elementwise
from ._flux_law import END_SLACK, GEL_CLEARANCE, HIGH_FLUX, FluxLaw, along, measured_law, passed
from ._gel_model import (
    ABOVE_MEASURED, BELOW_MEASURED, CHERYAN, FOLEY, GEL_MODEL, NO_MAXIMUM, NO_MEASURED_FLUX, NO_TRANSFER,
    POINTS, PROCESS_TIME, diavolumes_over_flux, gel_flux,
)
from .concentration import BLATT_BATCH

TOPIC = "concentration"

NG = ("Ng, Lundblad & Mitra, Optimization of solute separation by diafiltration, Sep. Sci. 11 (1976) 499, "
      "doi 10.1080/01496397608085339")


#: Donnan exclusion can drive a small ion into the permeate above its concentration in the feed.
DONNAN_SIEVING = replace(quantity("sieving_coefficient"), high=2)
#: The same seen as a rejection below zero.
DONNAN_REJECTION = replace(quantity("rejection"), low=-1)


@worksheet_function(
    arguments={"sieving_coefficient": DONNAN_SIEVING},
    result="diavolumes",
    equation="N = −ln f/S",
    source=f"{BLATT_BATCH}; {NG}",
    refuses=[Rule(lambda sieving_coefficient: sieving_coefficient == 0,
                  "{sieving_coefficient}: the membrane holds the solute back, and no water washes it out")],
)
def diavolumes(remaining_fraction: Number, sieving_coefficient: Number = 1.0) -> Number:
    """Diavolumes that leave the given share of a solute, at constant volume.

    Water is added as permeate leaves; well mixed, with a constant sieving coefficient.
    """
    return -np.log(remaining_fraction) / above_zero(sieving_coefficient)


@worksheet_function(
    arguments={"sieving_coefficient": DONNAN_SIEVING},
    result="remaining_fraction",
    equation="f = e^(−S N)",
    source=f"{BLATT_BATCH}; {NG}",
)
def diafiltration_remaining(diavolumes: Number, sieving_coefficient: Number = 1.0) -> Number:
    """Share of a solute that remains after diafiltration at constant volume; the inverse of diavolumes.

    Water is added as permeate leaves; well mixed, with a constant sieving coefficient.
    """
    return np.exp(-sieving_coefficient * diavolumes)


@worksheet_function(
    arguments={"sieving_coefficient": DONNAN_SIEVING},
    result="remaining_fraction",
    equation="f = (1 + r)^(−S n)",
    source=f"{CHERYAN}; {BLATT_BATCH}",
)
def diafiltration_steps(dilution_ratio: Number, steps: Number, sieving_coefficient: Number = 1.0) -> Number:
    """Share of a solute that remains after discontinuous diafiltration.

    Each step adds water, r times the volume, and then removes as much permeate in a well mixed batch.
    """
    return np.exp(-sieving_coefficient * steps * np.log1p(dilution_ratio))


@worksheet_function(
    result="concentration",
    equation="C_opt = C_g/e",
    source=NG,
)
def diafiltration_optimum(gel_concentration: Number) -> Number:
    """Product concentration at which diafiltration takes the least time, by the gel model.

    For a product fully retained, an impurity of constant sieving coefficient and a flux k ln(C_g/C) that the
    pressure does not limit: C·J(C) is highest there, whatever k. The time to concentrate to it is not
    counted.
    """
    return gel_concentration / math.e


@worksheet_function(
    result="concentration",
    equation="C·J(C) is highest; J linear in ln C between the measured points",
    source=f"{NG}; interpolation of this library",
    cautions=[Rule(lambda concentration, result: (
                      not 1.000001 * min(concentration) < result < 0.999999 * max(concentration)),
                   "the optimum is at an end of the measured range; the true one may lie outside")],
    dimensional="search over measured points",
)
def diafiltration_optimum_table(concentration: Column, flux: Column) -> float:
    """Product concentration at which diafiltration takes the least time, from measured fluxes.

    For a product fully retained: the highest C·J(C) within the measured range, J joined by straight lines on
    ln C. Points in any order.
    """
    law = measured_law(concentration, flux)
    candidates = list(law.logs)
    for piece, (left, right) in enumerate(zip(law.logs, law.logs[1:])):
        fall = -law.slope(piece)
        if fall > 0:  # C·J is stationary where J = −dJ/d ln C
            log = right - (fall - law.fluxes[piece + 1]) / fall
            candidates += [log] if left < log < right else []
    best = max(candidates, key=lambda log: math.exp(log) * law.flux(log))
    return law.reference * math.exp(best)


# --- time ---------------------------------------------------------------------------------------------------

DIAFILTRATED = replace(quantity("volume"), meaning="Volume of the retentate, held constant")
AT_START = "Concentration of the retained solute at the start"
WASHED_OUT = "Sieving coefficient of the solute that limits the flux"


def _ends_above_clean_water(concentration, diavolumes, mass_transfer_coefficient, gel_concentration,
                            sieving_coefficient, maximum_flux) -> bool:
    final = concentration * math.exp(-sieving_coefficient * diavolumes)
    flux = gel_flux(final, mass_transfer_coefficient, gel_concentration, None)
    return maximum_flux is None and flux > HIGH_FLUX


@worksheet_function(
    result=PROCESS_TIME,
    equation="t = (V/A) ∫ dn/J(C e^(−S n)), n from 0 to N, J = min(J_max, k ln(C_g/C))",
    source=f"balance at constant volume with the {GEL_MODEL}; {FOLEY}",
    arguments={"volume": DIAFILTRATED, "concentration": AT_START, "sieving_coefficient": WASHED_OUT},
    default_texts=NO_MAXIMUM,
    refuses=[
        NO_TRANSFER,
        Rule(lambda concentration, maximum_flux: concentration == 0 and maximum_flux is None,
             "{concentration}: the gel model sets no limit to the flux without solute; give maximum_flux"),
        Rule(lambda concentration, gel_concentration: (
                concentration >= gel_concentration * (1 - GEL_CLEARANCE)),
             "{concentration} is not below {gel_concentration}: there is no flux"),
    ],
    cautions=[Rule(_ends_above_clean_water,
                   "the gel model's flux rises above 200 L/(m²·h), more than most membranes pass of clean "
                   "water (common practice, no source): give maximum_flux")],
    dimensional="numerical integration",
)
def diafiltration_time(
    volume: Number,
    concentration: Number,
    diavolumes: Number,
    area: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    sieving_coefficient: Number = 0.0,
    maximum_flux: Number | None = None,
) -> Number:
    """Time of a diafiltration at constant volume, by the gel model.

    The concentration is that of the retained solute, which limits the flux; with a sieving coefficient above
    0 it washes out and the flux rises. Well mixed, at constant crossflow and temperature.
    """
    return volume / area * elementwise(
        diavolumes_over_flux, concentration, diavolumes, mass_transfer_coefficient, gel_concentration,
        sieving_coefficient, maximum_flux)


@worksheet_function(
    result=PROCESS_TIME,
    equation="t = (V/A) ∫ dn/J(C e^(−S n)), n from 0 to N, J linear in ln C between the measured points",
    source=f"balance at constant volume on measured fluxes; {CHERYAN}",
    arguments={"volume": DIAFILTRATED, "feed_concentration": AT_START, "sieving_coefficient": WASHED_OUT,
               **POINTS},
    refuses=[
        BELOW_MEASURED,
        ABOVE_MEASURED,
        Rule(lambda feed_concentration, diavolumes, sieving_coefficient, concentration: (
                feed_concentration * math.exp(-sieving_coefficient * diavolumes)
                < min(concentration) * (1 - END_SLACK)),
             "the solute washes out below the lowest measured concentration; the flux is not extrapolated"),
        NO_MEASURED_FLUX,
    ],
    dimensional="numerical integration",
)
def diafiltration_time_table(
    volume: Number,
    feed_concentration: Number,
    diavolumes: Number,
    area: Number,
    concentration: Column,
    flux: Column,
    sieving_coefficient: Number = 0.0,
) -> Number:
    """Time of a diafiltration at constant volume, from measured fluxes.

    The flux is joined by straight lines on ln C and not extrapolated; the points, in any order, are of the
    crossflow, pressure and temperature of the diafiltration.
    """
    law = measured_law(concentration, flux)
    return volume / area * elementwise(
        lambda *scalars: _table_diavolumes_over_flux(law, *scalars), feed_concentration, diavolumes,
        sieving_coefficient)


def _table_diavolumes_over_flux(law: FluxLaw, start: float, diavolumes: float, sieving: float) -> float:
    if start == 0:
        return math.nan
    return along(law, law.log(start), -sieving, diavolumes, passed, lambda n: 1.0)


# --- purity -------------------------------------------------------------------------------------------------


@worksheet_function(
    result="diavolumes",
    equation="C_i = C_0i X^R_i e^(−(1−R_i)N); the least N with C_product/Σ C_i = target",
    source=f"balances of each component; {CHERYAN}",
    refuses=[
        Rule(lambda product, feed_concentration: product > len(feed_concentration),
             "{product} is beyond the rows of the feed"),
        Rule(lambda feed_concentration, product: feed_concentration[int(product) - 1] == 0,
             "the feed holds none of the product, {product}"),
        Rule(lambda target_purity: True,
             "{target_purity} is out of reach: the product's share never rises so high, since others are "
             "held back as well or better"),
    ],
    arguments={"product": "Row number of the product in the ranges", "rejection": DONNAN_REJECTION},
    dimensional="root of a sum over components",
)
def diavolumes_purity(
    feed_concentration: Column,
    rejection: Column,
    product: Number,
    concentration_factor: Number,
    target_purity: Number,
) -> Number:
    """Diavolumes until the product's share of total solids reaches the target, after a batch concentration.

    First concentrated by the factor, then diafiltered at constant volume, each component with its own
    constant observed rejection. Where something is held back better than the product the share passes a peak:
    the first crossing counts. A target that is met already takes 0.
    """
    return elementwise(lambda *scalars: _diavolumes_purity(feed_concentration, rejection, *scalars),
                       product, concentration_factor, target_purity)


def _diavolumes_purity(
    feed: np.ndarray, rejection: np.ndarray, product: float, factor: float, target: float
) -> float:
    row = int(product) - 1
    if row >= len(feed) or feed[row] == 0:
        return math.nan
    if target == 0:
        return 0.0
    # The others over the product, Σ w_i e^(−a_i N), is convex in N: it falls to its first crossing, or never.
    others = np.arange(len(feed)) != row
    excess = (rejection[row] - rejection)[others]  # sieving coefficient above the product's
    weight = feed[others] * factor**-excess / feed[row]

    def ratio(n: float) -> float:
        return float(weight @ np.exp(np.minimum(-excess * n, 600.0)))

    def slope(n: float) -> float:
        return -float((weight * excess) @ np.exp(np.minimum(-excess * n, 600.0)))

    wanted = (1.0 - target) / target
    if ratio(0.0) <= wanted * (1.0 + 1e-15):
        return 0.0
    if wanted == 0 or slope(0.0) >= 0:
        return math.nan
    from scipy.optimize import brentq

    high = 1.0
    while ratio(high) > wanted:
        if slope(high) >= 0:  # past the peak, which must then reach the target
            high = brentq(slope, 0.0, high, xtol=1e-14, rtol=1e-15)
            if ratio(high) > wanted:
                return math.nan
            break
        high *= 2.0
        if high > 1e15:  # the share levels off below the target
            return math.nan
    return brentq(lambda n: math.log(ratio(n) / wanted), 0.0, high, xtol=1e-14, rtol=1e-15)
