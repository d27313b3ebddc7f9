"""UF_SOLVE_FOR: round trip over the registry, and what it says where there is not one answer."""

import math

import pytest

from tests.examples import ELEMENTWISE, example, given_numbers
from uffuncs.cell import call
from uffuncs.errors import ErrorValue

ROUND_TRIPS = [(r, a) for r in ELEMENTWISE if not r.result_by for a in r.arguments if a.kind == "number"]


def solve(function, argument, target, *cells):
    return call("UF_SOLVE_FOR", [function, argument, target, *cells])


@pytest.mark.parametrize("record, argument", ROUND_TRIPS, ids=lambda p: getattr(p, "name", None) or p.worksheet_name)
def test_round_trip(record, argument):
    """The value found gives the target back; where there is no single value, the reason says why, and is right."""
    cells, name = example(record), record.worksheet_name
    i = record.argument_names.index(argument.name)
    target = call(name, cells)
    if not isinstance(target, float):
        return
    without = [*cells[:i], None, *cells[i + 1:]]
    found = solve(name, argument.name, target, *without)
    if isinstance(found, ErrorValue):
        reason = call("UF_WHY", ["UF_SOLVE_FOR", name, argument.name, target, *without])
        assert reason == found.reason and found.code == "#NUM!"
        assert any(words in reason for words in ("does not change", "is flat", "values of", "whole number", "gives a result")), reason
        if "gives a result" in reason:  # the example lies at the only point of the function's domain
            assert all(isinstance(call(name, [*cells[:i], cells[i] * f, *cells[i + 1:]]), ErrorValue) for f in (0.999999, 1.000001))
        if "does not change" in reason and cells[i] is not None:
            for other in (argument.quantity.low, argument.quantity.high):
                value = call(name, [*cells[:i], other, *cells[i + 1:]])
                assert isinstance(value, ErrorValue) or value == pytest.approx(target, rel=1e-9)
        return
    back = call(name, [*cells[:i], found, *cells[i + 1:]])
    assert back == pytest.approx(target, rel=1e-9, abs=1e-300)
    if cells[i] is not None and i in given_numbers(record, cells):
        nudged = call(name, [*cells[:i], min(cells[i] * (1 + 1e-6), argument.quantity.high), *cells[i + 1:]])
        sensitive = isinstance(nudged, float) and target and abs(nudged / target - 1) > 1e-9
        if sensitive:  # a function that hardly answers to an argument cannot give it back to ten digits
            slope = abs(nudged / target - 1) / 1e-6
            assert found == pytest.approx(cells[i], rel=max(1e-10, 1e-14 / slope * 10))


def test_most_round_trips_have_one_answer():
    single = sum(isinstance(solve(r.worksheet_name, a.name, call(r.worksheet_name, example(r)), *_without(r, a)), float)
                 for r, a in ROUND_TRIPS if isinstance(call(r.worksheet_name, example(r)), float))
    assert single > 0.8 * len(ROUND_TRIPS)


def _without(record, argument):
    cells = example(record)
    cells[record.argument_names.index(argument.name)] = None
    return cells


def test_ten_digits():
    assert solve("UF_FLUX_DARCY", "viscosity", 33.7, 1.3, None, 4.2e12) == pytest.approx(1.3 * 36e13 / 33.7 / 4.2e12, rel=1e-10)
    assert solve("UF_WATER_VISCOSITY", "temperature", 1.0016) == pytest.approx(20, abs=0.01)


def test_target_with_its_unit_and_ranges():
    in_gfd = solve("UF_FLUX_DARCY", "transmembrane_pressure", "20 gfd", None, 1, 5e12)
    assert in_gfd == pytest.approx(20 * 1.6977430556 / 72, rel=1e-9)
    assert solve("UF_FLUX_DARCY", "transmembrane_pressure", "20 m", None, 1, 5e12).code == "#VALUE!"
    block = solve("UF_FLUX_DARCY", "transmembrane_pressure", [[72], [144]], None, [[1, 2]], 5e12)
    assert block == [[pytest.approx(1), pytest.approx(2)], [pytest.approx(2), pytest.approx(4)]]
    mixed = solve("UF_FLUX_DARCY", "viscosity", [[72], [-1], ["x"]], 1, None, 5e12)
    assert mixed[0][0] == pytest.approx(1) and [row[0].code for row in mixed[1:]] == ["#NUM!", "#VALUE!"]


def test_the_unknown_may_be_left_off_at_the_end():
    assert solve("UF_RESISTANCE_FROM_PERMEABILITY", "permeability", 5e12, None, 1) == pytest.approx(72)
    assert solve("UF_FLUX_DARCY", "membrane_resistance", 72, 1, 1) == pytest.approx(5e12)


