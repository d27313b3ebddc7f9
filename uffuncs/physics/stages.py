"""Feed-and-bleed cascades: stages in series, each with its recirculation loop."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import NoResult
from ..quantities import quantity
from ._cascade import SPLITS, Cascade, cascade, equal_permeate_limit, rated_logs, split_logs
from ._elements import elementwise, refuse
from ._flux_law import END_SLACK, GEL_CLEARANCE, HIGH_FLUX, FluxLaw, gel_law, measured_law
from ._gel_model import (
    ABOVE_MEASURED, AT_GEL, BELOW_MEASURED, CHERYAN, GEL_MODEL, NO_MAXIMUM, NO_TRANSFER, POINTS,
)
from .plant import RAUTENBACH

TOPIC = "plant"

#: The least mean rise of the concentration in a stage, relative, that still means something.
LEAST_RISE = 1e-6

BALANCES = f"balances of feed-and-bleed stages; {CHERYAN}; {RAUTENBACH}"
SOURCE = f"{BALANCES}; least area: optimisation of this library"
EQUATION = "F_(i−1) C_(i−1) = C_i (F_i + (1−R) P_i), F_i = F_(i−1) − P_i, A_i = P_i/J(C_i)"
COLUMNS = [
    replace(quantity("retentate_concentration"), meaning="Concentration in the stage and at its outlet"),
    replace(quantity("flux"), meaning="Flux of the stage; of the whole: total permeate over total area"),
    replace(quantity("permeate_flow"), meaning="Permeate flow of the stage"),
    replace(quantity("retentate_flow"), meaning="Retentate flow to the next stage"),
    replace(quantity("area"), meaning="Membrane area of the stage"),
    replace(quantity("yield_fraction"), meaning="Share of the solute retained so far"),
]
SPLIT = {"split": "How the work is divided between the stages"}


def _rise(feed_concentration, final_concentration):
    return math.log(final_concentration / feed_concentration)


NO_FEED = Rule(lambda feed_flow: feed_flow == 0, "{feed_flow}: there is no feed")
NO_SOLUTE_FED = Rule(lambda feed_concentration: feed_concentration == 0,
                     "{feed_concentration}: there is nothing to concentrate")
NOT_RETAINED = Rule(lambda rejection: rejection == 0,
                    "{rejection}: a solute that is not retained is not concentrated")
CASCADE_REFUSALS = [
    NO_FEED,
    NO_SOLUTE_FED,
    Rule(lambda feed_concentration, final_concentration: final_concentration <= feed_concentration,
         "{final_concentration} is not above {feed_concentration}"),
    NOT_RETAINED,
    Rule(lambda feed_concentration, final_concentration, stages, rejection:
         rejection < 1 and _rise(feed_concentration, final_concentration) >= -stages * math.log1p(-rejection),
         "{final_concentration} is out of reach: a stage of any area concentrates by less than 1/(1 − R)"),
    Rule(lambda feed_concentration, final_concentration, stages:
         math.expm1(_rise(feed_concentration, final_concentration) / stages) < LEAST_RISE,
         "more stages than make sense: the concentration rises by less than 1e-6 of itself in a stage"),
    Rule(lambda feed_concentration, final_concentration, stages, rejection, split:
         split == "equal permeate"
         and _rise(feed_concentration, final_concentration) >= equal_permeate_limit(int(stages), rejection),
         "{final_concentration} is out of reach with equal permeate flows: the last stage has no feed left"),
]
GEL_CASCADE_REFUSALS = [
    NO_TRANSFER,
    AT_GEL,
    Rule(lambda final_concentration, gel_concentration: (
            final_concentration >= gel_concentration * (1 - GEL_CLEARANCE)),
         "{final_concentration} is not below {gel_concentration}: the flux of the last stage falls to 0"),
    *CASCADE_REFUSALS,
]
#: After all that can be told beforehand.
NO_SPLIT = [
    Rule(lambda split: split != "least area", "{final_concentration} is out of reach with this split"),
    Rule(lambda split: split == "least area",
         "there is no least area: it falls on towards a stage that passes all it is fed, the solute included; "
         "take more stages"),
]

STAGES_ARGUMENTS = (
    "feed_flow", "feed_concentration", "final_concentration", "stages", "mass_transfer_coefficient",
    "gel_concentration", "rejection", "maximum_flux", "split",
)


def _gel_cascade(**named) -> Cascade | None:
    """By the arguments of stages; None where a rule above refuses, or the split does not reach the end."""
    if any(rule.when(**{name: named[name] for name in rule.names}) for rule in GEL_CASCADE_REFUSALS):
        return None
    maximum = math.inf if named["maximum_flux"] is None else named["maximum_flux"]
    law = gel_law(
        named["feed_concentration"], named["mass_transfer_coefficient"], named["gel_concentration"], maximum)
    return _designed(law, *(named[name] for name in (
        "feed_flow", "feed_concentration", "final_concentration", "stages", "rejection", "split")))


def _designed(
    law: FluxLaw, feed_flow, feed_concentration, final_concentration, stages, rejection, split
) -> Cascade | None:
    first, last = law.log(feed_concentration), law.log(final_concentration)
    logs = split_logs(law, split, first, last, int(stages), rejection)
    return None if logs is None else cascade(law, feed_flow, first, logs, rejection)


def _above_clean_water(
    feed_flow, feed_concentration, final_concentration, stages, mass_transfer_coefficient, gel_concentration,
    rejection, maximum_flux, split,
) -> bool:
    found = _gel_cascade(**locals()) if maximum_flux is None else None
    return found is not None and found.fluxes[0] > HIGH_FLUX


ABOVE_CLEAN_WATER_FIRST = Rule(
    _above_clean_water,
    "the gel model's flux of the first stage is above 200 L/(m²·h), more than most membranes pass of clean "
    "water (common practice, no source): give maximum_flux",
)


@worksheet_function(
    results=COLUMNS,
    equation=f"{EQUATION}, J = min(J_max, k ln(C_g/C))",
    source=f"{SOURCE}; {GEL_MODEL}",
    choices={"split": SPLITS},
    names=SPLIT,
    default_texts=NO_MAXIMUM,
    refuses=[*GEL_CASCADE_REFUSALS, *NO_SPLIT],
    cautions=[ABOVE_CLEAN_WATER_FIRST],
    dimensional="numerical optimisation",
)
def stages(
    feed_flow: Number,
    feed_concentration: Number,
    final_concentration: Number,
    stages: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    rejection: Number = 1.0,
    maximum_flux: Number | None = None,
    split: str = "least area",
) -> tuple:
    """Stages of a feed-and-bleed cascade to a final concentration, by the gel model.

    One row for each stage from the feed on, then the whole: final concentration, mean flux, total permeate,
    final retentate flow, total area, yield. A stage is well mixed: its flux is that at its own outlet
    concentration, its permeate at 1 − R of it. The split `least area` takes the intermediate concentrations
    for which the total area is least, `equal permeate` gives every stage the same permeate flow, `equal area`
    the same area. Least area does not look at the yield: with a rejection below 1 a smaller area may lose
    more. Where a single flux rules all stages they concentrate by equal ratios. k is one for all stages.
    Refused where the concentration would rise by less than 1e-6 of itself in a stage.
    """
    named = dict(locals())
    found = _gel_cascade(**named)
    if found is None:
        refuse([*GEL_CASCADE_REFUSALS, *NO_SPLIT], **named)
    return found.columns()


@worksheet_function(
    result=replace(quantity("area"), name="total_area", meaning="Total membrane area of the cascade"),
    equation=f"A = Σ A_i; {EQUATION}, J = min(J_max, k ln(C_g/C))",
    source=f"{SOURCE}; {GEL_MODEL}",
    choices={"split": SPLITS},
    names=SPLIT,
    default_texts=NO_MAXIMUM,
    refuses=[*GEL_CASCADE_REFUSALS, *NO_SPLIT],
    cautions=[ABOVE_CLEAN_WATER_FIRST],
    dimensional="numerical optimisation",
)
def stages_area(
    feed_flow: Number,
    feed_concentration: Number,
    final_concentration: Number,
    stages: Number,
    mass_transfer_coefficient: Number,
    gel_concentration: Number,
    rejection: Number = 1.0,
    maximum_flux: Number | None = None,
    split: str = "least area",
) -> Number:
    """Total area of a feed-and-bleed cascade, by the gel model: the total of stages as one number.

    The same assumptions as there.
    """
    def total(*scalars) -> float:
        found = _gel_cascade(**dict(zip(STAGES_ARGUMENTS, scalars)))
        return math.nan if found is None else math.fsum(found.areas)

    return elementwise(
        total, feed_flow, feed_concentration, final_concentration, stages, mass_transfer_coefficient,
        gel_concentration, rejection, maximum_flux, split)


def _flux_stays_above_zero(law: FluxLaw, first: float, last: float):
    within = [flux for log, flux in zip(law.logs, law.fluxes) if first <= log <= last]
    if min(within, default=1.0) <= 0 or law.flux(last) <= 0:
        raise NoResult("the measured flux falls to 0 within the range of concentrations")


TABLE_CASCADE_REFUSALS = [
    BELOW_MEASURED,
    Rule(lambda final_concentration, concentration: (
            final_concentration > max(concentration) * (1 + END_SLACK)),
         "{final_concentration} is above the highest measured concentration; the flux is not extrapolated"),
    *CASCADE_REFUSALS,
]
RATED_REFUSALS = [NO_FEED, NO_SOLUTE_FED, NOT_RETAINED, BELOW_MEASURED, ABOVE_MEASURED]
RISING = Rule(lambda concentration, flux: bool((np.diff(flux[np.argsort(concentration)]) > 0).any()),
              "the measured flux rises with concentration somewhere")


@worksheet_function(
    results=COLUMNS,
    equation=f"{EQUATION}, J linear in ln C between the measured points",
    source=SOURCE,
    arguments=POINTS,
    choices={"split": SPLITS},
    names=SPLIT,
    refuses=[*TABLE_CASCADE_REFUSALS, *NO_SPLIT],
    cautions=[RISING],
    dimensional="numerical optimisation",
)
def stages_table(
    feed_flow: Number,
    feed_concentration: Number,
    final_concentration: Number,
    stages: Number,
    concentration: Column,
    flux: Column,
    rejection: Number = 1.0,
    split: str = "least area",
) -> tuple:
    """Stages of a feed-and-bleed cascade to a final concentration, from measured fluxes.

    Rows, splits and assumptions as of stages. The flux is joined by straight lines on ln C and not
    extrapolated; the points, in any order, are of the crossflow, pressure and temperature of the loops. An
    optimum may lie on a measured point, where the slope of the flux changes.
    """
    named = dict(locals())
    law = measured_law(concentration, flux)
    refuse(TABLE_CASCADE_REFUSALS, **named)
    first, last = law.log(feed_concentration), law.log(final_concentration)
    _flux_stays_above_zero(law, first, last)
    found = _designed(law, feed_flow, feed_concentration, final_concentration, stages, rejection, split)
    if found is None:
        refuse(NO_SPLIT, **named)
    return found.columns()


@worksheet_function(
    results=COLUMNS,
    equation=f"{EQUATION}, J linear in ln C between the measured points",
    source=BALANCES,
    arguments={"area": "Membrane area of each stage, from the feed on", **POINTS},
    groups={"concentration": "measured", "flux": "measured"},
    refuses=RATED_REFUSALS,
    cautions=[RISING],
    dimensional="rows of a table",
)
def stages_rated(
    feed_flow: Number,
    feed_concentration: Number,
    area: Column,
    concentration: Column,
    flux: Column,
    rejection: Number = 1.0,
) -> tuple:
    """What an installed feed-and-bleed cascade does, from measured fluxes.

    Rows and assumptions as of stages: for the areas that stages_table gives, it gives back its concentrations
    and flows. The gel model is two measured points, or three with a highest flux. Where the flux rises with
    concentration a stage may have several operating points: the lowest counts, where a stage comes to rest
    that starts up filled with its feed.
    """
    law = measured_law(concentration, flux)
    refuse(RATED_REFUSALS, feed_flow=feed_flow, feed_concentration=feed_concentration, rejection=rejection,
           concentration=concentration)
    first = law.log(feed_concentration)
    logs = rated_logs(law, feed_flow, first, area.tolist(), rejection)
    return cascade(law, feed_flow, first, logs, rejection).columns()


@worksheet_function(
    results=["stage", "component_number", "retentate_concentration", "yield_fraction",
             replace(quantity("diafiltration_flow"), name="water_used",
                     meaning="Diafiltration water to this stage and those before")],
    equation="F_(i−1) C_(i−1) = C_i (F_i + (1−R) P_i), F_i = F_(i−1) + W_i − P_i",
    source=BALANCES,
    arguments={"feed_concentration": "Concentration of each component in the feed",
               "rejection": replace(quantity("rejection"), low=-1,  # salts, by Donnan exclusion
                                    meaning="Rejection of each component"),
               "permeate_flow": "Permeate flow of each stage, from the feed on",
               "diafiltration_flow": "Flow of water into each stage, 0 for none"},
    groups={"permeate_flow": "stages", "diafiltration_flow": "stages"},
    dimensional="rows of a table",
)
def stages_diafiltration(
    feed_flow: Number,
    feed_concentration: Column,
    rejection: Column,
    permeate_flow: Column,
    diafiltration_flow: Column,
) -> tuple:
    """Concentration and yield of each component in a feed-and-bleed cascade with diafiltration.

    One row for each stage and component: all components of the first stage, then of the second, and so on,
    numbered in the first two columns. Yield and water used count from the feed up to this stage. Components
    and stages are two groups of ranges, each of its own length. Well mixed stages, constant rejections; the
    water goes into the loop.
    """
    if feed_flow == 0:
        raise NoResult("feed_flow 0 m³/h: there is no feed")
    components, stage_count = len(rejection), len(permeate_flow)
    flow, concentration, kept = feed_flow, feed_concentration, np.ones(components)
    concentrations, yields = [], []
    for i, (permeate, water) in enumerate(zip(permeate_flow, diafiltration_flow), 1):
        left = flow + water - permeate
        if left <= 1e-12 * flow:
            shown = quantity("flow").shown
            raise NoResult(f"stage {i}: the permeate {shown(permeate)} leaves nothing of the feed and water "
                           f"{shown(flow + water)}")
        out = left + (1.0 - rejection) * permeate
        concentration, kept, flow = concentration * flow / out, kept * left / out, left
        concentrations.append(concentration)
        yields.append(kept)
    return (
        np.repeat(np.arange(1.0, stage_count + 1), components),
        np.tile(np.arange(1.0, components + 1), stage_count),
        np.concatenate(concentrations),
        np.concatenate(yields),
        np.repeat(np.cumsum(diafiltration_flow), components),
    )
