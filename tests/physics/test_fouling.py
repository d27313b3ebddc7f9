"""Fouling: laws against their differential equation, fits of noisy data, the linear section of an index."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NotAvailable
from uffuncs.physics import fouling as f
from uffuncs.physics.water import water_viscosity

LMH, HOUR, BAR = 1e-3 / 3600, 3600.0, 1e5
HERMIA_N = {"complete": 2.0, "standard": 1.5, "intermediate": 1.0, "cake": 0.0}
laws = st.sampled_from(list(HERMIA_N))


def why(name, *cells):
    return call("UF_WHY", [f"UF_{name}", *cells])


def column(values):
    return [[float(v)] for v in values]


def inside(found, error, true, degrees):
    """Within the two-sided interval that misses once in 100,000 times."""
    return abs(found - true) <= stats.t.isf(0.5e-5, degrees) * error


# --- blocking laws -------------------------------------------------------------------------------------


@settings(max_examples=30)
@given(laws, st.floats(5, 500), st.floats(0.01, 50))
def test_laws_solve_their_differential_equation(law, start, strength):
    """`strength` is the initial relative decline per hour, k J_0^(2−n) in 1/h."""
    j0 = start * LMH
    n = HERMIA_N[law]
    k = strength / HOUR / j0 ** (2 - n)
    times = [HOUR, 2 * HOUR]
    solution = solve_ivp(lambda t, j: -k * j ** (3 - n), (0, times[-1]), [j0], rtol=1e-9, atol=1e-16 * j0,
                         t_eval=times)
    assert f.flux_blocking(law, j0, k, solution.t) == pytest.approx(solution.y[0], rel=1e-6, abs=1e-12 * j0)


@pytest.mark.parametrize("law", HERMIA_N)
def test_law_limits(law):
    assert f.flux_blocking(law, 1e-5, 3.0, 0.0) == 1e-5 == f.flux_blocking(law, 1e-5, 0.0, 1e4)
    assert f.flux_blocking(law, 0.0, 3.0, 1e4) == 0
    assert 0 <= f.flux_blocking(law, 1e-5, 1e30, 1e9) < 1e-9
    assert why("FLUX_BLOCKING", law, 100, 1, 1).startswith("ok: k in ")


@settings(max_examples=40)
@given(laws, st.floats(20, 400), st.floats(0.5, 8), st.integers(0, 10**6))
def test_blocking_fit_recovers_noisy_data(law, start, strength, seed):
    j0 = start * LMH
    k = strength / (4 * HOUR) / j0 ** (2 - HERMIA_N[law])
    time = np.linspace(0, 4 * HOUR, 16)
    noise = np.random.default_rng(seed).normal(0, 0.003 * j0, 16)
    found = f.blocking_fit(time, np.maximum(f.flux_blocking(law, j0, k, time) + noise, 0))
    assert list(found[6]) == sorted(found[6]) and sorted(found[0]) == sorted(HERMIA_N)
    row = found[0].index(law)
    initial, coefficient, initial_error, coefficient_error, r_squared, deviation = (c[row] for c in found[1:])
    assert inside(initial, initial_error, j0, 14) and inside(coefficient, coefficient_error, k, 14)
    assert 0.3 < deviation / (0.003 * j0) < 2 and 0 < r_squared < 1
    # The right law cannot be beaten by more than the noise allows.
    assert deviation <= 1.3 * found[6][0]


def test_blocking_fit_is_the_least_squares_optimum():
    from scipy.optimize import curve_fit

    time = np.array([0, 0.2, 0.5, 1, 2, 3, 5.0]) * HOUR
    flux = np.array([100, 82, 70, 52, 36, 27, 20]) * LMH
    found = f.blocking_fit(time, flux)
    row = found[0].index("intermediate")
    best, covariance = curve_fit(lambda t, a, b: a / (1 + b * a * t), time / HOUR, flux / LMH, [90, 0.01],
                                 xtol=1e-13, ftol=1e-13)
    expected = [best[0] * LMH, best[1] / LMH / HOUR]
    errors = np.sqrt(np.diag(covariance)) * [LMH, 1 / LMH / HOUR]
    assert [found[1][row], found[2][row]] == pytest.approx(expected, rel=1e-6)
    assert [found[3][row], found[4][row]] == pytest.approx(errors, rel=1e-4)


@pytest.mark.parametrize(("time", "flux", "reason"), [
    ([0, 1], [100, 50], "three different times"),
    ([0, 0, 1, 1], [100, 99, 50, 51], "three different times"),
    ([0, 1, 2], [50, 50, 50], "does not fall"),
    ([0, 1, 2], [50, 60, 70], "does not fall"),
    ([1, 2, 4, 8], [100, 50 * 2**0.5, 50, 25 * 2**0.5], "nearer to the start"),  # cake with an infinite J_0
])
def test_blocking_fit_refuses_what_tells_nothing(time, flux, reason):
    assert call("UF_BLOCKING_FIT", [column(time), column(flux)]) == ErrorValue("#N/A")
    assert reason in why("BLOCKING_FIT", column(time), column(flux))


@settings(max_examples=40)
@given(st.floats(1e11, 1e13), st.floats(1e13, 1e16), st.floats(0.2, 5), st.integers(0, 10**6))
def test_cake_fit_recovers_noisy_data(resistance, cake, pressure, seed):
    mu, dp = 1.1e-3, pressure * BAR
    time = np.linspace(0, 2 * HOUR, 15)
    squares = (mu * resistance / dp) ** 2 + 2 * mu * cake / dp * time
    noise = np.random.default_rng(seed).normal(0, 1e-3 * squares[0], 15)
    r_m, alpha_c, r_error, cake_error, r_squared = f.cake_fit(time, (squares + noise) ** -0.5, dp, mu)
    assert inside(r_m, r_error, resistance, 13) and inside(alpha_c, cake_error, cake, 13)


def test_cake_fit_and_the_cake_law_agree():
    """k of the law is µ α c/Δp, and J_0 is Δp/(µ R_m)."""
    time = np.linspace(0, 3 * HOUR, 9)
    flux = f.flux_blocking("cake", 120 * LMH, 4e6, time)
    r_m, alpha_c, *_ = f.cake_fit(time, flux, 1 * BAR, 1e-3)
    assert r_m == pytest.approx(BAR / (1e-3 * 120 * LMH), rel=1e-9)
    assert alpha_c == pytest.approx(4e6 * BAR / 1e-3, rel=1e-9)


@pytest.mark.parametrize(("time", "flux", "reason"), [
    ([0, 1], [100, 50], "three or more"),
    ([0, 1, 2], [100, 0, 20], "0 in row 2"),
    ([0, 1, 2], [50, 60, 70], "does not fall"),
    ([1, 2, 4], [100, 60, 20], "starts at or below 0"),
    ([3, 3, 3], [100, 60, 20], "same time"),
])
def test_cake_fit_refuses_what_tells_nothing(time, flux, reason):
    assert call("UF_CAKE_FIT", [column(time), column(flux), 1]) == ErrorValue("#N/A")
    assert reason in why("CAKE_FIT", column(time), column(flux), 1)


# --- indices -------------------------------------------------------------------------------------------


def test_silt_density_index_cautions():
    assert "plugged by more than 75 %" in why("SILT_DENSITY_INDEX", "30 s", "130 s")
    assert why("SILT_DENSITY_INDEX", "30 s", "120 s", 15) == "ok"
    assert "less time than the first" in why("SILT_DENSITY_INDEX", 2, 1)
    assert "is over before the first sample" in why("SILT_DENSITY_INDEX", 20, 30, 15)


def filtration(slope, bend, squeeze, noise=0.0, n=60, seed=1):
    """Time and volume in SI: t/V runs onto a line over the first litre and rises above it after the third."""
    v = np.linspace(0, 5, n + 1)[1:]  # L
    ratio = 40 + slope * v - bend * np.exp(-v / 0.25) + squeeze * np.maximum(v - 3, 0) ** 2
    ratio += np.random.default_rng(seed).normal(0, noise, n)
    return ratio * v, v * 1e-3


STANDARD = (13.8e-4, 2e5, 293.15)
PER_L2 = 1e6  # s/m⁶ in 1 s/L²


@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize(("bend", "squeeze"), [(0, 0), (15, 0), (0, 4), (15, 4)])
def test_fouling_index_finds_the_linear_section(bend, squeeze, seed):
    test = filtration(6.0, bend, squeeze, noise=0.02, seed=seed)
    index, start, end, r_squared = f.fouling_index(*test, *STANDARD)
    assert index / PER_L2 == pytest.approx(6.0, rel=0.05)
    assert r_squared > 0.99
    assert start <= 0.2e-3 if not bend else 0.3e-3 < start < 1.5e-3
    assert end >= 4.8e-3 if not squeeze else 2.7e-3 < end < 3.7e-3


def test_fouling_index_of_an_exact_line_uses_all_points_and_leaves_out_the_start():
    time, volume = filtration(2.5, 0, 0)
    plain = f.fouling_index(time, volume, *STANDARD)
    assert plain == pytest.approx((2.5 * PER_L2, volume[0], volume[-1], 1), rel=1e-9)
    assert f.fouling_index(np.append(0, time), np.append(0, volume), *STANDARD) == plain


def test_fouling_index_does_not_depend_on_the_test_conditions():
    """One fouling potential I (1/m²) at any conditions: t/V = µ R/(p A) + µ I V/(2 p A²)."""
    def test(area, pressure, temperature, potential=2e9):
        mu = water_viscosity(temperature)
        volume = np.linspace(0.1, 3, 30) * 1e-3 * area / 13.8e-4
        ratio = mu * 1e11 / (pressure * area) + mu * potential * volume / (2 * pressure * area**2)
        return f.fouling_index(ratio * volume, volume, area, pressure, temperature)[0]

    expected = water_viscosity(293.15) * 2e9 / (2 * 2e5 * 13.8e-4**2)
    for conditions in [(13.8e-4, 2e5, 293.15), (13.8e-4, 1e5, 278.15), (40e-4, 3e5, 303.15)]:
        assert test(*conditions) == pytest.approx(expected, rel=1e-9)
    time = column(np.arange(1, 8) * np.arange(2, 9))
    assert "200 kPa" in why("FOULING_INDEX", time, column(range(1, 8)), 0.00138, 2, 20)


@pytest.mark.parametrize(("time", "volume", "reason"), [
    ([0, 1, 2, 3, 4], [0, 1, 2, 3, 4], "4 points"),
    ([1, 2, 3, 4, 5, 6], [1, 2, 3, 4, 5, 6], "falls or stays level"),
    ([1, 3, 6, 10, 15], [1, 2, 3, 3, 4], "must rise"),
    ([1, 3, 2, 10, 15], [1, 2, 3, 4, 5], "must rise"),
])
def test_fouling_index_refuses_what_tells_nothing(time, volume, reason):
    cells = [column(time), column(volume), 0.00138, 2, 20]
    assert call("UF_FOULING_INDEX", cells) == ErrorValue("#N/A")
    assert reason in why("FOULING_INDEX", *cells)


def test_unified_index():
    volume = np.array([0, 0.02, 0.05, 0.1, 0.2])
    assert f.fouling_index_unified(volume, 1 / (1 + 7 * volume)) == pytest.approx(7, rel=1e-12)
    # A step in flux at the start moves the intercept, not the index.
    assert f.fouling_index_unified(volume, 1 / (1.3 + 7 * volume)) == pytest.approx(7, rel=1e-12)
    assert "three or more" in why("FOULING_INDEX_UNIFIED", column([0, 1]), column([1, 0.9]))
    assert "rises" in why("FOULING_INDEX_UNIFIED", column([0, 1, 2]), column([1, 1.1, 1.2]))


# --- recovery, resistance ------------------------------------------------------------------------------


@given(st.floats(1, 1000), st.floats(0, 1), st.floats(0, 1))
def test_shares_add_up(clean, a, b):
    fouled, cleaned = clean * a * b, clean * a
    recovered = f.recovery_flux(clean, fouled, cleaned)
    back, lost = (g(clean, fouled, cleaned) for g in (f.fouling_reversible, f.fouling_irreversible))
    assert recovered + lost == pytest.approx(1) and back + lost == pytest.approx(1 - fouled / clean)


def test_fluxes_out_of_order_are_told():
    assert "do not rise from fouled" in why("RECOVERY_FLUX", 100, 50, 110)
    assert "clean flux is 0" in why("FOULING_REVERSIBLE", 0, 0, 0)


@settings(max_examples=40)
@given(st.floats(1e9, 1e12), st.floats(1e11, 1e13), st.integers(0, 10**6))
def test_fouling_rate_recovers_noisy_data(rate, start, seed):
    rng = np.random.default_rng(seed)
    time = np.linspace(0, 48 * HOUR, 25)
    flux, temperature = rng.uniform(20, 80, 25) * LMH, rng.uniform(276, 300, 25)
    resistance = start + rate / HOUR * time + rng.normal(0, 0.01 * start, 25)
    pressure = resistance * water_viscosity(temperature) * flux
    found = f.fouling_rate(time, flux, pressure, temperature)
    assert inside(found[0], found[2], rate / HOUR, 23) and inside(found[1], found[3], start, 23)


def test_fouling_rate_and_cleaning_interval_fit_together():
    viscosity, flux = water_viscosity(283.15), 60 * LMH
    wait = f.cleaning_interval(flux, 1.5 * BAR, viscosity, 1e12, 1e9 / HOUR)
    assert (1e12 + 1e9 / HOUR * wait) * viscosity * flux == pytest.approx(1.5 * BAR, rel=1e-12)
    time = np.array([0, 0.5, 1]) * wait
    pressure = (1e12 + 1e9 / HOUR * time) * viscosity * flux
    rate, start, *_ = f.fouling_rate(time, np.full(3, flux), pressure, np.full(3, 283.15))
    assert rate == pytest.approx(1e9 / HOUR, rel=1e-9) and start == pytest.approx(1e12, rel=1e-9)


def test_cleaning_that_never_falls_due_or_is_overdue():
    for cells, reason in [
        ((50, 1, 1, 1e12, 0), "does not grow"),
        ((50, 1, 1, 1e12, -5e9), "does not grow"),
        ((50, 1, 1, 1e13, 1e10), "at the start already"),
        ((0, 1, 1, 1e12, 1e10), "never reached"),
    ]:
        assert call("UF_CLEANING_INTERVAL", list(cells)) == ErrorValue("#NUM!")
        assert reason in why("CLEANING_INTERVAL", *cells)
    mixed = call("UF_CLEANING_INTERVAL", [50, 1, 1, 1e12, [[0], [1e10]]])
    assert mixed[0][0] == ErrorValue("#NUM!") and mixed[1][0] == pytest.approx(620)


# --- droplets ------------------------------------------------------------------------------------------


def laplace_balance(sigma, theta, pore, droplet):
    """The same pressure by geometry: spherical caps outside and in the pore share the droplet's volume."""
    def cap(radius, angle):  # volume of a cap whose half angle is `angle`
        return math.pi / 3 * radius**3 * (2 - 3 * math.cos(angle) + math.cos(angle) ** 3)

    inner = pore / 2 / math.cos(theta)
    left = math.pi / 6 * droplet**3 - cap(inner, math.pi / 2 - theta)
    outer = brentq(lambda radius: cap(radius, math.pi - theta) - left, 1e-3 * droplet, 2 * droplet,
                   xtol=1e-18, rtol=1e-14)
    return 2 * sigma / inner - 2 * sigma / outer


