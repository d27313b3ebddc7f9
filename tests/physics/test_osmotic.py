"""Osmotic pressure: limits of the theories, ion balance, published fits, least squares done another way."""

import math
from decimal import Decimal, getcontext

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from scipy.optimize import brentq, curve_fit

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NotAvailable
from uffuncs.physics import osmotic as o
from uffuncs.physics._solutes import solute_table
from uffuncs.physics.solution import donnan_ratio

R = 8.31446261815324
NA, NUM = ErrorValue("#N/A"), ErrorValue("#NUM!")
FITTED_SOLUTES = [n for n, p in solute_table().items() if "osmotic_coefficient_1" in p]


def why(name, *cells):
    return call("UF_WHY", [f"UF_{name}", *cells])


# --- theories -----------------------------------------------------------------------------------------------


@given(st.floats(0, 1000), st.floats(0.1, 500), st.floats(273, 350))
def test_all_theories_contain_the_ideal_law(concentration, mass, temperature):
    ideal = pytest.approx(R * temperature * concentration / mass, rel=1e-13)
    assert o.osmotic_vant_hoff(concentration, mass, temperature) == ideal
    assert o.osmotic_virial(concentration, mass, 0.0, 0.0, temperature) == ideal
    assert o.osmotic_donnan(concentration, mass, 0.0, 150.0, 0.0, 0.0, temperature) == ideal
    assert o.osmotic_donnan(concentration, mass, 0.0, 0.0, 0.0, 0.0, temperature) == ideal
    assert o.osmotic_hard_sphere(concentration, mass, 0.0, temperature) == ideal


def test_hard_spheres_have_the_virial_coefficients_of_hard_spheres():
    """4 and 10 on the volume fraction: exact, by the excluded volume of two and three spheres."""
    mass, v = 66.0, 1e-3
    for c in (1.0, 2.0, 5.0):
        virial = o.osmotic_virial(c, mass, 4 * v / mass, 10 * v**2 / mass)
        # what is left is of fourth order: 18.36 φ³ by the exact coefficient, 18 by this equation
        rest = (o.osmotic_hard_sphere(c, mass, v) - virial) / o.osmotic_vant_hoff(c, mass)
        assert rest == pytest.approx(18 * (c * v) ** 3, rel=0.02)


def test_hard_spheres_are_refused_above_the_fluid_branch():
    assert np.isfinite(o.osmotic_hard_sphere(490.0, 50.0, 1e-3))
    assert np.isnan(o.osmotic_hard_sphere(490.1, 50.0, 1e-3))
    rising = o.osmotic_hard_sphere(np.linspace(0, 490, 50), 50.0, 1e-3)
    assert np.all(np.diff(rising, 2) > 0)
    assert call("UF_OSMOTIC_HARD_SPHERE", [[[400], [600]], 50, 1])[1][0] == NUM
    assert "above 0.49" in why("OSMOTIC_HARD_SPHERE", 600, 50, 1)


# --- Donnan -------------------------------------------------------------------------------------------------

IONS = st.tuples(st.floats(0, 600), st.floats(1, 500), st.floats(-200, 200), st.floats(0, 2000))


def ion_term(concentration, mass, charge, salt):
    """The Donnan term alone, as an excess of ions in mol/m³."""
    whole = o.osmotic_donnan(concentration, mass, charge, salt, 0.0, 0.0, 300.0)
    return (whole - o.osmotic_vant_hoff(concentration, mass, 300.0)) / (R * 300.0)


@given(IONS)
def test_donnan_term_is_the_excess_of_ions(case):
    concentration, mass, charge, salt = case
    fixed = abs(charge) * concentration / mass
    # The counter-ion is at least what the charge and the salt each need, at most their sum.
    low, high = max(fixed, salt) * (1 - 1e-12), fixed + salt + 1e-9
    counter = brentq(lambda c: c * (c - fixed) - salt**2, low, high, xtol=1e-12)
    excess = counter + (counter - fixed) - 2 * salt
    assert ion_term(*case) == pytest.approx(excess, rel=1e-7, abs=1e-8 * (1 + concentration / mass))
    mirrored = o.osmotic_donnan(concentration, mass, -charge, salt, 0.0, 0.0, 300.0)
    assert mirrored == o.osmotic_donnan(concentration, mass, charge, salt, 0.0, 0.0, 300.0)


