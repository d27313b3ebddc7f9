"""The command line as a person or a build job uses it, in processes of its own."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import openpyxl
import pytest

from uffuncs import __version__

ROOT = Path(__file__).parents[1]


def uffuncs(*arguments, cwd=ROOT):
    return subprocess.run([sys.executable, "-m", "uffuncs", *map(str, arguments)], cwd=cwd, capture_output=True, text=True,
                          encoding="utf-8", env=None if cwd == ROOT else _environment())


def _environment():
    import os

    return {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONIOENCODING": "utf-8"}


def workbook(path, **cells):
    book = openpyxl.Workbook()
    for address, value in cells.items():
        book.active[address] = value
    book.save(path)
    return path


def test_version():
    done = uffuncs("--version")
    assert (done.returncode, done.stdout) == (0, f"uffuncs {__version__}\n")


def test_help_loads_nothing_heavy():
    code = ("import sys, uffuncs.command_line as c\n"
            "sys.argv = ['uffuncs', '--help']\n"
            "try: c.main()\nexcept SystemExit: pass\n"
            "print('heavy:', *sorted({'numpy', 'scipy', 'pint', 'openpyxl', 'formualizer', 'xlwings'} & set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=ROOT)
    assert "recalc" in done.stdout and done.stdout.endswith("heavy:\n")


def test_functions_lists_all_topics_and_one():
    from uffuncs.registry import TOPICS, functions

    done = uffuncs("functions")
    assert done.returncode == 0 and f"{len(functions())} functions" in done.stdout
    for name in functions():
        assert name in done.stdout
    for topic in TOPICS:
        assert topic in done.stdout
    assert "UF_FLUX_DARCY" not in uffuncs("functions", "water").stdout


@pytest.mark.parametrize("name", ["UF_FLUX_DARCY", "uf_flux_darcy", "flux_darcy"])
def test_functions_shows_one_whole(name):
    done = uffuncs("functions", name)
    for words in ("J = (Δp_tm − σ Δπ)", "membrane_resistance", "1e+18", "reflection_coefficient=1", "L/(m²·h)", "Source:", "Example: =UF_FLUX_DARCY("):
        assert words in done.stdout


def test_functions_unknown():
    done = uffuncs("functions", "flux_darcee")
    assert done.returncode == 2 and "UF_FLUX_DARCY" in done.stderr and done.stdout == "" and done.stderr.count("\n") == 1


def test_recalc_clean(tmp_path):
    source = workbook(tmp_path / "in.xlsx", A1="35 psi", B1="=UF_FLUX_DARCY(A1,1,5e12)", C1="=B1*2")
    done = uffuncs("recalc", source, "-o", tmp_path / "out.xlsx")
    assert done.returncode == 0, done.stderr
    sheet = openpyxl.load_workbook(tmp_path / "out.xlsx", data_only=True).active
    assert sheet["B1"].value == pytest.approx(35 * 0.0689475729 * 72, rel=1e-8)
    assert sheet["C1"].value == pytest.approx(2 * sheet["B1"].value)
    assert openpyxl.load_workbook(source, data_only=True).active["B1"].value is None, "the input is left alone"


def test_recalc_reports_error_cells_with_their_reason(tmp_path):
    source = workbook(tmp_path / "in.xlsx", A1=-1, B1="=UF_FLUX_DARCY(A1,1,5e12)", B2="=1/0", B3="=NOSUCHFUNCTION(1)")
    done = uffuncs("recalc", source, "-o", tmp_path / "out.xlsx")
    assert done.returncode == 1
    assert "B1" in done.stdout and "transmembrane_pressure must be 0 to 200 bar; got -1" in done.stdout
    assert "NOSUCHFUNCTION" in done.stdout and "#DIV/0!" in done.stdout


def test_recalc_several_into_a_folder(tmp_path):
    one, two = (workbook(tmp_path / f"{n}.xlsx", A1="=UF_WATER_DENSITY(20)") for n in ("one", "two"))
    bad = tmp_path / "bad.xlsx"
    bad.write_text("not a workbook")
    done = uffuncs("recalc", one, bad, two, "-o", tmp_path / "results")
    assert done.returncode == 2 and "bad.xlsx" in done.stderr and done.stderr.count("\n") == 1 and "Traceback" not in done.stderr
    assert sorted(p.name for p in (tmp_path / "results").iterdir()) == ["one.xlsx", "two.xlsx"]


def test_recalc_needs_a_target(tmp_path):
    source = workbook(tmp_path / "in.xlsx", A1="=1+1")
    before = source.read_bytes()
    assert uffuncs("recalc", source).returncode == 2
    assert uffuncs("recalc", source, "-o", source).returncode == 2
    assert source.read_bytes() == before
    assert uffuncs("recalc", source, "--in-place").returncode == 0
    assert openpyxl.load_workbook(source, data_only=True).active["A1"].value == 2


def test_recalc_missing_file_and_unknown_engine(tmp_path):
    done = uffuncs("recalc", tmp_path / "none.xlsx", "-o", tmp_path / "out.xlsx")
    assert done.returncode == 2 and "none.xlsx" in done.stderr and done.stderr.count("\n") == 1
    source = workbook(tmp_path / "in.xlsx", A1="=1+1")
    done = uffuncs("recalc", source, "-o", tmp_path / "out.xlsx", "--engine", "abacus")
    assert done.returncode == 2 and "abacus" in done.stderr and not (tmp_path / "out.xlsx").exists()


def test_demo(tmp_path):
    done = uffuncs("demo", "here", cwd=tmp_path)
    assert done.returncode == 0, done.stderr + done.stdout
    assert "Membrane area needed" in done.stdout and str(Path("here") / "plant_design.xlsx") in done.stdout
    again = uffuncs("demo", "here", cwd=tmp_path)
    assert again.returncode == 2 and "--overwrite" in again.stderr
    assert uffuncs("demo", "here", "--overwrite", cwd=tmp_path).returncode == 0


def test_doctor_tells_every_door_in_plain_words():
    done = uffuncs("doctor")
    assert done.returncode in (0, 1) and f"uffuncs {__version__} on Python" in done.stdout
    assert "Excel" in done.stdout and "Calc" in done.stdout and "Traceback" not in done.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="there it would install")
def test_install_excel_elsewhere_is_one_line():
    done = uffuncs("install", "excel")
    assert done.returncode == 2 and done.stderr.count("\n") == 1 and "Windows" in done.stderr


def test_build_calc(tmp_path):
    done = uffuncs("build", "calc", "-o", tmp_path / "new")
    assert done.returncode == 0 and Path(done.stdout.strip()).suffix == ".oxt" and Path(done.stdout.strip()).exists()


def test_build_excel(tmp_path):
    pytest.importorskip("xlwings")
    pytest.importorskip("pyopenvba")
    done = uffuncs("build", "excel", "-o", tmp_path / "new")
    assert done.returncode == 0 and [Path(line).exists() for line in done.stdout.split("\n")[:-1]] == [True, True]


def test_an_unknown_door_is_refused():
    done = uffuncs("install", "abacus")
    assert done.returncode == 2 and "calc" in done.stderr and "Traceback" not in done.stderr
