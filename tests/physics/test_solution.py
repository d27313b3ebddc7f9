"""Solutions: limits, inverse pairs, the ion balance solved another way, and the table of solutes."""

import csv
import math
from decimal import Decimal, getcontext
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from uffuncs.cell import call
from uffuncs.errors import ErrorValue, NotAvailable
from uffuncs.physics import solution as s
from uffuncs.physics._solutes import CONDITIONS, PROPERTIES, solute_table
from uffuncs.physics.water import water_density, water_viscosity
from uffuncs.quantities import quantity

KDA, ML_G, MOLAR = 1.0, 1e-3, 1e3  # worksheet units in SI
NA, NUM = ErrorValue("#N/A"), ErrorValue("#NUM!")


def why(name, *cells):
    return call("UF_WHY", [f"UF_{name}", *cells])


# --- viscosity ----------------------------------------------------------------------------------------------


@given(st.floats(0, 50), st.floats(0.1, 2))
def test_ross_minton_begins_with_the_intrinsic_viscosity(intrinsic, crowding):
    c, eta = 1e-3, intrinsic * ML_G
    excess = s.viscosity_ross_minton(c, eta, crowding, 1.0) - 1.0
    assert excess == pytest.approx(eta * c, rel=1e-3, abs=1e-14)
    assert s.viscosity_ross_minton(0.0, eta, crowding, 0.9) == 0.9


def test_ross_minton_without_crowding_is_an_exponential():
    assert s.viscosity_ross_minton(200.0, 5e-3, 0.0, 1.0) == pytest.approx(math.e, rel=1e-14)


def test_ross_minton_rises_without_bound_towards_its_limit_and_is_refused_from_there():
    limit = 1 / (0.5 * 6.3e-3)  # kg/m³
    c = limit * np.array([0, 0.5, 0.9, 0.99, 1 - 1e-6, 1, 1.5])
    viscosity = s.viscosity_ross_minton(c, 6.3e-3, 0.5, 1.0)
    assert np.all(np.diff(viscosity[:4]) > 0)
    assert np.isnan(viscosity[4:]).all()
    assert np.isnan(s.viscosity_ross_minton(limit, 6.3e-3, 0.5, 1.0))
    assert "no longer flows" in why("VISCOSITY_ROSS_MINTON", 400, 6.3, 0.5)
    assert "exceeds any number" in why("VISCOSITY_ROSS_MINTON", 317.4, 6.3, 0.5)
    assert call("UF_VISCOSITY_ROSS_MINTON", [[[100], [400]], 6.3, 0.5])[1][0] == NUM


@given(st.floats(0.001, 0.6), st.floats(0.62, 1), st.floats(0.1, 20))
def test_suspension_satisfies_its_differential_equation(phi, phi_m, number):
    """dµ/dφ = [η] µ/(1 − φ/φ_m): a bit of solids thickens the suspension as it would the free liquid."""
    h = 1e-5
    up, down = (s.viscosity_suspension(phi + d, phi_m, number, 1.0) for d in (h, -h))
    slope = (math.log(up) - math.log(down)) / (2 * h)
    assert slope == pytest.approx(number / (1 - phi / phi_m), rel=1e-4)


def test_suspension_limits():
    assert s.viscosity_suspension(0.0, 0.64, 2.5, 0.9) == 0.9
    assert np.isnan(s.viscosity_suspension(np.array([0.64, 0.7]))).all()
    assert np.isnan(s.viscosity_suspension(0.64))
    assert np.isnan(s.viscosity_suspension(0.6399999, 0.64, 1000.0))
    assert "is not below maximum_volume_fraction 0.64" in why("VISCOSITY_SUSPENSION", 0.65)


# --- density and fractions ----------------------------------------------------------------------------------


@given(st.floats(0, 1000), st.floats(0.3, 1), st.floats(0, 90))
def test_density_is_the_sum_of_both_masses(concentration, specific_volume, celsius):
    free = 1 - concentration * specific_volume * ML_G  # share of the volume that is water
    density = s.density_solution(concentration, specific_volume * ML_G, celsius + 273.15)
    if free >= 0:
        assert density == pytest.approx(concentration + free * water_density(celsius + 273.15), rel=1e-13)
    else:
        assert np.isnan(density)


