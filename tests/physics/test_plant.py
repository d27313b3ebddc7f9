"""Continuous plants: whole modules, racks, and the tapered array."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from uffuncs.cell import call
from uffuncs.physics import plant as p
from uffuncs.physics.batch import batch_area, flux_mean

LMH, HOUR = 1e-3 / 3600, 3600.0


# --- balances and counts --------------------------------------------------------------------------------


def test_the_balance_closes_and_tells_the_sign():
    assert p.balance_error(10.0, 5.0, 8.0, 0.5, 2.0, 23.0) == pytest.approx(0, abs=1e-15)
    assert p.balance_error(10.0, 5.0, 8.0, 0.5, 2.0, 20.5) == pytest.approx(0.1)  # solute is missing
    assert p.balance_error(10.0, 5.0, 8.0, 0.5, 2.0, 25.5) == pytest.approx(-0.1)


def test_reasons(why):
    assert "carries no solute" in why("UF_BALANCE_ERROR", 10, 0, 8, 0.5, 2, 23)
    assert "there is no feed" in why("UF_RECYCLE_RATIO", 5, 0)
    assert "there is no feed" in why("UF_RECOVERY", 0, 5)
    assert "is above feed_flow" in why("UF_RECOVERY", 4, 5)
    assert "no area is enough" in why("UF_AREA", 10, 0)
    for out in (5, 6):
        assert "none is in service" in why("UF_FLUX_RACKS", 10, 5, out, 10, 40)


@given(st.integers(1, 100_000), st.floats(0.001, 1000), st.sampled_from([0.0, 0.1, 0.25]))
def test_a_whole_number_of_modules_is_not_rounded_up(count, module_area, spare):
    area = count * module_area / (1 + spare)
    assert p.modules(area, module_area, spare) == count
    assert p.modules(area * (1 + 1e-11), module_area, spare) == count
    assert p.modules(area * (1 + 1e-6), module_area, spare) == count + 1
    assert p.modules(area * (1 - 1e-6), module_area, spare) == count


def test_few_modules():
    assert p.modules(1e-6, 1000.0) == 1
    assert list(p.modules(np.array([12.000000001, 12.1, 11.9]), 1.0)) == [12, 13, 12]


def test_racks_and_area_are_one_balance():
    flux = p.flux_racks(100 / HOUR, 6.0, 1.0, 20.0, 50.0)
    assert p.area(100 / HOUR, flux) == pytest.approx(5 * 20 * 50)
    assert flux == pytest.approx(p.flux_racks(100 / HOUR, 6.0, 0.0, 20.0, 50.0) * 6 / 5)
    assert np.isnan(p.flux_racks(1.0, np.array([3.0, 2.0]), 2.0, 20.0, 50.0)).tolist() == [False, True]


# --- the tapered array ----------------------------------------------------------------------------------

ARRAYS = [
    (100.0, 10.0, 10.0, 5.0, 1.0, 10.0, 20.0, 300.0, 1.0, 50.0),
    (100.0, 10.0, 10.0, 20.0, 1.0, 10.0, 20.0, 300.0, 0.9, None),
    (47.0, 1.0, 30.0, 40.0, 0.2, 6.0, 15.0, 400.0, 1.0, 30.0),
    (3.0, 10.0, 2.0, 7.0, 0.2, 6.0, 15.0, 400.0, 0.0, None),
]


def array(feed_flow, feed, factor, module_area, least, most, transfer, gel, rejection, maximum):
    return p.taper(
        feed_flow / HOUR,
        feed,
        factor,
        module_area,
        least / HOUR,
        most / HOUR,
        transfer * LMH,
        gel,
        rejection,
        None if maximum is None else maximum * LMH,
    )


@pytest.mark.parametrize("cells", ARRAYS)
def test_the_array_meets_its_target_within_its_limits(cells):
    feed_flow, feed, factor, module_area, least, most, transfer, gel, rejection, maximum = cells
    modules, inlet, flux, permeate, concentration = array(*cells)
    into = inlet * modules * HOUR
    out = into - permeate * HOUR
    assert into[0] == pytest.approx(feed_flow) and into[1:] == pytest.approx(out[:-1])
    assert out[-1] == pytest.approx(feed_flow / factor, rel=1e-12)
    assert concentration[-1] == pytest.approx(feed * factor**rejection, rel=1e-12)
    assert (modules == np.ceil(into / most * (1 - 1e-9))).all() and (inlet * HOUR <= most * (1 + 1e-9)).all()
    assert (out / modules >= least * (1 - 1e-9)).all()
    assert flux == pytest.approx(permeate / (modules * module_area))


@pytest.mark.parametrize("cells", ARRAYS)
def test_every_stage_is_a_batch_in_space(cells):
    """Plug flow: the area of a stage is that of a batch per time, and its flux the batch's mean."""
    feed_flow, feed, factor, module_area, least, most, transfer, gel, rejection, maximum = cells
    law = (transfer * LMH, gel, rejection, None if maximum is None else maximum * LMH)
    modules, inlet, flux, permeate, concentration = array(*cells)
    starts = [feed, *concentration[:-1]]
    for i, (m, q, start) in enumerate(zip(modules, inlet, starts)):
        x = m * q / (m * q - permeate[i])
        area = batch_area(m * q, start, x, 1.0, *law)
        if i < len(modules) - 1:
            assert area == pytest.approx(m * module_area, rel=1e-8)
            assert flux[i] == pytest.approx(flux_mean(start, x, *law), rel=1e-8)
        else:  # throttled to meet the target
            assert area <= m * module_area * (1 + 1e-9)
            assert flux[i] <= flux_mean(start, x, *law) * (1 + 1e-9)


