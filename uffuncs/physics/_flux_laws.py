"""Flux by the osmotic-pressure model for each law of osmotic pressure, for plain floats and for arrays.

In all: H = L_p σ [π(C_w) − π(C_p)] is the flux taken by the osmotic pressure, `darcy` is L_p Δp. Where H at
no flux is L_p Δp or more, the flux is 0. NaN where there is no single flux: the mass-transfer coefficient is
0, or not exactly one flux from 0 to L_p Δp solves the equation.
"""

from __future__ import annotations

import math

import numpy as np

from ._flux_solver import LAST_STEP, single_bracket, solve_one, solve_rows, start_one, start_rows
from ._osmotic_table import OsmoticTable

#: Points of the scan for several fluxes, even on the logarithm of the surface concentration.
SCAN = 200
#: Rows scanned at a time.
SCAN_ROWS = 512
#: Cubic pieces meet with a jump of the second derivative, which a last step of the usual size could cross.
TABLE_LAST_STEP = 1e-9
#: Highest J/k in a search at full rejection: e^690 times any concentration is still a number.
FARTHEST = 690.0


# --- polynomial ---------------------------------------------------------------------------------------------


def _polynomial_terms(c, first, second, third):
    one, two, three = first * c, second * c * c, third * c * c * c
    return one + two + three, one + 2.0 * two + 3.0 * three, one + 4.0 * two + 9.0 * three


def difference_coefficients(first, second, third, rejection):
    """π(C_w) − π(C_p) is R times a polynomial of C_w too: b_n (1 − (1 − R)^n)/R."""
    passed = 1.0 - rejection
    return first, second * (1.0 + passed), third * (1.0 + passed + passed * passed)


def _rises(first, second, third):
    """Whether the polynomial rises at all concentrations: b_1 + 2 b_2 c + 3 b_3 c² is nowhere below 0."""
    return (first >= 0.0) & (third >= 0.0) & ((second >= 0.0) | (second * second < 3.0 * first * third))


def _least_slope(first, second, third, low, high):
    """Least b_1 + 2 b_2 c + 3 b_3 c² from `low` to `high`."""
    vertex = min(max(-second / (3.0 * third), low), high) if third > 0.0 else low
    return min(first + c * (2.0 * second + 3.0 * third * c) for c in (low, vertex, high))


def _rises_to_end(first, second, third, bulk, limit, rejection) -> bool:
    """Whether the polynomial rises, and is not below 0 in the end, between C_b and the C_w at J = L_p Δp."""
    end = bulk / (rejection * math.exp(-min(limit, FARTHEST)) + (1.0 - rejection))
    ends_high = first + end * (second + end * third) >= 0.0
    return ends_high and _least_slope(first, second, third, bulk, end) >= 0.0


def polynomial_one(pressure, permeability, transfer, bulk, b1, b2, b3, rejection, reflection) -> float:
    darcy = permeability * pressure
    d1, d2, d3 = difference_coefficients(b1, b2, b3, rejection)
    factor = permeability * reflection * rejection
    if bulk == 0.0 or factor * d1 == factor * d2 == factor * d3 == 0.0:
        return darcy
    if transfer == 0.0:
        return math.nan
    rises, limit = _rises(d1, d2, d3), darcy / transfer
    if not rises and not _rises_to_end(d1, d2, d3, bulk, limit, rejection):
        row = (pressure, permeability, transfer, bulk, b1, b2, b3, rejection, reflection)
        with np.errstate(all="ignore"):
            return float(polynomial_rows(*(np.array([v]) for v in row))[0])
    d1, d2, d3 = factor * d1, factor * d2, factor * d3

    def terms(c):
        one, two, three = d1 * c, d2 * c * c, d3 * c * c * c
        return one + two + three, one + 2.0 * two + 3.0 * three, one + 4.0 * two + 9.0 * three

    if terms(bulk)[0] >= darcy:
        return 0.0
    most = darcy / d1 if d1 > 0.0 else math.inf  # the C_w at which one term alone takes all the flux
    if d2 > 0.0:
        most = min(most, math.sqrt(darcy / d2))
    if d3 > 0.0:
        most = min(most, math.cbrt(darcy / d3))
    x, high = start_one(terms, bulk / most, limit, transfer, bulk, rejection)
    if not rises:  # then the start says nothing of where the search must end
        high = limit * (1.0 + 1e-9) if rejection < 1.0 else min(limit, FARTHEST)
    return solve_one(terms, darcy, transfer, bulk, rejection, x, high)


