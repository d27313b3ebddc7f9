"""Worksheet functions about the worksheet functions: reasons, sources, arguments, units."""

from __future__ import annotations

from itertools import chain

import numpy as np

from . import cell as contract
from .declaration import Function, Tool, cell_tool
from .errors import CellError, ErrorValue, InvalidInput, NotAvailable, UffuncsError, shortened
from .reasons import cautions, remarks
from .registry import TOPICS, find, functions, near_names
from .units import convert
from .version import __version__

OWN = "This library"
_NAME = ("function", "Name of a worksheet function, such as \"UF_FLUX_DARCY\"")


def function_named(name: object) -> Function | Tool:
    """The record of a function given as text.

    Raises
    ------
    NotAvailable
        No such function; the reason lists near matches.
    """
    if isinstance(name, ErrorValue):
        raise CellError(name)
    if not isinstance(name, str):
        raise InvalidInput(f"the function's name must be a text such as \"UF_FLUX_DARCY\"; got {name}")
    record = find(name)
    if record is None:
        near = near_names(name)
        hint = f"; did you mean {' or '.join(near)}?" if near else "; UF_FUNCTIONS lists all"
        raise NotAvailable(f"there is no function '{name[:40]}'{hint}")
    return record


@cell_tool(
    arguments=[_NAME],
    variadic=True,
    result="text",
    equation="ok, or the reason of an error, or a caution",
    source=OWN,
)
def uf_why(name, *cells):
    """Tells why a function gives an error or calls for caution; `ok` if neither.

    Give the function's name and then the same arguments as the function itself. For a range the answer is a block with one
    text for each element.
    """
    try:
        record = function_named(name)
        if isinstance(record, Tool) or record.block or not _has_range(record, cells):
            return _why_once(record, cells)
        return [[_why_once(record, element) for element in row] for row in _elements(record, cells)]
    except (InvalidInput, NotAvailable) as error:
        return shortened(str(error))


def _has_range(record: Function, cells) -> bool:
    cells = [contract.unwrapped(c) for c in cells]
    return any(isinstance(c, (list, tuple)) and a.kind not in ("column", "labels") for a, c in zip(record.arguments, cells))


def _elements(record: Function, cells):
    """The arguments of each element of a broadcast call, as rows of lists of cells."""
    grids = []
    for argument, value in zip(record.arguments, map(contract.unwrapped, cells)):
        whole = argument.kind in ("column", "labels") or not isinstance(value, (list, tuple))
        rows = [[value]] if whole else [list(row) for row in value]
        width = max(map(len, rows))
        grid = np.empty((len(rows), width), object)
        for i, row in enumerate(rows):
            for j in range(width):
                grid[i, j] = row[j] if j < len(row) else None
        grids.append(grid)
    try:
        grids = np.broadcast_arrays(*grids)
    except ValueError:
        raise InvalidInput("the ranges do not fit together in shape") from None
    for i in range(grids[0].shape[0]):
        yield [[grid[i, j] for grid in grids] for j in range(grids[0].shape[1])]


def _why_once(record: Function | Tool, cells) -> str:
    result = contract.call(record.worksheet_name, list(cells))
    if isinstance(result, ErrorValue):
        return result.reason or f"{record.worksheet_name}: {result.code}"
    if isinstance(result, list):
        bad = next((v for v in chain.from_iterable(result) if isinstance(v, ErrorValue)), None)
        if bad is not None:
            return bad.reason or f"{record.worksheet_name}: {bad.code} in the block"
    if isinstance(record, Tool):
        return "ok"
    values = _si_values(record, cells)
    value = None if record.block or record.result_by or isinstance(result, str) else record.results[0].to_si(result)
    if careful := cautions(record, values, value):
        return shortened("caution: " + "; ".join(careful))
    told = remarks(record, values, value)
    return shortened("ok: " + "; ".join(told)) if told else "ok"


def _si_values(record: Function, cells) -> list:
    compiled = contract._COMPILED[record.worksheet_name]
    cells = [contract.unwrapped(c) for c in cells] + [None] * (len(record.arguments) - len(cells))
    columns = compiled._read_columns(cells) if compiled.columns else {}
    return [columns[i] if i in columns else read(cell) for i, (read, cell) in enumerate(zip(compiled.readers, cells))]


