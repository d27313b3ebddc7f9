"""Osmotic pressure of a retained solute: from theory, from published fits, fitted to measurements."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import NotAvailable
from ..quantities import quantity
from ._solutes import entry_of, osmotic_fit as published_fit
from .constants import GAS_CONSTANT

VANT_HOFF = "van 't Hoff, Z. phys. Chem. 1 (1887) 481"
MCMILLAN_MAYER = ("McMillan & Mayer, The statistical thermodynamics of multicomponent systems, "
                  "J. Chem. Phys. 13 (1945) 276; Tombs & Peacocke, The Osmotic Pressure of Biological "
                  "Macromolecules, Oxford (1974)")
VILKER = ("Vilker, Colton & Smith, The osmotic pressure of concentrated protein solutions: effect of "
          "concentration and pH in saline solutions of bovine serum albumin, "
          "J. Colloid Interface Sci. 79 (1981) 548")
CARNAHAN_STARLING = ("Carnahan & Starling, Equation of state for nonattracting rigid spheres, "
                     "J. Chem. Phys. 51 (1969) 635")

OSMOTIC_TEMPERATURE = 298.15  # K, the 25 °C of most measurements
HIGHEST_FLUID_FRACTION = 0.49  # hard spheres begin to freeze above this

SOLUTION = {"temperature": "Temperature of the solution"}
NEGATIVE = Rule(lambda result: result < 0,
                "the osmotic pressure is negative: the coefficients do not hold at {concentration}")


@worksheet_function(result="osmotic_pressure", equation="π = R T C/M", source=VANT_HOFF, arguments=SOLUTION)
def osmotic_vant_hoff(
    concentration: Number, molar_mass: Number, temperature: Number = OSMOTIC_TEMPERATURE
) -> Number:
    """Osmotic pressure of a dilute solution.

    The ideal limit: macromolecules exceed it many times at the concentrations at a membrane. For a salt use
    the mean molar mass of its ions.
    """
    return GAS_CONSTANT * temperature * concentration / molar_mass


@worksheet_function(
    result="osmotic_pressure",
    equation="π = R T (C/M + B_2 C² + B_3 C³)",
    source=MCMILLAN_MAYER,
    arguments=SOLUTION,
    cautions=[NEGATIVE],
)
def osmotic_virial(
    concentration: Number,
    molar_mass: Number,
    second_virial_coefficient: Number,
    third_virial_coefficient: Number = 0.0,
    temperature: Number = OSMOTIC_TEMPERATURE,
) -> Number:
    """Osmotic pressure from virial coefficients.

    A series in concentration, cut after the third term: for moderate concentrations. The coefficients belong
    to one pH, salt and temperature.
    """
    higher = concentration * (second_virial_coefficient + concentration * third_virial_coefficient)
    return GAS_CONSTANT * temperature * concentration * (1.0 / molar_mass + higher)


@worksheet_function(
    result="osmotic_pressure",
    equation="π = b_1 C + b_2 C² + b_3 C³",
    source="polynomial through the origin, common practice for measured osmotic pressures",
    cautions=[NEGATIVE],
)
def osmotic_polynomial(
    concentration: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
) -> Number:
    """Osmotic pressure from a fitted polynomial.

    The coefficients belong to one solute, pH, salt, temperature and range of concentration: it does not
    extrapolate. osmotic_fit fits them, osmotic_solute has some published ones.
    """
    higher = concentration * (second_coefficient + concentration * third_coefficient)
    return concentration * (first_coefficient + higher)


@worksheet_function(
    result="osmotic_pressure",
    equation="π = b C^n",
    source="power law, common practice for measured osmotic pressures",
    dimensional="the unit of the coefficient follows the exponent",
)
def osmotic_power(concentration: Number, power_coefficient: Number, exponent: Number) -> Number:
    """Osmotic pressure from a fitted power law.

    The coefficient is in bar/(g/L)ⁿ with the exponent's n. It does not extrapolate; at low concentration only
    n = 1 is right.
    """
    return power_coefficient * concentration**exponent


@worksheet_function(
    result="osmotic_pressure",
    equation="π = R T {2 [(Z C/2M)² + m²]^½ − 2 m} + (R T/M)(C + a_2 C² + a_3 C³)",
    source=VILKER,
    arguments={**SOLUTION, "salt_concentration": "Amount concentration of the 1:1 salt in the permeate"},
    cautions=[NEGATIVE],
)
def osmotic_donnan(
    concentration: Number,
    molar_mass: Number,
    charge_number: Number,
    salt_concentration: Number,
    nonideality_2: Number,
    nonideality_3: Number,
    temperature: Number = OSMOTIC_TEMPERATURE,
) -> Number:
    """Osmotic pressure of a charged protein in a solution of a 1:1 salt.

    The first term is the excess of small ions that the protein's charge holds back (Donnan), the second the
    protein's own with its nonideality. The coefficients belong to one protein, pH and salt; those of the
    source, for serum albumin, are functions of the charge. The sign of the charge does not matter. Salt
    concentration 0 leaves the counter-ions alone. The volume that the protein takes from the salt is not in
    the first term: the fitted coefficients hold it.
    """
    half = abs(charge_number) * concentration / (2.0 * molar_mass)
    # (x² + m²)^½ − m is x tan(½ arctan(x/m)): nothing cancels where x is small against m, and m may be 0
    ions = 2.0 * half * np.tan(0.5 * np.arctan2(half, salt_concentration))
    nonideal = concentration * (nonideality_2 + concentration * nonideality_3)
    return GAS_CONSTANT * temperature * (ions + concentration / molar_mass * (1.0 + nonideal))


@worksheet_function(
    result="osmotic_pressure",
    equation="π = (R T C/M)(1 + φ + φ² − φ³)/(1 − φ)³, φ = C v",
    source=CARNAHAN_STARLING,
    arguments={**SOLUTION,
               "partial_specific_volume": "Volume of the sphere per dry mass; hydrated for a protein"},
    refuses=[Rule(lambda concentration, partial_specific_volume:
                  concentration * partial_specific_volume > HIGHEST_FLUID_FRACTION,
                  "{concentration} at {partial_specific_volume} is a volume fraction above 0.49, where hard "
                  "spheres freeze")],
)
def osmotic_hard_sphere(
    concentration: Number,
    molar_mass: Number,
    partial_specific_volume: Number,
    temperature: Number = OSMOTIC_TEMPERATURE,
) -> Number:
    """Osmotic pressure of hard spheres.

    Repulsion by volume alone, no charge and no attraction: a compact protein at its isoelectric point or in
    much salt. Volume fractions up to 0.49, the fluid branch.
    """
    filling = concentration * partial_specific_volume
    # A hair of slack: 490 g/L at 1 mL/g may come out above 0.49 by rounding.
    filling = np.where(filling <= HIGHEST_FLUID_FRACTION * (1 + 1e-12), filling, np.nan)[()]
    factor = (1.0 + filling * (1.0 + filling * (1.0 - filling))) / (1.0 - filling) ** 3
    return GAS_CONSTANT * temperature * concentration / molar_mass * factor


def _range_of(solute: str) -> tuple[float, float]:
    entry = entry_of(solute, "osmotic_coefficient_1")
    return entry.lowest or 0.0, np.inf if entry.highest is None else entry.highest


def _outside(solute: str, concentration: float) -> bool:
    low, high = _range_of(solute)
    return not low * (1 - 1e-9) <= concentration <= high * (1 + 1e-9)


def _told_outside(solute: str, concentration: float) -> str:
    low, high = _range_of(solute)
    return (f"concentration {concentration:.6g} g/L is outside {low:.6g} to {high:.6g} g/L, "
            f"where the published equation of {solute[:40]} was fitted")


def _told_outside(solute: str, concentration: float) -> str:
    low, high = _range_of(solute)
    return (f"concentration {concentration:.6g} g/L is outside {low:.6g} to {high:.6g} g/L, "
            f"where the published equation of {solute[:40]} was fitted")


@worksheet_function(
    result="osmotic_pressure",
    equation="π = b_1 C + b_2 C² + b_3 C³, with the published coefficients",
    source="one for each solute of the table; UF_WHY tells it",
    names={"solute": "Name of a solute that the table has osmotic coefficients of, such as whey protein"},
    cautions=[Rule(_outside, "the concentration is outside the range of the published fit", _told_outside),
              NEGATIVE],
    remarks=[Rule(lambda solute: True, "the temperature of the fit, and where it comes from",
                  lambda solute: entry_of(solute, "osmotic_coefficient_1").origin)],
    dimensional="coefficients from a table",
)
def osmotic_solute(solute: str, concentration: Number) -> Number:
    """Osmotic pressure of a common solute by a published fit, at the temperature of the fit.

    UF_SOLUTE gives the coefficients, their temperature and range. pH and salt are those of the publication.
    It does not extrapolate.
    """
    return osmotic_polynomial(concentration, *published_fit(solute))


_ORDER = ("first", "second", "third")


@worksheet_function(
    results=[
        *(f"{order}_coefficient" for order in _ORDER),
        *(replace(quantity(f"{order}_coefficient"), name=f"{order}_standard_error", symbol=f"s_{n}", low=0.0,
                  meaning=f"Standard error of the {order} coefficient") for n, order in enumerate(_ORDER, 1)),
        replace(quantity("coefficient_of_determination"), meaning="Share of Σπ² that the fit explains"),
    ],
    columns=lambda terms: (*range(int(terms)), *range(3, 3 + int(terms)), 6),
    equation="π = Σ b_n C^n, n = 1 … terms; Σ(π − π_fit)² least; r² = 1 − Σ(π − π_fit)²/Σπ²",
    source="linear least squares without intercept; r² as in NIST Statistical Reference Datasets, NoInt1",
    dimensional="least squares on scaled numbers",
)
def osmotic_fit(concentration: Column, osmotic_pressure: Column, terms: Number = 3.0) -> tuple:
    """Polynomial through the origin fitted to measured osmotic pressures.

    One row: as many coefficients as terms, as many standard errors, r²; there are no columns for terms left
    out. Every point has the same weight.
    Without an intercept r² is about zero, not about the mean, as certified for such fits: it is near 1 for
    almost any rising data, so look at the standard errors. At least one more point than terms is needed.
    """
    count = int(terms)
    points = len(concentration)
    if points <= count:
        raise NotAvailable(f"{points} points; {count} terms with standard errors need {count + 1} or more")
    different = np.unique(concentration[concentration > 0]).size
    if different < count:
        raise NotAvailable(f"{different} different concentrations above 0; {count} terms need as many")
    total = osmotic_pressure @ osmotic_pressure
    if total == 0:
        raise NotAvailable("every osmotic pressure is 0; there is nothing to fit")
    scale = concentration.max() ** np.arange(1.0, count + 1)
    powers = (concentration / concentration.max())[:, None] ** np.arange(1, count + 1)
    orthogonal, triangle = np.linalg.qr(powers)
    if abs(np.diag(triangle)).min() < 1e-10 * abs(triangle[0, 0]):
        raise NotAvailable(f"the concentrations lie too close together for {count} terms")
    inverse = np.linalg.inv(triangle)
    coefficients = inverse @ (orthogonal.T @ osmotic_pressure)
    rest = osmotic_pressure - powers @ coefficients
    variance = rest @ rest / (points - count)
    errors = np.sqrt(variance * (inverse**2).sum(axis=1))
    return *(coefficients / scale), *(errors / scale), 1.0 - rest @ rest / total
