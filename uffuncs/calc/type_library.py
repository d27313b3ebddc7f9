"""The type library of the add-in, written in pure Python: one interface and the service that has it.

The format is LibreOffice's binary UNOIDL: a header, entities as payloads, and maps from names to offsets,
sorted by name. Numbers are little-endian and 32 bits wide; a text is its length and its bytes.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from struct import pack

MAGIC = b"UNOIDL\xff\0"
MODULE, INTERFACE, SERVICE = 0, 5, 8
SINGLE_INTERFACE_DEFAULT = 0x20  # flag of a service that needs no further constructor
IN = b"\0"
ROOT_INTERFACE = "com.sun.star.uno.XInterface"

ANY = "any"
ANY_SEQUENCE = "[]any"
ANY_BLOCK = "[][]any"


def type_library(
    interface: str, service: str, methods: Sequence[tuple[str, str, Sequence[tuple[str, str]]]]
) -> bytes:
    """The bytes of a type library.

    Parameters
    ----------
    interface, service : str
        Full names with dots, in one module.
    methods : sequence of (name, result type, parameters as (name, type))
    """
    *modules, interface_name = interface.split(".")
    *same_modules, service_name = service.split(".")
    if modules != same_modules:
        raise ValueError("interface and service belong in one module")
    writer = _Writer()
    entities = {
        interface_name: writer.put(_interface_payload(methods)),
        service_name: writer.put(bytes([SERVICE | SINGLE_INTERFACE_DEFAULT]) + _text(interface)),
    }
    for module in reversed(modules[1:]):
        entities = {module: writer.module(entities)}
    entities = {modules[0]: writer.module(entities)}
    return writer.finished(entities)


def _interface_payload(methods) -> bytes:
    none = _number(0)
    pieces = [bytes([INTERFACE]), _number(1), _text(ROOT_INTERFACE), none, none, _number(len(methods))]
    for name, result, parameters in methods:
        pieces += [_text(name), _text(result), _number(len(parameters))]
        pieces += [IN + _text(parameter) + _text(kind) for parameter, kind in parameters]
        pieces.append(none)  # no exceptions
    return b"".join(pieces)


class _Writer:
    """Collects payloads; every offset counts from the start of the file."""

    def __init__(self):
        self.data = bytearray(MAGIC + bytes(8))

    def put(self, payload: bytes) -> int:
        offset = len(self.data)
        self.data += payload
        return offset

    def _entries(self, entities: Mapping[str, int]) -> bytes:
        ordered = sorted(entities.items())
        names = [self.put(name.encode("ascii") + b"\0") for name, _ in ordered]
        return b"".join(
            _number(name) + _number(offset) for name, (_, offset) in zip(names, ordered, strict=True)
        )

    def module(self, entities: Mapping[str, int]) -> int:
        entries = self._entries(entities)
        return self.put(bytes([MODULE]) + _number(len(entities)) + entries)

    def finished(self, entities: Mapping[str, int]) -> bytes:
        root = self.put(self._entries(entities))
        self.data[len(MAGIC) : len(MAGIC) + 8] = _number(root) + _number(len(entities))
        return bytes(self.data)


def _number(value: int) -> bytes:
    return pack("<I", value)


def _text(text: str) -> bytes:
    data = text.encode("ascii")
    return _number(len(data)) + data
