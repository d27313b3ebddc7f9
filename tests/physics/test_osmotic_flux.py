"""Osmotic-pressure model: the equation in forty digits, closed forms, limits, several fluxes, tables."""

import math
from decimal import Decimal, localcontext

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq
from scipy.special import lambertw

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NoResult, NotAvailable
from uffuncs.physics import osmotic_flux as o
from uffuncs.physics._osmotic_table import OsmoticTable
from uffuncs.physics.polarization import polarization_modulus, surface_concentration

NUM = ErrorValue("#NUM!")
LMH = 1e-3 / 3600
PROTEIN = (445.83, -0.1722525, 8.004675e-3)  # Pa/(kg/m³)^n; the second coefficient below 0, the slope nowhere
FITS = (PROTEIN, (40.0, 0.0, 0.0), (37.5, 0.752, 7.64e-3), (0.0, 0.0, 1e-3), (0.0, 0.3, 0.0))

log_range = lambda low, high: st.floats(math.log(low), math.log(high)).map(math.exp)  # noqa: E731
pressures, permeabilities = log_range(1e3, 2e6), log_range(1e-11, 1e-8)
transfers, bulks = log_range(1e-8, 1e-4), log_range(1e-3, 400)
rejections = st.one_of(
    st.just(1.0), st.floats(0, 1), log_range(1e-12, 1).map(lambda s: 1 - s), log_range(1e-9, 1)
)
conditions = st.tuples(pressures, permeabilities, transfers, bulks)


def scale(row) -> float:
    """What the accuracy of a flux is told by: J, or a ten-thousandth of Darcy's flux."""
    return 1e-4 * row[0] * row[1]


def excess(row, flux) -> float:
    """J − L_p {Δp − σ [π(C_w) − π(C_p)]} in forty digits."""
    with localcontext() as context:
        context.prec = 40
        pressure, permeability, transfer, bulk, b1, b2, b3, rejection, reflection = map(Decimal, row)
        j = Decimal(flux)
        surface = bulk / (rejection * (-j / transfer).exp() + (1 - rejection))
        permeate = (1 - rejection) * surface
        difference = sum(b * (surface**n - permeate**n) for n, b in enumerate((b1, b2, b3), 1))
        return j - permeability * (pressure - reflection * difference)


# --- the root -----------------------------------------------------------------------------------------------


@settings(max_examples=300)
@given(conditions, st.sampled_from(FITS), rejections, st.floats(0, 1))
def test_flux_solves_the_equation_in_forty_digits(condition, fit, rejection, reflection):
    row = (*condition, *fit, rejection, reflection)
    flux, darcy = o.flux_osmotic(*row), condition[0] * condition[1]
    assert 0 <= flux <= darcy
    if flux == 0:
        assert excess(row, 0.0) >= -Decimal(1e-15 * darcy)
        return
    tolerance = 1e-12 * max(flux, 1e-4 * darcy)
    # Below about a five-hundredth of Darcy's flux the last digit of J weighs more than the tolerance: there
    # the root lies within 1e-13 of it.
    if flux > 2e-3 * darcy:
        assert abs(excess(row, flux)) <= Decimal(tolerance)
    assert excess(row, flux - 0.1 * tolerance) < 0 < excess(row, flux + 0.1 * tolerance)


@settings(max_examples=300)
@given(conditions, st.sampled_from(FITS), rejections, st.floats(0, 1))
def test_scalars_and_arrays_agree(condition, fit, rejection, reflection):
    row = (*condition, *fit, rejection, reflection)
    array = o.flux_osmotic(*(np.array([v, v]) for v in row))
    assert array == pytest.approx(o.flux_osmotic(*row), rel=1e-12, abs=1e-12 * scale(row))
    power = (*condition, fit[0] + 1.0, 1.7, rejection, reflection)
    array = o.flux_osmotic_power(*(np.array([[v], [v]]) for v in power))
    assert array.shape == (2, 1)
    assert array == pytest.approx(o.flux_osmotic_power(*power), rel=1e-12, abs=1e-12 * scale(row))


