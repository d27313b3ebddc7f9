"""Excel on Windows: the functions as an add-in that is built on the user's machine.

>>> from uffuncs import excel
>>> excel.build("folder")       # the add-in and its settings, on any system    # doctest: +SKIP
>>> excel.install()             # into Excel's start folder                     # doctest: +SKIP
"""

from .addin import build
from .errors import ExcelDoorError
from .registration import Finding, doctor, install, uninstall

__all__ = ["ExcelDoorError", "Finding", "build", "doctor", "install", "uninstall"]
