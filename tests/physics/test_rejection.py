"""Rejection and sieving: limits, inverse pairs, quadrature against another integration, noisy fits."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats
from scipy.integrate import quad

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NotAvailable
from uffuncs.physics import rejection as r
from uffuncs.physics import sieving_curve

LMH = 1e-3 / 3600
fractions = st.floats(0, 1)
ratios = st.floats(1e-4, 3)


def why(name, *cells):
    return call("UF_WHY", [f"UF_{name}", *cells])


# --- film model ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("ratio", [0, 1e-12, 1, 50, 740, 800, 1e9])
def test_no_and_full_rejection_stay_whatever_the_polarization(ratio):
    for convert in (r.rejection_intrinsic, r.rejection_from_intrinsic):
        assert convert(0.0, ratio * 1e-6, 1e-6) == 0
        assert convert(1.0, ratio * 1e-6, 1e-6) == 1


def test_limits_of_strong_polarization():
    assert r.rejection_intrinsic(0.01, 1.0, 1e-6) == 1
    assert r.rejection_from_intrinsic(0.99, 1.0, 1e-6) == pytest.approx(0, abs=1e-300)
    array = r.rejection_from_intrinsic(np.array([0, 0.5, 1]), np.array([1.0, 1, 1]), 1e-6)
    assert array == pytest.approx([0, 0, 1], abs=1e-300)


@given(fractions, st.floats(0, 25))
def test_observed_and_intrinsic_are_inverse(observed, ratio):
    intrinsic = r.rejection_intrinsic(observed, ratio, 1.0)
    assert observed <= intrinsic <= 1
    # 1 − R_i holds only the digits that are left beside 1.
    back = r.rejection_from_intrinsic(intrinsic, ratio, 1.0)
    assert back == pytest.approx(observed, rel=1e-13, abs=4e-16 * math.exp(ratio))
    down = r.rejection_from_intrinsic(observed, ratio, 1.0)
    assert r.rejection_intrinsic(down, ratio, 1.0) == pytest.approx(observed, rel=1e-12, abs=1e-15)


def test_no_transfer_is_refused_in_its_own_place():
    assert call("UF_REJECTION_INTRINSIC", [0.5, 30, 0]) == ErrorValue("#NUM!")
    assert "mass-transfer coefficient is 0" in why("REJECTION_INTRINSIC", 0.5, 30, 0)
    column = call("UF_REJECTION_INTRINSIC", [0.5, 30, [[0], [15]]])
    assert column[0][0] == ErrorValue("#NUM!") and 0.5 < column[1][0] < 1


def test_observed_values_add_up_and_odd_samples_are_told():
    assert r.rejection_observed(8.0, 2.0) + r.sieving_observed(8.0, 2.0) == 1
    assert "feed concentration is 0" in why("REJECTION_OBSERVED", 0, 1)
    assert call("UF_REJECTION_OBSERVED", [1, 3]) == -2
    assert "more concentrated than the feed" in why("REJECTION_OBSERVED", 1, 3)


# --- pores ---------------------------------------------------------------------------------------------

SIEVES = {
    "ferry": r.sieving_ferry,
    "zeman-wales": r.sieving_zeman_wales,
    "cylinder": r.sieving_hindered,
    "slit": lambda a, b: r.sieving_hindered(a, b, "slit"),
    "H cylinder": r.hindrance_diffusion,
    "H slit": lambda a, b: r.hindrance_diffusion(a, b, "slit"),
}


@pytest.mark.parametrize("sieve", SIEVES.values(), ids=SIEVES)
def test_sieving_falls_from_one_to_zero_with_size(sieve):
    lam = np.linspace(1e-6, 1, 20001)
    values = sieve(lam, 1.0)
    assert values[0] == pytest.approx(1, abs=3e-5) and values[-1] == 0
    # The branches of H meet within 1 %, at 1.6e-6.
    assert np.all(np.diff(values) <= 1e-8) and np.all(values >= 0)
    assert sieve(1.0, 1.0) == sieve(7.0, 1.0) == sieve(1e5, 5e-2) == 0
    assert isinstance(float(sieve(0.3, 1.0)), float)
    assert np.array_equal(sieve(lam, 1.0)[::500], [float(sieve(float(x), 1.0)) for x in lam[::500]])


@given(ratios)
def test_order_of_the_sieving_models(lam):
    """Diffusion is hindered more than convection; the lag of the solute can only lower Ferry's value."""
    assert r.sieving_zeman_wales(lam, 1.0) <= r.sieving_ferry(lam, 1.0)
    assert r.hindrance_diffusion(lam, 1.0) <= r.sieving_hindered(lam, 1.0)
    assert r.sieving_hindered(lam, 1.0) <= r.sieving_hindered(lam, 1.0, "slit") + 1e-15