@given(conditions, log_range(1, 1e5))
def test_proportional_osmotic_pressure_against_lamberts_function(condition, coefficient):
    pressure, permeability, transfer, bulk = condition
    darcy, taken = permeability * pressure, permeability * coefficient * bulk
    for flux in (o.flux_osmotic(*condition, coefficient), o.flux_osmotic_power(*condition, coefficient, 1.0)):
        if taken >= darcy:
            assert flux == 0
        elif darcy / transfer < 600:
            omega = transfer * lambertw(taken / transfer * math.exp(darcy / transfer)).real
            assert flux == pytest.approx(darcy - omega, rel=1e-11, abs=1e-14 * darcy)


@given(conditions, rejections, st.floats(0, 1), st.sampled_from([1, 2, 3]), log_range(1e-4, 1e3))
def test_a_power_law_is_a_polynomial_of_one_term(condition, rejection, reflection, exponent, coefficient):
    terms = [coefficient if n == exponent else 0.0 for n in (1, 2, 3)]
    by_power = o.flux_osmotic_power(*condition, coefficient, float(exponent), rejection, reflection)
    by_terms = o.flux_osmotic(*condition, *terms, rejection, reflection)
    assert by_power == pytest.approx(by_terms, rel=1e-11, abs=1e-11 * scale(condition))


@pytest.mark.parametrize("exponent", [0.1, 0.5, 7.3, 20.0])
def test_power_laws_of_any_exponent(exponent):
    for rejection in (1.0, 0.7, 1e-6):
        row = (2e5, 3e-10, 5e-6, 20.0, 1e4 / 50**exponent, exponent, rejection)
        flux = o.flux_osmotic_power(*row)
        surface = 20.0 * polarization_modulus(flux, 5e-6, rejection)
        taken = row[4] * surface**exponent * (1 - (1 - rejection) ** exponent)
        assert flux == pytest.approx(3e-10 * (2e5 - taken), rel=1e-9)


@pytest.mark.parametrize("ratio", [50, 200, 1e4, 1e8])
def test_strong_polarization_does_not_overflow(ratio):
    """L_p Δp/k far above what e^x can hold, and fluxes of more than 50 k."""
    darcy, transfer = 3e-10 * 2e5, 3e-10 * 2e5 / ratio
    for bulk in (1e-3, 1e-20, 1e-80):
        row = (2e5, 3e-10, transfer, bulk, *PROTEIN, 1.0, 1.0)
        flux = o.flux_osmotic(*row)
        x = flux / transfer
        assert x <= math.log(1e3 / bulk) and (x > 50 or bulk > 1e-20 or ratio < 100)
        assert abs(excess(row, flux)) <= Decimal(1e-12 * max(flux, 1e-4 * darcy) + 1e-15 * ratio * flux)
        assert o.flux_osmotic(*map(np.atleast_1d, row)) == pytest.approx(flux, rel=1e-13)
    # Where something passes, the surface cannot exceed C_b/(1 − R).
    surface, permeate = 10.0 / 0.2, 10.0
    taken = sum(b * (surface**n - permeate**n) for n, b in enumerate(PROTEIN, 1))
    limit = 3e-10 * (2e5 - taken)
    if ratio >= 200:
        assert o.flux_osmotic(2e5, 3e-10, transfer, 10.0, *PROTEIN, 0.8) == pytest.approx(limit, rel=1e-13)


def test_without_osmosis_it_is_darcys_flux():
    row = dict(
        transmembrane_pressure=2e5,
        permeability=3e-10,
        mass_transfer_coefficient=5e-6,
        bulk_concentration=40.0,
        first_coefficient=400.0,
        intrinsic_rejection=0.9,
        reflection_coefficient=0.95,
    )
    assert o.flux_osmotic(**row) < 5e-5
    for name in ("intrinsic_rejection", "reflection_coefficient", "bulk_concentration", "first_coefficient"):
        for transfer in (5e-6, 0.0):
            changed = {**row, name: 0.0, "mass_transfer_coefficient": transfer}
            assert o.flux_osmotic(**changed) == 3e-10 * 2e5
            assert o.flux_osmotic(**{n: np.array([v]) for n, v in changed.items()}) == [3e-10 * 2e5]
    assert o.flux_osmotic(**{**row, "permeability": 0.0}) == 0
    assert o.flux_osmotic(**{**row, "transmembrane_pressure": 0.0}) == 0
    assert math.isnan(o.flux_osmotic(**{**row, "mass_transfer_coefficient": 0.0}))


