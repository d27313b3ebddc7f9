"""UF_WHY, UF_SOURCE, UF_ARGUMENTS, UF_FUNCTIONS, UF_VERSION (UF_CONVERT: test_units.py)."""

import pytest

from uffuncs import __version__
from uffuncs.cell import call
from uffuncs.errors import ErrorValue
from uffuncs.registry import TOPICS, functions


def test_why_says_ok(why):
    assert why("UF_FLUX_DARCY", 1, 1, 5e12) == "ok"
    assert why("uf_flux_darcy", "1 bar", 1, 5e12) == "ok"


def test_why_names_argument_limit_unit_and_value(why):
    assert why("UF_FLUX_DARCY", 1, 1, 5) == "UF_FLUX_DARCY: membrane_resistance must be 1e+06 to 1e+18 1/m; got 5"


def test_why_cautions(why):
    assert why("UF_FLUX_DARCY", 1, 1, 5e12, "", "", 2).startswith("caution: the flux is negative")
    assert "outside -20 °C to 110 °C" in why("UF_WATER_VISCOSITY", 120)
    assert why("UF_WATER_VISCOSITY", 110) == "ok"
    assert "reciprocal" in why("UF_VISCOSITY_RATIO", 30)


def test_why_cautions_of_a_zero_where_the_default_is_another(why):
    assert "blank cell in Calc" in why("UF_FLUX_DARCY", 1, 1, 5e12, 0, 0, 0, 0)
    assert why("UF_FLUX_DARCY", 1, 1, 5e12, 0, 0, 0) == "ok"


def test_why_cautions_of_a_blank_temperature_and_of_an_absurd_result(why):
    assert "reference_temperature is exactly 0" in why("UF_VISCOSITY_RATIO", 25, 0)
    assert why("UF_OSMOTIC_VANT_HOFF", 50, 66, 0).startswith("caution: temperature is exactly 0")
    assert "lies outside" in why("UF_VISCOSITY_ROSS_MINTON", 330, 6, 0.5)


def test_why_of_a_range_is_a_block_of_texts(why):
    block = why("UF_FLUX_DARCY", [[1], ["x"], [-1]], 1, 5e12)
    assert block[0] == ["ok"] and "'x'" in block[1][0] and "0 to 200 bar" in block[2][0]
    grid = why("UF_FLUX_DARCY", [[1], [-1]], [[1, 0]], 5e12)
    assert [[text == "ok" for text in row] for row in grid] == [[True, False], [False, False]]


def test_why_of_shapes_that_do_not_fit(why):
    assert "shape" in why("UF_FLUX_DARCY", [[1], [2]], [[1], [2], [3]], 5e12)


@pytest.mark.parametrize("name, near", [("UF_FLUX_DARCI", "UF_FLUX_DARCY"), ("UF_WATR_DENSITY", "UF_WATER_DENSITY"), ("QQQ", "UF_FUNCTIONS")])
def test_why_of_an_unknown_name_lists_near_ones(name, near, why):
    assert near in why(name, 1)
    assert call("UF_SOURCE", [name]).code == "#N/A" and near in call("UF_SOURCE", [name]).reason
    assert call(name, []).code == "#N/A"


def test_tools_refuse_what_is_no_name():
    for tool in ("UF_SOURCE", "UF_ARGUMENTS"):
        assert call(tool, [5]).code == "#VALUE!"
        assert call(tool, [None]).code == "#VALUE!"
        assert call(tool, [ErrorValue("#REF!")]).code == "#REF!"


def test_why_explains_tools_too(why):
    assert why("UF_CONVERT", 1, "bar", "psi") == "ok"
    assert "different" in why("UF_CONVERT", 1, "bar", "m")


def test_arguments():
    rows = call("UF_ARGUMENTS", ["UF_VISCOSITY_RATIO"])
    assert rows[0] == ["temperature", "°C", -20.0, 150.0, "", "Temperature of the liquid at the membrane"]
    assert rows[1][4] == "20"
    assert rows[2][1] == "text" and "cubic" in rows[2][5]
    assert call("UF_ARGUMENTS", ["UF_VERSION"]).code == "#N/A"


def test_functions():
    rows = call("UF_FUNCTIONS", [])
    assert len(rows) == len(functions()) and all(len(row) == 3 for row in rows)
    for topic in TOPICS:
        assert call("UF_FUNCTIONS", [topic.upper()])
    assert call("UF_FUNCTIONS", ["watr"]).code == "#N/A"
    assert call("UF_FUNCTIONS", [3]).code == "#VALUE!"


def test_version():
    assert call("UF_VERSION", []) == __version__
