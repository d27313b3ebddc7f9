"""Installing and removing, on a Windows that is a folder and a small stand-in for the registry."""

from __future__ import annotations

import os
import sys
from pathlib import Path

import pytest

from tests.excel import needed

needed("xlwings", "pyopenvba")

from tests.excel.registry import REG_BINARY, REG_DWORD, REG_SZ, Registry
from uffuncs import excel
from uffuncs.excel import addin, registration
from uffuncs.version import __version__

OFFICE = r"Software\Microsoft\Office"
OPTIONS = rf"{OFFICE}\16.0\Excel\Options"
SECURITY = rf"{OFFICE}\16.0\Excel\Security"
EXCEL_16 = {OPTIONS: {}, rf"{OFFICE}\Common": {}, rf"{OFFICE}\16.0\Word": {}}


class Windows:
    def __init__(self, folder: Path, monkeypatch):
        self.monkeypatch = monkeypatch
        self.start = folder / "Roaming" / "Microsoft" / "Excel" / "XLSTART"
        self.addin, self.settings = self.start / "uffuncs.xlam", self.start / "uffuncs" / "uffuncs.conf"
        self.python = folder / "python"
        self.python.mkdir()
        self.library = self.python / f"xlwings64-{addin.xlwings_version()}.dll"
        self.library.write_bytes(b"")
        monkeypatch.setattr(sys, "platform", "win32")
        monkeypatch.setattr(sys, "prefix", str(self.python))
        monkeypatch.setenv("APPDATA", str(folder / "Roaming"))
        self.registry(EXCEL_16)

    def registry(self, keys) -> Registry:
        registry = Registry(keys)
        self.monkeypatch.setitem(sys.modules, "winreg", registry)
        return registry

    def interpreter(self, script: str):
        """A Python of a few lines, in the settings."""
        path = self.python / "python.sh"
        path.write_text(f"#!/bin/sh\n{script}\n")
        path.chmod(0o755)
        text = self.settings.read_text().replace(sys.executable, str(path))
        self.settings.write_text(text)

    def problems(self) -> list[str]:
        return [f.text for f in excel.doctor() if not f.good]


@pytest.fixture
def windows(tmp_path, monkeypatch):
    if sys.platform == "win32":
        pytest.skip("a stand-in for Windows")
    return Windows(tmp_path, monkeypatch)


@pytest.mark.skipif(sys.platform == "win32", reason="about other systems")
def test_other_systems_say_so_in_one_line():
    for action in (excel.install, excel.uninstall):
        with pytest.raises(excel.ExcelDoorError, match="needs Excel on Windows") as error:
            action()
        assert "\n" not in str(error.value)
    (finding,) = excel.doctor()
    assert finding.good and "needs Excel on Windows" in str(finding)


def test_install(windows):
    done = excel.install()
    assert done[:2] == [f"written: {windows.addin}", f"written: {windows.settings}"]
    settings = dict(line.split("=", 1) for line in windows.settings.read_text().splitlines() if "=" in line)
    assert settings["interpreter"] == sys.executable and settings["library64"] == str(windows.library)
    assert "library32" not in settings
    # Excel opens every file of its start folder: there is nothing but the add-in.
    assert [p.name for p in windows.start.iterdir() if p.is_file()] == ["uffuncs.xlam"]
    again = windows.addin.read_bytes()
    excel.install()
    assert windows.addin.read_bytes() == again


def test_uninstall_undoes_it(windows):
    excel.install()
    (windows.start / "another.xlam").write_text("of the user")
    assert excel.uninstall() == [f"removed: {windows.addin}", f"removed: {windows.settings}"]
    assert [p.name for p in windows.start.iterdir()] == ["another.xlam"]
    assert excel.uninstall() == ["the add-in was not installed"]


