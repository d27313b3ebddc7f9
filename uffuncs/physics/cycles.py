"""Cycles of filtration and backwash, cleaning, tests: net flux, recovery, availability, chemical exposure."""

from __future__ import annotations

from dataclasses import replace

from ..declaration import Number, Rule, worksheet_function
from ..quantities import quantity
from ._elements import above_zero

TOPIC = "plant"

M53 = "AWWA Manual M53, Microfiltration and Ultrafiltration Membranes for Drinking Water, 2nd ed. (2016)"
BALANCE = f"water balance of the cycle; {M53}"

#: A share of a day this small is rounding: nothing is left.
ROUNDING = 1e-12

NET_FLUX = replace(quantity("net_flux"), low=-1e5)
NET_RECOVERY = replace(quantity("recovery"), low=-1e9, meaning="Net permeate over feed")
GROSS = "Flux while filtering, before backwash and downtime"
NEGATIVE = Rule(lambda result: result < 0,
                "it is negative: backwash and cleaning use more water than is filtered")
NOTHING_FED = Rule(lambda flux: flux == 0, "{flux}: nothing is fed")
NO_TIME_LEFT = Rule(lambda cleanings_per_day, cleaning_time, test_time_per_day:
                    _in_service(cleanings_per_day, cleaning_time, test_time_per_day) <= ROUNDING,
                    "{cleanings_per_day} of {cleaning_time} and {test_time_per_day} leave no time to filter")


def _in_service(cleanings_per_day, cleaning_time, test_time_per_day):
    """Share of the day that is left for cycles."""
    return 1.0 - cleanings_per_day * cleaning_time - test_time_per_day


@worksheet_function(
    result=NET_FLUX,
    equation="J_net = (J t_f − J_b t_b)/(t_f + t_b + t_i)",
    source=BALANCE,
    arguments={"flux": GROSS},
    cautions=[NEGATIVE],
)
def flux_net(
    flux: Number,
    filtration_time: Number,
    backwash_flux: Number,
    backwash_time: Number,
    idle_time: Number = 0.0,
) -> Number:
    """Net flux of a filtration cycle, after backwash with permeate and idle time."""
    net = flux * filtration_time - backwash_flux * backwash_time
    return net / (filtration_time + backwash_time + idle_time)


@worksheet_function(
    result=NET_RECOVERY,
    equation="(J t_f − J_b t_b)/(J t_f + V_f/A)",
    source=BALANCE,
    arguments={"flux": GROSS,
               "flush_volume_per_area": "Feed water used to flush, per membrane area, in one cycle"},
    refuses=[Rule(lambda flux, flush_volume_per_area: flux == 0 and flush_volume_per_area == 0,
                  "{flux}: nothing is fed")],
    cautions=[NEGATIVE],
)
def recovery_net(
    flux: Number,
    filtration_time: Number,
    backwash_flux: Number,
    backwash_time: Number,
    flush_volume_per_area: Number = 0.0,
) -> Number:
    """Recovery of a filtration cycle: net permeate over gross feed.

    Dead-end: the feed is what is filtered, and the flush, with feed water, comes on top. The backwash is
    permeate.
    """
    filtered = flux * filtration_time
    return (filtered - backwash_flux * backwash_time) / (filtered + flush_volume_per_area)


@worksheet_function(
    result=NET_FLUX,
    equation="J_net = s (J t_f − J_b t_b)/(t_f + t_b + t_i) − n_c V_c/A, s = 1 − n_c t_c − t_t",
    source=f"water balance of a day; {M53}",
    arguments={"flux": GROSS, "cleaning_volume_per_area": "Permeate used in one cleaning, per membrane area",
               "cleaning_time": "Time of one chemically enhanced wash, out of service"},
    refuses=[NO_TIME_LEFT],
    cautions=[NEGATIVE],
)
def flux_net_daily(
    flux: Number,
    filtration_time: Number,
    backwash_flux: Number,
    backwash_time: Number,
    idle_time: Number = 0.0,
    cleanings_per_day: Number = 0.0,
    cleaning_time: Number = 0.0,
    cleaning_volume_per_area: Number = 0.0,
    test_time_per_day: Number = 0.0,
) -> Number:
    """Net flux over a whole day, with chemically enhanced washes and integrity tests.

    Washes and tests stop the cycles; parts of a cycle count, so that it is the mean of many days. The washes
    use permeate. Without washes and tests it is flux_net.
    """
    cycle = flux_net(flux, filtration_time, backwash_flux, backwash_time, idle_time)
    share = above_zero(_in_service(cleanings_per_day, cleaning_time, test_time_per_day), ROUNDING)
    return share * cycle - cleanings_per_day * cleaning_volume_per_area


@worksheet_function(
    result=NET_RECOVERY,
    equation="[s (J t_f − J_b t_b)/t − n_c V_c/A]/(s J t_f/t), t = t_f + t_b + t_i, s = 1 − n_c t_c − t_t",
    source=f"water balance of a day; {M53}",
    arguments={"flux": GROSS, "cleaning_volume_per_area": "Permeate used in one cleaning, per membrane area",
               "cleaning_time": "Time of one chemically enhanced wash, out of service"},
    refuses=[NO_TIME_LEFT, NOTHING_FED],
    cautions=[NEGATIVE],
)
def recovery_daily(
    flux: Number,
    filtration_time: Number,
    backwash_flux: Number,
    backwash_time: Number,
    idle_time: Number = 0.0,
    cleanings_per_day: Number = 0.0,
    cleaning_time: Number = 0.0,
    cleaning_volume_per_area: Number = 0.0,
    test_time_per_day: Number = 0.0,
) -> Number:
    """Recovery over a whole day: net permeate over gross feed, chemically enhanced washes included.

    Dead-end: the feed is what is filtered. Backwash and washes use permeate. Idle and test time count only in
    that they leave fewer cycles to carry the water of the washes.
    """
    share = above_zero(_in_service(cleanings_per_day, cleaning_time, test_time_per_day), ROUNDING)
    gross = share * flux * filtration_time / (filtration_time + backwash_time + idle_time)
    net = flux_net_daily(flux, filtration_time, backwash_flux, backwash_time, idle_time, cleanings_per_day,
                         cleaning_time, cleaning_volume_per_area, test_time_per_day)
    return net / gross


@worksheet_function(
    result="availability",
    equation="a = t_i/(t_i + t_c)·(1 − t_t)",
    source="definition; common practice, no source",
    refuses=[Rule(lambda test_duration_per_day: test_duration_per_day >= 1,
                  "{test_duration_per_day} leaves no time in service")],
)
def availability(
    cleaning_interval: Number, cleaning_duration: Number, test_duration_per_day: Number = 0.0
) -> Number:
    """Share of calendar time in service, between cleanings and daily tests.

    The interval is time in service, and a test takes its time on every calendar day, days of cleaning
    included.
    """
    between_tests = above_zero(1.0 - test_duration_per_day)
    return cleaning_interval / (cleaning_interval + cleaning_duration) * between_tests


@worksheet_function(
    result="exposure",
    equation="C·t·n",
    source="definition; common practice, no source",
    arguments={"concentration": "Concentration of the chemical in contact with the membrane"},
)
def chemical_exposure(concentration: Number, contact_time: Number, cleanings_per_year: Number) -> Number:
    """Exposure of the membrane to a cleaning chemical in a year, to set against the maker's lifetime limit.

    Concentration times time: 1 g·h/L is 1000 ppm·h in water. Each chemical has its own limit, which
    temperature and pH shift. Never mix hypochlorite with acid cleaners: chlorine gas.
    """
    return concentration * contact_time * cleanings_per_year
