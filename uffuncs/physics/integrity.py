"""Integrity tests of membranes: bubble point, pressure decay, breach flow, and the log removal verified."""

from __future__ import annotations

import inspect
from collections.abc import Callable
from dataclasses import replace

import numpy as np

from ..declaration import Column, Fitted, Number, Rule, worksheet_function
from ..errors import NoResult
from ..quantities import quantity
from .water import (
    R1_76,
    ROOM_TEMPERATURE,
    SR6_08,
    WATER_SURFACE_TENSION_20,
    water_density,
    water_surface_tension,
    water_viscosity,
)

NOTICE = ("direct integrity results and removal credit are set by the local regulator and by licensed "
          "practice; this is a calculation aid")

#: The same for the one line that a function wizard shows.
IN_SHORT = "A calculation aid: the regulator and licensed practice decide."

EPA = "EPA 815-R-06-009, Membrane Filtration Guidance Manual (2005)"
F316 = "ASTM F316, Pore Size Characteristics of Membrane Filters by Bubble Point and Mean Flow Pore Test"
CRANE = "Crane Technical Paper 410, Flow of Fluids through Valves, Fittings, and Pipe"
AIR = ("viscosity of air: Sutherland's law with 110.4 K (U.S. Standard Atmosphere, 1976) through 18.205 "
       "µPa·s at 20 °C (Lemmon & Jacobsen, Int. J. Thermophys. 25 (2004) 21)")


def _integrity_function(*, remarks: tuple[Rule, ...] = (), **declaration) -> Callable:
    """Declare a function of this topic: its notes and UF_WHY carry the notice."""

    def register(function: Callable) -> Callable:
        summary, _, notes = inspect.cleandoc(function.__doc__).partition("\n")
        function.__doc__ = f"{summary} {IN_SHORT}\n{notes}\n\n{NOTICE[0].upper()}{NOTICE[1:]}."
        return worksheet_function(remarks=[*remarks, Rule(lambda: True, NOTICE)], **declaration)(function)

    return register


# --- bubble point ----------------------------------------------------------------------------------------

RIGHT_ANGLE = 0.5 * np.pi * (1 - 1e-12)
NOT_WETTED = Rule(lambda contact_angle: contact_angle >= RIGHT_ANGLE,
                  "{contact_angle} is not below 90 deg: the membrane is not wetted, no pressure is needed")
WATER_TENSION = {"surface_tension": "water 20 °C"}


def _at_20(text: str) -> tuple[Rule, ...]:
    return (Rule(lambda surface_tension: surface_tension == WATER_SURFACE_TENSION_20,
                 f"surface tension of water at 20 °C; {text}"),)


def _capillary(surface_tension: Number, contact_angle: Number, shape_factor: Number) -> Number:
    """4 κ σ cos θ; NaN where the liquid does not wet."""
    wetting = np.where(contact_angle < RIGHT_ANGLE, np.cos(contact_angle), np.nan)[()]
    return 4.0 * shape_factor * surface_tension * wetting


@_integrity_function(
    result="bubble_point",
    equation="p_b = 4 κ σ cos θ/d",
    source=f"Young–Laplace (Cantor) equation; {F316}; {EPA}",
    default_texts=WATER_TENSION,
    refuses=[NOT_WETTED],
    remarks=_at_20("colder water needs more pressure"),
)
def bubble_point(
    defect_diameter: Number,
    surface_tension: Number = WATER_SURFACE_TENSION_20,
    contact_angle: Number = 0.0,
    shape_factor: Number = 1.0,
) -> Number:
    """Pressure at which air begins to pass a wetted defect of given diameter.

    Difference between the air and the water behind the defect. A contact angle of 0 and a shape factor of 1
    give the highest pressure; smaller values need proof for the membrane. Cold water has the higher surface
    tension: test_pressure takes it at the temperature.
    """
    return _capillary(surface_tension, contact_angle, shape_factor) / defect_diameter


@_integrity_function(
    result="defect_diameter",
    equation="d = 4 κ σ cos θ/p_b",
    source=f"Young–Laplace (Cantor) equation; {F316}; {EPA}",
    default_texts=WATER_TENSION,
    refuses=[NOT_WETTED],
    remarks=_at_20("in colder water the defect is larger"),
)
def defect_diameter(
    bubble_point: Number,
    surface_tension: Number = WATER_SURFACE_TENSION_20,
    contact_angle: Number = 0.0,
    shape_factor: Number = 1.0,
) -> Number:
    """Diameter of the smallest defect that passes air at a pressure; the inverse of bubble_point.

    The pressure is the difference between the air and the water behind the defect: test pressure less back
    pressure. A contact angle of 0 and a shape factor of 1 give the largest diameter, the coarsest
    resolution.
    """
    return _capillary(surface_tension, contact_angle, shape_factor) / bubble_point


