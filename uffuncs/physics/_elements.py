"""Functions of floats over arrays, and refusals of functions that give a block."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..declaration import Number, Rule
from ..errors import NoResult
from ..quantities import quantity


def elementwise(function: Callable, *arguments):
    """A function of floats over arguments that may be arrays; None stays None."""
    if not any(isinstance(a, np.ndarray) for a in arguments):
        return function(*arguments)
    grids = np.broadcast_arrays(*(a if isinstance(a, np.ndarray) else np.array(a, object) for a in arguments))
    values = [function(*row) for row in zip(*(g.ravel().tolist() for g in grids))]
    return np.array(values, float).reshape(grids[0].shape)


def above_zero(value: Number, rounding: float = 0.0) -> Number:
    """The value itself, NaN where it is not above 0 by more than `rounding`: for divisors and what is left of 1."""
    if isinstance(value, np.ndarray):
        return np.where(value > rounding, value, np.nan)
    return value if value > rounding else np.nan


def refuse(rules: list[Rule], **values):
    """For a function that gives a block: raise the first rule that holds, as one value would be refused.

    Raises
    ------
    NoResult
        With the rule's text.
    """
    for rule in rules:
        if rule.when(**{name: values[name] for name in rule.names}):
            numbers = {name: v for name, v in values.items() if isinstance(v, (int, float))}
            raise NoResult(rule.text.format_map(
                {name: f"{name} {quantity(name).shown(v)}" for name, v in numbers.items()}))
