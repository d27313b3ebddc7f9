"""The engine `calc`: an installed LibreOffice computes the values, in a throw-away profile."""

from __future__ import annotations

import re
import subprocess
import tempfile
from contextlib import contextmanager
from pathlib import Path
from time import perf_counter

from ..errors import ErrorValue
from ..headless.engine import Evaluation, Model, Place, Reason
from ..headless.formula import called_names, own_name
from ..headless.package import Package, UnreadableWorkbook
from ..headless.patch import alike, decode
from ..headless.sheet import ARRAY, DYNAMIC, KEPT, read_sheet, rows_and_cells
from ..headless.structure import address, read_structure
from ..registry import find
from .inside.configuration import OVERRIDE
from .installation import own_settings
from .office import (
    NAMES_UNCHANGED,
    START_AGAIN,
    Office,
    OfficeProblem,
    bundle_option,
    clean_environment,
    find_office,
    profile_option,
    run,
)
from .renaming import plain_names, programmatic_names, renamed_package

SECONDS = 600.0
CALL_SECONDS = 300.0  # nobody waits at a window
FILTER = "xlsx:Calc MS Excel 2007 XML"
PREFIXES = re.compile(r"^(?:_xlfn\.|_xlws\.|_xll\.)+", re.IGNORECASE)
VOLATILE = re.compile(r"\b(?:RAND|RANDBETWEEN|RANDARRAY|NOW|TODAY)\(", re.IGNORECASE)

#: (node, property, type, value): every value is computed anew; no macro, no link, no network, no Java.
SETTINGS = (
    ("Calc/Formula/Load", "OOXMLRecalcMode", "int", "0"),
    ("Calc/Content/Update", "Link", "int", "1"),
    ("Common/Security/Scripting", "DisableMacrosExecution", "boolean", "true"),
    ("Common/Security/Scripting", "DisableActiveContent", "boolean", "true"),
    ("Common/Security/Scripting", "BlockUntrustedRefererLinks", "boolean", "true"),
    ("Common/Security/Scripting", "MacroSecurityLevel", "int", "3"),
    ("Java/VirtualMachine", "Enable", "boolean", "false"),
)
REGISTRY = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema"
           xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance">
{items}
</oor:items>
"""
ITEM = (
    '<item oor:path="/org.openoffice.Office.{node}">'
    '<prop oor:name="{name}" oor:op="fuse" oor:type="xs:{kind}">'
    "<value>{value}</value></prop></item>"
)


class CalcEngine:
    """Evaluates with LibreOffice; only the values are taken from what it saves."""

    name = "calc"

    def evaluate(self, model: Model, progress=None) -> Evaluation:
        progress = progress or (lambda stage: None)
        started = perf_counter()
        evaluation = Evaluation()
        try:
            office = find_office()
            version = office.version()
            progress("evaluate")
            with computed(office, version, model) as saved:
                _read_values(model, saved, evaluation)
        except OfficeProblem as problem:
            raise UnreadableWorkbook(f"{model.package.label}: {problem}") from None
        evaluation.notes.append("the values are those of LibreOffice %d.%d" % version)
        evaluated = perf_counter()
        progress("explain")
        _find_unknown(model, evaluation)
        _compare(model, evaluation)
        evaluation.timings = {"evaluate": evaluated - started, "explain": perf_counter() - evaluated}
        return evaluation


@contextmanager
def computed(office: Office, version: tuple[int, int], model: Model):
    """The workbook as LibreOffice saves it after computing every formula, as a checked package.

    Raises
    ------
    OfficeProblem
        LibreOffice does not load or save it.
    """
    with tempfile.TemporaryDirectory(prefix="uffuncs-", ignore_cleanup_errors=True) as name:
        folder = Path(name)
        source = folder / ("in" + model.package.path.suffix.lower())
        new_name = plain_names if version >= NAMES_UNCHANGED else programmatic_names
        source.write_bytes(renamed_package(model, new_name))
        _write_profile(folder / "profile")
        settings = folder / "calc.json"
        _write_settings(settings)
        command = [
            office.soffice,
            profile_option(folder / "profile"),
            bundle_option(folder / "bundled"),
            "--headless",
            "--norestore",
            "--nologo",
            "--convert-to",
            FILTER,
            "--outdir",
            folder / "out",
            source,
        ]
        told = _converted(command, clean_environment() | {OVERRIDE: str(settings)})
        saved = folder / "out" / "in.xlsx"
        if not saved.is_file():
            raise OfficeProblem(
                f"LibreOffice does not load it ({' '.join(told.split())[:200] or 'it gives no reason'})"
            )
        yield Package(saved)


def _converted(command: list, environment: dict[str, str]) -> str:
    for _ in range(3):
        try:
            done = run(command, SECONDS, environment)
        except subprocess.TimeoutExpired:
            raise OfficeProblem(f"LibreOffice has not finished within {SECONDS:.0f} s") from None
        except OSError as error:
            raise OfficeProblem(f"LibreOffice cannot be run ({error.strerror or error})") from None
        if done.returncode != START_AGAIN:
            break
    return done.stderr + done.stdout


def _write_profile(folder: Path) -> None:
    items = "\n".join(ITEM.format(node=n, name=p, kind=k, value=v) for n, p, k, v in SETTINGS)
    (folder / "user").mkdir(parents=True)
    (folder / "user" / "registrymodifications.xcu").write_text(REGISTRY.format(items=items), encoding="utf-8")


def _write_settings(path: Path) -> None:
    import json

    path.write_text(json.dumps(own_settings() | {"seconds": CALL_SECONDS}), encoding="utf-8")


def _read_values(model: Model, saved: Package, evaluation: Evaluation) -> None:
    """The values of the formula cells and of the cells that array formulas cover."""
    from ..headless.recalculate import _SharedStrings

    structure = read_structure(saved)
    strings = _SharedStrings(Model(saved, structure, []))
    lost = []
    for sheet in model.sheets:
        wanted = [cell for cell in sheet.cells if cell.kind not in KEPT]
        if not wanted:
            continue
        part = structure.sheets.get(sheet.name)
        if part is None:
            raise OfficeProblem(f"LibreOffice does not read the sheet {sheet.name!r}")
        new = read_sheet(saved, sheet.name, part)
        cells = rows_and_cells(new)[1]
        formulas = {(cell.row, cell.column) for cell in new.cells}
        for cell in wanted:
            if (cell.row, cell.column) not in formulas:
                lost.append(
                    f"{sheet.name}!{address(cell.row, cell.column)}"
                )  # no value is better than a wrong one
                continue
            area = (
                cell.area if cell.kind in (ARRAY, DYNAMIC) else (cell.row, cell.column, cell.row, cell.column)
            )
            for row in range(area[0], area[2] + 1):
                for column in range(area[1], area[3] + 1):
                    known = cells.get((row, column))
                    value = decode(saved, new, known, strings) if known is not None else None
                    evaluation.values[sheet.name, row, column] = _as_cell_value(value)
            if cell.kind == DYNAMIC:
                evaluation.spills[sheet.name, cell.row, cell.column] = (
                    area[2] - area[0] + 1,
                    area[3] - area[1] + 1,
                )
    if evaluation.spills:
        evaluation.notes.append(f"{len(evaluation.spills):,} dynamic arrays keep the ranges they had")
    if lost:
        evaluation.notes.append(
            f"{len(lost):,} formulas were not read by LibreOffice and keep their values; first {lost[0]}"
        )


def _as_cell_value(value: object) -> object:
    """An error of LibreOffice's own, such as Err:502, counts as #VALUE!."""
    if isinstance(value, str) and re.fullmatch(r"Err:\d+", value):
        return ErrorValue("#VALUE!", f"LibreOffice gives {value}")
    return value


