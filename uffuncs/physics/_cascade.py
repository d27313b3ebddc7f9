"""Feed-and-bleed cascades: the balances, ways to split the work between stages, what installed areas do.

A stage is well mixed at the concentration of its outlet, where its flux is taken; its permeate is at 1 − R of
it: F_(i-1) C_(i-1) = C_i (F_i + (1 − R) P_i), F_i = F_(i-1) − P_i, so that P_i = F_(i-1) (1 − C_(i-1)/C_i)/R.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import accumulate

from ..errors import NoResult
from ._flux_law import FluxLaw
from ._least_area import least_area_logs

SPLITS = ("least area", "equal permeate", "equal area")


@dataclass(frozen=True)
class Cascade:
    """One entry per stage."""

    concentrations: list[float]
    fluxes: list[float]
    permeates: list[float]
    retentates: list[float]
    areas: list[float]
    yields: list[float]

    def columns(self) -> tuple[list[float], ...]:
        """With a last row for the whole cascade."""
        permeate, area = sum(self.permeates), sum(self.areas)
        return (
            [*self.concentrations, self.concentrations[-1]],
            [*self.fluxes, permeate / area],
            [*self.permeates, permeate],
            [*self.retentates, self.retentates[-1]],
            [*self.areas, area],
            [*self.yields, self.yields[-1]],
        )


def cascade(law: FluxLaw, feed_flow: float, first: float, logs: list[float], rejection: float) -> Cascade:
    """The stages for the ln(C/reference) of their outlets; `first` is the feed's."""
    flow, before = feed_flow, first
    rows = []
    for log in logs:
        permeate = flow * -math.expm1(before - log) / rejection
        flow, before = flow - permeate, log
        flux = law.flux(log)
        kept = flow / feed_flow * math.exp(log - first)
        rows.append((law.reference * math.exp(log), flux, permeate, flow, permeate / flux, kept))
    return Cascade(*map(list, zip(*rows)))


def split_logs(
    law: FluxLaw, split: str, first: float, last: float, stages: int, rejection: float
) -> list[float] | None:
    """ln(C/reference) at the outlets of all stages; None where this split does not reach the last one."""
    if split == "least area":
        return least_area_logs(law, first, last, stages, rejection)
    if stages == 1:
        return [last]
    if split == "equal permeate":
        return _equal_permeate(first, last, stages, rejection)
    return _equal_area(law, first, last, stages, rejection)


def equal_permeate_limit(stages: int, rejection: float) -> float:
    """ln of the concentration ratio that equal permeate flows approach as the last retentate goes to 0."""
    if rejection == 1:
        return math.inf
    return -sum(math.log1p(-rejection / left) for left in range(1, stages + 1))


def _equal_permeate(first: float, last: float, stages: int, rejection: float) -> list[float] | None:
    from scipy.optimize import brentq

    span = last - first
    if span >= equal_permeate_limit(stages, rejection):
        return None

    def steps(log_final: float) -> list[float]:
        # The unknown is the last retentate flow: it may be tiny against the feed, where the permeate is not.
        final = math.exp(log_final)
        permeate = -math.expm1(log_final) / stages
        flows = (final + left * permeate for left in range(stages, 0, -1))
        return [-math.log1p(-rejection * permeate / flow) for flow in flows]

    lowest = -1.0
    while sum(steps(lowest)) < span:
        lowest *= 2.0
        if lowest < -700.0:
            return None
    log_final = brentq(lambda x: sum(steps(x)) - span, lowest, 0.0, xtol=1e-16, rtol=1e-15)
    return [*(first + log for log in accumulate(steps(log_final)[:-1])), last]


def _equal_area(law: FluxLaw, first: float, last: float, stages: int, rejection: float) -> list[float] | None:
    from scipy.optimize import brentq

    def outlets(log_area: float) -> list[float] | None:  # area of one stage per feed flow of the cascade
        flow, logs = 1.0, [first]
        for _ in range(stages):
            log = _operating_log(law, flow, logs[-1], math.exp(log_area), rejection)
            if log is None or log > last + 1e-6 * (last - first):
                return None
            flow *= 1.0 + math.expm1(logs[-1] - log) / rejection
            logs.append(log)
        return logs[1:]

    def beyond(log_area: float) -> float:
        logs = outlets(log_area)
        return last - first if logs is None else logs[-1] - last

    # The area that the first step of an even climb takes is a start; the bracket widens from it.
    high = math.log((last - first) / stages / law.flux(last))
    low = high
    while beyond(high) <= 0:
        high += 1.0
    while beyond(low) > 0:
        low -= 1.0
    log_area = brentq(beyond, low, high, xtol=1e-15, rtol=1e-15)
    logs = outlets(log_area)
    if logs is None:  # the root lies a hair towards the smaller area
        logs = outlets(log_area - 4e-15 * max(1.0, abs(log_area)))
    if logs is None or abs(logs[-1] - last) > 1e-9 * max(1.0, last - first):
        return None
    return [*logs[:-1], last]


def _operating_log(law: FluxLaw, flow: float, before: float, area: float, rejection: float) -> float | None:
    """ln(C/reference) at which a stage of this area runs; None if it passes all its feed or leaves the law.

    The lowest one, if the flux rises with concentration somewhere and there are several: a stage that starts
    up filled with its feed comes to rest there.
    """
    from scipy.optimize import brentq

    def excess(log: float) -> float:  # what the balance needs to pass, above what the membrane passes
        return flow * -math.expm1(before - log) / rejection - area * law.flux(log)

    all_passed = before - math.log1p(-rejection) if rejection < 1 else math.inf
    low = before
    for piece in range(law.piece(before), len(law.logs) - 1):
        high = min(law.logs[piece + 1], all_passed)
        ends = [high]
        if (rise := law.slope(piece)) > 0:  # the excess may peak inside: above 0 there, below at both ends
            peak = before + math.log(flow / (rejection * area * rise))
            ends = [peak, high] if low < peak < high else [high]
        for end in ends:
            if excess(end) >= 0:
                return brentq(excess, low, end, xtol=1e-15, rtol=1e-15) if excess(low) < 0 else low
            low = end
        if high == all_passed:
            return None
    return None


def rated_logs(
    law: FluxLaw, feed_flow: float, first: float, areas: list[float], rejection: float
) -> list[float]:
    """ln(C/reference) at the outlets of installed stages.

    Raises
    ------
    NoResult
        A stage would leave the law's range or pass all its feed; names the stage.
    """
    flow, logs = feed_flow, [first]
    for i, area in enumerate(areas, 1):
        log = _operating_log(law, flow, logs[-1], area, rejection)
        if log is None:
            top = law.reference * math.exp(law.logs[-1])
            raise NoResult(f"stage {i} of {area:.6g} m² would pass all its feed, or concentrate beyond the "
                           f"highest measured concentration {top:.6g} g/L; the flux is not extrapolated")
        flow *= 1.0 + math.expm1(logs[-1] - log) / rejection
        logs.append(log)
    return logs[1:]
