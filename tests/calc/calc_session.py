"""A running LibreOffice in a throw-away profile, driven through its own Python bridge over a named pipe."""

from __future__ import annotations

import subprocess
import sys
import time
import uuid
from pathlib import Path

from uffuncs.calc.inside.configuration import OVERRIDE
from uffuncs.calc.office import START_AGAIN, Office, bundle_option, clean_environment, profile_option

XLSX, ODS = "Calc MS Excel 2007 XML", "calc8"
DEBIAN_BRIDGE = "/usr/lib/python3/dist-packages"
ARRAY_SEPARATORS = str.maketrans(",", ";")


def uno_bridge():
    """The module `uno`; ImportError where this Python has none."""
    try:
        import uno
    except ImportError:
        if DEBIAN_BRIDGE not in sys.path:
            sys.path.append(DEBIAN_BRIDGE)
        import uno
    return uno


class Session:
    """One LibreOffice; `with` ends it."""

    def __init__(
        self,
        office: Office,
        folder: Path,
        configuration: Path | None = None,
        bundled=True,
        compatibility_names=True,
        hidden=True,
        environment=None,
        profile: Path | None = None,
    ):
        self.uno = uno_bridge()
        pipe = "uffuncs" + uuid.uuid4().hex[:12]
        profile = profile or folder / "profile"
        program = office.program / "soffice.bin"
        command = [
            str(program if program.is_file() else office.soffice),
            profile_option(profile),
            "--norestore",
            "--nologo",
            "--nodefault",
            "--nofirststartwizard",
            f"--accept=pipe,name={pipe};urp;",
        ]
        if bundled:
            command.append(bundle_option(folder / "bundled", compatibility_names))
        if hidden:
            command += ["--headless", "--invisible"]
        self.environment = clean_environment() | {"PYTHONPATH": str(office.program)} | (environment or {})
        if configuration is not None:
            self.environment[OVERRIDE] = str(configuration)
        self.command, self.pipe, self.process = command, pipe, None
        self.context = self._connect(time.monotonic() + 120)
        self.desktop = self.create("com.sun.star.frame.Desktop")

    def _connect(self, deadline):
        from com.sun.star.connection import NoConnectException

        local = self.uno.getComponentContext()
        resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
        self._start()
        while True:
            try:
                return resolver.resolve(f"uno:pipe,name={self.pipe};urp;StarOffice.ComponentContext")
            except NoConnectException:
                if self.process.poll() == START_AGAIN:
                    self._start()
                elif self.process.poll() is not None or time.monotonic() > deadline:
                    self.close()
                    raise RuntimeError(f"LibreOffice ended with status {self.process.poll()}") from None
                time.sleep(0.05)

    def _start(self):
        self.process = subprocess.Popen(
            self.command,
            env=self.environment,
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )

    def create(self, service: str):
        return self.context.ServiceManager.createInstanceWithContext(service, self.context)

    def _properties(self, **values):
        from com.sun.star.beans import PropertyValue

        return tuple(PropertyValue(name, 0, value, 0) for name, value in values.items())

    def open(self, path: Path | None = None, **options):
        url = "private:factory/scalc" if path is None else path.resolve().as_uri()
        options = {"Hidden": True} | options
        return self.desktop.loadComponentFromURL(url, "_blank", 0, self._properties(**options))

    def store(self, document, path: Path, kind: str = XLSX) -> Path:
        document.storeToURL(path.resolve().as_uri(), self._properties(FilterName=kind))
        return path

    def children(self) -> list[int]:
        """Process numbers of the program's children (Linux)."""
        task = Path(f"/proc/{self.process.pid}/task")
        return [int(n) for t in task.iterdir() for n in (t / "children").read_text().split()]

    def close(self):
        try:
            self.desktop.terminate()
        except Exception:  # the bridge is gone as soon as the program obeys
            pass
        try:
            self.process.wait(20)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait()

    def __enter__(self):
        return self

    def __exit__(self, *_):
        self.close()


def is_alive(process: int) -> bool:
    """Whether a process runs (a zombie does not)."""
    try:
        return Path(f"/proc/{process}/stat").read_text().rpartition(")")[2].split()[0] not in ("Z", "X")
    except OSError:
        return False


def settings(folder: Path, **more) -> Path:
    """A file of settings that names this Python; for a session of its own."""
    import json

    from uffuncs.calc.installation import own_settings

    path = folder / "calc.json"
    path.write_text(json.dumps(own_settings() | more), encoding="utf-8")
    return path
