"""Ranges, element by element: one argument of a call as an array, with an error for each bad element."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import chain

import numpy as np

from .declaration import Argument
from .errors import ErrorValue, InvalidInput, UffuncsError
from .quantities import Quantity
from .reading import RANGES

#: Rows worked on at a time: the arrays of one piece stay in the processor's cache.
PIECE = 16384


class Grid:
    """One argument over a range: worksheet numbers (or texts), or one SI value for every element."""

    def __init__(self, values, shape: tuple[int, int], errors: dict[tuple[int, int], ErrorValue], single: bool, is_text=False):
        self.values, self.shape, self.errors, self.single, self.is_text = values, shape, errors, single, is_text

    def flat(self, shape: tuple[int, int]):
        if self.single:
            return self.values
        if self.shape == shape:
            return self.values.reshape(-1)
        return np.broadcast_to(self.values, shape).reshape(-1)

    def errors_in(self, shape: tuple[int, int]) -> dict[tuple[int, int], ErrorValue]:
        if not self.errors or self.shape == shape:
            return self.errors
        spread = {}
        for (i, j), error in self.errors.items():
            for r in range(shape[0]) if self.shape[0] == 1 else (i,):
                for c in range(shape[1]) if self.shape[1] == 1 else (j,):
                    spread[r, c] = error
        return spread


def grid(argument: Argument, read: Callable, cell: object) -> Grid:
    if type(cell) not in RANGES:
        try:
            return Grid(read(cell), (1, 1), {}, single=True)
        except UffuncsError as error:
            return Grid(np.full((1, 1), np.nan), (1, 1), {(0, 0): error.as_cell()}, single=False)
    q = argument.quantity
    if isinstance(cell, np.ndarray):
        numbers = np.atleast_2d(cell.astype(float, copy=False))
        numbers = numbers.T if cell.ndim == 1 else numbers
        if q is not None:
            return Grid(numbers, numbers.shape, _outside(read, numbers, q), single=False)
        cell = numbers.tolist()
    rows = cell if isinstance(cell[0], RANGES) else [cell]
    width = max(map(len, rows))
    if q is not None and all(len(r) == width for r in rows):
        if {float, int}.issuperset(map(type, chain.from_iterable(rows))):
            try:
                numbers = np.array(rows, float)
                return Grid(numbers, numbers.shape, _outside(read, numbers, q), single=False)
            except OverflowError:  # an integer too long for a float: told element by element
                pass
    return _mixed_grid(argument, read, rows, width)


def _mixed_grid(argument: Argument, read: Callable, rows: Sequence[Sequence], width: int) -> Grid:
    """A range with blanks, texts or errors among the numbers: read cell by cell."""
    q = argument.quantity
    values = np.full((len(rows), width), np.nan) if q is not None else np.full((len(rows), width), "", object)
    errors = {}
    for i, row in enumerate(rows):
        for j in range(width):
            try:
                value = read(row[j] if j < len(row) else None)
                values[i, j] = q.from_si(value) if q is not None else value
            except UffuncsError as error:
                errors[i, j] = error.as_cell()
    return Grid(values, values.shape, errors, single=False, is_text=q is None)


def _outside(read: Callable, numbers: np.ndarray, q: Quantity) -> dict[tuple[int, int], ErrorValue]:
    """The elements outside the bounds; the common case of none costs one pass, piece by piece."""
    flat = numbers.reshape(-1)
    pieces = (flat[start:start + PIECE] for start in range(0, flat.size, PIECE))
    if not q.whole and all(q.low <= p.min() and p.max() <= q.high for p in pieces):  # false where there is a NaN
        return {}
    bad = ~((numbers >= q.low) & (numbers <= q.high))
    if q.whole:
        bad |= numbers != np.floor(numbers)
    errors = {}
    for i, j in np.argwhere(bad):
        try:
            read(float(numbers[i, j]))
        except UffuncsError as error:
            errors[int(i), int(j)] = error.as_cell()
    return errors


def common_shape(shapes: Sequence[tuple[int, int]], names: Sequence[str] = ()) -> tuple[int, int]:
    """The shape that ranges are broadcast to.

    Raises
    ------
    InvalidInput
        They do not fit together; the reason gives the shape of each, with its name where there is one.
    """
    try:
        return np.broadcast_shapes(*shapes)
    except ValueError:
        labels = [f"{name} " for name in names] or [""] * len(shapes)
        shown = ", ".join(f"{label}{h}×{w}" for label, (h, w) in zip(labels, shapes) if (h, w) != (1, 1))
        raise InvalidInput(f"the ranges do not fit together in shape: {shown}") from None


def elements(cells: Sequence, whole=()) -> list[list[list]]:
    """The cells of each element of a broadcast call, as rows; `whole` places are passed as they are.

    Raises
    ------
    InvalidInput
        The ranges do not fit together in shape.
    """
    grids = []
    for i, value in enumerate(cells):
        rows = [list(row) for row in value] if isinstance(value, RANGES) and i not in whole else None
        height, width = (len(rows), max(map(len, rows))) if rows else (1, 1)
        cell_grid = np.empty((height, width), object)
        if rows is None:
            cell_grid[0, 0] = value
        for r, row in enumerate(rows or ()):
            for c in range(width):
                cell_grid[r, c] = row[c] if c < len(row) else None
        grids.append(cell_grid)
    rows, columns = common_shape([g.shape for g in grids])
    grids = np.broadcast_arrays(*grids)
    return [[[g[r, c] for g in grids] for c in range(columns)] for r in range(rows)]
