"""Feed-and-bleed cascades: conservation, least area against a general optimiser, kinks, splits, refusals."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import differential_evolution, minimize, minimize_scalar

from uffuncs.cell import call
from uffuncs.physics import _least_area as least
from uffuncs.physics import stages as s
from uffuncs.physics._cascade import SPLITS
from uffuncs.physics._flux_law import FluxLaw, gel_law
from uffuncs.physics.batch import batch_area

LMH, HOUR = 1e-3 / 3600, 3600.0
FLOW, K = 10 / HOUR, 20 * LMH
splits = st.sampled_from(SPLITS)
C = np.array([5.0, 20.0, 60.0, 120.0, 250.0])
J = np.array([60.0, 57.0, 30.0, 18.0, 3.0]) * LMH


def total_area(concentrations, feed_flow, feed, final, flux, rejection):
    """The balances written out anew, stage by stage, for any flux of the concentration."""
    flow, before, area = feed_flow, feed, 0.0
    for c in [*concentrations, final]:
        permeate = (flow * c - flow * before) / (c * rejection)
        area += permeate / flux(c)
        flow, before = flow - permeate, c
    return area


def gel_flux(maximum=math.inf, gel=300.0):
    return lambda c: min(maximum, K * math.log(gel / c))


def measured_flux(points, fluxes):
    return lambda c: float(np.interp(math.log(c), np.log(points), fluxes))


def least_by_optimiser(feed, final, stages, flux, rejection):
    """scipy's search over all concentrations at once, then a simplex from its best."""
    low, high = math.log(feed), math.log(final)

    def area(sorted_or_not):
        c = np.exp(np.sort(sorted_or_not))
        steps = np.diff([feed, *c, final]) / np.array([*c, final])
        if (steps <= 0).any() or (steps >= rejection).any():
            return 1e9
        return total_area(c, 1.0, feed, final, flux, rejection) * LMH

    found = differential_evolution(
        area, [(low, high)] * (stages - 1), seed=1, tol=1e-12, maxiter=300, popsize=12
    )
    found = minimize(
        area, found.x, method="Nelder-Mead", options={"xatol": 1e-11, "fatol": 1e-15, "maxiter": 4000}
    )
    return found.fun / LMH, np.exp(np.sort(found.x))


# --- conservation and layout ----------------------------------------------------------------------------


@given(
    st.floats(0.5, 50),
    st.floats(1.1, 20),
    st.integers(1, 12),
    st.sampled_from([1.0, 0.999, 0.97]),
    splits,
    st.sampled_from([None, 45 * LMH, 15 * LMH]),
)
def test_volume_and_solute_are_conserved(feed, ratio, stages, rejection, split, maximum):
    final = min(feed * ratio, 295.0)
    columns = s.stages(FLOW, feed, final, float(stages), K, 300.0, rejection, maximum, split)
    c, flux, permeate, retentate, area, kept = map(np.array, columns)
    assert len(c) == stages + 1 and (np.diff([feed, *c[:-1]]) > 0).all()
    assert c[-2] == c[-1] == pytest.approx(final, rel=1e-12)
    into = np.array([FLOW, *retentate[:-2]])
    assert into == pytest.approx(permeate[:-1] + retentate[:-1], rel=1e-12)
    solute_in = into * np.array([feed, *c[:-2]])
    assert solute_in == pytest.approx(c[:-1] * (retentate[:-1] + permeate[:-1] * (1 - rejection)), rel=1e-9)
    assert area == pytest.approx(permeate / flux, rel=1e-12)
    assert flux[:-1] == pytest.approx(
        [min(maximum or math.inf, K * math.log(300.0 / x)) for x in c[:-1]], rel=1e-11
    )
    assert kept == pytest.approx(retentate * c / (FLOW * feed), rel=1e-9)
    assert permeate[-1] == pytest.approx(permeate[:-1].sum()) and area[-1] == pytest.approx(area[:-1].sum())
    if split == "equal permeate":
        assert permeate[:-1] == pytest.approx([permeate[-1] / stages] * stages, rel=1e-9)
    if split == "equal area":
        assert area[:-1] == pytest.approx([area[-1] / stages] * stages, rel=1e-8)


