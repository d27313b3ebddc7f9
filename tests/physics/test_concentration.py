"""Balances of concentration: batch and mixed stage, components, scale, flush."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from uffuncs.physics import concentration as c

factors = st.floats(1, 1e5)
shares = st.floats(0, 1)


@given(st.floats(0, 2000), factors, shares)
def test_what_is_kept_is_concentration_times_volume(feed, factor, rejection):
    assert c.concentration_batch(feed, factor, rejection) == pytest.approx(
        feed * factor * c.yield_batch(factor, rejection), rel=1e-12
    )
    assert c.concentration_continuous(feed, factor, rejection) == pytest.approx(
        feed * factor * c.yield_continuous(factor, rejection), rel=1e-12
    )


@given(factors, shares)
def test_a_batch_keeps_more_than_a_mixed_stage(factor, rejection):
    assert c.yield_batch(factor, rejection) >= c.yield_continuous(factor, rejection) * (1 - 1e-12)


def test_limits():
    assert c.yield_batch(20.0, 1.0) == c.yield_continuous(20.0, 1.0) == 1.0
    assert c.yield_batch(20.0, 0.0) == c.yield_continuous(20.0, 0.0) == pytest.approx(0.05)
    assert (
        c.concentration_batch(10.0, 20.0, 0.0)
        == c.concentration_continuous(10.0, 20.0, 0.0)
        == pytest.approx(10)
    )


def test_many_mixed_stages_are_a_batch():
    """A cascade of ever smaller mixed stages is plug flow, and that is a batch."""
    rejection, stages = 0.9, 20000
    assert c.yield_continuous(20.0 ** (1 / stages), rejection) ** stages == pytest.approx(
        c.yield_batch(20.0, rejection), rel=1e-4
    )


def test_a_concentration_factor_below_one_is_a_caution(why):
    assert "dilutes" in why("UF_CONCENTRATION_FACTOR", 10, 20)
    assert why("UF_CONCENTRATION_FACTOR", 20, 10) == "ok"
    assert "1 to 100000" in why("UF_CONCENTRATION_BATCH", 10, 0.5)


# --- components -----------------------------------------------------------------------------------------

FEED, REJECTION = np.array([35.0, 48.0, 7.0, 0.0]), np.array([0.995, 0.03, 0.4, 0.5])
NAMES = ["protein", "sugar", "salts", "none"]


@pytest.mark.parametrize("mode", c.MODES)
@pytest.mark.parametrize("factor, diavolumes", [(5.0, 0.0), (5.0, 3.0), (1.0, 2.0), (1.0000001, 0.0)])
def test_every_component_is_conserved(mode, factor, diavolumes):
    retentate, permeate, kept, share = c.composition(NAMES, FEED, REJECTION, factor, diavolumes, mode)
    volume, permeate_volume = 1 / factor, 1 - 1 / factor + diavolumes / factor
    assert retentate * volume + permeate * permeate_volume == pytest.approx(
        np.append(FEED, FEED.sum()), rel=1e-8
    )
    assert share[:-1].sum() == pytest.approx(1) and share[-1] == 1
    assert retentate[-1] == pytest.approx(retentate[:-1].sum()) and permeate[-1] == pytest.approx(
        permeate[:-1].sum()
    )
    assert kept[-1] * FEED.sum() == pytest.approx((kept[:-1] * FEED).sum())


def test_components_of_a_batch_against_the_differential_equation():
    """First dV/dt = −1 to V_0/5, then water in at the rate of the permeate, for three diavolumes."""

    def concentrating(t, mass):
        return -(1 - REJECTION) * mass / (1 - t)

    def washing(_, mass):
        return -(1 - REJECTION) * mass / 0.2

    first = solve_ivp(concentrating, (0, 0.8), FEED, rtol=1e-11, atol=1e-13).y[:, -1]
    second = solve_ivp(washing, (0, 0.6), first, rtol=1e-11, atol=1e-13).y[:, -1]
    retentate, *_ = c.composition(NAMES, FEED, REJECTION, 5.0, 3.0)
    assert retentate[:-1] == pytest.approx(second / 0.2, rel=1e-8)


def test_a_continuous_stage_against_its_balance():
    """Feed 1, water 3/5, retentate 1/5: all leaves with the retentate at C or the permeate at (1 − R) C."""
    retentate, permeate, *_ = c.composition(NAMES, FEED, REJECTION, 5.0, 3.0, "continuous")
    assert permeate[:-1] == pytest.approx((1 - REJECTION) * retentate[:-1])
    assert FEED == pytest.approx(retentate[:-1] * 0.2 + permeate[:-1] * (0.8 + 0.6))


def test_no_permeate_shows_the_first_drop():
    _, permeate, kept, _ = c.composition(NAMES, FEED, REJECTION, 1.0)
    assert permeate[:-1] == pytest.approx((1 - REJECTION) * FEED) and list(kept) == [1] * 5


def test_an_empty_feed(why):
    assert "all feed concentrations are 0" in why("UF_COMPOSITION", [["a"], ["b"]], [[0], [0]], [[1], [0]], 5)


# --- scale and flush ------------------------------------------------------------------------------------


def test_flush_limits_and_growth():
    assert c.yield_flush(10.0, 1.0) == pytest.approx(10 / 11)
    assert c.yield_flush(10.0, 0.0, 5.0) == 1.0
    assert c.yield_flush(10.0, 1.0, 1000.0) == 1.0
    assert c.yield_flush(10.0, 1e-9, 1.0) == 1.0
    flushed = c.yield_flush(10.0, np.array([0.0, 1.0, 1.0, 1.0]), np.array([1.0, 0.5, 1.0, 2.0]))
    assert flushed[0] == 1 and (np.diff(flushed[1:]) > 0).all()
    assert flushed[2] == pytest.approx((10 + 1 - math.exp(-1)) / 11)


def test_scaled_area_keeps_the_mean_flux():
    area = c.area_scaled(2.0, 0.1, 3.0, 3600.0, 7200.0)
    assert 3.0 / (area * 7200.0) == pytest.approx(0.1 / (2.0 * 3600.0))
    assert c.loading(3.0, 5.0, c.area_scaled(2.0, 0.1, 3.0, 60.0, 60.0)) == pytest.approx(
        c.loading(0.1, 5.0, 2.0)
    )
