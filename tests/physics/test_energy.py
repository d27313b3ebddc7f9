"""Power and money: energy conserved, compression integrated another way, payments that add up."""

from decimal import Decimal, getcontext

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from uffuncs.cell import call
from uffuncs.errors import ErrorValue
from uffuncs.physics import energy as e
from uffuncs.units import YEAR

NUM = ErrorValue("#NUM!")
rates = st.floats(1e-6, 1)


def why(name, *cells):
    return call("UF_WHY", [f"UF_{name}", *cells])


# --- power --------------------------------------------------------------------------------------------------


@given(st.floats(-0.5e5, 1e5), st.floats(0, 3e5), st.floats(0.6e5, 1.1e5))
def test_blower_work_is_the_integral_along_the_adiabat(inlet, rise, atmosphere):
    low, high = inlet + atmosphere, inlet + atmosphere + rise
    work = quad(lambda p: (low / p) ** (1 / 1.4), low, high, epsabs=0, epsrel=1e-11)[0]  # ∫V dp, V = 1 at low
    found = e.blower_power(1.0, inlet + rise, inlet, 1.0, atmosphere)
    assert found == pytest.approx(work, rel=1e-9, abs=1e-6)


def test_blower_at_little_pressure_is_a_pump():
    for rise in (1e-6, 1e-2, 1.0):
        assert e.blower_power(2.0, rise, 0.0, 0.5) == pytest.approx(2.0 * rise / 0.5, rel=1e-5)
    assert e.blower_power(2.0, 0.0) == 0


def test_adiabatic_lies_between_isothermal_and_incompressible():
    p = 101325.0
    for rise in (1e4, 1e5, 5e5):
        assert p * np.log((p + rise) / p) < e.blower_power(1.0, rise, 0.0, 1.0) < rise


def test_gauge_and_absolute_pressures():
    """One bar gauge at 0.8 bar of atmosphere: a ratio of 1.8/0.8."""
    expected = 3.5 * 80000 * ((1.8 / 0.8) ** (2 / 7) - 1) / 0.6
    assert e.blower_power(1.0, 1e5, 0.0, 0.6, 0.8e5) == pytest.approx(expected, rel=1e-13)
    assert call("UF_BLOWER_POWER", [3600, 1, 0, 0.6, "0.8 bara"]) == pytest.approx(expected / 1000, rel=1e-13)
    assert call("UF_BLOWER_POWER", [3600, 1, 0, 0.6, "0.8 barg"]) == ErrorValue("#VALUE!")
    assert call("UF_BLOWER_POWER", [3600, "1 bara"]) == ErrorValue("#VALUE!")


def test_what_is_no_compression_is_refused_in_its_own_place():
    assert call("UF_BLOWER_POWER", [1000, [[0.5], [-0.2]]])[1][0] == NUM
    assert "is below inlet_pressure" in why("BLOWER_POWER", 1000, -0.2)
    for inlet in (-0.9e5, -0.8e5):
        assert np.isnan(e.blower_power(1.0, 1e5, inlet, 0.6, 0.8e5))
    assert "leaves no absolute pressure" in why("BLOWER_POWER", 1000, 0.5, -0.9, 0.6, 0.8)


FLOW, PRESSURE = st.floats(1e-4, 10), st.floats(1e3, 1e6)


@given(FLOW, PRESSURE, FLOW, PRESSURE, st.floats(1e-4, 1), st.floats(0.1, 1))
def test_crossflow_energy_is_that_of_both_pumps(feed, rise, loop, drop, permeate, efficiency):
    both = e.pump_power(feed, rise, efficiency) + e.pump_power(loop, drop, efficiency)
    assert e.energy_crossflow(feed, rise, loop, drop, permeate, efficiency) == pytest.approx(
        e.energy_specific(both, permeate), rel=1e-13)


def test_a_throttled_pump_heats_the_liquid():
    """All power of a pump of efficiency 1 becomes heat: ΔT = Δp/(ρ c)."""
    power = e.pump_power(0.02, 4e5, 1.0)
    assert e.temperature_rise(power, 0.02, 1000.0, 4180.0) == pytest.approx(4e5 / 4.18e6, rel=1e-14)
    rise = 10e3 / (10 / 3600 * 1000 * 4180)
    assert call("UF_TEMPERATURE_RISE", [10, "10 m³/h"]) == pytest.approx(rise, rel=1e-13)