@pytest.mark.parametrize("charge", [1e-6, 1e-3, 1, 100])
def test_donnan_term_loses_no_digits_in_much_salt(charge):
    getcontext().prec = 60
    x, m = Decimal(charge) * 50 / (2 * 66), Decimal(3000)
    exact = float(2 * ((x * x + m * m).sqrt() - m))
    # a2 = −1/c takes the protein's own pressure away, so that the ions stand alone
    alone = o.osmotic_donnan(50.0, 66.0, charge, 3000.0, -1 / 50, 0.0, 300.0) / (R * 300.0)
    assert alone == pytest.approx(exact, rel=1e-13)


def test_donnan_without_salt_counts_the_counter_ions():
    assert ion_term(60.0, 60.0, -15.0, 0.0) == pytest.approx(15, rel=1e-13)
    assert o.osmotic_donnan(0.0, 60.0, -15.0, 0.0, 0.0, 0.0) == 0
    assert o.osmotic_donnan(0.0, 60.0, -15.0, 100.0, 0.0, 0.0) == 0


@given(st.floats(1, 300), st.floats(10, 200), st.floats(1, 50), st.floats(5, 1000))
def test_donnan_pressure_and_ratio_agree(concentration, mass, charge, salt):
    ratio = donnan_ratio(concentration, mass, charge, salt, 0.0)
    excess = salt * (ratio + 1 / ratio - 2)
    assert ion_term(concentration, mass, charge, salt) == pytest.approx(excess, rel=1e-6, abs=1e-9)


def test_salt_screens_the_charge():
    pressures = o.osmotic_donnan(100.0, 69.0, -20.0, np.array([0, 1, 10, 100, 1000.0]), 0.0, 0.0)
    assert np.all(np.diff(pressures) < 0)


# --- polynomials and powers ---------------------------------------------------------------------------------


@given(st.floats(0, 500), *[st.floats(-10, 10)] * 3)
def test_polynomial_by_another_evaluation(c, first, second, third):
    expected = math.fsum([first * c, second * c**2, third * c**3])
    assert o.osmotic_polynomial(c, first, second, third) == pytest.approx(expected, rel=1e-10, abs=1e-6)
    assert o.osmotic_power(c, 3.0, 2.0) == pytest.approx(o.osmotic_polynomial(c, 0.0, 3.0), rel=1e-13)


def test_a_negative_pressure_stands_with_a_caution():
    assert call("UF_OSMOTIC_POLYNOMIAL", [100, -1e-3]) < 0
    assert why("OSMOTIC_POLYNOMIAL", 100, -1e-3).startswith("caution: the osmotic pressure is negative")
    assert why("OSMOTIC_VIRIAL", 100, 66, -0.01).startswith("caution: the osmotic pressure is negative")


@pytest.mark.parametrize("name", FITTED_SOLUTES)
def test_a_published_fit(name):
    """Three coefficients, one temperature and range, rising all over it; UF_SOLUTE gives what is used."""
    rows = [solute_table()[name][f"osmotic_coefficient_{n}"] for n in (1, 2, 3)]
    assert len({(r.temperature, r.lowest, r.highest) for r in rows}) == 1
    grid = np.linspace(rows[0].lowest, rows[0].highest, 50)
    assert np.all(np.diff(o.osmotic_solute(name, grid)) > 0)
    coefficients = [call("UF_SOLUTE", [name, f"osmotic_coefficient_{n}"]) for n in (1, 2, 3)]
    half = float(grid[25])
    by_hand = call("UF_OSMOTIC_POLYNOMIAL", [half, *coefficients])
    assert call("UF_OSMOTIC_SOLUTE", [name, half]) == pytest.approx(by_hand, rel=1e-13)
    # At the start the slope is R T/M of a molar mass that retained solutes may have; whey holds small ones too.
    assert 5 < R * rows[0].temperature / rows[0].value < 300
    highest = rows[0].highest
    assert why("OSMOTIC_SOLUTE", name, highest).startswith(f"ok: at {rows[0].temperature - 273.15:g} °C")
    assert why("OSMOTIC_SOLUTE", name, highest + 1).startswith(
        f"caution: concentration {highest + 1:g} g/L is outside 0 to {highest:g} g/L")


