"""What a recalculation reports: plain data for a summary, and the same as lines of text."""

from dataclasses import dataclass, field
from pathlib import Path


@dataclass(slots=True)
class ErrorCell:
    """A cell with an error value, and why.

    `source` is the cell the error comes from ("Sheet!B8") where this cell only passes it on, else "".
    """

    sheet: str
    address: str
    code: str
    reason: str
    formula: str = ""
    source: str = ""


@dataclass(slots=True)
class UnknownFunction:
    """A function that neither the engine nor uffuncs knows, and the cells that call it."""

    name: str
    cells: list[tuple[str, str]]  # (sheet, address)


@dataclass(slots=True)
class Change:
    """A cell whose value differs from the one the workbook held before; None stands for no value."""

    sheet: str
    address: str
    before: object
    after: object


@dataclass(slots=True)
class Report:
    """The outcome of one recalculation."""

    source: Path
    output: Path
    engine: str
    formulas: int = 0
    own_formulas: int = 0  # of which call a uffuncs function
    errors: list[ErrorCell] = field(default_factory=list)
    unknown_functions: list[UnknownFunction] = field(default_factory=list)
    changes: list[Change] = field(default_factory=list)  # the workbook held another value
    filled: int = 0  # cells that held no value before
    notes: list[str] = field(default_factory=list)
    seconds: float = 0.0
    timings: dict[str, float] = field(default_factory=dict)  # seconds of read, load, evaluate, explain, patch

    @property
    def changed(self):
        """Number of cells whose value differs from the previous one."""
        return len(self.changes)


def report_lines(report, most=20):
    """The report as lines of plain text; at most `most` entries of each list."""
    lines = [
        f"{report.source.name} -> {report.output}: {report.formulas:,} formulas "
        f"({report.own_formulas:,} with uffuncs functions), {report.changed:,} changed, "
        f"{report.filled:,} filled, "
        f"{len(report.errors):,} errors, {report.seconds:.2f} s"
    ]
    for error in report.errors[:most]:
        lines.append(f"  {error.sheet}!{error.address}  {error.code}  {error.reason}")
    lines += _more(len(report.errors), most, "error cells")
    for unknown in report.unknown_functions[:most]:
        cells = ", ".join(f"{sheet}!{address}" for sheet, address in unknown.cells[:3])
        rest = f" and {len(unknown.cells) - 3:,} more" if len(unknown.cells) > 3 else ""
        lines.append(f"  nobody knows the function {unknown.name}: {cells}{rest}")
    lines += _more(len(report.unknown_functions), most, "unknown functions")
    lines += [f"  {note}" for note in report.notes]
    return lines


def _more(count, most, what):
    return [f"  and {count - most:,} more {what}"] if count > most else []