@given(conditions, st.sampled_from(FITS), rejections)
def test_more_pressure_and_more_transfer_never_lower_the_flux(condition, fit, rejection):
    pressure, permeability, transfer, bulk = condition
    by_pressure = o.flux_osmotic(
        pressure * np.geomspace(0.01, 10, 40), permeability, transfer, bulk, *fit, rejection
    )
    by_transfer = o.flux_osmotic(
        pressure, permeability, transfer * np.geomspace(0.01, 100, 40), bulk, *fit, rejection
    )
    for flux in (by_pressure, by_transfer):
        assert np.all(np.diff(flux) >= -1e-14 * pressure * permeability)


# --- pressure for a flux ------------------------------------------------------------------------------------


@given(st.floats(0, 8), permeabilities, transfers, bulks, st.sampled_from(FITS), rejections, st.floats(0, 1))
def test_pressure_and_flux_are_inverse(ratio, permeability, transfer, bulk, fit, rejection, reflection):
    flux = ratio * transfer
    fixed = (permeability, transfer, bulk, *fit, rejection, reflection)
    pressure = o.pressure_for_flux(flux, *fixed)
    assert o.flux_osmotic(pressure, *fixed) == pytest.approx(
        flux, rel=1e-10, abs=1e-14 * permeability * pressure
    )
    assert o.pressure_for_flux(np.array([flux]), *fixed) == pytest.approx(pressure, rel=1e-14)


def test_pressure_at_its_edges(why):
    cells = [100, 20, 40, 0.004]
    assert call("UF_PRESSURE_FOR_FLUX", [0, *cells]) == pytest.approx(0.16)
    assert call("UF_PRESSURE_FOR_FLUX", [10, 0, 20, 40, 0.004]) == NUM
    assert "permeability is 0" in why("UF_PRESSURE_FOR_FLUX", 10, 0, 20, 40, 0.004)
    assert call("UF_PRESSURE_FOR_FLUX", [10, 100, 0, 40, 0.004]) == NUM
    assert "no limit" in why("UF_PRESSURE_FOR_FLUX", 10, 100, 0, 40, 0.004)
    assert call("UF_PRESSURE_FOR_FLUX", [10, 100, 0, 0, 0.004]) == pytest.approx(0.1)
    assert call("UF_PRESSURE_FOR_FLUX", [50, 100, 0.01, 40, 0.004]) == NUM
    assert "too large a number" in why("UF_PRESSURE_FOR_FLUX", 50, 100, 0.01, 40, 0.004)
    assert call("UF_PRESSURE_FOR_FLUX", [50, 100, 0.01, 40, 0.004, 0, 0, 0.5]) == pytest.approx(
        0.5 + 0.004 * 40
    )
    assert "1000 g/L" in why("UF_PRESSURE_FOR_FLUX", 80, *cells)
    assert "outside of any sensible fit" in why("UF_PRESSURE_FOR_FLUX", 10, *cells, 0, -1e-6)
    column = call("UF_PRESSURE_FOR_FLUX", [[[10], [10]], 100, [[0], [20]], 40, 0.004])
    assert column[0][0] == NUM and column[1][0] == pytest.approx(0.1 + 0.16 * math.exp(0.5))


# --- reasons and cautions -----------------------------------------------------------------------------------


def test_reasons_and_cautions_of_the_flux(why):
    name, cells = "UF_FLUX_OSMOTIC", [2, 100, 20, 40, 0.0044583, -1.722525e-06, 8.004675e-08]
    assert why(name, *cells) == "ok"
    assert call(name, [0.1, *cells[1:]]) == 0 and "does not exceed the osmotic pressure" in why(
        name, 0.1, *cells[1:]
    )
    assert call(name, [2, 100, 0, *cells[3:]]) == NUM and "coefficient is 0" in why(
        name, 2, 100, 0, *cells[3:]
    )
    assert "1000 g/L" in why(name, 20, 400, 20, 40, 0.0044583)
    # One flux, at a concentration at which the polynomial already falls; then several; then none.
    beyond, falling = [1.3, 20, 200, 185, 0.01, 0, -1e-7], [1.0, 500, 100, 100, 0.01, 0, -8e-8]
    assert call(name, beyond) > 1 and "falls between 0 and" in why(name, *beyond)
    assert call(name, falling) == NUM and "several fluxes" in why(name, *falling)
    assert call(name, [2, 100, 20, 40, -0.001]) == NUM and "no flux up to" in why(
        name, 2, 100, 20, 40, -0.001
    )
    column = call(name, [[[a], [b], [a]] for a, b in zip(beyond, falling)])
    assert column == [[pytest.approx(call(name, beyond), rel=1e-12)], [NUM], [column[0][0]]]


