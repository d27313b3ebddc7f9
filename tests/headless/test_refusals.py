"""What is refused: one line, nothing written."""

import io
import os
import struct
import zipfile

import pytest
from headless_books import MAIN, cell, members, packed, parts_of, sheet_xml

from uffuncs.headless import UnreadableWorkbook, package, recalculate


def good_parts(rows=""):
    return parts_of({"S": sheet_xml(rows or '<row r="1">' + cell("A1", "1+1") + "</row>")})


def with_entries(entries):
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in entries:
            archive.writestr(name, data)
    return buffer.getvalue()


def bomb(size):
    """A package whose sheet inflates to `size` bytes."""
    parts = good_parts()
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as archive:
        for name, data in parts.items():
            if "sheet1.xml" not in name:
                archive.writestr(name, data)
        with archive.open("xl/worksheets/sheet1.xml", "w", force_zip64=True) as stream:
            stream.write(f'<worksheet xmlns="{MAIN}"><sheetData>'.encode())
            block = b" " * 2**20
            for _ in range(size // len(block)):
                stream.write(block)
            stream.write(b"</sheetData></worksheet>")
    return buffer.getvalue()


def lying(data):
    """The directory announces a sheet of 100 bytes; the local header too."""
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        size = archive.getinfo("xl/worksheets/sheet1.xml").file_size
    return data.replace(struct.pack("<L", size), struct.pack("<L", 100))


OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600)
DTD = f'<!DOCTYPE x [<!ENTITY a "aaaa">]><worksheet xmlns="{MAIN}"><sheetData/></worksheet>'


