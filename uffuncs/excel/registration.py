"""Putting the add-in where Excel finds it, taking it away again, and telling what is wrong.

The add-in lies in the user's start folder of Excel: what lies there is opened at every start and trusted by
default, and no entry in the registry is needed. Deleting the files undoes it all. The registry is read to
tell what is in the way, and cleared of add-ins of the same name that were ticked by hand: Excel cannot open
two of one name.
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
from importlib import metadata
from pathlib import Path

from ..finding import Finding
from ..version import __version__
from .addin import ADDIN, CODE_PAGE, SETTINGS, build, xlwings_version
from .errors import ExcelDoorError

_OFFICE = r"Software\Microsoft\Office"
_POLICIES = r"Software\Policies\Microsoft\Office"
_OPEN = re.compile(r"OPEN(\d*)")
_ELSEWHERE = (
    "the add-in needs Excel on Windows; `uffuncs build excel -o FOLDER` writes its files here, "
    "for inspection or for a colleague"
)
_TRIAL = (
    "from uffuncs.excel.server import without_licensed_part as w;w();import pythoncom,xlwings;"
    "from uffuncs.excel import marked_functions as m;print(m.UF_VERSION()[0][0])"
)


def install() -> list[str]:
    """Build the add-in into Excel's start folder; what was done, in plain words.

    Raises
    ------
    ExcelDoorError
        Not Windows, a package is missing, or Excel has the add-in open.
    """
    _only_windows()
    folder = start_folder()
    libraries = _libraries()
    try:
        written = build(folder, sys.executable, libraries)
    except PermissionError:
        raise ExcelDoorError(_locked(folder / ADDIN)) from None
    return [
        *(f"written: {path}" for path in written),
        *_forget_others(),
        "start Excel anew: the functions are there in every workbook",
    ]


def uninstall() -> list[str]:
    """Remove the add-in, its settings and what the registry says of it; what was done, in plain words.

    Raises
    ------
    ExcelDoorError
        Not Windows, or Excel has the add-in open.
    """
    _only_windows()
    done = []
    for path in (start_folder() / ADDIN, start_folder() / SETTINGS):
        try:
            path.unlink()
            done.append(f"removed: {path}")
        except FileNotFoundError:
            pass
        except PermissionError:
            raise ExcelDoorError(_locked(path)) from None
    try:
        (start_folder() / SETTINGS).parent.rmdir()
    except OSError:  # not there, or holds files of the user
        pass
    done += _forget_others()
    return done or ["the add-in was not installed"]


def doctor() -> list[Finding]:
    """What the add-in needs, looked at one by one; nothing is changed."""
    if sys.platform != "win32":
        return [Finding(f"Excel: {_ELSEWHERE}")]  # nothing is wrong with that
    return [*_files(), *_python(), *_registry()]


def _locked(path: Path) -> str:
    return f"{path} cannot be changed while Excel has it open; close Excel and try again"


def _only_windows() -> None:
    if sys.platform != "win32":
        raise ExcelDoorError(_ELSEWHERE)


def start_folder() -> Path:
    """The folder whose files Excel opens when it starts."""
    roaming = os.environ.get("APPDATA")
    if not roaming:
        raise ExcelDoorError(
            "Windows does not say where the user's application data are (APPDATA is not set)"
        )
    return Path(roaming) / "Microsoft" / "Excel" / "XLSTART"


def _libraries() -> dict[str, str]:
    """xlwings' libraries for Excel of 32 and 64 bits, which pip puts beside Python or elsewhere."""
    found = {}
    for bits in (32, 64):
        name = f"xlwings{bits}-{xlwings_version()}.dll"
        places = [Path(f.locate()) for f in metadata.files("xlwings") or () if f.name.casefold() == name]
        places += [
            Path(folder) / name for folder in (sys.prefix, sys.base_prefix, os.path.dirname(sys.executable))
        ]
        for path in places:
            if path.exists():
                found[f"library{bits}"] = str(path.resolve())
                break
    if not found:
        raise ExcelDoorError(
            f"xlwings is installed without its library {name}: pip install --force-reinstall xlwings"
        )
    return found


