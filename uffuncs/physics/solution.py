"""Solutions: viscosity, density, size and diffusion of the solute, Donnan ratio, a table of solutes."""

from __future__ import annotations

from dataclasses import replace
from math import pi

import numpy as np

from ..declaration import Fitted, Number, Rule, worksheet_function
from ..quantities import quantity
from ._solutes import CONDITIONS, PROPERTIES, Entry, entry_of
from .constants import AVOGADRO_CONSTANT, BOLTZMANN_CONSTANT
from .water import LIQUID_RANGE, ROOM_TEMPERATURE, WATER_VISCOSITY_20, water_density

ROSS_MINTON = ("Ross & Minton, Hard quasispherical model for the viscosity of hemoglobin solutions, "
               "Biochem. Biophys. Res. Commun. 76 (1977) 971")
KRIEGER_DOUGHERTY = ("Krieger & Dougherty, A mechanism for non-Newtonian flow in suspensions of rigid "
                     "spheres, Trans. Soc. Rheol. 3 (1959) 137")
TANFORD = "Tanford, Physical Chemistry of Macromolecules, Wiley (1961)"
DEXTRAN_RADIUS = ("Membranes 11 (2021) 331, doi 10.3390/membranes11050331, Table 1, footnote i; "
                  "after Granath & Kvist, J. Chromatogr. 28 (1967) 69")
SINGH = ("Singh, Khulbe, Matsuura & Ramamurthy, Membrane characterization by solute transport and atomic "
         "force microscopy, J. Membr. Sci. 142 (1998) 111")
ERICKSON = ("Erickson, Size and shape of protein molecules at the nanometer level, "
            "Biol. Proced. Online 11 (2009) 32")
EINSTEIN = "Einstein, Ann. Phys. 17 (1905) 549; Sutherland, Phil. Mag. 9 (1905) 781"
YOUNG = ("Young, Carroad & Bell, Estimation of diffusion coefficients of proteins, "
         "Biotechnol. Bioeng. 22 (1980) 947")
POLSON = ("Polson, Some aspects of diffusion in solution and a definition of a colloidal particle, "
          "J. Phys. Colloid Chem. 54 (1950) 649; constant as in Geankoplis, Transport Processes and Unit "
          "Operations, 3rd ed., Prentice Hall (1993), Example 6.4-1")
BOLTON = ("Bolton, Boesch, Basha, LaCasse, Kelley & Acharya, Effect of protein and solution properties on "
          "the Donnan effect during the ultrafiltration of proteins, Biotechnol. Prog. 27 (2011) 140")
STONER = ("Stoner, Fischer, Nie, Buckel, Benke, Austin, Randolph & Kendrick, Protein–solute interactions "
          "affect the outcome of ultrafiltration/diafiltration operations, J. Pharm. Sci. 93 (2004) 2332")

WATER_20 = {"solvent_viscosity": "water 20 °C"}
SOLUTION_TEMPERATURE = "Temperature of the solution"
SOLVENT_VISCOSITY = "Dynamic viscosity of the solvent, at the temperature given"
BOUND_WATER_VOLUME = 1e-3  # m³/kg, the round 1 mL/g of the trade
LARGEST_EXPONENT = 700.0  # e^700 is about the largest number there is

OVERFILLED = Rule(lambda concentration, partial_specific_volume: concentration * partial_specific_volume > 1,
                    "{concentration} at {partial_specific_volume} is more solute than the volume holds")


# --- viscosity and density ----------------------------------------------------------------------------------


@worksheet_function(
    result="viscosity",
    equation="µ = µ_0 exp{[η] C/(1 − (k/ν) [η] C)}",
    source=ROSS_MINTON,
    default_texts=WATER_20,
    refuses=[Rule(lambda concentration, intrinsic_viscosity, crowding_factor:
                  crowding_factor * intrinsic_viscosity * concentration >= 1,
                  "(k/ν) [η] C is 1 or more: at {concentration} the solution no longer flows"),
             Rule(lambda concentration: True,
                  "the viscosity exceeds any number: (k/ν) [η] C is near 1, or [η] C beyond any solution")],
)
def viscosity_ross_minton(
    concentration: Number,
    intrinsic_viscosity: Number,
    crowding_factor: Number,
    solvent_viscosity: Number = WATER_VISCOSITY_20,
) -> Number:
    """Viscosity of a concentrated protein solution.

    Newtonian, at low shear, globular proteins that do not associate; Mooney's equation with [η] C in place
    of 2.5 φ. `crowding_factor` is k/ν, about 0.3 to 0.6 for proteins, best fitted to measured viscosities
    (common practice, no source). Dilute: µ_0 (1 + [η] C).
    """
    dilute = intrinsic_viscosity * concentration
    room = 1.0 - crowding_factor * dilute
    return solvent_viscosity * np.exp(dilute / np.where(dilute <= LARGEST_EXPONENT * room, room, np.nan))


