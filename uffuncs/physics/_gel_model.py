"""Shared by batches, diafiltration and cascades: the integrals of the gel model, and why there is no flux."""

from __future__ import annotations

import math
from dataclasses import replace

from ..declaration import Rule
from ..quantities import quantity
from ._flux_law import END_SLACK, GEL_CLEARANCE, HIGH_FLUX, drained, passed

CHERYAN = "Cheryan, Ultrafiltration and Microfiltration Handbook, 2nd ed., Technomic (1998)"
FOLEY = "Foley, Membrane Filtration: A Problem Solving Approach with MATLAB, Cambridge Univ. Press (2013)"
GEL_MODEL = (
    "gel model: Blatt, Dravid, Michaels & Nelsen, in Flinn (ed.), Membrane Science and Technology, Plenum "
    "(1970) 47, doi 10.1007/978-1-4684-1851-4_4"
)

PROCESS_TIME = replace(quantity("time"), name="process_time", meaning="Process time")
NO_MAXIMUM = {"maximum_flux": "none"}
POINTS = {"concentration": "Concentrations at which the flux was measured", "flux": "Measured fluxes"}


# --- the gel model ------------------------------------------------------------------------------------------


def gel_flux(concentration: float, transfer: float, gel: float, maximum: float | None) -> float:
    """min(maximum, k ln(C_g/C)); NaN where there is no flux, or no limit to it."""
    limit = math.inf if maximum is None else maximum
    if transfer == 0 or concentration >= gel * (1 - GEL_CLEARANCE):
        return math.nan
    if concentration == 0 and limit == math.inf:
        return math.nan
    return min(limit, transfer * math.log(gel / concentration)) if concentration > 0 else limit


def volume_over_flux(
    feed: float, factor: float, transfer: float, gel: float, rejection: float, maximum: float | None
) -> float:
    """A t/V_0 of a batch = ∫ e^(−u)/J du, u = ln(V_0/V) from 0 to ln X; NaN where there is no flux."""
    length, maximum = math.log(factor), math.inf if maximum is None else maximum
    if transfer == 0 or (feed == 0 and maximum == math.inf):
        return math.nan
    if feed == 0:
        return -math.expm1(-length) / maximum
    start = math.log(gel / feed)
    if not start - rejection * length > GEL_CLEARANCE:
        return math.nan
    first, last = transfer * start, transfer * (start - rejection * length)
    # The flux is the highest one up to here, and falls with ln C from there on.
    kink = (
        0.0 if first <= maximum
        else length if last >= maximum
        else length * (first - maximum) / (first - last)
    )
    flat = -math.expm1(-kink) / maximum if kink > 0 else 0.0
    falling = drained(min(first, maximum), min(last, maximum), length - kink) if length > kink else 0.0
    return flat + math.exp(-kink) * falling


def diavolumes_over_flux(
    start: float, diavolumes: float, transfer: float, gel: float, sieving: float, maximum: float | None
) -> float:
    """A t/V of a diafiltration = ∫ dn/J from 0 to N, C = C_0 e^(−S n); NaN where there is no flux."""
    maximum = math.inf if maximum is None else maximum
    if transfer == 0 or (start == 0 and maximum == math.inf):
        return math.nan
    if start == 0:
        return diavolumes / maximum
    distance = math.log(gel / start)
    if not distance > GEL_CLEARANCE:
        return math.nan
    first, last = transfer * distance, transfer * (distance + sieving * diavolumes)
    # The solute washes out, the flux rises, and from here on the pressure limits it.
    kink = (
        diavolumes if last <= maximum
        else 0.0 if first >= maximum
        else diavolumes * (maximum - first) / (last - first)
    )
    rising = passed(min(first, maximum), min(last, maximum), kink) if kink > 0 else 0.0
    flat = (diavolumes - kink) / maximum if kink < diavolumes else 0.0
    return rising + flat


# --- why there is no result, and when to be careful ---------------------------------------------------------


def final_concentration(feed_concentration, concentration_factor, rejection):
    return feed_concentration * concentration_factor**rejection


NO_TRANSFER = Rule(
    lambda mass_transfer_coefficient: mass_transfer_coefficient == 0,
    "{mass_transfer_coefficient}: the gel model has no flux",
)
NO_SOLUTE = Rule(
    lambda feed_concentration, maximum_flux: feed_concentration == 0 and maximum_flux is None,
    "{feed_concentration}: the gel model sets no limit to the flux without solute; give maximum_flux",
)
AT_GEL = Rule(
    lambda feed_concentration, gel_concentration: (
        feed_concentration >= gel_concentration * (1 - GEL_CLEARANCE)),
    "{feed_concentration} is not below {gel_concentration}: there is no flux",
)
GEL_REACHED = Rule(
    lambda feed_concentration, concentration_factor, rejection, gel_concentration: (
        final_concentration(feed_concentration, concentration_factor, rejection)
        >= gel_concentration * (1 - GEL_CLEARANCE)),
    "the flux falls to 0: the concentration reaches {gel_concentration} before {concentration_factor}",
)
GEL_REFUSALS = [NO_TRANSFER, NO_SOLUTE, AT_GEL, GEL_REACHED]

ABOVE_CLEAN_WATER = Rule(
    lambda feed_concentration, mass_transfer_coefficient, gel_concentration, maximum_flux: (
        maximum_flux is None
        and gel_flux(feed_concentration, mass_transfer_coefficient, gel_concentration, None) > HIGH_FLUX),
    "the gel model's flux at {feed_concentration} is above 200 L/(m²·h), more than most membranes pass of "
    "clean water (common practice, no source): give maximum_flux",
)

BELOW_MEASURED = Rule(
    lambda feed_concentration, concentration: feed_concentration < min(concentration) * (1 - END_SLACK),
    "{feed_concentration} is below the lowest measured concentration; the flux is not extrapolated",
)
ABOVE_MEASURED = Rule(
    lambda feed_concentration, concentration: feed_concentration > max(concentration) * (1 + END_SLACK),
    "{feed_concentration} is above the highest measured concentration; the flux is not extrapolated",
)
NO_MEASURED_FLUX = Rule(
    lambda flux: min(flux) <= 0,
    "the measured flux falls to 0 within the range of concentrations",
)