def polynomial_rows(pressure, permeability, transfer, bulk, b1, b2, b3, rejection, reflection) -> np.ndarray:
    """polynomial_one for arrays of one size."""
    darcy = permeability * pressure
    d1, d2, d3 = difference_coefficients(b1, b2, b3, rejection)
    factor = permeability * reflection * rejection
    law = np.stack([factor * d1, factor * d2, factor * d3])
    plain = (bulk == 0.0) | np.all(law == 0.0, axis=0)
    flux = np.where(plain, darcy, np.nan)
    sound = ~plain & (transfer > 0.0)
    simple = sound & _rises(d1, d2, d3)
    start = _polynomial_terms(bulk, *law)[0]
    flux[simple & (start >= darcy)] = 0.0
    rows = simple & (start < darcy)
    if rows.any():
        law_r = tuple(law[:, rows])
        a, k, c, r = (v[rows] for v in (darcy, transfer, bulk, rejection))
        most = np.full(len(a), np.inf)
        for coefficient, root in zip(law_r, (np.positive, np.sqrt, np.cbrt)):
            most = np.minimum(most, root(a / np.where(coefficient > 0.0, coefficient, 0.0)))
        x, high = start_rows(_polynomial_terms, law_r, c / most, a / k, k, c, r)
        flux[rows] = solve_rows(_polynomial_terms, law_r, a, k, c, r, x, np.zeros(len(x)), high)
    careful = np.flatnonzero(sound & ~simple)
    if careful.size:
        law_c = tuple(law[:, careful])
        row = tuple(v[careful] for v in (darcy, transfer, bulk, rejection))
        flux[careful] = _bracketed(_polynomial_terms, law_c, *row, *_polynomial_brackets(law_c, *row))
    return flux


def _bracketed(
    terms, law, darcy, transfer, bulk, rejection, low, high, solutions, last_step=LAST_STEP
) -> np.ndarray:
    """Flux of rows whose solutions were counted: the single one, else NaN."""
    flux = np.full(len(low), np.nan)
    none = terms(bulk, *law)[0] >= darcy
    flux[(solutions == 1) & none] = 0.0
    rows = np.flatnonzero((solutions == 1) & ~none)
    if rows.size:
        low, high, *known = (v[rows] for v in (low, high, darcy, transfer, bulk, rejection))
        law = tuple(part[rows] for part in law)
        middle = 0.5 * (low + high)
        flux[rows] = solve_rows(terms, law, *known, middle, low, high * (1.0 + 1e-9), last_step)
    return flux


def _polynomial_brackets(law, darcy, transfer, bulk, rejection):
    """Bracket of the root and number of solutions from J = 0 to L_p Δp, for any signs of the coefficients.

    k x + H is monotone between its stationary points, which are the roots of a quartic in w = C_b/C_w:
    k w⁴ + h_1 w³ + (2 h_2 − S h_1) w² + (3 h_3 − 2 S h_2) w − 3 S h_3 = 0, with h_n the terms of H at C_b and
    S = 1 − R.
    """
    passed = 1.0 - rejection
    h1, h2, h3 = (part * bulk**n for n, part in enumerate(law, 1))
    lower = np.stack([h1, 2 * h2 - passed * h1, 3 * h3 - 2 * passed * h2, -3 * passed * h3], axis=1)
    lower /= transfer[:, None]
    sound = np.isfinite(lower).all(axis=1)
    companion = np.zeros((len(bulk), 4, 4))
    companion[:, [1, 2, 3], [0, 1, 2]] = 1.0
    companion[sound, 0] = -lower[sound]
    # The real parts of complex roots are points like any other: they do no harm.
    inverse = np.linalg.eigvals(companion).real
    end = darcy / transfer
    last = np.minimum(end, np.where(rejection == 1.0, FARTHEST, np.inf))
    share = (inverse - passed[:, None]) / rejection[:, None]
    inner = np.clip(-np.log(np.where(share > 0.0, share, 1.0)), 0.0, last[:, None])
    nodes = np.sort(np.column_stack([np.zeros_like(end), inner, last]), axis=1)
    c = bulk[:, None] / (rejection[:, None] * np.exp(-nodes) + passed[:, None])
    first, second, third = (part[:, None] for part in law)
    taken = c * (first + c * (second + c * third))
    excess = transfer[:, None] * nodes + taken - darcy[:, None]
    # At the end k x is L_p Δp up to rounding: the sign of H alone decides there.
    low, high, solutions = single_bracket(nodes, np.where(nodes >= end[:, None], taken, excess))
    return low, high, np.where(sound, solutions, 0)


