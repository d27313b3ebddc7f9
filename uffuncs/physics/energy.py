"""Energy and money: power of pumps and blowers, specific energy, cost of membranes and treatment."""

from __future__ import annotations

import numpy as np

from ..declaration import Number, Rule, worksheet_function
from ..units import YEAR
from .constants import STANDARD_ATMOSPHERE

PERRY = "Perry's Chemical Engineers' Handbook, 8th ed., McGraw-Hill (2008)"
METCALF_EDDY = ("Metcalf & Eddy, Wastewater Engineering: Treatment and Resource Recovery, 5th ed., "
                "McGraw-Hill (2014)")
BLANK_TARQUIN = "Blank & Tarquin, Engineering Economy, 7th ed., McGraw-Hill (2012)"
PETERS = ("Peters, Timmerhaus & West, Plant Design and Economics for Chemical Engineers, 5th ed., "
          "McGraw-Hill (2003)")

AIR_HEAT_CAPACITY_RATIO = 1.4  # diatomic gas
YEARLY_VOLUME = "Permeate volume in a year, downtime allowed for"
YEARLY_VOLUME = "Permeate volume in a year, downtime allowed for"
YEARLY = "rates are per year, the life is counted in years"

NO_PERMEATE = Rule(lambda permeate_flow: permeate_flow == 0, "the permeate flow is 0")


@worksheet_function(result="power", equation="P = Q Δp/η", source=PERRY)
def pump_power(flow: Number, pressure_rise: Number, efficiency: Number = 0.7) -> Number:
    """Power drawn by a pump.

    `efficiency` is that of pump, motor and drive together; with that of the pump alone it is the power at the
    shaft.
    """
    return flow * pressure_rise / efficiency


def _compresses(outlet_pressure, inlet_pressure, atmospheric_pressure):
    return (inlet_pressure + atmospheric_pressure > 0) & (outlet_pressure >= inlet_pressure)


@worksheet_function(
    result="power",
    equation="P = Q_a p_1 [κ/(κ − 1)] [(p_2/p_1)^((κ − 1)/κ) − 1]/η, p absolute, κ = 1.4",
    source=f"adiabatic compression of an ideal gas, {METCALF_EDDY}; {PERRY}",
    arguments={"efficiency": "Overall adiabatic efficiency of blower and motor"},
    refuses=[Rule(lambda inlet_pressure, atmospheric_pressure: inlet_pressure + atmospheric_pressure <= 0,
                  "{inlet_pressure} with {atmospheric_pressure} leaves no absolute pressure at the inlet"),
             Rule(lambda outlet_pressure, inlet_pressure: outlet_pressure < inlet_pressure,
                  "{outlet_pressure} is below {inlet_pressure}: nothing is compressed")],
)
def blower_power(
    air_flow: Number,
    outlet_pressure: Number,
    inlet_pressure: Number = 0.0,
    efficiency: Number = 0.6,
    atmospheric_pressure: Number = STANDARD_ATMOSPHERE,
) -> Number:
    """Power drawn by an air blower, by adiabatic compression.

    Dry air as an ideal gas, one stage without cooling, no heat lost; outlet and inlet pressure are gauge and
    are made absolute with the atmospheric pressure. The flow is that at inlet pressure and temperature, not
    standard or normal air.
    """
    compresses = _compresses(outlet_pressure, inlet_pressure, atmospheric_pressure)
    inlet = np.where(compresses, inlet_pressure + atmospheric_pressure, np.nan)[()]
    exponent = 1.0 - 1.0 / AIR_HEAT_CAPACITY_RATIO
    work = inlet / exponent * np.expm1(exponent * np.log1p((outlet_pressure - inlet_pressure) / inlet))
    return air_flow * work / efficiency


