"""Declaring a worksheet function: one decorator records a plain SI function and returns it untouched.

    @worksheet_function(
        result="flux",
        equation="J = Q_p/A",
        source="ASTM D6161",
    )
    def flux_from_flow(permeate_flow: Number, area: Number) -> Number:
        '''Flux from permeate flow and membrane area.'''
        return permeate_flow / area

An argument's name is its entry in the vocabulary (`quantities.py`): unit, bounds and meaning come from there. Its annotation
says how a cell fills it: `Number` (a cell or a range, element by element), `Column` (a whole range at once), `Labels` (a
range of texts), `str` (one of the choices given, or a free name). A wrong declaration is a DeclarationError at import.
"""

from __future__ import annotations

import inspect
import sys
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Annotated, Any

import numpy as np

from .docstrings import docstring
from .errors import shortened
from .quantities import VOCABULARY, Quantity

#: An SI number or an array of them; functions broadcast like NumPy.
Number = float | np.ndarray
#: A whole range, flattened to one dimension; paired columns have one length.
Column = Annotated[np.ndarray, "column"]
#: A whole range of texts.
Labels = Annotated[list, "labels"]

REQUIRED = inspect.Parameter.empty
WORKSHEET_PREFIX = "UF_"


class DeclarationError(TypeError):
    """A worksheet function is declared wrongly; names the function and the cause."""


@dataclass(frozen=True)
class Argument:
    """One argument of a worksheet function."""

    name: str
    kind: str  # "number", "column", "labels", "choice", "name"
    quantity: Quantity | None = None  # for numbers and columns
    choices: tuple[str, ...] = ()
    default: Any = REQUIRED  # in SI
    default_text: str = ""  # as shown at the worksheet
    meaning: str = ""
    group: str = ""  # columns of one group are paired row by row

    @property
    def required(self) -> bool:
        return self.default is REQUIRED

    @property
    def unit(self) -> str:
        return self.quantity.unit if self.quantity else "text"

    @property
    def meaning_and_choices(self) -> str:
        return f"{self.meaning}: {', '.join(self.choices)}" if self.choices else self.meaning

    @property
    def description(self) -> str:
        """Meaning, unit, bounds and default in one line, as wizards show it."""
        text = self.meaning_and_choices
        if self.quantity:
            text += f" [{self.quantity.unit}], {self.quantity.low:g} to {self.quantity.high:g}"
        if self.kind == "column":
            text += "; a whole range"
        return shortened(text if self.required else f"{text}; default {self.default_text}")


@lru_cache(maxsize=None)
def parameter_names(function: Callable) -> tuple[str, ...]:
    """The names of the arguments that a rule's condition takes."""
    return tuple(inspect.signature(function).parameters)


@dataclass(frozen=True)
class Rule:
    """A condition on arguments by name (and on `result`), and the text for it; `{name}` is the value with its unit.

    `told` works out, from arguments by name, the words for the case at hand; `text` is then what the reference says.
    """

    when: Callable[..., bool]
    text: str
    told: Callable[..., str] | None = None

    @property
    def names(self) -> tuple[str, ...]:
        return parameter_names(self.when)


@dataclass(frozen=True)
class Fitted:
    """The range in which a correlation was fitted, in SI; outside it the value stands and UF_WHY cautions.

    `name` is an argument, or the words for a derived number that `value` computes from arguments by name. `when` limits
    the range to some cases, for example to one of several correlations.
    """

    name: str
    low: float
    high: float
    value: Callable[..., float] | None = None
    when: Callable[..., bool] | None = None


class _Described:
    """What the records of functions and tools tell of their arguments."""

    worksheet_name: str
    arguments: tuple[Argument, ...]

    @property
    def minimum_cells(self) -> int:
        return sum(a.required for a in self.arguments)

    @property
    def maximum_cells(self) -> int | None:
        """None: any number."""
        return len(self.arguments)

    @property
    def argument_names(self) -> tuple[str, ...]:
        return tuple(a.name for a in self.arguments)

    @property
    def signature_text(self) -> str:
        parts = [a.name if a.required else f"{a.name}={a.default_text}" for a in self.arguments]
        return f"{self.worksheet_name}({', '.join(parts + ['…'] * (self.maximum_cells is None))})"


