"""Volume, concentration and yield of batch and continuous concentration, component by component."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declaration import Column, Labels, Number, Rule, worksheet_function
from ..errors import NoResult
from ..quantities import quantity
from ._gel_model import CHERYAN

BLATT_BATCH = ("Blatt, Robinson & Bixler, Membrane ultrafiltration: the diafiltration technique and its "
               "application to microsolute exchange and binding phenomena, Anal. Biochem. 26 (1968) 151")

MODES = ("batch", "continuous")


@worksheet_function(
    result="concentration_factor",
    equation="X = V_0/V",
    source=CHERYAN,
    cautions=[Rule(lambda result: result < 1, "{retentate_volume} is above {feed_volume}: that dilutes")],
)
def concentration_factor(feed_volume: Number, retentate_volume: Number) -> Number:
    """Volume concentration factor from the volumes of feed and retentate."""
    return feed_volume / retentate_volume


@worksheet_function(
    result="retentate_concentration",
    equation="C = C_0 X^R",
    source=f"{CHERYAN}; {BLATT_BATCH}",
)
def concentration_batch(
    feed_concentration: Number, concentration_factor: Number, rejection: Number = 1.0
) -> Number:
    """Concentration in the retentate after batch concentration.

    A well mixed batch with an observed rejection that stays constant while it is concentrated.
    """
    return feed_concentration * concentration_factor**rejection


@worksheet_function(
    result="yield_fraction",
    equation="Y = X^(R − 1)",
    source=f"{CHERYAN}; {BLATT_BATCH}",
)
def yield_batch(concentration_factor: Number, rejection: Number) -> Number:
    """Share of a solute that stays in the retentate of a batch concentration.

    A well mixed batch with an observed rejection that stays constant while it is concentrated.
    """
    return concentration_factor ** (rejection - 1.0)


@worksheet_function(
    result="retentate_concentration",
    equation="C = C_0 X/(1 + (X − 1)(1 − R))",
    source=CHERYAN,
)
def concentration_continuous(
    feed_concentration: Number, concentration_factor: Number, rejection: Number = 1.0
) -> Number:
    """Concentration in the retentate of one continuous, well mixed stage.

    Feed and bleed at steady state: the whole stage is at the concentration of its outlet, and the permeate at
    1 − R of it.
    """
    return feed_concentration * concentration_factor * yield_continuous(concentration_factor, rejection)


@worksheet_function(
    result="yield_fraction",
    equation="Y = 1/(1 + (X − 1)(1 − R))",
    source=CHERYAN,
)
def yield_continuous(concentration_factor: Number, rejection: Number) -> Number:
    """Share of a solute that stays in the retentate of one continuous, well mixed stage.

    Lower than in a batch of the same concentration factor: the stage works at its highest concentration all
    the time.
    """
    return 1.0 / (1.0 + (concentration_factor - 1.0) * (1.0 - rejection))


@worksheet_function(
    results=["retentate_concentration", "permeate_concentration", "yield_fraction", "share"],
    equation="batch: C = C_0 X^R e^(−(1−R)N), Y = C/(C_0 X); continuous: C = C_0 X/(1 + (1−R)(X − 1 + N)); "
             "mean C_p = C_0 (1 − Y)/(1 − 1/X + N/X)",
    source=f"balances of each component; {CHERYAN}",
    choices={"mode": MODES},
    arguments={"rejection": replace(quantity("rejection"), low=-1)},  # salts, by Donnan exclusion
    names={"component": "Names of the components", "mode": "Batch, or one continuous mixed stage"},
    dimensional="rows of a table",
)
def composition(
    component: Labels,
    feed_concentration: Column,
    rejection: Column,
    concentration_factor: Number,
    diavolumes: Number = 0.0,
    mode: str = "batch",
) -> tuple:
    """Composition of retentate and mean permeate, component by component: milk, whey, a broth.

    One row for each component in the order given, then the total solids. Each component has its own constant
    observed rejection and takes no notice of the others. The batch is first concentrated, then diafiltered at
    constant volume; in the continuous stage the water goes into the stage, diavolumes times its retentate
    flow. The share is that of the retentate's total solids. The permeate is taken as a whole, diafiltration
    included; with no permeate at all its concentration is that of the first drop.
    """
    total_feed = feed_concentration.sum()
    if total_feed == 0:
        empty = ", ".join(map(str, component))[:60]
        raise NoResult(f"the feed holds nothing of {empty}: all feed concentrations are 0")
    sieving = 1.0 - rejection
    if mode == "batch":
        exponent = -sieving * (np.log(concentration_factor) + diavolumes)
        remaining, lost = np.exp(exponent), -np.expm1(exponent)
    else:
        passing = sieving * (concentration_factor - 1.0 + diavolumes)
        remaining, lost = 1.0 / (1.0 + passing), passing / (1.0 + passing)
    retentate = feed_concentration * concentration_factor * remaining
    permeate_volume = (concentration_factor - 1.0 + diavolumes) / concentration_factor  # over the feed's
    permeate = feed_concentration * (lost / permeate_volume if permeate_volume > 0 else sieving)
    return (
        np.append(retentate, retentate.sum()),
        np.append(permeate, permeate.sum()),
        np.append(remaining, (feed_concentration * remaining).sum() / total_feed),
        np.append(retentate / retentate.sum(), 1.0),
    )


@worksheet_function(
    result="loading",
    equation="m/A = V C/A",
    source="definition; common practice, no source",
    arguments={"volume": "Volume of the solution processed"},
)
def loading(volume: Number, concentration: Number, area: Number) -> Number:
    """Mass of solute brought to the membrane, per area."""
    return volume * concentration / area


@worksheet_function(
    result="yield_fraction",
    equation="Y = (V + h(1 − e^(−F/h)))/(V + h)",
    source="balance of a holdup that the flush washes out as a well mixed volume; common practice, no source",
)
def yield_flush(pool_volume: Number, holdup_volume: Number, flush_volume: Number = 0.0) -> Number:
    """Share of the product recovered when the holdup is flushed into the pool.

    Pool and holdup are at one concentration before the flush, and the holdup is washed out as a well mixed
    volume: a plug of flush pushes out more. No product is lost otherwise.
    """
    if isinstance(holdup_volume, np.ndarray):
        some = np.where(holdup_volume > 0, holdup_volume, 1.0)
        flushed = np.where(holdup_volume > 0, -np.expm1(-flush_volume / some), 1.0)
    else:
        flushed = -np.expm1(-flush_volume / holdup_volume) if holdup_volume > 0 else 1.0
    return (pool_volume + holdup_volume * flushed) / (pool_volume + holdup_volume)


@worksheet_function(
    result="area",
    equation="A_2 = A_1 (V_2/V_1)(t_1/t_2)",
    source="constant loading and mean flux; common practice, no source",
    arguments={
        "area": "Membrane area at the present scale",
        "volume": replace(quantity("volume"), low=1e-9, meaning="Volume at the present scale"),
        "time": replace(quantity("time"), low=1e-4, meaning="Process time at the present scale"),
    },
)
def area_scaled(area: Number, volume: Number, new_volume: Number, time: Number, new_time: Number) -> Number:
    """Membrane area at another scale, for the same mean flux.

    With one process time also the volume per area, and so the loading, stays the same. Concentrations,
    membrane, channel, crossflow and pressure are those of the present scale.
    """
    return area * (new_volume / volume) * (time / new_time)
