"""The extension file for LibreOffice (.oxt), built from the registry; two builds are the same bytes."""

from __future__ import annotations

import io
import json
import zipfile
from importlib.resources import files
from xml.sax.saxutils import escape

from ..version import __version__
from .names import CATEGORY, IDENTIFIER, INTERFACE, JOB, SERVICE, AddInFunction, add_in_functions
from .type_library import ANY, ANY_BLOCK, ANY_SEQUENCE, type_library

FILE_NAME = "uffuncs.oxt"
OLDEST_LIBREOFFICE = "7.4"
COMPONENT = "uffuncs_component.py"
#: Modules that run inside LibreOffice's Python, beside the component.
INSIDE = ("__init__", "binding", "configuration", "frames", "running", "values", "watchdog", "worker_link")
DATE = (1980, 1, 1, 0, 0, 0)

MANIFEST = """<?xml version="1.0" encoding="UTF-8"?>
<manifest:manifest xmlns:manifest="http://openoffice.org/2001/manifest">
  <manifest:file-entry manifest:full-path="types.rdb"
      manifest:media-type="application/vnd.sun.star.uno-typelibrary;type=RDB"/>
  <manifest:file-entry manifest:full-path="uffuncs.components"
      manifest:media-type="application/vnd.sun.star.uno-components"/>
  <manifest:file-entry manifest:full-path="Jobs.xcu"
      manifest:media-type="application/vnd.sun.star.configuration-data"/>
</manifest:manifest>
"""

DESCRIPTION = """<?xml version="1.0" encoding="UTF-8"?>
<description xmlns="http://openoffice.org/extensions/description/2006"
             xmlns:d="http://openoffice.org/extensions/description/2006"
             xmlns:l="http://libreoffice.org/extensions/description/2011">
  <identifier value="{identifier}"/>
  <version value="{version}"/>
  <platform value="all"/>
  <display-name><name lang="en">uffuncs: ultrafiltration functions for Calc</name></display-name>
  <dependencies>
    <l:LibreOffice-minimal-version value="{oldest}" d:name="LibreOffice {oldest}"/>
  </dependencies>
</description>
"""

COMPONENTS = """<?xml version="1.0" encoding="UTF-8"?>
<components xmlns="http://openoffice.org/2010/uno-components">
  <component loader="com.sun.star.loader.Python" uri="{component}">
    <implementation name="{service}.implementation">
      <service name="{service}"/>
      <service name="com.sun.star.sheet.AddIn"/>
    </implementation>
    <implementation name="{job}.implementation">
      <service name="{job}"/>
      <service name="com.sun.star.task.Job"/>
    </implementation>
  </component>
</components>
"""

JOBS = """<?xml version="1.0" encoding="UTF-8"?>
<oor:component-data oor:name="Jobs" oor:package="org.openoffice.Office"
    xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema">
  <node oor:name="Jobs">
    <node oor:name="{job}" oor:op="replace">
      <prop oor:name="Service"><value>{job}</value></prop>
      <prop oor:name="Context"><value>com.sun.star.sheet.SpreadsheetDocument</value></prop>
    </node>
  </node>
  <node oor:name="Events">
    <node oor:name="OnLoadFinished" oor:op="fuse">
      <node oor:name="JobList">
        <node oor:name="{job}" oor:op="replace"/>
      </node>
    </node>
  </node>
</oor:component-data>
"""


def extension_files(compatibility_names: bool = True) -> dict[str, bytes]:
    """The files of the extension: path inside the package to content.

    Without compatibility names the functions of an .xlsx are bound only after loading, as on LibreOffice 7.4.
    """
    functions = add_in_functions()
    texts = {
        "MANIFEST": MANIFEST,
        "description.xml": DESCRIPTION.format(
            identifier=IDENTIFIER, version=escape(__version__), oldest=OLDEST_LIBREOFFICE
        ),
        "uffuncs.components": COMPONENTS.format(component=COMPONENT, service=SERVICE, job=JOB),
        "Jobs.xcu": JOBS.format(job=JOB),
        "functions.json": _functions_json(functions, compatibility_names),
    }
    texts["META-INF/manifest.xml"] = texts.pop("MANIFEST")
    found = {path: text.encode("utf-8") for path, text in texts.items()}
    found["types.rdb"] = type_library(INTERFACE, SERVICE, [_method(f) for f in functions])
    inside = files(__package__) / "inside"
    found[COMPONENT] = (inside / "component.py").read_bytes()
    for module in INSIDE:
        found[f"pythonpath/uffuncs_inside/{module}.py"] = (inside / f"{module}.py").read_bytes()
    return {path: _with_plain_line_ends(path, data) for path, data in sorted(found.items())}


def extension() -> bytes:
    """The .oxt package; stored without compression, so that no library's version shows in its bytes."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_STORED) as package:
        for path, data in extension_files().items():
            entry = zipfile.ZipInfo(path, DATE)
            entry.create_system = 3
            entry.external_attr = 0o644 << 16
            package.writestr(entry, data)
    return buffer.getvalue()


def _method(function: AddInFunction):
    """Every argument is an `any` that may be left out; every result a block, for several values."""
    kinds = [ANY] * len(function.parameters)
    if function.variadic:
        kinds[-1] = ANY_SEQUENCE
    return function.method, ANY_BLOCK, list(zip(function.parameters, kinds, strict=True))


def _functions_json(functions: list[AddInFunction], compatibility_names: bool) -> str:
    entries = [
        {
            "name": f.name,
            "method": f.method,
            "description": f.description,
            "arguments": f.arguments,
            "variadic": f.variadic,
        }
        for f in functions
    ]
    content = {
        "version": __version__,
        "service": SERVICE,
        "job": JOB,
        "category": CATEGORY,
        "compatibility_names": compatibility_names,
        "functions": entries,
    }
    return json.dumps(content, ensure_ascii=False, indent=0) + "\n"


def _with_plain_line_ends(path: str, data: bytes) -> bytes:
    """A checkout on Windows must not change the package."""
    return data if path.endswith(".rdb") else data.replace(b"\r\n", b"\n")
