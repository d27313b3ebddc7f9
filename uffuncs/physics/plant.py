"""Continuous plants: recovery, balances, area, whole modules, racks, the parallel–series tapered array."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..declaration import Number, Rule, worksheet_function
from ..errors import NoResult
from ..quantities import quantity
from ._elements import above_zero, refuse
from ._flux_law import GEL_CLEARANCE
from ._gel_model import ABOVE_CLEAN_WATER, GEL_MODEL, GEL_REFUSALS, NO_MAXIMUM, volume_over_flux
from .permeation import D6161, IUPAC

RAUTENBACH = "Rautenbach & Albrecht, Membrane Processes, Wiley (1989)"

#: A quotient this near above a whole number, relative, is that number: 12.000000001 modules are 12.
WHOLE_SLACK = 1e-9
#: An array of more stages in series than this is no array, but a flux or a module that is far too small.
MOST_STAGES = 500
#: ln of the concentration factor of one stage at which practically all its feed has become permeate.
ALL_PASSED = 30.0


@worksheet_function(
    result="ratio",
    equation="r = Q_c/Q_f",
    source="definition; common practice, no source",
    refuses=[Rule(lambda feed_flow: feed_flow == 0, "{feed_flow}: there is no feed")],
    arguments={"crossflow": "Flow around the loop, along the membrane"},
)
def recycle_ratio(crossflow: Number, feed_flow: Number) -> Number:
    """Flow around the loop over the feed flow of a stage."""
    return crossflow / feed_flow


@worksheet_function(
    result="recovery",
    equation="Q_p/Q_f",
    source=f"{IUPAC}; {D6161}",
    refuses=[Rule(lambda feed_flow: feed_flow == 0, "{feed_flow}: there is no feed")],
    cautions=[Rule(lambda permeate_flow, feed_flow: permeate_flow > feed_flow,
                   "{permeate_flow} is above {feed_flow}")],
)
def recovery(feed_flow: Number, permeate_flow: Number) -> Number:
    """Recovery: permeate flow over feed flow."""
    return permeate_flow / feed_flow


@worksheet_function(
    result="balance_error",
    equation="e = (Q_f C_f − Q_p C_p − Q_r C_r)/(Q_f C_f)",
    source="balance of the solute",
    refuses=[Rule(lambda feed_flow, feed_concentration: feed_flow * feed_concentration == 0,
                  "the feed carries no solute")],
)
def balance_error(
    feed_flow: Number,
    feed_concentration: Number,
    permeate_flow: Number,
    permeate_concentration: Number,
    retentate_flow: Number,
    retentate_concentration: Number,
) -> Number:
    """Closure of the solute balance at steady state, relative to the feed.

    Above 0 solute is missing (adsorbed, deposited, mismeasured), below 0 more comes out than goes in.
    """
    fed = feed_flow * feed_concentration
    return (fed - permeate_flow * permeate_concentration - retentate_flow * retentate_concentration) / fed


@worksheet_function(
    result="area",
    equation="A = Q_p/(J a)",
    source=f"{IUPAC}; {D6161}",
    refuses=[Rule(lambda flux: flux == 0, "{flux}: no area is enough")],
    arguments={"permeate_flow": "Mean permeate flow over calendar time", "flux": "Flux while in service"},
)
def area(permeate_flow: Number, flux: Number, availability: Number = 1.0) -> Number:
    """Membrane area for a permeate flow, at a flux and an availability."""
    return permeate_flow / (flux * availability)


def _whole(number: Number) -> Number:
    """Rounded up to a whole number, a hair of rounding error left out."""
    return np.ceil(number * (1.0 - WHOLE_SLACK))


@worksheet_function(
    result="modules",
    equation="n = ⌈A (1 + s)/A_m⌉",
    source="definition; common practice, no source",
)
def modules(area: Number, module_area: Number, spare_fraction: Number = 0.0) -> Number:
    """Whole modules for an area with spare, rounded up.

    An excess below 1e-9 of the number is rounding error, and not one more module.
    """
    return _whole(area * (1.0 + spare_fraction) / module_area)


@worksheet_function(
    result="flux",
    equation="J = Q_p/((n − n_out) m A_m)",
    source="definition; common practice, no source",
    refuses=[Rule(lambda racks, racks_out: racks_out >= racks, "{racks_out} of {racks}: none is in service")],
)
def flux_racks(
    permeate_flow: Number, racks: Number, racks_out: Number, modules_per_rack: Number, module_area: Number
) -> Number:
    """Flux of the racks in service when others are out, for cleaning, test or repair."""
    return permeate_flow / (above_zero(racks - racks_out) * modules_per_rack * module_area)


# --- the tapered array --------------------------------------------------------------------------------------

TAPER_REFUSALS = [
    Rule(lambda feed_flow: feed_flow == 0, "{feed_flow}: there is no feed"),
    Rule(lambda concentration_factor: concentration_factor == 1,
         "{concentration_factor}: there is nothing to concentrate"),
    Rule(lambda minimum_module_flow, maximum_module_flow: minimum_module_flow >= maximum_module_flow,
         "{minimum_module_flow} is not below {maximum_module_flow}"),
    *GEL_REFUSALS,
]


@worksheet_function(
    results=[
        replace(quantity("modules"), meaning="Modules in parallel"),
        replace(quantity("feed_flow"), meaning="Feed flow of one module"),
        replace(quantity("flux"), meaning="Mean flux of the stage"),
        replace(quantity("permeate_flow"), meaning="Permeate flow of the stage"),
        replace(quantity("retentate_concentration"), meaning="Concentration that leaves the stage"),
    ],
    equation="per stage m = ⌈F/Q_max⌉, m A_m = F ∫ e^(−u)/J du, u from 0 to ln(F/F_out), C = C_in e^(R u), "
             "J = min(J_max, k ln(C_g/C))",
    source=f"balances along the modules with the {GEL_MODEL}; {RAUTENBACH}",
    default_texts=NO_MAXIMUM,
    refuses=TAPER_REFUSALS,
    cautions=[ABOVE_CLEAN_WATER],
    dimensional="rows of a table",
)
def taper(
    feed_flow: Number,
    feed_concentration: Number,
    concentration_factor: Number,
    module_area: Number,
    minimum_module_flow: Number,
    maximum_module_flow: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    rejection: Number = 1.0,
    maximum_flux: Number | None = None,
) -> tuple:
    """Parallel–series tapered array of whole modules, with stages until the concentration factor is reached.

    Without recirculation. Each stage has the fewest modules whose inlet flow does not exceed the maximum;
    what they retain feeds the next. The concentration rises along a module in plug flow, so that the stage's
    flux is the integral mean between its inlet and its outlet, flux_mean of the stage's own concentration
    factor. The last stage has as many modules as any other would; its permeate is throttled until the target
    is met exactly, so that its flux is below what the law allows. k is one for all stages, though it falls
    with the flow along a module: take it at a low flow. Pressure losses are left out.
    """
    refuse(TAPER_REFUSALS, feed_flow=feed_flow, feed_concentration=feed_concentration,
           concentration_factor=concentration_factor, minimum_module_flow=minimum_module_flow,
           maximum_module_flow=maximum_module_flow, mass_transfer_coefficient=mass_transfer_coefficient,
           gel_concentration=gel_concentration, rejection=rejection, maximum_flux=maximum_flux)
    law = (mass_transfer_coefficient, gel_concentration, rejection, maximum_flux)
    final_flow = feed_flow / concentration_factor
    flow, rows = feed_flow, []
    while flow > final_flow * (1.0 + WHOLE_SLACK):
        if len(rows) == MOST_STAGES:
            raise NoResult(f"{MOST_STAGES} stages in series do not reach the concentration factor: "
                           "the modules are too small or the flux too low for their flow")
        parallel = float(_whole(flow / maximum_module_flow))
        inlet = feed_concentration * (feed_flow / flow) ** rejection
        outlet_flow = max(_outlet_flow(flow, inlet, parallel * module_area, *law), final_flow)
        if outlet_flow < parallel * minimum_module_flow * (1.0 - WHOLE_SLACK):
            outlet, least = map(quantity("flow").shown, (outlet_flow / parallel, minimum_module_flow))
            raise NoResult(f"stage {len(rows) + 1} of {parallel:g} modules in parallel: the outlet flow of a "
                           f"module, {outlet}, is below the minimum {least}")
        permeate = flow - outlet_flow
        rows.append((parallel, flow / parallel, permeate / (parallel * module_area), permeate,
                     feed_concentration * (feed_flow / outlet_flow) ** rejection))
        flow = outlet_flow
    return tuple(np.array(column) for column in zip(*rows))


def _outlet_flow(flow: float, inlet: float, stage_area: float, transfer: float, gel: float, rejection: float,
                 maximum: float | None) -> float:
    """Flow that leaves a stage in plug flow; 0 where the area would pass all of it."""
    from scipy.optimize import brentq

    def excess(length: float) -> float:
        per_flow = volume_over_flux(inlet, math.exp(length), transfer, gel, rejection, maximum)
        return flow * per_flow - stage_area

    longest = ALL_PASSED
    if rejection > 0 and inlet > 0:
        longest = min(longest, (math.log(gel / inlet) - 2 * GEL_CLEARANCE) / rejection)
    if excess(longest) < 0:
        # Either all becomes permeate, or the gel concentration is reached within rounding.
        return 0.0 if longest == ALL_PASSED else flow * math.exp(-longest)
    return flow * math.exp(-brentq(excess, 0.0, longest, xtol=1e-15, rtol=1e-14))
