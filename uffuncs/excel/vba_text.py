"""The add-in's VBA: fixed parts from `vba/`, and one short wrapper for each function of the registry."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable
from pathlib import Path

from ..declaration import Function, Tool
from ..version import __version__
from .adapter import ERROR_NUMBERS
from .names import LONGEST_TEXT, argument_names, check

FUNCTIONS_MODULE = "UffuncsFunctions"
_FIXED = Path(__file__).with_name("vba")
_LONGEST_LINE = 1000  # VBA takes 1,023 characters, and 24 continuations of a line
_SPELLED = str.maketrans(
    {
        "²": "2",
        "³": "3",
        "·": "*",
        "µ": "u",
        "μ": "u",
        "°": " deg ",
        "±": "+/-",
        "×": "x",
        "−": "-",
        "–": "-",
        "…": "...",
        "≤": "<=",
        "≥": ">=",
        "ⁿ": "^n",
        "α": "alpha",
        "ε": "epsilon",
        "ρ": "rho",
        "ω": "omega",
        "“": '"',
        "”": '"',
        "’": "'",
        "Δ": "Delta ",
    }
)


def functions_module(records: Iterable[Function | Tool]) -> str:
    """The module of the wrappers."""
    records = list(records)
    check(records)
    errors = "\n".join(
        f'        Case "{code}": UfxValue = CVErr({number})' for code, number in ERROR_NUMBERS.items()
    )
    parts = [_fixed("functions.bas").replace("@ERRORS@", errors), *map(wrapper, records)]
    return _as_vba("\n".join(parts))


def this_workbook_module(xlwings_version: str) -> str:
    """The code of the add-in's workbook: Python server, texts of the wizard, binding of names."""
    return _as_vba(_fixed("this_workbook.cls").replace("@XLWINGS@", xlwings_version))


def wrapper(record: Function | Tool) -> str:
    """One function as a cell calls it."""
    name, names = record.worksheet_name, argument_names(record)
    parameters = [
        f"{'' if a.required else 'Optional '}ByVal {n} As Variant" for n, a in zip(names, record.arguments)
    ]
    given = [f"UfxCells({n})" for n in names[: len(record.arguments)]]
    variadic = len(names) > len(record.arguments)
    if variadic:
        parameters.append(f"ParamArray {names[-1]}() As Variant")
    lines = [
        f"Public Function {name}({_joined(parameters)}) As Variant",
        f'Attribute {name}.VB_Description = "{_quoted(plain_ascii(record.summary))}"',
        f'Attribute {name}.VB_ProcData.VB_Invoke_Func = " \\n14"',
    ]
    if variadic:
        count = len(given)
        lines += [
            "    Dim ufxGiven() As Variant, ufxPlace As Long",
            f"    ReDim ufxGiven(0 To UBound({names[-1]}) + {count})",
            *(f"    ufxGiven({i}) = {g}" for i, g in enumerate(given)),
            f"    For ufxPlace = 0 To UBound({names[-1]})",
            f"        ufxGiven(ufxPlace + {count}) = UfxCells({names[-1]}(ufxPlace))",
            "    Next ufxPlace",
            f'    {name} = UfxAnswer("{name}", ufxGiven)',
        ]
    else:
        lines.append(f'    {name} = UfxAnswer("{name}", Array({_joined(given)}))')
    return "\n".join([*lines, "End Function", ""])


def plain_ascii(text: str) -> str:
    """A text within VBA's source, which has one code page only; the wizard's texts keep every character."""
    text = unicodedata.normalize("NFKD", text.translate(_SPELLED)).encode("ascii", "ignore").decode()
    return re.sub(r"\s+", " ", text)[:LONGEST_TEXT]


def _fixed(name: str) -> str:
    return (_FIXED / name).read_text(encoding="ascii").replace("@VERSION@", __version__)


def _joined(parts: list[str]) -> str:
    """Comma-separated, broken into lines that VBA takes."""
    rows, row = [], ""
    for part in parts:
        if row and len(row) + len(part) > _LONGEST_LINE - 200:
            rows.append(row)
            row = ""
        row += part if not row else f", {part}"
    return ", _\n        ".join([*rows, row])


def _quoted(text: str) -> str:
    return text.replace('"', '""')


def _as_vba(text: str) -> str:
    return text.replace("\r\n", "\n").replace("\n", "\r\n")
