"""UF_CLAIM: a claimed value against a calculated one, as a verdict in words."""

from __future__ import annotations

from ..declaration import cell_tool
from ..errors import CellError, ErrorValue, InvalidInput, NoResult
from ..reading import is_blank, split_number
from ..units import convert, known_unit
from ._cells import OWN, element_by_element, plain_number, plain_text

SENSES = ("equal", "at most", "at least")


@cell_tool(
    arguments=[
        ("claimed", "The value claimed"),
        ("calculated", "The value calculated"),
        ("tolerance", "Relative tolerance, 0.1 or \"10 %\"", 0.1),
        ("sense", "equal; at most: the claim may not exceed the calculated value; at least: it may not fall short of it", "equal"),
        ("unit", "Unit of plain numbers; with it, claims may be unit texts such as \"20 gfd\"", ""),
    ],
    result="text",
    equation="d = (claimed − calculated)/|calculated|; holds, above or below by comparison with the tolerance",
    source=OWN,
    elementwise=True,
)
def uf_claim(claimed, calculated, tolerance, sense, unit):
    """Whether a claim holds against a calculated value: holds, above or below, and the difference in per cent.

    The text starts with the verdict, so that a conditional format can tell it. Ranges are compared element by element.
    """
    return element_by_element(_verdict, [claimed, calculated, tolerance, sense, unit])


def _verdict(claimed, calculated, tolerance, sense, unit) -> str:
    unit = plain_text("unit", unit) if not is_blank(unit) else ""
    if unit:
        known_unit(unit)
    allowed = _tolerance(tolerance)
    chosen = plain_text("sense", sense).casefold() if not is_blank(sense) else "equal"
    if chosen not in SENSES:
        raise InvalidInput(f"sense must be one of: {', '.join(SENSES)}; got '{chosen[:40]}'")
    claim, value = _in_unit("claimed", claimed, unit), _in_unit("calculated", calculated, unit)
    if value == 0:
        if claim == 0:
            return "holds: +0.0 %"
        raise NoResult("the calculated value is 0: a relative difference cannot be told")
    difference = (claim - value) / abs(value)
    shown = f"{100 * difference:+.1f} %".replace("-", "−").replace("−0.0 %", "+0.0 %")
    slack = allowed + 1e-12  # a claim exactly at the tolerance holds, whatever the rounding
    if difference > slack and chosen != "at least":
        return f"above: {shown}"
    if difference < -slack and chosen != "at most":
        return f"below: {shown}"
    return f"holds: {shown}"


def _tolerance(cell: object) -> float:
    if isinstance(cell, str):
        number, unit = split_number("tolerance", cell, "%")
        if unit not in ("", "%"):
            raise InvalidInput(f"tolerance must be a share or per cent; got '{cell[:40]}'")
        cell = number / 100 if unit else number
    number = 0.1 if is_blank(cell) else plain_number("tolerance", cell)
    if not 0 <= number <= 10:
        raise InvalidInput(f"tolerance must be 0 to 10; got {number:g}")
    return number


def _in_unit(name: str, cell: object, unit: str) -> float:
    """A number, or a unit text converted to the unit given."""
    if isinstance(cell, ErrorValue):
        raise CellError(cell)
    if not isinstance(cell, str) or is_blank(cell):
        return plain_number(name, cell)
    number, own = split_number(name, cell, unit or "1")
    if not own:
        return number
    if not unit:
        raise InvalidInput(f"{name} carries the unit '{own[:20]}'; name a unit in the last argument")
    return convert(number, own, unit)
