"""Time, area and mean flux of a batch concentration, by the gel model and on measured fluxes."""

from __future__ import annotations

import math
from dataclasses import replace

from ..declaration import Column, Number, Rule, worksheet_function
from ..quantities import quantity
from ._elements import elementwise
from ._flux_law import END_SLACK, FluxLaw, along, drained, measured_law
from ._gel_model import (
    ABOVE_CLEAN_WATER, ABOVE_MEASURED, BELOW_MEASURED, CHERYAN, FOLEY, GEL_MODEL, GEL_REFUSALS, NO_MAXIMUM,
    NO_MEASURED_FLUX, POINTS, PROCESS_TIME, final_concentration, gel_flux, volume_over_flux,
)

TOPIC = "concentration"

GEL_SOURCE = f"balance of the batch with the {GEL_MODEL}; {FOLEY}"
TABLE_SOURCE = f"balance of the batch on measured fluxes; {CHERYAN}"

TIME_ALLOWED = replace(quantity("time"), low=1e-4, meaning="Process time allowed")
TABLE_REFUSALS = [
    BELOW_MEASURED,
    ABOVE_MEASURED,
    Rule(lambda feed_concentration, concentration_factor, rejection, concentration: (
            final_concentration(feed_concentration, concentration_factor, rejection)
            > max(concentration) * (1 + END_SLACK)),
         "{concentration_factor} leads above the highest measured concentration; flux is not extrapolated"),
    NO_MEASURED_FLUX,
]


@worksheet_function(
    result=PROCESS_TIME,
    equation="t = ∫ dV/(A J), V from V_0/X to V_0, C = C_0 (V_0/V)^R, J = min(J_max, k ln(C_g/C))",
    source=GEL_SOURCE,
    default_texts=NO_MAXIMUM,
    refuses=GEL_REFUSALS,
    cautions=[ABOVE_CLEAN_WATER],
    dimensional="numerical integration",
)
def batch_time(
    feed_volume: Number,
    feed_concentration: Number,
    concentration_factor: Number,
    area: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    rejection: Number = 1.0,
    maximum_flux: Number | None = None,
) -> Number:
    """Time of a batch concentration, by the gel model.

    A well mixed batch at constant crossflow and temperature; the observed rejection is constant and the
    permeate's concentration is neglected in the flux. `maximum_flux` is what the pressure allows. No
    cleaning, filling or emptying. Integrated piece by piece, the kink at the highest flux apart, to rounding.
    """
    return feed_volume / area * elementwise(
        volume_over_flux, feed_concentration, concentration_factor, mass_transfer_coefficient,
        gel_concentration, rejection, maximum_flux)


@worksheet_function(
    result="area",
    equation="A = ∫ dV/(t J), V from V_0/X to V_0, C = C_0 (V_0/V)^R, J = min(J_max, k ln(C_g/C))",
    source=GEL_SOURCE,
    arguments={"time": TIME_ALLOWED},
    default_texts=NO_MAXIMUM,
    refuses=GEL_REFUSALS,
    cautions=[ABOVE_CLEAN_WATER],
    dimensional="numerical integration",
)
def batch_area(
    feed_volume: Number,
    feed_concentration: Number,
    concentration_factor: Number,
    time: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    rejection: Number = 1.0,
    maximum_flux: Number | None = None,
) -> Number:
    """Membrane area that concentrates a batch in the given time, by the gel model; the inverse of batch_time.

    The same assumptions as there.
    """
    return feed_volume / time * elementwise(
        volume_over_flux, feed_concentration, concentration_factor, mass_transfer_coefficient,
        gel_concentration, rejection, maximum_flux)


def _table_volume_over_flux(law: FluxLaw, feed: float, factor: float, rejection: float) -> float:
    if feed == 0:
        return math.nan
    return along(law, law.log(feed), rejection, math.log(factor), drained, lambda u: math.exp(-u))