def test_a_solute_without_a_fit():
    assert call("UF_OSMOTIC_SOLUTE", ["lysozyme", 50]) == NA
    assert "no osmotic_coefficient_1 of lysozyme" in why("OSMOTIC_SOLUTE", "lysozyme", 50)
    assert call("UF_OSMOTIC_SOLUTE", ["whey", 50]) == NA
    assert "is it whey protein?" in why("OSMOTIC_SOLUTE", "whey", 50)


def test_ranges_of_solutes_and_concentrations():
    block = call("UF_OSMOTIC_SOLUTE", [[["whey protein", "nothing"]], [[10], [20]]])
    assert [row[0] for row in block] == [call("UF_OSMOTIC_SOLUTE", ["whey protein", c]) for c in (10, 20)]
    assert [row[1] for row in block] == [NA, NA]


# --- least squares ------------------------------------------------------------------------------------------

CONCENTRATIONS = np.array([0, 20, 40, 80, 120, 160, 200, 250, 300.0])
TRUE = (35.0, 0.08, 8e-4)  # Pa/(kg/m³)^n


def powers(c, *coefficients):
    return sum(b * c ** (n + 1) for n, b in enumerate(coefficients))


@pytest.mark.parametrize("terms", [1, 2, 3])
def test_exact_data_give_their_coefficients_back(terms):
    found = o.osmotic_fit(CONCENTRATIONS, powers(CONCENTRATIONS, *TRUE[:terms]), float(terms))
    assert len(found) == 2 * terms + 1
    assert found[:terms] == pytest.approx(TRUE[:terms], rel=1e-9)
    assert np.all(np.array(found[terms:-1]) < 1e-8 * np.array(TRUE[:terms])) and found[-1] == pytest.approx(1)


@pytest.mark.parametrize("terms", [1, 2, 3])
def test_against_another_least_squares(terms):
    noisy = powers(CONCENTRATIONS, *TRUE) * (1 + 0.03 * np.sin(7 * CONCENTRATIONS)) + 5
    found = o.osmotic_fit(CONCENTRATIONS, noisy, float(terms))
    coefficients, covariance = curve_fit(powers, CONCENTRATIONS, noisy, p0=TRUE[:terms], x_scale=TRUE[:terms],
                                         method="trf", xtol=1e-14, ftol=1e-14, gtol=1e-14)
    assert found[:terms] == pytest.approx(coefficients, rel=1e-5)
    assert found[terms:-1] == pytest.approx(np.sqrt(np.diag(covariance)), rel=1e-4)
    rest = noisy - powers(CONCENTRATIONS, *coefficients)
    assert found[-1] == pytest.approx(1 - (rest**2).sum() / (noisy**2).sum(), rel=1e-9)


@pytest.mark.parametrize("terms", [1, 2, 3])
def test_the_stated_errors_cover_the_truth_as_often_as_they_should(terms):
    random = np.random.default_rng(20)
    truth, trials, inside = np.array(TRUE[:terms]), 400, np.zeros(terms)
    reach = stats.t.ppf(0.975, len(CONCENTRATIONS) - terms)
    for _ in range(trials):
        measured = powers(CONCENTRATIONS, *truth) + random.normal(0, 300, len(CONCENTRATIONS))
        found = np.array(o.osmotic_fit(CONCENTRATIONS, measured, float(terms)))
        inside += abs(found[:terms] - truth) <= reach * found[terms:-1]
    # 380 of 400 are expected; three standard deviations of the count are 13.
    assert np.all(abs(inside - 0.95 * trials) <= 14), inside