@dataclass(frozen=True)
class Function(_Described):
    """The record of one worksheet function; every door is derived from it."""

    python: Callable
    worksheet_name: str
    topic: str
    arguments: tuple[Argument, ...]
    results: tuple[Quantity, ...]  # one for a single value; the columns of a block
    result_by: tuple[str, Mapping[str, Quantity]] | None  # a text argument that decides the result's quantity
    block: bool
    summary: str
    notes: str
    equation: str
    source: str
    refuses: tuple[Rule, ...]
    cautions: tuple[Rule, ...]
    remarks: tuple[Rule, ...]
    fitted: tuple[Fitted, ...]
    dimensional: str  # "" where the body is dimensionally sound as it stands, else why it is not
    columns: Callable[..., Sequence[int]] | None = None  # which of the results there are, from arguments by name

    @property
    def elementwise(self) -> bool:
        return not self.block

    @property
    def result_unit(self) -> str:
        if self.result_by:
            return "by " + self.result_by[0]
        return ", ".join(q.unit for q in self.results)

    def result_quantity(self, values: Sequence) -> Quantity:
        """The quantity of a single result, given the arguments' SI values."""
        if self.result_by is None:
            return self.results[0]
        name, quantities = self.result_by
        return quantities[values[self.argument_names.index(name)]]

    def column_quantities(self, values: Sequence) -> tuple[Quantity, ...]:
        """The quantities of a block's columns, given the arguments' SI values."""
        if self.columns is None:
            return self.results
        named = dict(zip(self.argument_names, values))
        return tuple(self.results[i] for i in self.columns(*map(named.get, parameter_names(self.columns))))


@dataclass(frozen=True)
class Tool(_Described):
    """A worksheet function that works on cells as they are: function names, further cells for another function."""

    python: Callable  # takes the cells, returns a cell value or a block of them
    worksheet_name: str
    topic: str
    arguments: tuple[Argument, ...]
    variadic: bool  # further cells may follow the arguments
    result_text: str
    block: bool
    elementwise: bool  # over ranges among its own arguments
    caution: Callable[..., str] | None  # what UF_WHY cautions of, for the same cells
    summary: str
    notes: str
    equation: str
    source: str

    @property
    def maximum_cells(self) -> int | None:
        return None if self.variadic else len(self.arguments)

    @property
    def result_unit(self) -> str:
        return self.result_text


#: worksheet name -> record, filled as the topic modules are imported (see registry.py)
DECLARED: dict[str, Function | Tool] = {}


def worksheet_function(
    *,
    equation: str,
    source: str,
    result: str | Quantity = "",
    results: Sequence[str | Quantity] = (),
    columns: Callable[..., Sequence[int]] | None = None,
    result_by: tuple[str, Mapping[str, str]] | None = None,
    arguments: Mapping[str, Quantity | str] | None = None,
    choices: Mapping[str, Sequence[str]] | None = None,
    names: Mapping[str, str] | None = None,
    default_texts: Mapping[str, str] | None = None,
    groups: Mapping[str, str] | None = None,
    refuses: Sequence[Rule] = (),
    cautions: Sequence[Rule] = (),
    remarks: Sequence[Rule] = (),
    fitted: Sequence[Fitted] = (),
    dimensional: str = "",
):
    """Record a plain SI function as a worksheet function.

    Parameters
    ----------
    equation, source : str
        The equation in one line of plain text; the full citation.
    result : str or Quantity
        The vocabulary entry of a single result; the function is then elementwise.
    results : sequence of str or Quantity
        The columns of a block; the function then returns one sequence (or number) per column, and its `Number` arguments
        take single cells.
    columns : callable
        Where an argument decides which of the results there are: their places, from arguments by name.
    result_by : (argument, {choice: entry})
        Where a text argument decides what the result is.
    arguments : mapping
        Arguments whose entry is not the vocabulary's own: name to Quantity, or to a text that replaces the meaning.
    choices, names : mapping
        Text arguments: the texts allowed, or the meaning of a free name.
    default_texts : mapping
        How a default of None reads.
    groups : mapping
        Column arguments that are not paired row by row with the others: name to the name of their group.
    refuses, cautions, remarks : sequence of Rule
        Why there is no result; when to be careful with one; what UF_WHY tells besides.
    fitted : sequence of Fitted
        Ranges of correlations.
    dimensional : str
        Why the body cannot be run on quantities with units, for example "correlation in its own units".
    """

    def register(function: Callable) -> Callable:
        name = WORKSHEET_PREFIX + function.__name__.upper()
        summary, _, notes = inspect.getdoc(function).partition("\n") if function.__doc__ else ("", "", "")

        def wrong(cause: str) -> DeclarationError:
            return DeclarationError(f"{name}: {cause}")

        if name in DECLARED:
            raise wrong("declared twice")
        if not summary.endswith("."):
            raise wrong("the docstring needs a one-line summary that ends with a full stop")
        if not equation or not source:
            raise wrong("equation and source are needed")
        if sum(map(bool, (result, results, result_by))) != 1:
            raise wrong("give exactly one of result, results, result_by")

        def entry(given: str | Quantity) -> Quantity:
            if isinstance(given, Quantity):
                return given
            if given not in VOCABULARY:
                raise wrong(f"'{given}' is not in the vocabulary (quantities.py)")
            return VOCABULARY[given]

        quantities = tuple(map(entry, results or ([result] if result else [])))
        by = result_by and (result_by[0], {choice: entry(q) for choice, q in result_by[1].items()})
        special = {"arguments": arguments or {}, "choices": choices or {}, "names": names or {},
                   "default_texts": default_texts or {}, "groups": groups or {}}
        parameters = inspect.signature(function).parameters
        for mapping in special.values():
            if unknown := set(mapping) - set(parameters):
                raise wrong(f"{sorted(unknown)} are not arguments")
        built = tuple(_argument(p, function, wrong, entry, **special) for p in parameters.values())
        optional_seen = False
        for a in built:
            if a.required and optional_seen:
                raise wrong(f"{a.name} is required but follows an optional argument")
            optional_seen = optional_seen or not a.required
        known = {a.name for a in built} | {"result"}
        for rule in (*refuses, *cautions, *remarks):
            if not set(rule.names) <= known:
                raise wrong(f"the rule '{rule.text}' uses {sorted(set(rule.names) - known)}, which are not arguments")
        for f in fitted:
            if f.value is None and f.name not in known:
                raise wrong(f"the fitted range of '{f.name}' needs an argument of that name, or a value")

        record = Function(
            function, name, _topic(function), built, quantities, by, bool(results), summary,
            notes.strip(), equation, source, tuple(refuses), tuple(cautions), tuple(remarks), tuple(fitted), dimensional,
            columns,
        )
        DECLARED[name] = record
        function.__doc__ = docstring(record)
        return function

    return register