def test_the_branches_near_contact_meet():
    below, above = r.hindrance_diffusion(0.95, 1.0), r.hindrance_diffusion(0.95 + 1e-9, 1.0)
    assert above == pytest.approx(below, rel=0.01)
    assert "asymptote" in why("HINDRANCE_DIFFUSION", 9.7, 10)
    assert why("HINDRANCE_DIFFUSION", 9.7, 10, "slit") == why("HINDRANCE_DIFFUSION", 9.4, 10) == "ok"


PORE = dict(solute_radius=3e-9, pore_radius=5e-9, porosity=0.1, tortuosity=1.5, membrane_thickness=5e-7,
            diffusion_coefficient=6e-11)


def test_peclet_limits():
    convective = r.sieving_hindered(3e-9, 5e-9)
    assert r.sieving_peclet(0.0, **PORE) == 1
    assert r.sieving_peclet(1.0, **PORE) == pytest.approx(convective, rel=1e-14)
    # Slope at no flux, from the series: S = 1 − Pe (1 − W)/W.
    tiny = 1e-6 * LMH
    pe = convective * tiny * 5e-7 * 1.5 / (0.1 * r.hindrance_diffusion(3e-9, 5e-9) * 6e-11)
    assert 1 - r.sieving_peclet(tiny, **PORE) == pytest.approx(pe * (1 - convective) / convective, rel=1e-4)
    assert np.all(np.diff(r.sieving_peclet(np.geomspace(1e-12, 1e-2, 200), **PORE)) <= 0)


@pytest.mark.parametrize("flux", [0.0, 1e-5])
def test_peclet_of_a_solute_as_large_as_the_pore(flux):
    for radius in (5e-9, 8e-9):
        assert r.sieving_peclet(flux, **{**PORE, "solute_radius": radius}) == 0
    values = r.sieving_peclet(flux, **{**PORE, "solute_radius": np.array([3e-9, 5e-9, 8e-9])})
    assert values[0] > 0 and list(values[1:]) == [0, 0]
    almost = r.sieving_peclet(flux, **{**PORE, "solute_radius": 5e-9 * (1 - 1e-15)})
    assert 0 <= almost <= 1


@given(st.floats(0, 50), st.floats(1e-6, 1))
def test_partition_lies_between_its_limits(peclet, k):
    value = r.sieving_partition(peclet, k, 1.0)
    assert k * (1 - 1e-15) <= value <= 1
    assert value == pytest.approx(k / (1 - (1 - k) * math.exp(-peclet)), rel=1e-9)


def test_partition_edges():
    assert r.sieving_partition(0.0, 0.3, 1e-6) == 1 and r.sieving_partition(1.0, 0.3, 1e-9) == 0.3
    assert r.sieving_partition(0.0, 0.0, 1e-6) == 0 and r.sieving_partition(1e-6, 0.0, 1e-6) == 0
    assert "pore transfer coefficient is 0" in why("SIEVING_PARTITION", 20, 0.3, 0)
    assert call("UF_SIEVING_PARTITION", [[[20], [20]], 0.3, [[0], [10]]])[0][0] == ErrorValue("#NUM!")


def by_quad(solute, median, deviation):
    """The average over the pores themselves: number density and r⁴, by adaptive integration in ln r."""
    s = math.log(deviation)

    centre = math.log(median) + 4 * s**2  # where n r⁴ peaks

    def flow(x):  # n r⁴, scaled to 1 at its peak
        return math.exp(-0.5 * ((x - math.log(median)) / s) ** 2 + 4 * (x - centre) + 8 * s**2)

    def passing(x):
        return flow(x) * r.sieving_hindered(solute, math.exp(x))

    def integral(function, edges):
        return sum(quad(function, a, b, epsabs=0, epsrel=1e-11)[0] for a, b in zip(edges, edges[1:]) if b > a)

    edges = np.linspace(centre - 12 * s, centre + 12 * s, 25)
    return integral(passing, np.maximum(edges, math.log(solute))) / integral(flow, edges)


@pytest.mark.parametrize("deviation", [1.02, 1.2, 1.6, 2.5, 6, 10])
def test_pore_spread_against_adaptive_integration(deviation):
    for lam in (0.01, 0.3, 0.9, 1.0, 1.1, 2.0, 6.0):
        value = r.sieving_pore_spread(lam, 1.0, deviation)
        expected = by_quad(lam, 1.0, deviation)
        assert value == pytest.approx(expected, rel=1e-8, abs=1e-60)


