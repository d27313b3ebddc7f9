"""The copy of a workbook that LibreOffice reads: names without prefixes, or programmatic ones."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Callable
from xml.sax.saxutils import escape

from ..headless.formula import own_name, tokens
from ..headless.prepare import apply_edits
from ..headless.sheet import KEPT, decode_text
from .names import IDENTIFIER, add_in_functions, programmatic_name

DEFINED_NAME = re.compile(rb"(<(?:[\w.-]+:)?definedName(?=[\s>])[^>]*>)([^<]*)(?=</)")
MENTIONS = re.compile("UF_|" + re.escape(IDENTIFIER), re.IGNORECASE)


def plain_names(name: str) -> str | None:
    """A uffuncs function as it is typed, whatever stands before it; None of any other name."""
    return own_name(name)


def programmatic_names(name: str) -> str | None:
    """A uffuncs function as versions before 25.2 read it in an .xlsx; None of any other name."""
    own = own_name(name)
    return programmatic_name(own) if own else None


def worksheet_names() -> Callable[[str], str | None]:
    """Back from programmatic names, as versions before 25.2 save them."""
    known = {programmatic_name(f.name): f.name for f in add_in_functions()}
    return lambda name: known.get(name.upper())


def renamed(formula: str, new_name: Callable[[str], str | None]) -> str:
    """A formula with the names of the uffuncs functions it calls replaced; texts stay."""
    if MENTIONS.search(formula) is None:
        return formula
    out, parts = [], list(tokens(formula))
    for (_, text), (_, following) in zip(parts, [*parts[1:], ("", "")], strict=True):
        new = new_name(text) if following == "(" else None
        if new:
            _drop_qualifier(out)
        out.append(new or text)
    return "".join(out)


def _drop_qualifier(out: list[str]) -> None:
    """Remove [1]! or 'C:\\folder\\file.xlam'! written just before a function's name."""
    if out and out[-1] == "!":
        del out[-2:]
        while out and out[-1].startswith("["):
            out.pop()


def renamed_package(model, new_name: Callable[[str], str | None]) -> bytes:
    """The workbook's bytes with the formulas and defined names renamed; everything else as it was."""
    parts = {}
    for sheet in model.sheets:
        edits = [edit for cell in sheet.cells if (edit := _edit(sheet, cell, new_name))]
        if edits:
            parts[sheet.part] = apply_edits(sheet.data, edits)
    workbook = model.structure.workbook_part
    data = model.package.read_xml(workbook)

    def replaced(match: re.Match) -> bytes:
        text = decode_text(model.package, workbook, match[2])
        new = renamed(text, new_name)
        return match[0] if new == text else match[1] + escape(new).encode()

    new = DEFINED_NAME.sub(replaced, data)
    if new != data:
        parts[workbook] = new
    return model.package.with_parts(parts, zipfile.ZIP_STORED) if parts else model.package.stored


def _edit(sheet, cell, new_name) -> tuple[int, int, bytes] | None:
    if cell.kind in KEPT or not cell.text:
        return None
    new = renamed(cell.text, new_name)
    if new == cell.text:
        return None
    element = sheet.data[cell.formula_start : cell.formula_end]
    opening = element[: element.index(b">") + 1]
    return cell.formula_start, cell.formula_end, opening + escape(new).encode() + b"</%sf>" % sheet.prefix
