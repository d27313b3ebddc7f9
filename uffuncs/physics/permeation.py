"""Permeation: flux, permeability and hydraulic resistances, without a solute."""

from __future__ import annotations

from dataclasses import replace

from ..declaration import Number, Rule, worksheet_function
from ..quantities import quantity
from .water import ROOM_TEMPERATURE, TEMPERATURE_RULES, WATER_VISCOSITY_20, viscosity_ratio

D6161 = "ASTM D6161, Standard Terminology Used for Microfiltration, Ultrafiltration, Nanofiltration and Reverse Osmosis"
IUPAC = "Koros, Ma & Shimidzu, Terminology for membranes and membrane processes (IUPAC Recommendations 1996), Pure Appl. Chem. 68 (1996) 1479"
CHERYAN = "Cheryan, Ultrafiltration and Microfiltration Handbook, 2nd ed., Technomic (1998)"
ZEMAN_ZYDNEY = "Zeman & Zydney, Microfiltration and Ultrafiltration: Principles and Applications, Dekker (1996)"
CARMAN = "Carman, Fluid flow through granular beds, Trans. Inst. Chem. Eng. 15 (1937) 150"

PERMEATE_VISCOSITY = "Dynamic viscosity of the permeate, at the membrane's temperature"
WATER_20 = {"viscosity": "water 20 °C"}


@worksheet_function(result="flux", equation="J = Q_p/A", source=D6161)
def flux_from_flow(permeate_flow: Number, area: Number) -> Number:
    """Flux from permeate flow and membrane area."""
    return permeate_flow / area


@worksheet_function(result="permeate_flow", equation="Q_p = J A", source=D6161)
def flow_from_flux(flux: Number, area: Number) -> Number:
    """Permeate flow from flux and membrane area."""
    return flux * area


@worksheet_function(
    result="permeability",
    equation="L_p = ε d²/(32 µ τ l)",
    source=f"Hagen–Poiseuille for parallel cylindrical pores; {ZEMAN_ZYDNEY}",
    arguments={"viscosity": PERMEATE_VISCOSITY},
    default_texts=WATER_20,
)
def permeability_pore(
    porosity: Number,
    pore_diameter: Number,
    tortuosity: Number,
    membrane_thickness: Number,
    viscosity: Number = WATER_VISCOSITY_20,
) -> Number:
    """Permeability of a membrane of parallel cylindrical pores.

    Laminar flow, pores of one size, no slip and no end effects; `membrane_thickness` is that of the separating skin and
    `tortuosity` the length of a pore over it. A real membrane has a spread of pore sizes, which the widest dominate.
    """
    return porosity * pore_diameter**2 / (32.0 * viscosity * tortuosity * membrane_thickness)


@worksheet_function(
    result="pore_diameter",
    equation="d = (32 µ τ l L_p/ε)^½",
    source=f"Hagen–Poiseuille for parallel cylindrical pores; {ZEMAN_ZYDNEY}",
    arguments={"viscosity": PERMEATE_VISCOSITY},
    default_texts=WATER_20,
)
def pore_diameter(
    permeability: Number,
    porosity: Number,
    tortuosity: Number,
    membrane_thickness: Number,
    viscosity: Number = WATER_VISCOSITY_20,
) -> Number:
    """Hydraulic pore diameter from a measured permeability; the inverse of permeability_pore.

    Permeability and viscosity belong to one temperature.
    """
    return (32.0 * viscosity * tortuosity * membrane_thickness * permeability / porosity) ** 0.5


@worksheet_function(
    result="permeability",
    equation="L_p(T_ref) = (J/Δp_tm)·µ(T)/µ(T_ref)",
    source=f"{D6161}; {CHERYAN}",
    choices={"rule": TEMPERATURE_RULES},
)
def permeability_measured(
    flux: Number,
    transmembrane_pressure: Number,
    temperature: Number,
    reference_temperature: Number = ROOM_TEMPERATURE,
    rule: str = "viscosity",
) -> Number:
    """Permeability from a clean-water test, corrected to the reference temperature."""
    return flux / transmembrane_pressure * viscosity_ratio(temperature, reference_temperature, rule)


