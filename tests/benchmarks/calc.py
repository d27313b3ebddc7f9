"""Calc: 10,000 cells of UF_FLUX_DARCY in LibreOffice, against native, Basic and do-nothing functions."""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path
from time import perf_counter

from tests.benchmarks.measure import Row

CELLS = 10_000
RUNS = 15
FORMULAS = {
    "native": "=A{r}*1E5/(1.002E-3*5E12)*3.6E6",
    "basic": "=FLUX_IN_BASIC(A{r};1.002;5E12)",
    "nothing": "=NOTHING(A{r};1.002;5E12)",
    "uffuncs": "=UF_FLUX_DARCY(A{r};1.002;5E12)",
}
BASIC = """
Function flux_in_basic(pressure, viscosity, resistance)
    flux_in_basic = pressure * 1E5 / (viscosity * 1E-3 * resistance) * 3.6E6
End Function
"""
BASIC_COLUMN = """
Function flux_column_in_basic(pressure, viscosity, resistance)
    Dim flux(1 To UBound(pressure, 1), 1 To 1)
    For n = 1 To UBound(pressure, 1)
        flux(n, 1) = pressure(n, 1) * 1E5 / (viscosity * 1E-3 * resistance) * 3.6E6
    Next n
    flux_column_in_basic = flux
End Function
"""

NOTHING = """
import unohelper
from com.sun.star.lang import Locale, XServiceInfo, XServiceName
from com.sun.star.sheet import XAddIn
from org.uffuncs.nothing import XFunctions

SERVICE, ADD_IN = "org.uffuncs.nothing.Functions", "com.sun.star.sheet.AddIn"


class Functions(unohelper.Base, XFunctions, XAddIn, XServiceName, XServiceInfo):
    def __init__(self, context):
        self.locale = Locale("en", "US", "")

    def nothing(self, pressure, viscosity, resistance):
        return 1.0

    def getProgrammaticFuntionName(self, name):
        return "nothing" if name == "NOTHING" else ""

    def getDisplayFunctionName(self, method):
        return method.upper()

    def getFunctionDescription(self, method):
        return ""

    def getDisplayArgumentName(self, method, number):
        return str(number)

    def getArgumentDescription(self, method, number):
        return ""

    def getProgrammaticCategoryName(self, method):
        return "Add-In"

    def getDisplayCategoryName(self, method):
        return "Add-In"

    def setLocale(self, locale):
        self.locale = locale

    def getLocale(self):
        return self.locale

    def getServiceName(self):
        return SERVICE

    def getImplementationName(self):
        return SERVICE + ".implementation"

    def supportsService(self, name):
        return name in (SERVICE, ADD_IN)

    def getSupportedServiceNames(self):
        return (SERVICE, ADD_IN)


g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(Functions, SERVICE + ".implementation", (SERVICE, ADD_IN))
"""
COMPONENTS = """<?xml version="1.0" encoding="UTF-8"?>
<components xmlns="http://openoffice.org/2010/uno-components">
  <component loader="com.sun.star.loader.Python" uri="nothing.py">
    <implementation name="org.uffuncs.nothing.Functions.implementation">
      <service name="org.uffuncs.nothing.Functions"/>
      <service name="com.sun.star.sheet.AddIn"/>
    </implementation>
  </component>
</components>
"""
MANIFEST = """<?xml version="1.0" encoding="UTF-8"?>
<manifest:manifest xmlns:manifest="http://openoffice.org/2001/manifest">
  <manifest:file-entry manifest:full-path="types.rdb"
      manifest:media-type="application/vnd.sun.star.uno-typelibrary;type=RDB"/>
  <manifest:file-entry manifest:full-path="nothing.components"
      manifest:media-type="application/vnd.sun.star.uno-components"/>
</manifest:manifest>
"""
IDENTIFIER = """<?xml version="1.0" encoding="UTF-8"?>
<description xmlns="http://openoffice.org/extensions/description/2006">
  <identifier value="org.uffuncs.nothing"/><version value="1"/><platform value="all"/>
</description>
"""


