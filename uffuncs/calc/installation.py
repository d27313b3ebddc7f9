"""Building the add-in's extension, installing it for the user, and removing it."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from pathlib import Path

from ..files import write_whole
from ..version import __version__
from .extension import FILE_NAME, OLDEST_LIBREOFFICE, extension
from .inside.configuration import AUTOMATIC, TIME_LIMIT, configuration_path, problem_path, write_configuration
from .inside.running import abi
from .names import IDENTIFIER
from .office import NAMES_UNCHANGED, Office, OfficeIsRunning, OfficeProblem, find_office, profile_option, run

OLDEST = tuple(map(int, OLDEST_LIBREOFFICE.split(".")))
SECONDS = 180.0
ABSENT = "no such extension deployed"


def build(folder: Path | str) -> Path:
    """Write the extension alone into a folder, which is made if it is not there; the file's path."""
    target = Path(folder) / FILE_NAME
    write_whole(target, extension())
    return target


def install(profile: Path | None = None) -> list[str]:
    """Build the extension and install it for the user; what was done, one sentence each.

    Parameters
    ----------
    profile : path
        Folder of LibreOffice's settings, where it is not the user's own.

    Raises
    ------
    OfficeProblem
        There is no LibreOffice, it is too old, or it refuses the extension; nothing was changed.
    """
    office = find_office()
    version = office.version()
    shown = "%d.%d" % version
    if version < OLDEST:
        raise OfficeProblem(f"LibreOffice {shown} is too old; the add-in needs {OLDEST_LIBREOFFICE} or later")
    if version < NAMES_UNCHANGED:
        _start_once(office, profile)
    with tempfile.TemporaryDirectory(prefix="uffuncs-") as folder:
        _unopkg(office, profile, "add", "-f", "-s", build(folder))
    if "is registered: yes" not in _unopkg(office, profile, "list", IDENTIFIER):
        raise OfficeProblem(
            "LibreOffice has taken the extension but does not register it; its package for Python components "
            "may be missing (on Debian: python3-uno)"
        )
    Path(problem_path()).unlink(missing_ok=True)
    settings = write_configuration(own_settings())
    done = [
        f"uffuncs {__version__} is installed in LibreOffice {shown} ({office.program})",
        f"it runs in the Python {sys.executable}, as {settings} says",
        "start LibreOffice anew, and type =UF_VERSION() into a cell",
    ]
    if version < NAMES_UNCHANGED:
        done.append(
            f"LibreOffice {shown} saves the names of the functions in .xlsx in a form of its own; "
            "25.2 and later keep them"
        )
    return done


def uninstall(profile: Path | None = None) -> list[str]:
    """Remove the extension and the settings; what was done, one sentence each.

    Raises
    ------
    OfficeProblem
        LibreOffice does not remove it, for example because it is running.
    """
    done = []
    try:
        office = find_office()
    except OfficeProblem as problem:
        done.append(str(problem))
    else:
        done.append(_without_extension(office, profile))
    for path in map(Path, (configuration_path(), problem_path())):
        if path.is_file():
            path.unlink()
            done.append(f"{path} is removed")
    return done


def _without_extension(office: Office, profile: Path | None) -> str:
    try:
        _unopkg(office, profile, "remove", IDENTIFIER)
    except OfficeProblem as problem:
        if ABSENT not in str(problem):
            raise
        return "the extension was not installed in LibreOffice"
    return "the extension is removed from LibreOffice"


def installed_version(office: Office, profile: Path | None = None) -> str | None:
    """Version of the extension in LibreOffice; None where there is none, "" where it is not registered."""
    try:
        listed = _unopkg(office, profile, "list", IDENTIFIER)
    except OfficeProblem as problem:
        if ABSENT in str(problem):
            return None
        raise
    if "is registered: yes" not in listed:
        return ""
    return next(
        (
            line.partition(":")[2].strip()
            for line in listed.splitlines()
            if line.strip().startswith("Version:")
        ),
        "",
    )


def own_settings() -> dict:
    """The settings that lead the add-in to the Python that runs this."""
    return {
        "python": sys.executable,
        "version": "%d.%d" % sys.version_info[:2],
        "abi": abi(),
        "paths": own_paths(),
        "mode": AUTOMATIC,
        "seconds": TIME_LIMIT,
        "uffuncs": __version__,
    }


def own_paths() -> list[str]:
    """Folders in which this Python finds uffuncs and what it needs."""
    import site

    found = site.getsitepackages()
    if site.ENABLE_USER_SITE:
        found.append(site.getusersitepackages())
    package = str(Path(__file__).resolve().parents[2])
    if package not in map(os.path.realpath, found):
        found.insert(0, package)  # a checkout
    return [p for p in found if os.path.isdir(p)]


def _start_once(office: Office, profile: Path | None) -> None:
    """An older version registers an extension only in a profile that has been used."""
    if profile is None or not (profile / "user" / "registrymodifications.xcu").is_file():
        options = [profile_option(profile)] if profile else []
        run([office.soffice, "--headless", "--terminate_after_init", *options], SECONDS)


def _unopkg(office: Office, profile: Path | None, *arguments) -> str:
    """What LibreOffice's own tool for extensions says.

    Raises
    ------
    OfficeProblem
        It refuses, in plain words.
    """
    if office.unopkg is None:
        raise OfficeProblem(f"unopkg, LibreOffice's tool for extensions, is not in {office.program}")
    options = [profile_option(profile)] if profile else []
    try:
        done = run([office.unopkg, *arguments, *options], SECONDS)
    except subprocess.TimeoutExpired:
        raise OfficeProblem(
            f"unopkg has not ended within {SECONDS:.0f} s; close LibreOffice and try again"
        ) from None
    except OSError as error:
        raise OfficeProblem(f"{office.unopkg} cannot be run ({error.strerror or error})") from None
    if done.returncode == 0:
        return done.stdout
    told = " ".join((done.stderr + done.stdout).split())
    if "lock file" in told:
        raise OfficeIsRunning("LibreOffice is running; close all its windows and try again")
    if "as root" in told:
        raise OfficeProblem("LibreOffice keeps no extensions for the user root; run this as an ordinary user")
    raise OfficeProblem(f"unopkg {arguments[0]} has failed: {told[:400] or f'status {done.returncode}'}")
