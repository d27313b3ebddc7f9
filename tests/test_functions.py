"""What holds for every function of the registry, whatever it computes. The arguments are those of its first published value."""

from __future__ import annotations

import math
import sys

import numpy as np
import pytest

from tests.compare import same
from tests.examples import ELEMENTWISE, FUNCTIONS, example, given_numbers
from uffuncs.cell import call, compile_function
from uffuncs.declaration import Function
from uffuncs.errors import ErrorValue

NUMERIC = [(r, a) for r in FUNCTIONS for a in r.arguments if a.kind == "number"]


def by_name(record):
    return record.worksheet_name


def by_argument(pair):
    return pair.name if hasattr(pair, "name") else pair.worksheet_name


@pytest.mark.parametrize("record", ELEMENTWISE, ids=by_name)
def test_ranges_equal_the_scalar_loop(record):
    cells = example(record)
    numbers = [i for i in given_numbers(record, cells) if not record.arguments[i].quantity.whole]
    factors = [(1 + 0.003 * math.sin(7 * r + 3 * i)) for r in range(5) for i in range(len(cells))]
    rows = []
    for r in range(5):
        row = list(cells)
        for i in numbers:
            row[i] = _inside(record.arguments[i].quantity, cells[i] * factors[r * len(cells) + i])
        rows.append(row)
    block = call(record.worksheet_name, [[[row[i]] for row in rows] if i in numbers else cells[i] for i in range(len(cells))])
    if not numbers:
        return
    loop = [[call(record.worksheet_name, row)] for row in rows]
    assert same(block, loop, 1e-10), (block, loop)
    assert any(isinstance(row[0], float) for row in block)


def _inside(quantity, value):
    return min(max(value, quantity.low), quantity.high)


@pytest.mark.parametrize("record", ELEMENTWISE, ids=by_name)
def test_broadcasting_like_numpy(record):
    cells = example(record)
    numbers = given_numbers(record, cells)
    if len(numbers) < 2:
        return
    expected = call(record.worksheet_name, cells)
    i, j = numbers[:2]
    grid = list(cells)
    grid[i], grid[j] = [[cells[i]]] * 3, [[cells[j]] * 2]
    block = call(record.worksheet_name, grid)
    assert len(block) == 3 and all(len(row) == 2 for row in block)
    assert all(same(v, expected, 1e-10) for row in block for v in row)


@pytest.mark.parametrize("record", ELEMENTWISE, ids=by_name)
def test_the_python_function_takes_arrays(record):
    cells = example(record)
    compiled = compile_function(record.worksheet_name)
    if compiled.columns:
        return
    values = [read(c) for read, c in zip(compiled.readers, cells)]
    numbers = given_numbers(record, cells)
    if not numbers:
        return
    scalar = record.python(*values)
    array = record.python(*[np.full((2, 3), v) if i in numbers else v for i, v in enumerate(values)])
    assert np.shape(array) == (2, 3)
    assert np.allclose(array, scalar, rtol=1e-10, atol=0)


@pytest.mark.parametrize("record, argument", NUMERIC, ids=by_argument)
def test_each_bound_is_refused_with_its_reason(record, argument):
    cells = example(record)
    i = record.argument_names.index(argument.name)
    q = argument.quantity
    for outside in (q.low - 0.01 * max(abs(q.low), 1e-9) - (1 if q.whole else 0), q.high * 1.01 + (1 if q.whole else 0)):
        result = call(record.worksheet_name, [*cells[:i], outside, *cells[i + 1:]])
        assert isinstance(result, ErrorValue) and result.code == "#NUM!", (outside, result)
        assert argument.name in result.reason and f"{q.low:g} to {q.high:g}" in result.reason


@pytest.mark.parametrize("record, argument", NUMERIC, ids=by_argument)
def test_cells_that_are_no_numbers(record, argument):
    cells = example(record)
    i = record.argument_names.index(argument.name)
    if argument.required:
        assert call(record.worksheet_name, [*cells[:i], None, *cells[i + 1:]]).code == "#VALUE!"
        assert "blank" in call(record.worksheet_name, [*cells[:i], "", *cells[i + 1:]]).reason
    for bad, code in ((True, "#VALUE!"), ("some text", "#VALUE!"), ("2,5", "#VALUE!"), ("1 mol**3", "#VALUE!"),
                      (float("nan"), "#NUM!"), (ErrorValue("#DIV/0!"), "#DIV/0!"), (ErrorValue("#N/A"), "#N/A")):
        result = call(record.worksheet_name, [*cells[:i], bad, *cells[i + 1:]])
        assert isinstance(result, ErrorValue) and result.code == code, (bad, result)
        assert argument.name in result.reason or isinstance(bad, ErrorValue)


@pytest.mark.parametrize("record, argument", NUMERIC, ids=by_argument)
def test_a_text_in_the_worksheet_unit_is_the_number(record, argument):
    cells = example(record)
    i = record.argument_names.index(argument.name)
    if cells[i] is None:
        return
    expected = call(record.worksheet_name, cells)
    for text in (f"{cells[i]!r} {argument.unit}" if argument.unit != "-" else f"{cells[i]!r}", f"  {cells[i]!r}"):
        assert same(call(record.worksheet_name, [*cells[:i], text, *cells[i + 1:]]), expected, 1e-10), text


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_omitted_blank_and_empty_are_one(record):
    cells = example(record)
    expected = call(record.worksheet_name, cells)
    given = len(cells)
    while given and cells[given - 1] is None:
        given -= 1
    assert same(call(record.worksheet_name, cells[:given]), expected)
    assert same(call(record.worksheet_name, ["" if c is None else c for c in cells]), expected)


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_too_many_arguments(record):
    result = call(record.worksheet_name, [*example(record), 1.0])
    assert result.code == "#VALUE!" and "arguments at most" in result.reason


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_why_answers_with_text(record):
    answer = call("UF_WHY", [record.worksheet_name, *example(record)])
    assert isinstance(answer, str) and answer.startswith(("ok", "caution: ")), answer
    assert not answer.endswith("…"), "what is said must fit into a cell's note"
    refused = call("UF_WHY", [record.worksheet_name])
    assert record.worksheet_name in refused if record.minimum_cells else True


