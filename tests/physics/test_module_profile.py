"""Profiles along a module: closed balances, exact limits, independent integration, refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import simpson, solve_ivp
from scipy.optimize import brentq

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NoResult
from uffuncs.physics import _graetz, _march
from uffuncs.physics.crossflow import hydraulic_diameter_spacer, reynolds, schmidt
from uffuncs.physics.crossflow_pressure import pressure_drop_slit, pressure_drop_spacer, pressure_drop_tube
from uffuncs.physics.crossflow_transfer import (sherwood_graetz, sherwood_turbulent, transfer_slit,
                                                transfer_spacer, transfer_tube)
from uffuncs.physics.module_profile import (_smooth_sherwood, module_profile_fiber, module_profile_slit,
                                            module_profile_spacer, module_profile_tube)

LMH_BAR = 1e-3 / 3600 / 1e5
WHEY = (440.0, -0.17, 7.9e-3)  # Pa/(kg/m³)^n, of the order of a protein's
FEED = dict(feed_concentration=10.0, feed_pressure=3e5, permeate_pressure=0.2e5)
LIQUID = dict(diffusion_coefficient=6e-11, viscosity=1e-3, density=1000.0)
OSMOTIC = dict(first_coefficient=WHEY[0], second_coefficient=WHEY[1], third_coefficient=WHEY[2])
PURE = dict(first_coefficient=0.0)

TUBE = dict(tube_diameter=1e-3, channel_length=1.0, channel_count=1000, permeability=60 * LMH_BAR)
SLIT = dict(channel_height=1e-3, channel_width=0.5, channel_length=1.0, channel_count=10,
            permeability=60 * LMH_BAR)
SPACER = dict(channel_height=0.8e-3, channel_width=0.8, channel_length=0.9, spacer_voidage=0.9,
              filament_diameter=0.4e-3, channel_count=10, permeability=30 * LMH_BAR)
FIBER = dict(fiber_diameter=0.8e-3, fiber_length=1.0, fiber_count=3000, permeability=60 * LMH_BAR)
MODULES = [
    (module_profile_tube, TUBE, 2 / 3600, math.pi * 1e-3 * 1000 * 1.0),
    (module_profile_slit, SLIT, 2 / 3600, 2 * 0.5 * 1.0 * 10),
    (module_profile_spacer, SPACER, 5 / 3600, 2 * 0.8 * 0.9 * 10),
    (module_profile_fiber, FIBER, 2 / 3600, math.pi * 0.8e-3 * 3000 * 1.0),
]
ids = [m[0].__name__ for m in MODULES]


def run(profile, geometry, flow, **changes):
    return profile(**{"feed_flow": flow, **FEED, **geometry, **LIQUID, **OSMOTIC, **changes})


# --- balances -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("profile, geometry, flow, area", MODULES, ids=ids)
@pytest.mark.parametrize("rejection", [1.0, 0.9, 0.0])
def test_balances_of_water_and_solute(profile, geometry, flow, area, rejection):
    x, u, p, c, flux, wall = run(profile, geometry, flow, intrinsic_rejection=rejection)
    flow_out = flow * u[-2] / u[0]
    assert flow == pytest.approx(flow_out + area * flux[-1], rel=1e-12)
    if rejection == 1.0:
        assert np.allclose(u[:-1] * c[:-1], u[0] * 10.0, rtol=1e-12, atol=0)
    if rejection == 0.0:
        assert np.allclose(c, 10.0, rtol=1e-9) and np.allclose(wall, 10.0, rtol=1e-9)


@pytest.mark.parametrize("rejection", [1.0, 0.8])
def test_the_rows_carry_the_balances(rejection):
    """The fluxes of the rows, summed by Simpson's rule, are what flow and solute lose, to 1e-9."""
    columns = run(module_profile_spacer, SPACER, 2 / 3600, points=401, intrinsic_rejection=rejection)
    x, u, p, c, flux, wall = (column[:-1] for column in columns)
    width, flow = 2 * 0.8 * 10, 2 / 3600 * u / u[0]
    assert width * simpson(flux, x=x) == pytest.approx(flow[0] - flow[-1], rel=1e-9)
    passed = width * simpson(flux * (1 - rejection) * wall, x=x)
    assert flow[0] * c[0] == pytest.approx(flow[-1] * c[-1] + passed, rel=1e-9)
    assert flow[0] - flow[-1] > 0.15 * flow[0]


