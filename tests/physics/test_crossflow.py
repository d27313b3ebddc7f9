"""Crossflow: Sherwood numbers against an independent solution, branches, limits, pressure losses."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from uffuncs.cell import call
from uffuncs.errors import ErrorValue
from uffuncs.physics import _graetz
from uffuncs.physics.crossflow import (LAMINAR_BELOW, TURBULENT_ABOVE, area_fiber, flow_area_spacer,
                                       flux_diameter, hydraulic_diameter_slit, hydraulic_diameter_spacer,
                                       reynolds, reynolds_power_law, velocity)
from uffuncs.physics.crossflow_pressure import (pressure_drop_fiber, pressure_drop_slit, pressure_drop_spacer,
                                                pressure_drop_tube)
from uffuncs.physics.crossflow_transfer import (TURBULENT, flux_inertial_lift, sherwood_graetz,
                                                sherwood_leveque, sherwood_spacer, sherwood_turbulent,
                                                transfer_coefficient, transfer_shear_induced, transfer_slit,
                                                transfer_spacer, transfer_tube)

EXACT_LEVEQUE = {"tube": 1.5 * (8 / 9) ** (1 / 3) / math.gamma(4 / 3),
                 "slit": 1.5 * (12 / 9) ** (1 / 3) / math.gamma(4 / 3)}


# --- laminar flow: an independent solution of the problem of Graetz -----------------------------------------


def chebyshev(n: int):
    """Nodes on [−1, 1], differentiation matrix, and the weights of Clenshaw and Curtis."""
    x = np.cos(np.pi * np.arange(n + 1) / n)
    c = np.where((np.arange(n + 1) % n) == 0, 2.0, 1.0) * (-1.0) ** np.arange(n + 1)
    d = np.outer(c, 1 / c) / (x[:, None] - x[None, :] + np.eye(n + 1))
    d -= np.diag(d.sum(axis=1))
    moments = np.array([2 / (1 - k * k) if k % 2 == 0 else 0.0 for k in range(n + 1)])
    weights = np.linalg.solve(np.cos(np.outer(np.arange(n + 1), np.arccos(x))), moments)
    return x, d, weights


def mixing_cup_excess(channel: str, n: int = 140):
    """θ as a function of Gz, by Chebyshev collocation across the channel and exact integration along it."""
    x, d, w = chebyshev(n)
    if channel == "tube":  # in ρ = r² on [0, 1], where the axis needs no condition
        rho = (1 + x) / 2
        operator = 4 * (np.diag(rho) @ (4 * d @ d) + 2 * d)
        speed, w, inner, along = 1 - rho, w / 2 * 2 * (1 - rho), slice(1, None), 2.0
    else:
        operator, speed, inner, along = d @ d, 1 - x**2, slice(1, -1), 32.0 / 3.0
        w = 0.75 * w * (1 - x**2)
    decay, modes = np.linalg.eig(operator[inner, inner] / speed[inner, None])
    share = (w[inner] @ modes) * np.linalg.solve(modes, np.ones(modes.shape[0]))
    return lambda gz: float(np.real(np.sum(share * np.exp(decay * along / gz))))


@pytest.fixture(scope="module", params=["tube", "slit"])
def solution(request):
    return request.param, mixing_cup_excess(request.param)


def test_graetz_against_an_independent_solution(solution):
    channel, theta = solution
    for gz in np.geomspace(0.5, 2e4, 60):
        exact = -gz / 4 * math.log(theta(gz))
        assert sherwood_graetz(100.0, gz, 1e-3, 0.1, channel) == pytest.approx(exact, rel=1e-7), gz


def test_local_value_is_the_slope_of_the_independent_solution(solution):
    channel, theta = solution
    for gz in np.geomspace(2, 1e4, 25):
        step = 1e-3 / gz
        z = np.array([-2, -1, 1, 2]) * step + 1 / gz
        slope = np.dot([1, -8, 8, -1], [math.log(theta(1 / v)) for v in z]) / (12 * step)
        assert _graetz.local(1 / gz, _graetz.CHANNELS[channel]) == pytest.approx(-slope / 4, rel=1e-6), gz


@pytest.mark.parametrize("channel, floor", [("tube", 3.6567934577632923), ("slit", 7.5407008740695645)])
def test_far_down_the_channel_the_floor(channel, floor):
    assert sherwood_graetz(0.0, 1e4, 1e-3, 1.0, channel) == pytest.approx(floor, rel=1e-12)
    assert sherwood_graetz(1e-9, 1.0, 1e-3, 1.0, channel) == pytest.approx(floor, rel=1e-9)
    assert _graetz.local(50.0, _graetz.CHANNELS[channel]) == pytest.approx(floor, rel=1e-12)


def test_the_floor_of_a_tube_in_a_general_library():
    ht = pytest.importorskip("ht")
    floor = ht.conv_internal.laminar_T_const()
    assert sherwood_graetz(1e-6, 1.0, 1e-3, 1.0) == pytest.approx(floor, abs=0.005)


@pytest.mark.parametrize("channel", ["tube", "slit"])
def test_in_the_entrance_leveque_s_law(channel):
    for gz, tolerance in ((1e9, 2e-3), (1e15, 2e-5)):
        leading = EXACT_LEVEQUE[channel] * gz ** (1 / 3)
        assert sherwood_graetz(1.0, gz, 1.0, 1.0, channel) == pytest.approx(leading, rel=tolerance)
    leading = EXACT_LEVEQUE[channel] * 100
    assert sherwood_leveque(1.0, 1e6, 1.0, 1.0, channel) == pytest.approx(leading, rel=4e-3)


def test_how_far_leveque_is_from_the_exact_average():
    """What the docstring says of it: within 6 % above Gz 20 in a tube, within 5 % above Gz 300 in a slit."""
    for channel, lowest, within in (("tube", 20.0, 0.0601), ("slit", 300.0, 0.05)):
        gz = np.geomspace(lowest, 1e8, 200)
        ratio = sherwood_leveque(1.0, gz, 1.0, 1.0, channel) / sherwood_graetz(1.0, gz, 1.0, 1.0, channel)
        assert np.abs(ratio - 1).max() < within


@pytest.mark.parametrize("channel", [_graetz.TUBE, _graetz.PLATES])
def test_both_parts_meet_and_arrays_equal_numbers(channel):
    below, above = channel.change * (1 - 1e-12), channel.change * (1 + 1e-12)
    assert _graetz.average(below, channel) == pytest.approx(_graetz.average(above, channel), rel=2e-9)
    assert _graetz.local(1 / below, channel) == pytest.approx(_graetz.local(1 / above, channel), rel=2e-8)
    gz = np.concatenate([[0.0], np.geomspace(1e-6, 1e12, 500)])
    values = _graetz.average(gz, channel)
    assert np.allclose(values, [_graetz.average(float(g), channel) for g in gz], rtol=1e-13, atol=0)
    assert np.all(np.diff(values) > 0)


@pytest.mark.parametrize("channel", [_graetz.TUBE, _graetz.PLATES])
def test_the_average_is_the_mean_of_the_local_values(channel):
    from scipy.integrate import quad

    for gz in (5.0, 80.0, 700.0, 5e4):  # in s = x^(1/3) the integrand is smooth
        mean, _ = quad(lambda s: _graetz.local(s**3 / gz, channel) * 3 * s * s, 0, 1, epsabs=0, epsrel=1e-10)
        assert _graetz.average(gz, channel) == pytest.approx(mean, rel=1e-8)


# --- turbulent flow, spacers, and the blend between laminar and turbulent -----------------------------------


def test_turbulent_against_a_general_library():
    ht = pytest.importorskip("ht")
    for re, pr in ((1e4, 0.7), (3e4, 7.0), (1e5, 150.0)):
        colburn = ht.conv_internal.turbulent_Colburn(re, pr)
        assert sherwood_turbulent(re, pr) == pytest.approx(colburn, rel=1e-12)


def test_turbulent_correlations_agree_roughly_where_all_are_used():
    values = [sherwood_turbulent(3e4, 3000.0, name) for name in TURBULENT]
    assert max(values) < 1.8 * min(values)


TRANSFERS = [
    (transfer_tube, 1e-2, lambda re, sc, ratio: sherwood_graetz(re, sc, 1.0, ratio, "tube")),
    (transfer_slit, 2e-3, lambda re, sc, ratio: sherwood_graetz(re, sc, 1.0, ratio, "slit")),
]


@pytest.mark.parametrize("transfer, size, laminar", TRANSFERS)
@pytest.mark.parametrize("correlation", list(TURBULENT))
def test_transfer_by_branch(transfer, size, laminar, correlation):
    diffusion, length = 7e-11, 2.0
    diameter = size if transfer is transfer_tube else 2 * size
    schmidt = 1e-3 / (1000.0 * diffusion)

    def k(re):
        return transfer(re * 1e-6 / diameter, size, length, diffusion, 1e-3, 1000.0, correlation)

    def from_sherwood(sh):
        return transfer_coefficient(sh, diffusion, diameter)

    low, high = from_sherwood(laminar(LAMINAR_BELOW, schmidt, length / diameter)), from_sherwood(
        sherwood_turbulent(TURBULENT_ABOVE, schmidt, correlation))
    assert k(800.0) == pytest.approx(from_sherwood(laminar(800.0, schmidt, length / diameter)), rel=1e-12)
    assert k(2e4) == pytest.approx(from_sherwood(sherwood_turbulent(2e4, schmidt, correlation)), rel=1e-12)
    for edge, value in ((LAMINAR_BELOW, low), (TURBULENT_ABOVE, high)):
        assert k(edge * (1 - 1e-9)) == pytest.approx(value, rel=1e-8)
        assert k(edge * (1 + 1e-9)) == pytest.approx(value, rel=1e-8)
    assert k(math.sqrt(LAMINAR_BELOW * TURBULENT_ABOVE)) == pytest.approx(math.sqrt(low * high), rel=1e-9)


@pytest.mark.parametrize("transfer", [transfer_tube, transfer_slit])
def test_transfer_of_arrays_over_all_branches(transfer):
    u = np.geomspace(1e-3, 20, 60)
    values = transfer(u, 1e-3, 1.0, 1e-10, 1e-3, 1000.0)
    one_by_one = [transfer(float(v), 1e-3, 1.0, 1e-10, 1e-3, 1000.0) for v in u]
    assert np.allclose(values, one_by_one, rtol=1e-13, atol=0)
    assert np.all(np.diff(values) > 0)
    lengths = transfer(0.5, 1e-3, np.array([0.1, 1.0, 10.0]), 1e-10, 1e-3, 1000.0)
    assert np.all(np.diff(lengths) < 0)


@pytest.mark.parametrize("velocity_given, words", [
    (0.5, "ok: laminar branch"), (3, "caution: transition"),
    (30, "caution: turbulent branch, dittus-boelter: Schmidt number"),
])
def test_why_names_the_branch(why, velocity_given, words):
    assert why("UF_TRANSFER_TUBE", velocity_given, 1, 1, 1e-10, 1, 1000).startswith(words)
    assert why("UF_TRANSFER_SLIT", velocity_given, 0.5, 1, 1e-10, 1, 1000).startswith(words)


def test_why_without_an_extrapolation(why):
    assert why("UF_TRANSFER_TUBE", 6, 5, 1, 1e-10, 1, 1000, "harriott-hamilton") == (
        "ok: turbulent branch, Reynolds number above 4000: the correlation")
    assert "outside 1000 to inf" in why("UF_SHERWOOD_TURBULENT", 2e4, 500, "pinczewski-sideman")
    assert "Graetz number (slit) 40" in why("UF_SHERWOOD_LEVEQUE", 1000, 100, 2, 5, "slit")
    assert why("UF_SHERWOOD_LEVEQUE", 1000, 100, 2, 5, "tube") == "ok"
    assert "caution" in why("UF_SHERWOOD_SPACER", 50, 1000)
    assert why("UF_TRANSFER_SPACER", 0.2, 0.8, 0.9, 0.4, 1e-10, 1, 1000) == "ok"


def test_spacer_laws_from_their_parts():
    h, voidage, filament = 0.8e-3, 0.88, 0.4e-3
    d = hydraulic_diameter_spacer(h, voidage, filament)
    re = reynolds(0.25, d, 1000.0, 1e-3)
    assert transfer_spacer(0.25, h, voidage, filament, 1e-10, 1e-3, 1000.0) == pytest.approx(
        transfer_coefficient(sherwood_spacer(re, 1e4), 1e-10, d), rel=1e-12)
    darcy = 6.23 * re**-0.3
    assert pressure_drop_spacer(0.25, h, voidage, filament, 0.9, 1e-3, 1000.0) == pytest.approx(
        darcy * 0.9 / d * 1000 * 0.25**2 / 2, rel=1e-12)
    assert pressure_drop_spacer(0.0, h, voidage, filament, 0.9, 1e-3, 1000.0) == 0.0


def test_hydraulic_diameter_of_a_spacer_is_four_volumes_over_surface():
    """A net of round filaments, counted piece by piece in one square metre of channel."""
    h, filament, filaments_length = 0.9e-3, 0.45e-3, 700.0  # m of filament in a square metre
    filled = filaments_length * math.pi / 4 * filament**2
    surface = 2.0 + filaments_length * math.pi * filament
    diameter = 4 * (h - filled) / surface
    assert hydraulic_diameter_spacer(h, 1 - filled / h, filament) == pytest.approx(diameter, rel=1e-12)
    assert hydraulic_diameter_spacer(h, 1.0, filament) == pytest.approx(2 * h, rel=1e-15)
    assert hydraulic_diameter_slit(h, 1e6) == pytest.approx(2 * h, rel=1e-8)


def test_flow_area_and_velocity_of_a_spacer_channel():
    height, width, length, voidage = 0.8e-3, 12.0, 0.9, 0.85
    area = flow_area_spacer(2 * width * length, length, height, voidage)
    assert area == pytest.approx(width * height * voidage, rel=1e-14)
    assert velocity(1e-3, area) == pytest.approx(1e-3 / (width * height * voidage), rel=1e-14)


def test_shear_induced_diffusion_is_leveque_with_another_diffusion_coefficient():
    shear, radius, length = 2500.0, 2e-6, 0.4
    u, d = 1.0, 8.0 / shear
    diffusion = 0.03 * radius**2 * shear
    sh = EXACT_LEVEQUE["tube"] * (u * d * d / (diffusion * length)) ** (1 / 3)
    assert transfer_shear_induced(shear, radius, length) == pytest.approx(sh * diffusion / d, rel=1e-3)


def test_inertial_lift_cautions_beyond_its_theory(why):
    assert flux_inertial_lift(5000.0, 5e-6, 1000.0, 1e-3) == pytest.approx(1.125e-4, rel=1e-12)
    assert why("UF_FLUX_INERTIAL_LIFT", 5000, 5, 1000, 1) == "ok"
    assert "Reynolds number of the particle" in why("UF_FLUX_INERTIAL_LIFT", 5000, 50, 1000, 1)


# --- power-law liquids --------------------------------------------------------------------------------------


@given(st.floats(0.3, 1.5), st.floats(0.01, 5), st.floats(0.05, 4))
def test_power_law_reynolds_number_gives_laminar_friction(n, consistency, u):
    """Wall shear stress of the power-law velocity profile, τ = K (8u/d · (3n+1)/4n)^n, is (64/Re) ρ u²/8."""
    d, rho = 0.02, 1030.0
    stress = consistency * (8 * u / d * (3 * n + 1) / (4 * n)) ** n
    re = reynolds_power_law(u, d, rho, consistency, n)
    assert stress == pytest.approx(64 / re * rho * u * u / 8, rel=1e-10)


def test_power_law_of_a_newtonian_liquid():
    newtonian = reynolds(0.7, 0.01, 998.0, 2e-3)
    assert reynolds_power_law(0.7, 0.01, 998.0, 2e-3, 1.0) == pytest.approx(newtonian, rel=1e-14)
    assert isinstance(call("UF_REYNOLDS_POWER_LAW", [0, 10, 1000, 1, 2.5]), ErrorValue)


# --- pressure losses ----------------------------------------------------------------------------------------


def test_pressure_drop_against_a_general_library():
    fluids = pytest.importorskip("fluids")
    for u, d in ((0.3, 2e-3), (1.5, 0.02), (3.0, 0.025)):
        re = 1000 * u * d / 1e-3
        f = fluids.friction.friction_laminar(re) if re < LAMINAR_BELOW else fluids.friction.Blasius(re)
        expected = f * 3.0 / d * 1000 * u * u / 2
        # Blasius's 0.3164 is 0.316 in the trade.
        assert pressure_drop_tube(u, d, 3.0, 1e-3, 1000.0) == pytest.approx(expected, rel=1.3e-3)
    tube, slit = 32 * 1e-3 * 0.3 * 3 / 4e-6, 12 * 1e-3 * 0.3 * 3 / 1e-6
    assert pressure_drop_tube(0.3, 2e-3, 3.0, 1e-3, 1000.0) == pytest.approx(tube, rel=1e-13)
    assert pressure_drop_slit(0.3, 1e-3, 3.0, 1e-3, 1000.0) == pytest.approx(slit, rel=1e-13)


@pytest.mark.parametrize("drop, diameter", [(pressure_drop_tube, 1e-3), (pressure_drop_slit, 2e-3)])
def test_pressure_drop_is_continuous_and_rises(drop, diameter):
    def at(re):
        return drop(re * 1e-6 / diameter, 1e-3, 1.0, 1e-3, 1000.0)

    for edge in (LAMINAR_BELOW, TURBULENT_ABOVE):
        assert at(edge * (1 - 1e-9)) == pytest.approx(at(edge * (1 + 1e-9)), rel=1e-7)
    middle = at(math.sqrt(LAMINAR_BELOW * TURBULENT_ABOVE))
    assert middle == pytest.approx(math.sqrt(at(LAMINAR_BELOW) * at(TURBULENT_ABOVE)), rel=1e-9)
    re = np.concatenate([[0.0], np.geomspace(1, 1e5, 200)])
    values = at(re)
    assert values[0] == 0.0 and np.all(np.diff(values) > 0)
    assert np.allclose(values, [at(float(r)) for r in re], rtol=1e-13)


def test_pressure_drop_names_its_branch(why):
    assert why("UF_PRESSURE_DROP_TUBE", 0.5, 1, 1, 1, 1000).startswith("ok: laminar")
    assert why("UF_PRESSURE_DROP_TUBE", 3, 1, 1, 1, 1000).startswith("caution: transition")
    assert why("UF_PRESSURE_DROP_SLIT", 6, 1, 1, 1, 1000).startswith("ok: turbulent")
    assert "outside 3000 to 100000" in why("UF_PRESSURE_DROP_SLIT", 80, 1, 1, 1, 1000)


@given(st.floats(0.3e-3, 3e-3), st.floats(0.05, 3), st.floats(1e-12, 1e-8))
def test_dead_end_fiber_against_numerical_integration(diameter, length, permeability):
    """From the closed end towards the open one: flow and pressure, integrated with scipy."""
    from scipy.integrate import solve_ivp

    viscosity = 1.2e-3
    if (128 * viscosity * permeability / diameter**3) ** 0.5 * length > 8:
        return
    found = solve_ivp(lambda x, y: [math.pi * diameter * permeability * y[1],
                                    128 * viscosity * y[0] / (math.pi * diameter**4)],
                      (0, length), [0.0, 1e5], rtol=1e-10, atol=[1e-20, 1e-6], method="DOP853")
    flow, pressure = found.y[:, -1]
    flux = flow / (math.pi * diameter * length)
    drop = pressure_drop_fiber(flux, diameter, length, viscosity, permeability)
    assert drop == pytest.approx(pressure - 1e5, rel=1e-6, abs=0.1)


def test_dead_end_fiber_of_little_permeability():
    uniform = 64 * 1e-3 * 2e-5 * 1.5**2 / (0.8e-3) ** 3
    assert pressure_drop_fiber(2e-5, 0.8e-3, 1.5, 1e-3, 0.0) == pytest.approx(uniform, rel=1e-14)
    permeability = np.array([0.0, 1e-30, 1e-18, 1e-15, 1e-12])
    drops = pressure_drop_fiber(2e-5, 0.8e-3, 1.5, 1e-3, permeability)
    assert np.allclose(drops, uniform, rtol=1e-3) and np.all(np.diff(drops) <= 0)
    one_by_one = [pressure_drop_fiber(2e-5, 0.8e-3, 1.5, 1e-3, float(p)) for p in permeability]
    assert drops.tolist() == pytest.approx(one_by_one, rel=1e-14)
    # Very permeable or long: all water passes near the open end, and the loss is that of its entrance.
    assert pressure_drop_fiber(2e-5, 0.8e-3, 100.0, 1e-3, 1e-9) == pytest.approx(
        2e-5 / 1e-9 * 100.0 * (128 * 1e-3 * 1e-9 / (0.8e-3) ** 3) ** 0.5, rel=1e-9)


# --- fibers -------------------------------------------------------------------------------------------------


@given(st.floats(0.1e-3, 2e-3), st.floats(0.1e-3, 2e-3), st.floats(1e-7, 1e-3))
def test_the_flow_is_the_same_on_either_face_of_a_fiber(inner, outer, flux):
    on_outer = flux_diameter(flux, inner, outer)
    flow = flux * area_fiber(1000, inner, 1.2)
    assert on_outer * area_fiber(1000, outer, 1.2) == pytest.approx(flow, rel=1e-12)
    assert flux_diameter(on_outer, outer, inner) == pytest.approx(flux, rel=1e-12)
