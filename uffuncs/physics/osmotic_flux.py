"""The osmotic-pressure model: flux and pressure where the osmotic pressure at the membrane grows with the flux."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import UffuncsError
from ..quantities import quantity
from ._flux_laws import (
    polynomial_one, polynomial_rows, polynomial_solutions, power_one, power_rows, table_one, table_rows, table_solutions,
    without_osmosis,
)
from ._osmotic_table import osmotic_table
from .polarization import FILM, polarization_modulus

TOPIC = "polarization"

GOLDSMITH = "Goldsmith, Macromolecular ultrafiltration with microporous membranes, Ind. Eng. Chem. Fundam. 10 (1971) 113"
VILKER = "Vilker, Colton & Smith, Concentration polarization in protein ultrafiltration, AIChE J. 27 (1981) 632"
JONSSON = ("Jonsson, Boundary layer phenomena during ultrafiltration of dextran and whey protein solutions, "
           "Desalination 51 (1984) 61")
WIJMANS = ("Wijmans, Nakao & Smolders, Flux limitation in ultrafiltration: osmotic pressure model and gel layer model, "
           "J. Membr. Sci. 20 (1984) 115")
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


def _rows(function, *values, **fixed):
    """A function of one-dimensional arrays of one size, over arguments that broadcast."""
    grids = np.broadcast_arrays(*values)
    columns = [np.array(g, float).reshape(-1) for g in grids]
    with np.errstate(all="ignore"):
        return function(*columns, **fixed).reshape(grids[0].shape)[()]


def _no_transfer(permeability, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection, reflection_coefficient):
    return mass_transfer_coefficient == 0 and not without_osmosis(
        bulk_concentration, permeability, intrinsic_rejection, reflection_coefficient)


NO_TRANSFER = Rule(_no_transfer, "the mass-transfer coefficient is 0: the surface concentration has no limit")
NO_FLUX = Rule(lambda result, permeability: result == 0 and permeability > 0,
               "the flux is 0: {transmembrane_pressure} does not exceed the osmotic pressure difference at no flux; "
               "water would flow back")


def _surface(flux, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection):
    if bulk_concentration == 0:
        return 0.0
    return bulk_concentration * polarization_modulus(flux, mass_transfer_coefficient, intrinsic_rejection)


DENSE_SURFACE = Rule(
    lambda result, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection:
    _surface(result, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection) > DENSE,
    "the surface concentration is above 1000 g/L, outside of any fit of an osmotic pressure")


def _falls(surface, first, second, third) -> bool:
    """Whether π = b_1 c + b_2 c² + b_3 c³ falls anywhere from 0 to the surface concentration."""
    points = [0.0, surface]
    if third > 0 and 0 < -second / (3 * third) < surface:
        points.append(-second / (3 * third))
    return min(first + c * (2 * second + 3 * third * c) for c in points) < 0


FALLING = Rule(
    lambda result, mass_transfer_coefficient, bulk_concentration, first_coefficient, second_coefficient, third_coefficient,
    intrinsic_rejection: _falls(_surface(result, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection),
                                first_coefficient, second_coefficient, third_coefficient),
    "the osmotic polynomial falls somewhere between 0 and the surface concentration: outside of any sensible fit")


def _count(
    transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration, first_coefficient,
    second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient,
):
    return polynomial_solutions(
        transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration, first_coefficient,
        second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient)


def _several(
    transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration, first_coefficient,
    second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient,
):
    return _count(transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration, first_coefficient,
                  second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient) > 1
