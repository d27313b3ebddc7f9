"""UF_UNCERTAINTY: propagation of distributions through any function, in one cell."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from ..cell import compile_function
from ..declaration import Argument, Function, cell_tool
from ..errors import InvalidInput, NoResult, UffuncsError
from ..reasons import cautions
from ..units import compile_unit
from ._cells import FUNCTION_NAME, function_named

#: Points of the sample: a power of two keeps a Sobol' sequence balanced.
POINTS = 2**15
#: Share of the sample without a result up to which the rest still stands for the distribution.
LOST_AT_MOST = 0.05

JCGM_101 = ("JCGM 101:2008, Evaluation of measurement data, Supplement 1 to the GUM: Propagation of distributions using a Monte "
            "Carlo method; shares of variance after its annex B")

_NUMBER = r"[-+−]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+−]?\d+)?"
_NORMAL = re.compile(rf"\s*({_NUMBER})\s*([^±]{{0,60}}?)\s*(?:±|\+/-)\s*({_NUMBER})\s*(.*?)\s*", re.DOTALL)
_UNIFORM = re.compile(rf"\s*({_NUMBER})\s*\.\.\s*({_NUMBER})\s*(.*?)\s*", re.DOTALL)


@dataclass(frozen=True)
class Distribution:
    """An uncertain quantity in SI, cut off at its bounds; `sample` maps (0, 1) to it."""

    kind: str  # "normal" or "uniform"
    mean: float
    standard_uncertainty: float
    low: float  # physical bounds; for a uniform one, its own ends within them
    high: float

    @property
    def cut_off(self) -> float:
        """Probability outside the bounds, before it is cut off."""
        if self.kind == "uniform":
            half = math.sqrt(3) * self.standard_uncertainty
            return max(0.0, 1 - (self.high - self.low) / (2 * half)) if half else 0.0
        below, above = self._normal_ends()
        return below + 1 - above

    def sample(self, u: np.ndarray) -> np.ndarray:
        if self.kind == "uniform":
            return self.low + (self.high - self.low) * u
        from scipy.special import ndtri

        below, above = self._normal_ends()
        x = self.mean + self.standard_uncertainty * ndtri(below + (above - below) * u)
        return np.clip(x, self.low, self.high)

    def _normal_ends(self) -> tuple[float, float]:
        from scipy.special import ndtr

        return tuple(float(ndtr((x - self.mean) / self.standard_uncertainty)) for x in (self.low, self.high))


@dataclass(frozen=True)
class Propagated:
    """The distribution of a result, in SI."""

    mean: float
    standard_uncertainty: float
    low: float  # 2.5 % point
    high: float  # 97.5 % point
    shares: tuple[float, ...]  # of the variance, one for each input
    lost: float  # share of the sample without a result


@cell_tool(
    arguments=[FUNCTION_NAME],
    variadic=True,
    block=True,
    result="mean, standard uncertainty, 2.5 % and 97.5 % points in the function's unit, then the share of variance of each argument",
    equation="distribution of f(X1, …, Xn) from those of the arguments, by a Sobol' sample of 32,768 points",
    source=JCGM_101,
    caution=lambda *cells: _caution(cells),
)
def uf_uncertainty(function, *cells):
    """Mean, standard uncertainty, 95 % interval, and shares of variance of a result from uncertain arguments.

    After the function's name come its arguments, each plain, or "2.0 ± 0.1 bar" (normal, standard uncertainty; +/- may be
    written for ±), or "2.0 ± 5 % bar" (relative), or "1.8 .. 2.2 bar" (uniform). The arguments count as independent: two results
    of one fit, such as k and C_g of UF_GEL_FIT, are not. A distribution is cut off at the argument's bounds, and UF_WHY says so. The sample is a fixed low-discrepancy sequence: the same arguments give
    the same digits. A share is an argument's own variance, the others at their means, over the sum of these.
    """
    record, inputs = _inputs(function, cells)
    q = record.results[0]
    result = propagate(_function_of_uncertain(record, inputs), [i for i in inputs if isinstance(i, Distribution)])
    shares = iter(result.shares)
    columns = [next(shares) if isinstance(i, Distribution) else 0.0 for i in inputs]
    return [[q.from_si(result.mean), result.standard_uncertainty / q.scale, q.from_si(result.low), q.from_si(result.high), *columns]]


def _inputs(function, cells: Sequence) -> tuple[Function, list]:
    """The record, and each argument: a distribution, or an SI value."""
    record = function_named(function)
    if not isinstance(record, Function) or not record.elementwise or record.result_by:
        raise InvalidInput(f"{record.worksheet_name} gives no single number: UF_UNCERTAINTY cannot work on it")
    compiled = compile_function(record.worksheet_name)
    certain, distributions = list(cells), {}
    for i, (argument, cell) in enumerate(zip(record.arguments, cells)):
        if argument.kind == "number" and isinstance(cell, (list, tuple)):
            raise InvalidInput(f"{argument.name} takes one cell here, not a range")
        if argument.kind == "number" and isinstance(cell, str):
            found = read_uncertain(argument, cell)
            if isinstance(found, Distribution):
                distributions[i] = found
            if found is not None:
                certain[i] = argument.quantity.from_si(_mean(found) if isinstance(found, Distribution) else found)
    values = compiled.si_values(certain)
    return record, [distributions.get(i, v) for i, v in enumerate(values)]


def read_uncertain(argument: Argument, text: str) -> Distribution | float | None:
    """A text such as "2.0 ± 0.1 bar" or "1.8 .. 2.2 bar" as a distribution; an SI value where the uncertainty is 0.

    None where it is a plain text.

    Raises
    ------
    InvalidInput
        An uncertain text with a unit that does not fit, a negative uncertainty, or ends in the wrong order.
    """
    q = argument.quantity
    low, high = sorted((q.to_si(q.low), q.to_si(q.high)))
    if found := _NORMAL.fullmatch(text):
        number, own_unit, spread, unit = _float(found[1]), found[2], _float(found[3]), found[4]
        if unit.startswith("%"):
            if q.unit == "-" and not own_unit and unit == "%":
                raise InvalidInput(f"{argument.name}: '{text[:40]}' can be read in two ways; write '95 % ± 2 %' or '0.95 ± 0.02'")
            if own_unit != "%":  # relative
                spread, unit = abs(number) * spread / 100, unit[1:].strip() or own_unit
        scale, offset = _unit(argument, own_unit or unit)
        spread_scale = _unit(argument, unit or own_unit)[0]
        mean = scale * number + offset
        if spread < 0:
            raise InvalidInput(f"{argument.name}: the uncertainty in '{text[:40]}' is negative")
        if not low <= mean <= high:
            _outside(argument, text)
        return Distribution("normal", mean, abs(spread_scale) * spread, low, high) if spread else mean
    if found := _UNIFORM.fullmatch(text):
        scale, offset = _unit(argument, found[3])
        ends = [scale * _float(x) + offset for x in found.groups()[:2]]
        if not ends[0] < ends[1]:
            raise InvalidInput(f"{argument.name}: the ends in '{text[:40]}' must rise")
        if ends[1] < low or ends[0] > high:
            _outside(argument, text)
        return Distribution("uniform", sum(ends) / 2, (ends[1] - ends[0]) / math.sqrt(12), max(ends[0], low), min(ends[1], high))
    return None


def _outside(argument: Argument, text: str):
    raise NoResult(f"{argument.name} must be {argument.quantity.bounds_text}; got '{text[:40]}'")


def _float(text: str) -> float:
    return float(text.replace("−", "-"))


def _unit(argument: Argument, unit: str) -> tuple[float, float]:
    q = argument.quantity
    try:
        return compile_unit(unit, q.si_unit, q.absolute, q.unit) if unit else (q.scale, q.offset)
    except InvalidInput as error:
        raise InvalidInput(f"{argument.name}: {error}") from None


def _function_of_uncertain(record: Function, inputs: list) -> Callable:
    """The function of its uncertain arguments alone, on arrays."""
    places = [i for i, v in enumerate(inputs) if isinstance(v, Distribution)]

    def f(*samples):
        values = list(inputs)
        for i, sample in zip(places, samples):
            values[i] = sample
        try:
            return record.python(*values)
        except UffuncsError:
            return np.array([_one(record, values, places, n) for n in range(len(samples[0]))]) if samples else math.nan

    return f


def _one(record: Function, values: list, places: list[int], n: int) -> float:
    """One point of a sample, where the body refuses the whole sample for some of them."""
    try:
        return record.python(*[float(v[n]) if i in places else v for i, v in enumerate(values)])
    except UffuncsError:
        return math.nan


@lru_cache(maxsize=16)
def _sobol(dimensions: int) -> np.ndarray:
    """Points of a scrambled Sobol' sequence in the open unit cube, the same in every run."""
    from scipy.stats import qmc

    u = qmc.Sobol(dimensions, scramble=True, rng=np.random.default_rng(20080101)).random(POINTS)
    return np.clip(u, 0.5 / POINTS / 1024, 1 - 0.5 / POINTS / 1024)


