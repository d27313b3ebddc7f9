"""The words that a declaration adds to a docstring: parameters, returns, refusals, cautions, references."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from .declaration import Fitted, Function


def docstring(record: Function) -> str:
    """The whole docstring: the author's words, then what the declaration knows."""
    lines = [record.summary, "", f"    {record.equation}", ""]
    if record.notes:
        lines += [record.notes, ""]
    lines += ["Parameters", "----------"]
    for a in record.arguments:
        optional = "" if a.required else ", optional"
        if a.quantity is None:
            kind = "list of str" if a.kind == "labels" else "str"
            lines += [f"{a.name} : {kind}{optional}", f"    {a.description}."]
            continue
        q = a.quantity
        kind = "one-dimensional array" if a.kind == "column" else "float" if record.block else "float or array"
        text = f"    {a.meaning}, {q.symbol}. [{q.si_unit}; worksheet: {q.bounds_text}]"
        lines += [f"{a.name} : {kind}{optional}", text + ("" if a.required else f" Default {a.default_text}.")]
    lines += ["", "Returns", "-------"]
    if record.block:
        lines += ["tuple, one entry per column, each a float or one-dimensional array:"]
        lines += [f"    {q.name}: {q.meaning}. [{q.si_unit}; worksheet: {q.unit}]" for q in record.results]
    elif record.result_by:
        lines += [f"float: by {record.result_by[0]}, in SI"]
    else:
        q = record.results[0]
        lines += [f"{q.name} : float or array, of the arguments broadcast together",
                  f"    {q.meaning}. [{q.si_unit}; worksheet: {q.unit}]"]
    lines += ["", "Raises", "------", "UffuncsError", "    At the worksheet: an argument of the wrong kind or outside its bounds."]
    lines += [f"    {plain_rule(rule.text)}." for rule in record.refuses]
    limits = [*(plain_rule(rule.text) for rule in record.cautions), *(fitted_text(record, f) for f in record.fitted)]
    if limits:
        lines += ["", "Cautions", "--------", *(f"{text}." for text in limits)]
    return "\n".join([*lines, "", "References", "----------", record.source])


def plain_rule(text: str) -> str:
    return text.replace("{", "").replace("}", "").rstrip(".")


def fitted_text(record: Function, f: Fitted) -> str:
    quantity = next((a.quantity for a in record.arguments if a.name == f.name), None)
    if quantity is None:
        return f"Fitted for {f.name} {f.low:.6g} to {f.high:.6g}"
    return f"Fitted for {f.name} {quantity.shown(f.low)} to {quantity.shown(f.high)}"