@worksheet_function(
    result="permeability",
    equation="L_p(T) = L_p(T_ref)·µ(T_ref)/µ(T)",
    source=f"{D6161}; {CHERYAN}",
    arguments={"permeability": "Permeability at the reference temperature"},
    choices={"rule": TEMPERATURE_RULES},
)
def permeability_at(
    permeability: Number,
    temperature: Number,
    reference_temperature: Number = ROOM_TEMPERATURE,
    rule: str = "viscosity",
) -> Number:
    """Permeability at the process temperature, from that at the reference temperature."""
    return permeability / viscosity_ratio(temperature, reference_temperature, rule)


@worksheet_function(
    result="resistance",
    equation="R = 1/(µ L_p)",
    source=IUPAC,
    arguments={"viscosity": PERMEATE_VISCOSITY},
    default_texts=WATER_20,
)
def resistance_from_permeability(permeability: Number, viscosity: Number = WATER_VISCOSITY_20) -> Number:
    """Hydraulic resistance from permeability, both at the temperature of the viscosity."""
    return 1.0 / (viscosity * permeability)


@worksheet_function(
    result="permeability",
    equation="L_p = 1/(µ R)",
    source=IUPAC,
    arguments={"viscosity": PERMEATE_VISCOSITY},
    default_texts=WATER_20,
)
def permeability_from_resistance(resistance: Number, viscosity: Number = WATER_VISCOSITY_20) -> Number:
    """Permeability from hydraulic resistance, at the temperature of the viscosity."""
    return 1.0 / (viscosity * resistance)


@worksheet_function(
    result="total_resistance",
    equation="R_t = (Δp_tm − Δπ)/(µ J)",
    source=f"Darcy's law; {CHERYAN}",
    arguments={"viscosity": PERMEATE_VISCOSITY},
    refuses=[Rule(lambda flux: flux == 0, "the flux is 0: a resistance cannot be told from it")],
    cautions=[Rule(lambda transmembrane_pressure, osmotic_pressure: osmotic_pressure > transmembrane_pressure,
                   "{osmotic_pressure} exceeds {transmembrane_pressure}: the resistance is negative")],
)
def resistance_total(
    flux: Number, transmembrane_pressure: Number, viscosity: Number, osmotic_pressure: Number = 0.0
) -> Number:
    """Total hydraulic resistance from flux and pressure."""
    return (transmembrane_pressure - osmotic_pressure) / (viscosity * flux)


@worksheet_function(
    result="cake_resistance",
    equation="R_c = 180 (1 − ε)² δ/(d² ε³)",
    source=f"Carman–Kozeny; {CARMAN}",
)
def resistance_cake(cake_thickness: Number, particle_diameter: Number, cake_porosity: Number) -> Number:
    """Resistance of an incompressible cake of given thickness.

    For a packed bed of near-spherical particles; `particle_diameter` is the Sauter mean. Compressible cakes resist more.
    """
    return 180.0 * (1.0 - cake_porosity) ** 2 * cake_thickness / (particle_diameter**2 * cake_porosity**3)


@worksheet_function(
    result="specific_cake_resistance",
    equation="α = 180 (1 − ε)/(ρ_p d² ε³)",
    source=f"Carman–Kozeny; {CARMAN}",
)
def resistance_cake_specific(particle_diameter: Number, cake_porosity: Number, particle_density: Number) -> Number:
    """Specific resistance of an incompressible cake, per mass of cake and membrane area.

    For a packed bed of near-spherical particles; `particle_diameter` is the Sauter mean.
    """
    return 180.0 * (1.0 - cake_porosity) / (particle_density * particle_diameter**2 * cake_porosity**3)


def _fluxes_fall(clean_flux, fouled_flux, rinsed_flux, cleaned_flux):
    return not fouled_flux <= rinsed_flux <= cleaned_flux <= clean_flux


