"""What an engine is asked for and what it gives: the place to add a second one."""

from dataclasses import dataclass, field
from typing import Protocol

from .package import Package, UnreadableWorkbook
from .sheet import Sheet
from .structure import Structure

Place = tuple[str, int, int]  # worksheet, row, column


@dataclass(slots=True)
class Model:
    """A workbook as read: the package, its structure, and the formula cells of each worksheet."""

    package: Package
    structure: Structure
    sheets: list[Sheet]


@dataclass(slots=True)
class Reason:
    """Why a cell shows an error; `source` is the cell it was passed on from, or None."""

    text: str
    source: Place | None = None


@dataclass(slots=True)
class Evaluation:
    """The values an engine found: float, text, boolean, ErrorValue, or None for a blank."""

    values: dict[Place, object] = field(default_factory=dict)
    spills: dict[Place, tuple[int, int]] = field(default_factory=dict)  # anchor -> rows, columns
    reasons: dict[Place, Reason] = field(default_factory=dict)
    unknown: dict[str, list[Place]] = field(default_factory=dict)  # function name -> cells
    notes: list[str] = field(default_factory=list)
    timings: dict[str, float] = field(default_factory=dict)


class Engine(Protocol):
    """Evaluates every formula of a model."""

    name: str

    def evaluate(self, model: Model, progress=None) -> Evaluation:
        """The values of all formula cells, of the cells array formulas cover, and the reasons of errors."""
        ...


def engine_named(name):
    """The engine of a name; loaded when asked for, because engines are heavy."""
    if name == "formualizer":
        from .formualizer_engine import FormualizerEngine

        return FormualizerEngine()
    if name == "calc":
        from ..calc.engine import CalcEngine

        return CalcEngine()
    raise UnreadableWorkbook(f"there is no engine {name!r}; there are 'formualizer' and 'calc'")
