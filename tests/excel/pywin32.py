"""Stands in for pywin32, so far as xlwings' functions and server ask: xlwings' real code runs anywhere.

Nothing of COM happens here. What pywin32 does to values on their way is modelled in `transport.py`.
"""

from __future__ import annotations

import atexit
import contextlib
import ctypes
import datetime
import sys
from types import ModuleType, SimpleNamespace

RANGE_CLASS = "{00020846-0000-0000-C000-000000000046}"


class ComError(Exception):
    """pywintypes.com_error"""


class Dispatched:
    """What a call of COM gives back as an object."""


class Anything:
    """A library of which every entry can be called and gives 0."""

    def __getattr__(self, name):
        return Anything()

    def __call__(self, *given, **named):
        return 0


def _not_wrapped(value):
    raise ComError("no Python object inside")


def _modules() -> dict[str, ModuleType]:
    contents = {
        "pywintypes": {"com_error": ComError, "error": ComError, "IID": str, "TimeType": datetime.datetime},
        "pythoncom": {
            "com_error": ComError,
            "ole_error": ComError,
            "__file__": "no library",
            "CoInitialize": lambda *given: None,
            "IID_IDispatch": "IDispatch",
            "IID_IEnumVARIANT": "IEnumVARIANT",
            "TypeIIDs": {"IDispatch": Dispatched},
        },
        "win32api": {},
        "win32con": {},
        "win32gui": {},
        "win32process": {"GetWindowThreadProcessId": lambda window: (1, 1)},
        "win32event": {},
        "win32timezone": {},
        "win32com": {},
        "win32com.server": {},
        "win32com.client": {
            "CDispatch": Dispatched,
            "CoClassBaseClass": Dispatched,
            "DispatchBaseClass": Dispatched,
            "Dispatch": lambda value, **named: value,
            "DispatchEx": lambda value, **named: value,
        },
        "win32com.server.dispatcher": {},
        "win32com.server.policy": {},
        "win32com.server.exception": {},
        "win32com.server.util": {"wrap": lambda value, **named: value, "unwrap": _not_wrapped},
    }
    made = {}
    for name, content in contents.items():
        made[name] = ModuleType(name)
        vars(made[name]).update(content)
        parent, _, child = name.rpartition(".")
        if parent:
            setattr(made[parent], child, made[name])
    return made


@contextlib.contextmanager
def _windows():
    """The modules and libraries that only Windows has, while xlwings is being imported."""
    modules = _modules()
    real = ctypes.PyDLL
    sys.modules.update(modules)
    ctypes.windll, ctypes.oledll, ctypes.PyDLL = Anything(), Anything(), lambda name, *given: Anything()
    try:
        yield
    finally:
        ctypes.PyDLL = real
        del ctypes.windll, ctypes.oledll
        for name in modules:
            sys.modules.pop(name, None)


def xlwings_of_windows() -> SimpleNamespace:
    """xlwings with its functions and server as on Windows; imported once, with its licensed part shut out."""
    if "xlwings" in sys.modules and not hasattr(sys.modules["xlwings"], "_uffuncs_stand_in"):
        raise RuntimeError("xlwings was imported before the stand-in for pywin32")
    from uffuncs.excel.server import without_licensed_part

    without_licensed_part()
    with _windows():
        import xlwings
        from xlwings import _xlwindows, com_server, udfs
    if not hasattr(xlwings, "_uffuncs_stand_in"):
        atexit.unregister(_xlwindows.cleanup)  # would look for processes of Excel
        xlwings.engines.add(xlwings.Engine(impl=_xlwindows.engine))
        xlwings.func, xlwings.arg, xlwings.ret = udfs.xlfunc, udfs.xlarg, udfs.xlret
        xlwings._uffuncs_stand_in = True
    return SimpleNamespace(xlwings=xlwings, udfs=udfs, server=com_server.XLPython())


class SheetRange:
    """A Range as Excel's own wrappers of xlwings hand it over: `rows` of values, as `Value` gives them."""

    def __init__(self, rows):
        self._rows = [list(row) for row in rows]
        self._oleobj_ = self
        self.Row = self.Column = 1
        self.Rows, self.Columns = (
            SimpleNamespace(Count=len(self._rows)),
            SimpleNamespace(Count=len(self._rows[0])),
        )
        self.Worksheet = SimpleNamespace(Parent=SimpleNamespace(Application=SimpleNamespace(Hwnd=1)))

    def GetTypeInfo(self):
        return self

    def GetTypeAttr(self):
        return SimpleNamespace(iid=RANGE_CLASS)

    @property
    def Value(self):
        if len(self._rows) == len(self._rows[0]) == 1:
            return self._rows[0][0]
        return tuple(map(tuple, self._rows))
