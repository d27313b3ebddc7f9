"""The words of UF_WHY: why there is no result, when to be careful with one, and what is worth knowing besides."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from .declaration import Argument, Fitted, Function, Rule, parameter_names


def no_result_reason(record: Function, values: Sequence) -> str:
    """Why sound arguments (in SI) gave no finite result."""
    for rule in record.refuses:
        if _evaluated(rule.when, record, values, None):
            return f"{record.worksheet_name}: {_told(rule, record, values, None)}"
    zeros = [a.name for a, v in zip(record.arguments, values) if a.kind == "number" and v is not None and v == 0]
    cause = f"; {', '.join(zeros)} {'is' if len(zeros) == 1 else 'are'} 0" if zeros else ""
    return f"{record.worksheet_name}: no finite result, by a division by zero or a number too large{cause}"


def cautions(record: Function, values: Sequence, result: object = None) -> list[str]:
    """What to be careful with, for arguments and result in SI."""
    found = _that_hold(record.cautions, record, values, result)
    for fitted in record.fitted:
        found += filter(None, [_outside_fitted(record, fitted, values, result)])
    for argument, value in zip(record.arguments, values):
        if argument.kind == "number" and not argument.required and _is_zero(argument, value) and not _is_zero(argument, argument.default):
            found.append(f"{argument.name} is exactly 0, not its default {argument.default_text}: a blank cell in Calc?")
    if isinstance(result, (int, float)) and len(record.results) == 1 and not record.block:
        q = record.results[0]
        if not q.low <= q.from_si(result) <= q.high:
            found.append(f"the result {q.shown(result)} lies outside {q.bounds_text}, the span of its kind; check the arguments")
    return found


def remarks(record: Function, values: Sequence, result: object = None) -> list[str]:
    """What else there is to tell, for example the branch used."""
    return _that_hold(record.remarks, record, values, result)


def _that_hold(rules: Sequence[Rule], record: Function, values: Sequence, result: object) -> list[str]:
    return [_told(rule, record, values, result) for rule in rules if _evaluated(rule.when, record, values, result)]


def _is_zero(argument: Argument, value: object) -> bool:
    return isinstance(value, (int, float)) and argument.quantity.from_si(value) == 0


def _outside_fitted(record: Function, fitted: Fitted, values: Sequence, result: object) -> str:
    if fitted.when is not None and not _evaluated(fitted.when, record, values, result):
        return ""
    if fitted.value is None:
        value = _named(record, values, result)[fitted.name]
        shown = record.arguments[record.argument_names.index(fitted.name)].quantity.shown
    else:
        value = _evaluated(fitted.value, record, values, result)
        shown = "{:.6g}".format
    if value is None or not math.isfinite(value):
        return ""
    # Nine digits decide: 20 °C given in °F may not fall outside 20 °C by rounding.
    if fitted.low * (1 - math.copysign(1e-9, fitted.low)) <= value <= fitted.high * (1 + math.copysign(1e-9, fitted.high)):
        return ""
    return f"{fitted.name} {shown(value)} is outside {shown(fitted.low)} to {shown(fitted.high)}, where the equation was fitted"


def _named(record: Function, values: Sequence, result: object) -> dict[str, object]:
    return {**dict(zip(record.argument_names, values)), "result": result}


def _evaluated(condition: Callable, record: Function, values: Sequence, result: object):
    """A condition or a number of a declaration, from arguments by name; None where it cannot be told, as on one left out."""
    named = _named(record, values, result)
    try:
        return condition(**{name: named[name] for name in parameter_names(condition)})
    except (ArithmeticError, TypeError):
        return None


def _told(rule: Rule, record: Function, values: Sequence, result: object) -> str:
    return _evaluated(rule.told, record, values, result) if rule.told else _filled(rule.text, record, values, result)


def _filled(text: str, record: Function, values: Sequence, result: object) -> str:
    shown = {}
    for argument, value in zip(record.arguments, values):
        if argument.quantity is not None and isinstance(value, (int, float)):
            shown[argument.name] = f"{argument.name} {argument.quantity.shown(value)}"
        else:
            shown[argument.name] = argument.name
    if record.results and isinstance(result, (int, float)):
        shown["result"] = record.results[0].shown(result)
    return text.format_map(shown) if "{" in text else text
