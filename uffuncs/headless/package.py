"""Open, check, copy and write the zip package of a workbook.

A workbook from elsewhere is untrusted: sizes are checked in the zip directory and again while inflating.
"""

import io
import os
import re
import zipfile
import zlib
from pathlib import Path
from xml.parsers import expat

from ..files import write_into_place

MAX_FILE_BYTES = 512 * 1024**2  # of the file as stored
MAX_PART_BYTES = 384 * 1024**2  # of one inflated part; a full sheet of a million rows stays below
MAX_PACKAGE_BYTES = 1024 * 1024**2  # of all inflated parts together
MAX_PARTS = 20_000
CHUNK_BYTES = 1024**2

OLE_MAGIC = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
ENCRYPTED_STREAM = "EncryptedPackage".encode("utf-16-le")
KNOWN_COMPRESSION = {zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED}
READ_ERRORS = (
    zipfile.BadZipFile,
    zlib.error,
    EOFError,
    NotImplementedError,
    RuntimeError,
    OSError,
    ValueError,
)


class UnreadableWorkbook(Exception):
    """The workbook, or the output asked for, is refused; the message is one line and nothing was written."""


class Package:
    """A checked zip package held in memory as stored; parts are inflated on request, within the limits."""

    def __init__(self, path):
        self.path = Path(path)
        self.label = self.path.name
        self.stored = _read_file(self.path)
        self._archive = _open_archive(self.stored, self.label)
        self.members = self._archive.infolist()
        self._by_name = _index(self.members, self.label)
        self._cache = {}
        self.transcoded = set()  # parts that were not in UTF-8

    def __contains__(self, name):
        return name in self._by_name

    def find(self, name):
        """The member's own spelling of a part name (part names are compared without case), or None."""
        if name in self._by_name:
            return name
        wanted = name.casefold()
        return next((known for known in self._by_name if known.casefold() == wanted), None)

    def read(self, name):
        """The inflated bytes of a part, never more than its announced size or the limit."""
        info = self._by_name.get(name)
        if info is None:
            raise UnreadableWorkbook(f"{self.label}: the part {name} is missing from the package")
        pieces, size = [], 0
        try:
            with self._archive.open(info) as stream:
                while piece := stream.read(CHUNK_BYTES):
                    size += len(piece)
                    if size > min(info.file_size, MAX_PART_BYTES):
                        raise UnreadableWorkbook(
                            f"{self.label}: the part {name} inflates to more than the "
                            f"{info.file_size:,} bytes "
                            "its directory entry announces"
                        )
                    pieces.append(piece)
        except READ_ERRORS as error:
            raise UnreadableWorkbook(
                f"{self.label}: the part {name} is damaged ({_one_line(error)})"
            ) from None
        return b"".join(pieces)

    def read_xml(self, name):
        """The bytes of an XML part in UTF-8, checked to be well-formed and free of a document type."""
        if name not in self._cache:
            stored = self.read(name)
            data = as_utf8(stored, self.label, name)
            if data is not stored:
                self.transcoded.add(name)
            parse_xml(data, self.label, name)
            self._cache[name] = data
        return self._cache[name]

    def check_document_types(self):
        """Refuse a document type definition in any XML part, also in those that are only copied."""
        for info in self.members:
            if info.filename.lower().endswith((".xml", ".rels", ".vml")) and info.filename not in self._cache:
                data = self.read(info.filename)
                if b"\0" in data[:200]:
                    data = data.replace(b"\0", b"")
                if b"<!DOCTYPE" in data:
                    raise _document_type(self.label, info.filename)

    def with_parts(self, parts, compression=None):
        """Bytes of the package with some parts replaced: order, names, dates and compression are kept."""

        buffer = io.BytesIO()
        self.write(buffer, parts, compression)
        return buffer.getvalue()

    def write(self, stream, parts, compression=None):
        """Write the package with some parts replaced to an open binary stream."""
        with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as target:
            target.comment = self._archive.comment
            for info in self.members:
                entry = _copy_of(info)
                if compression is not None:
                    entry.compress_type = compression
                if info.is_dir():
                    target.writestr(entry, b"")
                    continue
                data = parts.get(info.filename)
                target.writestr(entry, self.read(info.filename) if data is None else data)


