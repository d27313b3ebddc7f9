"""Worksheet functions about the worksheet functions: reasons, sources, arguments."""

from __future__ import annotations

from itertools import chain

from ..cell import call, compile_function
from ..declaration import Function, Tool, cell_tool
from ..errors import CellError, ErrorValue, InvalidInput, NotAvailable, shortened
from ..reading import unwrapped
from ..reasons import cautions, remarks
from ..registry import TOPICS, functions
from ..version import __version__
from ._cells import FUNCTION_NAME, OWN, element_by_element, function_named


@cell_tool(
    arguments=[FUNCTION_NAME],
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
        if isinstance(record, Tool):
            return _why_tool(record, cells)
        if record.block:
            return _why_once(record, cells)
        whole = [i for i, a in enumerate(record.arguments) if a.kind in ("column", "labels")]
        return element_by_element(lambda *element: _why_once(record, element), cells, whole)
    except (InvalidInput, NotAvailable) as error:
        return shortened(str(error))


def _why_tool(record: Tool, cells) -> str | list[list[str]]:
    result = call(record.worksheet_name, list(cells))
    if isinstance(result, list) and record.elementwise:
        return [[_reason(record, v) or "ok" for v in row] for row in result]
    if reason := _reason(record, result):
        return reason
    careful = record.caution(*map(unwrapped, cells)) if record.caution else ""
    return shortened(f"caution: {careful}") if careful else "ok"


def _reason(record: Function | Tool, result: object) -> str:
    return (result.reason or f"{record.worksheet_name}: {result.code}") if isinstance(result, ErrorValue) else ""


def _why_once(record: Function, cells) -> str:
    result = call(record.worksheet_name, list(cells))
    for value in chain.from_iterable(result) if isinstance(result, list) else [result]:
        if reason := _reason(record, value):
            return reason
    values = compile_function(record.worksheet_name).si_values(cells)
    value = None if record.block or record.result_by or isinstance(result, str) else record.results[0].to_si(result)
    careful, told = cautions(record, values, value), remarks(record, values, value)
    if careful:
        return shortened("caution: " + "; ".join(careful + told))
    return shortened("ok: " + "; ".join(told)) if told else "ok"


@cell_tool(arguments=[FUNCTION_NAME], result="text", equation="equation; source", source=OWN)
def uf_source(name):
    """The equation of a function in one line, and its source."""
    record = function_named(name)
    return f"{record.equation}. {record.source}"


@cell_tool(
    arguments=[FUNCTION_NAME],
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
        rows.append([a.name, a.unit, low, high, "" if a.required else a.default_text, a.meaning_and_choices])
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


@cell_tool(arguments=[], result="text", equation="version of this library", source=OWN)
def uf_version():
    """The version of this library."""
    return __version__