@pytest.mark.parametrize("profile, geometry, flow, area", MODULES, ids=ids)
def test_last_row_has_the_means(profile, geometry, flow, area):
    """In s = x^(1/3) the columns are smooth: Simpson's rule on many points there, from a denser run."""
    columns = run(profile, geometry, flow, points=4001)
    x = columns[0][:-1]
    s = np.cbrt(x / x[-1])
    for column, tolerance in zip(columns[1:], (1e-7, 1e-7, 1e-7, 2e-3, 2e-3)):
        mean = np.sum(0.5 * (column[1:-1] + column[:-2]) * np.diff(x)) / x[-1]
        assert column[-1] == pytest.approx(mean, rel=tolerance)
    assert columns[0][-1] == x[-1] == columns[0][-2]
    assert s[0] == 0.0


# --- exact limits -------------------------------------------------------------------------------------------


def closed_form(flow, pressure, resistance, width, permeability, x):
    """Laminar flow with a permeable wall, no osmotic pressure: p′ = −r Q, Q′ = −w L_p p, a linear system."""
    g = math.sqrt(resistance * width * permeability)
    return (flow * np.cosh(g * x) - pressure * g / resistance * np.sinh(g * x),
            pressure * np.cosh(g * x) - flow * resistance / g * np.sinh(g * x))


@pytest.mark.parametrize("profile, geometry, size, resistance, width", [
    (module_profile_tube, TUBE, 1000 * math.pi / 4 * 1e-6, 128e-3 / (math.pi * 1e-12 * 1000), math.pi),
    (module_profile_fiber, FIBER, 3000 * math.pi / 4 * 0.64e-6, 128e-3 / (math.pi * 0.8e-3**4 * 3000),
     3000 * math.pi * 0.8e-3),
    (module_profile_slit, SLIT, 10 * 0.5e-3, 12e-3 / (1e-9 * 0.5 * 10), 10 * 2 * 0.5),
], ids=["tube", "fiber", "slit"])
@pytest.mark.parametrize("changes", [PURE, {"feed_concentration": 0.0}, {"intrinsic_rejection": 0.0}])
def test_without_osmotic_pressure_the_closed_form(profile, geometry, size, resistance, width, changes):
    flow = 2 / 3600
    x, u, p, c, flux, wall = run(profile, geometry, flow, points=11, **{**OSMOTIC, "second_coefficient": 0.0,
                                                                        "third_coefficient": 0.0, **changes})
    expected_flow, expected_pressure = closed_form(flow, 2.8e5, resistance, width, 60 * LMH_BAR, x[:-1])
    assert np.allclose(u[:-1] * size, expected_flow, rtol=1e-10, atol=0)
    assert np.allclose(p[:-1] - 0.2e5, expected_pressure, rtol=1e-10, atol=0)
    assert np.allclose(flux[:-1], 60 * LMH_BAR * expected_pressure, rtol=1e-10, atol=0)
    if changes is PURE:
        assert np.allclose(c[:-1], 10 * flow / expected_flow, rtol=1e-10, atol=0)
    if "feed_concentration" in changes:
        assert not c.any() and not wall.any()


DROPS = [
    (module_profile_tube, TUBE, lambda u: pressure_drop_tube(u, 1e-3, 1.0, 1e-3, 1000.0)),
    (module_profile_slit, SLIT, lambda u: pressure_drop_slit(u, 1e-3, 1.0, 1e-3, 1000.0)),
    (module_profile_spacer, SPACER,
     lambda u: pressure_drop_spacer(u, 0.8e-3, 0.9, 0.4e-3, 0.9, 1e-3, 1000.0)),
    (module_profile_fiber, FIBER, lambda u: pressure_drop_tube(u, 0.8e-3, 1.0, 1e-3, 1000.0)),
]


