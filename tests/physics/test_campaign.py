"""Campaigns: the steps of the single functions, added up."""

import math

import numpy as np
import pytest

from uffuncs.cell import call
from uffuncs.physics.batch import batch_time
from uffuncs.physics.campaign import campaign
from uffuncs.physics.diafiltration import diafiltration_time

LMH = 1e-3 / 3600
LAW = (20 * LMH, 300.0)


@pytest.mark.parametrize(
    "rejection, sieving, maximum", [(1.0, 1.0, None), (0.98, 0.9, None), (0.99, 0.5, 40 * LMH)]
)
def test_a_campaign_adds_up_to_its_steps(rejection, sieving, maximum):
    time, volume, product, impurity, kept, flux = campaign(
        10.0, 10.0, 5.0, 6.0, 3.0, 50.0, *LAW, rejection, sieving, maximum
    )
    washed = product[0] * math.exp(-(1 - rejection) * 6.0)
    assert time[0] == batch_time(10.0, 10.0, 5.0, 50.0, *LAW, rejection, maximum)
    assert time[1] == diafiltration_time(2.0, product[0], 6.0, 50.0, *LAW, 1 - rejection, maximum)
    assert time[2] == pytest.approx(batch_time(2.0, washed, 3.0, 50.0, *LAW, rejection, maximum), rel=1e-14)
    assert time[3] == pytest.approx(time[:3].sum(), rel=1e-15)
    assert list(volume) == pytest.approx([2.0, 2.0, 2 / 3, 2 / 3])
    assert kept[3] == pytest.approx(np.prod(kept[:3])) == pytest.approx(product[3] * volume[3] / 100.0)
    assert impurity[3] == pytest.approx(15.0 ** (1 - sieving) * math.exp(-6.0 * sieving))
    permeate = [8.0, 12.0, 4 / 3]
    assert (flux[:3] * time[:3] * 50.0) == pytest.approx(permeate)
    assert flux[3] * time[3] * 50.0 == pytest.approx(sum(permeate))


def test_steps_left_out():
    time, _, _, impurity, kept, flux = campaign(10.0, 10.0, 1.0, 0.0, 1.0, 50.0, *LAW)
    assert list(time) == [0, 0, 0, 0] and list(impurity) == [1, 1, 1, 1] and list(kept) == [1, 1, 1, 1]
    assert list(flux) == pytest.approx([20 * LMH * math.log(30)] * 4)


def test_a_campaign_that_reaches_the_gel(why):
    for cells in ((10, 10, 30, 0, 1), (10, 10, 5, 6, 6)):
        assert "the product reaches gel_concentration 300 g/L" in why("UF_CAMPAIGN", *cells, 50, 20, 300)
    # Washed out enough in between, the second concentration stays below.
    assert why("UF_CAMPAIGN", 10, 10, 5, 6, 6, 50, 20, 300, 0.9) == "ok"
    assert call("UF_CAMPAIGN", [10, 10, 5, 6, 6, 50, 20, 300]).code == "#NUM!"