@given(st.floats(0.01, 100), st.floats(1e-3, 1e3))
def test_units_of_the_data_only_scale_the_fit(stretch, lift):
    data = powers(CONCENTRATIONS, *TRUE) + 50 * np.cos(CONCENTRATIONS)
    plain = np.array(o.osmotic_fit(CONCENTRATIONS, data))
    scaled = np.array(o.osmotic_fit(stretch * CONCENTRATIONS, lift * data))
    factor = lift / stretch ** np.array([1.0, 2, 3])
    assert scaled[:3] == pytest.approx(plain[:3] * factor, rel=1e-8)
    assert scaled[3:6] == pytest.approx(plain[3:6] * factor, rel=1e-8)
    assert scaled[6] == pytest.approx(plain[6], rel=1e-12)


def test_columns_of_the_block_follow_the_terms():
    c, p = [[10], [20], [30], [40], [60]], [[0.011], [0.024], [0.041], [0.058], [0.105]]
    for terms in (1, 2, 3):
        block = call("UF_OSMOTIC_FIT", [c, p, terms])
        assert len(block) == 1 and len(block[0]) == 2 * terms + 1
        si = o.osmotic_fit(np.array(c, float).ravel(), 1e5 * np.array(p).ravel(), float(terms))
        expected = [*(v / 1e5 for v in si[:-1]), si[-1]]  # bar for all but r²
        assert block[0] == pytest.approx(expected, rel=1e-12)
    assert call("UF_OSMOTIC_FIT", [c, p]) == call("UF_OSMOTIC_FIT", [c, p, 3])
    assert 0.9 < call("UF_OSMOTIC_FIT", [c, p, 1])[0][-1] <= 1
    in_psi = [["20 g/L", "0.35 psi"], ["40 g/L", "0.8 psi"], ["60 g/L", "1.4 psi"]]
    fit = call("UF_OSMOTIC_FIT", [[[r[0]] for r in in_psi], [[r[1]] for r in in_psi], 1])
    slope = (20 * 0.35 + 40 * 0.8 + 60 * 1.4) / (400 + 1600 + 3600)
    assert fit[0][0] == pytest.approx(slope * 0.0689475729, rel=1e-8)


def test_blank_rows_do_not_count():
    full = call("UF_OSMOTIC_FIT", [[[10], [20], [30]], [[0.011], [0.024], [0.041]], 1])
    gap = [[[10], [None], [20], [30]], [[0.011], [None], [0.024], [0.041]]]
    assert call("UF_OSMOTIC_FIT", [*gap, 1]) == full
    assert call("UF_OSMOTIC_FIT", [[[10], [20], [30]], [[0.011], [0.024]], 1]) == ErrorValue("#VALUE!")


@pytest.mark.parametrize("c, p, terms, reason", [
    ([10, 20, 30], [1, 2, 3], 3, "3 points"),
    ([10], [1], 1, "1 points"),
    ([0, 10, 10, 10], [0, 1, 1.1, 0.9], 2, "1 different concentrations above 0"),
    ([0, 0], [0, 1], 1, "0 different concentrations above 0"),
    ([10, 20, 30], [0, 0, 0], 1, "every osmotic pressure is 0"),
    ([100, 100 + 1e-9, 100 + 2e-9, 100 + 3e-9], [1, 1, 1, 1.1], 3, "too close together"),
])
def test_data_that_cannot_be_fitted(c, p, terms, reason):
    assert call("UF_OSMOTIC_FIT", [[[x] for x in c], [[y] for y in p], terms]) == NA
    assert reason in why("OSMOTIC_FIT", [[x] for x in c], [[y] for y in p], terms)
    with pytest.raises(NotAvailable):
        o.osmotic_fit(np.array(c, float), np.array(p, float), float(terms))
