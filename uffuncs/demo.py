"""`uffuncs demo`: builds the design workbook, recalculates it and reads its key results back."""

from __future__ import annotations

import sys
from dataclasses import dataclass
from importlib import import_module
from importlib.util import find_spec
from pathlib import Path

NAME = "plant_design.xlsx"


@dataclass(frozen=True)
class KeyResults:
    """The table of key results as the workbook holds it, values formatted."""

    title: str
    rows: list[tuple[str, str, str]]


def builder(script: str = "plant_design"):
    """A module of the demo workbooks: inside an installed package, or beside the package in a checkout."""
    if find_spec("uffuncs.workbooks_demo"):
        return import_module(f"uffuncs.workbooks_demo.{script}")
    checkout = str(Path(__file__).resolve().parents[1])
    if checkout not in sys.path:
        sys.path.append(checkout)
    return import_module(f"workbooks_demo.{script}")


def build_and_recalculate(folder: Path, overwrite: bool = False):
    """Build the workbook in a folder and recalculate it there.

    Returns
    -------
    (Path, KeyResults, Report)

    Raises
    ------
    FileExistsError
        There is such a workbook already, and `overwrite` is not given.
    """
    target = folder / NAME
    if target.exists() and not overwrite:
        raise FileExistsError(17, "File exists", str(target))
    folder.mkdir(parents=True, exist_ok=True)
    report = builder("layout").write_with_values(builder().build, target)
    return target, key_results(target), report


def key_results(path: Path) -> KeyResults:
    """The key results of the workbook's summary sheet."""
    import openpyxl

    layout = builder("plant_results").SUMMARY
    sheet = openpyxl.load_workbook(path, data_only=True)[layout.sheet]
    rows = []
    for label, value, unit in sheet.iter_rows(layout.first_row, layout.last_row, layout.column, layout.column + 2):
        shown = value.value
        if isinstance(shown, (int, float)):
            shown = f"{shown:,.{_decimals(value.number_format)}f}"
        rows.append((str(label.value), str(shown), str(unit.value or "")))
    return KeyResults(str(sheet["A1"].value), rows)


def _decimals(number_format: str) -> int:
    """Decimals of a plain number format such as #,##0.00."""
    return len(number_format.partition(".")[2])