def test_a_folder_with_files_of_the_user_stays(windows):
    excel.install()
    (windows.settings.parent / "notes.txt").write_text("mine")
    excel.uninstall()
    assert [p.name for p in windows.settings.parent.iterdir()] == ["notes.txt"]


def test_excel_is_running(windows, monkeypatch):
    excel.install()
    before = {p: p.read_bytes() for p in windows.start.rglob("*") if p.is_file()}

    def locked(*given, **named):
        raise PermissionError(13, "in use")

    monkeypatch.setattr(os, "replace", locked)
    monkeypatch.setattr(Path, "unlink", locked)
    for action in (excel.install, excel.uninstall):
        with pytest.raises(excel.ExcelDoorError, match="close Excel and try again") as error:
            action()
        assert "\n" not in str(error.value)
    assert {p: p.read_bytes() for p in windows.start.rglob("*") if p.is_file()} == before


def test_xlwings_without_its_library(windows):
    windows.library.unlink()
    with pytest.raises(excel.ExcelDoorError, match="without its library"):
        excel.install()
    assert not windows.addin.exists()


def test_no_application_data(windows, monkeypatch):
    monkeypatch.delenv("APPDATA")
    with pytest.raises(excel.ExcelDoorError, match="APPDATA"):
        excel.install()


# --- the registry -----------------------------------------------------------------------------------------

TICKED = {
    "OPEN": ('/R "C:\\Tools\\solver.xlam"', REG_SZ),
    "OPEN1": ('"C:\\Old\\UFFUNCS.xlam"', REG_SZ),
    "OPEN2": ('/A "Some.AddIn"', REG_SZ),
    "OPEN10": ("last.xlam", REG_SZ),
    "OPEN3": ("uffuncs.xlam", REG_SZ),
    "OPEN4": ('"C:\\Tools\\my_uffuncs.xlam"', REG_SZ),
    "Font": ("Calibri,11", REG_SZ),
}


def test_an_add_in_of_our_name_ticked_by_hand_is_forgotten(windows):
    manager = rf"{OFFICE}\16.0\Excel\Add-in Manager"
    registry = windows.registry(
        {OPTIONS: TICKED, manager: {"C:\\Old\\uffuncs.xlam": ("", REG_SZ), "C:\\x.xlam": ("", REG_SZ)}}
    )
    assert len([p for p in windows.problems() if "another add-in of this name" in p]) == 2
    assert registry.writes == []  # doctor changes nothing
    done = excel.install()
    assert (
        sum("no longer opens" in line for line in done) == 2
        and sum("no longer lists" in line for line in done) == 1
    )
    left = {name: data for name, (data, _) in registry.keys[OPTIONS].items()}
    assert left == {
        "OPEN": '/R "C:\\Tools\\solver.xlam"',
        "OPEN1": '/A "Some.AddIn"',
        "OPEN2": '"C:\\Tools\\my_uffuncs.xlam"',
        "OPEN3": "last.xlam",
        "Font": "Calibri,11",
    }
    assert list(registry.keys[manager]) == ["C:\\x.xlam"]
    # What is kept was written before anything was deleted.
    kinds = [kind for kind, name in registry.writes if name.startswith("OPEN")]
    assert kinds == sorted(kinds, reverse=True)


def test_entries_of_others_are_not_touched(windows):
    registry = windows.registry({OPTIONS: {"OPEN": ("a.xlam", REG_SZ), "OPEN7": ("b.xlam", REG_SZ)}})
    excel.install()
    excel.uninstall()
    assert registry.writes == []


def test_every_version_of_office_is_looked_at(windows):
    windows.registry(
        {
            OPTIONS: {},
            rf"{OFFICE}\15.0\Excel\Options": {"OPEN": ("uffuncs.xlam", REG_SZ)},
            rf"{OFFICE}\14.0\Word": {},
        }
    )
    assert registration._office_versions() == ["16.0", "15.0"]
    assert [p for p in windows.problems() if "Excel 15.0 also opens" in p]


