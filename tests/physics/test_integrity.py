"""Integrity: the notice on every function, no default that raises a credit, equations against derivations."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from uffuncs.cell import call
from uffuncs.declaration import DECLARED
from uffuncs.errors import ErrorValue
from uffuncs.physics import integrity as i
from uffuncs.physics.water import water_density, water_surface_tension, water_viscosity

PSI, ATM = 6894.757293168, 101325.0
TOPIC = [record for record in DECLARED.values() if record.topic == "integrity"]
NUM = ErrorValue("#NUM!")

#: A call of each function that calls for no caution, in worksheet units.
SOUND = {
    "UF_BUBBLE_POINT": [3],
    "UF_DEFECT_DIAMETER": [1],
    "UF_TEST_PRESSURE": [3, 5, 0.2],
    "UF_AIR_LIQUID_RATIO": [1, 0, 0.7, 15, 1, "laminar"],
    "UF_LOG_REMOVAL_DECAY": [12, 40, 5, 0.3, 1, 1],
    "UF_DECAY_RATE_LIMIT": [4, 12, 40, 0.3, 1, 1],
    "UF_LOG_REMOVAL_BREACH": [100, 0.01, 1],
    "UF_BREACH_FIBER": [0.2, 0.5, [[1], [0.5]], 1],
    "UF_LOG_REMOVAL_CHALLENGE": [[[5], [6]]],
}


def why(name, *cells):
    return call("UF_WHY", [f"UF_{name}", *cells])


# --- the notice, and defaults --------------------------------------------------------------------------


def test_the_list_of_sound_calls_is_complete():
    assert {record.worksheet_name for record in TOPIC} == set(SOUND)


@pytest.mark.parametrize("record", TOPIC, ids=lambda record: record.worksheet_name)
def test_every_function_carries_the_notice(record):
    assert i.NOTICE[1:] in record.notes and i.NOTICE[1:] in record.python.__doc__
    answer = call("UF_WHY", [record.worksheet_name, *SOUND[record.worksheet_name]])
    assert answer.startswith("ok: ") and answer.endswith(i.NOTICE)
    assert i.IN_SHORT in record.summary


def test_no_default_raises_a_credit():
    optional = {(r.worksheet_name, a.name) for r in TOPIC for a in r.arguments if not a.required}
    assert {name for name, _ in optional} == {
        "UF_BUBBLE_POINT", "UF_DEFECT_DIAMETER", "UF_TEST_PRESSURE", "UF_AIR_LIQUID_RATIO"}
    assert {a for name, a in optional if name == "UF_AIR_LIQUID_RATIO"} == {"expansion_factor"}
    # The defaults of angle and shape ask for the highest test pressure and admit the coarsest resolution.
    for angle, shape in [(0.3, 1.0), (0.0, 0.7), (1.2, 0.4)]:
        assert i.test_pressure(3e-6, 280.0, 1e4, angle, shape) < i.test_pressure(3e-6, 280.0, 1e4)
        assert i.defect_diameter(1e5, 0.07, angle, shape) < i.defect_diameter(1e5, 0.07)


# --- bubble point --------------------------------------------------------------------------------------


@given(st.floats(1e-8, 1e-4), st.floats(0.01, 0.1), st.floats(0, 1.5), st.floats(0.05, 1))
def test_bubble_point_and_defect_diameter_are_inverse(diameter, tension, angle, shape):
    pressure = i.bubble_point(diameter, tension, angle, shape)
    assert i.defect_diameter(pressure, tension, angle, shape) == pytest.approx(diameter, rel=1e-12)


@given(st.floats(274, 310), st.floats(1e-6, 5e-6), st.floats(0, 5e4))
def test_the_test_pressure_finds_the_resolution(temperature, resolution, back):
    pressure = i.test_pressure(resolution, temperature, back)
    found = i.defect_diameter(pressure - back, water_surface_tension(temperature))
    assert found == pytest.approx(resolution, rel=1e-10)
    assert i.test_pressure(resolution, temperature - 1, back) > pressure


@pytest.mark.parametrize("angle", [90, 90.5, 180])
def test_a_membrane_that_water_does_not_wet_is_refused(angle):
    for name, cells in [("BUBBLE_POINT", (3, 72, angle)), ("DEFECT_DIAMETER", (1, 72, angle)),
                        ("TEST_PRESSURE", (3, 20, 0, angle))]:
        assert call(f"UF_{name}", list(cells)) == NUM
        assert f"contact_angle {angle} deg is not below 90 deg" in why(name, *cells)
    assert call("UF_BUBBLE_POINT", [3, 72, [[angle], [60]]])[0][0] == NUM
    assert call("UF_BUBBLE_POINT", [3, 72, 89.9]) > 0


def test_a_coarse_resolution_is_told():
    assert "coarser than the 3 µm" in why("TEST_PRESSURE", 3.1, 20, 0)
    assert why("TEST_PRESSURE", 3, 20, 0).startswith("ok")
    assert "colder water needs more pressure" in why("BUBBLE_POINT", 3)
    assert "colder water" not in why("BUBBLE_POINT", 3, 74.9)


# --- air and water through one breach ------------------------------------------------------------------


#: Test pressure and share of back pressure, transmembrane pressure, temperature.
CONDITIONS = st.floats(0.1e5, 3e5), st.floats(0, 0.9), st.floats(0.1e5, 2e5), st.floats(274, 310)


def air_viscosity_by_lemmon_jacobsen(temperature):
    """Dilute gas plus the first density term at 1 atm, Int. J. Thermophys. 25 (2004) 21, in Pa·s."""
    x = math.log(temperature / 103.3)
    collision = math.exp(sum(b * x**n for n, b in enumerate([0.431, -0.4623, 0.08406, 0.005341, -0.00331])))
    dilute = 0.0266958 * math.sqrt(28.9586 * temperature) / (0.360**2 * collision)
    tau, delta = 132.6312 / temperature, ATM / (8.314510 * temperature) / 1000 / 10.4477
    residual = 10.72 * tau**0.2 * delta - 8.876 * tau**0.6 * delta * math.exp(-delta)
    return (dilute + residual) * 1e-6


@pytest.mark.parametrize("celsius", [0, 5, 10, 20, 30, 40, 60])
def test_viscosity_of_air(celsius):
    temperature = celsius + 273.15
    expected = air_viscosity_by_lemmon_jacobsen(temperature)
    assert i._air_viscosity(temperature) == pytest.approx(expected, rel=2e-3)


@given(*CONDITIONS, st.floats(0.7e5, 1.05e5))
def test_laminar_ratio_from_the_flow_in_a_capillary(test, share, pressure, temperature, atmosphere):
    """Isothermal Poiseuille flow: the mass flow goes by the integral of density over pressure."""
    back = share * test
    radius, length = 1e-6, 1e-3
    conductance = math.pi * radius**4 / (8 * length)
    at_atmosphere = quad(lambda p: p / atmosphere, back + atmosphere, test + atmosphere)[0]
    air = conductance / i._air_viscosity(temperature) * at_atmosphere
    water = conductance / water_viscosity(temperature) * pressure
    value = i.air_liquid_ratio(test, back, pressure, temperature, atmosphere, "laminar")
    assert value == pytest.approx(air / water, rel=1e-9)


@given(*CONDITIONS, st.floats(0.2, 1))
def test_turbulent_ratio_from_darcy(test, share, pressure, temperature, y):
    """One loss coefficient K: u = (2 Δp/(K ρ))^½, air at the inlet's density, counted at 14.7 psia, 60 °F."""
    back, loss, area = share * test, 3.0, 1e-9
    gas = 8.314462618 / 0.0289647  # J/(kg·K)
    inlet_density = (test + 14.7 * PSI) / (gas * temperature)
    standard_density = 14.7 * PSI / (gas * 288.7056)
    air = y * area * math.sqrt(2 * (test - back) * inlet_density / loss) / standard_density
    water = area * math.sqrt(2 * pressure / (loss * 998.5))
    value = i.air_liquid_ratio(test, back, pressure, temperature, 14.7 * PSI, "turbulent", y)
    assert value == pytest.approx(air / water, rel=2e-3)


