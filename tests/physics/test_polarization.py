"""Film and gel model: limits, inverse pairs, fit and interval of the gel concentration, flux-step tests."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NotAvailable
from uffuncs.physics import polarization as p

LMH = 1e-3 / 3600
NUM = ErrorValue("#NUM!")
concentrations = st.floats(1e-3, 500)
ratios = st.floats(0, 30)


# --- film ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("rejection", [0.0, 0.3, 0.9, 1 - 1e-12, 1.0])
def test_modulus_from_no_flux_to_its_limit(rejection):
    modulus = p.polarization_modulus
    assert modulus(0.0, 1e-5, rejection) == pytest.approx(1, rel=1e-15)
    limit = 1 / (1 - rejection) if rejection < 1 else math.inf
    assert modulus(1e4, 1e-5, rejection) == pytest.approx(limit, rel=1e-15)
    x = np.linspace(0, 60, 400)
    values = modulus(x, 1.0, rejection)
    assert np.all(np.diff(values) >= 0) and np.all(values <= limit)
    assert values == pytest.approx([modulus(float(v), 1.0, rejection) for v in x], rel=1e-14)


def test_modulus_without_limit_is_refused_with_its_reason(why):
    assert call("UF_POLARIZATION_MODULUS", [1e5, 0.1]) == NUM and "too large a number" in why(
        "UF_POLARIZATION_MODULUS", 1e5, 0.1
    )
    assert call("UF_POLARIZATION_MODULUS", [1e5, 0.1, 0.9]) == pytest.approx(10)
    for rejection in (0, 0.5, 1):
        assert call("UF_POLARIZATION_MODULUS", [10, 0, rejection]) == NUM
    column = call("UF_POLARIZATION_MODULUS", [10, [[0], [20]], 0.5])
    assert column[0][0] == NUM and column[1][0] == pytest.approx(1 / (0.5 * math.exp(-0.5) + 0.5))
    assert "mass-transfer coefficient is 0" in why("UF_POLARIZATION_MODULUS", 10, 0, 0.5)


@given(concentrations, ratios, st.floats(0, 0.999))
def test_film_flux_is_the_inverse_of_the_surface_concentration(bulk, ratio, passage):
    permeate = bulk * passage
    surface = p.surface_concentration(ratio * 1e-5, 1e-5, bulk, permeate)
    assert surface >= bulk * (1 - 1e-15)
    # C_w holds J/k in the digits that it has beyond C_b.
    slack = 4e-16 * surface / (bulk - permeate) / math.exp(ratio)
    assert p.flux_film(1e-5, surface, bulk, permeate) == pytest.approx(
        ratio * 1e-5, rel=1e-12, abs=1e-5 * 4 * slack
    )


@given(concentrations, st.floats(0, 300), st.floats(0, 1))
def test_modulus_and_surface_concentration_are_one_film(bulk, ratio, rejection):
    surface = bulk * p.polarization_modulus(ratio, 1.0, rejection)
    permeate = (1 - rejection) * surface
    kept = (bulk - permeate) * math.exp(ratio)
    assert surface - permeate == pytest.approx(kept, rel=1e-9, abs=4e-16 * bulk * math.exp(ratio))


def test_surface_of_a_solute_that_passes_stays_at_the_bulk():
    assert p.surface_concentration(1.0, 1e-6, 5.0, 5.0) == 5
    column = p.surface_concentration(np.array([1.0, 1e-6, 0.0]), 1e-6, 5.0, np.array([5.0, 4.0, 5.0]))
    assert column == pytest.approx([5, 4 + math.e, 5])


def test_film_reasons(why):
    assert call("UF_SURFACE_CONCENTRATION", [1e5, 0.1, 10]) == NUM
    assert call("UF_SURFACE_CONCENTRATION", [100, 10, 10, 12]) == NUM
    assert "above bulk_concentration" in why("UF_SURFACE_CONCENTRATION", 100, 10, 10, 12)
    assert call("UF_SURFACE_CONCENTRATION", [0, 10, 10, 12]) == 10
    assert "more concentrated" in why("UF_SURFACE_CONCENTRATION", 0, 10, 10, 12)
    assert call("UF_FLUX_FILM", [20, 100, 10, 10]) == NUM and "nothing is retained" in why(
        "UF_FLUX_FILM", 20, 100, 10, 10
    )
    assert call("UF_FLUX_FILM", [20, 5, 10, 7]) == NUM and "not below both" in why(
        "UF_FLUX_FILM", 20, 5, 10, 7
    )
    assert call("UF_FLUX_FILM", [20, 5, 10]) == pytest.approx(-20 * math.log(2))
    assert "negative" in why("UF_FLUX_FILM", 20, 5, 10)
    column = call("UF_FLUX_FILM", [20, [[100], [5], [10]], 10, [[0], [7], [0]]])
    assert column[0][0] == pytest.approx(20 * math.log(10)) and column[1][0] == NUM and column[2][0] == 0


# --- gel model ----------------------------------------------------------------------------------------------


def test_limiting_flux_at_its_edges(why):
    assert call("UF_FLUX_LIMITING", [20, 300, 300]) == 0
    assert call("UF_FLUX_LIMITING", [0, 300, 30]) == 0
    assert p.flux_limiting(1.0, 300.0, 300 * (1 - 2**-40)) == pytest.approx(2**-40, rel=1e-12)
    for cells, words in (
        ([20, 300, 301], "above gel_concentration"),
        ([20, 300, 0], "bulk concentration is 0"),
        ([20, 300, 30, 30], "nothing is retained"),
        ([20, 300, 30, 40], "nothing is retained"),
    ):
        assert call("UF_FLUX_LIMITING", cells) == NUM and words in why("UF_FLUX_LIMITING", *cells)
    column = call("UF_FLUX_LIMITING", [20, 300, [[0], [30], [300], [301]]])
    assert [row[0] if isinstance(row[0], float) else "#" for row in column] == [
        "#",
        pytest.approx(20 * math.log(10)),
        0,
        "#",
    ]


GEL = dict(
    viscosity=1e-3, membrane_resistance=3.6e12, mass_transfer_coefficient=20 * LMH, gel_concentration=300.0
)


def test_gel_flux_and_its_branches(why):
    darcy = 1e5 / (1e-3 * 3.6e12)
    assert p.flux_gel(1e5, bulk_concentration=0.0, **GEL) == darcy
    assert p.flux_gel(1e5, bulk_concentration=300.0, **GEL) == 0
    assert math.isnan(p.flux_gel(1e5, bulk_concentration=300.1, **GEL))
    cells = [1, 3.6e12, 20, 300]
    assert call("UF_FLUX_GEL", [1, *cells, 301]) == NUM and "the bulk would be gel" in why(
        "UF_FLUX_GEL", 1, *cells, 301
    )
    assert why("UF_FLUX_GEL", 0.2, *cells, 30).startswith("ok: pressure-controlled")
    assert why("UF_FLUX_GEL", 1, *cells, 0).startswith("ok: pressure-controlled")
    assert why("UF_FLUX_GEL", 2, *cells, 30).startswith("ok: limiting")
    pressure, bulk = np.linspace(0, 3e5, 31)[:, None], np.array([0.0, 1, 30, 299, 300, 301])
    block = p.flux_gel(pressure, bulk_concentration=bulk, **GEL)
    assert block.shape == (31, 6)
    loop = [[p.flux_gel(float(a), bulk_concentration=float(b), **GEL) for b in bulk] for a in pressure[:, 0]]
    assert block == pytest.approx(np.array(loop), rel=1e-14, nan_ok=True)
    assert np.all(np.diff(block[:, :5], axis=0) >= 0) and np.all(
        block[:, :5] <= pressure / 3.6e9 * (1 + 1e-15)
    )


@given(st.floats(1, 299), st.floats(0.001, 1), st.floats(0, 1e13))
def test_knee_is_where_darcy_meets_the_share(bulk, share, fouling):
    knee = p.pressure_knee(bulk_concentration=bulk, fraction=share, fouling_resistance=fouling, **GEL)
    limit = p.flux_limiting(GEL["mass_transfer_coefficient"], 300.0, bulk)
    assert knee / (1e-3 * (3.6e12 + fouling)) == pytest.approx(share * limit, rel=1e-12)
    flux = p.flux_gel(1.001 * knee / share, bulk_concentration=bulk, fouling_resistance=fouling, **GEL)
    assert flux == limit
    assert p.flux_gel(
        0.999 * knee, bulk_concentration=bulk, fouling_resistance=fouling, **GEL
    ) < share * limit * (1 + 1e-12)


def test_knee_at_its_edges(why):
    cells = [1, 3.6e12, 20, 300]
    assert call("UF_PRESSURE_KNEE", [*cells, 300]) == 0
    assert call("UF_PRESSURE_KNEE", [*cells, 0]) == NUM and "nothing limits" in why(
        "UF_PRESSURE_KNEE", *cells, 0
    )
    assert call("UF_PRESSURE_KNEE", [*cells, 301]) == NUM and "would be gel" in why(
        "UF_PRESSURE_KNEE", *cells, 301
    )


# --- fit of the gel concentration ---------------------------------------------------------------------------

BULK = np.array([10.0, 20, 40, 80, 160])


@given(st.floats(1, 100), st.floats(170, 900))
def test_gel_fit_recovers_the_line(transfer, gel):
    k, c_g, k_error, gel_error, r_squared, low, high = p.gel_fit(BULK, transfer * np.log(gel / BULK))
    assert k == pytest.approx(transfer, rel=1e-9) and c_g == pytest.approx(gel, rel=1e-8)
    assert r_squared == pytest.approx(1) and max(k_error / k, gel_error / gel) < 1e-8
    assert low == pytest.approx(gel, rel=1e-6) and high == pytest.approx(gel, rel=1e-6)


def test_gel_fit_against_a_general_library():
    flux = np.array([70.5, 56.0, 37.2, 23.4, 9.1]) * LMH
    bulk = np.array([10.0, 20, 50, 100, 200])
    k, gel, k_error, gel_error, r_squared, low, high = p.gel_fit(bulk, flux)
    line = stats.linregress(np.log(bulk), flux)
    assert [k, k_error] == pytest.approx([-line.slope, line.stderr], rel=1e-10)
    assert gel == pytest.approx(math.exp(-line.intercept / line.slope), rel=1e-10)
    assert r_squared == pytest.approx(line.rvalue**2, rel=1e-12)
    # At both ends of the interval the line is t standard errors of its mean from zero: the definition.
    t, n, logs = stats.t.ppf(0.975, 3), 5, np.log(bulk)
    rest = flux - line.intercept - line.slope * logs
    for end in (low, high):
        at = math.log(end)
        error = math.sqrt(
            rest @ rest / (n - 2) * (1 / n + (at - logs.mean()) ** 2 / np.sum((logs - logs.mean()) ** 2))
        )
        assert abs(line.intercept + line.slope * at) == pytest.approx(t * error, rel=1e-8)
    assert low < gel < high and math.log(high / gel) > math.log(gel / low)
    assert gel_error == pytest.approx(gel * math.log(high / low) / (2 * t), rel=0.01)


@pytest.mark.parametrize("noise, points", [(2.0, 5), (2.5, 4), (4.0, 9)])
def test_gel_interval_covers_as_often_as_it_says(noise, points):
    rng = np.random.default_rng(1954)
    bulk = np.geomspace(8, 120, points)
    trials, covered, endless = 3000, 0, 0
    for _ in range(trials):
        *_, low, high = p.gel_fit(bulk, 20 * np.log(280 / bulk) + rng.normal(0, noise, points))
        covered += low <= 280 <= high
        endless += math.isnan(low)
    assert endless < 0.02 * trials
    # Fieller's set is exact; where it has no end it covers more often than not, and counts as such here.
    assert abs((covered + endless) / trials - 0.95) < 4 * math.sqrt(0.95 * 0.05 / trials) + endless / trials


def test_gel_fit_of_points_that_tell_little(why):
    bulk, flux = [[10], [20], [40]], [[30], [45], [20]]
    row = call("UF_GEL_FIT", [bulk, flux])[0]
    assert all(isinstance(v, float) for v in row[:5]) and row[5] == row[6] == NUM
    assert call("UF_GEL_FIT", [bulk, [[30], [30], [31]]]) == ErrorValue("#N/A")
    assert "does not fall" in why("UF_GEL_FIT", bulk, [[30], [30], [31]])
    assert "row 2" in why("UF_GEL_FIT", [[10], [0], [40]], flux)
    assert "three or more" in why("UF_GEL_FIT", bulk[:2], flux[:2])
    assert "same bulk concentration" in why("UF_GEL_FIT", [[10], [10], [10]], flux)
    assert "no end" in p.gel_fit.__doc__


# --- critical flux ------------------------------------------------------------------------------------------

STEPS = np.array([0, 10, 20, 30, 40, 50, 60]) * LMH


def steps_of_a_test(critical, excess):
    """Pressures at 0.005 bar per L/(m²·h), and above the critical flux steeper."""
    line = 500 / LMH * STEPS
    return line + np.where(STEPS > critical * (1 + 1e-9), excess * line, 0)


@pytest.mark.parametrize("critical", [20, 30, 40, 50])
def test_critical_flux_is_the_last_step_on_the_line(critical):
    pressure = steps_of_a_test(critical * LMH, 0.06)
    assert p.critical_flux(STEPS, pressure) == pytest.approx(critical * LMH)
    assert p.critical_flux(STEPS, pressure, 0.0) == pytest.approx(critical * LMH)
    with pytest.raises(NotAvailable, match="60 L/.* leaves the line"):
        p.critical_flux(STEPS, pressure, 0.07)


def test_critical_flux_for_several_tolerances():
    pressure = np.array([0, 0.05, 0.1, 0.15, 0.23, 0.22, 0.5]) * 1e5
    found = p.critical_flux(STEPS, pressure, np.array([0.05, 0.2, 0.9]))
    assert found == pytest.approx([30 * LMH, 50 * LMH, math.nan], nan_ok=True)
    assert found[:2] == pytest.approx([p.critical_flux(STEPS, pressure, t) for t in (0.05, 0.2)])


def test_critical_flux_that_a_test_does_not_tell(why):
    flux, pressure = [[10], [20], [30]], [[0.05], [0.1], [0.15]]
    assert call("UF_CRITICAL_FLUX", [flux, pressure]) == ErrorValue("#N/A")
    assert "highest, 30 L/(m²·h)" in why("UF_CRITICAL_FLUX", flux, pressure)
    assert "three or more" in why("UF_CRITICAL_FLUX", flux[:2], pressure[:2])
    assert "step 2 to step 3" in why("UF_CRITICAL_FLUX", [[10], [20], [20]], pressure)
    assert "first two steps is 0" in why("UF_CRITICAL_FLUX", flux, [[0], [0], [1]])
    assert "2 steps" in why("UF_CRITICAL_FLUX", [[0], [20], [30]], pressure)
    head = [[0], *flux], [[0.02], [0.05], [0.1], [0.3]]
    assert call("UF_CRITICAL_FLUX", [*head]) == pytest.approx(20) and "static head" in why(
        "UF_CRITICAL_FLUX", *head
    )