def test_density_limits():
    assert s.density_solution(0.0, 0.73e-3, 298.15) == water_density(298.15)
    assert s.density_solution(1250.0, 0.8e-3) == pytest.approx(1250, rel=1e-13)
    assert call("UF_DENSITY_SOLUTION", [[[100], [1400]], 0.73])[1][0] == NUM
    assert "more solute than the volume holds" in why("DENSITY_SOLUTION", 1400, 0.73)
    assert why("DENSITY_SOLUTION", 100, 0.73, 120).startswith("caution: temperature 120 °C is outside")


@given(st.floats(1e-6, 1), st.floats(500, 3000))
def test_fraction_and_concentration_are_inverse(fraction, density):
    concentration = s.concentration_from_fraction(fraction, density)
    assert s.fraction_from_concentration(concentration, density) == pytest.approx(fraction, rel=1e-14)


def test_more_solute_than_solution_is_refused_in_its_own_place():
    assert np.isnan(s.fraction_from_concentration(1001.0, 1000.0))
    assert call("UF_FRACTION_FROM_CONCENTRATION", [[[500], [1200]], 1000]) == [[0.5], [NUM]]
    assert call("UF_VOLUME_FRACTION", [[[500], [1400]], 0.73]) == [[pytest.approx(0.365)], [NUM]]
    assert "exceeds solution_density" in why("FRACTION_FROM_CONCENTRATION", 1200, 1000)


# --- size and diffusion -------------------------------------------------------------------------------------


@given(st.floats(1e-14, 1e-9), st.floats(273, 370), st.floats(1e-4, 1e-1))
def test_radius_and_diffusion_are_inverse(diffusion, temperature, viscosity):
    radius = s.radius_stokes(diffusion, temperature, viscosity)
    assert s.diffusion_stokes(radius, temperature, viscosity) == pytest.approx(diffusion, rel=1e-14)


@given(st.floats(0.1, 1000), st.floats(273, 370), st.floats(0.2, 100))
def test_correlations_in_their_own_units(kilodalton, kelvin, centipoise):
    grams = 1000 * kilodalton
    young = 8.34e-8 * kelvin / (centipoise * grams ** (1 / 3))  # cm²/s
    polson = 9.40e-15 * kelvin / (centipoise / 1000 * grams ** (1 / 3))  # m²/s
    arguments = kilodalton * KDA, kelvin, centipoise * 1e-3
    assert s.diffusion_young(*arguments) * 1e4 == pytest.approx(young, rel=1e-13)
    assert s.diffusion_polson(*arguments) == pytest.approx(polson, rel=1e-13)
    assert s.radius_dextran(kilodalton) * 1e10 == pytest.approx(0.33 * grams**0.463, rel=1e-13)
    assert s.radius_peg(kilodalton) * 1e2 == pytest.approx(16.73e-10 * grams**0.557, rel=1e-13)


def test_youngs_equation_is_for_compact_molecules():
    """For a dextran of 70 kDa it is 60 % above the diffusion of a sphere of the dextran's radius."""
    viscosity = water_viscosity(298.15)
    coil = s.diffusion_stokes(s.radius_dextran(70.0), 298.15, viscosity)
    assert s.diffusion_young(70.0, 298.15, viscosity) / coil == pytest.approx(1.6, abs=0.05)


@given(st.floats(1, 1000), st.floats(0.5, 1), st.floats(0, 2))
def test_the_protein_sphere_holds_protein_and_bound_water(mass, specific_volume, hydration):
    radius = s.radius_protein(mass, specific_volume * ML_G, hydration)
    per_mole = 4 / 3 * math.pi * radius**3 * 6.02214076e23
    assert per_mole == pytest.approx(mass * (specific_volume + hydration) * 1e-3, rel=1e-12)


@pytest.mark.parametrize("name", [n for n, p in solute_table().items()
                                  if {"molar_mass", "radius"} <= set(p) and p["molar_mass"].value > 5])
