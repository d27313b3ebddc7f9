"""The process that the add-in starts: xlwings' server, with the functions loaded.

xlwings' licensed part (`xlwings.pro`) is shut out before xlwings itself would try it.
"""

from __future__ import annotations

import sys


def without_licensed_part() -> None:
    """From here on `import xlwings.pro` fails, which xlwings takes for its absence."""
    sys.modules["xlwings.pro"] = None


def serve(clsid: str) -> None:
    """Serve until Excel ends; Excel gives the class identifier."""
    without_licensed_part()
    import xlwings

    from . import marked_functions  # noqa: F401 - loaded now, so that the first cell does not wait

    xlwings.serve(clsid)
