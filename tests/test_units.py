"""Units: the table of worksheet units against pint, trade units against exact definitions, and what is refused."""

import subprocess
import sys
from pathlib import Path

import pytest

from uffuncs.cell import call
from uffuncs.errors import InvalidInput
from uffuncs.units import COMMON_UNITS, WORKSHEET_UNITS, _to_base, compile_unit, convert

GALLON, FOOT, INCH, POUND_FORCE, DAY = 3.785411784e-3, 0.3048, 0.0254, 4.4482216152605, 86400.0  # exact by definition
PSI = POUND_FORCE / INCH**2

# Exponents that stand for a number given elsewhere, and words: nothing that pint can read.
NOT_FOR_PINT = {u for u in WORKSHEET_UNITS if "ⁿ" in u} | {"g/g", "min/day", "h/day", "g·h/(L·year)", "%/min"}


@pytest.mark.parametrize("unit", sorted(set(WORKSHEET_UNITS) - NOT_FOR_PINT))
def test_worksheet_unit_is_what_pint_makes_of_it(unit):
    si, scale, offset = WORKSHEET_UNITS[unit]
    pint_scale, pint_offset = _to_base(unit)
    assert scale == pytest.approx(pint_scale / _to_base(si)[0], rel=1e-12)
    assert offset == pytest.approx(pint_offset, abs=1e-9)


@pytest.mark.parametrize("unit", sorted(COMMON_UNITS))
def test_common_unit_is_what_pint_makes_of_it(unit):
    si, scale, offset = COMMON_UNITS[unit]
    assert (scale, offset) == (pytest.approx(_to_base(unit)[0] / _to_base(si)[0], rel=1e-12), pytest.approx(_to_base(unit)[1], abs=1e-9))


def test_common_units_do_not_load_pint():
    code = ("import sys; from uffuncs.cell import call\n"
            "assert call('UF_FLUX_DARCY', ['35 psig', '1 cP', '5e12']) and call('UF_CONVERT', [1, 'gfd', 'LMH']) and call('UF_CLAIM', ['20 gfd', 34, .1, '', 'LMH'])\n"
            "assert 'pint' not in sys.modules")
    subprocess.run([sys.executable, "-c", code], check=True, cwd=Path(__file__).parents[1])


@pytest.mark.parametrize("unit, si, scale", [
    ("psi", "Pa", PSI), ("psig", "Pa", PSI), ("barg", "Pa", 1e5), ("bar(g)", "Pa", 1e5), ("kPa", "Pa", 1e3), ("mmHg", "Pa", 133.322387415),
    ("atm", "Pa", 101325.0), ("gfd", "m/s", GALLON / FOOT**2 / DAY), ("GFD", "m/s", GALLON / FOOT**2 / DAY),
    ("LMH", "m/s", 1e-3 / 3600), ("L/m2/h", "m/s", 1e-3 / 3600), ("L m-2 h-1", "m/s", 1e-3 / 3600), ("L·m⁻²·h⁻¹", "m/s", 1e-3 / 3600),
    ("gfd/psi", "m/(s·Pa)", GALLON / FOOT**2 / DAY / PSI), ("LMH/bar", "m/(s·Pa)", 1e-8 / 3600),
    ("cP", "Pa·s", 1e-3), ("P", "Pa·s", 0.1), ("gpm", "m³/s", GALLON / 60), ("MGD", "m³/s", 1e6 * GALLON / DAY), ("MLD", "m³/s", 1e3 / DAY),
    ("m3/h", "m³/s", 1 / 3600), ("L/min", "m³/s", 1e-3 / 60), ("kDa", "kg/mol", 1.0), ("Da", "kg/mol", 1e-3), ("g/mol", "kg/mol", 1e-3),
    ("mg/L", "kg/m³", 1e-3), ("g/dL", "kg/m³", 10.0), ("%", "-", 0.01), ("ft²", "m²", FOOT**2), ("ft2", "m²", FOOT**2), ("mil", "m", 25.4e-6), ("MDa", "kg/mol", 1e3),
    ("dyn/cm", "N/m", 1e-3), ("cm²/s", "m²/s", 1e-4), ("μm", "m", 1e-6), ("µm", "m", 1e-6), ("Å", "m", 1e-10), ("psi/min", "Pa/s", PSI / 60),
    ("atm/(g/L)^2", "Pa·m⁶/kg²", 101325.0), ("in", "m", INCH), ("L", "m³", 1e-3), ("gal", "m³", GALLON), ("day", "s", DAY), ("hp", "W", 745.69987158227022),
])
def test_trade_unit(unit, si, scale):
    found, offset = compile_unit(unit, si)
    assert found == pytest.approx(scale, rel=1e-12) and offset == 0


