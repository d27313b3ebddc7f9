"""Fouling: blocking laws, fouling indices, flux recovery, growth of resistance, droplets entering pores."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import NotAvailable
from ..quantities import quantity
from ._blocking import LAWS, decline, fit_laws
from ._line import fit_line
from .water import ROOM_TEMPERATURE, WATER_VISCOSITY_20, water_viscosity

HERMIA = ("Hermia, Constant pressure blocking filtration laws: application to power-law non-Newtonian "
          "fluids, Trans. Inst. Chem. Eng. 60 (1982) 183")
RUTH = "Ruth, Studies in filtration III, Ind. Eng. Chem. 27 (1935) 708"
SCHIPPERS_VERDOUW = ("Schippers & Verdouw, The modified fouling index, a method of determining the fouling "
                     "characteristics of water, Desalination 32 (1980) 137")
D8002 = "ASTM D8002, Standard Test Method for Modified Fouling Index (MFI-0.45) of Water"
D4189 = "ASTM D4189, Standard Test Method for Silt Density Index (SDI) of Water"
HUANG = ("Huang, Young & Jacangelo, Unified membrane fouling index for low pressure membrane filtration of "
         "natural waters: principles and methodology, Environ. Sci. Technol. 42 (2008) 714")
NAZZAL_WIESNER = ("Nazzal & Wiesner, Microfiltration of oil-in-water emulsions, "
                  "Water Environ. Res. 68 (1996) 1187")
CHERYAN = "Cheryan, Ultrafiltration and Microfiltration Handbook, 2nd ed., Technomic (1998)"

PERMEATE_VISCOSITY = "Dynamic viscosity of the permeate, at the membrane's temperature"
SIGNED_SHARE = replace(quantity("share"), low=-1e9, high=1e9)
FLUX_ERROR = replace(quantity("standard_error"), unit="L/(m²·h)")


@worksheet_function(
    result="flux",
    equation="dJ/dt = −k J^(3−n): J = J_0 (1 + m k J_0^m t)^(−1/m), m = 2 − n; "
             "complete n = 2 (J_0 e^(−k t)), standard 1.5, intermediate 1, cake 0",
    source=HERMIA,
    choices={"law": tuple(LAWS)},
    names={"law": "Blocking law"},
    remarks=[Rule(lambda law: law == "complete", "k in 1/s"),
             Rule(lambda law: law == "standard", "k in m^(-1/2) s^(-1/2)"),
             Rule(lambda law: law == "intermediate", "k in 1/m"),
             Rule(lambda law: law == "cake", "k in s/m²")],
    dimensional="the unit of the coefficient depends on the law",
)
def flux_blocking(law: str, initial_flux: Number, blocking_coefficient: Number, time: Number) -> Number:
    """Flux decline at constant pressure by one of Hermia's blocking laws.

    Dead-end, constant pressure and viscosity, one mechanism from the start. The coefficient belongs to the
    flux per area in SI: 1/s (complete), m^(-1/2) s^(-1/2) (standard), 1/m (intermediate), s/m² (cake).
    Coefficients of papers that write the laws in volumes or with other factors are not interchangeable with
    it.
    """
    return initial_flux * decline(LAWS[law], blocking_coefficient * initial_flux ** LAWS[law] * time)


@worksheet_function(
    results=[replace(quantity("blocking_coefficient"), name="law", symbol="", meaning="Blocking law"),
             "initial_flux",
             "blocking_coefficient",
             replace(FLUX_ERROR, meaning="Standard error of the initial flux"),
             replace(quantity("standard_error"), meaning="Standard error of the coefficient, in its unit"),
             "coefficient_of_determination",
             replace(FLUX_ERROR, name="residual_deviation", meaning="Residual standard deviation")],
    equation="least squares of J on J_0 (1 + m k J_0^m t)^(−1/m) for each law",
    source=HERMIA,
    dimensional="the unit of the coefficient depends on the law",
)
def blocking_fit(time: Column, flux: Column) -> tuple:
    """All four blocking laws fitted to a flux decline, the best first.

    One row a law: law, J_0, k, their standard errors, r², residual standard deviation, the smallest first;
    k in the unit of its law (see flux_blocking). Nonlinear least squares on the flux itself, all points of
    one weight; standard errors by the linear approximation at the fit. Constant pressure, dead-end, time
    from the start of filtration. Three points or more, at three different times, with a flux that falls.
    Laws whose residual deviations hardly differ cannot be told apart by the data.
    """
    return fit_laws(time, flux)


@worksheet_function(
    results=["membrane_resistance", "cake_resistance_concentration",
             replace(quantity("standard_error"), unit="1/m", meaning="Standard error of R_m"),
             replace(quantity("standard_error"), unit="1/m²", meaning="Standard error of α·c"),
             "coefficient_of_determination"],
    equation="1/J² = (µ R_m/Δp)² + (2 µ α c/Δp) t",
    source=f"{RUTH}; least squares of 1/J² on t",
    arguments={"viscosity": PERMEATE_VISCOSITY,
               "transmembrane_pressure": replace(quantity("transmembrane_pressure"), low=1e-4)},
    default_texts={"viscosity": "water 20 °C"},
)
def cake_fit(
    time: Column, flux: Column, transmembrane_pressure: Number, viscosity: Number = WATER_VISCOSITY_20
) -> tuple:
    """Membrane resistance and α·c of cake filtration from a flux decline, their standard errors, and r².

    Constant pressure, no crossflow, an incompressible cake that starts at time 0; what fouls the pores at
    the start counts as membrane. Straight line of 1/J² on t, all points of one weight: low fluxes decide.
    Three points or more.
    """
    if np.any(flux <= 0):
        raise NotAvailable(f"the flux is 0 in row {int(np.argmin(flux)) + 1}; leave the row out")
    line = fit_line(time, flux**-2.0, "time")
    if line.slope <= 0:
        raise NotAvailable("the flux does not fall with time: no cake resistance can be told")
    if line.intercept <= 0:
        raise NotAvailable("the line of 1/J² on t starts at or below 0: no membrane resistance can be told; "
                           "give points nearer to the start")
    ratio, root = transmembrane_pressure / viscosity, line.intercept**0.5
    return (ratio * root, 0.5 * ratio * line.slope,
            0.5 * ratio * line.intercept_error / root, 0.5 * ratio * line.slope_error, line.r_squared)


# --- fouling indices of water ------------------------------------------------------------------------------


@worksheet_function(
    result=replace(quantity("silt_density_index"), low=-1e15),
    equation="SDI = 100 (1 − t_i/t_f)/T",
    source=D4189,
    cautions=[
        Rule(lambda first_time, last_time: 1 - first_time / last_time > 0.75,
             "the filter is plugged by more than 75 %; repeat with a shorter interval (10 or 5 min)"),
        Rule(lambda first_time, last_time: first_time > last_time,
             "the last sample took less time than the first"),
        Rule(lambda first_time, interval: interval < first_time,
             "{interval} is over before the first sample, {first_time}"),
    ],
)
def silt_density_index(first_time: Number, last_time: Number, interval: Number = 900.0) -> Number:
    """Silt density index from the times to collect two samples of one volume.

    Through a filter of 0.45 µm at 207 kPa (30 psi); `interval` runs from the start of the first sample to
    the start of the last. The index is not proportional to the particles in the water, and not corrected
    for temperature.
    """
    return (1.0 - first_time / last_time) / interval


REFERENCE_PRESSURE = 2.00e5  # Pa
REFERENCE_AREA = 13.8e-4  # m²
SAMPLED = replace(quantity("volume"), unit="L")
SECTION_SHARE = 4  # the slope is told over a quarter of the points
SECTION_TOLERANCE = 0.1  # and stays within 10 % of the smallest


def _linear_section(volume: np.ndarray, ratio: np.ndarray) -> slice:
    """The points about the smallest slope of t/V on V, as far as the slope stays near it."""
    size = max(5, len(volume) // SECTION_SHARE)
    slopes = np.array([fit_line(volume[i:i + size], ratio[i:i + size], "volume").slope
                       for i in range(len(volume) - size + 1)])
    first = last = int(np.argmin(slopes))
    if slopes[first] <= 0:
        raise NotAvailable("t/V falls or stays level over part of the test; no fouling index can be told")
    most = slopes[first] * (1.0 + SECTION_TOLERANCE)
    while first > 0 and slopes[first - 1] <= most:
        first -= 1
    while last < len(slopes) - 1 and slopes[last + 1] <= most:
        last += 1
    return slice(first, last + size)


@worksheet_function(
    results=["fouling_index",
             replace(SAMPLED, name="first_volume", meaning="Volume at the start of the linear section"),
             replace(SAMPLED, name="last_volume", meaning="Volume at the end of the linear section"),
             "coefficient_of_determination"],
    equation="MFI = d(t/V)/dV · (µ_20/µ_T)(Δp/Δp_0)(A/A_0)², Δp_0 = 200 kPa, A_0 = 13.8 cm²",
    source=f"{SCHIPPERS_VERDOUW}; {D8002} (test pressure 200 kPa); rule for the linear section: no source",
    arguments={"time": replace(quantity("time"), unit="s", meaning="Time from the start of the test"),
               "volume": replace(SAMPLED, meaning="Filtered volume up to that time"),
               "area": "Area of the test filter",
               "transmembrane_pressure": replace(quantity("transmembrane_pressure"), low=1e-4)},
    remarks=[Rule(lambda area: True, "normalised to 200 kPa, 20 °C, 13.8 cm²; on 207 kPa it is 3.4 % lower")],
    dimensional="viscosity of water in its own units",
)
def fouling_index(
    time: Column, volume: Column, area: Number, transmembrane_pressure: Number, temperature: Number
) -> tuple:
    """Modified fouling index (MFI-0.45) from a filtration test, the linear section used, and r².

    Constant pressure through a filter of 0.45 µm. t/V against V first bends (blocking of pores), then runs
    straight (cake filtration), at last may steepen (compression of the cake); the index is the slope of the
    straight part, normalised to 20 °C, 200 kPa and 13.8 cm². The straight part is found so: slopes over
    five neighbouring points or a quarter of all, whichever is more; around the smallest of them, all points
    as far as the slope stays within 10 % of it. Volumes count from the start; rows of volume 0 are left
    out. Five points or more. Some texts normalise to 207 kPa (30 psi): multiply by 200/207.
    """
    begun = volume > 0
    time, volume = time[begun], volume[begun]
    if len(volume) < 5:
        raise NotAvailable(f"{len(volume)} points above volume 0; the linear section needs five or more")
    if np.any(np.diff(volume) <= 0) or np.any(np.diff(time) < 0):
        raise NotAvailable("time and volume must rise from row to row")
    section = _linear_section(volume, time / volume)
    line = fit_line(volume[section], (time / volume)[section], "volume")
    factor = (water_viscosity(ROOM_TEMPERATURE) / water_viscosity(temperature)
              * transmembrane_pressure / REFERENCE_PRESSURE * (area / REFERENCE_AREA) ** 2)
    return line.slope * factor, volume[section][0], volume[section][-1], line.r_squared


@worksheet_function(
    result=replace(quantity("standard_error"), name="unified_fouling_index", symbol="UMFI", unit="1/m",
                   low=-1e300, meaning="Unified membrane fouling index"),
    equation="J_0/J = a + UMFI V/A",
    source=HUANG,
    cautions=[Rule(lambda result: result < 0, "the flux rises with the filtered volume")],
)
def fouling_index_unified(volume_per_area: Column, normalized_flux: Column) -> Number:
    """Unified membrane fouling index: the slope of J_0/J against the volume per area.

    `normalized_flux` is J/J_0 of the specific flux, corrected for pressure and temperature. Least squares
    with a free intercept, which is near 1 where cake filtration holds from the start. Three points or more.
    A value in m²/L times 1000 is the one here.
    """
    return fit_line(volume_per_area, 1.0 / normalized_flux, "volume").slope


# --- recovery and growth of resistance ----------------------------------------------------------------------

OUT_OF_ORDER = Rule(
    lambda clean_flux, fouled_flux, cleaned_flux: not fouled_flux <= cleaned_flux <= clean_flux,
    "the fluxes do not rise from fouled over cleaned to clean: {fouled_flux}, {cleaned_flux}, {clean_flux}")
NO_CLEAN_FLUX = Rule(lambda clean_flux: clean_flux == 0, "the clean flux is 0: nothing can be related to it")
ORDER = {"refuses": [NO_CLEAN_FLUX], "cautions": [OUT_OF_ORDER]}
RATIOS = "flux ratios as usual in the antifouling literature; common practice, no source"


@worksheet_function(result=SIGNED_SHARE, equation="J_c/J_0", source=RATIOS, **ORDER)
def recovery_flux(clean_flux: Number, fouled_flux: Number, cleaned_flux: Number) -> Number:
    """Flux recovery: water flux after cleaning over that of the clean membrane.

    All fluxes at one pressure and temperature. 1 minus the irreversible share; the fouled flux serves to
    check the order only.
    """
    return cleaned_flux / clean_flux


@worksheet_function(result=SIGNED_SHARE, equation="(J_c − J_f)/J_0", source=RATIOS, **ORDER)
def fouling_reversible(clean_flux: Number, fouled_flux: Number, cleaned_flux: Number) -> Number:
    """Reversible fouling: share of the clean flux that was lost and came back by cleaning.

    All fluxes at one pressure and temperature. With the irreversible share it adds up to the total loss, 1
    − J_f/J_0.
    """
    return (cleaned_flux - fouled_flux) / clean_flux


@worksheet_function(result=SIGNED_SHARE, equation="(J_0 − J_c)/J_0", source=RATIOS, **ORDER)
def fouling_irreversible(clean_flux: Number, fouled_flux: Number, cleaned_flux: Number) -> Number:
    """Irreversible fouling: share of the clean flux that cleaning did not bring back.

    All fluxes at one pressure and temperature. What is irreversible depends on the cleaning.
    """
    return (clean_flux - cleaned_flux) / clean_flux


@worksheet_function(
    results=["resistance_rate", "initial_resistance",
             replace(quantity("standard_error"), unit="1/(m·h)", meaning="Standard error of the rate"),
             replace(quantity("standard_error"), unit="1/m", meaning="Standard error of R_0"),
             "coefficient_of_determination"],
    equation="Δp/(µ_T J) = R_0 + (dR/dt) t",
    source=f"Darcy's law; least squares; {CHERYAN}",
    arguments={"temperature": "Temperature of the permeate"},
)
def fouling_rate(time: Column, flux: Column, transmembrane_pressure: Column, temperature: Column) -> tuple:
    """Growth of the total resistance with time and its value at the start, their standard errors, and r².

    Straight line of R = Δp/(µ J) on time, at any flux and pressure; viscosity of water at each temperature.
    No osmotic pressure. Over cycles take one point of each cycle at the same phase, such as right after the
    backwash. Three points or more.
    """
    if np.any(flux <= 0):
        raise NotAvailable(f"the flux is 0 in row {int(np.argmin(flux)) + 1}; leave the row out")
    line = fit_line(time, transmembrane_pressure / (water_viscosity(temperature) * flux), "time")
    return line.slope, line.intercept, line.slope_error, line.intercept_error, line.r_squared


@worksheet_function(
    result=replace(quantity("cleaning_interval"), low=0, high=1e300),
    equation="t = (Δp_max/(µ J) − R_0)/(dR/dt)",
    source=f"Darcy's law; {CHERYAN}",
    arguments={"viscosity": PERMEATE_VISCOSITY},
    refuses=[
        Rule(lambda flux: flux == 0, "the flux is 0: the pressure limit is never reached"),
        Rule(lambda resistance_rate: resistance_rate <= 0,
             "{resistance_rate}: the resistance does not grow, no cleaning falls due"),
        Rule(lambda flux, pressure_limit, viscosity, initial_resistance:
             viscosity * flux * initial_resistance > pressure_limit,
             "the pressure is above {pressure_limit} at the start already"),
    ],
)
def cleaning_interval(
    flux: Number,
    pressure_limit: Number,
    viscosity: Number,
    initial_resistance: Number,
    resistance_rate: Number,
) -> Number:
    """Time until the pressure limit is reached at constant flux.

    The resistance grows in proportion to time, as fouling_rate finds it. Cold water reaches the limit
    sooner: take the viscosity at the lowest temperature.
    """
    left = pressure_limit / (viscosity * flux) - initial_resistance
    return np.where((left >= 0) & (resistance_rate > 0), left, np.nan)[()] / resistance_rate


RIGHT_ANGLE = 0.5 * np.pi * (1 - 1e-12)


@worksheet_function(
    result="critical_pressure",
    equation="p = (4 σ cos θ/d_p) "
             "{1 − [(2 + 3 cos θ − cos³θ)/(4 (d_d/d_p)³ cos³θ − (2 − 3 sin θ + sin³θ))]^⅓}, not below 0",
    source=NAZZAL_WIESNER,
    arguments={"contact_angle": "Contact angle of the droplet on the membrane, measured through the water",
               "pore_diameter": replace(quantity("pore_diameter"), unit="µm", low=1e-3, high=1e4)},
    refuses=[Rule(lambda contact_angle: contact_angle >= RIGHT_ANGLE,
                  "{contact_angle} is not below 90 deg: it wets the membrane, nothing keeps it out")],
    cautions=[Rule(lambda result: result == 0,
                   "the droplet is so small, or wets so well, that it enters without any pressure")],
)
def pressure_droplet(
    interfacial_tension: Number, contact_angle: Number, pore_diameter: Number, droplet_diameter: Number
) -> Number:
    """Critical pressure that pushes a droplet into a pore of a membrane wetted by water.

    Laplace pressure of the meniscus in a cylindrical pore less that of the droplet outside, whose volume is
    kept; one droplet at rest, no flow past it. The contact angle is measured through the water, 0 for a
    fully wetted membrane; an angle measured through the oil is 180° less it. A droplet too small to hold
    back gives 0.
    """
    angle = np.minimum(contact_angle, RIGHT_ANGLE)
    cosine, sine = np.cos(angle), np.sin(angle)
    cap = 2.0 + 3.0 * cosine - cosine**3
    left_outside = 4.0 * (droplet_diameter / pore_diameter * cosine) ** 3 - (2.0 - 3.0 * sine + sine**3)
    held = 1.0 - (cap / np.maximum(left_outside, cap)) ** (1.0 / 3.0)
    held = np.where(contact_angle < RIGHT_ANGLE, held, np.nan)[()]
    return 4.0 * interfacial_tension * cosine / pore_diameter * held


@worksheet_function(result="loading", equation="m/A = J t C", source="mass balance")
def solids_loading(flux: Number, filtration_time: Number, concentration: Number) -> Number:
    """Solids brought to the membrane in one cycle, per area.

    Dead-end: all that comes stays until the backwash. With a bleed or crossflow it is the most that can
    deposit.
    """
    return flux * filtration_time * concentration