def several_by_polynomial(
    transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration,
    first_coefficient, second_coefficient, third_coefficient, intrinsic_rejection, reflection_coefficient,
) -> bool:
    """Whether several fluxes solve the equation, for the reason of a refusal."""
    coefficients = first_coefficient, second_coefficient, third_coefficient
    factor = permeability * reflection_coefficient * intrinsic_rejection
    law = tuple(np.array([factor * d]) for d in difference_coefficients(*coefficients, intrinsic_rejection))
    darcy = permeability * transmembrane_pressure
    row = (np.array([v]) for v in (darcy, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection))
    with np.errstate(all="ignore"):
        return bool(_polynomial_brackets(law, *row)[2][0] > 1)


# --- power law ----------------------------------------------------------------------------------------------


def _power_terms(c, coefficient, exponent):
    h = coefficient * c**exponent
    return h, exponent * h, exponent * exponent * h


def power_one(pressure, permeability, transfer, bulk, b, exponent, rejection, reflection) -> float:
    darcy = permeability * pressure
    # The difference between surface and permeate is again a power law, b (1 − (1 − R)^n) C_w^n.
    kept = 1.0 if rejection == 1.0 else -math.expm1(exponent * math.log1p(-rejection))
    coefficient = permeability * reflection * b * kept
    if bulk == 0.0 or coefficient == 0.0:
        return darcy
    if transfer == 0.0:
        return math.nan

    def terms(c):
        try:
            return _power_terms(c, coefficient, exponent)
        except OverflowError:
            return math.inf, math.inf, math.inf

    if terms(bulk)[0] >= darcy:
        return 0.0
    rise = math.exp(math.log(bulk) + (math.log(coefficient) - math.log(darcy)) / exponent)
    x, high = start_one(terms, rise, darcy / transfer, transfer, bulk, rejection)
    return solve_one(terms, darcy, transfer, bulk, rejection, x, high)


def power_rows(pressure, permeability, transfer, bulk, b, exponent, rejection, reflection) -> np.ndarray:
    """power_one for arrays of one size."""
    darcy = permeability * pressure
    coefficient = permeability * reflection * b * -np.expm1(exponent * np.log1p(-rejection))
    plain = (bulk == 0.0) | (coefficient == 0.0)
    flux = np.where(plain, darcy, np.nan)
    start = _power_terms(bulk, coefficient, exponent)[0]
    sound = ~plain & (transfer > 0.0)
    flux[sound & (start >= darcy)] = 0.0
    rows = sound & (start < darcy)
    if rows.any():
        law = coefficient[rows], exponent[rows]
        a, k, c, r = (v[rows] for v in (darcy, transfer, bulk, rejection))
        rise = np.exp(np.log(c) + (np.log(law[0]) - np.log(a)) / law[1])
        x, high = start_rows(_power_terms, law, rise, a / k, k, c, r)
        flux[rows] = solve_rows(_power_terms, law, a, k, c, r, x, np.zeros(len(x)), high)
    return flux


# --- measured points ----------------------------------------------------------------------------------------


def _end_one(bulk, highest, rejection) -> float:
    """The x at which the surface reaches the highest concentration measured; infinite where it never does."""
    share = (bulk / highest - (1.0 - rejection)) / rejection
    return -math.log(min(share, 1.0)) if share > 0.0 else math.inf


def _end_rows(bulk, highest, rejection) -> np.ndarray:
    return -np.log(np.clip((bulk / highest - (1.0 - rejection)) / rejection, 0.0, 1.0))


def table_one(pressure, permeability, transfer, bulk, table: OsmoticTable, rejection, reflection) -> float:
    darcy = permeability * pressure
    factor, passed = permeability * reflection, 1.0 - rejection
    if bulk == 0.0 or factor == 0.0 or rejection == 0.0:
        return darcy
    if transfer == 0.0 or bulk > table.highest:
        return math.nan
    if passed > 0.0 and not table.steepens:
        one = [np.array([v]) for v in (pressure, permeability, transfer, bulk, rejection, reflection)]
        with np.errstate(all="ignore"):
            return float(table_rows(*one[:4], table, *one[4:])[0])

    def terms(c):
        h, h1, h2 = table.terms_one(c)
        if passed > 0.0:
            p, p1, p2 = table.terms_one(passed * c)
            h, h1, h2 = h - p, h1 - p1, h2 - p2
        return factor * h, factor * h1, factor * h2

    if terms(bulk)[0] >= darcy:
        return 0.0
    limit, end = darcy / transfer, _end_one(bulk, table.highest, rejection)
    if end < limit and transfer * end + terms(table.highest)[0] < darcy:
        return math.nan
    top = min(limit, end)
    x, _ = start_one(terms, bulk / table.about(darcy / factor), limit, transfer, bulk, rejection)
    high = top * (1.0 + 1e-9)
    return solve_one(terms, darcy, transfer, bulk, rejection, min(x, top), high, TABLE_LAST_STEP)