@worksheet_function(
    result="viscosity",
    equation="µ = µ_0 (1 − φ/φ_m)^(−[η]_φ φ_m)",
    source=KRIEGER_DOUGHERTY,
    default_texts=WATER_20,
    refuses=[Rule(lambda volume_fraction, maximum_volume_fraction: volume_fraction >= maximum_volume_fraction,
                  "{volume_fraction} is not below {maximum_volume_fraction}: the suspension no longer flows"),
             Rule(lambda volume_fraction: True,
                  "the viscosity exceeds any number: {volume_fraction} is near the densest packing")],
)
def viscosity_suspension(
    volume_fraction: Number,
    maximum_volume_fraction: Number = 0.64,
    intrinsic_viscosity_number: Number = 2.5,
    solvent_viscosity: Number = WATER_VISCOSITY_20,
) -> Number:
    """Viscosity of a suspension of rigid particles.

    The defaults are random close packing and Einstein's 2.5 for spheres. Suspensions thin with shear: φ_m is
    about 0.63 at low and 0.71 at high shear (common practice, no source). Dilute: µ_0 (1 + [η]_φ φ).
    """
    flows = np.where(volume_fraction < maximum_volume_fraction, volume_fraction, np.nan)[()]
    power = intrinsic_viscosity_number * maximum_volume_fraction
    exponent = -power * np.log1p(-flows / maximum_volume_fraction)
    return solvent_viscosity * np.exp(np.where(exponent <= LARGEST_EXPONENT, exponent, np.nan)[()])


@worksheet_function(
    result="solution_density",
    equation="ρ = ρ_w + C (1 − v ρ_w)",
    source=f"definition of the partial specific volume, {TANFORD}; water density after IAPWS SR6-08(2011)",
    arguments={"temperature": SOLUTION_TEMPERATURE},
    refuses=[OVERFILLED],
    fitted=[LIQUID_RANGE],
)
def density_solution(
    concentration: Number, partial_specific_volume: Number, temperature: Number = ROOM_TEMPERATURE
) -> Number:
    """Density of an aqueous solution from the partial specific volume of its solute.

    Exact for the apparent specific volume; the partial one is taken as constant with concentration. Salts
    beside the solute are left out.
    """
    water = water_density(temperature)
    fits = np.where(concentration * partial_specific_volume <= 1.0, 1.0, np.nan)
    return water + fits * concentration * (1.0 - partial_specific_volume * water)


@worksheet_function(result="concentration", equation="C = w ρ", source="definition of the mass fraction")
def concentration_from_fraction(mass_fraction: Number, solution_density: Number) -> Number:
    """Mass concentration from mass fraction and the density of the solution."""
    return mass_fraction * solution_density


@worksheet_function(
    result="mass_fraction",
    equation="w = C/ρ",
    source="definition of the mass fraction",
    refuses=[Rule(lambda concentration, solution_density: concentration > solution_density,
                  "{concentration} exceeds {solution_density}: more solute than solution")],
)
def fraction_from_concentration(concentration: Number, solution_density: Number) -> Number:
    """Mass fraction from mass concentration and the density of the solution."""
    return np.where(concentration <= solution_density, concentration, np.nan) / solution_density


@worksheet_function(
    result="volume_fraction",
    equation="φ = C v",
    source=f"definition of the partial specific volume, {TANFORD}",
    refuses=[OVERFILLED],
)
def volume_fraction(concentration: Number, partial_specific_volume: Number) -> Number:
    """Volume fraction of a dissolved or suspended solute.

    With the partial specific volume it is the dry volume; with volume per dry mass of the swollen particle,
    the hydrodynamic one.
    """
    fraction = concentration * partial_specific_volume
    return np.where(fraction <= 1.0, fraction, np.nan)[()]


# --- size and diffusion -------------------------------------------------------------------------------------