def test_pore_spread_of_one_size_and_arrays():
    lam = np.linspace(0.05, 1.3, 11)
    assert r.sieving_pore_spread(lam, 1.0, 1.0) == pytest.approx(r.sieving_hindered(lam, 1.0), rel=1e-12)
    assert r.sieving_pore_spread(1.0, 1.0, 1.0) == 0 == r.sieving_pore_spread(2.0, 1.0, 1.0)
    assert r.sieving_pore_spread(0.5, 1.0, 1 + 1e-7) == pytest.approx(r.sieving_hindered(0.5, 1.0), rel=1e-5)
    block = r.sieving_pore_spread(lam[:, None], 1.0, np.array([1, 1.5, 3]))
    assert block.shape == (11, 3) and np.all((block >= 0) & (block <= 1))
    assert np.all(np.diff(block, axis=0) <= 0)
    assert block[4, 1] == pytest.approx(r.sieving_pore_spread(float(lam[4]), 1.0, 1.5), rel=1e-14)
    assert "widest pores" in why("SIEVING_PORE_SPREAD", 3, 5, 4)


# --- fits ----------------------------------------------------------------------------------------------


def inside(found, error, true, degrees):
    """Within the two-sided interval that misses once in 100,000 times."""
    return abs(found - true) <= stats.t.isf(0.5e-5, degrees) * error


@settings(max_examples=40)
@given(st.floats(0.01, 1), st.integers(3, 20), st.integers(0, 10**6))
def test_sieving_fit_recovers_noisy_data(s, n, seed):
    volumes = np.linspace(0, 6, n)
    noise = np.random.default_rng(seed).normal(0, 0.02, n)
    found, error, _ = r.sieving_fit(volumes, 10 * np.exp(-s * volumes + noise))
    reference = stats.linregress(volumes, np.log(10) - s * volumes + noise)
    assert [found, error] == pytest.approx([-reference.slope, reference.stderr], rel=1e-9)
    assert inside(found, error, s, n - 2)


@pytest.mark.parametrize(("volumes", "concentrations", "reason"), [
    ([0, 1], [5, 4], "three or more"),
    ([2, 2, 2], [5, 4, 3], "same diavolumes"),
    ([0, 1, 2], [5, 0, 3], "0 in row 2"),
])
def test_sieving_fit_refuses_what_tells_nothing(volumes, concentrations, reason):
    cells = [[[v] for v in volumes], [[c] for c in concentrations]]
    assert call("UF_SIEVING_FIT", cells) == ErrorValue("#N/A")
    assert reason in why("SIEVING_FIT", *cells)


def test_a_retained_solute_has_no_sieving():
    assert r.sieving_fit(np.arange(4.0), np.full(4, 7.0)) == (0, 0, 0)


@given(st.floats(0.05, 0.95), st.floats(1, 500), st.floats(0.05, 2))
def test_curve_and_cut_off_belong_together(level, cut, spread):
    assert sieving_curve.rejection_curve(cut, cut, spread, level) == pytest.approx(level, rel=1e-12)
    masses = cut * np.exp(np.linspace(-4, 4, 2001) * spread)
    measured = sieving_curve.rejection_curve(masses, cut, spread, level)
    assert sieving_curve.cut_off(masses, measured, level) == pytest.approx(cut, rel=1e-4 * max(spread, 1))


def test_sharp_curve():
    rejections = [float(sieving_curve.rejection_curve(m, 100.0, 0.0)) for m in (99.999, 100.0, 100.001)]
    assert rejections == [0, pytest.approx(0.9), 1]


def test_cut_off_of_scattered_points():
    masses, rejections = np.array([10.0, 20, 40, 80]), np.array([0.5, 0.8, 0.7, 0.95])
    # The middle two disagree and count as 0.75 both.
    expected = 40 * 2 ** ((0.9 - 0.75) / (0.95 - 0.75))
    assert sieving_curve.cut_off(masses, rejections) == pytest.approx(expected, rel=1e-12)
    shuffled = [2, 0, 3, 1]
    assert sieving_curve.cut_off(masses[shuffled], rejections[shuffled]) == pytest.approx(expected, rel=1e-12)
    cells = [[[10], [20], [40], [80]], [[0.5], [0.8], [0.7], [0.95]]]
    assert "pooled" in why("CUT_OFF", *cells)
    # Two rejections at 20 kDa average to 0.75.
    twice = sieving_curve.cut_off(np.array([10.0, 20, 20, 40]), np.array([0.5, 0.7, 0.8, 0.95]))
    assert twice == pytest.approx(20 * 2**0.75, rel=1e-12)
    assert why("CUT_OFF", [[10], [20], [20], [40]], [[0.5], [0.8], [0.7], [0.95]]) == "ok"