def test_no_published_macromolecule_is_smaller_than_its_dry_sphere(name):
    entries = solute_table()[name]
    assert entries["radius"].value > s.radius_protein(entries["molar_mass"].value, 0.7e-3, 0.0)


def test_cautions_outside_the_ranges():
    assert why("RADIUS_DEXTRAN", 600).startswith("caution: molar_mass 600 kDa is outside 1 kDa to 500 kDa")
    assert why("RADIUS_PEG", 40).startswith("caution: molar_mass 40 kDa is outside 1 kDa to 35 kDa")
    assert why("DIFFUSION_YOUNG", 4, 20, 1).startswith("caution: molar_mass 4 kDa is below 5 kDa")
    assert why("DIFFUSION_POLSON", 0.5, 20, 1).startswith("caution: molar_mass 0.5 kDa is below 1 kDa")
    assert why("DIFFUSION_YOUNG", 5, 20, 1) == why("DIFFUSION_POLSON", 1, 20, 1) == "ok"
    assert why("RADIUS_DEXTRAN", 500) == why("RADIUS_PEG", 35) == "ok"


# --- Donnan ratio -------------------------------------------------------------------------------------------

#: concentration, molar mass, charge, salt in mol/L, specific volume in mL/g
PROTEIN = st.tuples(
    st.floats(0, 600), st.floats(1, 500), st.floats(-100, 100), st.floats(1e-3, 2), st.floats(0, 1.5))


@given(PROTEIN)
def test_donnan_ratio_solves_the_ion_balance(case):
    concentration, mass, charge, salt, specific_volume = case
    m, free = salt * MOLAR, 1 - concentration * specific_volume * ML_G
    fixed = abs(charge) * concentration / (mass * free)  # mol of charge per m³ of accessible volume
    co_ion = brentq(lambda c: c * (c + fixed) - m**2, 0, m * (1 + 1e-12), xtol=1e-300, rtol=8.9e-16)
    ratio = s.donnan_ratio(concentration, mass, charge, m, specific_volume * ML_G)
    assert ratio == pytest.approx(free * co_ion / m, rel=1e-9)
    assert ratio <= free * (1 + 1e-12)
    assert ratio == s.donnan_ratio(concentration, mass, -charge, m, specific_volume * ML_G)


def test_donnan_retentate_is_electrically_neutral():
    c, mass, charge, m, v = 150.0, 150.0, 25.0, 20.0, 0.73e-3
    ratio, free = s.donnan_ratio(c, mass, charge, m, v), 1 - c * v
    co_ion, counter_ion = ratio * m, free**2 / ratio * m  # per volume of whole retentate
    assert counter_ion - co_ion == pytest.approx(charge * c / mass, rel=1e-13)


def test_donnan_ratio_loses_no_digits_in_little_salt():
    getcontext().prec = 60
    x, m = Decimal(50) * 300 / (2 * 100), Decimal("1e-3")  # mol/m³
    exact = float(((x * x + m * m).sqrt() - x) / m)
    assert s.donnan_ratio(300.0, 100.0, 50.0, 1e-3, 0.0) == pytest.approx(exact, rel=1e-13)


def test_donnan_limits():
    assert s.donnan_ratio(0.0, 150.0, 30.0, 10.0) == pytest.approx(1, rel=1e-15)
    assert s.donnan_ratio(100.0, 150.0, 0.0, 10.0) == pytest.approx(1 - 0.073, rel=1e-14)
    assert s.donnan_ratio(100.0, 150.0, 30.0, 1e9) == pytest.approx(1 - 0.073, rel=1e-6)
    charges = s.donnan_ratio(100.0, 150.0, np.linspace(0, 60, 20), 10.0)
    assert np.all(np.diff(charges) < 0)
    assert np.isnan(s.donnan_ratio(1400.0, 150.0, 30.0, 10.0))
    assert "leaves no room for the salt" in why("DONNAN_RATIO", 1400, 150, 30, 0.1)
    assert "excluded volume" in why("DONNAN_RATIO", 100, 150, 0, 0.1)
    assert call("UF_DONNAN_RATIO", [[[100], [1400]], 150, 30, 0.1])[1][0] == NUM


# --- table of solutes ---------------------------------------------------------------------------------------

