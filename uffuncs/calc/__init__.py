"""LibreOffice Calc: the functions as an add-in, its installation, and recalculation by LibreOffice.

>>> from uffuncs import calc
>>> calc.build("folder")        # the extension alone        # doctest: +SKIP
>>> calc.install()              # for the user               # doctest: +SKIP
"""

from .examination import Finding, doctor
from .installation import build, install, uninstall
from .office import OfficeProblem

__all__ = ["Finding", "OfficeProblem", "build", "doctor", "install", "uninstall"]
