"""The cell contract, line by line."""

import math

import numpy as np
import pytest
from tests.compare import same
from hypothesis import given
from hypothesis import strategies as st

from uffuncs.cell import call
from uffuncs.errors import ERROR_CODES, ErrorValue

DARCY = "UF_FLUX_DARCY"


def darcy(p, *rest):
    return call(DARCY, [p, *(rest or (1, 5e12))])


def test_numbers_and_unit_texts():
    assert darcy(1) == pytest.approx(72)
    assert darcy("1 bar") == darcy("1bar") == darcy(" 1  bar ") == darcy("1") == darcy("+1.0e0") == darcy(1)
    assert darcy("14.503773773 psi") == pytest.approx(72, rel=1e-9)
    assert darcy("1 barg") == darcy(1)
    assert darcy(1, "1 cP", "5e12 1/m") == darcy(1)


@pytest.mark.parametrize("text", ["1,5 bar", "1,5", "1'000", "1 000", "one bar", "bar", "1 bar 2", "--1", "1e", "TRUE", "0x10", "nan", "inf", "#NUM!", "1 ± 0.1 bar", "1 .. 2 bar"])
def test_other_text_is_a_value_error(text):
    assert darcy(text).code == "#VALUE!"
    assert "transmembrane_pressure" in darcy(text).reason


@pytest.mark.parametrize("cell, code, words", [
    (None, "#VALUE!", "is blank"), ("", "#VALUE!", "is blank"), ("   ", "#VALUE!", "is blank"), (True, "#VALUE!", "TRUE"), (False, "#VALUE!", "FALSE"),
    (-1, "#NUM!", "0 to 200 bar; got -1"), (201, "#NUM!", "0 to 200 bar"), (float("nan"), "#NUM!", "nan"), (float("inf"), "#NUM!", "inf"),
    (10**400, "#NUM!", "0 to 200"), ("-1 psi", "#NUM!", "'-1 psi'"), ("2 bara", "#VALUE!", "absolute"), ("2 m", "#VALUE!", "does not fit"),
    ("2 barrr", "#VALUE!", "unknown"), (object(), "#VALUE!", "not a cell value"), (3j, "#VALUE!", "not a cell value"), ({}, "#VALUE!", "not a cell value"),
])
def test_bad_input_gives_an_error_value_and_its_reason(cell, code, words, why):
    result = darcy(cell)
    assert result.code == code and words in result.reason
    assert DARCY in result.reason and "transmembrane_pressure" in result.reason and len(result.reason) <= 255
    assert why(DARCY, cell, 1, 5e12) == result.reason


@pytest.mark.parametrize("code", ERROR_CODES)
def test_an_error_cell_comes_out_as_it_went_in(code):
    assert darcy(ErrorValue(code)).code == code
    assert darcy([[1], [ErrorValue(code)]])[1][0].code == code


def test_defaults():
    assert call(DARCY, [1, 1, 5e12, None, "", None]) == darcy(1)
    assert call(DARCY, [1, 1, 5e12, 5e12]) == pytest.approx(36)
    assert call("UF_TRANSMEMBRANE_PRESSURE", [3]) == 3
    assert call("UF_TRANSMEMBRANE_PRESSURE", [3, None, 1]) == 2


def test_ranges_are_elementwise_and_an_error_stays_in_its_place():
    block = darcy([[1], ["2 bar"], [None], ["x"], [-1], [True], [ErrorValue("#DIV/0!")], [4]])
    assert [getattr(row[0], "code", row[0]) for row in block][2:7] == ["#VALUE!", "#VALUE!", "#NUM!", "#VALUE!", "#DIV/0!"]
    assert [row[0] for row in block if isinstance(row[0], float)] == pytest.approx([72, 144, 288])


def test_blank_elements_of_an_optional_range_take_the_default():
    assert call(DARCY, [1, 1, 5e12, [[5e12], [None]]]) == [[pytest.approx(36)], [pytest.approx(72)]]


def test_a_blank_takes_a_default_that_the_function_works_out(why):
    cells = [[[2], [2], ["x"]], [[1], [None], [1]]]
    block = call("UF_TRANSMEMBRANE_PRESSURE", cells)
    assert block[:2] == [[1.5], [2.0]] and block[2][0].code == "#VALUE!"
    assert [row[0][:2] for row in why("UF_TRANSMEMBRANE_PRESSURE", *cells)] == ["ok", "ok", "UF"]


def test_an_error_cell_is_named_in_the_reason(why):
    assert why("UF_FLUX_DARCY", 1, ErrorValue("#DIV/0!"), 5e12) == "UF_FLUX_DARCY: viscosity is the error value #DIV/0!"
    assert "viscosity is outside" in why("UF_FLUX_DARCY", 1, ErrorValue("#NUM!", "the viscosity is outside"), 5e12)