@worksheet_function(
    result="solute_radius",
    equation="r_s/Å = 0.33 M^0.463, M in g/mol",
    source=DEXTRAN_RADIUS,
    fitted=[Fitted("molar_mass", 1.0, 500.0)],
    dimensional="correlation in its own units",
)
def radius_dextran(molar_mass: Number) -> Number:
    """Stokes radius of a dextran in water.

    A mean over the coil; branched dextrans of one molar mass differ. The range is an approximate one. Other
    published power laws differ by a quarter: do not mix them within one sieving curve.
    """
    return 0.33e-10 * (1e3 * molar_mass) ** 0.463


@worksheet_function(
    result="solute_radius",
    equation="r_s/cm = 16.73e-10 M^0.557, M in g/mol",
    source=SINGH,
    fitted=[Fitted("molar_mass", 1.0, 35.0)],
    dimensional="correlation in its own units",
)
def radius_peg(molar_mass: Number) -> Number:
    """Stokes radius of a poly(ethylene glycol) in water.

    The range is an approximate one.
    """
    return 16.73e-12 * (1e3 * molar_mass) ** 0.557


@worksheet_function(
    result="solute_radius",
    equation="r_s = [3 M (v + h v_w)/(4 π N_A)]^⅓, v_w = 1 mL/g",
    source=f"volume of the hydrated molecule, {TANFORD}; without hydration, {ERICKSON}",
    dimensional="the volume of bound water is the round 1 mL/g",
)
def radius_protein(
    molar_mass: Number, partial_specific_volume: Number = 0.73e-3, hydration: Number = 0.3
) -> Number:
    """Radius of a compact protein, as the equivalent hydrated sphere.

    For globular proteins in water, elongation left out: the Stokes radius is mostly larger, by up to a fifth
    for compact proteins. 0.3 g/g of bound water is usual (common practice, no source); with hydration 0 it
    is the smallest radius possible.
    """
    volume = molar_mass * (partial_specific_volume + hydration * BOUND_WATER_VOLUME) / AVOGADRO_CONSTANT
    return (3.0 * volume / (4.0 * pi)) ** (1.0 / 3.0)


@worksheet_function(
    result="solute_radius",
    equation="r_s = k T/(6 π µ D)",
    source=EINSTEIN,
    arguments={"temperature": SOLUTION_TEMPERATURE, "viscosity": SOLVENT_VISCOSITY},
)
def radius_stokes(diffusion_coefficient: Number, temperature: Number, viscosity: Number) -> Number:
    """Stokes radius from the diffusion coefficient.

    The sphere that diffuses alike; dilute, solute much larger than the solvent's molecules.
    """
    return BOLTZMANN_CONSTANT * temperature / (6.0 * pi * viscosity * diffusion_coefficient)


@worksheet_function(
    result="diffusion_coefficient",
    equation="D = k T/(6 π µ r_s)",
    source=EINSTEIN,
    arguments={"temperature": SOLUTION_TEMPERATURE, "viscosity": SOLVENT_VISCOSITY},
)
def diffusion_stokes(solute_radius: Number, temperature: Number, viscosity: Number) -> Number:
    """Diffusion coefficient from the Stokes radius.

    Dilute, solute much larger than the solvent's molecules.
    """
    return BOLTZMANN_CONSTANT * temperature / (6.0 * pi * viscosity * solute_radius)


@worksheet_function(
    result="diffusion_coefficient",
    equation="D/(cm²/s) = 8.34e-8 T/(µ M^⅓), T in K, µ in cP, M in g/mol",
    source=YOUNG,
    arguments={"temperature": SOLUTION_TEMPERATURE, "viscosity": SOLVENT_VISCOSITY},
    cautions=[Rule(lambda molar_mass: molar_mass < 5.0 * (1 - 1e-9),
                   "{molar_mass} is below 5 kDa, where the equation was not fitted")],
    dimensional="correlation in its own units",
)
def diffusion_young(molar_mass: Number, temperature: Number, viscosity: Number) -> Number:
    """Diffusion coefficient of a globular protein from its molar mass.

    Dilute; within about 20 % for most globular proteins. Chains that swell diffuse more slowly: for a
    dextran of 70 kDa it is 60 % high. In SI with M in kg/mol the constant is 8.34e-16, for 1 cm²/s is
    1e-4 m²/s, 1 cP is 1e-3 Pa·s and the cube root of 1000 is 10.
    """
    return 8.34e-16 * temperature / (viscosity * molar_mass ** (1.0 / 3.0))


