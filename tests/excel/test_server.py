"""The Python server of the add-in: started once, again when it is gone, without xlwings' licensed part."""

from __future__ import annotations

import ast
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.excel import needed

needed("xlwings", "pyopenvba", stand_in=True)

import uffuncs.excel
from tests.excel.pywin32 import SheetRange, xlwings_of_windows
from uffuncs.cell import call
from uffuncs.errors import ErrorValue
from uffuncs.version import __version__

FOLDER = Path(uffuncs.excel.__file__).parent


def test_started_once_from_the_settings_alone(fresh):
    assert fresh.raw("UF_VERSION") == __version__ == fresh.raw("UF_VERSION")
    assert fresh.library.commands == [
        (
            'cmd.exe /K ""C:\\Python\\python.exe" -P -c '
            '"from uffuncs.excel.server import serve;serve(\'$(CLSID)\')""'
        )
    ]
    assert fresh.library.loaded == ["C:\\Python\\64.dll"]


def test_one_retry_when_the_server_is_gone(fresh):
    fresh.raw("UF_VERSION")
    fresh.library.server.failures = 1
    assert fresh.raw("UF_VERSION") == __version__
    assert len(fresh.library.commands) == 2 and len(fresh.library.stopped) == 1


def test_a_server_that_fails_twice_is_a_true_error(fresh):
    fresh.library.server.failures = 2
    assert fresh.raw("UF_VERSION") == ErrorValue("#VALUE!")
    assert fresh.library.server.calls == 2
    assert fresh.raw("UF_VERSION") == __version__


def test_a_short_text_when_python_cannot_be_started(fresh):
    fresh.library.broken = True
    shown = fresh.raw("UF_VERSION")
    assert (
        shown.startswith("uffuncs: Python cannot be started. the process ended")
        and "doctor" in shown
        and len(shown) <= 255
    )
    # A sheet of many cells does not try, and wait, once for each.
    assert [fresh.raw("UF_VERSION") for _ in range(5)] == [shown] * 5
    assert len(fresh.library.commands) == 1


def test_python_is_tried_again_after_a_while(fresh):
    import datetime

    fresh.library.broken = True
    now = datetime.datetime(2024, 1, 1, 12, 0, 0)
    fresh.app.freeze_clock(now)
    fresh.raw("UF_VERSION")
    fresh.library.broken = False
    fresh.app.freeze_clock(now + datetime.timedelta(seconds=29))
    assert "cannot be started" in fresh.raw("UF_VERSION")
    fresh.app.freeze_clock(now + datetime.timedelta(seconds=31))
    assert fresh.raw("UF_VERSION") == __version__


def test_missing_library_or_settings_say_so(fresh):
    fresh.library.absent = True
    assert "Cannot load C:\\Python\\64.dll" in fresh.raw("UF_VERSION")


def test_missing_settings_say_so(fresh):
    fresh.library.settings.unlink()
    assert "File not found" in fresh.raw("UF_VERSION")


# --- xlwings' licensed part -------------------------------------------------------------------------------


def test_no_source_of_ours_names_the_licensed_part():
    for path in FOLDER.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                assert not any(a.name.startswith("xlwings.pro") for a in node.names), path
            if isinstance(node, ast.ImportFrom):
                assert not (node.module or "").startswith("xlwings.pro"), path


def test_the_server_loads_nothing_of_the_licensed_part(tmp_path):
    """As `serve` does it, up to the point where xlwings would wait for Excel."""
    code = (
        "import sys, uffuncs.excel.server as s\n"
        "waited = []\n"
        "s.without_licensed_part()\n"
        "import xlwings\n"
        "xlwings.serve = waited.append\n"
        "s.serve('{1}')\n"
        "assert waited == ['{1}']\n"
        "from uffuncs.excel import marked_functions as m\n"
        "assert m.UF_VERSION() and not xlwings.__pro__\n"
        "print([n for n in sys.modules if n.startswith('xlwings.pro') and sys.modules[n] is not None])\n"
    )
    done = subprocess.run(
        [sys.executable, "-P", "-c", code],
        check=False,
        capture_output=True,
        text=True,
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(FOLDER.parents[1])},
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == "[]"


def test_the_core_loads_neither_xlwings_nor_the_door(tmp_path):
    code = (
        "import sys, uffuncs.cell\nuffuncs.cell.call('UF_VERSION', [])\n"
        "doors = ('xlwings', 'pyopenvba', 'uffuncs.excel')\n"
        "print([n for n in sys.modules if n.startswith(doors)])\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        check=False,
        capture_output=True,
        text=True,
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(FOLDER.parents[1])},
    )
    assert done.stdout.strip() == "[]", done.stderr


# --- xlwings' own wrappers, by "Import Functions" ---------------------------------------------------------


@pytest.fixture(scope="module")
def stock():
    return xlwings_of_windows()


def called(stock, name, *given):
    return stock.server.CallUDF("uffuncs.excel.functions", name, given)


def test_stock_wrappers_can_be_written_for_every_function(stock, tmp_path):
    """What "Import Functions" does: xlwings writes its VBA from our functions."""
    from types import SimpleNamespace

    import uffuncs.excel.functions as module
    from tests.examples import functions

    with open(tmp_path / "udfs.bas", "w+") as file:
        stock.udfs.generate_vba_wrapper(
            "uffuncs.excel.functions", module, file, SimpleNamespace(Name="plant.xlsm")
        )
        file.seek(0)
        text = file.read()
    for name in functions():
        assert f"Function {name}(" in text
    assert "Function UF_WHY(function_, ParamArray cells())" in text
    assert "Function UF_QUANTITY(value, unit, Optional uncertainty)" in text


def test_stock_route_gives_values_and_texts_of_errors(stock):
    assert called(stock, "UF_FLUX_DARCY", 2.0, 1.0, 5e12) == call("UF_FLUX_DARCY", [2.0, 1.0, 5e12])
    assert called(stock, "UF_FLUX_DARCY", -2.0, 1.0, 5e12) == "#NUM!"
    missing = -2147352572
    assert called(stock, "UF_FLUX_DARCY", 2.0, 1.0, 5e12, missing) == call("UF_FLUX_DARCY", [2.0, 1.0, 5e12])
    assert called(stock, "UF_WHY", "UF_FLUX_DARCY", 2.0, missing, 5e12) == call(
        "UF_WHY", ["UF_FLUX_DARCY", 2.0, None, 5e12]
    )


def test_stock_route_takes_ranges_of_the_sheet(stock):
    column = SheetRange([[2.0], [None], [-2146826281], [-1.0]])  # the third is #DIV/0!
    expected = call("UF_FLUX_DARCY", [[[2.0], [None], [ErrorValue("#DIV/0!")], [-1.0]], 1.0, 5e12])
    assert called(stock, "UF_FLUX_DARCY", column, SheetRange([[1.0]]), 5e12) == [
        [v[0].code if isinstance(v[0], ErrorValue) else v[0]] for v in expected
    ]


def test_texts_for_the_wizard_come_with_the_stock_route(stock):
    import uffuncs.excel.functions as module
    from uffuncs.registry import find

    info = module.UF_FLUX_DARCY.__xlfunc__
    record = find("UF_FLUX_DARCY")
    assert info["category"] == "Ultrafiltration: permeation" and info["ret"]["doc"] == record.summary
    assert [a["doc"] for a in info["args"]] == [a.description for a in record.arguments]