def _find_unknown(model: Model, evaluation: Evaluation) -> None:
    """Functions that only cells with #NAME? call, and that no spreadsheet program is known to have."""
    from openpyxl.utils import FORMULAE

    name_error = ErrorValue("#NAME?")
    failing: dict[str, list[Place]] = {}
    working = set()
    for sheet in model.sheets:
        for cell in sheet.cells:
            place = (sheet.name, cell.row, cell.column)
            if cell.kind in KEPT or place not in evaluation.values:
                continue
            names = dict.fromkeys(
                own_name(n) or PREFIXES.sub("", n).upper() for n in called_names(sheet.formula_of(cell))
            )
            if evaluation.values[place] == name_error:
                for name in names:
                    failing.setdefault(name, []).append(place)
            else:
                working.update(names)
    for name, places in failing.items():
        if name not in working and name not in FORMULAE and (own_name(name) is None or find(name) is None):
            evaluation.unknown[name] = places


def _compare(model: Model, evaluation: Evaluation) -> None:
    """Reasons of errors from the other engine where it has the same error; how many values differ."""
    from ..headless.formualizer_engine import FormualizerEngine

    try:
        other = FormualizerEngine().evaluate(model)
    except UnreadableWorkbook:
        other = Evaluation()
    for place, value in evaluation.values.items():
        if isinstance(value, ErrorValue):
            same = other.values.get(place) == value and place in other.reasons
            evaluation.reasons[place] = (
                other.reasons[place] if same else Reason(value.reason or f"LibreOffice gives {value.code}")
            )
    differing = [
        place
        for place in evaluation.values
        if place in other.values and not _agree(evaluation.values[place], other.values[place])
    ]
    volatile = {
        (sheet.name, cell.row, cell.column)
        for sheet in model.sheets
        for cell in sheet.cells
        if VOLATILE.search(sheet.formula_of(cell))
    }
    differing = [place for place in differing if place not in volatile]
    if differing:
        sheet, row, column = differing[0]
        evaluation.notes.append(
            f"{len(differing):,} values differ from those of the engine formualizer; "
            f"first {sheet}!{address(row, column)}: "
            f"{evaluation.values[differing[0]]} against {other.values[differing[0]]}"
        )


def _agree(one: object, other: object) -> bool:
    if isinstance(one, float) and isinstance(other, float):
        return abs(one - other) <= 1e-9 * max(abs(one), abs(other), 1e-300)
    return (
        alike(one, other) or {one, other} <= {None, "", 0.0}
        if not isinstance(one, ErrorValue)
        else one == other
    )