@pytest.mark.parametrize("profile, geometry, drop", DROPS, ids=ids)
def test_without_permeation_the_plain_pressure_drop(profile, geometry, drop):
    x, u, p, c, flux, wall = run(profile, {**geometry, "permeability": 0.0}, 2 / 3600)
    assert np.allclose(u, u[0], rtol=1e-14) and not flux.any() and np.allclose(wall, 10.0, rtol=1e-14)
    assert p[0] - p[-2] == pytest.approx(drop(u[0]), rel=1e-11)
    assert np.allclose(np.diff(p[:-1]), p[1] - p[0], rtol=1e-9)


@pytest.mark.parametrize("flow", [2 / 3600, 9 / 3600, 30 / 3600])  # laminar, in transition, turbulent
def test_pressure_drop_in_every_regime(flow):
    geometry = {**TUBE, "permeability": 0.0}
    p = run(module_profile_tube, geometry, flow, feed_pressure=150e5)[2]
    u = flow / (1000 * math.pi / 4 * 1e-6)
    assert p[0] - p[-2] == pytest.approx(pressure_drop_tube(u, 1e-3, 1.0, 1e-3, 1000.0), rel=1e-10)


@pytest.mark.parametrize("profile, geometry, transfer", [
    (module_profile_tube, {**TUBE, "tube_diameter": 4e-3},
     lambda u: transfer_tube(u, 4e-3, 1.0, 6e-11, 1e-3, 1000.0)),
    (module_profile_slit, {**SLIT, "channel_height": 3e-3},
     lambda u: transfer_slit(u, 3e-3, 1.0, 6e-11, 1e-3, 1000.0)),
    (module_profile_spacer, SPACER,
     lambda u: transfer_spacer(u, 0.8e-3, 0.9, 0.4e-3, 6e-11, 1e-3, 1000.0)),
], ids=["tube", "slit", "spacer"])
def test_the_local_coefficients_average_to_the_mean_one(profile, geometry, transfer):
    """With hardly any permeation, k = J/ln(C_w/C): its mean along the module is that of the whole length."""
    columns = run(profile, {**geometry, "permeability": 1e-3 * LMH_BAR}, 5 / 3600, points=3001,
                  feed_pressure=20e5, intrinsic_rejection=1.0)
    x, u, p, c, flux, wall = (column[1:-1] for column in columns)
    k = flux / np.log(wall / c)
    s = np.cbrt(x / x[-1])
    weighted = k * 3 * s**2  # finite at the inlet, and 0 there
    mean = simpson(np.append(0.0, weighted), x=np.append(0.0, s))
    assert mean == pytest.approx(transfer(columns[1][0]), rel=2e-4)


def test_the_local_coefficient_in_transition():
    """Between the laminar value at the same place in a flow at Re 2100, and the turbulent one at Re 4000."""
    local, place = _smooth_sherwood(_graetz.TUBE), 1.3e-3  # x D/(u d²) at Re 2900
    low = _graetz.local(place * 2900 / 2100, _graetz.TUBE)
    share = math.log(2900 / 2100) / math.log(4000 / 2100)
    high = sherwood_turbulent(4000.0, 8000.0)
    assert local(2900.0, 8000.0, place) == pytest.approx(low ** (1 - share) * high**share, rel=1e-12)
    assert local(2100.0, 8000.0, place) == pytest.approx(_graetz.local(place, _graetz.TUBE), rel=1e-14)
    assert local(5000.0, 8000.0, place) == sherwood_turbulent(5000.0, 8000.0)


# --- independent integration --------------------------------------------------------------------------------


def film_flux(pressure, permeability, k, bulk, rejection):
    """The osmotic film model, solved for the surface concentration instead of the flux."""
    def osmotic(v):
        return WHEY[0] * v + WHEY[1] * v**2 + WHEY[2] * v**3

    def excess(wall):
        passed = (1 - rejection) * wall
        flux = permeability * (pressure - osmotic(wall) + osmotic(passed))
        return math.log((wall - passed) / (bulk - passed)) - flux / k

    highest = bulk / (1 - rejection) * (1 - 1e-13) if rejection < 1 else 5000.0
    wall = brentq(excess, bulk, min(highest, 5000.0), xtol=1e-13, rtol=1e-14)
    return permeability * (pressure - osmotic(wall) + osmotic((1 - rejection) * wall)), wall