def test_published_turbulent_value_and_the_way_to_the_lower_ratio():
    cells = ["15 psi", 0, "10 psi", "68 degF", "14.7 psia"]
    assert call("UF_AIR_LIQUID_RATIO", [*cells, "turbulent", 1]) == pytest.approx(49.381, abs=5e-4)
    assert call("UF_AIR_LIQUID_RATIO", [*cells, "laminar"]) == pytest.approx(124.63, abs=0.01)
    assert "state its ground" in why("AIR_LIQUID_RATIO", *cells, "laminar")
    assert "expansion_factor is not used" in why("AIR_LIQUID_RATIO", *cells, "laminar", 0.8)


@pytest.mark.parametrize("cells", [[1, 0, 0.7, 15, 1, "turbulent"], [1, 0, 0.7, 15, 1, "turbulent", None]])
def test_no_expansion_factor_is_assumed(cells):
    assert call("UF_AIR_LIQUID_RATIO", cells) == NUM
    assert "needs expansion_factor" in why("AIR_LIQUID_RATIO", *cells)
    assert call("UF_AIR_LIQUID_RATIO", [[[1], [1.1]], *cells[1:]]) == [[NUM], [NUM]]
    assert call("UF_AIR_LIQUID_RATIO", [*cells[:6], 1.01]) == NUM
    assert call("UF_AIR_LIQUID_RATIO", cells[:5]).code == "#VALUE!"  # nor a regime


