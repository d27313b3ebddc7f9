"""What can go wrong, as Python exceptions and as the error values of a cell."""

from __future__ import annotations

#: The error values a worksheet knows. A result is never a text that only looks like one of them.
ERROR_CODES = ("#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A", "#SPILL!", "#CALC!")

#: Longest reason: a function wizard and a cell comment cut longer texts off.
REASON_LENGTH = 255


class ErrorValue:
    """A true error value of a cell, with the reason that UF_WHY shows; equal to another by its code alone."""

    __slots__ = ("code", "reason")

    def __init__(self, code: str, reason: str = ""):
        if code not in ERROR_CODES:
            raise ValueError(f"{code!r} is not an error value of a worksheet")
        self.code = code
        self.reason = shortened(reason)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, ErrorValue) and other.code == self.code

    def __hash__(self) -> int:
        return hash(self.code)

    def __repr__(self) -> str:
        return f"ErrorValue({self.code!r}, {self.reason!r})"

    def __str__(self) -> str:
        return self.code


class UffuncsError(ValueError):
    """Base of every refusal; `code` is the error value that a cell shows for it."""

    code = "#VALUE!"

    def as_cell(self) -> ErrorValue:
        return ErrorValue(self.code, str(self))


class InvalidInput(UffuncsError):
    """An argument is missing, is of the wrong kind or dimension, or does not fit the others in shape."""


class OutOfBounds(UffuncsError):
    """An argument lies outside the physical bounds of its quantity."""

    code = "#NUM!"


class NoResult(UffuncsError):
    """The arguments are sound one by one, but together have no (or no single) result."""

    code = "#NUM!"


class NotAvailable(UffuncsError):
    """An unknown name, or too few or degenerate points for a fit."""

    code = "#N/A"


class CellError(UffuncsError):
    """An error cell among the arguments: it comes out as it went in."""

    def __init__(self, value: ErrorValue):
        super().__init__(value.reason or f"an argument is the error value {value.code}")
        self.code = value.code


def shortened(text: str) -> str:
    return text if len(text) <= REASON_LENGTH else text[: REASON_LENGTH - 1] + "…"