def local_sherwood(channel):
    """d(x Sh)/dx of the average by finite differences; the argument is 1/Gz."""
    def average(z):
        return sherwood_graetz(1.0, 1.0, 1.0, z, channel)

    def local(z):
        h = 1e-3 * z
        values = [(z + i * h) * average(z + i * h) for i in (-2, -1, 1, 2)]
        return np.dot([1, -8, 8, -1], values) / (12 * h)

    return local


@pytest.mark.parametrize("case", ["spacer", "tube", "slit"])
@pytest.mark.parametrize("rejection", [1.0, 0.99])
def test_against_an_independent_integration(case, rejection):
    """Another method (in x, with another solver of the flux), started a little inside a laminar entrance."""
    flow, start = 2 / 3600, 0.0
    if case == "spacer":
        profile, geometry, length = module_profile_spacer, SPACER, 0.9
        width, area = 16.0, 10 * 0.8 * 0.8e-3 * 0.9
        diameter = hydraulic_diameter_spacer(0.8e-3, 0.9, 0.4e-3)

        def gradient(u):
            return 6.23 * reynolds(u, diameter, 1000.0, 1e-3) ** -0.3 / diameter * 500 * u * u

        def coefficient(u, z):
            re = reynolds(u, diameter, 1000.0, 1e-3)
            return 0.065 * re**0.875 * schmidt(1e-3, 1000.0, 6e-11) ** 0.25 * 6e-11 / diameter
    else:
        profile, geometry, width, area, diameter = {
            "tube": (module_profile_tube, TUBE, math.pi, 1000 * math.pi / 4e6, 1e-3),
            "slit": (module_profile_slit, SLIT, 10.0, 5e-3, 2e-3)}[case]
        length = 1.0
        sherwood = local_sherwood(case)

        def gradient(u):
            return (32e-3 if case == "tube" else 48e-3) * u / diameter**2

        def coefficient(u, z):
            return sherwood(z) * 6e-11 / diameter

        start = 1e-7

    def slopes(x, y):
        water, solute, pressure, z = y
        u = water * flow / area
        bulk = 10 * solute / water
        flux, wall = film_flux(pressure * 1e5, geometry["permeability"], coefficient(u, z), bulk,
                               rejection)
        return [-width * flux / flow, -width * flux * (1 - rejection) * wall / (10 * flow),
                -gradient(u) / 1e5, 6e-11 / (u * diameter**2)]

    # Up to the start the water lost is at most that of the pressure alone, 1e-7 of it.
    u0 = flow / area
    found = solve_ivp(slopes, (start, length), [1.0, 1.0, 2.8, 6e-11 * start / (u0 * diameter**2)],
                      method="LSODA", rtol=1e-9, atol=1e-12, t_eval=[length])
    water, solute, pressure, _ = found.y[:, -1]
    x, u, p, c, flux, wall = run(profile, geometry, flow, intrinsic_rejection=rejection)
    assert u[-2] == pytest.approx(u0 * water, rel=3e-7)
    assert p[-2] - 0.2e5 == pytest.approx(pressure * 1e5, rel=3e-7)
    assert c[-2] == pytest.approx(10 * solute / water, rel=3e-7)
    assert flux[-1] == pytest.approx((1 - water) * flow / (width * length), rel=2e-6)


# --- discretisation -----------------------------------------------------------------------------------------

KINKED = dict(tube_diameter=12e-3, channel_length=3.0, channel_count=100, permeability=100 * LMH_BAR)
CASES = [
    *[(m[0], m[1], m[2]) for m in MODULES],
    (module_profile_tube, KINKED, 13.8 / 3600),  # the Reynolds number falls through 4000
    (module_profile_tube, KINKED, 7.15 / 3600),  # and through 2100
]


@pytest.mark.parametrize("profile, geometry, flow", CASES, ids=[*ids, "through 4000", "through 2100"])
def test_integration_error(profile, geometry, flow, monkeypatch):
    values = np.array(run(profile, geometry, flow))
    monkeypatch.setattr(_march, "TOLERANCE", 3e-14)
    monkeypatch.setattr(_march, "SMALL", 1e-16)
    finer = np.array(run(profile, geometry, flow))
    assert np.allclose(values, finer, rtol=1e-8, atol=0)


