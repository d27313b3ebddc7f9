"""The osmotic-pressure model: flux and pressure where the osmotic pressure at the surface counts."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..quantities import quantity
from ._flux_laws import (
    difference_coefficients,
    polynomial_one,
    polynomial_rows,
    power_one,
    power_rows,
    several_by_polynomial,
    several_by_table,
    table_one,
    table_rows,
)
from ._osmotic_table import OsmoticTable
from .polarization import FILM, polarization_modulus

TOPIC = "polarization"

GOLDSMITH = ("Goldsmith, Macromolecular ultrafiltration with microporous membranes, "
             "Ind. Eng. Chem. Fundam. 10 (1971) 113")
VILKER = ("Vilker, Colton & Smith, Concentration polarization in protein ultrafiltration, "
          "AIChE J. 27 (1981) 632")
JONSSON = ("Jonsson, Boundary layer phenomena during ultrafiltration of dextran and whey protein solutions, "
           "Desalination 51 (1984) 61")
WIJMANS = ("Wijmans, Nakao & Smolders, Flux limitation in ultrafiltration: osmotic pressure model and gel "
           "layer model, J. Membr. Sci. 20 (1984) 115")
FRITSCH_BUTLAND = ("Fritsch & Butland, A method for constructing local monotone piecewise cubic "
                   "interpolants, SIAM J. Sci. Stat. Comput. 5 (1984) 300")
SOURCE = f"osmotic-pressure model: {GOLDSMITH}; {VILKER}; {JONSSON}; {WIJMANS}; film theory: {FILM}"
EQUATION = "J = L_p {Δp_tm − σ [π(C_w) − π(C_p)]}, C_w = C_b/(R e^(−J/k) + 1 − R), C_p = (1 − R) C_w, "
ITERATIVE = "solved by iteration on plain numbers"

#: 1000 g/L, above which no osmotic pressure was ever fitted (common practice, no source).
DENSE = 1000.0


def _floats(values) -> bool:
    for value in values:
        if type(value) is not float:
            return False
    return True


def _rows(function, *values):
    """A function of one-dimensional arrays of one size, over arguments that broadcast."""
    grids = np.broadcast_arrays(*values)
    with np.errstate(all="ignore"):
        return function(*(np.array(g, float).reshape(-1) for g in grids)).reshape(grids[0].shape)[()]


# --- reasons and cautions -----------------------------------------------------------------------------------


def without_osmosis(bulk, permeability, rejection, reflection):
    """Where no osmotic pressure can act, whatever the mass transfer."""
    return (bulk == 0.0) | (permeability == 0.0) | (rejection == 0.0) | (reflection == 0.0)


def _no_transfer(
    permeability, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection, reflection_coefficient
) -> bool:
    return mass_transfer_coefficient == 0 and not without_osmosis(
        bulk_concentration, permeability, intrinsic_rejection, reflection_coefficient)


def _no_flux(result, permeability, bulk_concentration, intrinsic_rejection, reflection_coefficient) -> bool:
    return result == 0 and not without_osmosis(
        bulk_concentration, permeability, intrinsic_rejection, reflection_coefficient)


def _surface(flux, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection):
    if bulk_concentration == 0:
        return 0.0
    return bulk_concentration * polarization_modulus(flux, mass_transfer_coefficient, intrinsic_rejection)


def _dense(result, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection) -> bool:
    return _surface(result, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection) > DENSE


def _falls_below(surface, first, second, third) -> bool:
    """Whether π = b_1 c + b_2 c² + b_3 c³ falls anywhere from 0 to the surface concentration."""
    vertex = min(max(-second / (3 * third), 0.0), surface) if third > 0 else 0.0
    return min(first + c * (2 * second + 3 * third * c) for c in (0.0, vertex, surface)) < 0


def _falls(
    result, mass_transfer_coefficient, bulk_concentration, first_coefficient, second_coefficient,
    third_coefficient, intrinsic_rejection,
) -> bool:
    surface = _surface(result, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection)
    return _falls_below(surface, first_coefficient, second_coefficient, third_coefficient)


def _negative(first_coefficient, second_coefficient, third_coefficient) -> bool:
    return min(first_coefficient, second_coefficient, third_coefficient) < 0


NO_TRANSFER = Rule(_no_transfer, "the mass-transfer coefficient is 0: the surface concentration has no limit")
NO_FLUX = Rule(_no_flux, "the flux is 0: {transmembrane_pressure} does not exceed the osmotic pressure "
                         "difference at no flux; water would flow back")
FALLING_TEXT = ("the osmotic polynomial falls between 0 and the surface concentration: outside of any "
                "sensible fit")
DENSE_TEXT = "the surface concentration is above 1000 g/L: outside of any fit of an osmotic pressure"


# --- flux ---------------------------------------------------------------------------------------------------


@worksheet_function(
    result="flux",
    equation=EQUATION + "π = b_1 c + b_2 c² + b_3 c³",
    source=SOURCE,
    refuses=[
        NO_TRANSFER,
        Rule(several_by_polynomial,
             "several fluxes up to that of pure water solve the equation, because the osmotic polynomial "
             "falls somewhere; fit it with coefficients of 0 or above"),
        Rule(_negative, "no flux up to that of pure water solves the equation, because the osmotic "
                        "polynomial is negative at the surface"),
    ],
    cautions=[NO_FLUX, Rule(_falls, FALLING_TEXT), Rule(_dense, DENSE_TEXT)],
    dimensional=ITERATIVE,
)
def flux_osmotic(
    transmembrane_pressure: Number,
    permeability: Number,
    mass_transfer_coefficient: Number,
    bulk_concentration: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    reflection_coefficient: Number = 1.0,
) -> Number:
    """Flux limited by the osmotic pressure at the membrane surface, from an osmotic polynomial.

    Local and steady: one mass-transfer coefficient, one bulk concentration, constant properties in the film,
    no gel, no fouling beyond what the permeability holds; the permeability is that at process temperature.
    The coefficients belong to one temperature, pH and ionic strength, and hold in the range of their fit
    alone, which the function does not know: compare the surface concentration (flux_curve) with the highest
    concentration measured, for proteins usually 200 to 500 g/L. Where the pressure does not exceed the
    osmotic pressure difference at no flux, the flux is 0. With coefficients below 0 several fluxes may solve
    the equation, or none up to that of pure water: then there is no result. The flux is exact to rounding,
    1e-14 of the larger of J and 1e-4 L_p Δp.
    """
    values = (
        transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration,
        first_coefficient, second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient,
    )
    return polynomial_one(*values) if _floats(values) else _rows(polynomial_rows, *values)


@worksheet_function(
    result="flux",
    equation=EQUATION + "π = b cⁿ",
    source=SOURCE,
    refuses=[NO_TRANSFER],
    cautions=[NO_FLUX, Rule(_dense, DENSE_TEXT)],
    dimensional=ITERATIVE,
)
def flux_osmotic_power(
    transmembrane_pressure: Number,
    permeability: Number,
    mass_transfer_coefficient: Number,
    bulk_concentration: Number,
    power_coefficient: Number,
    exponent: Number,
    intrinsic_rejection: Number = 1.0,
    reflection_coefficient: Number = 1.0,
) -> Number:
    """Flux limited by the osmotic pressure at the membrane surface, from an osmotic power law.

    As flux_osmotic. A power law fits macromolecules at high concentrations, with an exponent of 2 or more; it
    is too low where the solution is dilute and π is proportional to c.
    """
    values = (
        transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration,
        power_coefficient, exponent, intrinsic_rejection, reflection_coefficient,
    )
    return power_one(*values) if _floats(values) else _rows(power_rows, *values)


@worksheet_function(
    result="flux",
    equation=EQUATION + "π by monotone interpolation",
    source=f"{SOURCE}; interpolation: {FRITSCH_BUTLAND}",
    arguments={"concentration": "Concentrations of the measured osmotic pressures",
               "osmotic_pressure": "Osmotic pressures measured at these concentrations"},
    refuses=[
        NO_TRANSFER,
        Rule(lambda bulk_concentration, concentration: bulk_concentration > max(concentration),
             "{bulk_concentration} is above the highest concentration of the osmotic table"),
        Rule(several_by_table, "several fluxes up to that of pure water solve the equation, with this table "
                               "and this rejection"),
        Rule(lambda concentration: True,
             "the surface concentration would exceed the highest of the osmotic table; measure further, or "
             "lower the pressure"),
    ],
    cautions=[NO_FLUX],
    dimensional=ITERATIVE,
)
def flux_osmotic_table(
    transmembrane_pressure: Number,
    permeability: Number,
    mass_transfer_coefficient: Number,
    bulk_concentration: Number,
    concentration: Column,
    osmotic_pressure: Column,
    intrinsic_rejection: Number = 1.0,
    reflection_coefficient: Number = 1.0,
) -> Number:
    """Flux limited by the osmotic pressure at the membrane surface, from measured osmotic pressures.

    As flux_osmotic. Monotone cubic interpolation through the points and the origin; the rows may be in any
    order, but no concentration twice, and no osmotic pressure that falls. No extrapolation: where the surface
    would be more concentrated than the table, there is no result. With a rejection below 1 and a table that
    flattens, several fluxes are looked for by a scan of 200 points.
    """
    table = OsmoticTable.of(concentration, osmotic_pressure)
    values = (
        transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration,
        intrinsic_rejection, reflection_coefficient,
    )
    if _floats(values):
        return table_one(*values[:4], table, *values[4:])
    return _rows(lambda *rows: table_rows(*rows[:4], table, *rows[4:]), *values)


# --- pressure and curve -------------------------------------------------------------------------------------


def _difference(surface, first, second, third, rejection):
    """π(C_w) − π(C_p), which keeps its digits where the rejection is small."""
    first, second, third = difference_coefficients(first, second, third, rejection)
    return rejection * surface * (first + surface * (second + surface * third))


def _too_large(flux, mass_transfer_coefficient) -> bool:
    return flux > 100 * mass_transfer_coefficient


def _falls_at(
    flux, mass_transfer_coefficient, bulk_concentration, first_coefficient, second_coefficient,
    third_coefficient, intrinsic_rejection,
) -> bool:
    return _falls(flux, mass_transfer_coefficient, bulk_concentration, first_coefficient, second_coefficient,
                  third_coefficient, intrinsic_rejection)


@worksheet_function(
    result=replace(quantity("transmembrane_pressure"), low=-1e300, high=1e300),
    equation="Δp_tm = J/L_p + σ [π(C_w) − π(C_p)], C_w = C_b/(R e^(−J/k) + 1 − R), C_p = (1 − R) C_w, "
             "π = b_1 c + b_2 c² + b_3 c³",
    source=SOURCE,
    refuses=[
        Rule(lambda permeability: permeability == 0, "the permeability is 0: no pressure gives a flux"),
        NO_TRANSFER,
        Rule(_too_large, "{flux} is so far above {mass_transfer_coefficient} that the osmotic pressure is "
                         "too large a number"),
    ],
    cautions=[
        Rule(_falls_at, FALLING_TEXT),
        Rule(lambda flux, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection:
             _dense(flux, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection), DENSE_TEXT),
    ],
)
def pressure_for_flux(
    flux: Number,
    permeability: Number,
    mass_transfer_coefficient: Number,
    bulk_concentration: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    reflection_coefficient: Number = 1.0,
) -> Number:
    """Transmembrane pressure that a flux takes against the osmotic pressure; the inverse of flux_osmotic.

    Explicit, with the assumptions of flux_osmotic. At no flux it is the osmotic pressure difference of the
    bulk. The pressure rises steeply with the flux; where the surface would reach the solubility or the gel
    concentration, no pressure gives the flux.
    """
    surface = bulk_concentration * polarization_modulus(flux, mass_transfer_coefficient, intrinsic_rejection)
    coefficients = first_coefficient, second_coefficient, third_coefficient
    osmotic = reflection_coefficient * _difference(surface, *coefficients, intrinsic_rejection)
    none = without_osmosis(bulk_concentration, 1.0, intrinsic_rejection, reflection_coefficient)
    if type(osmotic) is float:
        return flux / permeability + (0.0 if none else osmotic)
    return flux / permeability + np.where(none, 0.0 * first_coefficient * bulk_concentration, osmotic)


def _without_flux(
    transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration, first_coefficient,
    second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient,
) -> bool:
    flux = flux_osmotic(
        float(min(transmembrane_pressure)), permeability, mass_transfer_coefficient, bulk_concentration,
        first_coefficient, second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient)
    return _no_flux(flux, permeability, bulk_concentration, intrinsic_rejection, reflection_coefficient)


def _beyond_fit(
    transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration, first_coefficient,
    second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient,
) -> bool:
    osmotic = first_coefficient, second_coefficient, third_coefficient
    flux = flux_osmotic(
        float(max(transmembrane_pressure)), permeability, mass_transfer_coefficient, bulk_concentration,
        *osmotic, intrinsic_rejection, reflection_coefficient)
    surface = _surface(flux, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection)
    return surface > DENSE or _falls_below(surface, *osmotic)


@worksheet_function(
    results=[
        "transmembrane_pressure",
        "flux",
        replace(quantity("surface_concentration"), high=1e300),
        "polarization_modulus",
        replace(quantity("osmotic_pressure"), low=-1e300, high=1e300),
    ],
    equation="for each Δp_tm: J as in flux_osmotic, C_w, C_w/C_b, π(C_w) − π(C_p)",
    source=SOURCE,
    cautions=[
        Rule(_without_flux, "the flux is 0 at the lowest pressure: it does not exceed the osmotic pressure "
                            "difference at no flux"),
        Rule(_beyond_fit, "at the highest pressure the surface concentration is above 1000 g/L, or the "
                          "osmotic polynomial falls below it: outside of any sensible fit"),
    ],
    dimensional=ITERATIVE,
)
def flux_curve(
    transmembrane_pressure: Column,
    permeability: Number,
    mass_transfer_coefficient: Number,
    bulk_concentration: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    reflection_coefficient: Number = 1.0,
) -> tuple:
    """Flux against pressure with the osmotic pressure at the membrane surface, one row a pressure.

    Columns: pressure, flux, surface concentration, polarization modulus, osmotic pressure difference between
    surface and permeate. As flux_osmotic: straight at low pressure, bending where the osmotic pressure takes
    most of what is added. Why a row has no flux, UF_WHY tells of UF_FLUX_OSMOTIC at its pressure.
    """
    osmotic = first_coefficient, second_coefficient, third_coefficient
    flux = flux_osmotic(transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration,
                        *osmotic, intrinsic_rejection, reflection_coefficient)
    with np.errstate(all="ignore"):
        modulus = polarization_modulus(flux, mass_transfer_coefficient, intrinsic_rejection)
        surface = bulk_concentration * modulus if bulk_concentration > 0 else np.zeros_like(flux)
    return transmembrane_pressure, flux, surface, modulus, _difference(surface, *osmotic, intrinsic_rejection)