def scanned(row):
    """Fluxes that solve the equation, by a dense scan: intervals of J/k, and whether 0 is among them."""
    pressure, permeability, transfer, bulk, b1, b2, b3, rejection, reflection = row
    end = permeability * pressure / transfer
    x = np.unique(np.concatenate([np.linspace(0, min(end, 200), 40001), np.geomspace(1e-9, 1, 1000) * end]))
    x = x[x <= end]
    with np.errstate(all="ignore"):
        surface = bulk / (rejection * np.exp(-np.minimum(x, 200)) + (1 - rejection))
        permeate = (1 - rejection) * surface
        osmotic = sum(b * (surface**n - permeate**n) for n, b in enumerate((b1, b2, b3), 1))
        above = transfer * x - permeability * (pressure - reflection * osmotic) >= 0
        above[-1] = osmotic[-1] >= 0
    change = np.flatnonzero(above[1:] != above[:-1])
    return [(x[i], x[i + 1]) for i in change], bool(above[0])


def test_coefficients_of_any_sign_against_a_scan():
    rng = np.random.default_rng(7)
    rows, seen = [], {"single": 0, "zero": 0, "several": 0, "none": 0}
    for _ in range(250):
        at, level = 10 ** rng.uniform(1, 3.5), 10 ** rng.uniform(4, 6)
        b = rng.uniform(-0.4, 1, 3) * (rng.random(3) < 0.8) * level / at ** np.arange(1, 4)
        rejection = rng.choice([1.0, rng.random(), rng.uniform(0.9, 1)])
        rows.append(
            (
                10 ** rng.uniform(3, 6.5),
                10 ** rng.uniform(-11.5, -8.5),
                10 ** rng.uniform(-6.5, -4),
                10 ** rng.uniform(-1, 2.5),
                *b,
                rejection,
                rng.choice([1.0, rng.random()]),
            )
        )
    rows += [(1e5, 500 / 3.6e11, 100 * LMH, 100.0, 1000.0, 0.0, -8e-3, 1.0, 1.0)]
    array = o.flux_osmotic(*np.array(rows).T)
    for row, from_array in zip(rows, array):
        row = tuple(map(float, row))
        flux = o.flux_osmotic(*row)
        assert from_array == pytest.approx(flux, rel=1e-12, abs=1e-12 * scale(row), nan_ok=True)
        places, zero = scanned(row)
        if len(places) + zero != 1:
            assert math.isnan(flux), row
            seen["several" if places else "none"] += 1
        elif zero:
            assert flux == 0, row
            seen["zero"] += 1
        else:
            low, high = places[0]
            assert low * (1 - 1e-9) <= flux / row[2] <= high * (1 + 1e-9), row
            seen["single"] += 1
    assert min(seen.values()) >= 1 and seen["single"] > 50, seen


# --- table --------------------------------------------------------------------------------------------------

C = np.array([25.0, 50, 100, 200, 300, 400])
PI = sum(b * C**n for n, b in enumerate(PROTEIN, 1))


def test_interpolation_is_the_general_librarys():
    rng = np.random.default_rng(3)
    for points in (1, 2, 3, 9):
        c, pi = np.cumsum(rng.uniform(0.1, 50, points)), np.cumsum(
            rng.uniform(0, 1e5, points) * (rng.random(points) < 0.8)
        )
        table = OsmoticTable.of(c[::-1], pi[::-1])
        x = np.linspace(0, c[-1], 1001)
        value, slope, bend = table.terms(x)
        theirs = PchipInterpolator([0, *c], [0, *pi])
        assert value == pytest.approx(theirs(x), rel=1e-12, abs=1e-9)
        assert slope == pytest.approx(x * theirs(x, 1), rel=1e-10, abs=1e-7)
        inner = ~np.isin(x, [0, *c])
        assert bend[inner] == pytest.approx(
            (x * (theirs(x, 1) + x * theirs(x, 2)))[inner], rel=1e-9, abs=1e-5
        )
        assert np.array([table.terms_one(float(v)) for v in x]).T == pytest.approx(
            np.array([value, slope, bend]), rel=1e-13
        )
        assert np.all(np.diff(value) >= -1e-9)