@cell_tool(arguments=[_NAME], result="text", equation="equation; source", source=OWN)
def uf_source(name):
    """The equation of a function in one line, and its source."""
    record = function_named(name)
    return f"{record.equation}. {record.source}"


@cell_tool(
    arguments=[_NAME],
    block=True,
    result="text and numbers",
    equation="argument, unit, lowest, highest, default, meaning",
    source=OWN,
)
def uf_arguments(name):
    """The arguments of a function: name, unit, lowest, highest, default, meaning, one a row.

    The bounds of a text are blank texts; its unit reads `text` and its meaning lists the choices.
    """
    record = function_named(name)
    if not record.arguments:
        raise NotAvailable(f"{record.worksheet_name} takes no arguments")
    rows = []
    for a in record.arguments:
        low, high = (a.quantity.low, a.quantity.high) if a.quantity else ("", "")
        meaning = a.meaning + (": " + ", ".join(a.choices) if a.choices else "")
        rows.append([a.name, a.unit, low, high, "" if a.required else a.default_text, meaning])
    return rows


@cell_tool(
    arguments=[("topic", "Topic such as \"osmotic\"; blank for all", "")],
    block=True,
    result="text",
    equation="name, unit of the result, summary",
    source=OWN,
)
def uf_functions(topic):
    """The functions of a topic, or all: name, unit of the result, summary, one a row."""
    if isinstance(topic, ErrorValue):
        raise CellError(topic)
    if not isinstance(topic, str):
        raise InvalidInput(f"the topic must be a text, one of: {', '.join(TOPICS)}")
    wanted = topic.strip().casefold()
    if wanted and wanted not in TOPICS:
        raise NotAvailable(f"there is no topic '{topic[:40]}'; topics: {', '.join(TOPICS)}")
    return [[r.worksheet_name, r.result_unit, r.summary] for r in functions().values() if wanted in ("", r.topic)]


@cell_tool(
    arguments=[
        ("value", "A number"),
        ("from_unit", "Unit of the number, such as \"gfd\""),
        ("to_unit", "Unit wanted, such as \"LMH\""),
    ],
    result="the unit wanted",
    equation="value in from_unit = result in to_unit",
    source="Exact definitions of the units: BIPM, The International System of Units, 9th ed. (2019); NIST SP 811 (2008)",
)
def uf_convert(value, from_unit, to_unit):
    """A number in one unit, expressed in another of the same dimension.

    Trade units are included: LMH, gfd, LMH/bar, gfd/psi, kDa, cP, MGD, MLD, gpm, mmHg, degF. Temperatures are converted as
    temperatures, not as differences. A range of values is converted element by element.
    """
    for unit in (from_unit, to_unit):
        if isinstance(unit, ErrorValue):
            raise CellError(unit)
        if not isinstance(unit, str):
            raise InvalidInput("the units must be texts, such as \"gfd\"")
    if isinstance(value, (list, tuple)):
        return [[_converted_or_error(v, from_unit, to_unit) for v in row] for row in value]
    return _converted(value, from_unit, to_unit)


def _converted_or_error(value, from_unit: str, to_unit: str):
    try:
        return _converted(value, from_unit, to_unit)
    except UffuncsError as error:
        return error.as_cell()


def _converted(value, from_unit: str, to_unit: str) -> float:
    if isinstance(value, ErrorValue):
        raise CellError(value)
    if contract.is_blank(value):
        raise InvalidInput("the value is blank")
    if isinstance(value, bool):
        raise InvalidInput(f"the value is {str(value).upper()}; give a number")
    if isinstance(value, str):
        value, unit = contract.split_number("value", value, from_unit)
        if unit:
            raise InvalidInput(f"the value carries the unit '{unit}'; give the number alone")
    return convert(float(value), from_unit, to_unit)


@cell_tool(arguments=[], result="text", equation="version of this library", source=OWN)
def uf_version():
    """The version of this library."""
    return __version__
