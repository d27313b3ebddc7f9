"""Laws over the whole registry: inverse pairs, monotonicity, limits. Arguments in worksheet units."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.examples import example
from uffuncs.cell import call
from uffuncs.errors import ErrorValue
from uffuncs.registry import find


def between(low, high):
    """Evenly in the logarithm."""
    return st.floats(math.log(low), math.log(high)).map(math.exp)


# Each: the value that must come back, and the call of the one function on the result of the other.
INVERSE_PAIRS = {
    "flux and flow": (dict(x=between(0.1, 1e3), a=between(1, 1e4)), lambda x, a: call("UF_FLUX_FROM_FLOW", [call("UF_FLOW_FROM_FLUX", [x, a]), a])),
    "permeability and pore": (dict(x=between(1, 500), a=between(0.01, 1), b=between(1, 5)), lambda x, a, b: call(
        "UF_PORE_DIAMETER", [call("UF_PERMEABILITY_PORE", [a, x, b, 1]), a, b, 1])),
    "permeability and resistance": (dict(x=between(1, 1e4), a=between(0.2, 5)), lambda x, a: call(
        "UF_PERMEABILITY_FROM_RESISTANCE", [call("UF_RESISTANCE_FROM_PERMEABILITY", [x, a]), a])),
    "reference and process temperature": (dict(x=between(1, 1e4), a=st.floats(1, 80)), lambda x, a: call(
        "UF_PERMEABILITY_MEASURED", [call("UF_PERMEABILITY_AT", [x, a]), 1, a])),
    "Darcy and total resistance": (dict(x=between(1e11, 1e15), a=between(0.1, 20)), lambda x, a: call(
        "UF_RESISTANCE_TOTAL", [call("UF_FLUX_DARCY", [a, 1, x]), a, 1])),
    "fraction and concentration": (dict(x=between(1e-6, 1), a=between(900, 1400)), lambda x, a: call(
        "UF_FRACTION_FROM_CONCENTRATION", [call("UF_CONCENTRATION_FROM_FRACTION", [x, a]), a])),
    "radius and diffusion": (dict(x=between(0.1, 1e3), a=st.floats(1, 80)), lambda x, a: call(
        "UF_RADIUS_STOKES", [call("UF_DIFFUSION_STOKES", [x, a, 1]), a, 1])),
    "observed and intrinsic rejection": (dict(x=st.floats(0.01, 0.99), a=between(1, 100)), lambda x, a: call(
        "UF_REJECTION_FROM_INTRINSIC", [call("UF_REJECTION_INTRINSIC", [x, a, 50]), a, 50])),
    "flux and surface concentration": (dict(x=between(0.1, 100), a=between(1, 50)), lambda x, a: call(
        "UF_FLUX_FILM", [30, call("UF_SURFACE_CONCENTRATION", [x, 30, a]), a])),
    "osmotic flux and pressure": (dict(x=between(0.05, 20), a=between(0.1, 100), b=st.floats(0.05, 1)), lambda x, a, b: call(
        "UF_PRESSURE_FOR_FLUX", [call("UF_FLUX_OSMOTIC", [x, 50, 20, a, 1e-4, 1e-6, 1e-8, b]), 50, 20, a, 1e-4, 1e-6, 1e-8, b])),
    "diavolumes and remainder": (dict(x=between(0.01, 20), a=st.floats(0.1, 1)), lambda x, a: call(
        "UF_DIAVOLUMES", [call("UF_DIAFILTRATION_REMAINING", [x, a]), a])),
    "bubble point and defect": (dict(x=between(0.01, 100), a=st.floats(0, 80)), lambda x, a: call(
        "UF_DEFECT_DIAMETER", [call("UF_BUBBLE_POINT", [x, 72, a]), 72, a])),
    "decay rate and log removal": (dict(x=st.floats(1, 7), a=between(1, 1e3)), lambda x, a: call(
        "UF_LOG_REMOVAL_DECAY", [a, 40, call("UF_DECAY_RATE_LIMIT", [x, a, 40, 1, 1, 1.01325]), 1, 1, 1.01325])),
    "batch time and area": (dict(x=between(0.1, 1e3), a=between(1.1, 20)), lambda x, a: call(
        "UF_BATCH_TIME", [1, 10, a, call("UF_BATCH_AREA", [1, 10, a, x, 30, 300]), 30, 300])),
}


@pytest.mark.parametrize("pair", INVERSE_PAIRS)
def test_inverse_pair(pair):
    strategies, back = INVERSE_PAIRS[pair]

    @given(**strategies)
    def check(**values):
        found = back(**values)
        assert not isinstance(found, ErrorValue), (values, found.reason)
        assert found == pytest.approx(values["x"], rel=1e-8)

    check()


# function, argument, and whether the result rises (+) or falls (-) with it, from the function's example
RISES = """
UF_WATER_VISCOSITY temperature -
UF_WATER_SURFACE_TENSION temperature -
UF_VISCOSITY_ROSS_MINTON concentration +
UF_VISCOSITY_SUSPENSION volume_fraction +
UF_DIFFUSION_STOKES solute_radius -
UF_DIFFUSION_YOUNG molar_mass -
UF_RADIUS_DEXTRAN molar_mass +
UF_RADIUS_PEG molar_mass +
UF_OSMOTIC_VANT_HOFF concentration +
UF_OSMOTIC_HARD_SPHERE concentration +
UF_OSMOTIC_DONNAN concentration +
UF_PERMEABILITY_PORE pore_diameter +
UF_PERMEABILITY_PORE viscosity -
UF_RESISTANCE_CAKE cake_porosity -
UF_FLUX_DARCY transmembrane_pressure +
UF_FLUX_DARCY membrane_resistance -
UF_FLUX_DARCY osmotic_pressure -
UF_SIEVING_FERRY solute_radius -
UF_SIEVING_ZEMAN_WALES solute_radius -
UF_SIEVING_HINDERED solute_radius -
UF_SIEVING_PORE_SPREAD solute_radius -
UF_HINDRANCE_DIFFUSION solute_radius -
UF_REJECTION_FROM_INTRINSIC flux -
UF_REJECTION_CURVE molar_mass +
UF_LOG_REMOVAL feed_count +
UF_REYNOLDS velocity +
UF_SHERWOOD_GRAETZ reynolds +
UF_SHERWOOD_SPACER reynolds +
UF_TRANSFER_TUBE velocity +
UF_TRANSFER_SLIT velocity +
UF_TRANSFER_SPACER velocity +
UF_PRESSURE_DROP_TUBE velocity +
UF_PRESSURE_DROP_SLIT velocity +
UF_PRESSURE_DROP_SPACER velocity +
UF_POLARIZATION_MODULUS flux +
UF_SURFACE_CONCENTRATION flux +
UF_FLUX_LIMITING bulk_concentration -
UF_FLUX_GEL transmembrane_pressure +
UF_FLUX_OSMOTIC transmembrane_pressure +
UF_FLUX_OSMOTIC mass_transfer_coefficient +
UF_FLUX_OSMOTIC bulk_concentration -
UF_FLUX_OSMOTIC_POWER transmembrane_pressure +
UF_PRESSURE_FOR_FLUX flux +
UF_FLUX_BLOCKING time -
UF_CONCENTRATION_BATCH concentration_factor +
UF_YIELD_BATCH concentration_factor -
UF_DIAFILTRATION_REMAINING diavolumes -
UF_BATCH_TIME concentration_factor +
UF_BATCH_TIME area -
UF_FLUX_MEAN concentration_factor -
UF_STAGES_AREA final_concentration +
UF_STAGES_AREA stages -
UF_PUMP_POWER flow +
UF_BLOWER_POWER outlet_pressure +
UF_COST_TREATMENT interest_rate +
UF_BUBBLE_POINT defect_diameter -
UF_LOG_REMOVAL_DECAY decay_rate -
UF_LOG_REMOVAL_DECAY volumetric_concentration_factor -
UF_DECAY_RATE_LIMIT target_log_removal -
"""


@pytest.mark.parametrize("line", RISES.split("\n")[1:-1])
def test_monotone(line):
    name, argument, sign = line.split()
    record = find(name)
    i = record.argument_names.index(argument)
    q = record.arguments[i].quantity
    cells = example(record)
    start = cells[i] if cells[i] is not None else q.from_si(record.arguments[i].default)
    if q.whole:
        points = [start + n for n in range(4)]
    elif q.unit == "°C":
        points = [start + 3.0 * n for n in range(-4, 5)]
    elif start == 0:
        points = [q.high * 1e-3 * n for n in range(10)]
    else:
        points = [start * 1.07**n for n in range(-12, 13)]
    values = [call(name, [*cells[:i], p, *cells[i + 1:]]) for p in points if q.low <= p <= q.high]
    values = [v for v in values if isinstance(v, float)]
    assert len(values) >= 3
    steps = [b - a for a, b in zip(values, values[1:])]
    slack = 1e-12 * max(map(abs, values))
    assert all(s >= -slack if sign == "+" else s <= slack for s in steps), values
    assert any(abs(s) > slack for s in steps), "the result does not change at all"


@pytest.mark.parametrize("what, found, limit", [
    ("no pore resists a point", lambda: call("UF_SIEVING_FERRY", [0.01, 5e4]), 1),
    ("a solute as wide as the pore is held", lambda: call("UF_SIEVING_FERRY", [5, 5]), 0),
    ("one pore size is no spread", lambda: call("UF_SIEVING_PORE_SPREAD", [2, 5, 1]), lambda: call("UF_SIEVING_HINDERED", [2, 5])),
    ("dilute suspension of spheres", lambda: (call("UF_VISCOSITY_SUSPENSION", [1e-6, 0.64, 2.5, 1]) - 1) / 1e-6, 2.5),
    ("virial terms of zero", lambda: call("UF_OSMOTIC_VIRIAL", [50, 70, 0]), lambda: call("UF_OSMOTIC_VANT_HOFF", [50, 70])),
    ("no charge", lambda: call("UF_OSMOTIC_DONNAN", [50, 70, 0, 0.15, 0, 0]), lambda: call("UF_OSMOTIC_VANT_HOFF", [50, 70])),
    ("no flux, no polarization", lambda: call("UF_POLARIZATION_MODULUS", [0, 20]), 1),
    ("no osmotic pressure", lambda: call("UF_FLUX_OSMOTIC", [2, 50, 20, 10, 0]), 100),
    ("no rejection", lambda: call("UF_FLUX_OSMOTIC", [2, 50, 20, 10, 1e-3, 0, 0, 0]), 100),
    ("a free slit channel", lambda: call("UF_HYDRAULIC_DIAMETER_SPACER", [0.8, 1, 0.4]), 1.6),
    ("full rejection keeps all", lambda: call("UF_YIELD_BATCH", [10, 1]), 1),
    ("no retention keeps 1/X", lambda: call("UF_YIELD_BATCH", [10, 0]), 0.1),
    ("nothing concentrated", lambda: call("UF_FLUX_MEAN", [10, 1, 25, 250]), lambda: call("UF_FLUX_LIMITING", [25, 250, 10])),
    ("one stage has one area", lambda: call("UF_STAGES_AREA", [10, 10, 50, 1, 25, 250]), 8000 / (25 * math.log(5))),
    ("one event a day less", lambda: call("UF_FLUX_NET_DAILY", [60, 30, 120, 0.5, 1]), lambda: call("UF_FLUX_NET", [60, 30, 120, 0.5, 1])),
])
def test_limit(what, found, limit):
    assert found() == pytest.approx(limit() if callable(limit) else limit, rel=1e-5, abs=1e-12)
