"""A whole campaign: concentrate, diafilter, concentrate again."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Number, Rule, worksheet_function
from ..quantities import quantity
from ._elements import refuse
from ._flux_law import GEL_CLEARANCE
from ._gel_model import ABOVE_CLEAN_WATER, AT_GEL, NO_MAXIMUM, NO_SOLUTE, NO_TRANSFER, PROCESS_TIME, gel_flux
from .batch import GEL_SOURCE, batch_time, flux_mean
from .concentration import concentration_batch, yield_batch
from .diafiltration import diafiltration_remaining, diafiltration_time

TOPIC = "concentration"


def _gel_is_reached(feed_concentration, first_concentration_factor, diavolumes, second_concentration_factor,
                    gel_concentration, product_rejection) -> bool:
    """After the first or after the second concentration."""
    washing = diafiltration_remaining(diavolumes, 1.0 - product_rejection)
    first = concentration_batch(feed_concentration, first_concentration_factor, product_rejection)
    second = concentration_batch(first * washing, second_concentration_factor, product_rejection)
    return max(first, second) >= gel_concentration * (1 - GEL_CLEARANCE)


CAMPAIGN_REFUSALS = [
    NO_TRANSFER,
    NO_SOLUTE,
    AT_GEL,
    Rule(_gel_is_reached,
         "the product reaches {gel_concentration} in the campaign, and the flux falls to 0; lower a factor"),
]


@worksheet_function(
    results=[
        PROCESS_TIME,
        replace(quantity("retentate_volume"), meaning="Volume of the retentate at the end of the step"),
        replace(quantity("retentate_concentration"), name="product_concentration",
                meaning="Product concentration at the end of the step"),
        replace(quantity("ratio"), name="impurity", symbol="C_i/C_i0",
                meaning="Impurity concentration over that of the feed, at the end of the step"),
        replace(quantity("yield_fraction"), meaning="Share of the product that the step retains"),
        replace(quantity("flux"), meaning="Mean flux of the step, permeate over area and time"),
    ],
    equation="batch by X_1, N diavolumes at constant volume, batch by X_2: batch_time, diafiltration_time",
    source=GEL_SOURCE,
    default_texts=NO_MAXIMUM,
    refuses=CAMPAIGN_REFUSALS,
    cautions=[ABOVE_CLEAN_WATER],
    dimensional="rows of a table",
)
def campaign(
    feed_volume: Number,
    feed_concentration: Number,
    first_concentration_factor: Number,
    diavolumes: Number,
    second_concentration_factor: Number,
    area: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    product_rejection: Number = 1.0,
    impurity_sieving: Number = 1.0,
    maximum_flux: Number | None = None,
) -> tuple:
    """Concentrate, diafilter, concentrate: time, volumes, purity and yield of a campaign, by the gel model.

    One row each: first concentration, diafiltration, second concentration, total. Volume, product
    concentration and impurity (over its concentration in the feed) are at the end of the step; the yield is
    the step's own, and the total's that of the campaign. The product limits the flux. Constant observed
    rejections, well mixed, no losses but through the membrane. A step left out, with a factor of 1 or no
    diavolumes, takes no time and shows the flux that it would start with.
    """
    refuse(CAMPAIGN_REFUSALS, feed_concentration=feed_concentration, diavolumes=diavolumes,
           first_concentration_factor=first_concentration_factor,
           second_concentration_factor=second_concentration_factor,
           mass_transfer_coefficient=mass_transfer_coefficient, gel_concentration=gel_concentration,
           product_rejection=product_rejection, maximum_flux=maximum_flux)
    law = (mass_transfer_coefficient, gel_concentration)
    product_sieving, impurity_rejection = 1.0 - product_rejection, 1.0 - impurity_sieving
    washed = feed_volume / first_concentration_factor
    final = washed / second_concentration_factor
    concentrated = concentration_batch(feed_concentration, first_concentration_factor, product_rejection)
    diafiltered = concentrated * diafiltration_remaining(diavolumes, product_sieving)
    product = concentration_batch(diafiltered, second_concentration_factor, product_rejection)

    first = (feed_concentration, first_concentration_factor)
    second = (diafiltered, second_concentration_factor)
    times = np.array([
        batch_time(feed_volume, *first, area, *law, product_rejection, maximum_flux),
        diafiltration_time(washed, concentrated, diavolumes, area, *law, product_sieving, maximum_flux),
        batch_time(washed, *second, area, *law, product_rejection, maximum_flux),
    ])
    waiting = gel_flux(concentrated, *law, maximum_flux)
    fluxes = [
        flux_mean(*first, *law, product_rejection, maximum_flux),
        diavolumes * washed / (area * times[1]) if diavolumes > 0 else waiting,
        flux_mean(*second, *law, product_rejection, maximum_flux),
    ]
    permeate = feed_volume - final + diavolumes * washed
    impurity = np.cumprod([
        concentration_batch(1.0, first_concentration_factor, impurity_rejection),
        diafiltration_remaining(diavolumes, impurity_sieving),
        concentration_batch(1.0, second_concentration_factor, impurity_rejection),
    ])
    yields = [
        yield_batch(first_concentration_factor, product_rejection),
        diafiltration_remaining(diavolumes, product_sieving),
        yield_batch(second_concentration_factor, product_rejection),
    ]
    total = times.sum()
    return (
        np.append(times, total),
        np.array([washed, washed, final, final]),
        np.array([concentrated, diafiltered, product, product]),
        np.append(impurity, impurity[-1]),
        np.append(yields, np.prod(yields)),
        np.append(fluxes, permeate / (area * total) if total > 0 else fluxes[0]),
    )
