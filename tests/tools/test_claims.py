"""UF_CLAIM and UF_QUANTITY."""

import pytest

from uffuncs.cell import call
from uffuncs.errors import ErrorValue


def claim(*cells):
    return call("UF_CLAIM", cells)


@pytest.mark.parametrize("cells, verdict", [
    ((100, 100), "holds: +0.0 %"), ((109, 100), "holds: +9.0 %"), ((111, 100), "above: +11.0 %"), ((85, 100), "below: −15.0 %"),
    ((110, 100), "holds: +10.0 %"), ((85, 100, 0.1, "at most"), "holds: −15.0 %"), ((115, 100, 0.1, "at most"), "above: +15.0 %"),
    ((115, 100, 0.1, "At Least"), "holds: +15.0 %"), ((85, 100, 0.1, "at least"), "below: −15.0 %"), ((85, 100, "20 %"), "holds: −15.0 %"),
    ((0, 0), "holds: +0.0 %"), ((-90, -100), "holds: +10.0 %"), (("20 gfd", 34, 0.01, "", "LMH"), "holds: −0.1 %"),
    (("35 psi", "2.4132 bar", 0.001, "equal", "bar"), "holds: −0.0 %"), (("77 degF", 25, 0.001, "equal", "°C"), "holds: +0.0 %"),
    (("100", 100), "holds: +0.0 %"),
])
def test_verdict(cells, verdict):
    assert claim(*cells).replace("+0.0", "").replace("−0.0", "") == verdict.replace("+0.0", "").replace("−0.0", "")


def test_units_with_a_zero_point_and_gauge_pressures():
    assert claim("77 degF", 77, 0.1, "equal", "degF") == claim("25 degC", 77, 0.001, "equal", "degF") == "holds: +0.0 %"
    assert claim("30 psig", "2.0684 bar", 0.001, "equal", "barg") == "holds: +0.0 %"
    assert claim("30 psia", 2, 0.1, "equal", "barg").code == "#VALUE!"
    assert claim(float("nan"), 1).code == "#VALUE!"


def test_ranges():
    block = claim([[100], [120], [None], [True]], 100)
    assert block[0] == ["holds: +0.0 %"] and block[1] == ["above: +20.0 %"] and block[2][0].code == block[3][0].code == "#VALUE!"


@pytest.mark.parametrize("cells, code, words", [
    ((1, 0), "#NUM!", "is 0"), (("20 gfd", 30), "#VALUE!", "name a unit"), (("20 gfd", 30, 0.1, "equal", "bar"), "#VALUE!", "measure different things"),
    ((1, 1, -0.1), "#VALUE!", "0 to 10"), ((1, 1, 0.1, "roughly"), "#VALUE!", "one of"), ((1, 1, 0.1, "equal", "barz"), "#VALUE!", "unknown"),
    ((None, 1), "#VALUE!", "blank"), ((ErrorValue("#N/A"), 1), "#N/A", ""), (("about 5", 5), "#VALUE!", "not a number"),
])
def test_refused(cells, code, words, why):
    assert claim(*cells).code == code and words in claim(*cells).reason
    assert words in why("UF_CLAIM", *cells)


def test_quantity_is_read_back_the_same():
    text = call("UF_QUANTITY", [35.25, "psi"])
    assert text == "35.25 psi"
    assert call("UF_FLUX_DARCY", [text, 1, 5e12]) == call("UF_FLUX_DARCY", ["35.25 psi", 1, 5e12])
    assert call("UF_QUANTITY", [1e-7, "m²/s"]) == "1e-07 m²/s"
    uncertain = call("UF_QUANTITY", [2, "bar", 0.1])
    assert uncertain == "2.0 ± 0.1 bar"
    assert isinstance(call("UF_UNCERTAINTY", ["UF_FLUX_DARCY", uncertain, 1, 5e12]), list)
    assert call("UF_QUANTITY", [[[1], [2]], "bar"]) == [["1.0 bar"], ["2.0 bar"]]
    assert call("UF_QUANTITY", [0.85, "-"]) == "0.85 -"
    assert call("UF_QUANTITY", ["1.5", "barg"]) == "1.5 barg"


@pytest.mark.parametrize("cells", [(1, "barz"), (1, 5), (None, "bar"), (1, "bar", -1), (True, "bar"), ("1 bar", "bar"), (1, None)])
def test_quantity_refuses(cells):
    assert call("UF_QUANTITY", cells).code == "#VALUE!"