def test_the_error_follows_the_tolerance(monkeypatch):
    exact = np.array(run(module_profile_spacer, SPACER, 2 / 3600))
    monkeypatch.setattr(_march, "LONGEST", 1.0)
    errors = []
    for tolerance in (1e-3, 1e-6, 1e-9):
        monkeypatch.setattr(_march, "TOLERANCE", tolerance)
        monkeypatch.setattr(_march, "SMALL", tolerance / 100)
        values = np.array(run(module_profile_spacer, SPACER, 2 / 3600))
        errors.append(np.abs(values[1:, :-1] / exact[1:, :-1] - 1).max())
    assert errors[0] > 10 * errors[1] > 100 * errors[2]
    assert errors[2] < 1e-9


@pytest.mark.parametrize("profile, geometry, flow, area", MODULES, ids=ids)
def test_the_points_do_not_change_the_values(profile, geometry, flow, area):
    few, many = (np.array(run(profile, geometry, flow, points=n)) for n in (3, 101))
    assert few.shape == (6, 4) and many.shape == (6, 102)
    assert np.allclose(few[:, :-1], many[:, [0, 50, 100]], rtol=1e-12, atol=0)
    assert np.allclose(few[:, -1], many[:, -1], rtol=1e-12, atol=0)


def test_how_often_the_flux_is_solved():
    """The cost of a profile is that of its flux solutions: a hundred for the points, and few besides."""
    calls = 0
    original = _march.March.flux

    def counted(self, *values):
        nonlocal calls
        calls += 1
        return original(self, *values)

    _march.March.flux = counted
    try:
        run(module_profile_spacer, SPACER, 5 / 3600, points=100)
    finally:
        _march.March.flux = original
    assert calls < 500


# --- trends -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("profile, geometry, flow, area", MODULES, ids=ids)
def test_shape_of_the_profiles(profile, geometry, flow, area):
    x, u, p, c, flux, wall = (column[:-1] for column in run(profile, geometry, flow, points=40))
    assert all(np.all(np.diff(falling) < 0) for falling in (u, p, flux))
    assert np.all(np.diff(c) > 0) and np.all(wall[1:] > c[1:])
    if profile is not module_profile_spacer:  # a smooth inlet has no concentration layer yet
        osmotic = WHEY[0] * 10 + WHEY[1] * 100 + WHEY[2] * 1000
        assert wall[0] == pytest.approx(10.0, rel=1e-6)
        assert flux[0] == pytest.approx(60 * LMH_BAR * (2.8e5 - osmotic), rel=1e-9)


@settings(max_examples=25)
@given(st.floats(0.5, 20), st.floats(0.05, 60), st.floats(1, 6), st.floats(5, 200), st.floats(0, 1))
def test_any_feed_is_balanced_or_refused(flow, concentration, pressure, permeability, rejection):
    cells = [flow, concentration, pressure, 0.2, 0.8, 0.8, 0.9, 0.4, 0.9, 10, permeability, 6e-11, 1, 1000,
             4.4e-3, -1.7e-6, 7.9e-8, rejection, 5]
    block = call("UF_MODULE_PROFILE_SPACER", cells)
    if isinstance(block, ErrorValue):
        assert block.code == "#NUM!" and "from the inlet" in block.reason
        return
    rows = np.array(block)
    assert rows.shape == (6, 6)
    permeate = rows[5, 4] * 2 * 0.8 * 0.9 * 10 / 1000
    assert flow == pytest.approx(flow * rows[4, 1] / rows[0, 1] + permeate, rel=1e-9)


# --- refusals and words -------------------------------------------------------------------------------------


