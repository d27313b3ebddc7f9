"""Filtration cycles: net flux and recovery, the balance of a day, availability."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from uffuncs.cell import call
from uffuncs.physics import cycles as c

LMH, MINUTE, HOUR, DAY = 1e-3 / 3600, 60.0, 3600.0, 86400.0
CYCLE = (80 * LMH, 30 * MINUTE, 200 * LMH, 1 * MINUTE)


@given(st.floats(1, 300), st.floats(1, 200), st.floats(0, 500), st.floats(0, 10), st.floats(0, 10))
def test_a_day_without_events_is_the_cycle(flux, filtration, backwash, backwash_time, idle):
    cells = (flux * LMH, filtration * MINUTE, backwash * LMH, backwash_time * MINUTE)
    assert c.flux_net_daily(*cells, idle * MINUTE) == pytest.approx(
        c.flux_net(*cells, idle * MINUTE), rel=1e-12, abs=1e-18
    )
    assert c.recovery_daily(*cells, idle * MINUTE) == pytest.approx(
        c.recovery_net(*cells), rel=1e-9, abs=1e-9
    )


def test_no_backwash_no_idle():
    assert c.flux_net(80 * LMH, 30 * MINUTE, 0.0, 0.0) == pytest.approx(80 * LMH)
    assert c.recovery_net(80 * LMH, 30 * MINUTE, 0.0, 0.0) == 1


def test_the_balance_of_a_day_counted_out():
    """A day of 24 h less 2 washes of 45 min and 20 min of tests, in cycles of 32 min, in litres per m²."""
    found = c.flux_net_daily(*CYCLE, 1 * MINUTE, 2 / DAY, 45 * MINUTE, 12e-3, 20 / 1440)
    cycles = (1440 - 90 - 20) / 32
    litres = cycles * (80 * 0.5 - 200 / 60) - 2 * 12
    assert found / LMH == pytest.approx(litres / 24)
    recovery = c.recovery_daily(*CYCLE, 1 * MINUTE, 2 / DAY, 45 * MINUTE, 12e-3, 20 / 1440)
    assert recovery == pytest.approx(litres / (cycles * 40))
    assert found / LMH == pytest.approx(call("UF_FLUX_NET_DAILY", [80, 30, 200, 1, 1, 2, 45, 12, 20]))


def test_recovery_with_a_flush_of_feed_water():
    assert c.recovery_net(*CYCLE, 2e-3) == pytest.approx((40 - 200 / 60) / (40 + 2))


def test_events_only_take_away():
    base = c.flux_net_daily(*CYCLE, 1 * MINUTE)
    for events in ((1 / DAY, 60 * MINUTE), (1 / DAY, 0.0, 5e-3), (0.0, 0.0, 0.0, 0.01)):
        assert c.flux_net_daily(*CYCLE, 1 * MINUTE, *events) < base
    # Tests alone take no water: the recovery stands.
    assert c.recovery_daily(*CYCLE, 1 * MINUTE, 0.0, 0.0, 0.0, 0.1) == pytest.approx(c.recovery_net(*CYCLE))


def test_reasons(why):
    assert "leave no time to filter" in why("UF_FLUX_NET_DAILY", 80, 30, 200, 1, 1, 24, 60)
    assert "leave no time to filter" in why("UF_RECOVERY_DAILY", 80, 30, 200, 1, 1, 23, 60, 0, 60)
    assert "nothing is fed" in why("UF_RECOVERY_NET", 0, 30, 200, 1)
    assert "nothing is fed" in why("UF_RECOVERY_DAILY", 0, 30, 200, 1)
    assert "more water than is filtered" in why("UF_FLUX_NET", 10, 5, 300, 2)
    assert "no time in service" in why("UF_AVAILABILITY", 100, 5, 24)
    assert math.isnan(c.availability(100 * HOUR, 5 * HOUR, 1.0))


def test_a_day_over_ranges():
    found = c.flux_net_daily(*CYCLE, 0.0, np.array([0.0, 2.0, 24.0]) / DAY, 60 * MINUTE)
    assert found[0] == c.flux_net_daily(*CYCLE) and found[1] == c.flux_net_daily(
        *CYCLE, 0.0, 2 / DAY, 60 * MINUTE
    )
    assert np.isnan(found[2])


def test_availability_counts_out():
    """A week of 168 h with 8 h of cleaning and half an hour of test a day: 168 − 8 − 3.5 h in service."""
    service = 168 - 8 - 3.5
    assert c.availability(service * HOUR, 8 * HOUR, 0.5 / 24) == pytest.approx(service / 168)
    assert c.availability(100 * HOUR, 0.0) == 1


def test_exposure_in_its_own_unit():
    assert call("UF_CHEMICAL_EXPOSURE", [0.2, 0.5, 52]) == pytest.approx(5.2)
