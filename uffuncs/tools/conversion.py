"""UF_CONVERT and UF_QUANTITY: numbers and units."""

from __future__ import annotations

from ..declaration import cell_tool
from ..errors import InvalidInput
from ..units import convert, known_unit
from ._cells import OWN, element_by_element, plain_number, plain_text


@cell_tool(
    arguments=[
        ("value", "A number"),
        ("from_unit", "Unit of the number, such as \"gfd\""),
        ("to_unit", "Unit wanted, such as \"LMH\""),
    ],
    result="the unit wanted",
    equation="value in from_unit = result in to_unit",
    elementwise=True,
    source="Exact definitions of the units: BIPM, The International System of Units, 9th ed. (2019); NIST SP 811 (2008)",
)
def uf_convert(value, from_unit, to_unit):
    """A number in one unit, expressed in another of the same dimension.

    Trade units are included: LMH, gfd, LMH/bar, gfd/psi, kDa, cP, MGD, MLD, gpm, mmHg, degF. Temperatures are converted as
    temperatures, not as differences. A range of values is converted element by element.
    """
    return element_by_element(_converted, [value, from_unit, to_unit])


def _converted(value, from_unit, to_unit) -> float:
    units = plain_text("from_unit", from_unit), plain_text("to_unit", to_unit)
    return convert(plain_number("value", value), *units)


@cell_tool(
    arguments=[
        ("value", "A number"),
        ("unit", 'Its unit, such as "gfd"'),
        ("uncertainty", "Standard uncertainty in the same unit", 0),
    ],
    result="text",
    equation="value ± uncertainty unit",
    source=OWN,
    elementwise=True,
)
def uf_quantity(value, unit, uncertainty):
    """A unit text that every argument reads, whatever the decimal sign of the locale.

    With an uncertainty the text is one that UF_UNCERTAINTY reads.
    """
    return element_by_element(_quantity, [value, unit, uncertainty])


def _quantity(value, unit, uncertainty) -> str:
    number, spread, text = plain_number("value", value), plain_number("uncertainty", uncertainty), plain_text("unit", unit)
    if spread < 0:
        raise InvalidInput(f"the uncertainty must not be below 0; got {spread:g}")
    known_unit(text)
    if not spread:
        return f"{number!r} {text}"
    own = " %" if text == "%" else ""  # a lone % at the end could be read as relative
    return f"{number!r}{own} ± {spread!r} {text}"