def test_refusals_with_their_place():
    with pytest.raises(NoResult, match="used up 0.[0-9]+ m from the inlet, before the outlet at 0.9 m"):
        run(module_profile_spacer, {**SPACER, "permeability": 100 * LMH_BAR}, 2 / 3600,
            feed_concentration=0.0)
    with pytest.raises(NoResult, match="pressure falls to the permeate pressure 0.[0-9]+ m from the inlet"):
        run(module_profile_spacer, SPACER, 25 / 3600, feed_pressure=1e5, feed_concentration=0.0)
    with pytest.raises(NoResult, match="feed pressure does not exceed"):
        run(module_profile_tube, TUBE, 2 / 3600, feed_pressure=0.2e5)
    with pytest.raises(NoResult, match="osmotic pressure of the feed"):
        run(module_profile_tube, TUBE, 2 / 3600, feed_concentration=400.0)
    with pytest.raises(NoResult, match="osmotic pressure of the bulk reaches"):
        run(module_profile_slit, SLIT, 10 / 3600, feed_concentration=98.0, feed_pressure=0.7e5)
    with pytest.raises(NoResult, match="feed flow is 0"):
        run(module_profile_fiber, FIBER, 0.0)
    with pytest.raises(NoResult, match="beyond all numbers"):
        run(module_profile_slit, {**SLIT, "channel_height": 0.02}, 2 / 3600, **PURE, second_coefficient=0.0,
            third_coefficient=0.0, diffusion_coefficient=1e-12)


def test_a_flux_that_dies_out_is_not_followed_for_ever(monkeypatch):
    monkeypatch.setattr(_march, "MOST_EVALUATIONS", 30)
    with pytest.raises(NoResult, match="dies out long before the outlet"):
        run(module_profile_spacer, SPACER, 5 / 3600)


def test_an_osmotic_law_with_several_fluxes_is_refused():
    with pytest.raises(NoResult, match="several fluxes, or none"):
        run(module_profile_spacer, SPACER, 5 / 3600, first_coefficient=2000.0, second_coefficient=-30.0,
            third_coefficient=0.0)


def test_numbers_of_any_type():
    plain = np.array(run(module_profile_tube, TUBE, 2 / 3600))
    geometry = {k: np.float64(v) for k, v in TUBE.items()}
    other = np.array(run(module_profile_tube, geometry, np.float64(2 / 3600),
                         intrinsic_rejection=1, points=np.int64(20)))
    assert np.allclose(plain, other, rtol=1e-13, atol=0)


def test_words_at_the_worksheet(why):
    spacer = [5, 10, 3, 0.2, 0.8, 0.8, 0.9, 0.4, 0.9, 10, 30, 6e-11, 1, 1000]
    protein = [4.4e-3, -1.7e-6, 7.9e-8]
    assert why("UF_MODULE_PROFILE_SPACER", *spacer, *protein) == "ok"
    assert "no osmotic coefficient is given" in why("UF_MODULE_PROFILE_SPACER", *spacer, 0)
    assert "Reynolds number at the inlet" in why("UF_MODULE_PROFILE_SPACER", 1.5, *spacer[1:], *protein)
    assert why("UF_MODULE_PROFILE_SPACER", 1.5, 0, *spacer[2:10], 200, *spacer[11:], 0).startswith(
        "UF_MODULE_PROFILE_SPACER: the feed flow is used up")
    tube = [10, 3, 0.2, 1, 1, 1000, 60, 6e-11, 1, 1000, *protein]
    assert why("UF_MODULE_PROFILE_TUBE", 2, *tube) == "ok: laminar at the inlet"
    assert "between 2100 and 4000" in why("UF_MODULE_PROFILE_FIBER", 7, 10, 50, *tube[2:])
    assert "dittus-boelter" in why("UF_MODULE_PROFILE_TUBE", 30, 10, 150, *tube[2:])
    slit = [10, 3, 0.2, 1, 0.5, 1, 10, 60, 6e-11, 1, 1000, *protein]
    assert why("UF_MODULE_PROFILE_SLIT", 2, *slit) == "ok: laminar at the inlet"
    assert "points must be a whole number" in why("UF_MODULE_PROFILE_SLIT", 2, *slit, 1, 10.5)


def test_rows_at_the_worksheet():
    rows = call("UF_MODULE_PROFILE_TUBE", [2, 10, 3, 0.2, 1, 1, 1000, 60, 6e-11, 1, 1000, 4.4e-3])
    assert len(rows) == 21 and all(len(row) == 6 and all(isinstance(v, float) for v in row) for row in rows)
    assert rows[0][:4] == pytest.approx([0, 2 / 3600 / (1000 * math.pi / 4e6), 3, 10])
    assert rows[19][0] == rows[20][0] == 1.0