# --- what doctor looks at ---------------------------------------------------------------------------------


def _settings() -> dict[str, str]:
    try:
        lines = (start_folder() / SETTINGS).read_text(encoding=CODE_PAGE).splitlines()
    except FileNotFoundError:
        return {}
    return dict(line.split("=", 1) for line in lines if "=" in line and not line.startswith("#"))


def _files() -> list[Finding]:
    addin, settings = start_folder() / ADDIN, _settings()
    if not addin.exists():
        return [Finding(f"not installed: there is no {addin}; run `uffuncs install excel`", good=False)]
    if not settings:
        return [Finding(f"there is no {start_folder() / SETTINGS}; run `uffuncs install excel`", good=False)]
    findings = [Finding(f"installed: {addin}")]
    for what, built, now in (
        ("uffuncs", settings.get("version"), __version__),
        ("xlwings", settings.get("xlwings"), xlwings_version()),
    ):
        if built != now:
            findings.append(
                Finding(
                    f"the add-in was built by {what} {built}, but {now} is installed; "
                    "run `uffuncs install excel`", good=False,
                )
            )
    for name in ["interpreter", *(n for n in settings if n.startswith("library"))]:
        path = settings.get(name, "")
        there = os.path.exists(path)
        findings.append(
            Finding(
                f"{name}: {path}"
                if there
                else f"{name}: there is no {path or 'path'}; run `uffuncs install excel`", good=there,
            )
        )
    return findings


def _python() -> list[Finding]:
    interpreter = _settings().get("interpreter", "")
    if not os.path.exists(interpreter):
        return []
    try:
        tried = subprocess.run(
            [interpreter, "-P", "-c", _TRIAL],
            check=False,
            capture_output=True,
            text=True,
            timeout=120,
            stdin=subprocess.DEVNULL,
        )
    except (OSError, subprocess.TimeoutExpired) as error:
        return [Finding(f"Python cannot be started: {error}", good=False)]
    if tried.returncode == 0:
        return [Finding(f"Python answers: uffuncs {tried.stdout.strip()}")]
    reason = (tried.stderr.strip().splitlines() or [f"it ended with {tried.returncode}"])[-1]
    return [Finding(f"Python cannot load the functions: {reason}", good=False)]


def _registry() -> list[Finding]:
    findings = []
    versions = _office_versions()
    if not versions:
        findings.append(Finding("no Excel has been started here by this user", good=False))
    for version in versions:
        findings += [
            Finding(
                f"Excel {version} also opens {path}, another add-in of this name; "
                "run `uffuncs install excel` to remove that entry", good=False,
            )
            for path in _others(version)
        ]
        for root in (_OFFICE, _POLICIES):
            security = rf"{root}\{version}\Excel\Security"
            if _value(security, "DisableAllAddins") == 1:
                findings.append(
                    Finding(f"Excel {version} opens no add-ins at all: Trust Center, Add-ins", good=False)
                )
            if _value(rf"{security}\Trusted Locations", "AllLocationsDisabled") == 1 and _warnings(
                version
            ) in (3, 4):
                findings.append(
                    Finding(
                        f"Excel {version} runs no unsigned macros and trusts no folder: Trust Center, "
                        "Trusted Locations", good=False,
                    )
                )
        if any(ADDIN in data for data in _disabled(version)):
            findings.append(
                Finding(
                    f"Excel {version} has disabled the add-in after a crash: Options, Add-ins, Disabled", good=False,
                )
            )
    return findings or [Finding(f"nothing in the registry is in the way (Excel {', '.join(versions)})")]


def _warnings(version: str) -> object:
    """Macro settings: 1 all macros, 2 ask (the default), 3 signed ones only, 4 none."""
    policy = _value(rf"{_POLICIES}\{version}\Excel\Security", "VBAWarnings")
    return policy if policy is not None else _value(rf"{_OFFICE}\{version}\Excel\Security", "VBAWarnings")


