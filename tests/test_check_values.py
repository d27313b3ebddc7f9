"""Every published value is reproduced to its printed digits, and no function is without one."""

import pytest

from uffuncs.check_values import OUTSIDE, Check, CheckFileError, Outcome, _fault, checks, checks_of, expected, half_unit, run
from uffuncs.declaration import Function
from uffuncs.errors import ErrorValue
from uffuncs.registry import find, functions


def label(check: Check) -> str:
    return f"{check.function}-{checks_of(check.function).index(check) + 1}-{check.kind}"


@pytest.mark.parametrize("check", checks(), ids=label)
def test_published_value(check):
    assert find(check.function), f"{check.topic}.toml checks {check.function}, which is not a function"
    outcome = run(check)
    assert outcome.passed, (
        f"{check.function}{check.arguments} gives {outcome.computed!r} {getattr(outcome.computed, 'reason', '')}, but "
        f"{check.source} {check.place} prints {check.expected} (= {outcome.printed} ± {outcome.tolerance:g})")


@pytest.mark.parametrize("name", [n for n, r in functions().items() if isinstance(r, Function)])
def test_every_function_has_a_check_from_outside(name):
    kinds = [c.kind for c in checks_of(name)]
    assert set(kinds) & set(OUTSIDE), f"{name} has no check against anything outside this library ({kinds})"


def test_a_function_without_an_outside_check_would_be_found():
    assert "regression" not in OUTSIDE
    assert checks_of("UF_NO_SUCH_FUNCTION") == []


def test_every_entry_names_its_place_or_says_why_not():
    for check in checks():
        assert check.source.strip()
        if check.kind == "printed":
            assert check.place or check.note, f"{check.function}: a printed value needs its place"


@pytest.mark.parametrize("digits, half", [("25", 0.5), ("3.3333", 5e-5), ("1.61", 5e-3), ("8.25e13", 5e10), ("-2.50E-3", 5e-6), ("100.", 0.5)])
def test_half_a_unit_of_the_last_printed_digit(digits, half):
    assert half_unit(digits) == pytest.approx(half, rel=1e-12)


def test_the_tolerance_follows_the_printed_unit():
    check = Check("permeation", "UF_FLUX_DARCY", "", "derived", ("1 bar", 1, 5e12), "42.41 gfd")
    printed, tolerance = expected(check)
    assert printed == pytest.approx(42.41 * 1.69774305, rel=1e-6)
    assert tolerance == pytest.approx(0.005 * 1.69774305, rel=1e-6)


def test_a_wrong_value_fails():
    assert not run(Check("permeation", "UF_FLUX_DARCY", "", "derived", ("1 bar", 1, 5e12), "72.1")).passed
    assert run(Check("permeation", "UF_FLUX_DARCY", "", "derived", ("1 bar", 1, 5e12), "72.0")).passed
    assert not run(Check("permeation", "UF_FLUX_DARCY", "", "derived", ("x bar", 1, 5e12), "72.0")).passed
    assert not Outcome(1.0, ErrorValue("#NUM!"), 10.0).passed


@pytest.mark.parametrize("entry, fault", [
    ({"function": "UF_X"}, "missing"),
    ({"function": "UF_X", "source": "s", "kind": "guess", "arguments": [], "expected": "1"}, "kind"),
    ({"function": "UF_X", "source": "s", "kind": "printed", "arguments": [], "expected": 1.0}, "text"),
    ({"function": "UF_X", "source": "s", "kind": "printed", "arguments": [], "expected": "1", "tolerance": "1 %"}, "reason"),
    ({"function": "UF_X", "source": "s", "kind": "printed", "arguments": [], "expected": "1", "extra": 1}, "unknown"),
])
def test_a_faulty_entry_is_named(entry, fault):
    assert fault in _fault(entry)
    assert issubclass(CheckFileError, ValueError)
