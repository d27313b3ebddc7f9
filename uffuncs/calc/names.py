"""What Calc calls things: programmatic names and the wizard's texts, derived from the registry."""

from __future__ import annotations

from dataclasses import dataclass

import uffuncs.cell  # noqa: F401 - before the registry, whose tools import it in turn

from ..declaration import Function, Tool
from ..errors import shortened
from ..registry import functions

#: The extension's identifier, and the UNO module of its interface and service.
IDENTIFIER = "org.uffuncs.calc"
INTERFACE = f"{IDENTIFIER}.XFunctions"
SERVICE = f"{IDENTIFIER}.Functions"
JOB = f"{IDENTIFIER}.BindNames"
CATEGORY = "Ultrafiltration"

#: The wizard's entry for the further cells of a variadic function.
FURTHER = ("further", "The arguments of that function, in its own order; leave one blank to omit it")


@dataclass(frozen=True)
class AddInFunction:
    """One worksheet function as the add-in offers it."""

    name: str  # as typed into a cell
    method: str  # of the UNO interface
    description: str
    arguments: tuple[tuple[str, str], ...]  # name, description
    variadic: bool  # the last argument takes any number of cells

    @property
    def parameters(self) -> tuple[str, ...]:
        return tuple(lower_camel(name) for name, _ in self.arguments)


def lower_camel(name: str) -> str:
    """UF_FLUX_DARCY and flux_darcy as ufFluxDarcy and fluxDarcy: UNO knows no underscores in parameters."""
    first, *rest = name.lower().split("_")
    return first + "".join(part.capitalize() for part in rest)


def programmatic_name(name: str) -> str:
    """How files hold a function where the program does not know its worksheet name."""
    return f"{SERVICE}.{lower_camel(name)}".upper()


def add_in_functions() -> list[AddInFunction]:
    """The functions of the registry, in its order.

    Raises
    ------
    ValueError
        Two functions, or two arguments of one function, would have the same UNO name.
    """
    found = [_add_in_function(record) for record in functions().values()]
    _unlike("functions", [f.method for f in found])
    for f in found:
        _unlike(f"arguments of {f.name}", f.parameters)
    return found


def _add_in_function(record: Function | Tool) -> AddInFunction:
    variadic = isinstance(record, Tool) and record.variadic
    arguments = [(a.name, _described(a)) for a in record.arguments] + [FURTHER] * variadic
    return AddInFunction(
        record.worksheet_name,
        lower_camel(record.worksheet_name),
        f"{record.summary} Gives: {record.result_unit}.",
        tuple(arguments),
        variadic,
    )


def _described(argument) -> str:
    """Meaning, unit, bounds and default; the program itself calls every argument of an add-in optional."""
    return shortened(argument.description + ("; required" if argument.required else ""))


def _unlike(what: str, names) -> None:
    twice = sorted({n for n in names if [m.lower() for m in names].count(n.lower()) > 1})
    if twice:
        raise ValueError(f"the {what} have one UNO name: {', '.join(twice)}")
