"""The extension file and what is derived from the registry, without the program."""

from __future__ import annotations

import io
import json
import math
import struct
import threading
import time
import zipfile
from xml.etree import ElementTree

import pytest

from uffuncs import calc
from uffuncs.calc.answers import answer, argument_names
from uffuncs.calc.extension import INSIDE, extension, extension_files
from uffuncs.calc.inside import frames
from uffuncs.calc.inside.binding import calls
from uffuncs.calc.inside.values import CODES, ERROR_NUMBERS, LONG, WIDE, error_name, trimmed
from uffuncs.calc.inside.watchdog import Watchdog
from uffuncs.calc.names import INTERFACE, SERVICE, add_in_functions, lower_camel, programmatic_name
from uffuncs.calc.type_library import MAGIC, type_library
from uffuncs.errors import REASON_LENGTH
from uffuncs.registry import functions


def test_two_builds_are_the_same(tmp_path):
    one, other = calc.build(tmp_path / "a" / "new"), calc.build(tmp_path / "b")
    assert one.name == "uffuncs.oxt" and one.read_bytes() == other.read_bytes() == extension()
    assert calc.build(tmp_path / "b").read_bytes() == one.read_bytes()
    assert [p.name for p in (tmp_path / "b").iterdir()] == ["uffuncs.oxt"]


def test_package():
    with zipfile.ZipFile(io.BytesIO(extension())) as package:
        names = package.namelist()
        assert package.testzip() is None
        manifest = package.read("META-INF/manifest.xml").decode()
        for name in names:
            if name.endswith((".xml", ".xcu", ".components")):
                ElementTree.fromstring(package.read(name))
        for name in ("types.rdb", "uffuncs.components", "Jobs.xcu"):
            assert name in names and f'"{name}"' in manifest
        assert {f"pythonpath/uffuncs_inside/{m}.py" for m in INSIDE} < set(names)
        for name in names:
            if name.endswith(".py"):
                compile(package.read(name), name, "exec")


def test_what_runs_inside_imports_nothing_else():
    import ast
    import sys

    from uffuncs.calc import inside

    folder = inside.__path__[0]
    for module in INSIDE:
        with open(f"{folder}/{module}.py", encoding="utf-8") as file:
            tree = ast.parse(file.read(), feature_version=(3, 8))
        for node in tree.body:
            imported = [a.name for a in node.names] if isinstance(node, ast.Import) else []
            if isinstance(node, ast.ImportFrom) and node.level == 0:
                imported = [node.module]
            assert {name.partition(".")[0] for name in imported} <= sys.stdlib_module_names, module


def test_every_function_is_offered():
    offered = add_in_functions()
    assert [f.name for f in offered] == list(functions())
    for f in offered:
        record = functions()[f.name]
        assert [name for name, _ in f.arguments] == argument_names(record)
        assert record.summary in f.description and record.result_unit in f.description
        assert all(text and len(text) <= REASON_LENGTH for _, text in f.arguments)
        for argument, (_, text) in zip(record.arguments, f.arguments, strict=False):
            assert argument.required == text.endswith("; required") or len(text) == REASON_LENGTH
        assert all(p.isalnum() and p[0].islower() for p in (f.method, *f.parameters))


def test_names():
    assert lower_camel("UF_FLUX_DARCY") == "ufFluxDarcy"
    assert programmatic_name("UF_FLUX_DARCY") == "ORG.UFFUNCS.CALC.FUNCTIONS.UFFLUXDARCY"
    content = json.loads(extension_files()["functions.json"])
    assert content["compatibility_names"] and len(content["functions"]) == len(functions())
    assert not json.loads(extension_files(compatibility_names=False)["functions.json"])["compatibility_names"]


# --- the type library -----------------------------------------------------------------------------------


class Reader:
    """Reads what the writer has written, by the format's own description."""

    def __init__(self, data: bytes):
        self.data = data

    def number(self, at: int) -> int:
        return struct.unpack_from("<I", self.data, at)[0]

    def name(self, at: int) -> str:
        return self.data[at : self.data.index(b"\0", at)].decode()

    def text(self, at: int) -> tuple[str, int]:
        length = self.number(at)
        return self.data[at + 4 : at + 4 + length].decode(), at + 4 + length

    def entries(self, at: int, count: int) -> dict[str, int]:
        found = [(self.name(self.number(at + 8 * n)), self.number(at + 8 * n + 4)) for n in range(count)]
        assert found == sorted(found)
        return dict(found)

    def root(self):
        assert self.data.startswith(MAGIC)
        return self.entries(self.number(8), self.number(12))

    def module(self, at: int):
        assert self.data[at] == 0
        return self.entries(at + 5, self.number(at + 1))

    def interface(self, at: int):
        assert self.data[at] == 5 and self.number(at + 1) == 1
        base, at = self.text(at + 5)
        assert base == "com.sun.star.uno.XInterface" and self.number(at) == self.number(at + 4) == 0
        count, at, methods = self.number(at + 8), at + 12, []
        for _ in range(count):
            name, at = self.text(at)
            result, at = self.text(at)
            number, at, parameters = self.number(at), at + 4, []
            for _ in range(number):
                assert self.data[at] == 0
                parameter, at = self.text(at + 1)
                kind, at = self.text(at)
                parameters.append((parameter, kind))
            assert self.number(at) == 0
            at += 4
            methods.append((name, result, parameters))
        return methods


