"""Tests of the Excel door on any system: xlwings' own server code and the add-in's VBA, run without Excel."""

from __future__ import annotations

import os
import sys
from importlib.util import find_spec


def needed(*packages: str, stand_in: bool = False) -> None:
    """Skip a test module, by name, where a package is missing; a failure with UFFUNCS_NEED_EXCEL=1."""
    import pytest

    reasons = [f"{package} is not installed" for package in packages if find_spec(package) is None]
    if stand_in and sys.platform == "win32":
        reasons.append("the stand-in for pywin32 is for other systems")
    if reasons and os.environ.get("UFFUNCS_NEED_EXCEL") == "1":
        raise RuntimeError(f"{', '.join(reasons)}, but UFFUNCS_NEED_EXCEL asks for these tests")
    if reasons:
        pytest.skip(", ".join(reasons), allow_module_level=True)