def _table_terms(table: OsmoticTable):
    def terms(c, factor, passed):
        h, h1, h2 = table.terms(c)
        if passed.any():
            p, p1, p2 = table.terms(passed * c)
            h, h1, h2 = h - p, h1 - p1, h2 - p2
        return factor * h, factor * h1, factor * h2

    return terms


def table_rows(
    pressure, permeability, transfer, bulk, table: OsmoticTable, rejection, reflection
) -> np.ndarray:
    """table_one for arrays of one size."""
    darcy, factor, passed = permeability * pressure, permeability * reflection, 1.0 - rejection
    plain = (bulk == 0.0) | (factor == 0.0) | (rejection == 0.0)
    flux = np.where(plain, darcy, np.nan)
    terms = _table_terms(table)
    sound = ~plain & (transfer > 0.0) & (bulk <= table.highest)
    simple = sound & ((passed == 0.0) | table.steepens)
    start = terms(bulk, factor, passed)[0]
    flux[simple & (start >= darcy)] = 0.0
    limit, end = darcy / transfer, _end_rows(bulk, table.highest, rejection)
    taken = terms(np.full_like(bulk, table.highest), factor, passed)[0]
    rows = simple & (start < darcy) & ((end >= limit) | (transfer * end + taken >= darcy))
    if rows.any():
        law, top = (factor[rows], passed[rows]), np.minimum(limit, end)[rows]
        a, k, c, r = (v[rows] for v in (darcy, transfer, bulk, rejection))
        x, _ = start_rows(terms, law, c / table.about(a / law[0]), a / k, k, c, r)
        high = top * (1.0 + 1e-9)
        flux[rows] = solve_rows(terms, law, a, k, c, r, np.minimum(x, top), 0.0 * x, high, TABLE_LAST_STEP)
    careful = np.flatnonzero(sound & ~simple)
    for first in range(0, len(careful), SCAN_ROWS):
        part = careful[first:first + SCAN_ROWS]
        law, row = (factor[part], passed[part]), tuple(v[part] for v in (darcy, transfer, bulk, rejection))
        flux[part] = _bracketed(terms, law, *row, *_table_brackets(table, law, *row), TABLE_LAST_STEP)
    return flux


def _table_brackets(table, law, darcy, transfer, bulk, rejection):
    """Bracket of the root and number of solutions, by a scan from no flux to L_p Δp or to the table's end."""
    limit, end = darcy / transfer, _end_rows(bulk, table.highest, rejection)
    last = np.minimum(limit, end)
    factor, passed = (part[:, None] for part in law)
    b, r = bulk[:, None], rejection[:, None]
    most = np.minimum(b / (r * np.exp(-last[:, None]) + passed), table.highest)
    c = b * np.exp(np.log(most / b) * np.linspace(0.0, 1.0, SCAN))
    nodes = np.minimum(-np.log(np.clip((b / c - passed) / r, 1e-300, 1.0)), last[:, None])
    nodes[:, 0], nodes[:, -1] = 0.0, last
    excess = transfer[:, None] * nodes + _table_terms(table)(c, factor, passed)[0] - darcy[:, None]
    # Where the scan ends at k x = L_p Δp, the osmotic pressure is what is left: never below 0.
    excess[:, -1] = np.where(end < limit, excess[:, -1], 0.0)
    return single_bracket(nodes, excess)


def several_by_table(
    transmembrane_pressure, permeability, mass_transfer_coefficient, bulk_concentration,
    concentration, osmotic_pressure, intrinsic_rejection, reflection_coefficient,
) -> bool:
    """Whether several fluxes solve the equation within the table, for the reason of a refusal."""
    table = OsmoticTable.of(concentration, osmotic_pressure)
    law = np.array([permeability * reflection_coefficient]), np.array([1.0 - intrinsic_rejection])
    darcy = permeability * transmembrane_pressure
    row = (np.array([v]) for v in (darcy, mass_transfer_coefficient, bulk_concentration, intrinsic_rejection))
    with np.errstate(all="ignore"):
        return bool(_table_brackets(table, law, *row)[2][0] > 1)
