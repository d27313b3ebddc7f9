"""UF_UNCERTAINTY against the worked examples of JCGM 101:2008, the linear law, and its own rules."""

import math

import pytest

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, InvalidInput, NoResult
from uffuncs.tools.uncertainty import POINTS, Distribution, propagate

FREE = (-1e9, 1e9)
DARCY = "UF_FLUX_DARCY"


def normal(mean, u):
    return Distribution("normal", mean, u, *FREE)


def uniform(mean, u):
    half = math.sqrt(3) * u
    return Distribution("uniform", mean, u, mean - half, mean + half)


def total(*x):
    return sum(x)


# JCGM 101:2008, 9.2: an additive model of four quantities, printed results of the Monte Carlo method.
@pytest.mark.parametrize("place, inputs, u, interval", [
    ("9.2.2, normal", [normal(0, 1)] * 4, 2.00, 3.92),
    ("9.2.3, rectangular, the same width", [uniform(0, 1)] * 4, 2.00, 3.88),
    ("9.2.4, rectangular, different widths", [uniform(0, 1)] * 3 + [uniform(0, 10)], 10.1, 17.0),
])
def test_additive_model_of_jcgm_101(place, inputs, u, interval):
    result = propagate(total, inputs)
    half_digit = 0.005 if u < 10 else 0.05
    assert result.mean == pytest.approx(0, abs=1e-3)
    assert result.standard_uncertainty == pytest.approx(u, abs=half_digit)
    assert result.low == pytest.approx(-interval, abs=2 * half_digit)
    assert result.high == pytest.approx(interval, abs=2 * half_digit)


def test_comparison_loss_of_jcgm_101():
    """9.4.2.2, Table 6: δY = X1² + X2² at x1 = x2 = 0, u = 0.005, r = 0; printed 50e-6, 50e-6, [0, 150]e-6."""
    result = propagate(lambda a, b: a * a + b * b, [normal(0, 0.005), normal(0, 0.005)])
    assert result.mean == pytest.approx(50e-6, abs=0.5e-6)
    assert result.standard_uncertainty == pytest.approx(50e-6, abs=0.5e-6)
    # The probabilistically symmetric interval is that of the exponential distribution of mean 50e-6.
    assert result.low == pytest.approx(-50e-6 * math.log(0.975), rel=0.01)
    assert result.high == pytest.approx(-50e-6 * math.log(0.025), rel=0.01)


def test_shares_of_an_additive_model_are_those_of_the_variances():
    result = propagate(total, [normal(0, 1), uniform(5, 2), normal(1, 3)])
    assert result.shares == pytest.approx((1 / 14, 4 / 14, 9 / 14), rel=2e-3)
    assert sum(result.shares) == pytest.approx(1)


def test_a_nearly_linear_function_follows_the_law_of_propagation():
    """JCGM 100:2008, 5.1.2: relative variances of a product and quotient add."""
    row = call("UF_UNCERTAINTY", [DARCY, "2 ± 0.02 bar", "1 ± 0.5 % cP", "5e12 ± 1 % 1/m"])[0]
    relative = math.sqrt(0.01**2 + 0.005**2 + 0.01**2)
    assert row[0] == pytest.approx(144, rel=3e-4)
    assert row[1] == pytest.approx(144 * relative, rel=5e-3)
    assert (row[2], row[3]) == pytest.approx((144 * (1 - 1.96 * relative), 144 * (1 + 1.96 * relative)), rel=1e-3)
    assert row[4:7] == pytest.approx([0.01**2 / relative**2, 0.005**2 / relative**2, 0.01**2 / relative**2], rel=5e-3)
    assert row[7:] == [0, 0, 0, 0] and len(row) == 4 + 7


def test_the_same_digits_every_time():
    cells = [DARCY, "2 ± 0.1 bar", "0.9 .. 1.1 cP", 5e12]
    assert call("UF_UNCERTAINTY", cells) == call("UF_UNCERTAINTY", cells)
    assert POINTS & (POINTS - 1) == 0


@pytest.mark.parametrize("a, b", [
    ("2 ± 0.1 bar", "2 +/- 0.1 bar"), ("2 ± 0.1 bar", "2±0.1bar"), ("2 ± 5 % bar", "2 ± 0.1 bar"), ("2 ± 0.1", "2 ± 0.1 bar"),
    ("200 ± 10 kPa", "2 ± 0.1 bar"), ("1.8 .. 2.2 bar", "1.8..2.2"), ("2 ± 0.1 barg", "2 ± 0.1 bar"),
])
def test_spellings(a, b):
    first, second = (call("UF_UNCERTAINTY", [DARCY, text, 1, 5e12])[0] for text in (a, b))
    assert first == pytest.approx(second, rel=1e-12)


def test_a_temperature_keeps_its_zero_point_out_of_the_uncertainty():
    celsius = call("UF_UNCERTAINTY", ["UF_WATER_VISCOSITY", "25 ± 1 °C"])[0]
    fahrenheit = call("UF_UNCERTAINTY", ["UF_WATER_VISCOSITY", "77 ± 1.8 degF"])[0]
    assert celsius == pytest.approx(fahrenheit, rel=1e-9)
    assert celsius[1] == pytest.approx(0.0200, abs=5e-4)  # dµ/dT of water at 25 °C is about -2.2 % per kelvin


