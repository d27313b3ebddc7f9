"""Water: viscosity, density, surface tension, and the factors that correct a flux for temperature."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Fitted, Number, Rule, worksheet_function
from ..quantities import quantity

SR6_08 = ("IAPWS SR6-08(2011), Revised Supplementary Release on Properties of Liquid Water at 0.1 MPa, International "
          "Association for the Properties of Water and Steam")
R1_76 = "IAPWS R1-76(2014), Revised Release on Surface Tension of Ordinary Water Substance"

#: Range of SR6-08 in K; liquid below 0 °C is supercooled.
LIQUID_RANGE = Fitted("temperature", 253.15, 383.15)

ROOM_TEMPERATURE = 293.15  # K, the 20 °C that permeability is referred to
CRITICAL_TEMPERATURE = 647.096  # K

#: The ways in use to correct a flux from one temperature to another.
TEMPERATURE_RULES = ("viscosity", "1.03", "1.024", "exponential", "cubic")


@worksheet_function(
    result="viscosity",
    equation="µ/(µPa·s) = 280.68 t^-1.9 + 511.45 t^-7.7 + 61.131 t^-19.6 + 0.45903 t^-40, t = T/(300 K)",
    source=f"{SR6_08}, section 5",
    fitted=[LIQUID_RANGE],
    dimensional="correlation in its own units",
)
def water_viscosity(temperature: Number) -> Number:
    """Dynamic viscosity of liquid water.

    For pure water at 0.1 MPa; the pressures of ultrafiltration change it by less than 0.1 %.
    """
    t = temperature / 300.0
    return 1e-6 * (280.68 * t**-1.9 + 511.45 * t**-7.7 + 61.131 * t**-19.6 + 0.45903 * t**-40.0)


#: Default of every viscosity of a permeate.
WATER_VISCOSITY_20 = water_viscosity(ROOM_TEMPERATURE)


@worksheet_function(
    result="density",
    equation="1/ρ = (R·10 K/p0)(a5 + Σ a_i α^n_i + Σ b_i β^m_i), α = 10 K/(593 K − T), β = 10 K/(T − 232 K), p0 = 0.1 MPa",
    source=f"{SR6_08}, equation 2",
    fitted=[LIQUID_RANGE],
    dimensional="correlation in its own units",
)
def water_density(temperature: Number) -> Number:
    """Density of liquid water.

    For pure water at 0.1 MPa; it rises by about 0.005 % per bar.
    """
    alpha = 10.0 / (593.0 - temperature)
    beta = 10.0 / (temperature - 232.0)
    volume = (
        1.93763157e-2
        + alpha**4 * (6.74458446e3 + alpha * (-2.22521604e5 + alpha**2 * (1.00231247e8 + alpha * (-1.63552118e9 + alpha * 8.32299658e9))))
        + beta * (5.78545292e-3 + beta * (-1.53195665e-2 + beta * (3.11337859e-2
                  + beta * (-4.23546241e-2 + beta * (3.38713507e-2 - beta * 1.19946761e-2)))))
    )
    return 0.1e6 / (461.51805 * 10.0 * volume)


@worksheet_function(
    result="surface_tension",
    equation="σ/(mN/m) = 235.8 τ^1.256 (1 − 0.625 τ), τ = 1 − T/(647.096 K)",
    source=R1_76,
    arguments={"temperature": replace(quantity("temperature"), high=373.9)},
    fitted=[Fitted("temperature", 273.16, 647.05)],
    dimensional="correlation in its own units",
)
def water_surface_tension(temperature: Number) -> Number:
    """Surface tension of water against its vapour or air.

    For clean water: surfactants and organic matter lower it, and so lower a bubble point.
    """
    t = 1.0 - temperature / CRITICAL_TEMPERATURE
    return 0.2358 * t**1.256 * (1.0 - 0.625 * t)


WATER_SURFACE_TENSION_20 = water_surface_tension(ROOM_TEMPERATURE)

CUBIC_HIGHEST = 308.15  # K; the cubic falls away from the viscosity of water above this


@worksheet_function(
    result="viscosity_ratio",
    equation="µ(T)/µ(T_ref); J(T_ref) = J(T)·µ(T)/µ(T_ref)",
    source=f"viscosity: {SR6_08}; cubic: EPA 815-R-06-009, Membrane Filtration Guidance Manual (2005); "
           "1.03, 1.024, exponential (e^(−0.0239 ΔT)): common practice, no source",
    choices={"rule": TEMPERATURE_RULES},
    refuses=[Rule(lambda rule, temperature, reference_temperature:
                  rule == "cubic" and max(temperature, reference_temperature) > CUBIC_HIGHEST,
                  "the rule cubic is refused above 35 °C, where it is more than 4 % low; use the rule viscosity")],
    fitted=[Fitted("temperature", 273.15, 293.15, when=lambda rule: rule == "cubic"),
            Fitted("reference_temperature", 273.15, 293.15, when=lambda rule: rule == "cubic"),
            Fitted("temperature", 253.15, 383.15, when=lambda rule: rule == "viscosity")],
    remarks=[Rule(lambda rule: True, "multiply the flux at {temperature} by it for the flux at {reference_temperature}; "
                                     "some quotations use the reciprocal")],
    dimensional="correlation in its own units",
)
def viscosity_ratio(
    temperature: Number, reference_temperature: Number = ROOM_TEMPERATURE, rule: str = "viscosity"
) -> Number:
    """Factor that corrects a flux from its temperature to the reference temperature.

    The flux at `temperature` times the factor is the flux at `reference_temperature`, at one transmembrane pressure. Bidders
    often quote the reciprocal. The rule `viscosity` uses the viscosity of water; `1.03` and `1.024` are 1.03^(T_ref − T)
    and 1.024^(T_ref − T); `exponential` is e^(−0.0239 (T − T_ref)); `cubic` is the cubic for the viscosity of water in
    drinking-water guidance, µ/cP = 1.784 − 0.0575 t + 0.0011 t² − 1e-5 t³ with t in °C.
    """
    difference = temperature - reference_temperature
    if rule == "1.03":
        return 1.03**-difference
    if rule == "1.024":
        return 1.024**-difference
    if rule == "exponential":
        return np.exp(-0.0239 * difference)
    if rule == "cubic":
        highest = np.maximum(temperature, reference_temperature)
        return np.where(highest <= CUBIC_HIGHEST, _cubic(temperature) / _cubic(reference_temperature), np.nan)
    return water_viscosity(temperature) / water_viscosity(reference_temperature)


def _cubic(temperature: Number) -> Number:
    t = temperature - 273.15
    return 1.784 + t * (-0.0575 + t * (0.0011 - 1e-5 * t))