def test_a_target_that_whole_stages_meet_is_not_split_by_rounding():
    """10 m³/h at a constant flux, 2 m³/h a stage: four stages to a fifth, and no fifth one for a drop."""
    modules, *_, concentration = p.taper(
        10 / HOUR, 1.0, 5.0, 20.0, 1e-3 / HOUR, 100 / HOUR, 20 * LMH, 1e30, 1.0, 100 * LMH
    )
    assert list(modules) == [1] * 4 and concentration[-1] == pytest.approx(5.0)


def test_taper_refusals(why):
    assert "stage 34 of 5 modules in parallel" in why("UF_TAPER", 100, 10, 20, 5, 8, 10, 20, 300, 1, 50)
    assert "below the minimum 8 m³/h" in why("UF_TAPER", 100, 10, 20, 5, 8, 10, 20, 300, 1, 50)
    # All of the first stage's feed would pass: even throttled to the target too little is left.
    assert "outlet flow of a module, 0.05 m³/h" in why("UF_TAPER", 1, 10, 20, 1000, 0.1, 10, 20, 300, 0, 50)
    assert "is not below maximum_module_flow" in why("UF_TAPER", 100, 10, 20, 5, 10, 10, 20, 300)
    assert "the flux falls to 0" in why("UF_TAPER", 100, 10, 30, 5, 1, 10, 20, 300)
    assert "nothing to concentrate" in why("UF_TAPER", 100, 10, 1, 5, 1, 10, 20, 300)
    assert "500 stages in series" in why("UF_TAPER", 100, 10, 20, 0.001, 0, 100, 20, 300)
    assert "200 L/(m²·h)" in why("UF_TAPER", 100, 0.001, 2, 50, 0.1, 10, 20, 300)
    assert call("UF_TAPER", [100, 10, 20, 5, 8, 10, 20, 300, 1, 50]).code == "#NUM!"


def test_an_oversized_stage_stops_short_of_the_gel():
    """Area without end concentrates towards C_g and never past it; the target comes first."""
    modules, _, flux, _, concentration = p.taper(1 / HOUR, 10.0, 29.9, 1e4, 0.0, 10 / HOUR, 20 * LMH, 300.0)
    assert list(modules) == [1] and concentration[0] == pytest.approx(299.0)
    assert math.isfinite(flux[0])