def _read_file(path):
    try:
        size = path.stat().st_size
        if not path.is_file():
            raise UnreadableWorkbook(f"{path}: is not a file")
        if size > MAX_FILE_BYTES:
            raise UnreadableWorkbook(
                f"{path.name}: {size:,} bytes, more than the limit of {MAX_FILE_BYTES:,} for a workbook file"
            )
        return path.read_bytes()
    except FileNotFoundError:
        raise UnreadableWorkbook(f"{path.name}: no such file") from None
    except (OSError, ValueError) as error:
        raise UnreadableWorkbook(f"{path.name}: cannot be read ({_one_line(error)})") from None


def _open_archive(data, label):

    if not data:
        raise UnreadableWorkbook(f"{label}: the file is empty")
    if data.startswith(OLE_MAGIC):
        if ENCRYPTED_STREAM in data:
            raise UnreadableWorkbook(
                f"{label}: is encrypted with a password; open it in a spreadsheet program, "
                "remove the password, save and try again"
            )
        raise UnreadableWorkbook(
            f"{label}: is in the old binary format (.xls); open it in a spreadsheet program "
            "and save it as .xlsx"
        )
    if not data.startswith(b"PK"):
        raise UnreadableWorkbook(
            f"{label}: is not an .xlsx workbook (not a zip package, whatever its name says)"
        )
    try:
        return zipfile.ZipFile(io.BytesIO(data))
    except READ_ERRORS as error:
        raise UnreadableWorkbook(
            f"{label}: is damaged or cut off: its zip directory cannot be read ({_one_line(error)})"
        ) from None


def _index(members, label):
    if len(members) > MAX_PARTS:
        raise UnreadableWorkbook(f"{label}: {len(members):,} parts, more than the limit of {MAX_PARTS:,}")
    names, folded, total = {}, set(), 0
    for info in members:
        name = info.filename
        if (
            info.orig_filename != name
            or "\\" in name
            or name.startswith("/")
            or ":" in name
            or ".." in name.split("/")
        ):
            raise UnreadableWorkbook(f"{label}: the package has an unsafe part name {name[:60]!r}")
        if name.casefold() in folded:
            raise UnreadableWorkbook(f"{label}: the package has the part {name} twice")
        if info.flag_bits & 0x1:
            raise UnreadableWorkbook(
                f"{label}: the part {name} is encrypted; save the workbook without a password"
            )
        if info.compress_type not in KNOWN_COMPRESSION:
            raise UnreadableWorkbook(f"{label}: the part {name} is compressed in a way workbooks do not use")
        if info.file_size > MAX_PART_BYTES:
            raise UnreadableWorkbook(
                f"{label}: the part {name} inflates to {info.file_size:,} bytes, more than the limit of "
                f"{MAX_PART_BYTES:,}"
            )
        total += info.file_size
        folded.add(name.casefold())
        names[name] = info
    if total > MAX_PACKAGE_BYTES:
        raise UnreadableWorkbook(
            f"{label}: the parts inflate to {total:,} bytes together, "
            f"more than the limit of {MAX_PACKAGE_BYTES:,}"
        )
    return names


def _copy_of(info):
    """A fresh directory entry: one object must not be shared between two archives."""
    entry = zipfile.ZipInfo(info.filename, info.date_time)
    entry.compress_type = info.compress_type
    entry.comment = info.comment
    entry.create_system = info.create_system
    entry.external_attr = info.external_attr
    entry.internal_attr = info.internal_attr
    return entry


def _one_line(error):
    return " ".join(str(error).split())[:120] or type(error).__name__


