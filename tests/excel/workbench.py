"""The built add-in in pyOpenVBA's interpreter: its VBA runs, and calls xlwings' real server code."""

from __future__ import annotations

import re
from pathlib import Path

from pyopenvba import ExcelFile, VBAModuleKind
from pyopenvba.apps.excel import ExcelApplication
from pyopenvba.interpreter._objects import VBAObject, method
from pyopenvba.interpreter._values import EMPTY, MISSING, VBAErrorValue, error

from tests.excel.pywin32 import xlwings_of_windows
from tests.excel.transport import as_cell_value, to_python, to_vba
from uffuncs import excel
from uffuncs.errors import ErrorValue
from uffuncs.excel.adapter import ERROR_NUMBERS

#: xlwings' library, which only Windows can load, and the reading of a file, as a module of VBA;
#: `TheLibrary` is the object below.
LIBRARY = """
Public Function XLPyDLLActivateAuto(ByRef Result As Variant, _
        Optional ByVal Config As String = "", Optional ByVal mode As Long = 1) As Long
    If mode = -1 Then
        TheLibrary.Stop_ Config
    ElseIf TheLibrary.CanStart(Config) Then
        Set Result = TheLibrary.Server
    Else
        Result = "the process ended"
        XLPyDLLActivateAuto = 1
    End If
End Function
Public Function LoadLibrary(ByVal lpLibFileName As String) As Long
    LoadLibrary = TheLibrary.Load(lpLibFileName)
End Function
Public Function SettingsText() As String
    SettingsText = TheLibrary.Settings
End Function
"""


class Library(VBAObject):
    """xlwings' library: starts the server, which is xlwings' own object."""

    vba_type_name = "Library"

    def __init__(self, settings: Path):
        self.settings = settings
        self.commands, self.stopped, self.loaded = [], [], []
        self.broken = self.absent = False
        self.server = Server()

    @method
    def CanStart(self, command):
        self.commands.append(str(command))
        return not self.broken

    @method
    def Stop_(self, command):
        self.stopped.append(str(command))

    @method
    def Load(self, path):
        self.loaded.append(str(path))
        return 0 if self.absent else 1

    @method
    def Server(self):
        return self.server

    @method
    def Settings(self):
        if not self.settings.exists():
            raise error(53)
        return self.settings.read_text(encoding="ascii")


class Server(VBAObject):
    """XLPython of xlwings behind a model of COM; `failures` calls fail as those of a server that is gone."""

    vba_type_name = "XLPython"

    def __init__(self):
        self.real = xlwings_of_windows().server
        self.failures = 0
        self.calls, self.cells = 0, ()

    @method
    def CallUDF(self, module, name, cells):
        self.calls += 1
        if self.failures:
            self.failures -= 1
            raise error(462, "The remote server machine does not exist or is unavailable")
        self.cells = to_python(cells)
        return to_vba(self.real.CallUDF(str(module), str(name), self.cells))


class Workbench:
    """Excel with the add-in and one open workbook, so far as the interpreter models it."""

    def __init__(self, folder: Path):
        addin, settings = excel.build(
            folder,
            r"C:\Python\python.exe",
            {"library32": r"C:\Python\32.dll", "library64": r"C:\Python\64.dll"},
        )
        self.app = ExcelApplication.open(addin, with_vba=False)
        interpreter = self.app.interpreter
        with ExcelFile(str(addin)) as written:
            for module in written.vba_project().modules:
                kind = "standard" if module.kind is VBAModuleKind.standard else "document"
                # What the interpreter has not: events of Application (tests call the handlers), hidden lines
                # of descriptions (tests read the file), libraries of Windows and files (LIBRARY stands in).
                source = module.source.replace("Private WithEvents ", "Private ")
                source = re.sub(r"(?m)^(Attribute UF_|    Private Declare ).*\n", "", source)
                source = re.sub(r"(?ms)^Private Function SettingsText.*?^End Function", "", source)
                self.app.add_module(source, name=module.name, kind=kind)
        self.library = Library(settings)
        known = interpreter.host.global_object
        interpreter.host.global_object = lambda name: self.library if name == "thelibrary" else known(name)
        self.app.add_module(LIBRARY, name="Library")
        self.asked = self._record("MacroOptions", "CalculateFullRebuild")
        self.book = self.app.add_workbook()
        self.sheet = self.app.sheet(1, workbook=self.book).sheet

    def _record(self, *names: str) -> list:
        """What the add-in asks of Excel that the interpreter has not: (name, named arguments), in order."""
        asked, application = [], self.app.application
        known, self.refused = application.vba_get, 0

        def get(name, args=(), named=None):
            if name.casefold() not in map(str.casefold, names):
                return known(name, args, named)
            if self.refused:
                self.refused -= 1
                raise error(1004)
            asked.append((name, dict(named or {})))
            return EMPTY

        application.vba_get = get
        return asked

    def handle(self, event: str, *given):
        """Run a handler of the add-in's workbook, as an event of Excel would."""
        return self.app.interpreter.run(event, list(given), module="ThisWorkbook")

    def range(self, reference: str):
        return self.sheet.vba_get("Range", [reference])

    def fill(self, reference: str, value):
        """Write a cell; None makes it blank. The apostrophe keeps a text a text, as when it is typed."""
        if value == "":
            self.range(reference).vba_set("Formula", '=""')
            return
        if isinstance(value, str):
            value = f"'{value}"
        if isinstance(value, ErrorValue):
            value = VBAErrorValue(ERROR_NUMBERS[value.code])
        self.range(reference).vba_set(
            "Value2", EMPTY if value is None else float(value) if type(value) is int else value
        )

    def call(self, name: str, cells):
        """`=NAME(…)` with each argument in cells: blanks stay blank cells, rows become a range."""
        self.sheet.vba_get("Cells").vba_get("Clear")
        given, row = [], 1
        for cell in cells:
            rows = cell if isinstance(cell, list) else [[cell]]
            rows = rows if isinstance(rows[0], list) else [rows]
            for i, values in enumerate(rows):
                for j, value in enumerate(values):
                    self.fill(_reference(row + i, j), value)
            given.append(
                self.range(f"{_reference(row, 0)}:{_reference(row + len(rows) - 1, len(rows[0]) - 1)}")
            )
            row += len(rows)
        return self.raw(name, *given)

    def raw(self, name: str, *given):
        """A call with values or ranges as they are; MISSING for an argument left out between commas."""
        return as_cell_value(self.app.interpreter.run(name, list(given)))


def _reference(row: int, column: int) -> str:
    letters, n = "", column + 1
    while n:
        n, rest = divmod(n - 1, 26)
        letters = chr(65 + rest) + letters
    return f"{letters}{row}"


__all__ = ["MISSING", "Workbench"]