def test_pooling_is_the_nearest_monotone_curve():
    from scipy.optimize import isotonic_regression

    rng = np.random.default_rng(5)
    for _ in range(20):
        masses, rejections = np.sort(rng.uniform(1, 100, 12)), np.round(rng.uniform(0, 1, 12), 3)
        curve = sieving_curve.monotone_curve(masses, rejections)[1]
        assert curve == pytest.approx(isotonic_regression(rejections).x, abs=1e-11)


def test_cut_off_level_on_a_plateau_at_the_ends_and_outside():
    masses, rejections = np.array([10.0, 20, 40, 80]), np.array([0.5, 0.9, 0.9, 0.95])
    assert sieving_curve.cut_off(masses, rejections, 0.9) == pytest.approx(20)
    assert sieving_curve.cut_off(masses, rejections, np.array([0.5, 0.95])) == pytest.approx([10, 80])
    cells = [[[10], [20], [40], [80]], [["50 %"], ["70 %"], [0.9], [0.95]]]
    levels = [[0.4], [0.5], [0.7], [0.96]]
    assert [row[0] for row in call("UF_CUT_OFF", [*cells, levels])] == [
        ErrorValue("#NUM!"), pytest.approx(10), pytest.approx(20), ErrorValue("#NUM!")]
    assert "measure a smaller one" in why("CUT_OFF", *cells, 0.4)
    assert "no solute is rejected to level 0.96" in why("CUT_OFF", *cells, 0.96)
    assert "two or more" in why("CUT_OFF", [[10], [10]], [[0.85], [0.95]])


@settings(max_examples=40)
@given(st.floats(5, 300), st.floats(0.3, 1.5), st.integers(0, 10**6))
def test_cut_off_fit_recovers_noisy_data(cut, spread, seed):
    masses = cut * np.exp(np.linspace(-4, 1.5, 12) * spread)
    noise = np.random.default_rng(seed).normal(0, 0.01, 12)
    rejections = np.clip(sieving_curve.rejection_curve(masses, cut, spread) + noise, 0, 1)
    found, width, error, width_error, r_squared = sieving_curve.cut_off_fit(masses, rejections)
    assert inside(found, error, cut, 10) and inside(width, width_error, spread, 10)
    assert r_squared > 0.98


def test_cut_off_fit_of_exact_data():
    masses = np.array([5.0, 20, 60, 200])
    found = sieving_curve.cut_off_fit(masses, sieving_curve.rejection_curve(masses, 80.0, 0.7))
    assert found == pytest.approx((80, 0.7, 0, 0, 1), rel=1e-7, abs=1e-6)


@pytest.mark.parametrize(("masses", "rejections", "reason"), [
    ([10, 100], [0.4, 0.9], "three or more"),
    ([10, 30, 100], [0, 0.5, 1], "at two molar masses"),
    ([10, 30, 100, 300], [0, 0, 1, 1], "at two molar masses"),
    ([10, 30, 100], [0.9, 0.6, 0.3], "does not rise"),
    ([10, 30, 100], [0.5, 0.5, 0.5], "does not rise"),
    ([10, 10, 10], [0.5, 0.6, 0.7], "at two molar masses"),
])
def test_cut_off_fit_refuses_what_tells_nothing(masses, rejections, reason):
    with pytest.raises(NotAvailable, match=reason):
        sieving_curve.cut_off_fit(np.array(masses, float), np.array(rejections, float))


# --- log removal ---------------------------------------------------------------------------------------


def test_log_removal_never_passes_the_detection_limit():
    for count in (0.0, 0.5, 1.0):
        assert r.log_removal(1e6, count, 1.0) == pytest.approx(6)
    assert r.log_removal(1e6, 10.0, 1.0) == pytest.approx(5)
    assert "nothing detected: detection_limit 1" in why("LOG_REMOVAL", 1e6, 0, 1)


def test_log_removal_that_cannot_be_told():
    assert call("UF_LOG_REMOVAL", [1e6, 0]) == ErrorValue("#NUM!")
    assert "give the detection limit" in why("LOG_REMOVAL", 1e6, 0)
    assert "nothing to remove" in why("LOG_REMOVAL", 0, 0, 5)
    column = call("UF_LOG_REMOVAL", [1e6, [[0], [10]]])
    assert column[0][0] == ErrorValue("#NUM!") and column[1][0] == pytest.approx(5)
    assert "no removal is shown" in why("LOG_REMOVAL", 10, 0, 100)
