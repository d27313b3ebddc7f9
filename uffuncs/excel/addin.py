"""Building the add-in: our VBA and texts in xlwings' own template, and the settings file beside it.

The same inputs give the same bytes. Only building needs pyOpenVBA.
"""

from __future__ import annotations

import io
import os
import re
import sys
import tempfile
import zipfile
from importlib import metadata
from importlib.util import find_spec
from pathlib import Path
from xml.sax.saxutils import escape

from ..files import write_whole
from ..version import __version__
from .adapter import category
from .errors import ExcelDoorError
from .names import argument_names
from .vba_text import FUNCTIONS_MODULE, functions_module, this_workbook_module

ADDIN = "uffuncs.xlam"
#: The settings lie in a folder of their own: Excel opens every file of its start folder, but no folder.
SETTINGS = Path("uffuncs") / "uffuncs.conf"
SERVED_MODULE = "uffuncs.excel.marked_functions"
#: How VBA reads a file.
CODE_PAGE = "mbcs" if sys.platform == "win32" else "ascii"

_CORE = """<?xml version="1.0" encoding="UTF-8" standalone="yes"?>
<cp:coreProperties xmlns:cp="http://schemas.openxmlformats.org/package/2006/metadata/core-properties" \
xmlns:dc="http://purl.org/dc/elements/1.1/" xmlns:dcterms="http://purl.org/dc/terms/" \
xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance"><dc:title>uffuncs</dc:title>\
<dc:description>{}</dc:description><dc:creator>uffuncs</dc:creator></cp:coreProperties>"""
_STRINGS = """<?xml version="1.0" encoding="UTF-8" standalone="yes"?>
<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" count="0" uniqueCount="0"/>"""


def build(
    folder: str | os.PathLike, interpreter: str = "", libraries: dict[str, str] | None = None
) -> list[Path]:
    """Write the add-in and its settings into a folder, on any system.

    Parameters
    ----------
    folder : path
        Made if it is not there; earlier files of the same names are replaced.
    interpreter, libraries : str, dict
        Python and xlwings' libraries (by "library32", "library64") on the machine with Excel. Without
        them the settings name Python and the libraries as Windows finds them along its path.

    Raises
    ------
    ExcelDoorError
        xlwings or pyOpenVBA is missing, or this xlwings is one whose template is not known.
    """
    folder = Path(folder)
    version = xlwings_version()
    files = {
        folder / ADDIN: addin_bytes(),
        folder / SETTINGS: settings_bytes(
            interpreter or "python",
            libraries or {f"library{bits}": f"xlwings{bits}-{version}.dll" for bits in (32, 64)},
        ),
    }
    for path, content in files.items():
        write_whole(path, content)
    return list(files)


def xlwings_version() -> str:
    try:
        return metadata.version("xlwings")
    except metadata.PackageNotFoundError:
        raise ExcelDoorError(_missing("xlwings")) from None


def _missing(package: str) -> str:
    return f"building the Excel add-in needs the package {package}: pip install 'uffuncs[excel]'"


def addin_bytes() -> bytes:
    """The add-in: xlwings' template with its macros taken out, our modules and the wizard's texts put in."""
    from ..registry import functions

    try:
        from pyopenvba import ExcelFile
    except ImportError:
        raise ExcelDoorError(_missing("pyOpenVBA")) from None
    version = xlwings_version()
    template = Path(find_spec("xlwings").origin).with_name("quickstart_addin.xlam")
    records = list(functions().values())
    with tempfile.TemporaryDirectory() as scratch:
        written = Path(scratch) / ADDIN
        with ExcelFile(str(template)) as book:
            check_template(book.get_module("xlwings"), version)
            project = book.vba_project()
            # The template's macros run any Python that a formula names, and read settings out of workbooks.
            for name in ("xlwings", "Dictionary", "Module1"):
                project.delete_module(name)
            project.add_module(FUNCTIONS_MODULE, functions_module(records))
            book.set_module("ThisWorkbook", book.get_module("ThisWorkbook") + this_workbook_module(version))
            book.save(str(written))
        return _with_texts(
            written.read_bytes(), records, f"Functions of uffuncs {__version__}, for xlwings {version}"
        )