def _disabled(version: str) -> list[str]:
    values = _values(rf"{_OFFICE}\{version}\Excel\Resiliency\DisabledItems")
    return [data.decode("utf-16-le", "ignore").casefold() for _, data, _ in values if isinstance(data, bytes)]


# --- the registry -----------------------------------------------------------------------------------------


def _office_versions() -> list[str]:
    """Versions of Office whose Excel this user has settings for, such as 16.0."""
    import winreg

    versions = []
    try:
        with winreg.OpenKey(winreg.HKEY_CURRENT_USER, _OFFICE) as key:
            n = 0
            while True:
                versions.append(winreg.EnumKey(key, n))
                n += 1
    except OSError:  # no Office, or the end of the list
        pass
    return [v for v in versions if re.fullmatch(r"\d+\.\d", v) and _exists(rf"{_OFFICE}\{v}\Excel")]


def _exists(path: str) -> bool:
    import winreg

    try:
        winreg.OpenKey(winreg.HKEY_CURRENT_USER, path).Close()
    except OSError:
        return False
    return True


def _values(path: str) -> list[tuple[str, object, int]]:
    """Name, data and type of all values of a key; none if it is not there."""
    import winreg

    values = []
    try:
        with winreg.OpenKey(winreg.HKEY_CURRENT_USER, path) as key:
            while True:
                values.append(tuple(winreg.EnumValue(key, len(values))))
    except OSError:
        pass
    return values


def _value(path: str, name: str) -> object:
    return next((data for n, data, _ in _values(path) if n.casefold() == name.casefold()), None)


def _names_addin(text: object) -> bool:
    """Whether a value such as `/R "C:\\…\\uffuncs.xlam"` names an add-in of ours."""
    return (
        isinstance(text, str)
        and re.split(r"[\\/]", text.strip().rstrip('"'))[-1].lstrip('"').casefold() == ADDIN
    )


def _opened(version: str) -> list[tuple[str, object, int]]:
    """The values OPEN, OPEN1, OPEN2 …, in the order in which Excel opens them."""
    found = [(v, _OPEN.fullmatch(v[0])) for v in _values(rf"{_OFFICE}\{version}\Excel\Options")]
    return [v for v, match in sorted(((v, m) for v, m in found if m), key=lambda item: int(item[1][1] or 0))]


def _others(version: str) -> list[str]:
    return [str(data) for _, data, _ in _opened(version) if _names_addin(data)]


def _forget_others() -> list[str]:
    """Take add-ins of our name out of the lists of opened and of known add-ins; the rest keep their order."""
    import winreg

    done = []
    for version in _office_versions():
        values = _opened(version)
        kept = [v for v in values if not _names_addin(v[1])]
        if len(kept) < len(values):
            with winreg.OpenKey(
                winreg.HKEY_CURRENT_USER, rf"{_OFFICE}\{version}\Excel\Options", 0, winreg.KEY_ALL_ACCESS
            ) as key:
                # Written before the surplus is deleted: nothing of others is lost on the way.
                for n, (_, data, kind) in enumerate(kept):
                    winreg.SetValueEx(key, f"OPEN{n or ''}", 0, kind, data)
                names = {f"OPEN{n or ''}" for n in range(len(kept))}
                for name in {v[0] for v in values} - names:
                    winreg.DeleteValue(key, name)
            done += [f"Excel {version} no longer opens {v[1]}" for v in values if _names_addin(v[1])]
        manager = rf"{_OFFICE}\{version}\Excel\Add-in Manager"
        for name in [n for n, _, _ in _values(manager) if _names_addin(n)]:
            with winreg.OpenKey(winreg.HKEY_CURRENT_USER, manager, 0, winreg.KEY_ALL_ACCESS) as key:
                winreg.DeleteValue(key, name)
            done.append(f"Excel {version} no longer lists {name}")
    return done
