"""What is installed where, with which Python, and what is wrong: the add-in's part of `uffuncs doctor`."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from subprocess import TimeoutExpired

from ..finding import Finding
from ..version import __version__
from .extension import OLDEST_LIBREOFFICE, extension_files
from .inside.configuration import WORKER, Problem, configuration_path, problem_path, read_configuration
from .inside.values import error_name
from .installation import OLDEST, installed_version
from .names import add_in_functions
from .office import NAMES_UNCHANGED, Office, OfficeIsRunning, OfficeProblem, find_office, run

INSTALL = "run: uffuncs install calc"

#: Run by LibreOffice's own Python: does it find its bridge, and do the functions load in it?
TRIAL = """\
import sys
sys.path.insert(0, sys.argv[1])
try:
    import uno
except ImportError:
    sys.exit("no bridge")
from inside.configuration import read_configuration
from inside.running import InProcess, fits
found = read_configuration()
print(InProcess(found, {}).call("UF_VERSION", ())[0][0] if fits(found) else "other")
"""


def doctor(profile: Path | None = None) -> list[Finding]:
    """What is found of LibreOffice, the extension, the settings and the Python they name."""
    try:
        office = find_office()
        version = office.version()
    except OfficeProblem as problem:
        return [Finding(f"Calc: {problem}", good=not _is_expected())]
    found = [_of_version(office, version)]
    installed = _of_extension(office, profile, found)
    settings = _of_settings(found, installed)
    if settings is not None:
        _of_python(settings, found)
        _of_place(office, settings, found)
    if installed:
        _of_last_problem(found)
    return [Finding(f"Calc: {f.text}", f.good) for f in found]


def _is_expected() -> bool:
    """Whether somebody has installed the add-in; before that a missing LibreOffice is nothing wrong."""
    return os.path.exists(configuration_path())


def _of_version(office: Office, version: tuple[int, int]) -> Finding:
    shown = "LibreOffice %d.%d is in %s" % (*version, office.program)
    if version < OLDEST:
        return Finding(f"{shown}: too old, the add-in needs {OLDEST_LIBREOFFICE} or later", good=False)
    if version < NAMES_UNCHANGED:
        return Finding(
            f"{shown}: it binds the names of the functions in an .xlsx after loading, "
            "and saves them in a form of its own; "
            "25.2 and later keep them"
        )
    return Finding(shown)


def _of_extension(office: Office, profile: Path | None, found: list[Finding]) -> bool:
    try:
        version = installed_version(office, profile)
    except OfficeProblem as problem:
        told = f"whether the extension is installed cannot be told: {problem}"
        found.append(Finding(told, good=isinstance(problem, OfficeIsRunning) or not _is_expected()))
        return False
    if version is None:
        found.append(Finding(f"the extension is not installed; {INSTALL}"))
        return False
    if not version:
        found.append(Finding(f"the extension is there but not registered; {INSTALL}", good=False))
        return True
    if version != __version__ or _has_other_functions(profile or default_profile()):
        found.append(
            Finding(
                f"the extension (version {version}) was built from other functions "
                f"than this uffuncs {__version__} "
                f"has; {INSTALL}",
                good=False,
            )
        )
    else:
        found.append(Finding(f"the extension is installed, version {version}"))
    return True


def default_profile() -> Path:
    """Where LibreOffice keeps the user's settings by itself."""
    home = Path.home()
    if os.name == "nt":
        return Path(os.environ.get("APPDATA", home / "AppData" / "Roaming")) / "LibreOffice" / "4"
    if sys.platform == "darwin":
        return home / "Library" / "Application Support" / "LibreOffice" / "4"
    return Path(os.environ.get("XDG_CONFIG_HOME") or home / ".config") / "libreoffice" / "4"


def _has_other_functions(profile: Path) -> bool:
    copies = profile.glob("user/uno_packages/cache/uno_packages/*/uffuncs.oxt/functions.json")
    latest = max(copies, key=lambda path: path.stat().st_mtime, default=None)
    return latest is not None and latest.read_bytes() != extension_files()["functions.json"]


def _of_settings(found: list[Finding], installed: bool) -> dict | None:
    try:
        settings = read_configuration()
    except Problem as problem:
        if installed or os.path.exists(configuration_path()):
            found.append(Finding(str(problem), good=False))
        return None
    python = settings["python"]
    found.append(
        Finding(
            f"{configuration_path()} names the Python {python}, version {settings.get('version', 'unknown')}"
        )
    )
    missing = [p for p in (python, *settings["paths"]) if not os.path.exists(p)]
    if missing:
        found.append(Finding(f"{missing[0]} is gone, so every function shows #NAME?; {INSTALL}", good=False))
        return None
    if os.path.realpath(os.path.dirname(python)) != os.path.realpath(os.path.dirname(sys.executable)):
        found.append(Finding(f"this is another Python, {sys.executable}; to use it in Calc, {INSTALL}"))
    return settings


def _of_python(settings: dict, found: list[Finding]) -> None:
    """Start the worker as the add-in would, and ask it."""
    from .inside.worker_link import Worker

    signatures = {f.name: [name for name, _ in f.arguments] for f in add_in_functions()}
    worker = None
    try:
        worker = Worker(settings, signatures)
        answer = worker.call("UF_VERSION", ())[0][0]
    except Problem as problem:
        found.append(Finding(str(problem), good=False))
        return
    finally:
        if worker is not None:
            worker.stop()
    if isinstance(answer, float):
        found.append(Finding(f"a worker process starts, but answers {error_name(answer)}", good=False))
    elif worker.stale:
        found.append(
            Finding(
                f"that Python has uffuncs {answer} with other functions than this one "
                f"({len(worker.stale)} differ, "
                f"first {sorted(worker.stale)[0]}); {INSTALL}",
                good=False,
            )
        )
    else:
        found.append(Finding(f"that Python answers in a worker process: uffuncs {answer}"))


def _of_place(office: Office, settings: dict, found: list[Finding]) -> None:
    """Whether the functions run in LibreOffice's process or beside it."""
    seconds = f"a call is given up after {settings['seconds']:g} s (#NUM!)"
    if office.python is None:
        found.append(
            Finding(
                f"LibreOffice's own Python is not found; the functions run in a worker process; {seconds}"
            )
        )
        return
    inner = f"LibreOffice's Python {office.python_version()} ({office.python})"
    try:
        done = run([office.python, "-c", TRIAL, Path(__file__).parent], seconds=120)
    except (OSError, TimeoutExpired) as error:
        found.append(Finding(f"{inner} cannot be run ({error})", good=False))
        return
    if "no bridge" in done.stderr:
        found.append(
            Finding(
                f"{inner} lacks the module uno (on Debian: install python3-uno); the add-in cannot load",
                good=False,
            )
        )
    elif settings.get("mode") == WORKER:
        found.append(Finding(f"the functions run in a worker process, as the settings say; {seconds}"))
    elif done.returncode == 0 and done.stdout.strip() != "other":
        found.append(Finding(f"the functions run in process, in {inner}; {seconds}"))
    else:
        why = done.stderr.strip().splitlines()[-1][:200] if done.returncode else "it is of another kind"
        found.append(
            Finding(
                f"the functions run in a worker process, because {inner} cannot load them ({why}); {seconds}"
            )
        )


def _of_last_problem(found: list[Finding]) -> None:
    try:
        text = Path(problem_path()).read_text(encoding="utf-8").strip()
    except OSError:
        return
    found.append(Finding(f"last problem noted by the add-in: {text}"))
