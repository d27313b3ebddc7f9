"""Binds worksheet names that an older LibreOffice has read from an .xlsx as unknown ones (#NAME?)."""

import re

ERROR_RESULTS = 4  # of com.sun.star.sheet.FormulaResult
UNKNOWN_NAME = (508, 525)
TEXT = re.compile('"[^"]*"')
CALL = re.compile(r"(?<![\w.])(UF_\w+)(?=\()", re.IGNORECASE)


def bind_names(document, names):
    """Enter anew the formulas that show #NAME? and call one of the names, perhaps through a defined name.

    `names` is a collection of worksheet names in capitals.
    """
    modified = document.isModified()
    document.lockControllers()
    try:
        defined = _bound_definitions(document, names)
        for sheet in document.Sheets:
            seen = set()
            for area in sheet.queryFormulaCells(ERROR_RESULTS):
                for i, row in enumerate(area.getFormulaArray()):
                    for j, formula in enumerate(row):
                        if calls(formula, names) or defined and defined.search(formula):
                            _enter_anew(sheet, area.getCellByPosition(j, i), formula, seen)
    finally:
        document.unlockControllers()
        document.setModified(modified)  # binding is no change of the user's


def _bound_definitions(document, names):
    """Enter anew the defined names that call a function; a pattern of their names, or None."""
    bound = []
    for collection in [document.NamedRanges] + [sheet.NamedRanges for sheet in document.Sheets]:
        for name in collection.getElementNames():
            entry = collection.getByName(name)
            content = entry.getContent()
            if calls(content, names):
                entry.setContent(content)
                bound.append(re.escape(name))
    return re.compile(r"(?<![\w.])(?:%s)(?![\w.(])" % "|".join(bound), re.IGNORECASE) if bound else None


def calls(formula, names):
    """Whether a formula calls one of the names; texts do not count."""
    found = CALL.findall(TEXT.sub('""', formula))
    return any(name.upper() in names for name in found)


def _enter_anew(sheet, cell, formula, seen):
    if cell.getError() not in UNKNOWN_NAME:
        return
    if not formula.startswith("{"):
        cell.setFormula(formula)
        return
    array = sheet.createCursorByRange(cell)
    array.collapseToCurrentArray()
    if array.AbsoluteName not in seen:
        seen.add(array.AbsoluteName)
        array.setArrayFormula(formula.strip("{}"))