FINEST_REQUIRED = 3e-6  # m, for Cryptosporidium


@_integrity_function(
    result="test_pressure",
    equation="p_test = 4 κ σ(T) cos θ/d + p_back",
    source=f"{EPA}, equation 4.1; resolution: 40 CFR 141.719(b)(3)(ii); surface tension: {R1_76}",
    arguments={"temperature": replace(quantity("temperature"), low=0, high=100,
                                      meaning="Lowest temperature of the water"),
               "back_pressure": "Highest pressure against the air in the test, static head included, gauge"},
    refuses=[NOT_WETTED],
    cautions=[Rule(lambda resolution: resolution > FINEST_REQUIRED * (1 + 1e-9),
                   "{resolution} is coarser than the 3 µm of 40 CFR 141.719(b)(3)(ii) for Cryptosporidium")],
)
def test_pressure(
    resolution: Number,
    temperature: Number,
    back_pressure: Number,
    contact_angle: Number = 0.0,
    shape_factor: Number = 1.0,
) -> Number:
    """Lowest test pressure that makes a defect of the wanted resolution pass air.

    Gauge. To hold during the whole test, at its end too; membrane makers limit it from above. A contact
    angle of 0 and a shape factor of 1 give the highest pressure; smaller values need proof for the
    membrane.
    """
    surface_tension = water_surface_tension(temperature)
    return bubble_point(resolution, surface_tension, contact_angle, shape_factor) + back_pressure


# --- pressure decay --------------------------------------------------------------------------------------


def _air_viscosity(temperature: Number) -> Number:
    """Dynamic viscosity of air near atmospheric pressure, by Sutherland's law."""
    return 18.205e-6 * (temperature / 293.15) ** 1.5 * (293.15 + 110.4) / (temperature + 110.4)


PSI = 6894.757293168  # Pa
SONIC_DROP = 0.55  # Δp/p_1 at which air in the shortest path of Crane's charts reaches the speed of sound


def _laminar(temperature, transmembrane_pressure, inlet, outlet, atmospheric_pressure):
    """Hagen–Poiseuille for both fluids; the air expands isothermally and counts at atmospheric pressure."""
    driving = (inlet**2 - outlet**2) / (2.0 * atmospheric_pressure)
    return water_viscosity(temperature) / _air_viscosity(temperature) * driving / transmembrane_pressure


def _turbulent(temperature, transmembrane_pressure, inlet, outlet, expansion_factor):
    """Darcy's equation for both fluids with one loss coefficient: Y (ρ_w ρ_1 Δp/TMP)^½/ρ_std.

    ρ_1 is the density of air at the inlet pressure, ρ_std that at 14.7 psia and 60 °F. Written with the
    manual's rounded numbers: 170, where the constants make 169.8, and 460 °F for the zero of temperature.
    """
    rankine = 1.8 * temperature + 0.33  # 460 + t/°F
    driving = (inlet - outlet) / transmembrane_pressure * inlet / PSI
    return 170.0 * expansion_factor * (driving / rankine) ** 0.5


