"""Installing, examining and removing the add-in with the real program, in a throw-away profile."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

import pytest
from calc_session import Session

from uffuncs import calc
from uffuncs.calc import installation
from uffuncs.calc.inside import configuration
from uffuncs.calc.installation import own_settings
from uffuncs.calc.office import OVERRIDE, Office, clean_environment

NOBODY = 65534

posix = pytest.mark.skipif(os.name == "nt", reason="shell scripts play the program")


@pytest.fixture
def settings(tmp_path, monkeypatch):
    path = tmp_path / "settings" / "calc.json"
    monkeypatch.setenv(configuration.OVERRIDE, str(path))
    return path


@pytest.fixture
def profile(office, settings, monkeypatch):
    """A fresh profile. LibreOffice keeps no extensions for root: there its tool runs as another user."""
    folder = Path(tempfile.mkdtemp(prefix="ufcalc"))
    if hasattr(os, "geteuid") and os.geteuid() == 0:
        os.chown(folder, NOBODY, NOBODY)
        monkeypatch.setattr(
            installation,
            "run",
            lambda command, seconds, environment=None: run_as_nobody(folder, command, seconds),
        )
    yield folder
    shutil.rmtree(folder, ignore_errors=True)


def run_as_nobody(home: Path, command, seconds):
    for path in (home, *home.rglob("*")):  # a session of root may have written there
        os.chown(path, NOBODY, NOBODY, follow_symlinks=False)
    for part in command:
        if str(part).endswith(".oxt"):
            os.chmod(Path(part).parent, 0o755)
    return subprocess.run(
        [str(p) for p in command],
        user=NOBODY,
        group=NOBODY,
        extra_groups=[],
        capture_output=True,
        text=True,
        env=clean_environment() | {"HOME": str(home)},
        cwd=home,
        timeout=seconds,
    )


def texts(findings, good=None) -> str:
    return "\n".join(f.text for f in findings if good is None or f.good is good)


def test_install_examine_use_and_uninstall(office, profile, settings):
    assert "the extension is not installed; run: uffuncs install calc" in texts(
        calc.doctor(profile), good=True
    )

    done = calc.install(profile)
    assert "is installed in LibreOffice" in done[0] and str(settings) in done[1]
    assert json.loads(settings.read_text()) == own_settings()
    findings = calc.doctor(profile)
    assert texts(findings, good=False) == ""
    told = texts(findings)
    assert "the extension is installed, version" in told and sys.executable in told
    assert "that Python answers in a worker process" in told
    assert "the functions run in process" in told or "the functions run in a worker process, because" in told
    assert "given up after 30 s (#NUM!)" in told

    assert calc.install(profile)  # a second time does no harm
    with Session(office, profile, settings, bundled=False, profile=profile) as session:
        cell = session.open().Sheets.getByIndex(0).getCellByPosition(0, 0)
        cell.setFormula('=UF_FLUX_DARCY("35 psi";1.002;5E12)')
        assert cell.Value == pytest.approx(173.4, rel=1e-3)

    assert calc.uninstall(profile)[0] == "the extension is removed from LibreOffice"
    assert not settings.exists()
    assert calc.uninstall(profile) == ["the extension was not installed in LibreOffice"]
    assert "the extension is not installed" in texts(calc.doctor(profile))


def test_examined_while_it_runs(office, profile, settings):
    calc.install(profile)
    lock = profile / ".lock"
    lock.write_text("")
    try:
        told = texts(calc.doctor(profile), good=True)
        assert "cannot be told: LibreOffice is running; close all its windows" in told
        assert "that Python answers in a worker process" in told
        with pytest.raises(calc.OfficeProblem, match="LibreOffice is running"):
            calc.uninstall(profile)
        assert settings.exists()
    finally:
        lock.unlink()


@posix
def test_what_is_wrong_is_told(office, profile, settings, bare_python):
    calc.install(profile)
    found = own_settings()

    configuration.write_configuration(found | {"python": "/nowhere/bin/python"})
    assert "/nowhere/bin/python is gone, so every function shows #NAME?; run: uffuncs install calc" in texts(
        calc.doctor(profile), good=False
    )
    configuration.write_configuration(found | {"python": bare_python, "paths": [], "abi": "another"})
    assert "No module named 'uffuncs'" in texts(calc.doctor(profile), good=False)
    configuration.write_configuration(found | {"mode": configuration.WORKER})
    assert "in a worker process, as the settings say" in texts(calc.doctor(profile), good=True)
    configuration.write_configuration(found | {"abi": "cpython-38-64"})
    assert "cannot load them (it is of another kind)" in texts(calc.doctor(profile), good=True)
    settings.unlink()
    assert f"{settings} is missing; run: uffuncs install calc" in texts(calc.doctor(profile), good=False)
    settings.write_text("no json")
    assert "cannot be read" in texts(calc.doctor(profile), good=False)
    configuration.note_problem("the worker has gone")
    assert "last problem noted by the add-in: " in texts(
        calc.doctor(profile)
    ) and "the worker has gone" in texts(calc.doctor(profile))

    copy = next(profile.glob("user/uno_packages/cache/uno_packages/*/uffuncs.oxt/functions.json"))
    copy.write_text(
        copy.read_text(encoding="utf-8").replace("UF_FLUX_DARCY", "UF_FLUX_OLD"), encoding="utf-8"
    )
    assert "was built from other functions" in texts(calc.doctor(profile), good=False)


def test_no_libreoffice(settings, tmp_path, monkeypatch):
    monkeypatch.setenv(OVERRIDE, str(tmp_path))
    with pytest.raises(calc.OfficeProblem, match="LibreOffice is not found"):
        calc.install()
    assert texts(calc.doctor(), good=True).startswith("Calc: LibreOffice is not found")
    assert not settings.exists()
    configuration.write_configuration(own_settings())
    assert texts(calc.doctor(), good=False).startswith("Calc: LibreOffice is not found")
    assert calc.uninstall()[-1] == f"{settings} is removed" and not settings.exists()


@posix
def test_too_old(settings, monkeypatch, tmp_path):
    program = tmp_path / "soffice"
    program.write_text("#!/bin/sh\necho 'LibreOffice 6.4.7.2 40(Build:2)'\n")
    program.chmod(0o755)
    monkeypatch.setenv(OVERRIDE, str(tmp_path))
    with pytest.raises(calc.OfficeProblem, match="LibreOffice 6.4 is too old; the add-in needs 7.4 or later"):
        calc.install()
    assert "too old" in texts(calc.doctor(), good=False)


@posix
@pytest.mark.parametrize(
    "told, shown",
    [
        (
            "ERROR: Cannot run unopkg as root without --shared or --bundled option.",
            "no extensions for the user root",
        ),
        (
            "ERROR: unopkg cannot be started. The lock file indicates it is already running.",
            "LibreOffice is running; close all its windows",
        ),
        ("ERROR: something else", "unopkg add has failed: ERROR: something else"),
    ],
)
def test_refusals_of_its_tool(settings, monkeypatch, tmp_path, told, shown):
    for name, text in (("soffice", "LibreOffice 25.2.3.2"), ("unopkg", told)):
        path = tmp_path / name
        path.write_text(f'#!/bin/sh\necho "{text}"\n[ $(basename $0) = soffice ]\n')
        path.chmod(0o755)
    monkeypatch.setenv(OVERRIDE, str(tmp_path))
    with pytest.raises(calc.OfficeProblem, match=shown):
        calc.install()
    assert not settings.exists()


def test_an_older_version_is_started_once_before(settings, monkeypatch, tmp_path):
    calls = []

    def run(command, seconds, environment=None):
        calls.append([Path(command[0]).name, str(command[1])])
        return subprocess.CompletedProcess(command, 0, "is registered: yes\n", "")

    monkeypatch.setattr(installation, "find_office", lambda: Office(tmp_path))
    monkeypatch.setattr(Office, "version", lambda self: (7, 4))
    monkeypatch.setattr(Office, "unopkg", tmp_path / "unopkg")
    monkeypatch.setattr(installation, "run", run)
    assert "saves the names of the functions" in calc.install(tmp_path / "profile")[-1]
    assert [c[1] for c in calls] == ["--headless", "add", "list"]


def test_the_settings_path(monkeypatch, tmp_path):
    monkeypatch.delenv(configuration.OVERRIDE, raising=False)
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    monkeypatch.setattr(sys, "platform", "linux")
    assert Path(configuration.configuration_path()) == tmp_path / "uffuncs" / "calc.json"
