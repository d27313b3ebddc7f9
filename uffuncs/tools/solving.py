"""UF_SOLVE_FOR: any numeric argument of any elementwise function, from its result; a live cell instead of Goal Seek."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from ..cell import compile_function
from ..declaration import Argument, Function, cell_tool
from ..errors import ErrorValue, InvalidInput, NoResult, NotAvailable
from ..quantities import Quantity
from ..reading import is_blank, make_reader
from ..reasons import cautions
from ._cells import FUNCTION_NAME, element_by_element, function_named, plain_text

#: Points of the scan on each side of zero, evenly and by their logarithm: roots closer together than these are not told apart.
SCAN = 200
#: Decades that the scan goes down from the larger bound where the bounds include zero.
DECADES = 18
#: Whole numbers are tried one by one up to this many; beyond, the function is solved as if they were not whole.
MOST_COUNTED = 10_000


@cell_tool(
    arguments=[
        FUNCTION_NAME,
        ("argument", "Name of the argument wanted, as UF_ARGUMENTS lists it"),
        ("target", "Result that the function shall give; a unit text may carry its unit"),
    ],
    variadic=True,
    elementwise=True,
    result="unit of the argument",
    equation="x within its bounds with f(…, x, …) = target",
    source="Brent, Algorithms for Minimization without Derivatives, Prentice-Hall (1973), chapter 4, on brackets from a scan",
    caution=lambda *cells: _caution(cells),
)
def uf_solve_for(function, argument, target, *cells):
    """The value of an argument, within its bounds, for which a function gives the target.

    After the target come the function's own arguments with the unknown left blank. Target and arguments may be ranges. The
    whole span between the argument's bounds is searched: no value or several of them give #NUM!, and UF_WHY says which.
    """
    problem = _Problem(function, argument)
    return element_by_element(problem.solve, [target, *cells], whole=problem.whole)


class _Problem:
    """One function and the argument wanted of it."""

    def __init__(self, function, argument):
        record = function_named(function)
        if not isinstance(record, Function) or not record.elementwise or record.result_by:
            raise InvalidInput(f"{record.worksheet_name} gives no single number: UF_SOLVE_FOR cannot work on it")
        wanted = plain_text("argument", argument).casefold()
        names = [a.name for a in record.arguments if a.kind == "number"]
        if wanted not in names:
            from difflib import get_close_matches

            near = get_close_matches(wanted, names, n=3, cutoff=0.5) or names
            raise NotAvailable(f"{record.worksheet_name} has no numeric argument '{wanted[:40]}'; it has {', '.join(near)}")
        self.record = record
        self.compiled = compile_function(record.worksheet_name)
        self.index = record.argument_names.index(wanted)
        self.argument: Argument = record.arguments[self.index]
        self.whole = [i + 1 for i in self.compiled.columns]  # counted with the target in front
        q = record.results[0]
        free = replace(q, name="target", low=-math.inf, high=math.inf, whole=False)
        self.result: Quantity = q
        self.read_target = make_reader("UF_SOLVE_FOR", Argument("target", "number", free))

    def solve(self, target, *cells) -> float:
        values, goal = self.values(cells), self.read_target(target)
        root = find_root(self.function(values), goal, self.argument.quantity, self.shown)
        return self.argument.quantity.from_si(root)

    def values(self, cells: Sequence) -> list:
        """The arguments in SI, None for the unknown."""
        if len(cells) > len(self.record.arguments):
            raise InvalidInput(f"{self.record.worksheet_name} takes {len(self.record.arguments)} arguments, got {len(cells)}")
        if len(cells) > self.index and not is_blank(cells[self.index]):
            raise InvalidInput(f"leave {self.argument.name} blank: it is what is asked for")
        # Any value within the bounds stands in for the unknown while the others are read.
        filled = [*cells, *[None] * (self.index + 1 - len(cells))]
        q = self.argument.quantity
        filled[self.index] = math.ceil(q.low) if q.whole else q.low
        values = self.compiled.si_values(filled)
        values[self.index] = None
        return values

    def function(self, values: list) -> Callable:
        """The function of the unknown alone; arrays in, arrays out."""
        index, body = self.index, self.record.python

        def f(x):
            with np.errstate(all="ignore"):
                try:
                    return body(*values[:index], x, *values[index + 1:])
                except (ArithmeticError, ValueError):  # a refusal, or a plain float outside a function's domain
                    return np.array([f(float(v)) for v in x]) if isinstance(x, np.ndarray) else math.nan

        return f

    def shown(self, value: float) -> str:
        return self.result.shown(value) if math.isfinite(value) else "no result"


def _caution(cells: Sequence) -> str:
    """What the function itself cautions of at the solution."""
    function, argument, target, *rest = cells
    problem = _Problem(function, argument)
    found = element_by_element(problem.solve, [target, *rest], whole=problem.whole)
    if isinstance(found, (list, ErrorValue)):
        return ""
    values = problem.values(rest)
    values[problem.index] = problem.argument.quantity.to_si(found)
    return "; ".join(cautions(problem.record, values, problem.read_target(target)))


def find_root(f: Callable, target: float, q: Quantity, shown: Callable[[float], str]) -> float:
    """The one x within the bounds of a quantity with f(x) = target, all in SI.

    Raises
    ------
    NoResult
        No such x, several, or f does not change with x there; the reason gives the values at the bounds.
    """
    if q.whole and q.high - q.low <= MOST_COUNTED:
        return _counted(f, target, q, shown)
    x = _scan(q)
    y = _with_edges_of_the_domain(f, x)
    x, y = np.array(sorted(y)), np.array([y[v] for v in sorted(y)]) - target
    good = np.isfinite(y)
    if not good.any():
        raise NoResult(f"no {q.name} within {q.bounds_text} gives a result with these arguments")
    ends = np.flatnonzero(good)[[0, -1]]
    at_bounds = " and ".join(f"{shown(y[i] + target)} at {q.shown(x[i])}" for i in ends)
    scale = max(abs(target), 1e-12 * float(np.max(np.abs(y[good]))))

    if float(np.ptp(y[good])) <= 1e-12 * scale:
        raise NoResult(f"the result does not change with {q.name}: {at_bounds}")
    exact = good & (y == 0)
    for first, last in _runs(exact):
        if 0.0 in (x[first], x[last]) and abs(x[last] - x[first]) <= 1e-9 * (x[-1] - x[0]):
            exact[first:last + 1] = x[first:last + 1] == 0  # so close to 0 that the result is the same to the last digit
            continue
        raise NoResult(f"the function is flat: every {q.name} from {q.shown(x[first])} to {q.shown(x[last])} gives the target")
    roots = [float(v) for v in x[exact]]
    for i in np.flatnonzero(good[:-1] & good[1:] & (np.sign(y[:-1]) * np.sign(y[1:]) < 0)):
        roots += filter(None, [_refined(f, target, float(x[i]), float(x[i + 1]), scale)])
    if not roots:  # a root on a bound may miss the target by rounding
        roots = [float(x[i]) for i in ends if abs(y[i]) <= 1e-12 * scale]
    if not roots:
        raise NoResult(f"no {q.name} within {q.bounds_text} gives {shown(target)}: it is {at_bounds}")
    if len(roots) > 1:
        listed = ", ".join(q.shown(r) for r in roots[:4])
        raise NoResult(f"{len(roots)} values of {q.name} give {shown(target)}: {listed}; the result is {at_bounds}")
    root = roots[0]
    for near in (root * (1 - 1e-6), root * (1 + 1e-6)):
        if root and float(f(near)) == target:
            raise NoResult(f"the function is flat: {q.name} about {q.shown(root)} gives the target, and so do its neighbours")
    if q.whole:
        number = q.from_si(root)
        if abs(number - round(number)) > 1e-9 * max(1.0, abs(number)):
            raise NoResult(f"{q.name} would be {number:.6g}, but must be a whole number")
        return q.to_si(float(round(number)))
    return root


def _counted(f: Callable, target: float, q: Quantity, shown: Callable[[float], str]) -> float:
    """The one whole number with f(x) = target, by trying them all."""
    numbers = np.arange(math.ceil(q.low), math.floor(q.high) + 1.0)
    y = np.broadcast_to(np.asarray(f(q.to_si(numbers)), float), numbers.shape)
    hits = numbers[np.abs(y - target) <= 1e-9 * max(abs(target), 1e-300)]
    if len(hits) == 1:
        return q.to_si(float(hits[0]))
    if len(hits):
        raise NoResult(f"the function is flat: {len(hits)} values of {q.name} give {shown(target)}, from {hits[0]:g} to {hits[-1]:g}")
    below = np.flatnonzero(np.sign(y[:-1] - target) * np.sign(y[1:] - target) < 0)
    if len(below):
        i = below[0]
        raise NoResult(f"no whole number {q.name} gives {shown(target)}: {numbers[i]:g} gives {shown(y[i])}, {numbers[i + 1]:g} {shown(y[i + 1])}")
    good = np.flatnonzero(np.isfinite(y))
    if not len(good):
        raise NoResult(f"no {q.name} within {q.bounds_text} gives a result with these arguments")
    first, last = good[[0, -1]]
    raise NoResult(f"no whole number {q.name} gives {shown(target)}: it is {shown(y[first])} at {numbers[first]:g} and "
                   f"{shown(y[last])} at {numbers[last]:g}")


def _scan(q: Quantity) -> np.ndarray:
    """Points between the bounds, in SI: evenly spaced, and evenly in the logarithm on either side of zero."""
    points = [np.linspace(q.low, q.high, SCAN)]
    for bound, other in ((q.high, q.low), (-q.low, -q.high)):
        if bound > 0:
            least = other if other > 0 else bound * 10.0**-DECADES
            points.append(math.copysign(1, 1 if bound is q.high else -1) * np.geomspace(least, bound, SCAN))
    if q.low < 0 < q.high:
        points.append(np.zeros(1))
    worksheet = np.unique(np.clip(np.concatenate(points), q.low, q.high))
    return np.unique(q.to_si(worksheet))


def _with_edges_of_the_domain(f: Callable, x: np.ndarray) -> dict[float, float]:
    """f at the points, and at the last points before it ceases to have a value: a root may hide there."""
    values = np.broadcast_to(np.asarray(f(x), float), x.shape)
    known = dict(zip(x.tolist(), values.tolist()))
    finite = np.isfinite(values)
    for i in np.flatnonzero(finite[:-1] != finite[1:]):
        inside, outside = (x[i], x[i + 1]) if finite[i] else (x[i + 1], x[i])
        for _ in range(80):
            middle = 0.5 * (inside + outside)
            if middle in (inside, outside):
                break
            value = float(f(float(middle)))
            if math.isfinite(value):
                inside = middle
                known[float(middle)] = value
            else:
                outside = middle
    return known


def _runs(exact: np.ndarray) -> list[tuple[int, int]]:
    """Stretches of two or more neighbouring points that all hit the target."""
    runs, start = [], None
    for i, hit in enumerate([*exact.tolist(), False]):
        if hit and start is None:
            start = i
        elif not hit and start is not None:
            if i - start > 1:
                runs.append((start, i - 1))
            start = None
    return runs


def _refined(f: Callable, target: float, a: float, b: float, scale: float) -> float | None:
    """The root in a bracket; None where the sign changes by a jump or a pole."""
    from scipy.optimize import brentq

    root = brentq(lambda v: float(f(v)) - target, a, b, xtol=1e-300, rtol=8.9e-16, maxiter=500)
    residual = abs(float(f(root)) - target)
    # Rounding of x alone leaves over what the slope makes of it; over a jump the slope is no such excuse.
    changes = [abs(float(f(root * factor)) - float(f(root))) for factor in (1 - 1e-6, 1 + 1e-6)]
    allowed = max([1e-9 * scale, *(1e-7 * c for c in changes if math.isfinite(c))])
    return root if residual <= allowed else None
