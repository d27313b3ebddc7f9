"""An installed LibreOffice: where it is, its version, its Python, and throw-away profiles for it."""

from __future__ import annotations

import os
import re
import shutil
import signal
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path

from .extension import extension_files

#: Names the program folder of a LibreOffice that is not found by itself.
OVERRIDE = "UFFUNCS_LIBREOFFICE"
#: From here on the names of the functions are read from and written to .xlsx unchanged.
NAMES_UNCHANGED = (25, 2)
VERSION = re.compile(r"LibreOffice\D*(\d+)\.(\d+)(?:\.(\d+))?")
#: Exit status of a fresh profile that asks to be started again.
START_AGAIN = 81
#: What would lead another Python or program astray.
FOREIGN = ("PYTHONPATH", "PYTHONHOME", "LD_LIBRARY_PATH")


class OfficeProblem(Exception):
    """What is wrong with LibreOffice, in plain words."""


class OfficeIsRunning(OfficeProblem):
    """Extensions cannot be looked at while the program runs."""


@dataclass(frozen=True)
class Office:
    """An installation of LibreOffice."""

    program: Path  # the folder of its executables

    @property
    def soffice(self) -> Path:
        return self._executable("soffice.com") or self._executable("soffice") or self.program / "soffice.bin"

    @property
    def unopkg(self) -> Path | None:
        return self._executable("unopkg.com") or self._executable("unopkg")

    @property
    def python(self) -> Path | None:
        """The Python that runs its components: its own, or that of the system."""
        for folder in (self.program, self.program.parent / "Resources"):
            for name in ("python.exe", "python"):
                if (folder / name).is_file():
                    return folder / name
        system = Path("/usr/bin/python3")
        return system if system.is_file() and os.name != "nt" else None

    def _executable(self, name: str) -> Path | None:
        path = self.program / name
        return path if path.is_file() else None

    def version(self) -> tuple[int, int]:
        """Version such as (25, 2).

        Raises
        ------
        OfficeProblem
            The program does not tell it.
        """
        try:
            told = run([self.soffice, "--version"], seconds=60).stdout
        except (OSError, subprocess.TimeoutExpired) as error:
            raise OfficeProblem(f"{self.soffice} cannot be run ({error})") from None
        found = VERSION.search(told)
        if not found:
            raise OfficeProblem(f"{self.soffice} does not tell its version")
        return int(found[1]), int(found[2])

    def python_version(self) -> str:
        """Version of the Python that runs its components, such as "3.11"; "" where it cannot be told."""
        if self.python is None:
            return ""
        code = "import sys; print('%d.%d' % sys.version_info[:2])"
        try:
            return run([self.python, "-c", code], seconds=60).stdout.strip()
        except (OSError, subprocess.TimeoutExpired):
            return ""


def find_office() -> Office:
    """The LibreOffice named by an environment variable, on the path, or in its usual place.

    Raises
    ------
    OfficeProblem
        None is found.
    """
    for folder in _places():
        for name in ("soffice.bin", "soffice.exe", "soffice"):
            if (folder / name).is_file():
                return Office(folder)
    raise OfficeProblem(
        f"LibreOffice is not found; install it, or name the folder of its programs in {OVERRIDE}"
    )


def _places():
    given = os.environ.get(OVERRIDE)
    if given:
        yield Path(given)
        return
    for name in ("soffice", "libreoffice"):
        if found := shutil.which(name):
            yield Path(os.path.realpath(found)).parent
    if os.name == "nt":
        for variable in ("ProgramFiles", "ProgramFiles(x86)"):
            if base := os.environ.get(variable):
                yield Path(base) / "LibreOffice" / "program"
    elif sys.platform == "darwin":
        yield Path("/Applications/LibreOffice.app/Contents/MacOS")
    else:
        yield Path("/usr/lib/libreoffice/program")
        yield from sorted(Path("/opt").glob("libreoffice*/program"), reverse=True)


def run(command, seconds: float, environment=None) -> subprocess.CompletedProcess:
    """Run a program of LibreOffice and give what it says; at a time-out it ends with all it has started."""
    command = [str(part) for part in command]
    process = subprocess.Popen(
        command,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        errors="replace",
        env=clean_environment() if environment is None else environment,
        start_new_session=True,
    )
    try:
        told, complained = process.communicate(timeout=seconds)
    except BaseException:
        _end(process)
        raise
    return subprocess.CompletedProcess(command, process.returncode, told, complained)


def _end(process: subprocess.Popen) -> None:
    """End a process and its children: soffice is only the starter of the program."""
    if os.name == "nt":
        subprocess.run(["taskkill", "/T", "/F", "/PID", str(process.pid)], capture_output=True, check=False)
    else:
        try:
            os.killpg(process.pid, signal.SIGKILL)
        except ProcessLookupError:
            pass
    process.kill()
    process.communicate()


def clean_environment() -> dict[str, str]:
    return {name: value for name, value in os.environ.items() if name not in FOREIGN}


def profile_option(folder: Path) -> str:
    """The option that makes LibreOffice keep its settings in a folder."""
    return f"-env:UserInstallation={folder.resolve().as_uri()}"


def bundle_option(folder: Path, compatibility_names: bool = True) -> str:
    """Unpack the extension into a folder; the option that makes LibreOffice use it uninstalled."""
    for path, data in extension_files(compatibility_names).items():
        target = folder / "uffuncs" / path
        target.parent.mkdir(parents=True, exist_ok=True)
        target.write_bytes(data)
    return f"-env:BUNDLED_EXTENSIONS={folder.resolve().as_uri()}"