def test_one_stage_is_a_mixed_stage():
    from uffuncs.physics.concentration import yield_continuous

    c, flux, permeate, retentate, area, kept = s.stages(FLOW, 10.0, 200.0, 1.0, K, 300.0, 0.99)
    assert kept[0] == pytest.approx(yield_continuous(FLOW / retentate[0], 0.99))
    assert area[0] == pytest.approx(permeate[0] / (K * math.log(1.5))) and list(area) == [area[0]] * 2


def test_many_stages_approach_a_batch():
    """The batch area per time is the limit of ever more stages of least area, from above."""
    batch = batch_area(FLOW * HOUR, 10.0, 20.0, HOUR, K, 300.0)
    areas = [s.stages_area(FLOW, 10.0, 200.0, float(n), K, 300.0) for n in (1, 2, 3, 5, 10, 25, 50)]
    assert all(a > b for a, b in zip(areas, areas[1:])) and areas[-1] > batch
    assert areas[-1] == pytest.approx(batch, rel=0.03)


# --- least area -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "final, stages, rejection, maximum",
    [
        (200.0, 3, 1.0, None),
        (290.0, 4, 1.0, None),
        (200.0, 5, 0.98, None),
        (200.0, 3, 0.9, None),
        (200.0, 3, 1.0, 45 * LMH),
        (200.0, 4, 0.98, 45 * LMH),
        (120.0, 4, 0.95, 25 * LMH),
    ],
)
def test_least_area_against_a_general_optimiser(final, stages, rejection, maximum):
    flux = gel_flux(maximum or math.inf)
    area, concentrations = least_by_optimiser(10.0, final, stages, flux, rejection)
    columns = s.stages(1.0, 10.0, final, float(stages), K, 300.0, rejection, maximum)
    assert columns[4][-1] == pytest.approx(area, rel=1e-9)
    assert columns[4][-1] <= area * (1 + 1e-12)
    assert columns[0][: stages - 1] == pytest.approx(
        concentrations, rel=2e-5
    )  # flat: an optimiser sees no nearer


def newton_step(log_c, feed, final, flux, rejection):
    """How far the true minimum is, in ln C: slopes of the balances above by complex steps, to rounding."""
    n = len(log_c)

    def slopes(at):
        found = np.empty(n)
        for i in range(n):
            moved = at.astype(complex)
            moved[i] += 1e-30j
            found[i] = total_area(list(np.exp(moved)), 1.0, feed, final, flux, rejection).imag / 1e-30
        return found

    steps = np.diff([math.log(feed), *log_c, math.log(final)])
    h = 1e-4 * np.minimum(steps[1:], steps[:-1])
    hessian = np.array([(slopes(log_c + d) - slopes(log_c - d)) / (2 * d.sum()) for d in np.diag(h)])
    assert (np.linalg.eigvalsh(0.5 * (hessian + hessian.T)) > 0).all()  # a minimum, no saddle
    return np.linalg.solve(hessian, slopes(log_c))


@pytest.mark.parametrize(
    "final, stages, rejection, maximum",
    [
        (200.0, 5, 1.0, None),
        (299.0, 5, 1.0, None),
        (299.99, 12, 1.0, None),
        (200.0, 8, 0.99, None),
        (200.0, 5, 0.9, None),
        (200.0, 5, 0.99, 35 * LMH),
    ],
)
def test_concentrations_are_exact_where_a_search_sees_a_flat(final, stages, rejection, maximum):
    c = np.array(s.stages(1.0, 10.0, final, float(stages), K, 300.0, rejection, maximum)[0][: stages - 1])
    first = 10.0
    if maximum:  # the first stage sits on the kink, and its neighbours are free
        assert c[0] == pytest.approx(300 * math.exp(-maximum / K), rel=1e-12)
        first, c = c[0], c[1:]
    step = newton_step(np.log(c), first, final, lambda x: K * np.log(300.0 / x), rejection)
    assert np.abs(step).max() < 1e-10