@settings(max_examples=150)
@given(conditions, rejections, st.floats(0.05, 1), st.sampled_from([(C, PI), (C, C * 40.0), (C[:2], PI[:2])]))
def test_table_against_brent_on_the_general_librarys_interpolation(condition, rejection, reflection, points):
    pressure, permeability, transfer, bulk = condition
    flux = o.flux_osmotic_table(*condition, *points, rejection, reflection)
    array = o.flux_osmotic_table(
        *(np.array([v, v]) for v in condition), *points, rejection, np.array([reflection] * 2)
    )
    assert array == pytest.approx(flux, rel=1e-12, abs=1e-12 * scale(condition), nan_ok=True)
    pi = PchipInterpolator([0, *points[0]], [0, *points[1]])

    def over(j):
        surface = bulk / (rejection * math.exp(-j / transfer) + (1 - rejection))
        return j - permeability * (pressure - reflection * (pi(surface) - pi((1 - rejection) * surface)))

    darcy, end = permeability * pressure, points[0][-1]
    if rejection == 0:
        assert flux == darcy
        return
    if bulk > end:
        assert math.isnan(flux)
        return
    share = (bulk / end - (1 - rejection)) / max(rejection, 1e-300)
    last = min(darcy, -transfer * math.log(share)) if share > 0 else darcy
    if over(0.0) >= 0:
        assert flux == 0
    elif last < darcy and over(last * (1 - 1e-12)) < 0:
        assert math.isnan(flux) or flux == pytest.approx(last, rel=1e-9)
    else:
        root = (
            brentq(over, 0.0, last * (1 - 1e-13), xtol=1e-15 * darcy, rtol=1e-13)
            if over(last * (1 - 1e-13)) > 0
            else last
        )
        assert flux == pytest.approx(root, rel=1e-9, abs=1e-9 * scale(condition))


def test_table_of_a_straight_line_is_the_polynomial():
    pressure = np.linspace(1e4, 1e5, 50)
    by_table = o.flux_osmotic_table(
        pressure, 3e-10, 5e-6, 30.0, np.array([50.0, 1e3, 2e3]), np.array([5e3, 1e5, 2e5]), 0.9
    )
    assert by_table == pytest.approx(
        o.flux_osmotic(pressure, 3e-10, 5e-6, 30.0, 100.0, 0.0, 0.0, 0.9), rel=1e-12
    )


def test_table_without_extrapolation(why):
    name, table = "UF_FLUX_OSMOTIC_TABLE", [[[c] for c in C], [[p / 1e5] for p in PI]]
    assert call(name, [1, 100, 20, 40, *table]) > 0 and why(name, 1, 100, 20, 40, *table) == "ok"
    assert call(name, [20, 100, 20, 40, *table]) == NUM and "would exceed the highest" in why(
        name, 20, 100, 20, 40, *table
    )
    assert call(name, [1, 100, 20, 401, *table]) == NUM and "is above the highest" in why(
        name, 1, 100, 20, 401, *table
    )
    assert call(name, [1, 100, 20, 401, *table, 0]) == 100
    assert call(name, [0.1, 100, 20, 40, *table]) == 0 and "water would flow back" in why(
        name, 0.1, 100, 20, 40, *table
    )
    assert call(name, [1, 100, 0, 40, *table]) == NUM and "no limit" in why(name, 1, 100, 0, 40, *table)
    column = call(name, [[[1], [20], [2]], 100, 20, 40, *table])
    assert column[0][0] > 0 and column[1][0] == NUM and column[2][0] > column[0][0]
    # Up to the highest concentration itself: the flux there is the film's.
    edge = 20 * math.log(10)
    assert call(name, [edge / 100 + PI[-1] / 1e5, 100, 20, 40, *table]) == pytest.approx(
        edge, rel=1e-9
    ) or call(name, [(edge - 1e-9) / 100 + PI[-1] / 1e5, 100, 20, 40, *table]) == pytest.approx(
        edge, rel=1e-6
    )