def propagate(f: Callable, inputs: Sequence[Distribution]) -> Propagated:
    """Propagate independent distributions through a function of arrays.

    Raises
    ------
    NoResult
        No input is uncertain, or more than a twentieth of the sample has no result.
    """
    if not inputs:
        raise InvalidInput("no argument is uncertain; write one as \"2.0 ± 0.1 bar\" or \"1.8 .. 2.2 bar\"")
    u = _sobol(len(inputs))
    samples = [d.sample(u[:, i]) for i, d in enumerate(inputs)]
    with np.errstate(all="ignore"):
        y = np.broadcast_to(np.asarray(f(*samples), float), (POINTS,))
        good = np.isfinite(y)
        lost = 1 - float(np.mean(good))
        if lost > LOST_AT_MOST:
            raise NoResult(f"{100 * lost:.0f} % of the sample has no result; narrow the arguments")
        own = []
        means = [np.full(POINTS, _mean(d)) for d in inputs]
        for i, sample in enumerate(samples):
            alone = np.broadcast_to(np.asarray(f(*means[:i], sample, *means[i + 1:]), float), (POINTS,))
            alone = alone[np.isfinite(alone)]
            own.append(float(np.var(alone)) if alone.size else 0.0)
    y = y[good]
    total = sum(own)
    low, high = np.quantile(y, (0.025, 0.975), method="linear")
    shares = tuple(v / total for v in own) if total > 0 else (0.0,) * len(own)
    return Propagated(float(np.mean(y)), float(np.std(y, ddof=1)), float(low), float(high), shares, lost)


def _mean(d: Distribution) -> float:
    return min(max(d.mean, d.low), d.high)


def _caution(cells: Sequence) -> str:
    function, *rest = cells
    record, inputs = _inputs(function, rest)
    found = [f"{100 * d.cut_off:.2g} % of {a.name} lies outside {a.quantity.bounds_text} and is cut off"
             for a, d in zip(record.arguments, inputs) if isinstance(d, Distribution) and d.cut_off > 1e-6]
    result = propagate(_function_of_uncertain(record, inputs), [d for d in inputs if isinstance(d, Distribution)])
    if result.lost:
        found.append(f"{100 * result.lost:.2g} % of the sample has no result and is left out")
    means = [_mean(i) if isinstance(i, Distribution) else i for i in inputs]
    return "; ".join([*found, *cautions(record, means, result.mean)])