# --- doctor -----------------------------------------------------------------------------------------------


def test_doctor_before_and_after(windows):
    assert any("not installed" in p for p in windows.problems())
    excel.install()
    windows.interpreter(f"echo {__version__}")
    findings = excel.doctor()
    assert all(f.good for f in findings), findings
    assert [
        f"Python answers: uffuncs {__version__}",
        "nothing in the registry is in the way (Excel 16.0)",
    ] == [str(f) for f in findings[-2:]]


def test_doctor_tells_why_python_does_not_answer(windows):
    excel.install()
    windows.interpreter("echo Traceback >&2; echo 'ImportError: no module' >&2; exit 1")
    assert windows.problems() == ["Python cannot load the functions: ImportError: no module"]


def test_doctor_runs_the_real_python(windows, monkeypatch):
    """The trial itself is sound: here it fails for want of pywin32 and nothing else."""
    monkeypatch.setenv("PYTHONPATH", str(Path(excel.__file__).parents[2]))
    excel.install()
    (problem,) = windows.problems()
    assert "pythoncom" in problem and "ModuleNotFoundError" in problem


def test_doctor_misses_files(windows):
    excel.install()
    windows.library.unlink()
    windows.settings.write_text(windows.settings.read_text().replace(sys.executable, "/no/python"))
    problems = windows.problems()
    assert any("interpreter: there is no /no/python" in p for p in problems)
    assert any("library64: there is no" in p for p in problems)
    windows.settings.unlink()
    assert any("uffuncs.conf" in p for p in windows.problems())


def test_doctor_sees_another_version(windows):
    excel.install()
    windows.settings.write_text(
        windows.settings.read_text().replace(f"version={__version__}", "version=0.0.1")
    )
    assert any("built by uffuncs 0.0.1" in p for p in windows.problems())


@pytest.mark.parametrize(
    "keys, words",
    [
        ({}, "no Excel has been started"),
        ({SECURITY: {"DisableAllAddins": (1, REG_DWORD)}}, "no add-ins at all"),
        (
            {
                rf"{SECURITY}\Trusted Locations": {"AllLocationsDisabled": (1, REG_DWORD)},
                SECURITY: {"VBAWarnings": (4, REG_DWORD)},
            },
            "trusts no folder",
        ),
        (
            {
                r"Software\Policies\Microsoft\Office\16.0\Excel\Security\Trusted Locations": {
                    "alllocationsdisabled": (1, REG_DWORD)
                },
                r"Software\Policies\Microsoft\Office\16.0\Excel\Security": {"vbawarnings": (3, REG_DWORD)},
                OPTIONS: {},
            },
            "trusts no folder",
        ),
        (
            {
                rf"{OFFICE}\16.0\Excel\Resiliency\DisabledItems": {
                    "A1": ("…C:\\XLSTART\\Uffuncs.xlam…".encode("utf-16-le"), REG_BINARY)
                }
            },
            "after a crash",
        ),
    ],
)
def test_doctor_reads_the_registry(windows, keys, words):
    excel.install()
    windows.interpreter(f"echo {__version__}")
    windows.registry(keys)
    problems = windows.problems()
    assert len(problems) == 1 and words in problems[0]


@pytest.mark.parametrize(
    "keys",
    [
        {
            rf"{SECURITY}\Trusted Locations": {"AllLocationsDisabled": (1, REG_DWORD)}
        },  # macros are asked about
        {SECURITY: {"VBAWarnings": (4, REG_DWORD)}},  # the start folder is trusted all the same
        {
            rf"{OFFICE}\16.0\Excel\Resiliency\DisabledItems": {
                "A1": (b"\x01\x02\x03", REG_BINARY),
                "A2": ("text", REG_SZ),
            }
        },
    ],
)
def test_doctor_is_not_alarmed(windows, keys):
    windows.registry(keys)
    assert [f for f in registration._registry() if not f.good] == []