@worksheet_function(
    result=PROCESS_TIME,
    equation="t = ∫ dV/(A J(C)), V from V_0/X to V_0, C = C_0 (V_0/V)^R, J linear in ln C between points",
    source=TABLE_SOURCE,
    arguments=POINTS,
    refuses=TABLE_REFUSALS,
    dimensional="numerical integration",
)
def batch_time_table(
    feed_volume: Number,
    feed_concentration: Number,
    concentration_factor: Number,
    area: Number,
    concentration: Column,
    flux: Column,
    rejection: Number = 1.0,
) -> Number:
    """Time of a batch concentration, from measured fluxes.

    The flux is joined by straight lines on ln C, as the gel model has it between two points, and is not
    extrapolated. The points, in any order, are of the crossflow, pressure and temperature of the batch. A
    well mixed batch of constant observed rejection.
    """
    law = measured_law(concentration, flux)
    return feed_volume / area * elementwise(
        lambda *scalars: _table_volume_over_flux(law, *scalars), feed_concentration, concentration_factor,
        rejection)


@worksheet_function(
    result="area",
    equation="A = ∫ dV/(t J(C)), V from V_0/X to V_0, C = C_0 (V_0/V)^R, J linear in ln C between points",
    source=TABLE_SOURCE,
    arguments={"time": TIME_ALLOWED, **POINTS},
    refuses=TABLE_REFUSALS,
    dimensional="numerical integration",
)
def batch_area_table(
    feed_volume: Number,
    feed_concentration: Number,
    concentration_factor: Number,
    time: Number,
    concentration: Column,
    flux: Column,
    rejection: Number = 1.0,
) -> Number:
    """Membrane area that concentrates a batch in the given time, from measured fluxes.

    The inverse of batch_time_table, with the same assumptions and interpolation.
    """
    law = measured_law(concentration, flux)
    return feed_volume / time * elementwise(
        lambda *scalars: _table_volume_over_flux(law, *scalars), feed_concentration, concentration_factor,
        rejection)


@worksheet_function(
    result="flux",
    equation="J_mean = (V_0 − V)/(A t) = (1 − 1/X)/∫ e^(−u)/J du, u = ln(V_0/V) from 0 to ln X",
    source=GEL_SOURCE,
    default_texts=NO_MAXIMUM,
    refuses=GEL_REFUSALS,
    cautions=[ABOVE_CLEAN_WATER],
    dimensional="numerical integration",
)
def flux_mean(
    feed_concentration: Number,
    concentration_factor: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    rejection: Number = 1.0,
    maximum_flux: Number | None = None,
) -> Number:
    """Mean flux of a batch concentration, by the gel model.

    The mean over time: permeate volume over area and batch time. The assumptions of batch_time. At a
    concentration factor of 1 it is the flux at the feed's concentration.
    """
    return elementwise(_flux_mean, feed_concentration, concentration_factor, mass_transfer_coefficient,
                       gel_concentration, rejection, maximum_flux)


def _flux_mean(feed, factor, transfer, gel, rejection, maximum) -> float:
    if factor == 1:
        return gel_flux(feed, transfer, gel, maximum)
    return -math.expm1(-math.log(factor)) / volume_over_flux(feed, factor, transfer, gel, rejection, maximum)


@worksheet_function(
    result="flux",
    equation="J_mean = J_f + w (J_0 − J_f)",
    source=f"common practice; {CHERYAN}",
    cautions=[Rule(lambda final_flux, initial_flux: final_flux > initial_flux,
                   "{final_flux} is above {initial_flux}")],
)
def flux_mean_rule(initial_flux: Number, final_flux: Number, weight: Number = 0.33) -> Number:
    """Mean flux of a batch from its first and last flux, by the rule of thumb.

    Within some percent of the integral for a flux that falls with ln C over a common concentration factor;
    flux_mean integrates.
    """
    return final_flux + weight * (initial_flux - final_flux)