@pytest.mark.parametrize("cells, code, words", [
    (("UF_FLUX_DARCY", "viscosity", -5, 1, None, 5e12), "#NUM!", "no viscosity within 0.01 to 1e+06 mPa·s gives -5 L/(m²·h)"),
    (("UF_WATER_DENSITY", "temperature", 999.9), "#NUM!", "2 values of temperature"),
    (("UF_FLUX_DARCY", "reflection_coefficient", 72, 1, 1, 5e12), "#NUM!", "does not change"),
    (("UF_FLUX_DARCY", "viscosity", 72, 1, 1, 5e12), "#VALUE!", "leave viscosity blank"),
    (("UF_FLUX_DARCY", "visc", 72, 1, None, 5e12), "#N/A", "viscosity"),
    (("UF_FLUX_DARCI", "viscosity", 72, 1, None, 5e12), "#N/A", "UF_FLUX_DARCY"),
    (("UF_FLUX_DARCY", "viscosity", None, 1, None, 5e12), "#VALUE!", "blank"),
    (("UF_FLUX_DARCY", "viscosity", 72, -1, None, 5e12), "#NUM!", "0 to 200 bar"),
    (("UF_FLUX_DARCY", "viscosity", 72, ErrorValue("#REF!"), None, 5e12), "#REF!", ""),
    (("UF_RESISTANCE_STEPS", "clean_flux", 72, None, 10, 20, 30, 1), "#VALUE!", "no single number"),
    (("UF_CONVERT", "value", 72), "#VALUE!", "no single number"),
    (("UF_VISCOSITY_RATIO", "rule", 1, 20), "#N/A", "temperature"),
    (("UF_FLUX_DARCY", "viscosity", 72, [[1], [2]], None, [[1e12], [2e12], [3e12]]), "#VALUE!", "shape"),
])
def test_what_has_no_single_answer(cells, code, words, why):
    result = call("UF_SOLVE_FOR", cells)
    assert result.code == code and words in result.reason
    assert words in why("UF_SOLVE_FOR", *cells)


def test_the_reason_gives_the_values_at_the_bounds(why):
    reason = why("UF_SOLVE_FOR", "UF_FLUX_DARCY", "viscosity", -5, 1, None, 5e12)
    assert "7200 L/(m²·h) at 0.01 mPa·s" in reason and "at 1e+06 mPa·s" in reason


def test_cautions_of_the_function_at_the_solution(why):
    assert why("UF_SOLVE_FOR", "UF_WATER_VISCOSITY", "temperature", 0.2).startswith("caution: temperature")
    assert why("UF_SOLVE_FOR", "UF_WATER_VISCOSITY", "temperature", 1.0) == "ok"


def test_whole_numbers_name_their_neighbours(why):
    reason = why("UF_SOLVE_FOR", "UF_STAGES_AREA", "stages", 100, 10, 5, 50, None, 50, 200)
    assert "no whole number stages gives 100 m²" in reason and reason.count("m²") == 3
    area = call("UF_STAGES_AREA", [10, 5, 50, 3, 50, 200])
    assert solve("UF_STAGES_AREA", "stages", area, 10, 5, 50, None, 50, 200) == 3


def test_any_case():
    assert call("uf_solve_for", ["uf_flux_darcy", "VISCOSITY", 72, 1, None, 5e12]) == pytest.approx(1)


@pytest.mark.filterwarnings("ignore::RuntimeWarning")
def test_the_search_itself():
    """Poles, jumps, edges of the domain, roots at a bound."""
    from uffuncs.errors import NoResult
    from uffuncs.quantities import Quantity
    from uffuncs.tools.solving import find_root

    import numpy as np

    def q(low, high, whole=False):
        return Quantity("x", "x", "-", low, high, "X", whole=whole)

    shown = "{:.3g}".format
    assert find_root(lambda x: x * x, 2.0, q(0, 10), shown) == pytest.approx(math.sqrt(2), rel=1e-14)
    assert find_root(lambda x: np.log(x), -30.0, q(0, 10), shown) == pytest.approx(math.exp(-30), rel=1e-10)
    assert find_root(lambda x: np.sqrt(x - 3), 1e-4, q(0, 1000), shown) == pytest.approx(3 + 1e-8, rel=1e-12), "close to the edge of the domain"
    assert find_root(lambda x: x, 0.0, q(0, 10), shown) == 0
    assert find_root(lambda x: x, 10.0, q(0, 10), shown) == 10
    assert find_root(lambda x: x**3, -8.0, q(-10, 10), shown) == pytest.approx(-2)
    assert find_root(lambda x: 3.0 * x, 21.0, q(1, 1e9, whole=True), shown) == 7
    for f, target, bounds, words in (
        (lambda x: np.divide(1, np.asarray(x) - 3.0), 0.0, (0, 10), "no x"),  # a pole is no root
        (lambda x: np.floor(x), 2.5, (0, 10), "no x"),  # nor is a jump
        (lambda x: np.sin(x), 0.5, (0, 10), "values of x"),
        (lambda x: np.minimum(x, 1.0), 1.0, (0, 10), "flat"),
        (lambda x: 0 * x + 5.0, 5.0, (0, 10), "does not change"),
        (lambda x: x * math.nan, 5.0, (0, 10), "gives a result"),
    ):
        with np.errstate(all="ignore"), pytest.raises(NoResult, match=words):
            find_root(f, target, q(*bounds), shown)
    with pytest.raises(NoResult, match="whole number"):
        find_root(lambda x: 3.0 * x, 20.0, q(1, 1e9, whole=True), shown)