def check_template(source: str, version: str) -> None:
    """Our declarations of xlwings' library are the template's own.

    Raises
    ------
    ExcelDoorError
        Another signature or version.
    """
    for bits in (32, 64):
        declared = (
            f'XLPyDLLActivateAuto Lib "xlwings{bits}-{version}.dll" (ByRef Result As Variant, '
            'Optional ByVal Config As String = "", Optional ByVal mode As Long = 1) As Long'
        )
        if declared not in source:
            raise ExcelDoorError(
                f"xlwings {version} declares its library in another way; install xlwings 0.37"
            )
    if "xlwings.serve('$(CLSID)')" not in source:
        raise ExcelDoorError(f"xlwings {version} starts its server in another way; install xlwings 0.37")


def settings_bytes(interpreter: str, libraries: dict[str, str]) -> bytes:
    """The settings file, in the code page in which VBA reads it.

    Raises
    ------
    ExcelDoorError
        A path that the code page cannot spell: xlwings' library could not open it either.
    """
    lines = [
        "# Settings of the uffuncs add-in. A workbook's folder is never added to Python's search path.",
        f"interpreter={interpreter}",
        f"module={SERVED_MODULE}",
        *(f"{k}={v}" for k, v in sorted(libraries.items())),
        f"version={__version__}",
        f"xlwings={xlwings_version()}",
    ]
    try:
        return ("\r\n".join(lines) + "\r\n").encode(CODE_PAGE, "strict")
    except UnicodeEncodeError:
        raise ExcelDoorError(
            f"Excel's macros cannot spell the path {interpreter}; "
            "set Python up in a folder with plain letters"
        ) from None


# --- the package around the project -----------------------------------------------------------------------


def _with_texts(package: bytes, records: list, about: str) -> bytes:
    replaced = {
        "xl/worksheets/sheet1.xml": lambda old: _sheet(old, records),
        "xl/workbook.xml": _workbook,
        "xl/sharedStrings.xml": lambda old: _STRINGS,
        "docProps/core.xml": lambda old: _CORE.format(escape(about)),
    }
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(package)) as old, zipfile.ZipFile(out, "w") as new:
        for entry in old.infolist():
            content = old.read(entry)
            if entry.filename in replaced:
                content = replaced[entry.filename](content.decode()).encode()
            info = zipfile.ZipInfo(entry.filename, (1980, 1, 1, 0, 0, 0))
            info.compress_type = zipfile.ZIP_DEFLATED
            info.create_system = 0  # the same bytes from every system
            new.writestr(info, content)
    return out.getvalue()


def _workbook(old: str) -> str:
    """The template's workbook without its author's path and without the order to recalculate on opening."""
    new = re.sub(r"<mc:AlternateContent.*?</mc:AlternateContent>", "", old, flags=re.DOTALL)
    new = re.sub(r"<calcPr[^>]*/>", "", new)
    return re.sub(r'(<sheet name=")[^"]*"', r'\1functions"', new, count=1)


def _sheet(old: str, records: list) -> str:
    """The wizard's texts, one function a row; VBA's source could not hold all their characters."""
    most = max(len(r.arguments) for r in records) + 1
    rows = [["name", "category", "description", "arguments", *(f"argument {i + 1}" for i in range(most))]]
    for record in records:
        descriptions = [a.description for a in record.arguments]
        if len(argument_names(record)) > len(descriptions):
            descriptions.append("Further arguments, one after the other")
        rows.append(
            [record.worksheet_name, category(record), record.summary, len(descriptions), *descriptions]
        )
    data = "".join(
        f'<row r="{r}">{"".join(_cell(r, c, v) for c, v in enumerate(row))}</row>'
        for r, row in enumerate(rows, 1)
    )
    code_name = re.search(r"<sheetPr[^>]*/>", old)
    return (
        '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
        '<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
        f"{code_name[0] if code_name else ''}<sheetData>{data}</sheetData></worksheet>"
    )


def _cell(row: int, column: int, value: str | int) -> str:
    letters = ""
    n = column + 1
    while n:
        n, rest = divmod(n - 1, 26)
        letters = chr(65 + rest) + letters
    if isinstance(value, int):
        return f'<c r="{letters}{row}"><v>{value}</v></c>'
    return f'<c r="{letters}{row}" t="inlineStr"><is><t xml:space="preserve">{escape(value)}</t></is></c>'