@pytest.mark.parametrize("regime", ["laminar", "turbulent"])
def test_no_air_against_a_higher_back_pressure(regime):
    for back in (1, 1.5):
        assert call("UF_AIR_LIQUID_RATIO", [1, back, 0.7, 15, 1, regime, 0.8]) == NUM
        assert "no air flows" in why("AIR_LIQUID_RATIO", 1, back, 0.7, 15, 1, regime, 0.8)
    block = call("UF_AIR_LIQUID_RATIO", [1, [[1.5], [0.1]], 0.7, 15, 1, regime, 0.8])
    assert block[0][0] == NUM and block[1][0] > 0


def test_cautions_of_the_ratio():
    assert "speed of sound" in why("AIR_LIQUID_RATIO", 2, 0, 0.7, 15, 1, "turbulent", 0.7)
    assert why("AIR_LIQUID_RATIO", 1, 0, 0.7, 15, 1, "turbulent", 0.7).startswith("ok")
    assert "ask the regulator" in why("AIR_LIQUID_RATIO", 1, 0.1, 0.7, 15, 1, "laminar")


# --- log removal from the decay and the breach ---------------------------------------------------------

positive = st.floats(1e-3, 1e3)


@given(positive, st.floats(1, 500), st.floats(0.1, 100), positive, st.floats(1, 50), st.floats(0.6e5, 1.1e5))
def test_decay_limit_and_breach_say_the_same(flow, ratio, decay, volume, factor, atmosphere):
    removal = i.log_removal_decay(flow, ratio, decay, volume, factor, atmosphere)
    limit = i.decay_rate_limit(removal, flow, ratio, volume, factor, atmosphere)
    assert limit == pytest.approx(decay, rel=1e-11)
    water = decay * volume / atmosphere / ratio  # the air that escapes, turned into water
    assert i.log_removal_breach(flow, water, factor) == pytest.approx(removal, abs=1e-11)
    assert i.log_removal_decay(flow, ratio, 1.01 * decay, volume, factor, atmosphere) < removal
    assert i.log_removal_decay(flow, ratio, decay, volume, 1.01 * factor, atmosphere) < removal


@pytest.mark.parametrize("decay", [0, -3])
def test_no_decay_is_refused(decay):
    assert call("UF_LOG_REMOVAL_DECAY", [12, 40, decay, 0.3, 1, 1]) == NUM
    assert f"decay_rate {decay} mbar/min is no decay" in why("LOG_REMOVAL_DECAY", 12, 40, decay, 0.3, 1, 1)
    block = call("UF_LOG_REMOVAL_DECAY", [12, 40, [[decay], [5]], 0.3, 1, 1])
    assert block[0][0] == NUM and block[1][0] > 0