def test_per_cent_of_a_fraction(why):
    for text in ("50 % ± 5 %", "0.5 ± 0.05", call("UF_QUANTITY", [50, "%", 5])):
        row = call("UF_UNCERTAINTY", [DARCY, 2, 1, 5e12, 0, 0, 1, text])[0]
        assert row[0] == pytest.approx(108, rel=1e-3) and row[1] == pytest.approx(72 * 0.05, rel=1e-2)
    assert call("UF_UNCERTAINTY", [DARCY, 2, 1, 5e12, 0, 0, 1, "0.95 ± 2 %"]).code == "#VALUE!"
    assert "two ways" in why("UF_UNCERTAINTY", DARCY, 2, 1, 5e12, 0, 0, 1, "0.95 ± 2 %")


def test_an_uncertainty_of_zero_is_a_certain_value():
    row = call("UF_UNCERTAINTY", [DARCY, "2 ± 0 bar", "1 ± 0.1 cP", 5e12])[0]
    assert row[4] == 0 and row[5] == 1
    assert call("UF_UNCERTAINTY", [DARCY, "2.0 bar ± 0.1 bar", 1, 5e12]) == call("UF_UNCERTAINTY", [DARCY, "2.0 ± 0.1 bar", 1, 5e12])
    assert call("UF_UNCERTAINTY", [DARCY, "2.0 bar ± 5 %", 1, 5e12]) == call("UF_UNCERTAINTY", [DARCY, "2.0 ± 0.1 bar", 1, 5e12])


def test_the_function_s_own_cautions(why):
    assert "fitted" in why("UF_UNCERTAINTY", "UF_SHERWOOD_TURBULENT", "5000 ± 100", 1000)


def test_a_distribution_is_cut_off_at_the_bounds(why):
    row = call("UF_UNCERTAINTY", [DARCY, "0.1 ± 0.1 bar", 1, 5e12])[0]
    # Mean of a normal distribution cut off at 0 (Johnson, Kotz & Balakrishnan 1994): m + s·φ(1)/Φ(1), with m = s = 0.1.
    assert row[0] / 72 == pytest.approx(0.1 + 0.1 * 0.24197072 / 0.84134475, rel=1e-3)
    assert row[2] >= 0
    assert "16 % of transmembrane_pressure" in why("UF_UNCERTAINTY", DARCY, "0.1 ± 0.1 bar", 1, 5e12)
    assert why("UF_UNCERTAINTY", DARCY, "2 ± 0.1 bar", 1, 5e12) == "ok"
    assert "cut off" in why("UF_UNCERTAINTY", DARCY, "-1 .. 1 bar", 1, 5e12)


@pytest.mark.parametrize("cells, code, words", [
    ([DARCY, 2, 1, 5e12], "#VALUE!", "no argument is uncertain"),
    ([DARCY, "2 ± -0.1 bar", 1, 5e12], "#VALUE!", "negative"),
    ([DARCY, "2.2 .. 1.8 bar", 1, 5e12], "#VALUE!", "rise"),
    ([DARCY, "2 ± 0.1 m", 1, 5e12], "#VALUE!", "does not fit"),
    ([DARCY, "-2 ± 0.1 bar", 1, 5e12], "#NUM!", "0 to 200 bar"),
    ([DARCY, "300 .. 400 bar", 1, 5e12], "#NUM!", "0 to 200 bar"),
    ([DARCY, "2 ± 0.1 bar", -1, 5e12], "#NUM!", "viscosity"),
    ([DARCY, [["2 ± 0.1 bar"], [1]], 1, 5e12], "#VALUE!", "one cell"),
    (["UF_NOTHING", "2 ± 0.1 bar"], "#N/A", "no function"),
    (["UF_RESISTANCE_STEPS", "100 ± 1", 40, 60, 90, 1], "#VALUE!", "no single number"),
    ([DARCY, "2 ± 0.1 bar", ErrorValue("#REF!"), 5e12], "#REF!", ""),
])
def test_what_is_refused(cells, code, words, why):
    result = call("UF_UNCERTAINTY", cells)
    assert isinstance(result, ErrorValue) and result.code == code and words in result.reason
    assert words in why("UF_UNCERTAINTY", *cells)


def test_other_functions_point_to_this_one():
    assert "UF_UNCERTAINTY" in call(DARCY, ["2 ± 0.1 bar", 1, 5e12]).reason


def test_a_sample_without_results():
    with pytest.raises(NoResult, match="% of the sample"):
        propagate(lambda x: x * math.nan, [normal(0, 1)])
    with pytest.raises(InvalidInput):
        propagate(total, [])
    import numpy as np

    few = propagate(lambda x: np.where(x > 2, math.nan, x), [normal(0, 1)])
    assert few.lost == pytest.approx(0.02275, abs=1e-3)