def rows():
    sys.path.insert(0, str(Path(__file__).parents[1] / "calc"))
    from uffuncs.calc.office import OfficeProblem, find_office

    try:
        from calc_session import uno_bridge

        uno_bridge()
        office = find_office()
    except (OfficeProblem, ImportError) as error:
        print(f"  left out: {error}")
        return
    times = {}
    for place in ("in process", "worker"):
        with tempfile.TemporaryDirectory() as folder:
            times |= _measured(office, Path(folder), place)
    per_cell = {key: 1e6 * seconds / CELLS for key, seconds in times.items()}
    yield Row("a native formula", per_cell["native"], "µs/cell")
    yield Row("a function in Basic", per_cell["basic"], "µs/cell")
    yield Row("a do-nothing function of a Python add-in", per_cell["nothing"], "µs/cell")
    yield Row("UF_FLUX_DARCY in process", per_cell["in process"], "µs/cell")
    yield Row("  over the do-nothing function", times["in process"] / times["nothing"], "times", 2)
    yield Row("UF_FLUX_DARCY in the worker", per_cell["worker"], "µs/cell")
    yield Row("one array formula of a function in Basic", per_cell["basic, array"], "µs/row")
    for place, label in (("in process", "in process"), ("worker", "in the worker")):
        yield Row(f"one array formula of UF_FLUX_DARCY {label}", per_cell[f"{place}, array"], "µs/row")
        yield Row(
            "  over the array formula in Basic", times[f"{place}, array"] / times["basic, array"], "times", 1
        )
        yield Row(
            "  over the function in Basic, cell by cell",
            times[f"{place}, array"] / times["basic"],
            "times",
            1,
        )
    yield Row(
        "LibreOffice started until the first value of a function, in process", times["in process, first"], "s"
    )
    yield Row("the same, in the worker", times["worker, first"], "s")


def _measured(office, folder: Path, place: str) -> dict[str, float]:
    from calc_session import Session, settings

    _add_nothing(folder / "bundled" / "nothing")
    started = perf_counter()
    with Session(office, folder, settings(folder, mode=place)) as session:
        cell = session.open().Sheets.getByIndex(0).getCellByPosition(0, 0)
        cell.setFormula("=UF_VERSION()")
        assert cell.String
        found = {f"{place}, first": perf_counter() - started}
        wanted = {place: FORMULAS["uffuncs"]}
        arrays = {f"{place}, array": f"=UF_FLUX_DARCY(A1:A{CELLS};1.002;5E12)"}
        if place == "in process":
            wanted |= {key: FORMULAS[key] for key in ("native", "basic", "nothing")}
            arrays["basic, array"] = f"=FLUX_COLUMN_IN_BASIC(A1:A{CELLS};1.002;5E12)"
        sheets = {}
        for key, formula in (wanted | arrays).items():
            copy = session.open(MacroExecutionMode=4)
            _add_basic(copy)
            sheets[key] = copy, copy.Sheets.getByIndex(0)
            _fill(sheets[key][1], formula, as_array=key in arrays)
        for _ in range(RUNS):  # in turns, so that other load on the machine meets all of them
            for key, (copy, sheet) in sheets.items():
                found[key] = min(
                    found.get(key, float("inf")),
                    _recalculation(copy, sheet, 1.0 if key == "nothing" else 144.0 / 1.002),
                )
    return found


def _add_basic(document) -> None:
    libraries = document.BasicLibraries
    if not libraries.hasByName("Standard"):
        libraries.createLibrary("Standard")
    libraries.getByName("Standard").insertByName("Module1", BASIC + BASIC_COLUMN)


def _fill(sheet, formula: str, as_array: bool) -> None:
    sheet.getCellRangeByName(f"A1:A{CELLS}").setDataArray(tuple((0.5 + n / 2500,) for n in range(CELLS)))
    area = sheet.getCellRangeByName(f"B1:B{CELLS}")
    if as_array:
        area.setArrayFormula(formula)
    else:
        area.setFormulaArray(tuple((formula.format(r=r),) for r in range(1, CELLS + 1)))


def _recalculation(document, sheet, at_two_bar: float) -> float:
    """Time of computing everything anew; a wrong value is no time at all."""
    started = perf_counter()
    document.calculateAll()
    value = sheet.getCellRangeByName("B3751").Value  # the row of 2 bar
    spent = perf_counter() - started
    assert abs(value - at_two_bar) < 1e-9 * at_two_bar, value
    return spent


def _add_nothing(folder: Path) -> None:
    from uffuncs.calc.type_library import type_library

    parameters = [(name, "any") for name in ("pressure", "viscosity", "resistance")]
    files = {
        "META-INF/manifest.xml": MANIFEST,
        "description.xml": IDENTIFIER,
        "nothing.components": COMPONENTS,
        "nothing.py": NOTHING,
    }
    for path, text in files.items():
        (folder / path).parent.mkdir(parents=True, exist_ok=True)
        (folder / path).write_text(text, encoding="utf-8")
    (folder / "types.rdb").write_bytes(
        type_library(
            "org.uffuncs.nothing.XFunctions",
            "org.uffuncs.nothing.Functions",
            [("nothing", "double", parameters)],
        )
    )