def test_other_refusals_and_cautions_of_the_removal():
    assert "permeate flow is 0" in why("LOG_REMOVAL_DECAY", 0, 40, 5, 0.3, 1, 1)
    assert "permeate flow is 0" in why("LOG_REMOVAL_BREACH", 0, 0.1, 1)
    assert "smallest breach" in why("LOG_REMOVAL_BREACH", 10, 0, 1)
    assert call("UF_LOG_REMOVAL_BREACH", [10, [[0], [0.1]], 1]) == [[NUM], [pytest.approx(2)]]
    assert "no removal at all" in why("LOG_REMOVAL_BREACH", 1, 2, 1)
    assert "deposition mode only" in why("LOG_REMOVAL_BREACH", 10, 0.1, 1)
    assert "deposition" not in why("LOG_REMOVAL_BREACH", 10, 0.1, 1.5)
    for missing in range(6):
        cells = [12, 40, 5, 0.3, 1, 1]
        cells[missing] = None
        assert call("UF_LOG_REMOVAL_DECAY", cells).code == "#VALUE!"


# --- a cut fiber ---------------------------------------------------------------------------------------


@given(st.floats(1e3, 3e5), st.floats(2e-4, 2e-3), st.floats(1e-3, 3), st.floats(3e-4, 3e-3))
def test_breach_of_a_fiber_balances_the_pressure(pressure, diameter, length, viscosity):
    flow = i.breach_fiber(pressure, diameter, np.array([length]), viscosity)
    u = flow / (math.pi / 4 * diameter**2)
    loss = 32 * viscosity * length * u / diameter**2 + 1.5 * water_density(293.15) * u**2 / 2
    assert loss == pytest.approx(pressure, rel=1e-11)
    hagen_poiseuille = math.pi * diameter**4 * pressure / (128 * viscosity * length)
    assert flow < hagen_poiseuille


def test_breach_of_a_fiber_limits_and_pieces():
    long = i.breach_fiber(1e4, 3e-4, np.array([50.0]), 1e-3)
    assert long == pytest.approx(math.pi * 3e-4**4 * 1e4 / (128 * 1e-3 * 50), rel=1e-5)
    short = i.breach_fiber(1e5, 8e-4, np.array([1e-9]), 1e-3)
    orifice = math.sqrt(2e5 / 1.5 / water_density(293.15))
    assert short == pytest.approx(math.pi / 4 * 8e-4**2 * orifice, rel=1e-5)
    a, b = (i.breach_fiber(3e4, 5e-4, np.array([x]), 1e-3) for x in (1.4, 0.1))
    both = i.breach_fiber(3e4, 5e-4, np.array([1.4, 0.1]), 1e-3)
    assert both == pytest.approx(a + b, rel=1e-14)
    middle = i.breach_fiber(3e4, 5e-4, np.array([0.75, 0.75]), 1e-3)
    assert both > middle  # the middle is the best place of a cut
    assert i.breach_fiber(0.0, 5e-4, 1.0, 1e-3) == 0 and i.breach_fiber(3e4, 5e-4, 1.4, 1e-3) == a
    pressures = np.array([1e4, 2e4])
    assert i.breach_fiber(pressures, 5e-4, np.array([1.4, 0.1]), 1e-3).shape == (2,)


def test_cautions_of_a_cut_fiber():
    assert "one piece" in why("BREACH_FIBER", 0.2, 0.5, 1, 1)
    assert "Reynolds number" in why("BREACH_FIBER", 1, 0.8, [[1.4], [0.05]], 1)


# --- challenge tests -----------------------------------------------------------------------------------


@given(st.lists(st.floats(2, 8), min_size=1, max_size=60), st.randoms())
def test_challenge_rule(values, random):
    expected = min(values) if len(values) < 20 else np.percentile(values, 10, method="weibull")
    random.shuffle(values)
    assert i.log_removal_challenge(np.array(values)) == pytest.approx(expected, rel=1e-12)


def test_challenge_rule_changes_at_twenty_modules():
    assert i.log_removal_challenge(np.append(3.0, np.full(18, 6.0))) == 3
    twenty = np.append([3.0, 4.0], np.arange(5, 23.0))
    assert i.log_removal_challenge(twenty) == pytest.approx(4.1)  # rank 2.1
    assert i.log_removal_challenge(np.arange(1.0, 30)) == pytest.approx(3)  # rank 3 exactly
    assert "lowest of fewer than 20" in why("LOG_REMOVAL_CHALLENGE", [[5], [6]])
    assert "10th percentile" in why("LOG_REMOVAL_CHALLENGE", [[5 + n / 20] for n in range(20)])
