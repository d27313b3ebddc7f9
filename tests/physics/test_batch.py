"""Batches by the gel model and on measured fluxes: quadrature, closed forms, kinks, seams."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp
from scipy.special import expi

from uffuncs.errors import NotAvailable, NoResult
from uffuncs.physics import batch as b
from uffuncs.physics._flux_law import drained, passed

LMH, HOUR = 1e-3 / 3600, 3600.0
factors = st.floats(1.0001, 1e4)
rejections = st.one_of(st.just(1.0), st.just(0.0), st.floats(1e-9, 1.0))
transfers = st.floats(1, 200)
nearness = st.floats(1e-9, 3)  # ln(C_g/C) at the end


def by_quadrature(feed, factor, transfer, gel, rejection, maximum=math.inf):
    """∫ e^(−u)/J du in the variable ln y, y = ln(C_g/C), which smooths the end near the gel concentration."""
    length, start = math.log(factor), math.log(gel / feed)
    if rejection < 1e-3:
        kinks = [u for u in [(start - maximum / transfer) / rejection if rejection else -1] if 0 < u < length]
        return quad(
            lambda u: math.exp(-u) / min(maximum, transfer * (start - rejection * u)),
            0,
            length,
            points=kinks or None,
            epsabs=0,
            epsrel=1e-12,
            limit=500,
        )[0]
    end = start - rejection * length

    def integrand(w):
        y = math.exp(w)
        return math.exp(-(start - y) / rejection) * y / (min(maximum, transfer * y) * rejection)

    kink = math.log(maximum / transfer) if math.isfinite(maximum) else math.inf
    ends = sorted({math.log(end), math.log(start), min(max(kink, math.log(end)), math.log(start))})
    return sum(
        quad(integrand, low, high, epsabs=0, epsrel=1e-12, limit=500)[0] for low, high in zip(ends, ends[1:])
    )


@given(factors, transfers, rejections, nearness, st.floats(0.2, 3))
def test_the_integral_with_and_without_a_kink(factor, transfer, rejection, end, share):
    feed = 10.0
    gel = feed * factor**rejection * math.exp(end)
    start = math.log(gel / feed)
    for maximum in (None, share * transfer * start, transfer * (end + 0.3 * (start - end))):
        found = b.volume_over_flux(feed, factor, transfer, gel, rejection, maximum)
        expected = by_quadrature(feed, factor, transfer, gel, rejection, maximum or math.inf)
        assert found == pytest.approx(expected, rel=1e-9)


def test_full_rejection_is_the_difference_of_two_exponential_integrals():
    volume, feed, factor, area, transfer, gel = 10.0, 10.0, 20.0, 50.0, 20 * LMH, 300.0
    expected = (
        volume
        * feed
        / (area * transfer * gel)
        * (expi(math.log(gel / feed)) - expi(math.log(gel / (feed * factor))))
    )
    assert b.batch_time(volume, feed, factor, area, transfer, gel) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("gap", [1e-3, 1e-6, 1e-9, 1e-11])
def test_close_to_the_gel_concentration(gap):
    """The time grows with the logarithm of the distance, and not faster: ∫ dy/y."""
    feed, factor, gel = 10.0, 20.0, 200.0 / (1 - gap)
    near = b.volume_over_flux(feed, factor, 1.0, gel, 1.0, None)
    nearer = b.volume_over_flux(feed, factor, 1.0, 200.0 / (1 - gap / 2), 1.0, None)
    assert nearer - near == pytest.approx(math.log(2) / factor, rel=2e-2 if gap < 1e-4 else 0.1)
    # Of the inputs only, not of the method: ln(C_g/C) itself has 1e-16 of absolute error.
    assert near == pytest.approx(by_quadrature(feed, factor, 1.0, gel, 1.0), rel=1e-9 + 1e-15 / gap)


def test_at_and_beyond_the_gel_concentration(why):
    for factor in (30.0, 40.0):
        assert math.isnan(b.batch_time(10.0, 10.0, factor, 50.0, 20 * LMH, 300.0))
        assert "the flux falls to 0" in why("UF_BATCH_TIME", 10, 10, factor, 50, 20, 300)
        assert "gel_concentration 300 g/L" in why("UF_FLUX_MEAN", 10, factor, 20, 300)
    assert math.isfinite(b.batch_time(10.0, 10.0, 40.0, 50.0, 20 * LMH, 300.0, 0.9))
    assert "not below gel_concentration" in why("UF_BATCH_AREA", 10, 300, 1, 5, 20, 300)


def test_no_transfer_no_solute(why):
    assert "no flux" in why("UF_BATCH_TIME", 10, 10, 5, 50, 0, 300)
    assert "give maximum_flux" in why("UF_BATCH_TIME", 10, 0, 5, 50, 20, 300)
    # Pure solvent under a highest flux: permeate volume over area and flux.
    assert b.batch_time(10.0, 0.0, 5.0, 50.0, 20 * LMH, 300.0, 1.0, 40 * LMH) == pytest.approx(
        8 / (50 * 40 * LMH)
    )


def test_caution_above_clean_water_flux(why):
    assert "200 L/(m²·h)" in why("UF_BATCH_TIME", 10, 0.01, 5, 50, 20, 300)
    assert why("UF_BATCH_TIME", 10, 0.01, 5, 50, 20, 300, 1, 100) == "ok"
    assert why("UF_BATCH_TIME", 10, 10, 5, 50, 20, 300) == "ok"


@given(st.floats(1.01, 20), st.floats(1.01, 20), st.floats(0, 1), st.floats(20, 80))
def test_a_batch_in_two_parts_takes_the_same_time(first, second, rejection, maximum):
    law = (20 * LMH, 5000.0)
    whole = b.batch_time(10.0, 10.0, first * second, 50.0, *law, rejection, maximum * LMH)
    parts = b.batch_time(10.0, 10.0, first, 50.0, *law, rejection, maximum * LMH) + b.batch_time(
        10.0 / first, 10.0 * first**rejection, second, 50.0, *law, rejection, maximum * LMH
    )
    assert parts == pytest.approx(whole, rel=1e-12)


def test_against_the_differential_equation():
    """dV/dt = −A J, dC/dt = R C A J/V: independent of every integral above."""
    area, transfer, gel, rejection, maximum = 50.0, 20 * LMH, 300.0, 0.95, 45 * LMH

    def rates(_, state):
        flow = area * min(maximum, transfer * math.log(gel / state[1]))
        return [-flow, rejection * state[1] * flow / state[0]]

    def reached(_, state):
        return state[0] - 0.5

    reached.terminal = True
    solution = solve_ivp(
        rates, (0, 1e6), [10.0, 10.0], events=reached, rtol=1e-10, atol=1e-12, max_step=100.0
    )
    assert b.batch_time(10.0, 10.0, 20.0, area, transfer, gel, rejection, maximum) == pytest.approx(
        solution.t_events[0][0], rel=1e-8
    )
    assert solution.y[1][-1] == pytest.approx(10.0 * 20.0**rejection, rel=1e-8)


@given(factors, st.floats(0, 1), st.floats(5, 150))
def test_area_and_time_undo_each_other(factor, rejection, maximum):
    area = b.batch_area(10.0, 1.0, factor, 4 * HOUR, 20 * LMH, 1e5, rejection, maximum * LMH)
    assert b.batch_time(10.0, 1.0, factor, area, 20 * LMH, 1e5, rejection, maximum * LMH) == pytest.approx(
        4 * HOUR, rel=1e-12
    )


@given(factors, rejections, nearness)
def test_the_mean_flux_lies_between_last_and_first(factor, rejection, end):
    gel = 10.0 * factor**rejection * math.exp(end)
    mean = b.flux_mean(10.0, factor, 1.0, gel, rejection)
    first, last = math.log(gel / 10.0), math.log(gel / 10.0) - rejection * math.log(factor)
    assert last * (1 - 1e-6) <= mean <= first * (1 + 1e-12)


def test_the_mean_flux_towards_no_concentration_is_the_first_one():
    first = 20 * LMH * math.log(30)
    assert b.flux_mean(10.0, 1.0, 20 * LMH, 300.0) == pytest.approx(first, rel=1e-15)
    for step in (1e-15, 1e-12, 1e-9, 1e-6):
        assert b.flux_mean(10.0, 1.0 + step, 20 * LMH, 300.0) == pytest.approx(first, rel=1e-12 + step)
    assert b.flux_mean(10.0, 1.0, 20 * LMH, 300.0, 1.0, 30 * LMH) == 30 * LMH


def test_the_rule_of_thumb_is_near_the_integral():
    """For a fifth of the volume left and a flux that halves, as common batches have it."""
    first, last = 20 * math.log(30), 20 * math.log(6)
    mean = b.flux_mean(10.0, 5.0, 20.0, 300.0)
    assert b.flux_mean_rule(first, last) == pytest.approx(mean, rel=0.15)


def test_ranges_equal_single_values():
    feed, factor = np.array([[5.0], [10.0], [400.0]]), np.array([2.0, 20.0])
    block = b.batch_time(10.0, feed, factor, 50.0, 20 * LMH, 300.0, 0.9)
    assert block.shape == (3, 2) and np.isnan(block[2]).all()
    for i in range(2):
        for j in range(2):
            assert block[i, j] == b.batch_time(
                10.0, float(feed[i, 0]), float(factor[j]), 50.0, 20 * LMH, 300.0, 0.9
            )


# --- measured fluxes ------------------------------------------------------------------------------------


def gel_points(transfer, gel, maximum, *concentrations):
    c = np.array(
        [*concentrations, gel * math.exp(-maximum / transfer)] if math.isfinite(maximum) else concentrations
    )
    return c, np.minimum(maximum, transfer * np.log(gel / c))


@given(
    factors,
    st.floats(0, 1),
    st.sampled_from([math.inf, 30 * LMH, 70 * LMH]),
    st.randoms(use_true_random=False),
)
def test_points_of_the_gel_model_give_its_times(factor, rejection, maximum, random):
    transfer, gel = 20 * LMH, 1e6
    c, j = gel_points(transfer, gel, maximum, 0.5, 1.0, 7.0, 400.0, 1.0001e4)
    order = random.sample(range(len(c)), len(c))
    limit = None if maximum == math.inf else maximum
    assert b.batch_time_table(10.0, 1.0, factor, 50.0, c[order], j[order], rejection) == pytest.approx(
        b.batch_time(10.0, 1.0, factor, 50.0, transfer, gel, rejection, limit), rel=1e-11
    )
    assert b.batch_area_table(10.0, 1.0, factor, HOUR, c[order], j[order], rejection) == pytest.approx(
        b.batch_area(10.0, 1.0, factor, HOUR, transfer, gel, rejection, limit), rel=1e-11
    )


C, J = np.array([5.0, 20.0, 60.0, 120.0, 250.0]), np.array([60.0, 64.0, 30.0, 18.0, 3.0]) * LMH


@pytest.mark.parametrize("rejection", [1.0, 0.7, 1e-6, 0.0])
def test_measured_points_against_quadrature(rejection):
    factor = 20.0

    def flux(u):
        return np.interp(math.log(12.0) + rejection * u, np.log(C), J)

    kinks = [u for u in (np.log(C / 12.0) / rejection if rejection else []) if 0 < u < math.log(factor)]
    expected = quad(
        lambda u: math.exp(-u) / flux(u), 0, math.log(factor), points=kinks or None, epsabs=0, epsrel=1e-12
    )[0]
    assert b.batch_time_table(1.0, 12.0, factor, 1.0, C, J, rejection) == pytest.approx(expected, rel=1e-10)


def test_measured_points_are_not_extrapolated(why):
    points = [[[c] for c in C], [[j / LMH] for j in J]]
    assert "below the lowest" in why("UF_BATCH_TIME_TABLE", 10, 4.9, 5, 50, *points)
    assert "above the highest" in why("UF_BATCH_TIME_TABLE", 10, 251, 5, 50, *points)
    assert "leads above the highest" in why("UF_BATCH_TIME_TABLE", 10, 60, 5, 50, *points)
    assert why("UF_BATCH_TIME_TABLE", 10, 50, 5, 50, *points) == "ok"  # to the last point itself
    assert "falls to 0" in why("UF_BATCH_TIME_TABLE", 10, 5, 50, 50, points[0], [[60], [50], [30], [18], [0]])
    assert why("UF_BATCH_TIME_TABLE", 10, 5, 20, 50, points[0], [[60], [50], [30], [18], [0]]) == "ok"


def test_points_that_are_no_curve():
    with pytest.raises(NotAvailable, match="two points"):
        b.batch_time_table(10.0, 10.0, 2.0, 50.0, C[:1], J[:1])
    with pytest.raises(NotAvailable, match="60 g/L"):
        b.batch_time_table(10.0, 10.0, 2.0, 50.0, np.append(C, 60.0), np.append(J, 1.0))
    with pytest.raises(NoResult, match="is 0"):
        b.batch_time_table(10.0, 10.0, 2.0, 50.0, np.append(C, 0.0), np.append(J, 1.0))


# --- the two elementary integrals -----------------------------------------------------------------------


@given(st.floats(1e-6, 10), st.floats(-9, 9), st.floats(-9, 1.06))
def test_elementary_integrals(start, log_ratio, log_length):
    length, end = 10.0**log_length, start * 10.0**log_ratio

    def along_w(weight):  # by the logarithm of the flux, which spreads the ends
        if end == start:
            return quad(weight, 0, length, epsabs=0, epsrel=1e-12)[0] / start
        slope = (end - start) / length
        return quad(
            lambda w: weight((math.exp(w) - start) / slope) / slope,
            math.log(start),
            math.log(end),
            epsabs=0,
            epsrel=1e-12,
            limit=400,
        )[0]

    if 0 < abs(end - start) < 1e-4 * start:  # the reference itself loses digits there: a series instead
        mean, change = 0.5 * (start + end), (end - start) / start
        assert passed(start, end, length) == pytest.approx(length / mean * (1 + change**2 / 12), rel=1e-9)
        return
    assert drained(start, end, length) == pytest.approx(along_w(lambda v: math.exp(-v)), rel=1e-9)
    assert passed(start, end, length) == pytest.approx(along_w(lambda v: 1.0), rel=1e-9)


def test_the_elementary_integral_has_no_seam():
    """Between the quadrature and the exponential integrals the values meet to rounding."""
    for length in (1e-6, 0.1, 3.0, 11.5):
        for end in (1 / 3, 3.0):
            below, above = drained(1.0, end * (1 - 1e-13), length), drained(1.0, end * (1 + 1e-13), length)
            assert below == pytest.approx(above, rel=5e-13)