@worksheet_function(
    results=["resistance", "share"],
    equation="R_m = Δp/(µ J_0); rinse-removable Δp/µ·(1/J_f − 1/J_r); chemically removable Δp/µ·(1/J_r − 1/J_c); "
             "remaining Δp/µ·(1/J_c − 1/J_0)",
    source=f"resistances in series; {CHERYAN}",
    arguments={"viscosity": "Dynamic viscosity of the water of the tests"},
    default_texts=WATER_20,
    cautions=[Rule(_fluxes_fall, "the fluxes do not rise from fouled over rinsed and cleaned to clean: a resistance is negative")],
)
def resistance_steps(
    clean_flux: Number,
    fouled_flux: Number,
    rinsed_flux: Number,
    cleaned_flux: Number,
    transmembrane_pressure: Number,
    viscosity: Number = WATER_VISCOSITY_20,
) -> tuple:
    """Resistances of membrane and fouling from four water fluxes, and their shares of the total.

    One row each: membrane, removed by the rinse, removed by chemical cleaning, remaining. The four fluxes are measured with
    clean water at one pressure and one temperature.
    """
    clean, fouled, rinsed, cleaned = (
        resistance_total(j, transmembrane_pressure, viscosity) for j in (clean_flux, fouled_flux, rinsed_flux, cleaned_flux))
    parts = [clean, fouled - rinsed, rinsed - cleaned, cleaned - clean]
    return parts, [part / fouled for part in parts]


@worksheet_function(
    result=replace(quantity("flux"), low=-1e5),
    equation="J = (Δp_tm − σ Δπ)/(µ (R_m + R_f + R_c))",
    source=f"Darcy's law with resistances in series; {CHERYAN}; osmotic term after Kedem & Katchalsky, Biochim. Biophys. Acta 27 (1958) 229",
    arguments={"viscosity": PERMEATE_VISCOSITY},
    cautions=[Rule(lambda result: result < 0, "the flux is negative: the osmotic pressure exceeds the transmembrane pressure")],
)
def flux_darcy(
    transmembrane_pressure: Number,
    viscosity: Number,
    membrane_resistance: Number,
    fouling_resistance: Number = 0.0,
    cake_resistance: Number = 0.0,
    osmotic_pressure: Number = 0.0,
    reflection_coefficient: Number = 1.0,
) -> Number:
    """Flux by Darcy's law with resistances in series.

    `osmotic_pressure` is the difference between the membrane surface and the permeate; flux_osmotic finds it together with
    the flux. A negative flux stands: water would flow back.
    """
    driving = transmembrane_pressure - reflection_coefficient * osmotic_pressure
    return driving / (viscosity * (membrane_resistance + fouling_resistance + cake_resistance))


@worksheet_function(
    result="flux",
    equation="J_norm = J (p_ref/Δp_tm)·µ(T)/µ(T_ref)",
    source=f"{D6161}; {CHERYAN}",
    choices={"rule": TEMPERATURE_RULES},
    refuses=[Rule(lambda transmembrane_pressure: transmembrane_pressure == 0, "the transmembrane pressure is 0")],
)
def flux_normalized(
    flux: Number,
    transmembrane_pressure: Number,
    temperature: Number,
    reference_pressure: Number = 1e5,
    reference_temperature: Number = ROOM_TEMPERATURE,
    rule: str = "viscosity",
) -> Number:
    """Flux corrected to the reference pressure and temperature, to tell fouling from cold water.

    Proportional to pressure: only in the pressure-controlled region, well below the limiting flux.
    """
    return flux * (reference_pressure / transmembrane_pressure) * viscosity_ratio(temperature, reference_temperature, rule)


@worksheet_function(
    result=replace(quantity("transmembrane_pressure"), low=-200),
    equation="Δp_tm = (p_f + p_r)/2 − p_p",
    source=D6161,
    default_texts={"retentate_pressure": "feed_pressure"},
    cautions=[Rule(lambda result: result < 0, "the transmembrane pressure is negative: permeate would flow back"),
              Rule(lambda retentate_pressure, feed_pressure: retentate_pressure > feed_pressure,
                   "{retentate_pressure} is above {feed_pressure}")],
)
def transmembrane_pressure(
    feed_pressure: Number, retentate_pressure: Number | None = None, permeate_pressure: Number = 0.0
) -> Number:
    """Mean transmembrane pressure of a module.

    Gauge pressures; with the retentate pressure left out the module is dead-end. Suction on the permeate side is negative.
    """
    outlet = feed_pressure if retentate_pressure is None else retentate_pressure
    return 0.5 * (feed_pressure + outlet) - permeate_pressure
