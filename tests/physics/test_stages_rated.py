"""Cascades on measured fluxes and with diafiltration: gel points, installed areas, balances of components."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from uffuncs.errors import NoResult
from uffuncs.physics import stages as s
from uffuncs.physics._cascade import SPLITS

LMH, HOUR = 1e-3 / 3600, 3600.0
FLOW, K = 10 / HOUR, 20 * LMH
C = np.array([5.0, 20.0, 60.0, 120.0, 250.0])
J = np.array([60.0, 57.0, 30.0, 18.0, 3.0]) * LMH


@pytest.mark.parametrize("split", SPLITS)
@pytest.mark.parametrize("rejection", [1.0, 0.97])
def test_points_of_the_gel_model_give_its_stages(split, rejection):
    kink = 300 * math.exp(-45 / 20)
    c = np.array([5.0, kink, 299.0])
    j = np.minimum(45 * LMH, K * np.log(300 / c))
    measured = s.stages_table(FLOW, 10.0, 200.0, 4.0, c, j, rejection, split)
    gel = s.stages(FLOW, 10.0, 200.0, 4.0, K, 300.0, rejection, 45 * LMH, split)
    for a, b in zip(measured, gel):
        assert list(a) == pytest.approx(list(b), rel=1e-8)
    # And the areas found do what they were found for.
    rated = s.stages_rated(FLOW, 10.0, np.array(gel[4][:-1]), c, j, rejection)
    for a, b in zip(rated, gel):
        assert list(a) == pytest.approx(list(b), rel=1e-8)


@given(
    st.floats(11, 249),
    st.integers(1, 8),
    st.sampled_from([1.0, 0.99]),
    st.sampled_from(SPLITS),
    st.randoms(use_true_random=False),
)
def test_rating_undoes_designing(final, stages, rejection, split, random):
    order = random.sample(range(len(C)), len(C))
    design = s.stages_table(FLOW, 10.0, final, float(stages), C[order], J[order], rejection, split)
    rated = s.stages_rated(FLOW, 10.0, np.array(design[4][:-1]), C, J, rejection)
    for a, b in zip(rated, design):
        assert list(a) == pytest.approx(list(b), rel=1e-8)


def test_more_area_concentrates_further():
    finals = [
        s.stages_rated(FLOW, 10.0, np.array([100.0, a, 40.0]), C, J)[0][-1] for a in (10.0, 30.0, 60.0, 90.0)
    ]
    assert finals == sorted(finals) and finals[0] < finals[-1]


def test_the_lowest_of_several_operating_points():
    """A flux that rises steeply meets the balance three times; a stage filled with its feed stops first."""
    c, j = np.array([10.0, 12.0, 14.0, 100.0]), np.array([10.0, 10.0, 60.0, 20.0]) * LMH
    area = 0.1 * FLOW / (10 * LMH)
    found = s.stages_rated(FLOW, 10.0, np.array([area]), c, j)[0][0]
    excess = [
        FLOW * (1 - 10.0 / x) - area * np.interp(math.log(x), np.log(c), j)
        for x in np.linspace(10, 99, 20000)
    ]
    crossings = np.flatnonzero(np.diff(np.sign(excess)) != 0)
    assert len(crossings) == 3
    assert found == pytest.approx(np.linspace(10, 99, 20000)[crossings[0]], abs=0.01)


def test_an_operating_point_between_two_points_that_have_none():
    """On one rising piece: the membrane passes too much at both its ends, and less than the balance in between."""
    c, j = np.array([10.0, 40.0, 200.0]), np.array([0.1, 0.8, 0.5]) * FLOW / 50.0
    found = s.stages_rated(FLOW, 10.0, np.array([50.0]), c, j)[0][0]
    assert 10 < found < 20
    assert 0.1 + 0.7 * math.log(found / 10) / math.log(4) == pytest.approx(1 - 10 / found, rel=1e-12)


def test_rated_refusals(why):
    points = [[[c] for c in C], [[j / LMH] for j in J]]
    assert "stage 2 of 5000 m²" in why("UF_STAGES_RATED", 10, 10, [[100], [5000]], *points)
    assert "stage 1 of 5000 m²" in why("UF_STAGES_RATED", 10, 10, [[5000]], *points, 0.5)
    assert "below the lowest" in why("UF_STAGES_RATED", 10, 4, [[100]], *points)
    assert "not retained" in why("UF_STAGES_RATED", 10, 10, [[100]], *points, 0)
    rising = [points[0], [[60], [61], [30], [18], [3]]]
    assert "rises with concentration" in why("UF_STAGES_RATED", 10, 10, [[100]], *rising)


def test_measured_fluxes_are_not_extrapolated(why):
    points = [[[c] for c in C], [[j / LMH] for j in J]]
    assert "below the lowest" in why("UF_STAGES_TABLE", 10, 4, 200, 3, *points)
    assert "above the highest" in why("UF_STAGES_TABLE", 10, 10, 251, 3, *points)
    assert why("UF_STAGES_TABLE", 10, 5, 250, 3, *points) == "ok"
    with pytest.raises(NoResult, match="falls to 0"):
        s.stages_table(FLOW, 10.0, 250.0, 3.0, C, np.append(J[:-1], 0.0))


# --- diafiltration --------------------------------------------------------------------------------------


def test_diafiltration_stages_conserve_every_component():
    feed, rejection = np.array([35.0, 48.0, 0.0]), np.array([0.99, 0.05, 0.5])
    permeate, water = np.array([4.0, 3.0, 2.0]) / HOUR, np.array([0.0, 2.0, 1.5]) / HOUR
    stage, component, c, kept, used = s.stages_diafiltration(FLOW, feed, rejection, permeate, water)
    assert list(stage) == [1, 1, 1, 2, 2, 2, 3, 3, 3] and list(component) == [1, 2, 3] * 3
    assert list(used[::3] * HOUR) == pytest.approx([0, 2, 3.5])
    c, kept = c.reshape(3, 3), kept.reshape(3, 3)
    flow, before = FLOW, feed
    for i in range(3):
        left = flow + water[i] - permeate[i]
        assert flow * before == pytest.approx(left * c[i] + permeate[i] * (1 - rejection) * c[i])
        assert (kept[i] * feed * FLOW) == pytest.approx(left * c[i])
        flow, before = left, c[i]
    # A component that the feed does not hold still has a yield: the share that would stay.
    assert 0 < kept[2, 2] < 1


def test_without_water_it_is_the_cascade():
    c, _, permeate, _, _, kept = s.stages(FLOW, 10.0, 200.0, 4.0, K, 300.0, 0.98)
    _, _, found, yields, used = s.stages_diafiltration(
        FLOW, np.array([10.0]), np.array([0.98]), np.array(permeate[:-1]), np.zeros(4)
    )
    assert list(found) == pytest.approx(list(c[:-1])) and list(yields) == pytest.approx(list(kept[:-1]))
    assert (used == 0).all()


def test_many_small_stages_wash_like_constant_volume():
    n = 4000
    each = np.full(n, 5.0 / n) / HOUR
    *_, kept, _ = s.stages_diafiltration(1.0 / HOUR, np.array([1.0]), np.array([0.2]), each, each)
    assert kept[-1] == pytest.approx(math.exp(-5 * 0.8), rel=3e-3)


def test_a_stage_that_passes_all(why):
    assert "stage 2: the permeate 7 m³/h" in why(
        "UF_STAGES_DIAFILTRATION", 10, [[5]], [[1]], [[4], [7]], [[0], [1]]
    )
    assert "there is no feed" in why("UF_STAGES_DIAFILTRATION", 0, [[5]], [[1]], [[4]], [[0]])