@pytest.mark.parametrize("record", FUNCTIONS, ids=by_name)
def test_source_and_arguments(record):
    source = call("UF_SOURCE", [record.worksheet_name])
    assert record.equation in source and record.source in source
    rows = call("UF_ARGUMENTS", [record.worksheet_name])
    assert [row[0] for row in rows] == list(record.argument_names) and all(len(row) == 6 for row in rows)


# --- dimensions: bodies run on quantities with units ---------------------------------------------------------------

CONSTANTS = {"GAS_CONSTANT": "J/(mol·K)", "BOLTZMANN_CONSTANT": "J/K", "AVOGADRO_CONSTANT": "1/mol", "STANDARD_ATMOSPHERE": "Pa"}
#: Correlations in units of their own: within other bodies they take and give what they declare.
CORRELATIONS = {r.python: r for r in FUNCTIONS if r.dimensional and not r.block and not r.result_by}


@pytest.mark.parametrize("record", [r for r in FUNCTIONS if not r.dimensional and not r.result_by], ids=by_name)
def test_dimensions(record, monkeypatch):
    """A body run on pint quantities gives the unit that its declaration says."""
    from uffuncs.units import _plain, _registry

    registry = _registry()

    def with_unit(value, si_unit):
        return registry.Quantity(value, _plain(si_unit.replace("ⁿ", "")))

    module = sys.modules[record.python.__module__]
    for name, unit in CONSTANTS.items():
        if hasattr(module, name):
            monkeypatch.setattr(module, name, with_unit(getattr(module, name), unit))
    for name, correlation in [(n, f) for n, f in vars(module).items() if callable(f) and f in CORRELATIONS and f is not record.python]:
        monkeypatch.setattr(module, name, lambda *values, f=correlation: with_unit(
            f(*(getattr(v, "magnitude", v) for v in values)), CORRELATIONS[f].results[0].si_unit))
    values = compile_function(record.worksheet_name).si_values(example(record))
    quantities = [with_unit(v, a.quantity.si_unit) if a.quantity is not None and v is not None else v
                  for a, v in zip(record.arguments, values)]
    results = record.python(*quantities)
    for q, result in zip(record.results, results if record.block else [results]):
        unit = registry.Unit(_plain(q.si_unit))
        for value in result if isinstance(result, list) else [result]:
            found = registry.Quantity(1, getattr(value, "units", "dimensionless"))
            assert found.is_compatible_with(unit), (q.name, value)
            assert np.all(np.isfinite(np.asarray(getattr(value, "magnitude", value))))


@pytest.mark.parametrize("record", [r for r in FUNCTIONS if r.dimensional], ids=by_name)
def test_why_a_body_is_not_run_on_quantities_is_said(record):
    assert len(record.dimensional) > 10


#: Reasons that speak of constants with a unit; all other bodies only compute in plain numbers.
UNITS_OF_THEIR_OWN = ("own units", "unit of the", "table of values", "from a table", "bound water", "per year", "normal integral", "molar mass")
#: Other sizes for the base units, prime to one another, so that no two dimensions stand for each other.
FACTORS = {"[length]": 1.7, "[mass]": 2.3, "[time]": 1.3, "[temperature]": 1.9, "[substance]": 3.1, "[money]": 2.9}


def factor(si_unit: str) -> float:
    from uffuncs.units import _plain, _registry

    dimensions = _registry().Unit(_plain(si_unit)).dimensionality
    return math.prod(FACTORS[name] ** power for name, power in dimensions.items())


def in_plain_numbers(record: Function) -> bool:
    units = [a.quantity.si_unit for a in record.arguments if a.quantity]
    return bool(record.dimensional) and not any(w in record.dimensional for w in UNITS_OF_THEIR_OWN) and "ⁿ" not in "".join(units)


@pytest.mark.parametrize("record", [r for r in FUNCTIONS if in_plain_numbers(r)], ids=by_name)
def test_bodies_in_plain_numbers_are_sound_in_dimension(record):
    """Measured in other base units, the arguments give the same result in these units."""
    values = compile_function(record.worksheet_name).si_values(example(record))
    scaled = [v if a.quantity is None or v is None else v * factor(a.quantity.si_unit) for a, v in zip(record.arguments, values)]
    with np.errstate(all="ignore"):
        plain, other = record.python(*values), record.python(*scaled)
    results = record.column_quantities(values) if record.block else record.results
    for n, (a, b) in enumerate(zip(plain, other) if record.block else [(plain, other)]):
        if isinstance(a, list) and a and isinstance(a[0], str):
            assert a == b
            continue
        expected = np.asarray(a, float) * factor(results[min(n, len(results) - 1)].si_unit)
        assert np.asarray(b, float) == pytest.approx(expected, rel=1e-6, abs=1e-9 * float(np.max(np.abs(expected)))), results[min(n, len(results) - 1)].name