def test_type_library_reads_back():
    reader = Reader(extension_files()["types.rdb"])
    entities = reader.root()
    for module in INTERFACE.split(".")[:-1]:
        entities = reader.module(entities[module])
    assert set(entities) == {"XFunctions", "Functions"}
    methods = reader.interface(entities["XFunctions"])
    for (name, result, parameters), f in zip(methods, add_in_functions(), strict=True):
        assert (name, result, tuple(p for p, _ in parameters)) == (f.method, "[][]any", f.parameters)
        kinds = [kind for _, kind in parameters]
        assert kinds == ["any"] * (len(kinds) - f.variadic) + ["[]any"] * f.variadic
    assert (
        reader.data[entities["Functions"]] == 0x28 and reader.text(entities["Functions"] + 1)[0] == INTERFACE
    )
    with pytest.raises(ValueError, match="one module"):
        type_library(INTERFACE, "org.elsewhere.Functions", [])
    assert SERVICE.endswith("calc.Functions")


# --- values ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", CODES)
def test_error_values_are_marked_nans(name):
    number = ERROR_NUMBERS[name]
    assert math.isnan(number) and error_name(number) == name
    assert struct.pack("<d", number)[:2] == struct.pack("<H", CODES[name])


def test_errors_that_files_do_not_know_are_value_errors():
    from uffuncs.calc.inside.values import error_number

    assert error_name(error_number("#SPILL!")) == "#VALUE!"
    assert error_name(math.nan) == "#NUM!"


def test_answers():
    assert answer("UF_FLUX_DARCY", (2.0, 1.0, 5e12, None))[0][0] == pytest.approx(144)
    na = ERROR_NUMBERS["#N/A"]
    block = answer("UF_FLUX_DARCY", (((2.0,), (na,), ("",)), 1.0, 5e12))
    assert (
        block[0][0] == pytest.approx(144)
        and error_name(block[1][0]) == "#N/A"
        and error_name(block[2][0]) == "#VALUE!"
    )
    assert answer("UF_FLUX_DARCY", (((2.0, 1.0), (na, 3.0)), 1.0, 5e12))[1][1] == pytest.approx(216)
    assert error_name(answer("UF_NOTHING", ())[0][0]) == "#N/A"


def test_whole_columns_are_trimmed_together():
    def column(*values):
        return tuple((v,) for v in values) + (("",),) * (LONG - len(values))

    one, other, short = trimmed((column(1.0, "", 3.0), column(1.0), ((1.0,), ("",))))
    assert one == ((1.0,), ("",), (3.0,)) and other == ((1.0,), ("",), ("",)) and short == ((1.0,), ("",))
    assert trimmed((column(),)) == ((("",),),)
    row = ((2.0, 3.0) + ("",) * WIDE,)
    assert trimmed((row, 1.0, None)) == (((2.0, 3.0),), 1.0, None)


VALUES = [
    "UF_X",
    1.5,
    None,
    '±µ\n"',
    "",
    ((1.0, 2.0), (3.0, 4.0)),
    ((1.0, "text"), (None, "")),
    (("35 psi",),),
    ((1e308, -0.0),),
]


def through(message: bytes):
    stream = io.BytesIO(message)
    return frames.unpacked(stream.read, frames.tuple_block)


def test_messages_come_back_as_they_were():
    values, head = through(frames.packed(VALUES, signatures={"a": ["b"]}))
    assert values == VALUES and head == {"signatures": {"a": ["b"]}}
    na, num = ERROR_NUMBERS["#N/A"], ERROR_NUMBERS["#NUM!"]
    (single, numbers, mixed), _ = through(frames.packed([na, ((1.0,), (num,)), (("x",), (na,))]))
    assert [error_name(v) for v in (single, numbers[1][0], mixed[1][0])] == ["#N/A", "#NUM!", "#N/A"]


def test_messages_are_bounded():
    with pytest.raises(frames.TooLong):
        frames.packed(["x" * (frames.MOST_BYTES + 1)])
    with pytest.raises(frames.TooLong):
        through(frames.HEADER.pack(8, frames.MOST_BYTES) + b"{}")


def test_watchdog():
    dog, fired = Watchdog(), threading.Event()
    dog.begin(0.05, fired.set)
    assert fired.wait(2) and dog.end()
    fired.clear()
    dog.begin(5, fired.set)
    assert not dog.end()
    time.sleep(0.5)
    assert not fired.is_set()


def test_calls_in_formulas():
    names = {"UF_FLUX_DARCY"}
    assert calls("=uf_flux_darcy(A1)+1", names) and calls('="x"&UF_FLUX_DARCY(1)', names)
    assert (
        not calls('="UF_FLUX_DARCY(1)"', names)
        and not calls("=MY.UF_FLUX_DARCY(1)", names)
        and not calls("=UF_FLUX_DARCY", names)
    )
