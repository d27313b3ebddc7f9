"""Concentration polarization: film model, gel model and its fit, critical flux."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import NotAvailable
from ..quantities import quantity
from ._line import Line, fit_line

FILM = ("Brian, Mass transport in reverse osmosis, in Merten (ed.), Desalination by Reverse Osmosis, "
        "MIT Press (1966)")
PORTER = ("Porter, Concentration polarization with membrane ultrafiltration, "
          "Ind. Eng. Chem. Prod. Res. Dev. 11 (1972) 234")
MICHAELS = "Michaels, New separation technique for the CPI, Chem. Eng. Prog. 64 (1968) no. 12, 31"
BLATT = ("Blatt, Dravid, Michaels & Nelsen, Solute polarization and cake formation in membrane "
         "ultrafiltration: causes, consequences, and control techniques, in Flinn (ed.), Membrane Science "
         "and Technology, Plenum (1970) 47")
GEL_MODEL = f"gel model: {MICHAELS}; {BLATT}"
FIELLER = "Fieller, Some problems in interval estimation, J. R. Stat. Soc. B 16 (1954) 175"
FIELD = ("Field, Wu, Howell & Gupta, Critical flux concept for microfiltration fouling, "
         "J. Membr. Sci. 100 (1995) 259")
LE_CLECH = ("Le Clech, Jefferson, Chang & Judd, Critical flux determination by the flux-step method in a "
            "submerged membrane bioreactor, J. Membr. Sci. 227 (2003) 81")

PERMEATE_VISCOSITY = "Dynamic viscosity of the permeate, at the membrane's temperature"
LARGEST_EXPONENT = 709.0  # e^709 is still a number

NO_TRANSFER = Rule(lambda mass_transfer_coefficient: mass_transfer_coefficient == 0,
                   "the mass-transfer coefficient is 0: the polarization has no limit")
OVERFLOW = Rule(
    lambda flux, mass_transfer_coefficient: flux > LARGEST_EXPONENT * mass_transfer_coefficient,
    "{flux} is so far above {mass_transfer_coefficient} that the concentration is too large a number")


def _more_in_permeate(permeate_concentration, bulk_concentration) -> bool:
    return permeate_concentration > bulk_concentration


# --- film ---------------------------------------------------------------------------------------------------


@worksheet_function(
    result="polarization_modulus",
    equation="C_w/C_b = 1/(R e^(−J/k) + 1 − R)",
    source=f"film theory: {FILM}",
    refuses=[NO_TRANSFER, OVERFLOW],
)
def polarization_modulus(
    flux: Number, mass_transfer_coefficient: Number, intrinsic_rejection: Number = 1.0
) -> Number:
    """Concentration at the membrane surface over that in the bulk.

    Stagnant film, steady and one-dimensional, with constant properties; R is the rejection at the surface,
    1 − C_p/C_w. At a large J/k the modulus goes to 1/(1 − R), and grows without limit where R is 1. A local
    value: the modulus of a module's mean flux is not the mean of its moduli.
    """
    passed = 1.0 - intrinsic_rejection
    if type(flux) is float and type(mass_transfer_coefficient) is float and type(passed) is float:
        if mass_transfer_coefficient == 0.0:
            return math.nan
        left = intrinsic_rejection * math.exp(-flux / mass_transfer_coefficient) + passed
        return 1.0 / left if left > 0.0 else math.inf
    with np.errstate(divide="ignore", invalid="ignore"):
        modulus = 1.0 / (intrinsic_rejection * np.exp(-flux / mass_transfer_coefficient) + passed)
    return np.where(mass_transfer_coefficient > 0, modulus, np.nan)[()]


@worksheet_function(
    result=replace(quantity("surface_concentration"), low=-1e300, high=1e300),
    equation="C_w = C_p + (C_b − C_p) e^(J/k)",
    source=f"film theory: {FILM}; {PORTER}",
    refuses=[NO_TRANSFER,
             Rule(_more_in_permeate, "{permeate_concentration} is above {bulk_concentration}: at this flux "
                                     "the surface concentration would be negative"),
             OVERFLOW],
    cautions=[Rule(_more_in_permeate, "the permeate is more concentrated than the bulk")],
)
def surface_concentration(
    flux: Number,
    mass_transfer_coefficient: Number,
    bulk_concentration: Number,
    permeate_concentration: Number = 0.0,
) -> Number:
    """Concentration at the membrane surface, from flux and permeate concentration.

    Stagnant film with constant properties. A value above the solute's solubility or gel concentration says
    that the film model alone does not hold.
    """
    retained = bulk_concentration - permeate_concentration
    if type(flux) is float and type(mass_transfer_coefficient) is float and type(retained) is float:
        if mass_transfer_coefficient == 0.0:
            return math.nan
        ratio = flux / mass_transfer_coefficient
        rise = math.exp(ratio) if ratio <= LARGEST_EXPONENT else math.inf
        surface = permeate_concentration + (retained * rise if retained != 0.0 else 0.0)
        return surface if surface >= 0.0 else math.nan
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = flux / mass_transfer_coefficient
        rise = np.where(ratio <= LARGEST_EXPONENT, np.exp(np.minimum(ratio, LARGEST_EXPONENT)), np.inf)
        # Where nothing is retained, C_w = C_p, however large e^(J/k).
        surface = permeate_concentration + retained * np.where(retained != 0, rise, 1.0)
    return np.where((mass_transfer_coefficient > 0) & (surface >= 0), surface, np.nan)[()]


def _film_flux(transfer: Number, surface: Number, bulk: Number, permeate: Number) -> Number:
    """k ln((C_w − C_p)/(C_b − C_p)), exact also where C_w is near C_b; NaN where that is no logarithm."""
    above, retained = surface - bulk, bulk - permeate
    if type(above) is float and type(retained) is float:
        if retained == 0.0 or above / retained <= -1.0:
            return math.nan
        return transfer * math.log1p(above / retained)
    share = above / np.where(retained != 0, retained, np.nan)
    return transfer * np.log1p(np.where(share > -1, share, np.nan))[()]


@worksheet_function(
    result=replace(quantity("flux"), low=-1e300),
    equation="J = k ln[(C_w − C_p)/(C_b − C_p)]",
    source=f"film theory: {FILM}; {PORTER}",
    refuses=[
        Rule(lambda bulk_concentration, permeate_concentration: bulk_concentration == permeate_concentration,
             "{bulk_concentration} equals {permeate_concentration}: nothing is retained, any flux would do"),
        Rule(lambda surface_concentration, bulk_concentration, permeate_concentration:
             min(surface_concentration, bulk_concentration) <= permeate_concentration
             <= max(surface_concentration, bulk_concentration),
             "{permeate_concentration} is not below both {surface_concentration} and {bulk_concentration}"),
    ],
    cautions=[
        Rule(_more_in_permeate, "the permeate is more concentrated than the bulk"),
        Rule(lambda result: result < 0,
             "the flux is negative, towards the feed: {surface_concentration} against {bulk_concentration}"),
    ],
)
def flux_film(
    mass_transfer_coefficient: Number,
    surface_concentration: Number,
    bulk_concentration: Number,
    permeate_concentration: Number = 0.0,
) -> Number:
    """Flux at which the membrane surface has a given concentration.

    Stagnant film with constant properties; the inverse of surface_concentration.
    """
    return _film_flux(
        mass_transfer_coefficient, surface_concentration, bulk_concentration, permeate_concentration)


# --- gel model ----------------------------------------------------------------------------------------------

NO_SOLUTE = Rule(lambda bulk_concentration: bulk_concentration == 0,
                 "the bulk concentration is 0: nothing limits the flux")
ABOVE_GEL = Rule(lambda bulk_concentration, gel_concentration: bulk_concentration > gel_concentration,
                 "{bulk_concentration} is above {gel_concentration}: the bulk would be gel")


def _limiting(transfer: Number, gel: Number, bulk: Number, permeate: Number = 0.0) -> Number:
    """Limiting flux; NaN above the gel concentration and where nothing is retained."""
    flux = _film_flux(transfer, gel, bulk, permeate)
    if type(flux) is float:
        return flux if permeate < bulk <= gel else math.nan
    return np.where((permeate < bulk) & (bulk <= gel), flux, np.nan)[()]


@worksheet_function(
    result="limiting_flux",
    equation="J_lim = k ln[(C_g − C_p)/(C_b − C_p)]",
    source=GEL_MODEL,
    refuses=[
        NO_SOLUTE,
        ABOVE_GEL,
        Rule(lambda permeate_concentration, bulk_concentration: permeate_concentration >= bulk_concentration,
             "{permeate_concentration} is not below {bulk_concentration}: nothing is retained"),
    ],
)
def flux_limiting(
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    bulk_concentration: Number,
    permeate_concentration: Number = 0.0,
) -> Number:
    """Limiting flux of the gel model, which more pressure does not raise.

    The surface is at the gel concentration, and the gel thickens until the flux is what the film lets back.
    C_g is where a measured line of J on ln C_b meets zero flux (gel_fit): a number of solute, membrane and
    crossflow more than of the solute alone. Protein gels lie at 10 to 50 % by mass (common practice, no
    source). A bulk at the gel concentration has no flux.
    """
    return _limiting(mass_transfer_coefficient, gel_concentration, bulk_concentration, permeate_concentration)


def _darcy(transmembrane_pressure, viscosity, membrane_resistance, fouling_resistance):
    return transmembrane_pressure / (viscosity * (membrane_resistance + fouling_resistance))


def _by_pressure(result, transmembrane_pressure, viscosity, membrane_resistance, fouling_resistance) -> bool:
    darcy = _darcy(transmembrane_pressure, viscosity, membrane_resistance, fouling_resistance)
    return result >= (1 - 1e-12) * darcy  # the result comes back from the worksheet unit


def _by_gel(result, transmembrane_pressure, viscosity, membrane_resistance, fouling_resistance) -> bool:
    conditions = transmembrane_pressure, viscosity, membrane_resistance, fouling_resistance
    return not _by_pressure(result, *conditions)


@worksheet_function(
    result="flux",
    equation="J = min{Δp_tm/[µ (R_m + R_f)], k ln(C_g/C_b)}",
    source=GEL_MODEL,
    arguments={"viscosity": PERMEATE_VISCOSITY},
    refuses=[ABOVE_GEL],
    remarks=[Rule(_by_pressure, "pressure-controlled: Darcy's flux is the lesser"),
             Rule(_by_gel, "limiting: more pressure does not raise the flux")],
)
def flux_gel(
    transmembrane_pressure: Number,
    viscosity: Number,
    membrane_resistance: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    bulk_concentration: Number,
    fouling_resistance: Number = 0.0,
) -> Number:
    """Flux by the gel model: the lesser of Darcy's flux and the limiting flux.

    Full rejection, no osmotic pressure; the measured curve bends gradually between the two branches and lies
    below both. Without solute it is Darcy's flux, with a bulk at the gel concentration 0.
    """
    darcy = _darcy(transmembrane_pressure, viscosity, membrane_resistance, fouling_resistance)
    limit = _limiting(mass_transfer_coefficient, gel_concentration, bulk_concentration)
    if type(darcy) is float and type(limit) is float:
        if bulk_concentration == 0.0:
            return darcy
        return limit if math.isnan(limit) else min(darcy, limit)
    return np.where(bulk_concentration > 0, np.minimum(darcy, limit), darcy)[()]


@worksheet_function(
    result="transmembrane_pressure",
    equation="Δp_tm = x k ln(C_g/C_b) µ (R_m + R_f)",
    source=f"{GEL_MODEL}; 0.9 of the limiting flux: common practice, no source",
    arguments={"viscosity": PERMEATE_VISCOSITY},
    refuses=[NO_SOLUTE, ABOVE_GEL],
)
def pressure_knee(
    viscosity: Number,
    membrane_resistance: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    bulk_concentration: Number,
    fraction: Number = 0.9,
    fouling_resistance: Number = 0.0,
) -> Number:
    """Pressure at which Darcy's flux reaches a given share of the limiting flux.

    Below it pressure pays, above it it mostly compacts the gel. Full rejection and no osmotic pressure, as in
    flux_gel: the measured flux at this pressure is lower than the share, because the curve bends.
    """
    limit = _limiting(mass_transfer_coefficient, gel_concentration, bulk_concentration)
    return fraction * limit * viscosity * (membrane_resistance + fouling_resistance)


def _gel_line(bulk_concentration: np.ndarray, flux: np.ndarray) -> tuple[float, Line]:
    """Mean of ln C_b, and the line of J on ln C_b less that mean."""
    if np.any(bulk_concentration <= 0):
        row = int(np.argmin(bulk_concentration)) + 1
        raise NotAvailable(f"the bulk concentration is 0 in row {row}; leave the row out")
    logs = np.log(bulk_concentration)
    return float(logs.mean()), fit_line(logs - logs.mean(), flux, "bulk concentration")


def _fieller(line: Line, points: int) -> tuple[float, float]:
    """95 % interval of the x at which a line over centred x is 0; NaN where the interval has no end."""
    from scipy.special import stdtrit

    spread = float(stdtrit(points - 2, 0.975)) ** 2
    slope_variance, level_variance = line.slope_error**2, line.intercept_error**2
    square = line.slope**2 - spread * slope_variance
    if square <= 0.0:
        return math.nan, math.nan
    # The x for which (level + slope x)² does not exceed t² times its variance.
    half = (spread * (square * level_variance + line.intercept**2 * slope_variance)) ** 0.5
    product = -line.slope * line.intercept
    return (product - half) / square, (product + half) / square


def _endless(bulk_concentration, flux) -> bool:
    return math.isnan(_fieller(_gel_line(bulk_concentration, flux)[1], len(flux))[0])


@worksheet_function(
    results=[
        "mass_transfer_coefficient",
        "gel_concentration",
        replace(quantity("standard_error"), unit="L/(m²·h)", meaning="Standard error of k"),
        replace(quantity("standard_error"), unit="g/L", meaning="Standard error of C_g"),
        "coefficient_of_determination",
        replace(quantity("gel_concentration"), meaning="Lower end of the 95 % interval of C_g"),
        replace(quantity("gel_concentration"), meaning="Upper end of the 95 % interval of C_g"),
    ],
    equation="least squares of J = k (ln C_g − ln C_b); interval of ln C_g by Fieller's theorem",
    source=f"{GEL_MODEL}; interval: {FIELLER}",
    refuses=[Rule(_endless, "the slope does not differ from 0 at 95 %: the interval of the gel concentration "
                            "has no end")],
    dimensional="takes the logarithm of a concentration",
)
def gel_fit(bulk_concentration: Column, flux: Column) -> tuple:
    """Mass-transfer coefficient and gel concentration from limiting fluxes at several bulk concentrations.

    One row: k, C_g, their standard errors, r², and the 95 % interval of C_g. Straight line of J on ln C_b,
    all points of one weight, extrapolated to zero flux. Only points in the limiting region, at one crossflow
    and temperature; three or more. The interval is Fieller's, which is right for such an inverse prediction
    with normal errors of the flux: it is not symmetric, and without an end (#NUM! in its two cells) where the
    slope does not differ from 0 at 95 %. The standard error of C_g is of first order.
    """
    mean, line = _gel_line(bulk_concentration, flux)
    if line.slope >= 0:
        raise NotAvailable("the flux does not fall as the bulk concentration rises: no gel concentration")
    zero = -line.intercept / line.slope
    error = (line.intercept_error**2 + (zero * line.slope_error) ** 2) ** 0.5 / -line.slope
    with np.errstate(over="ignore"):
        gel, low, high = np.exp(np.array([zero, *_fieller(line, len(flux))]) + mean)
    return -line.slope, gel, line.slope_error, gel * error, line.r_squared, low, high


# --- critical flux ------------------------------------------------------------------------------------------


@worksheet_function(
    result=replace(quantity("flux"), name="critical_flux", symbol="J_c", meaning="Critical flux of the test"),
    equation="last J before Δp_tm > (1 + t) a J, a = Σ J Δp_tm/Σ J² of the steps before",
    source=f"critical flux: {FIELD}; flux-step test: {LE_CLECH}; "
           "line through the origin and tolerance: common practice, no source",
    arguments={"tolerance": "Excess of the pressure over the line that counts as fouling, relative"},
    cautions=[Rule(lambda flux, transmembrane_pressure: bool(np.any(transmembrane_pressure[flux == 0] > 0)),
                   "there is a pressure at no flux: take static head and osmotic pressure off first")],
    dimensional="searches through the steps of a test",
)
def critical_flux(flux: Column, transmembrane_pressure: Column, tolerance: Number = 0.05) -> Number:
    """Critical flux from a flux-step test: the last step before the pressure leaves the line of those before.

    A working rule of common practice, not a definition: from the third step on, a line through the origin is
    fitted by least squares to all earlier steps, and the first step whose pressure exceeds it by more than
    the tolerance ends the search. The first two steps are taken to be free of fouling. The rule finds the
    flux up to which pressure and flux are proportional, whatever the slope; a slope above that of water (the
    weak form of the critical flux) shows only beside a water test. The result lies on a step, and depends on
    the height and length of the steps and on the tolerance. One row a step, the flux rising, with the
    pressure at the step's end, less static head and osmotic pressure. If no step leaves the line, the
    critical flux is above the test: #N/A.
    """
    j, p = flux[flux > 0], transmembrane_pressure[flux > 0]
    if len(j) < 3:
        raise NotAvailable(f"{len(j)} steps with a flux above 0; the test needs three or more")
    if (back := np.flatnonzero(np.diff(j) <= 0)).size:
        step = int(back[0]) + 1
        raise NotAvailable(f"the flux does not rise from step {step} to step {step + 1}; give rising steps")
    line = np.cumsum(j * p)[1:-1] / np.cumsum(j * j)[1:-1]
    if line[0] == 0:
        raise NotAvailable("the pressure of the first two steps is 0: there is no line to compare with")
    # The highest excess so far: it finds the first step above each of several tolerances.
    excess = np.maximum.accumulate(p[2:] / (line * j[2:]) - 1.0)
    last = 1 + np.searchsorted(excess, tolerance + 1e-9, side="right")
    if np.ndim(last) == 0 and last == len(j) - 1:
        highest = quantity("flux").shown(j[-1])
        raise NotAvailable(f"no step up to the highest, {highest}, leaves the line of the steps before: the "
                           "critical flux is higher")
    return np.where(last < len(j) - 1, j[last], np.nan)[()]