def _document_type(label, part):
    return UnreadableWorkbook(
        f"{label}: the part {part} has a document type definition (DTD), which a workbook never needs"
    )


_DECLARED_ENCODING = re.compile(rb"""^<\?xml[^>]*?\sencoding\s*=\s*["']([A-Za-z0-9._-]+)["']""")


def as_utf8(data, label, part):
    """The part in UTF-8 with a matching declaration; UTF-8 input is returned as it is."""
    if data.startswith(b"\xef\xbb\xbf"):
        return data
    encoding = None
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        encoding = "utf-16"
    elif data[:4] in (b"<\0?\0", b"<\0w\0"):
        encoding = "utf-16-le"
    elif data[:4] in (b"\0<\0?", b"\0<\0w"):
        encoding = "utf-16-be"
    else:
        declared = _DECLARED_ENCODING.match(data)
        if declared and declared[1].lower() not in (b"utf-8", b"utf8", b"us-ascii", b"ascii"):
            encoding = declared[1].decode("ascii")
    if encoding is None:
        return data
    try:
        text = data.decode(encoding)
    except (UnicodeDecodeError, LookupError):
        raise UnreadableWorkbook(f"{label}: the part {part} is not valid {encoding[:20]} text") from None
    text = re.sub(r"""(^<\?xml[^>]*?\sencoding\s*=\s*["'])[A-Za-z0-9._-]+""", r"\g<1>UTF-8", text, count=1)
    return text.encode("utf-8")


def parse_xml(data, label, part, start=None, end=None, text=None):
    """Run expat over a part with optional handlers; document types and malformed text are refused."""
    parser = expat.ParserCreate(namespace_separator=None)

    def refuse(*_):
        raise _document_type(label, part)

    parser.StartDoctypeDeclHandler = refuse
    parser.EntityDeclHandler = refuse
    parser.buffer_text = True
    if start:
        parser.StartElementHandler = start
    if end:
        parser.EndElementHandler = end
    if text:
        parser.CharacterDataHandler = text
    try:
        parser.Parse(data, True)
    except expat.ExpatError as error:
        raise UnreadableWorkbook(
            f"{label}: the part {part} is not well-formed XML ({_one_line(error)})"
        ) from None


def local(name):
    """The name of an element or attribute without its namespace prefix."""
    return name.rpartition(":")[2]


def output_path(source, output, in_place):
    """Where the result goes, after refusing to write over the input unasked."""
    source = Path(source)
    if output is None:
        if not in_place:
            raise UnreadableWorkbook(
                f"{source.name}: no output named, and writing over the input was not asked for"
            )
        return Path(os.path.realpath(source))
    target = Path(output)
    if target.is_dir():
        target = target / source.name
    same = os.path.realpath(target) == os.path.realpath(source)
    if not same and target.exists() and source.exists():
        same = os.path.samefile(target, source)
    if same and not in_place:
        raise UnreadableWorkbook(
            f"{source.name}: the output {target} is the input itself; name another output"
        )
    if not target.parent.is_dir():
        raise UnreadableWorkbook(f"{target}: the folder of the output does not exist")
    if target.suffix.lower() != source.suffix.lower():
        raise UnreadableWorkbook(
            f"{target.name}: the output must end in {source.suffix or 'the same suffix'} like the input, "
            "or a spreadsheet program will not open it"
        )
    return Path(os.path.realpath(target))


def _into_place(target, write):
    """Write a workbook; what the file system refuses is one line."""
    try:
        write_into_place(target, write)
    except OSError as error:
        raise UnreadableWorkbook(f"{target}: cannot be written ({_one_line(error)})") from None


def copy_into_place(package, target):
    """Write the package exactly as it was read."""
    _into_place(target, lambda stream: stream.write(package.stored))


def save_parts(package, target, parts):
    """Write the package with some parts replaced; nothing replaced means an exact copy."""
    if not parts:
        copy_into_place(package, target)
        return
    _into_place(target, lambda stream: package.write(stream, parts))
