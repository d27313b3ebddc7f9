"""Diafiltration: inverse pairs, the optimum, times, purity."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp
from scipy.optimize import minimize_scalar

from uffuncs.cell import call
from uffuncs.physics import diafiltration as d

LMH = 1e-3 / 3600
shares = st.floats(0, 1)


@given(st.floats(0, 600), st.floats(0.01, 1))
def test_diavolumes_undo_the_remaining_share(diavolumes, sieving):
    remaining = d.diafiltration_remaining(diavolumes, sieving)
    assert d.diavolumes(remaining, sieving) == pytest.approx(diavolumes, rel=1e-9, abs=1e-9)


def test_nothing_washes_out_without_sieving(why):
    assert d.diafiltration_remaining(100.0, 0.0) == 1.0
    assert math.isnan(d.diavolumes(0.1, 0.0))
    assert "no water washes it out" in why("UF_DIAVOLUMES", 0.1, 0)


def test_ever_smaller_steps_are_constant_volume():
    """The same water in many small steps; in few large ones less of it washes out."""
    few, many = (d.diafiltration_steps(5.0 / n, float(n), 0.8) for n in (2, 10**4))
    assert many == pytest.approx(d.diafiltration_remaining(5.0, 0.8), rel=2e-3)
    assert few > many


def test_a_step_is_a_dilution_and_a_batch():
    from uffuncs.physics.concentration import concentration_batch

    once = concentration_batch(1.0 / (1.0 + 0.5), 1.5, 1 - 0.3)
    assert d.diafiltration_steps(0.5, 4.0, 0.3) == pytest.approx(once**4)


# --- the optimum ----------------------------------------------------------------------------------------


def test_the_optimum_takes_the_least_time():
    """The time to wash one mass of product, V = m/C, is least there; by a search of its own."""

    def time(concentration):
        return d.diafiltration_time(100.0 / concentration, concentration, 5.0, 50.0, 20 * LMH, 300.0)

    best = minimize_scalar(time, bounds=(20, 280), method="bounded", options={"xatol": 1e-6}).x
    assert d.diafiltration_optimum(300.0) == pytest.approx(best, rel=1e-4)


def test_the_optimum_of_points_of_the_gel_model():
    c = np.array([250.0, 40.0, 20.0, 190.0])
    assert d.diafiltration_optimum_table(c, np.log(300.0 / c)) == pytest.approx(300 / math.e, rel=1e-12)


def test_the_optimum_on_measured_points(why):
    c, j = np.array([10.0, 30.0, 60.0, 120.0, 200.0]), np.array([60.0, 58.0, 33.0, 20.0, 3.0])
    fine = np.geomspace(10, 200, 200001)
    expected = fine[np.argmax(fine * np.interp(np.log(fine), np.log(c), j))]
    assert d.diafiltration_optimum_table(c, j) == pytest.approx(expected, rel=1e-4)
    rising = [[[10], [30]], [[60], [58]]]
    assert call("UF_DIAFILTRATION_OPTIMUM_TABLE", rising) == pytest.approx(30)
    assert "end of the measured range" in why("UF_DIAFILTRATION_OPTIMUM_TABLE", *rising)


# --- time -----------------------------------------------------------------------------------------------


@given(
    st.floats(1e-3, 290),
    st.floats(0.01, 50),
    st.sampled_from([0.0, 1e-12, 1e-3, 0.3, 1.0]),
    st.floats(1, 150),
)
def test_time_against_quadrature(start, diavolumes, sieving, maximum):
    distance = math.log(300 / start)
    for limit in (None, maximum * LMH):
        top = limit or math.inf
        kink = (top / (20 * LMH) - distance) / sieving if sieving else -1
        expected = quad(
            lambda n: 1 / min(top, 20 * LMH * (distance + sieving * n)),
            0,
            diavolumes,
            epsabs=0,
            epsrel=1e-11,
            points=[kink] if 0 < kink < diavolumes else None,
            limit=200,
        )[0]
        found = d.diafiltration_time(2.0, start, diavolumes, 50.0, 20 * LMH, 300.0, sieving, limit)
        assert found == pytest.approx(2.0 / 50.0 * expected, rel=1e-9)


def test_a_retained_product_keeps_its_flux():
    assert d.diafiltration_time(2.0, 100.0, 6.0, 50.0, 20 * LMH, 300.0) == pytest.approx(
        2.0 * 6.0 / (50.0 * 20 * LMH * math.log(3)), rel=1e-14
    )


def test_reasons(why):
    assert "not below gel_concentration" in why("UF_DIAFILTRATION_TIME", 2, 300, 6, 50, 20, 300)
    assert "give maximum_flux" in why("UF_DIAFILTRATION_TIME", 2, 0, 6, 50, 20, 300)
    assert why("UF_DIAFILTRATION_TIME", 2, 0, 6, 50, 20, 300, 0, 40) == "ok"
    assert "rises above 200" in why("UF_DIAFILTRATION_TIME", 2, 100, 20, 50, 20, 300, 1)
    points = [[[5], [50], [200]], [[60], [40], [10]]]
    assert "washes out below" in why("UF_DIAFILTRATION_TIME_TABLE", 2, 100, 6, 50, *points, 0.9)
    assert "above the highest" in why("UF_DIAFILTRATION_TIME_TABLE", 2, 201, 6, 50, *points)
    assert why("UF_DIAFILTRATION_TIME_TABLE", 2, 200, 6, 50, *points) == "ok"


@given(st.floats(20, 250), st.floats(0.01, 3), st.sampled_from([0.0, 1e-9, 0.2, 1.0]))
def test_points_of_the_gel_model_give_its_time(start, diavolumes, sieving):
    c = np.array([0.5, 300 * math.exp(-2.0), 299.0])  # with the kink at J = 2 k
    j = np.minimum(2.0, np.log(300.0 / c)) * 20 * LMH
    found = d.diafiltration_time_table(2.0, start, diavolumes, 50.0, c, j, sieving)
    assert found == pytest.approx(
        d.diafiltration_time(2.0, start, diavolumes, 50.0, 20 * LMH, 300.0, sieving, 40 * LMH), rel=1e-10
    )


def test_washing_out_against_the_differential_equation():
    """dC/dt = −S C J A/V with the flux of the moment: C arrives at e^(−S N) at the time found."""

    def rate(_, c):
        return -0.4 * c * min(30 * LMH, 20 * LMH * math.log(300 / c[0])) * 50.0 / 2.0

    time = d.diafiltration_time(2.0, 150.0, 3.0, 50.0, 20 * LMH, 300.0, 0.4, 30 * LMH)
    final = solve_ivp(rate, (0, time), [150.0], rtol=1e-10, atol=1e-10, max_step=time / 500).y[0, -1]
    assert final == pytest.approx(150.0 * math.exp(-0.4 * 3.0), rel=1e-7)


# --- purity ---------------------------------------------------------------------------------------------

FEED, REJECTION = np.array([35.0, 48.0, 7.0]), np.array([0.99, 0.02, 0.3])


def share(diavolumes, product, factor, feed=FEED, rejection=REJECTION):
    c = feed * factor**rejection * np.exp(-(1 - rejection) * diavolumes)
    return c[product] / c.sum()


@given(st.floats(1, 50), st.floats(0.3, 0.9999999))
def test_purity_is_reached_and_not_before(factor, target):
    n = d.diavolumes_purity(FEED, REJECTION, 1.0, factor, target)
    if share(0.0, 0, factor) >= target:
        assert n == 0
    else:
        assert share(n, 0, factor) == pytest.approx(target, rel=1e-9)
        assert share(n * (1 - 1e-6), 0, factor) < target


def test_purity_of_two_components_in_closed_form():
    """x = 1/(1 + (b/a) e^(−S N)) for a product fully retained."""
    n = d.diavolumes_purity(np.array([10.0, 30.0]), np.array([1.0, 0.2]), 1.0, 1.0, 0.99)
    assert n == pytest.approx(math.log(0.99 / 0.01 * 3) / 0.8, rel=1e-12)


def test_a_peak_is_crossed_at_its_near_side():
    """The middle one gains on the sugar and loses to the protein: its share rises, and falls."""
    feed, rejection = np.array([1.0, 20.0, 60.0]), np.array([1.0, 0.8, 0.0])
    grid = np.linspace(0, 60, 600001)
    c = feed[:, None] * np.exp(-(1 - rejection)[:, None] * grid)
    shares_ = c[1] / c.sum(axis=0)
    peak = shares_.max()
    n = d.diavolumes_purity(feed, rejection, 2.0, 1.0, peak - 1e-4)
    assert n < grid[shares_.argmax()] and n == pytest.approx(
        grid[np.argmax(shares_ >= peak - 1e-4)], abs=2e-4
    )
    assert math.isnan(d.diavolumes_purity(feed, rejection, 2.0, 1.0, float(peak) + 1e-6))


def test_out_of_reach(why):
    ranges = [[[35], [48], [7]], [[0.99], [0.02], [0.99]]]
    assert "out of reach" in why(
        "UF_DIAVOLUMES_PURITY", *ranges, 1, 5, 0.9
    )  # the salts stay as the protein does
    assert "out of reach" in why("UF_DIAVOLUMES_PURITY", *ranges, 2, 5, 0.9)  # the sugar is what leaves
    assert "out of reach" in why("UF_DIAVOLUMES_PURITY", *ranges, 1, 5, 1)
    assert "beyond the rows" in why("UF_DIAVOLUMES_PURITY", *ranges, 4, 5, 0.5)
    assert "holds none of the product" in why("UF_DIAVOLUMES_PURITY", [[0], [1]], [[1], [0]], 1, 5, 0.5)
    assert d.diavolumes_purity(FEED, REJECTION, 1.0, 5.0, 0.0) == 0
    assert d.diavolumes_purity(np.array([5.0]), np.array([0.5]), 1.0, 5.0, 1.0) == 0


def test_purity_over_a_range_of_targets():
    targets = np.array([0.5, 0.9, 0.99, 1.0])
    found = d.diavolumes_purity(FEED, REJECTION, 1.0, 5.0, targets)
    assert (np.diff(found[:3]) > 0).all() and math.isnan(found[3])
    assert found[1] == d.diavolumes_purity(FEED, REJECTION, 1.0, 5.0, 0.9)