@pytest.mark.parametrize("rejection", [1.0, 0.97])
def test_concentrations_on_measured_fluxes_are_exact(rejection):
    c = np.array(s.stages_table(1.0, 10.0, 200.0, 5.0, C, J, rejection)[0][:4])
    on_point = np.array([np.abs(x / C - 1).min() < 1e-9 for x in c])
    assert on_point.any() and not on_point.all()
    area = total_area(c, 1.0, 10.0, 200.0, measured_flux(C, J), rejection)
    for i in range(4):
        for change in (1e-4, -1e-4, 1e-6, -1e-6):
            moved = c.copy()
            moved[i] *= 1 + change
            assert total_area(moved, 1.0, 10.0, 200.0, measured_flux(C, J), rejection) > area * (1 - 1e-15)


def test_the_first_stage_sits_on_the_kink():
    """With full retention one stage takes all that passes at the highest flux, up to the kink."""
    c = s.stages(FLOW, 10.0, 200.0, 5.0, K, 300.0, 1.0, 45 * LMH)[0]
    assert c[0] == pytest.approx(300 * math.exp(-45 / 20), rel=1e-12)
    rest = s.stages(FLOW, c[0], 200.0, 4.0, K, 300.0)[0]
    assert c[1:] == pytest.approx(rest, rel=1e-10)


def test_a_flux_below_all_others_gives_equal_ratios():
    c, flux, *_ = s.stages(FLOW, 10.0, 160.0, 4.0, K, 300.0, 0.9, 5 * LMH)
    assert list(c[:4]) == pytest.approx([20, 40, 80, 160]) and list(flux) == pytest.approx([5 * LMH] * 5)


def test_a_maximum_above_the_first_stage_changes_nothing():
    free = s.stages(FLOW, 10.0, 200.0, 5.0, K, 300.0)
    capped = s.stages(FLOW, 10.0, 200.0, 5.0, K, 300.0, 1.0, free[1][0] * 1.001)
    for a, b in zip(free, capped):
        assert list(a) == pytest.approx(list(b), rel=1e-11)


@given(
    st.integers(2, 8),
    st.floats(0.3, 5),
    st.floats(1e-4, 0.9),
    st.sampled_from([1.0, 0.999, 0.98]),
    st.one_of(st.none(), st.floats(0.05, 1.2)),
)
def test_two_ways_to_the_least_area_agree(stages, y_first, share, rejection, kink):
    """The shooting for the gel law against the search that any law takes."""
    y_last = y_first * share
    if rejection < 1 and y_first - y_last > -0.99 * math.log1p(-rejection):
        return
    law = gel_law(math.exp(-y_first), 1.0, 1.0, math.inf if kink is None else kink * y_first)
    if law.slope(0) == 0 and y_last >= -law.logs[1]:
        return  # one flux everywhere
    shot = least._gel_logs(law, -y_first, -y_last, stages, rejection)
    searched = least._searched_logs(law, -y_first, -y_last, stages, rejection)
    assert searched is not None
    if shot is not None:
        assert shot == pytest.approx(searched, abs=1e-8 * (y_first - y_last))


def test_a_first_stage_short_of_the_kink():
    """With product to lose the optimum may lie inside the range of the highest flux: there the area is stationary."""
    law = gel_law(math.exp(-1.5407), 1.0, 1.0, 1.3779)
    logs = least.least_area_logs(law, -1.5407, -1.348, 2, 0.5)
    assert -1.5407 < logs[0] < -1.3779 - 0.01

    def area(log):
        return total_area(
            [math.exp(log)], 1.0, math.exp(-1.5407), math.exp(-1.348), lambda c: min(1.3779, -math.log(c)), 0.5)

    best = minimize_scalar(area, bounds=(-1.54, -1.35), method="bounded", options={"xatol": 1e-12}).x
    assert logs[0] == pytest.approx(best, abs=1e-7)


def test_slopes_of_the_area_against_differences():
    law = FluxLaw(1.0, (-3.0, -2.0, -1.0, 0.0), (60.0, 55.0, 20.0, 5.0))
    logs, pieces = np.array([-2.4, -1.7, -0.6]), [0, 1, 2]
    for rejection in (1.0, 0.9):
        _, slopes = least._area_and_slopes(law, -2.9, logs, -0.1, pieces, rejection)
        for i in range(3):
            h = np.zeros(3)
            h[i] = 1e-5
            up, down = (
                least._area_and_slopes(law, -2.9, logs + d, -0.1, pieces, rejection)[0] for d in (h, -h)
            )
            assert slopes[i] == pytest.approx((up - down) / 2e-5, rel=1e-6)