@_integrity_function(
    result="air_liquid_ratio",
    equation="p_1 = p_test + p_atm, p_2 = p_back + p_atm; laminar: (µ_w/µ_air)(p_1² − p_2²)/(2 p_atm Δp_tm); "
             "turbulent: 170 Y [(p_test − p_back) p_1/((460 + t) Δp_tm)]^½ in psi and °F",
    source=f"laminar: Hagen–Poiseuille, water: {SR6_08}, {AIR}; turbulent: {EPA}, Appendix C (not checked "
           f"against the print; 169.8 follows from Darcy's equation); Y: charts of {CRANE}",
    choices={"regime": ("laminar", "turbulent")},
    names={"regime": "Regime of the flow of air through the breach"},
    arguments={"transmembrane_pressure": replace(quantity("transmembrane_pressure"), low=1e-3,
                                                 meaning="Highest transmembrane pressure in operation"),
               "temperature": replace(quantity("temperature"), low=0, high=100,
                                      meaning="Temperature of water and air")},
    default_texts={"expansion_factor": "none; needed for turbulent"},
    refuses=[
        Rule(lambda regime, expansion_factor: regime == "turbulent" and expansion_factor is None,
             "the turbulent regime needs expansion_factor, Y of compressible flow; none is assumed"),
        Rule(lambda test_pressure, back_pressure: test_pressure <= back_pressure,
             "{test_pressure} does not exceed {back_pressure}: no air flows"),
    ],
    cautions=[
        Rule(lambda regime, test_pressure, back_pressure, atmospheric_pressure: regime == "turbulent"
             and test_pressure - back_pressure > SONIC_DROP * (test_pressure + atmospheric_pressure),
             "the air may flow at the speed of sound, which limits pressure difference and Y"),
        Rule(lambda regime, back_pressure: regime == "laminar" and back_pressure > 0,
             "with a back pressure some guidance divides by p_back + p_atm, not p_atm, and gets a lower "
             "ratio; ask the regulator"),
    ],
    remarks=(
        Rule(lambda regime: regime == "laminar", "laminar can be several times turbulent: state its ground"),
        Rule(lambda regime, expansion_factor: regime == "laminar" and expansion_factor is not None,
             "expansion_factor is not used"),
    ),
    dimensional="viscosities and the constants of the manual in their own units",
)
def air_liquid_ratio(
    test_pressure: Number,
    back_pressure: Number,
    transmembrane_pressure: Number,
    temperature: Number,
    atmospheric_pressure: Number,
    regime: str,
    expansion_factor: Number | None = None,
) -> Number:
    """Air–liquid conversion ratio: air flow in the test over water flow in operation, through one breach.

    A high ratio gives a high log removal. The laminar form can give several times the turbulent one: the
    regime is for the user to prove, from the size of the breach that the resolution names and the Reynolds
    number in it; turbulent is the cautious choice. A higher transmembrane pressure or temperature lowers
    the ratio. Gauge pressures but for the atmospheric one. The laminar air flow counts at atmospheric
    pressure, as log_removal_decay takes it; the turbulent one at 14.7 psia and 60 °F, which is on the safe
    side at high places.
    """
    inlet, outlet = test_pressure + atmospheric_pressure, back_pressure + atmospheric_pressure
    inlet = np.where(inlet > outlet, inlet, np.nan)[()]
    if regime == "laminar":
        return _laminar(temperature, transmembrane_pressure, inlet, outlet, atmospheric_pressure)
    factor = np.nan if expansion_factor is None else expansion_factor
    return _turbulent(temperature, transmembrane_pressure, inlet, outlet, factor)


LOG_REMOVAL = replace(quantity("log_removal"), low=-60, high=60)
NO_REMOVAL = Rule(lambda result: result <= 0, "{result}: the test verifies no removal at all")
NO_PERMEATE = Rule(lambda permeate_flow: permeate_flow == 0,
                   "the permeate flow is 0: there is no removal to tell")
DEPOSITION = Rule(lambda volumetric_concentration_factor: volumetric_concentration_factor == 1,
                  "a concentration factor of 1 holds in deposition mode only")


def _log10(ratio: Number) -> Number:
    return np.log10(np.where(ratio > 0, ratio, np.nan))


@_integrity_function(
    result=LOG_REMOVAL,
    equation="LRV = log10[Q_p ALCR p_atm/((dp/dt) V_sys VCF)]",
    source=f"{EPA}, equation 4.9",
    refuses=[NO_PERMEATE,
             Rule(lambda decay_rate: decay_rate <= 0,
                  "{decay_rate} is no decay: give the smallest rate that the test can tell, at least")],
    cautions=[NO_REMOVAL],
    remarks=(DEPOSITION,),
)
def log_removal_decay(
    permeate_flow: Number,
    air_liquid_ratio: Number,
    decay_rate: Number,
    system_volume: Number,
    volumetric_concentration_factor: Number,
    atmospheric_pressure: Number,
) -> Number:
    """Log removal value that a pressure decay test verifies.

    For the flow, volume and decay of the one membrane unit under test. The rate must not be below what the
    test can tell, and diffusion may be taken off it only as the regulator allows. A concentration factor of
    1 holds in deposition mode only.
    """
    decay = np.where(decay_rate > 0, decay_rate, np.nan)[()]
    air = decay * system_volume / atmospheric_pressure
    return _log10(permeate_flow * air_liquid_ratio / (air * volumetric_concentration_factor))


@_integrity_function(
    result="decay_rate",
    equation="dp/dt = Q_p ALCR p_atm/(V_sys VCF 10^LRV)",
    source=f"{EPA}, equation 4.17",
    remarks=(DEPOSITION,),
)
def decay_rate_limit(
    target_log_removal: Number,
    permeate_flow: Number,
    air_liquid_ratio: Number,
    system_volume: Number,
    volumetric_concentration_factor: Number,
    atmospheric_pressure: Number,
) -> Number:
    """Pressure decay rate that must not be passed for a log removal value; the inverse of log_removal_decay.

    The upper control limit of the test at this flow: take the lowest permeate flow at which the credit is
    claimed. A lower alarm limit is common.
    """
    air = permeate_flow * air_liquid_ratio / (volumetric_concentration_factor * 10.0**target_log_removal)
    return air * atmospheric_pressure / system_volume


# --- breach flow and challenge tests ---------------------------------------------------------------------


