"""The cell contract: what a worksheet function gets from cells and gives back. Every door calls this, and only this.

A cell value is a number, a text, a boolean, None (blank or omitted), an ErrorValue, or a range: a list of rows of these.
A result is a float, a text, an ErrorValue, or a block of these as a list of rows; never a NaN, a boolean or an exception.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from .declaration import Argument, Function, Tool
from .errors import CellError, ErrorValue, InvalidInput, NoResult, NotAvailable, UffuncsError
from .grids import PIECE, Grid, common_shape, elements, grid
from .reading import RANGES, flattened, is_blank, make_reader, unwrapped
from .reasons import no_result_reason
from .registry import find


def call(name: str, cells: Sequence) -> object:
    """The value of a worksheet function for cell values; never raises.

    Parameters
    ----------
    name : str
        Worksheet name, in any case.
    cells : sequence
        Cell values in the order of the arguments; missing ones at the end count as omitted.

    Returns
    -------
    float, str, ErrorValue, or a list of rows of these
    """
    try:
        compiled = _COMPILED.get(name) or compile_function(name)
        return compiled(cells)
    except UffuncsError as error:
        return error.as_cell()
    except (ArithmeticError, np.linalg.LinAlgError) as error:
        return ErrorValue("#NUM!", f"{name}: no finite result ({type(error).__name__})")
    except RecursionError:
        return ErrorValue("#NUM!", f"{name}: nested too deeply")
    except Exception as error:  # a slip of the library must not take the host program down
        return ErrorValue("#VALUE!", f"{name}: internal error, {type(error).__name__}: {error}")


_COMPILED: dict[str, Callable] = {}


def compile_function(name: str) -> Callable:
    """The callable for a worksheet name: readers and scales are prepared once.

    Raises
    ------
    NotAvailable
        No function of that name.
    """
    record = find(name)
    if record is None:
        raise NotAvailable(f"{name}: there is no function of this name")
    compiled = CompiledTool(record) if isinstance(record, Tool) else CompiledFunction(record)
    _COMPILED[name] = _COMPILED[record.worksheet_name] = compiled
    return compiled


class CompiledTool:
    """A tool gets its cells as they are; it checks them itself."""

    def __init__(self, record: Tool):
        self.record = record

    def __call__(self, cells: Sequence) -> object:
        record = self.record
        _check_count(record, cells)
        cells = [c.tolist() if isinstance(c, np.ndarray) else c for c in map(unwrapped, cells)]
        cells += [None] * (len(record.arguments) - len(cells))
        for argument, cell in zip(record.arguments, cells):
            if argument.required and is_blank(cell):
                raise InvalidInput(f"{record.worksheet_name}: {argument.name} is blank")
        given = [a.default if is_blank(c) and not a.required else c for a, c in zip(record.arguments, cells)]
        try:
            return sanitized(record.python(*given, *cells[len(given):]), record.worksheet_name)
        except CellError:
            raise
        except UffuncsError as error:
            raise type(error)(f"{record.worksheet_name}: {error}") from None


class CompiledFunction:
    """A function record with its argument readers; call it with cell values."""

    def __init__(self, record: Function):
        self.record = record
        self.body = record.python
        self.name = record.worksheet_name
        self.count = len(record.arguments)
        self.readers = [make_reader(record.worksheet_name, a) for a in record.arguments]
        self.minimum = record.minimum_cells
        self.defaults = [a.default for a in record.arguments]
        self.columns = [i for i, a in enumerate(record.arguments) if a.kind in ("column", "labels")]
        single = record.results[0] if record.results and not record.block else None
        self.scale, self.offset = (single.scale, single.offset) if single else (1.0, 0.0)

    def __call__(self, cells: Sequence) -> object:
        if self.columns or self.record.block:
            return self._with_columns(self._completed(cells))
        # A program asks for one cell at a time: numbers are read straight away, ranges are met as an exception.
        try:
            values = [read(cell) for read, cell in zip(self.readers, cells)]
            given = len(cells)
            if given != self.count:
                _check_count(self.record, cells)
                values += self.defaults[given:] if given >= self.minimum else [read(None) for read in self.readers[given:]]
        except UffuncsError:
            cells = self._completed(cells)
            if any(type(cell) in RANGES for cell in cells):
                return self.block(cells)
            values = [read(cell) for read, cell in zip(self.readers, cells)]
        return self.scalar(values)

    def _completed(self, cells: Sequence) -> list:
        _check_count(self.record, cells)
        return [*map(unwrapped, cells), *[None] * (self.count - len(cells))]

    def scalar(self, values: list) -> float | str:
        """One value from SI values; the reason of a refusal names the function."""
        try:
            result = self.body(*values)
        except UffuncsError as error:
            raise type(error)(f"{self.name}: {error}") from None
        except (ArithmeticError, ValueError):  # a plain float divides by zero, overflows, or leaves a function's domain
            result = math.nan
        if type(result) is str:
            return result
        if self.record.result_by:
            result = self.record.result_quantity(values).from_si(result)
        else:
            result = (result - self.offset) / self.scale
        result = float(result) + 0.0  # no negative zero
        if not math.isfinite(result):
            raise NoResult(no_result_reason(self.record, values))
        return result

    def si_values(self, cells: Sequence) -> list:
        """The arguments of a call in SI, ranges of whole columns as arrays."""
        cells = self._completed(cells)
        return self._values(cells, self._read_columns(cells) if self.columns else {})

    def _values(self, cells: Sequence, columns: dict) -> list:
        return [columns[i] if i in columns else read(cell) for i, (read, cell) in enumerate(zip(self.readers, cells))]

    # --- ranges, element by element ------------------------------------------------------------------------------

    def block(self, cells: Sequence, columns: dict | None = None) -> list[list]:
        if any(self._has_own_default(a, c) for a, c in zip(self.record.arguments, cells)):
            return self._element_by_element(cells, columns or {})
        values, errors = self.arrays(cells, columns)
        rows = values.tolist()
        for (i, j), error in errors.items():
            rows[i][j] = error
        return rows

    @staticmethod
    def _has_own_default(argument: Argument, cell: object) -> bool:
        """A range with blanks, for an argument whose default the function works out itself."""
        return (not argument.required and argument.default is None and type(cell) in RANGES
                and any(is_blank(v) for v in flattened(cell)))

    def _element_by_element(self, cells: Sequence, columns: dict) -> list[list]:
        def value(element: list):
            try:
                return self.scalar(self._values(element, columns))
            except UffuncsError as error:
                return error.as_cell()

        return [[value(element) for element in row] for row in elements(cells, whole=columns)]

    def arrays(self, cells: Sequence, columns: dict | None = None) -> tuple[np.ndarray, dict[tuple[int, int], ErrorValue]]:
        """Elementwise over ranges: the values in worksheet units, and the error of each bad element.

        Two-dimensional arrays of floats may stand for ranges of cells.
        """
        columns = columns or {}
        grids: list[Grid] = []
        for i, (argument, read, cell) in enumerate(zip(self.record.arguments, self.readers, cells)):
            if i in columns:
                grids.append(Grid(columns[i], (1, 1), {}, single=True))
            else:
                grids.append(grid(argument, read, cell))
        try:
            shape = common_shape([g.shape for g in grids], self.record.argument_names)
        except InvalidInput as error:
            raise InvalidInput(f"{self.name}: {error}") from None
        errors: dict[tuple[int, int], ErrorValue] = {}
        for g in reversed(grids):  # the first argument's error wins
            errors.update(g.errors_in(shape))
        size = shape[0] * shape[1]
        flat = [g.flat(shape) for g in grids]
        out = np.full(size, np.nan)
        failed: dict[int, ErrorValue] = {}
        if errors:
            good = np.ones(shape, bool)
            good[tuple(np.array(list(errors)).T)] = False
            keep = np.flatnonzero(good)
            finite = self._pieces([f if g.single else f[keep] for f, g in zip(flat, grids)], grids, keep, out, failed)
        else:
            finite = self._pieces(flat, grids, None, out, failed)
        for index in () if finite else np.flatnonzero(~np.isfinite(out)):
            errors.setdefault(divmod(int(index), shape[1]), failed.get(int(index), _NO_RESULT))
        return out.reshape(shape), errors

    def _pieces(self, flat: list, grids: list, keep: np.ndarray | None, out: np.ndarray, failed: dict) -> bool:
        """Compute `out[keep]` piece by piece, with text arguments fixed within a piece; tells whether all of it is finite.

        What a body refuses goes to `failed`.
        """
        finite = True
        size = len(out) if keep is None else len(keep)
        texts = [i for i, g in enumerate(grids) if not g.single and g.is_text]
        if texts:
            kinds = list(zip(*(flat[i] for i in texts)))
            for kind in dict.fromkeys(kinds):
                rows = np.array([n for n, k in enumerate(kinds) if k == kind])
                part = [f if g.single else f[rows] for f, g in zip(flat, grids)]
                for i, text in zip(texts, kind):
                    part[i] = text
                finite &= self._compute(part, [g.single or i in texts for i, g in enumerate(grids)], len(rows), out,
                                        rows if keep is None else keep[rows], failed)
            return finite
        return self._compute(flat, [g.single for g in grids], size, out, keep, failed)

    def _compute(self, flat: list, single: list[bool], size: int, out: np.ndarray, keep: np.ndarray | None,
                 failed: dict) -> bool:
        finite = True
        scale_of = [(a.quantity.scale, a.quantity.offset) if a.quantity else (1.0, 0.0) for a in self.record.arguments]
        for start in range(0, size, PIECE):
            part = slice(start, min(start + PIECE, size))
            values = []
            for f, fixed, (scale, offset) in zip(flat, single, scale_of):
                if fixed:
                    values.append(f)
                else:
                    x = f[part] * scale
                    values.append(x + offset if offset else x)
            places = part if keep is None else keep[part]
            try:
                result = self._body(values) + 0.0  # no negative zero
                finite &= bool(np.isfinite(result).all())
                out[places] = result
            except UffuncsError:  # a body that refuses the whole array: one by one, so that only the bad ones fail
                finite = False
                numbers = np.arange(part.start, part.stop) if keep is None else keep[part]
                for n, place in enumerate(numbers):
                    try:
                        out[place] = self._body([v[n].item() if isinstance(v, np.ndarray) and not fixed else v
                                                 for v, fixed in zip(values, single)])
                    except UffuncsError as error:
                        failed[int(place)] = ErrorValue(error.code, f"{self.name}: {error}")
        return finite

    def _body(self, values: list) -> np.ndarray | float:
        with np.errstate(all="ignore"):
            try:
                result = self.body(*values)
            except UffuncsError:
                raise
            except (ArithmeticError, ValueError):  # single values divide by zero, whatever the rest
                return np.nan
            if self.record.result_by:
                return self.record.result_quantity(values).from_si(result)
            return (result - self.offset) / self.scale if self.offset else result / self.scale

    # --- functions that take whole ranges, or give a block -------------------------------------------------------

    def _with_columns(self, cells: Sequence):
        columns = self._read_columns(cells)
        ranges = [i for i, cell in enumerate(cells) if i not in columns and type(cell) in RANGES]
        if self.record.block:
            values = self._values(cells[:ranges[0]] if ranges else cells, columns)  # an earlier argument's error comes first
            if ranges:
                raise InvalidInput(f"{self.name}: {self.record.arguments[ranges[0]].name} takes one cell, not a range")
            return self.table(values)
        if ranges:
            return self.block([None if i in columns else cell for i, cell in enumerate(cells)], columns)
        return self.scalar(self._values(cells, columns))

    def _read_columns(self, cells: Sequence) -> dict[int, np.ndarray]:
        """Whole ranges, flattened; rows in which every paired range is blank are left out."""
        given = {i: flattened(cells[i]) for i in self.columns if not (is_blank(cells[i]) and not self.record.arguments[i].required)}
        columns = {i: self.record.arguments[i].default for i in self.columns if i not in given}
        for group in _column_groups(self.record, given):
            lengths = {len(given[i]) for i in group}
            if len(lengths) > 1:
                names = ", ".join(f"{self.record.arguments[i].name} {len(given[i])}" for i in group)
                raise InvalidInput(f"{self.name}: the ranges need one length; cells: {names}")
            rows = [r for r in range(lengths.pop()) if not all(is_blank(given[i][r]) for i in group)]
            for i in group:
                argument, read = self.record.arguments[i], self.readers[i]
                column = [_column_cell(self.name, argument, read, given[i][r], r + 1) for r in rows]
                columns[i] = column if argument.kind == "labels" else np.array(column, float)
                if not rows:
                    raise InvalidInput(f"{self.name}: {argument.name} is blank; give a range of {argument.unit}")
        return columns

    def table(self, values: list) -> list[list]:
        """The block of a function that gives one."""
        try:
            with np.errstate(all="ignore"):
                columns = self.body(*values)
        except UffuncsError as error:
            raise type(error)(f"{self.name}: {error}") from None
        rows = max(len(c) if isinstance(c, RANGES) else 1 for c in columns)
        quantities = self.record.column_quantities(values)
        block = []
        for r in range(rows):
            row = []
            # More columns than declared repeat the last entry.
            for n, column in enumerate(columns):
                q = quantities[min(n, len(quantities) - 1)]
                value = column[r] if isinstance(column, RANGES) else column
                row.append(value if isinstance(value, str) else self._finite_or_error(q.from_si(float(value)), values))
            block.append(row)
        return block

    def _finite_or_error(self, value: float, values: list) -> float | ErrorValue:
        return value if math.isfinite(value) else ErrorValue("#NUM!", no_result_reason(self.record, values))


_NO_RESULT = ErrorValue("#NUM!")


def _column_groups(record: Function, given: dict[int, list]) -> list[list[int]]:
    """Paired ranges: neighbouring column arguments, split where the record says so."""
    groups: dict[str, list[int]] = {}
    for i in given:
        groups.setdefault(record.arguments[i].group, []).append(i)
    return list(groups.values())


def _check_count(record: Function | Tool, cells: Sequence):
    most = record.maximum_cells  # None: any number
    if most is not None and len(cells) > most:
        raise InvalidInput(f"{record.worksheet_name}: takes {most} arguments at most, got {len(cells)}")


def _column_cell(function: str, argument: Argument, read: Callable, cell: object, row: int):
    if is_blank(cell) and argument.kind != "labels":
        raise InvalidInput(f"{function}: {argument.name} is blank in row {row} of its range")
    try:
        return read(cell)
    except CellError:
        raise
    except UffuncsError as error:
        raise type(error)(f"{error} (row {row} of the range)") from None


def sanitized(value: object, name: str) -> object:
    """A tool's result as a cell may hold it; reasons name the tool."""
    if isinstance(value, (list, tuple)):
        return [[sanitized(v, name) for v in row] for row in value]
    if isinstance(value, ErrorValue):
        return value if not value.reason or value.reason.startswith("UF_") else ErrorValue(value.code, f"{name}: {value.reason}")
    if isinstance(value, str):
        return value
    number = float(value)
    return number if math.isfinite(number) else ErrorValue("#NUM!", f"{name}: no finite result")