FILE = Path(s.__file__).with_name("solutes.csv")
ROWS = list(csv.DictReader(FILE.open(encoding="utf-8", newline="")))


@pytest.mark.parametrize("row", ROWS, ids=lambda r: f"{r['name']}-{r['property']}")
def test_a_row_of_the_table(row):
    q = quantity(PROPERTIES[row["property"]])
    assert row["name"] == " ".join(row["name"].casefold().split())
    assert row["unit"] == q.unit and q.low <= float(row["value"]) <= q.high
    assert row["source"].strip() and None not in row
    if row["property"] == "diffusion_coefficient" or row["property"].startswith("osmotic"):
        assert row["temperature_celsius"], "the value belongs to a temperature"
    if row["property"].startswith("osmotic"):
        assert 0 <= float(row["lowest_concentration"]) < float(row["highest_concentration"])
    assert call("UF_SOLUTE", [row["name"], row["property"]]) == pytest.approx(float(row["value"]), rel=1e-14)


def test_no_row_hides_another():
    keys = [(r["name"], r["property"]) for r in ROWS]
    assert len(set(keys)) == len(keys) == sum(map(len, solute_table().values()))


@pytest.mark.parametrize("name", [n for n, p in solute_table().items()
                                  if {"radius", "diffusion_coefficient"} <= set(p)])
def test_radius_and_diffusion_of_one_solute_agree(name):
    entries = solute_table()[name]
    diffusion = entries["diffusion_coefficient"]
    radius = s.radius_stokes(diffusion.value, diffusion.temperature, water_viscosity(diffusion.temperature))
    assert radius == pytest.approx(entries["radius"].value, rel=0.12)


def test_names_in_any_case_and_spacing():
    plain = call("UF_SOLUTE", ["bovine serum albumin", "molar_mass"])
    assert call("UF_SOLUTE", ["  BOVINE Serum  albumin ", "Molar_Mass"]) == plain == pytest.approx(66.43)


def test_an_unknown_solute_is_not_available_and_near_names_are_told():
    assert call("UF_SOLUTE", ["lysozime", "molar_mass"]) == NA
    assert "is it lysozyme?" in why("SOLUTE", "lysozime", "molar_mass")
    assert "there are: bovine serum albumin" in why("SOLUTE", "moon dust", "molar_mass")
    with pytest.raises(NotAvailable):
        s.solute("moon dust", "molar_mass")


def test_a_property_that_a_solute_lacks_is_not_available():
    assert call("UF_SOLUTE", ["lysozyme", "gel_concentration"]) == NA
    told = why("SOLUTE", "lysozyme", "gel_concentration")
    assert "no gel_concentration of lysozyme; it has: molar_mass" in told
    assert call("UF_SOLUTE", ["lysozyme", "osmotic_temperature"]) == NA
    assert call("UF_SOLUTE", ["lysozyme", "colour"]) == ErrorValue("#VALUE!")


def test_conditions_are_properties_too():
    assert call("UF_SOLUTE", ["plasma protein", "osmotic_temperature"]) == 37
    assert call("UF_SOLUTE", ["plasma protein", "osmotic_lowest_concentration"]) == 0
    assert call("UF_SOLUTE", ["plasma protein", "osmotic_highest_concentration"]) == 120
    assert call("UF_SOLUTE", ["bovine serum albumin", "diffusion_temperature"]) == 20
    assert not set(CONDITIONS) & set(PROPERTIES)


def test_where_a_value_comes_from_is_told():
    assert why("SOLUTE", "ovalbumin", "radius").startswith("ok: Erickson")
    assert why("SOLUTE", "plasma protein", "osmotic_coefficient_1").startswith("ok: at 37 °C; Landis")


def test_a_range_of_names_fails_only_where_a_name_is_unknown():
    column = call("UF_SOLUTE", [[["lysozyme"], ["moon dust"], ["ovalbumin"]], "molar_mass"])
    assert column == [[pytest.approx(14.3)], [NA], [pytest.approx(42.91)]]
    assert call("UF_SOLUTE", ["lysozyme", [["molar_mass", "radius"]]]) == [[pytest.approx(14.3), NA]]