def refusals():
    parts = good_parts()
    plain = packed(parts)
    without = {name: data for name, data in parts.items() if "workbook.xml" not in name}
    big = good_parts('<row r="1">' + cell("A1", "1+1") + cell("B1", '"' + "x" * 5000 + '"') + "</row>")
    yield "text", b"name,flux\nrun 1,50\n", "not a zip"
    yield "empty", b"", "empty"
    yield "truncated", plain[: len(plain) // 2], "damaged"
    yield "old binary", OLE, ".xls)"
    yield "encrypted", OLE + "EncryptedPackage".encode("utf-16-le"), "password"
    yield "opendocument", with_entries(
        [("mimetype", "application/vnd.oasis.opendocument.spreadsheet"), ("content.xml", "<x/>")]
    ), ".ods"
    yield "binary workbook", with_entries([*parts.items(), ("xl/workbook.bin", b"1")]), ".xlsb"
    yield "no workbook part", packed(without), "no workbook part"
    yield "other zip", with_entries([("a.txt", "a")]), "no workbook part"
    yield "missing sheet", packed(
        {n: d for n, d in parts.items() if "sheet1" not in n}
    ), "sheet1.xml of sheet 'S' is missing"
    yield "parent folder", with_entries([*parts.items(), ("../evil.xml", "<x/>")]), "unsafe part name"
    yield "absolute", with_entries([*parts.items(), ("/evil.xml", "<x/>")]), "unsafe part name"
    yield "document type", packed(parts | {"xl/worksheets/sheet1.xml": DTD}), "DTD"
    yield "document type elsewhere", packed(parts | {"xl/theme/theme1.xml": "<!DOCTYPE x><x/>"}), "DTD"
    yield "document type in utf-16", packed(
        parts | {"xl/theme/theme1.xml": "<!DOCTYPE x><x/>".encode("utf-16")}
    ), "DTD"
    yield "malformed", packed(
        parts | {"xl/worksheets/sheet1.xml": "<worksheet><sheetData></worksheet>"}
    ), "well-formed"
    yield "not a sheet", packed(parts | {"xl/worksheets/sheet1.xml": "<html/>"}), "not a worksheet"
    yield "outside the sheet", packed(
        good_parts('<row r="1">' + cell("XFE1", "1+1") + "</row>")
    ), "outside the worksheet"
    yield "lying directory", lying(packed(big)), "damaged"


CASES = list(refusals())


@pytest.mark.parametrize(
    "data, part_of_message", [case[1:] for case in CASES], ids=[case[0] for case in CASES]
)
def test_refused_in_one_line(bench, data, part_of_message):
    source = bench.write(data)
    with pytest.raises(UnreadableWorkbook) as refusal:
        recalculate(source, bench.folder / "out.xlsx")
    message = str(refusal.value)
    assert part_of_message in message and "in.xlsx" in message and "\n" not in message and len(message) < 300
    assert os.listdir(bench.folder) == ["in.xlsx"]


def test_twice_the_same_part(bench):
    with pytest.warns(UserWarning, match="Duplicate"):
        data = with_entries([*good_parts().items(), ("xl/workbook.xml", "<x/>")])
    with pytest.raises(UnreadableWorkbook, match="twice"):
        recalculate(bench.write(data), bench.folder / "out.xlsx")
    data = with_entries([*good_parts().items(), ("XL/Workbook.xml", "<x/>")])
    with pytest.raises(UnreadableWorkbook, match="twice"):
        recalculate(bench.write(data), bench.folder / "out.xlsx")


def test_corrupt_part(bench):
    data = bytearray(packed(good_parts()))
    with zipfile.ZipFile(io.BytesIO(bytes(data))) as archive:
        info = archive.getinfo("xl/worksheets/sheet1.xml")
    start = info.header_offset + 30 + len(info.filename) + info.compress_size // 2
    data[start] ^= 0xFF
    with pytest.raises(UnreadableWorkbook, match="damaged|well-formed"):
        recalculate(bench.write(bytes(data)), bench.folder / "out.xlsx")


def test_sheet_that_inflates_to_gigabytes(bench):
    source = bench.write(bomb(package.MAX_PART_BYTES + 2**22))
    with pytest.raises(UnreadableWorkbook, match="more than the limit"):
        recalculate(source, bench.folder / "out.xlsx")


def test_limits_hold_while_inflating(bench, monkeypatch):
    """The check of announced sizes is not the only one."""
    source = bench.write(bomb(2**22))
    monkeypatch.setattr(package, "_index", lambda members, label: {info.filename: info for info in members})
    monkeypatch.setattr(package, "MAX_PART_BYTES", 2**21)
    with pytest.raises(UnreadableWorkbook, match="inflates to more"):
        recalculate(source, bench.folder / "out.xlsx")


@pytest.mark.parametrize("limit", ["MAX_FILE_BYTES", "MAX_PART_BYTES", "MAX_PACKAGE_BYTES", "MAX_PARTS"])
def test_each_limit(bench, monkeypatch, limit):
    source = bench.write(good_parts())
    monkeypatch.setattr(package, limit, 3)
    with pytest.raises(UnreadableWorkbook, match="limit"):
        recalculate(source, bench.folder / "out.xlsx")


def test_missing_input_folder_as_input_and_unknown_engine(bench):
    with pytest.raises(UnreadableWorkbook, match="no such file"):
        recalculate(bench.folder / "none.xlsx", bench.folder / "out.xlsx")
    with pytest.raises(UnreadableWorkbook, match="not a file"):
        recalculate(bench.folder, bench.folder / "out.xlsx")
    with pytest.raises(UnreadableWorkbook, match="no engine"):
        recalculate(bench.write(good_parts()), bench.folder / "out.xlsx", engine="abacus")


# --- the output --------------------------------------------------------------------------------------------------------


def test_input_is_never_written_over_unasked(bench, monkeypatch):
    source = bench.write(good_parts())
    before = source.read_bytes()
    (bench.folder / "link.xlsx").symlink_to(source)
    os.link(source, bench.folder / "hard.xlsx")
    (bench.folder / "sub").mkdir()
    monkeypatch.chdir(bench.folder)
    for target in (source, "in.xlsx", "sub/../in.xlsx", "link.xlsx", "hard.xlsx", bench.folder, "."):
        with pytest.raises(UnreadableWorkbook, match="is the input itself"):
            recalculate(source, target)
    with pytest.raises(UnreadableWorkbook, match="no output"):
        recalculate(source)
    assert source.read_bytes() == before


def test_in_place(bench):
    source = bench.write(good_parts())
    source.chmod(0o640)
    link = bench.folder / "link.xlsx"
    link.symlink_to(source)
    recalculate(link, in_place=True)
    assert link.is_symlink() and b"<v>2</v>" in members(source)["xl/worksheets/sheet1.xml"]
    assert source.stat().st_mode & 0o777 == 0o640
    assert sorted(os.listdir(bench.folder)) == ["in.xlsx", "link.xlsx"]


def test_folder_as_output_and_wrong_outputs(bench):
    source = bench.write(good_parts())
    (bench.folder / "results").mkdir()
    report = recalculate(source, bench.folder / "results")
    assert report.output == (bench.folder / "results" / "in.xlsx").resolve() and report.output.exists()
    with pytest.raises(UnreadableWorkbook, match="must end in .xlsx"):
        recalculate(source, bench.folder / "out.xlsm")
    with pytest.raises(UnreadableWorkbook, match="folder of the output does not exist"):
        recalculate(source, bench.folder / "nowhere" / "out.xlsx")


def test_failure_while_writing_leaves_the_old_output(bench, monkeypatch):
    source = bench.write(good_parts())
    target = bench.folder / "out.xlsx"
    target.write_bytes(b"old")

    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(package.os, "fsync", full)
    with pytest.raises(UnreadableWorkbook, match="No space left"):
        recalculate(source, target)
    assert target.read_bytes() == b"old" and sorted(os.listdir(bench.folder)) == ["in.xlsx", "out.xlsx"]