def test_no_flow_no_result():
    assert call("UF_TEMPERATURE_RISE", [10, [[0], [10]]])[0][0] == NUM
    assert "the flow is 0" in why("TEMPERATURE_RISE", 10, 0)
    assert "the permeate flow is 0" in why("ENERGY_SPECIFIC", 10, 0)
    assert "the permeate flow is 0" in why("ENERGY_CROSSFLOW", 10, 3, 200, 1.5, 0)


# --- money --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("rate", [0.0, 1e-9, 0.01, 0.08, 1.0])
@pytest.mark.parametrize("life", [1, 2, 7, 25])
def test_the_payments_are_worth_the_price(rate, life):
    payment = e._annuity_factor(rate, float(life))
    assert sum(payment / (1 + rate) ** year for year in range(1, life + 1)) == pytest.approx(1, rel=1e-12)


@pytest.mark.parametrize("rate", [1e-17, 1e-15, 1e-12, 1e-8, 1e-4])
@pytest.mark.parametrize("life", [1, 20])
def test_small_rates_lose_no_digits(rate, life):
    getcontext().prec = 80
    i = Decimal(rate)
    exact = float(i / (1 - (1 + i) ** -life))
    assert e._annuity_factor(rate, float(life)) == pytest.approx(exact, rel=1e-14)


@given(rates, st.floats(1, 60))
def test_the_annuity_lies_above_both_its_limits(rate, life):
    factor = e._annuity_factor(rate, life)
    assert factor >= rate and factor >= 1 / life * (1 - 1e-12)
    assert factor <= rate + 1 / life + 1e-12  # savings without interest, plus the interest on the price


def test_arrays_of_rates():
    rate = np.array([0.0, 0.05, 0.0, 0.1])
    assert e._annuity_factor(rate, 10.0) == pytest.approx([0.1, 0.129504575, 0.1, 0.162745395], rel=1e-8)
    column = call("UF_COST_MEMBRANE", [1000, 100, 10, 1e5, [[0], [0.05]]])
    assert [v[0] for v in column] == pytest.approx([0.1, 0.129504575], rel=1e-8)


@given(st.floats(1e-3, 1), st.integers(1, 40))
def test_a_sinking_fund_costs_less_by_the_interest_on_the_price(rate, life):
    """As the text says: what is saved each year grows to the price by the end."""
    saving = e._annuity_factor(rate, float(life)) - rate
    assert sum(saving * (1 + rate) ** year for year in range(life)) == pytest.approx(1, rel=1e-6)


def test_membranes_as_capital_cost_the_same():
    price, rate, life, volume = 250_000.0, 0.07, 6.0, 400_000.0
    as_membranes = call("UF_COST_MEMBRANE", [2500, 100, life, volume, rate])
    as_capital = call("UF_COST_TREATMENT", [price, rate, life, 0, 0, 0, 0, volume])
    assert as_capital == pytest.approx(as_membranes, rel=1e-13)


def test_the_parts_of_the_cost_add_up():
    everything = [1e6, 0.06, 15, 0.2, 0.1, 0.03, 25_000, 500_000]
    parts = ([1e6, 0.06, 15, 0, 0, 0, 0, 500_000], [0, 0.06, 15, 0.2, 0.1, 0, 0, 500_000],
             [0, 0.06, 15, 0, 0, 0.03, 0, 500_000], [0, 0.06, 15, 0, 0, 0, 25_000, 500_000])
    values = [call("UF_COST_TREATMENT", list(p)) for p in parts]
    assert values[1:] == pytest.approx([0.02, 0.03, 0.05], rel=1e-13)
    assert sum(values) == pytest.approx(call("UF_COST_TREATMENT", everything), rel=1e-13)


def test_years_are_counted_as_the_worksheet_counts_them():
    assert e.cost_membrane(10.0, 50.0, 5 * YEAR, 1000 / YEAR) == pytest.approx(0.1, rel=1e-14)
    assert call("UF_COST_MEMBRANE", [10, 50, "60 month", 1000]) == pytest.approx(0.1, rel=1e-9)
