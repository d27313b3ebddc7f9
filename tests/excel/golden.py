"""The VBA as a text to compare with: the fixed parts, and the wrappers of three functions.

Written anew by `python -m tests.excel.golden`; a change shows in the diff and is looked at before it is kept.
"""

from __future__ import annotations

from pathlib import Path

from uffuncs.excel.vba_text import functions_module, this_workbook_module
from uffuncs.registry import functions
from uffuncs.version import __version__

FOLDER = Path(__file__).with_name("golden")
#: Optional arguments; further cells; no arguments.
SHOWN = ("UF_QUANTITY", "UF_SOLVE_FOR", "UF_VERSION")


def texts() -> dict[str, str]:
    """File name to text, the versions left out."""
    modules = {
        "functions.bas": functions_module(functions()[name] for name in SHOWN),
        "this_workbook.cls": this_workbook_module("X.Y.Z"),
    }
    return {name: text.replace(f"uffuncs {__version__}", "uffuncs") for name, text in modules.items()}


if __name__ == "__main__":
    FOLDER.mkdir(exist_ok=True)
    for file, text in texts().items():
        (FOLDER / file).write_bytes(text.encode("ascii"))
        print(FOLDER / file)