@pytest.mark.parametrize("text, kelvin", [("degF", 459.67 * 5 / 9), ("°F", 459.67 * 5 / 9), ("F", 459.67 * 5 / 9), ("C", 273.15), ("degC", 273.15), ("K", 0)])
def test_temperature_units_have_a_zero_point(text, kelvin):
    scale, offset = compile_unit(text, "K")
    assert scale == pytest.approx(5 / 9 if "F" in text else 1) and offset == pytest.approx(kelvin)


@pytest.mark.parametrize("unit, si", [
    ("m", "Pa"), ("bara", "Pa"), ("psia", "Pa"), ("psi absolute", "Pa"), ("furlongz", "m"), ("", "Pa"), ("bar bar", "Pa"), ("L", "m³/s"),
    ("gfd", "m/(s·Pa)"), ("degC", "Pa"), ("__import__('os')", "Pa"), ("m**999999", "m"), ("bar; import os", "Pa"), ("9**9**9", "-"),
    ("(((((", "m"), ("dB", "-"), ("kg", "m"), ("lambda", "-"), ("a" * 500, "m"), ("bar\n", "m"), ("degC/m", "K"),
])
def test_a_unit_that_does_not_fit_is_refused(unit, si):
    with pytest.raises(InvalidInput):
        compile_unit(unit, si)


@pytest.mark.parametrize("unit", ["psig", "barg", "bar(g)"])
def test_an_absolute_pressure_takes_no_gauge_unit(unit):
    with pytest.raises(InvalidInput, match="gauge"):
        compile_unit(unit, "Pa", absolute=True)
    assert compile_unit("psia", "Pa", absolute=True)[0] == pytest.approx(PSI)


def test_convert_cell():
    assert call("UF_CONVERT", [1, "gfd", "LMH"]) == pytest.approx(1.6977430556, rel=1e-10)
    assert call("UF_CONVERT", [1, "gfd/psi", "LMH/bar"]) == pytest.approx(24.6236812025, rel=1e-11)
    assert call("UF_CONVERT", [77, "degF", "degC"]) == 25
    assert call("UF_CONVERT", [-40, "degC", "degF"]) == -40
    assert call("UF_CONVERT", ["1", "gpm", "m3/h"]) == pytest.approx(0.22712470704, rel=1e-12)
    assert call("UF_CONVERT", [85, "%", "-"]) == pytest.approx(0.85)
    assert call("UF_CONVERT", [[[1], [None], [True]], "bar", "psi"])[0][0] == pytest.approx(1e5 / PSI)


@pytest.mark.parametrize("cells, word", [
    ([1, "bar", "m"], "different"), ([1, "bara", "barg"], "atmospheric"), ([1, "barx", "bar"], "unknown"), ([None, "bar", "bar"], "blank"),
    ([True, "bar", "bar"], "TRUE"), (["1 bar", "bar", "psi"], "unit"), ([1, 5, "bar"], "text"), ([1, "bar", None], "blank"),
])
def test_convert_refuses(cells, word, why):
    assert call("UF_CONVERT", cells).code == "#VALUE!"
    assert word in why("UF_CONVERT", *cells)