@pytest.mark.parametrize("stages, rejection", [(3, 1.0), (4, 0.97)])
def test_least_area_on_measured_fluxes(stages, rejection):
    area, _ = least_by_optimiser(10.0, 200.0, stages, measured_flux(C, J), rejection)
    columns = s.stages_table(1.0, 10.0, 200.0, float(stages), C, J, rejection)
    assert columns[4][-1] == pytest.approx(area, rel=1e-8)
    assert columns[4][-1] <= area * (1 + 1e-12)


def test_no_least_area_where_a_stage_would_pass_everything(why):
    """R = 0.8 and a ratio of 20 in two stages: the area falls all the way to losing the product."""
    areas = [
        total_area([c], 1.0, 10.0, 200.0, gel_flux(), 0.8) for c in (49.99, 49.0, 48.0, 46.0, 44.0, 42.0)
    ]
    assert areas == sorted(areas)
    assert "there is no least area" in why("UF_STAGES", 10, 10, 200, 2, 20, 300, 0.8)
    assert call("UF_STAGES_AREA", [10, 10, 200, 2, 20, 300, 0.8]).code == "#NUM!"
    assert isinstance(call("UF_STAGES_AREA", [10, 10, 200, 3, 20, 300, 0.8]), float)


# --- area as one number ---------------------------------------------------------------------------------


def test_the_area_alone_over_ranges():
    final = np.array([[100.0], [200.0], [300.0]])
    stages = np.array([2.0, 5.0])
    for split in SPLITS:
        block = s.stages_area(FLOW, 10.0, final, stages, K, 300.0, 0.99, 50 * LMH, split)
        assert block.shape == (3, 2) and np.isnan(block[2]).all()
        expected = s.stages(FLOW, 10.0, 200.0, 5.0, K, 300.0, 0.99, 50 * LMH, split)[4][-1]
        assert block[1, 1] == pytest.approx(expected, rel=1e-14)


# --- refusals -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "cells, text",
    [
        ([0, 10, 200, 3, 20, 300], "there is no feed"),
        ([10, 0, 200, 3, 20, 300], "nothing to concentrate"),
        ([10, 10, 10, 3, 20, 300], "is not above feed_concentration"),
        ([10, 10, 300, 3, 20, 300], "is not below gel_concentration 300 g/L"),
        ([10, 10, 200, 3, 0, 300], "no flux"),
        ([10, 10, 200, 3, 20, 300, 0], "not retained is not concentrated"),
        ([10, 10, 200, 2, 20, 300, 0.7], "out of reach: a stage of any area"),
        ([10, 10, 10.00001, 50, 20, 300], "more stages than make sense"),
        ([10, 10, 200, 2, 20, 300, 0.8, None, "equal permeate"], "out of reach with equal permeate"),
    ],
)
def test_refusals_are_the_same_for_stages_and_their_area(why, cells, text):
    for name in ("UF_STAGES", "UF_STAGES_AREA"):
        assert text in why(name, *cells) and call(name, cells).code == "#NUM!"


def test_cautions(why):
    assert "200 L/(m²·h)" in why("UF_STAGES", 10, 0.001, 1, 50, 20, 300)
    assert why("UF_STAGES", 10, 0.001, 1, 50, 20, 300, 1, 100) == "ok"
    # The flux counts at the outlet of the first stage, not at the feed.
    assert why("UF_STAGES_AREA", 10, 0.001, 100, 1, 20, 300) == "ok"


@pytest.mark.parametrize("split", SPLITS)
def test_many_stages_and_steep_ends(split):
    for feed, final, rejection, maximum in (
        (10, 299.9999999, 1, None),
        (0.01, 290, 1, 60),
        (1, 290, 0.999, 60),
        (100, 100.1, 0.9, None),
    ):
        block = call("UF_STAGES", [10, feed, final, 50, 20, 300, rejection, maximum, split])
        assert len(block) == 51 and block[-1][0] == pytest.approx(final, rel=1e-9)
        assert all(a[0] < b[0] for a, b in zip(block[:-2], block[1:-1]))