def test_tables_that_are_none(why):
    def flux(c, pi):
        return o.flux_osmotic_table(3e4, 3e-10, 5e-6, 10.0, np.array(c), np.array(pi))

    assert flux([100.0, 50, 0, 25], [5e4, 2e4, 0, 9e3]) == flux([25.0, 50, 100], [9e3, 2e4, 5e4])
    with pytest.raises(NotAvailable, match="have the concentration 50"):
        flux([50.0, 25, 50], [2e4, 9e3, 2e4])
    with pytest.raises(NoResult, match="at no concentration"):
        flux([0.0, 50], [1e3, 2e4])
    with pytest.raises(NoResult, match="fall from 50 to 100"):
        flux([25.0, 50, 100], [9e3, 2e4, 1e4])
    with pytest.raises(NotAvailable, match="above 0"):
        flux([0.0], [0.0])
    cells = [1, 100, 20, 10, [[50], [50]], [[0.1], [0.2]]]
    assert call("UF_FLUX_OSMOTIC_TABLE", cells) == ErrorValue("#N/A")
    assert why("UF_FLUX_OSMOTIC_TABLE", *cells).startswith("UF_FLUX_OSMOTIC_TABLE: two points")


def test_a_table_that_flattens_may_have_several_fluxes(why):
    """π steps up at 90 to 100 g/L; with half of the solute passing, the permeate steps at 180 to 200."""
    table = [[[80], [90], [100], [300]], [[0.01], [0.02], [1.0], [1.01]]]
    name = "UF_FLUX_OSMOTIC_TABLE"
    assert call(name, [0.9, 100, 30, 120, *table, 0.5]) == NUM
    assert "several fluxes" in why(name, 0.9, 100, 30, 120, *table, 0.5)
    # With little polarization there is the one, at both ends of the step.
    high = call(name, [3, 10, 200, 120, *table, 0.5])
    assert high == pytest.approx(10 * (3 - 1), rel=0.02)
    low = call(name, [3, 100, 60, 20, *table, 0.5])
    assert low == pytest.approx(300, rel=0.02)
    column = call(name, [[[0.9], [3]], [[100], [10]], [[30], [200]], 120, *table, 0.5])
    assert column[0][0] == NUM and column[1][0] == pytest.approx(high, rel=1e-12)


# --- curve --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("rejection, reflection", [(1.0, 1.0), (0.8, 0.9), (0.0, 1.0)])
def test_curve_is_a_set_of_consistent_rows(rejection, reflection):
    pressure = np.array([0.0, 0.1, 0.5, 1, 2, 4]) * 1e5
    fixed = (3e-10, 5e-6, 40.0, *PROTEIN, rejection, reflection)
    given_back, flux, surface, modulus, osmotic = o.flux_curve(pressure, *fixed)
    assert np.array_equal(given_back, pressure) and np.all(np.diff(flux) >= 0)
    assert flux == pytest.approx([o.flux_osmotic(float(q), *fixed) for q in pressure], rel=1e-13)
    flows = flux > 0
    assert (3e-10 * (pressure - reflection * osmotic))[flows] == pytest.approx(flux[flows], rel=1e-10)
    film = [
        surface_concentration(float(j), 5e-6, 40.0, (1 - rejection) * float(c)) for j, c in zip(flux, surface)
    ]
    assert surface == pytest.approx(40 * modulus) and surface == pytest.approx(film)


def test_curve_in_cells(why):
    pressures = [[0.05], [1], [3]]
    block = call("UF_FLUX_CURVE", [pressures, 100, 20, 40, 0.004])
    assert [len(row) for row in block] == [5, 5, 5] and block[0][1:4] == [0, 40, 1]
    assert block[0][4] == pytest.approx(0.16)
    assert "the flux is 0 at the lowest pressure" in why("UF_FLUX_CURVE", pressures, 100, 20, 40, 0.004)
    assert why("UF_FLUX_CURVE", pressures[1:], 100, 20, 40, 0.004) == "ok"
    assert "1000 g/L" in why("UF_FLUX_CURVE", [[1], [20]], 100, 20, 40, 0.004)
    falling = [[[0.05], [1]], 500, 100, 100, 0.01, 0, -8e-8]
    block = call("UF_FLUX_CURVE", falling)
    assert block[1][0] == 1 and block[1][1:] == [NUM] * 4
    assert call("UF_FLUX_CURVE", [pressures, 100, 20, 0, 0.004])[2][1:] == [
        300,
        0,
        pytest.approx(math.exp(15)),
        0,
    ]