def test_convert_is_its_own_inverse():
    for pair in [("degF", "degC"), ("gfd", "LMH"), ("kDa", "g/mol"), ("MGD", "m³/h"), ("psi", "bar")]:
        assert convert(convert(12.5, *pair), *reversed(pair)) == pytest.approx(12.5, rel=1e-9)


@pytest.mark.parametrize("unit, si, scale", [
    ("bbl", "m³", 42 * GALLON), ("lmh", "m/s", 1e-3 / 3600), ("L/m2h", "m/s", 1e-3 / 3600), ("kg/cm2", "Pa", 98066.5), ("kg/cm²", "Pa", 98066.5),
    ("mH2O", "Pa", 9806.65), ("cmH2O", "Pa", 98.0665), ("inWC", "Pa", 249.08891), ("psid", "Pa", PSI), ("PSI", "Pa", PSI), ("Pa.s", "Pa·s", 1.0),
    ("mPas", "Pa·s", 1e-3), ("LPM", "m³/s", 1e-3 / 60), ("cfm", "m³/s", FOOT**3 / 60), ("ppb", "-", 1e-9), ("‰", "-", 1e-3), ("mg/g", "-", 1e-3),
    ("mL/mL", "-", 1.0), ("t", "kg", 1000.0), ("arcmin", "rad", 3.14159265358979 / 10800),
])
def test_everyday_spelling(unit, si, scale):
    assert compile_unit(unit, si)[0] == pytest.approx(scale, rel=1e-9)


@pytest.mark.parametrize("unit, si", [
    ("deg", "-"), ("rad", "-"), ("pi", "-"), ("bit", "-"), ("turn", "-"), ("alpha", "-"), ("sr", "-"), ("%", "rad"), ("-", "rad"), ("rpm", "1/s"),
    ("ton", "kg"), ("mPa", "Pa"), ("kg/cm2 a", "Pa"), ("psia", "Pa"),
])
def test_numbers_angles_and_slips_are_told_apart(unit, si):
    with pytest.raises(InvalidInput):
        compile_unit(unit, si)


def test_temperatures_and_their_differences():
    assert compile_unit("°C", "K", worksheet="°C difference") == (1.0, 0.0)
    assert compile_unit("degF", "K", worksheet="°C difference") == (pytest.approx(5 / 9), 0.0)
    assert call("UF_CONVERT", [25, "C", "F"]) == 77
    assert call("UF_CONVERT", [10, "°C difference", "degF"]).code == "#VALUE!"
    assert call("UF_CONVERT", [10, "°C difference", "K"]) == 10
    assert call("UF_CONVERT", [1, "rpm", "Hz"]).code == "#VALUE!"
    found = call("UF_SOLVE_FOR", ["UF_TEMPERATURE_RISE", "power", "10 °C", None, 100])
    assert found == pytest.approx(call("UF_SOLVE_FOR", ["UF_TEMPERATURE_RISE", "power", 10, None, 100]))


@pytest.mark.parametrize("text", [
    "3 membranes replaced after integrity test failure, 12 May", "2 bar transmembrane pressure measured upstream, morning shift", "2 m**9**9**9",
    "2 m2**9**9", "2 " + "a" * 5000, "2 " + "(" * 500, "2 bar according to the manufacturer's data sheet", "1 " + "m*" * 30,
])
def test_prose_and_powers_are_refused_at_once(text):
    """Read in one pass: a text of any length takes no time to speak of (a slow reader would hang here for minutes)."""
    assert call("UF_FLUX_DARCY", [text, 1, 5e12]).code == "#VALUE!"


def test_the_reason_names_the_worksheet_unit():
    assert "a unit like 'm/s'" in call("UF_VELOCITY", [1, "1 s"]).reason or "'m²'" in call("UF_VELOCITY", [1, "1 s"]).reason
    assert "'L/(m²·h)'" in call("UF_FLOW_FROM_FLUX", ["1 s", 1]).reason
    assert "'g/L'" in call("UF_OSMOTIC_VANT_HOFF", ["1 s", 70]).reason