@worksheet_function(
    result="temperature_rise",
    equation="ΔT = P/(Q ρ c_p)",
    source=f"energy balance, {PERRY}",
    arguments={"power": "Power that stays in the liquid as heat"},
    refuses=[Rule(lambda flow: flow == 0, "the flow is 0: nothing carries the heat away")],
)
def temperature_rise(
    power: Number, flow: Number, density: Number = 1000.0, heat_capacity: Number = 4180.0
) -> Number:
    """Temperature rise of a stream that takes up power as heat.

    At steady state, no heat lost. In a recirculation loop nearly all the pump's power ends as heat in the
    liquid that leaves: take the flow through the plant, not that of the loop.
    """
    return power / (flow * density * heat_capacity)


@worksheet_function(result="energy", equation="E = P/Q_p", source="definition", refuses=[NO_PERMEATE])
def energy_specific(power: Number, permeate_flow: Number) -> Number:
    """Energy per volume of permeate."""
    return power / permeate_flow


@worksheet_function(
    result="energy",
    equation="E = (Q_f Δp_f + Q_l Δp_l)/(η Q_p)",
    source=f"energy balance, {PERRY}",
    refuses=[NO_PERMEATE],
)
def energy_crossflow(
    feed_flow: Number,
    feed_pressure_rise: Number,
    loop_flow: Number,
    loop_pressure_drop: Number,
    permeate_flow: Number,
    efficiency: Number = 0.7,
) -> Number:
    """Energy per volume of permeate of a crossflow plant: feed and recirculation pumps together.

    Both pumps have the one efficiency, motor included. No energy is recovered from the retentate.
    """
    return (feed_flow * feed_pressure_rise + loop_flow * loop_pressure_drop) / (efficiency * permeate_flow)


def _annuity_factor(rate: Number, years: Number) -> Number:
    """Yearly payment per capital, at the end of each year: i/(1 − (1 + i)^−n), and 1/n at rate 0."""
    some = np.where(rate > 0, rate, 1.0)[()]
    return np.where(rate > 0, some / -np.expm1(-years * np.log1p(some)), 1.0 / years)[()]


@worksheet_function(
    result="membrane_cost",
    equation="c_m = A c_A a/V_a, a = i/[1 − (1 + i)^−n], 1/n at i = 0",
    source=f"capital recovery by an annuity, {BLANK_TARQUIN}; {PETERS}",
    arguments={"life_years": "Life of the membranes", "permeate_volume_per_year": YEARLY_VOLUME},
    dimensional=YEARLY,
)
def cost_membrane(
    area: Number,
    price_per_area: Number,
    life_years: Number,
    permeate_volume_per_year: Number,
    discount_rate: Number = 0.0,
) -> Number:
    """Membrane replacement cost per volume of permeate, discounted over the membranes' life.

    Each set is paid when it goes in and recovered by equal payments at the end of each year of its life, at
    the discount rate: the annuity of its price, the same for every set if the price stays. Without a rate it
    is price over life. No value is left at the end; labour is not in it. (A sinking fund, saving for the next
    set beforehand, would cost less by rate times price in a year.)
    """
    yearly = area * price_per_area * _annuity_factor(discount_rate, life_years / YEAR) / YEAR
    return yearly / permeate_volume_per_year


@worksheet_function(
    result="cost",
    equation="c = K a/V_a + E c_e + c_m + c_o/V_a, a = i/[1 − (1 + i)^−n], 1/n at i = 0",
    source=f"capital recovery by an annuity, {BLANK_TARQUIN}; {PETERS}",
    arguments={"life_years": "Life of the plant", "permeate_volume_per_year": YEARLY_VOLUME,
               "capital": "Capital outlay without the membranes, if these are in the membrane cost"},
    dimensional=YEARLY,
)
def cost_treatment(
    capital: Number,
    interest_rate: Number,
    life_years: Number,
    energy: Number,
    energy_price: Number,
    membrane_cost: Number,
    other_cost: Number,
    permeate_volume_per_year: Number,
) -> Number:
    """Cost per volume of permeate: capital, energy, membranes and the rest.

    Capital is recovered by equal payments at the end of each year of the plant's life; energy is per volume
    of permeate. Rate and prices are both with inflation or both without. No taxes, no value left at the end.
    """
    fixed = capital * _annuity_factor(interest_rate, life_years / YEAR) / YEAR + other_cost
    return fixed / permeate_volume_per_year + energy * energy_price + membrane_cost