@_integrity_function(
    result=LOG_REMOVAL,
    equation="LRV = log10[Q_p/(VCF Q_b)]",
    source="40 CFR 141.719(b)(3)(iii)(A)",
    refuses=[NO_PERMEATE,
             Rule(lambda breach_flow: breach_flow == 0,
                  "the breach flow is 0: give that of the smallest breach that the test can tell")],
    cautions=[NO_REMOVAL],
    remarks=(DEPOSITION,),
)
def log_removal_breach(
    permeate_flow: Number, breach_flow: Number, volumetric_concentration_factor: Number
) -> Number:
    """Log removal value from the flow through the smallest breach that the test can tell.

    Total permeate flow of the unit over what passes the breach unfiltered, concentrated by the factor. A
    concentration factor of 1 holds in deposition mode only.
    """
    passing = np.where(breach_flow > 0, breach_flow, np.nan)[()]
    return _log10(permeate_flow / (volumetric_concentration_factor * passing))


ENTRANCE_LOSS = 1.5  # velocity heads: 0.5 for the sharp entrance, 1 lost at the exit


def _piece_velocity(pressure: Number, diameter: Number, length: Number, viscosity: Number) -> Number:
    """Root of Δp = 32 µ L u/d² + K ρ u²/2, in the form without a difference of like numbers."""
    friction = 32.0 * viscosity * length / diameter**2
    head = 2.0 * ENTRANCE_LOSS * water_density(ROOM_TEMPERATURE)
    return 2.0 * pressure / (friction + (friction**2 + head * pressure) ** 0.5)


def _reynolds(transmembrane_pressure, fiber_diameter, fiber_length, viscosity):
    velocity = _piece_velocity(transmembrane_pressure, fiber_diameter, np.min(fiber_length), viscosity)
    return water_density(ROOM_TEMPERATURE) * velocity * fiber_diameter / viscosity


@_integrity_function(
    result="breach_flow",
    equation="Q_b = Σ (π d²/4) u over the pieces, Δp = 32 µ L u/d² + 1.5 ρ u²/2",
    source=f"Hagen–Poiseuille; entrance loss 0.5 and exit loss 1 velocity head: {CRANE}",
    arguments={"fiber_diameter": "Inner diameter of the fiber",
               "fiber_length": "Lengths of both pieces, from the cut to the open end; one length: one piece",
               "viscosity": "Dynamic viscosity of the water"},
    fitted=[Fitted("Reynolds number", 0, 2000, value=_reynolds)],
    cautions=[Rule(lambda fiber_length: np.size(fiber_length) == 1,
                   "one length, one piece: a fiber open at both ends leaks through both; give both lengths")],
)
def breach_fiber(
    transmembrane_pressure: Number, fiber_diameter: Number, fiber_length: Column, viscosity: Number
) -> Number:
    """Flow of water through one cut fiber, added over its pieces.

    Each piece runs full between the cut and its open end, laminar, with the losses of a sharp entrance and
    of the exit. The place of the cut decides: give both lengths as a range, the worst place being next to
    the potting, where the short piece is the potted length. The density of water is that at 20 °C. Above a
    Reynolds number of 2000 the true flow is lower; so it is in short pieces, where the laminar profile is
    still forming: the value is on the safe side as a breach flow, not as what a test can tell.
    """
    pieces = np.atleast_1d(fiber_length)
    if len(pieces) > 2:
        raise NoResult(f"fiber_length has {len(pieces)} lengths; a cut fiber has two pieces")
    velocity = sum(_piece_velocity(transmembrane_pressure, fiber_diameter, p, viscosity) for p in pieces)
    return 0.25 * np.pi * fiber_diameter**2 * velocity


FULL_SAMPLE = 20  # modules from which the 10th percentile counts


@_integrity_function(
    result="log_removal",
    equation="lowest of fewer than 20; else the 10th percentile, plotting position i/(n + 1), linear between",
    source="40 CFR 141.719(b)(2)(vii)",
    arguments={"log_removal": "Representative log removal value of each module tested"},
    remarks=(
        Rule(lambda log_removal: len(log_removal) < FULL_SAMPLE, "the lowest of fewer than 20 modules"),
        Rule(lambda log_removal: len(log_removal) >= FULL_SAMPLE, "10th percentile of 20 modules or more"),
    ),
)
def log_removal_challenge(log_removal: Column) -> Number:
    """Removal efficiency from challenge tests of several modules.

    One representative value a module: for each, the lowest of its repeated challenges or as the regulator
    says. The rule caps nothing: the credit is also limited by the challenge and by the direct integrity
    test.
    """
    ordered = np.sort(log_removal)
    n = len(ordered)
    if n < FULL_SAMPLE:
        return ordered[0]
    rank = 0.1 * (n + 1)
    below = int(rank)
    return ordered[below - 1] + (rank - below) * (ordered[below] - ordered[below - 1])
