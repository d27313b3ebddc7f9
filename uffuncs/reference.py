"""The reference of the functions as text: a table of a topic, one function whole, an example formula."""

from __future__ import annotations

from itertools import groupby

from .check_values import Check, checks_of
from .declaration import Function, Tool, fitted_text
from .registry import functions

Record = Function | Tool


def example_cells(record: Record) -> list | None:
    """Arguments of an example: those of the first published check; None where there is none."""
    found = checks_of(record.worksheet_name)
    return list(found[0].arguments) if found else None


def example_formula(record: Record) -> str:
    """An example as typed into a cell; ranges stand as array constants."""
    arguments = example_cells(record)
    if arguments is None:
        return f"={record.signature_text}"
    while arguments and arguments[-1] == "":
        arguments.pop()
    return f"={record.worksheet_name}({', '.join(map(formula_text, arguments))})"


def formula_text(argument: object) -> str:
    """One argument as formula text."""
    if isinstance(argument, list):
        rows = [row if isinstance(row, list) else [row] for row in argument]
        return "{" + ";".join(",".join(map(formula_text, row)) for row in rows) + "}"
    if isinstance(argument, str):
        escaped = argument.replace('"', '""')
        return f'"{escaped}"' if argument else ""
    return f"{argument:.15g}"


def show_table(console, topic: str) -> None:
    """Name, unit of the result and summary of each function, topic by topic."""
    from rich.table import Table

    wanted = [r for r in functions().values() if topic in ("", r.topic)]
    for name, records in groupby(wanted, key=lambda r: r.topic):
        table = Table("Function", "Result", "Summary", title=name, title_justify="left", title_style="bold", box=None, pad_edge=False)
        table.columns[0].no_wrap = True
        for r in records:
            table.add_row(r.worksheet_name, _short(r.result_unit), r.summary)
        console.print(table)
        console.print()
    console.print(f"{len(wanted)} functions. `uffuncs functions NAME` shows one whole.", markup=False)


def _short(unit: str) -> str:
    return unit if len(unit) <= 24 else unit[:23] + "…"


def show(console, record: Record) -> None:
    """One function whole."""
    from rich.table import Table

    def line(text: str = "", **style) -> None:
        console.print(text, markup=False, **style)

    line(record.signature_text, style="bold")
    line(record.summary)
    line(f"\n    {record.equation}\n")
    if record.notes:
        line(f"{record.notes}\n")
    if record.arguments:
        table = Table("Argument", "Unit", "Lowest", "Highest", "Default", "Meaning", box=None, pad_edge=False)
        for a in record.arguments:
            low, high = (f"{a.quantity.low:g}", f"{a.quantity.high:g}") if a.quantity else ("", "")
            meaning = a.meaning + (": " + ", ".join(a.choices) if a.choices else "")
            meaning += " (a whole range)" if a.kind in ("column", "labels") else ""
            table.add_row(a.name, a.unit, low, high, "" if a.required else a.default_text, meaning)
        console.print(table)
        line()
    line(f"Result: {result_text(record)}")
    if isinstance(record, Function):
        for f in record.fitted:
            line(fitted_text(record, f))
        for rule in record.refuses:
            line(f"#NUM! where {rule.text.replace('{', '').replace('}', '')}")
        for rule in record.cautions:
            line(f"Caution where {rule.text.replace('{', '').replace('}', '')}")
    line(f"Source: {record.source}")
    line(f"Example: {example_formula(record)}")
    for check in checks_of(record.worksheet_name)[:3]:
        line(f"Check ({check.kind}): {check_text(check)}")


def result_text(record: Record) -> str:
    """What a function gives: a unit, or the columns of its block."""
    if isinstance(record, Tool) or record.result_by or not record.block:
        return record.result_unit
    return "a block with the columns " + ", ".join(f"{q.name} [{q.unit}]" for q in record.results)


def check_text(check: Check) -> str:
    arguments = ", ".join(formula_text(a) for a in check.arguments)
    place = f", {check.place}" if check.place else ""
    at = "" if check.cell == (1, 1) else f" (row {check.cell[0]}, column {check.cell[1]})"
    return f"({arguments}) gives {check.expected}{at}; {check.source}{place}"
