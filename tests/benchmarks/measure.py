"""Timing, and one line of the printed table."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from timeit import Timer


@dataclass(frozen=True)
class Row:
    """A measured number; `bound` is the most (or with `least`, the least) that it may be, None where there is no target."""

    name: str
    measured: float
    unit: str
    bound: float | None = None
    least: bool = False

    @property
    def reached(self) -> bool:
        if self.bound is None:
            return True
        return self.measured >= self.bound if self.least else self.measured <= self.bound

    @property
    def target(self) -> str:
        if self.bound is None:
            return ""
        return f"{'≥' if self.least else '≤'} {self.bound:g}  {'reached' if self.reached else 'NOT REACHED'}"


def seconds(call: Callable, repeat: int = 7, least: float = 0.05) -> float:
    """Best time of one call, from runs of at least `least` seconds."""
    timer = Timer(call)
    number = 1
    while (spent := timer.timeit(number)) < least:
        number = max(2 * number, int(number * least / max(spent, 1e-9)))
    return min(timer.repeat(repeat, number)) / number


def microseconds(call: Callable, repeat: int = 7) -> float:
    return 1e6 * seconds(call, repeat)