def _topic(function: Callable) -> str:
    """A module is a topic by its file's name, unless it names the topic that it belongs to."""
    module = sys.modules[function.__module__]
    return getattr(module, "TOPIC", module.__name__.rpartition(".")[2])


def _argument(parameter, function, wrong, entry, *, arguments, choices, names, default_texts, groups) -> Argument:
    name, hint = parameter.name, parameter.annotation
    if isinstance(hint, str):  # under `from __future__ import annotations`
        hint = eval(hint, sys.modules[function.__module__].__dict__)  # noqa: S307 - the module's own annotation
    default = parameter.default
    given = default_texts.get(name, "")
    if hint is str:
        if name in choices:
            allowed = tuple(choices[name])
            if default is not REQUIRED and default not in allowed:
                raise wrong(f"the default '{default}' of {name} is not among its choices")
            meaning = names.get(name, name.replace("_", " ").capitalize())
            return Argument(name, "choice", None, allowed, default, given or str(default), meaning)
        if name not in names:
            raise wrong(f"the text argument {name} needs its choices, or a meaning in names")
        return Argument(name, "name", None, (), default, given or f'"{default}"', names[name])
    if hint is Labels:
        return Argument(name, "labels", None, (), default, given, names.get(name, "Names, one a row"), groups.get(name, ""))
    if hint == Number | None:
        hint = Number
    if hint is not Number and hint is not Column:
        raise wrong(f"annotate {name} as Number, Column, Labels or str")
    special = arguments.get(name)
    q = entry(special if isinstance(special, Quantity) else name)
    if q.name != name:
        q = replace(q, name=name)
    meaning = special if isinstance(special, str) else q.meaning
    if default is None and not given:
        raise wrong(f"the default None of {name} needs a text in default_texts")
    if default is not REQUIRED and default is not None:
        # A hair of slack: a default such as 293.15 K comes back as 20.000000000000004 °C.
        number = float(f"{q.from_si(default):.12g}")
        if not q.low <= number <= q.high:
            raise wrong(f"the default {number:g} of {name} is outside {q.bounds_text}; defaults are in SI")
        given = given or f"{number:.6g}"
    return Argument(name, "column" if hint is Column else "number", q, (), default, given, meaning, groups.get(name, ""))


def cell_tool(
    *,
    arguments: Sequence[tuple],
    result: str,
    equation: str,
    source: str,
    topic: str = "tools",
    variadic: bool = False,
    block: bool = False,
    elementwise: bool = False,
    caution: Callable[..., str] | None = None,
):
    """Record a function on cells as they are, `uf_name` in Python; `arguments` are (name, meaning) or (name, meaning, default)."""

    def register(function: Callable) -> Callable:
        name = function.__name__.upper()
        if name in DECLARED:
            raise DeclarationError(f"{name}: declared twice")
        summary, _, notes = inspect.getdoc(function).partition("\n")
        built = tuple(
            Argument(a[0], "cell", None, (), *((a[2], str(a[2]) or '""') if len(a) > 2 else (REQUIRED, "")), meaning=a[1])
            for a in arguments
        )
        DECLARED[name] = Tool(function, name, topic, built, variadic, result, block, elementwise, caution,
                              summary, notes.strip(), equation, source)
        return function

    return register