def test_no_negative_zero():
    assert str(call("UF_DIAVOLUMES", [1])) == "0.0"


def test_broadcasting():
    assert darcy([[1], [2]], [[1, 2, 4]], 5e12) == [[pytest.approx(72 * p / m) for m in (1, 2, 4)] for p in (1, 2)]
    assert darcy([[1]]) == darcy(1), "a range of one cell counts as that cell"
    assert darcy(((1,), (2,))) == darcy([[1], [2]])
    error = darcy([[1], [2]], [[1], [2], [3]], 5e12)
    assert error.code == "#VALUE!" and "2×1" in error.reason and "3×1" in error.reason


def test_an_error_in_a_single_argument_fills_the_block():
    block = darcy([[1], [2]], -1, 5e12)
    assert [[v.code for v in row] for row in block] == [["#NUM!"], ["#NUM!"]]


def test_the_first_argument_in_error_wins():
    assert darcy("x", -1, 5e12).code == "#VALUE!"
    assert darcy(-1, "x", 5e12).code == "#NUM!"
    assert darcy([["x"]] * 2, [[-1]] * 2, 5e12)[0][0].code == "#VALUE!"


def test_a_result_that_is_not_finite_is_an_error_with_its_reason(why):
    assert call("UF_RESISTANCE_TOTAL", [0, 1, 1]).code == "#NUM!"
    assert "flux is 0" in why("UF_RESISTANCE_TOTAL", 0, 1, 1)
    block = call("UF_RESISTANCE_TOTAL", [[[0], [10]], 1, 1])
    assert block[0][0].code == "#NUM!" and isinstance(block[1][0], float)
    assert call("UF_PERMEABILITY_MEASURED", [10, 0, 20]).code == "#NUM!"
    assert "transmembrane_pressure is 0" in why("UF_PERMEABILITY_MEASURED", 10, 0, 20)


def test_choices():
    assert call("UF_VISCOSITY_RATIO", [5, 20, "CUBIC "]) == call("UF_VISCOSITY_RATIO", [5, 20, "cubic"])
    assert call("UF_VISCOSITY_RATIO", [5, 20, 1.03]) == call("UF_VISCOSITY_RATIO", [5, 20, "1.03"])
    assert "one of: viscosity" in call("UF_VISCOSITY_RATIO", [5, 20, "arrhenius"]).reason
    assert call("UF_VISCOSITY_RATIO", [5, 20, True]).code == "#VALUE!"
    block = call("UF_VISCOSITY_RATIO", [[[5], [10], [15]], 20, [["viscosity"], ["1.024"], ["nonsense"]]])
    assert block[0][0] == call("UF_VISCOSITY_RATIO", [5]) and block[1][0] == pytest.approx(1.024**10) and block[2][0].code == "#VALUE!"


def test_names_and_counts(why):
    assert call("uf_flux_darcy", [1, 1, 5e12]) == darcy(1)
    assert call("UF_NOTHING", [1]).code == "#N/A"
    assert "7 arguments at most" in call(DARCY, [1] * 8).reason
    assert call(DARCY, []).code == "#VALUE!"


def test_results_are_plain():
    for value in (darcy(np.float64(1.0)), darcy(np.int64(1)), darcy(1)):
        assert type(value) is float
    assert {type(v) for row in darcy([[1, 2], [3, 4]]) for v in row} == {float}


def test_large_range_in_pieces():
    p = np.linspace(0.1, 10, 40_001)
    block = darcy([[v] for v in p.tolist()])
    assert len(block) == 40_001
    assert same([block[0][0], block[20_000][0], block[-1][0]], [72 * p[0], 72 * p[20_000], 72 * p[-1]], 1e-12)


def test_ragged_and_empty_ranges():
    assert darcy([[1, 2], [3]])[1][1].code == "#VALUE!"
    assert darcy([]).code == "#VALUE!"


CELL = st.one_of(st.none(), st.booleans(), st.floats(), st.integers(), st.text(max_size=12), st.sampled_from(
    [ErrorValue("#N/A"), "1 bar", "35 psi", "85 %", "2,5", "1e400 bar", "5e12", "#REF!"]))
RANGE = st.lists(st.lists(CELL, min_size=1, max_size=3), min_size=1, max_size=3)


@given(st.lists(st.one_of(CELL, RANGE), max_size=9))
def test_whatever_comes_in_a_cell_value_comes_out(cells):
    def sound(v):
        return (type(v) is float and math.isfinite(v)) or type(v) is str or isinstance(v, ErrorValue)

    for name in (DARCY, "UF_RESISTANCE_STEPS", "UF_VISCOSITY_RATIO", "UF_WHY", "UF_CONVERT"):
        result = call(name, cells)
        assert all(sound(v) for row in result for v in row) if isinstance(result, list) else sound(result)