@worksheet_function(
    result="diffusion_coefficient",
    equation="D/(m²/s) = 9.40e-15 T/(µ M^⅓), T in K, µ in Pa·s, M in g/mol",
    source=POLSON,
    arguments={"temperature": SOLUTION_TEMPERATURE, "viscosity": SOLVENT_VISCOSITY},
    cautions=[Rule(lambda molar_mass: molar_mass < 1.0 * (1 - 1e-9),
                   "{molar_mass} is below 1 kDa: the equation is for large molecules")],
    dimensional="correlation in its own units",
)
def diffusion_polson(molar_mass: Number, temperature: Number, viscosity: Number) -> Number:
    """Diffusion coefficient of a large biological molecule from its molar mass.

    Dilute, compact molecules; 15 % above the measured value for serum albumin, and always 13 % above
    diffusion_young. In SI with M in kg/mol the constant is 9.40e-16, for the cube root of 1000 is 10.
    """
    return 9.40e-16 * temperature / (viscosity * molar_mass ** (1.0 / 3.0))


# --- ions beside a charged protein --------------------------------------------------------------------------


@worksheet_function(
    result="donnan_ratio",
    equation="r = (1 − φ)[(1 + y²)^½ − y], y = |Z| C/[2 M m (1 − φ)], φ = C v",
    source=f"{STONER}; {BOLTON}; balances worked out anew",
    arguments={"concentration": "Protein per volume of whole retentate, the protein's own volume included",
               "salt_concentration": replace(quantity("salt_concentration"), low=1e-9,
                                             meaning="Amount concentration of the 1:1 salt in the permeate")},
    refuses=[Rule(lambda concentration, partial_specific_volume: concentration * partial_specific_volume >= 1,
                  "{concentration} at {partial_specific_volume} leaves no room for the salt")],
    remarks=[Rule(lambda charge_number: charge_number == 0,
                  "no charge: the ratio is that of the excluded volume, for both ions")],
)
def donnan_ratio(
    concentration: Number,
    molar_mass: Number,
    charge_number: Number,
    salt_concentration: Number,
    partial_specific_volume: Number = 0.73e-3,
) -> Number:
    """Co-ion concentration in the retentate over that in the permeate, for a charged protein and a 1:1 salt.

    The co-ion has the sign of the protein. At equilibrium across the membrane, as at the end of a
    diafiltration, with one activity coefficient of the salt on both sides. `concentration` is per volume of
    whole retentate, protein included, and so is the ion concentration in the ratio; the charges are
    neutralised in the share 1 − φ of that volume which the protein leaves free, where c₊ c₋ = m² and
    c₊ − c₋ = −Z C/[M (1 − φ)]. `salt_concentration` is that of the permeate. The counter-ion's ratio is
    (1 − φ)²/r.
    """
    free = 1.0 - concentration * partial_specific_volume
    free = np.where(free > 0.0, free, np.nan)[()]
    charge = abs(charge_number) * concentration / (2.0 * molar_mass * free)
    # (1 + y²)^½ − y without cancellation: the tangent of half the angle whose tangent is 1/y
    return free * np.tan(0.5 * np.arctan2(salt_concentration, charge))


# --- table --------------------------------------------------------------------------------------------------


@worksheet_function(
    result_by=("property_name", {**PROPERTIES, **{name: entry for name, (*_, entry) in CONDITIONS.items()}}),
    equation="a published value of the solute table",
    source="one for each value of the table; UF_WHY tells it",
    names={"solute": "Name of the solute, such as bovine serum albumin", "property_name": "Property"},
    choices={"property_name": (*PROPERTIES, *CONDITIONS)},
    remarks=[Rule(lambda solute: True, "where the value comes from",
                  told=lambda solute, property_name: _row(solute, property_name).origin)],
    dimensional="a table of values",
)
def solute(solute: str, property_name: str) -> float:
    """A published property of a common solute; UF_WHY tells its source and conditions.

    Names in any case. Osmotic coefficients belong to their temperature and range of concentration, which are
    properties too; a diffusion coefficient belongs to water at diffusion_temperature, and goes with T/µ. A
    gel concentration depends on the plant and is a guide only.
    """
    field = CONDITIONS[property_name][1] if property_name in CONDITIONS else "value"
    return getattr(_row(solute, property_name), field)


def _row(solute: str, property_name: str) -> Entry:
    return entry_of(solute, CONDITIONS[property_name][0] if property_name in CONDITIONS else property_name)