@given(st.floats(0.001, 0.05), st.floats(0, 1.3), st.floats(1.5, 50))
def test_droplet_pressure_is_the_balance_of_laplace_pressures(sigma, theta, size):
    droplet = size * 1e-6 / math.cos(theta)
    expected = laplace_balance(sigma, theta, 1e-6, droplet)
    assert f.pressure_droplet(sigma, theta, 1e-6, droplet) == pytest.approx(expected, rel=1e-9)


def test_droplet_limits():
    entry = 4 * 0.03 * math.cos(0.5) / 1e-6
    assert f.pressure_droplet(0.03, 0.5, 1e-6, 1.0) == pytest.approx(entry, rel=1e-5)  # a very large droplet
    pressures = f.pressure_droplet(0.03, 0.5, 1e-6, np.geomspace(1e-8, 1e-3, 500))
    assert np.all(np.diff(pressures) >= 0) and pressures[0] == 0 and np.all(np.isfinite(pressures))
    assert np.max(np.diff(pressures)) < 0.05 * entry  # continuous where the droplet begins to be held
    assert "without any pressure" in why("PRESSURE_DROPLET", 30, 30, 1, 0.9)


@pytest.mark.parametrize("angle", [90, 90.0001, 135, 180])
def test_a_droplet_that_wets_is_refused(angle):
    assert call("UF_PRESSURE_DROPLET", [30, angle, 1, 10]) == ErrorValue("#NUM!")
    assert f"contact_angle {angle} deg is not below 90 deg" in why("PRESSURE_DROPLET", 30, angle, 1, 10)
    assert call("UF_PRESSURE_DROPLET", [30, [[angle], [30]], 1, 10])[0][0] == ErrorValue("#NUM!")


def test_not_available_has_a_reason_without_the_function_name():
    with pytest.raises(NotAvailable, match="^the flux does not fall"):
        f.blocking_fit(np.arange(4.0), np.full(4, 1e-5))
