"""Values on their way in and out: needs neither xlwings nor Excel."""

from __future__ import annotations

import datetime
from decimal import Decimal

import pytest

from uffuncs.errors import ERROR_CODES, ErrorValue
from uffuncs.excel.adapter import ERROR_NUMBERS, LONGEST_CELL, MARK, incoming, outgoing


def test_every_error_value_has_a_number():
    assert set(ERROR_NUMBERS) == set(ERROR_CODES)


@pytest.mark.parametrize("value", [1.5, "text", "", True, None])
def test_plain_values_stay(value):
    assert incoming(value) is value
    assert incoming(((value, value),)) == ((value, value),)


@pytest.mark.parametrize(
    "value, expected",
    [
        (-2146826281, ErrorValue("#DIV/0!")),
        (-2146826246, ErrorValue("#N/A")),
        (-2146826259, ErrorValue("#NAME?")),
        (-2146826288, ErrorValue("#NULL!")),
        (-2146826252, ErrorValue("#NUM!")),
        (-2146826265, ErrorValue("#REF!")),
        (-2146826273, ErrorValue("#VALUE!")),
        (-2146826243, ErrorValue("#SPILL!")),
        (-2146826238, ErrorValue("#CALC!")),
        (-2146826245, ErrorValue("#VALUE!")),  # #GETTING_DATA, which the contract has not
        (-2147352572, None),
        (3, 3.0),
        (-3, -3.0),
        (Decimal("12.5"), 12.5),
        (datetime.datetime(2024, 3, 1, 12), 45352.5),
        (datetime.datetime(2024, 3, 1, 12, tzinfo=datetime.UTC), 45352.5),
    ],
)
def test_values_that_excel_spells_in_its_own_way(value, expected):
    found = incoming(value)
    assert found == expected and type(found) is type(expected)
    assert incoming(((value,), (1.0,))) == [[expected], [1.0]]


def test_an_unknown_kind_is_an_error_of_its_own_place():
    assert incoming(object()) == ErrorValue("#VALUE!")
    assert incoming(((1.0, object()),)) == [[1.0, ErrorValue("#VALUE!")]]


def test_a_row_of_one_dimension_is_a_row():
    assert incoming((1.0, 2.0)) == ((1.0, 2.0),)
    assert incoming((1.0, -2146826246)) == [[1.0, ErrorValue("#N/A")]]


def test_results():
    assert outgoing(1.5, MARK) == [[1.5]]
    assert outgoing("text", MARK) == [["text"]]
    assert outgoing(ErrorValue("#NUM!"), MARK) == [["\x01#NUM!"]]
    assert outgoing(ErrorValue("#NUM!"), "") == [["#NUM!"]]
    assert outgoing([[1.0, ErrorValue("#N/A")], ["a", 2.0]], MARK) == [[1.0, "\x01#N/A"], ["a", 2.0]]


def test_a_text_cannot_be_taken_for_an_error():
    assert outgoing("#NUM!", MARK) == [["#NUM!"]]
    assert outgoing(MARK + "#NUM!", MARK) == [["#NUM!"]]


def test_texts_longer_than_a_cell():
    assert outgoing("x" * LONGEST_CELL, MARK) == [["x" * LONGEST_CELL]]
    assert outgoing("x" * (LONGEST_CELL + 1), MARK) == [["\x01#VALUE!"]]
