"""What the README says of the project is so."""

from __future__ import annotations

import re
from collections import Counter
from pathlib import Path

import pytest

from uffuncs.cell import call
from uffuncs.check_values import KINDS, checks_of
from uffuncs.declaration import Function
from uffuncs.registry import functions

README = (Path(__file__).parents[1] / "README.md").read_text(encoding="utf-8")


def counts() -> Counter:
    """Functions by the best kind of check that they have."""
    names = [n for n, r in functions().items() if isinstance(r, Function)]
    return Counter(min((c.kind for c in checks_of(n)), key=KINDS.index) for n in names)


def test_the_counts_of_checks():
    best = counts()
    said = (f"Of {best.total()} functions {best['printed']} have a value read in print, {best['library']} more one of a general library, "
            f"{best['derived']} more one derived, and {best['memory']} only one from memory.")
    assert said in re.sub(r"\s+", " ", README), said


@pytest.mark.parametrize("formula", re.findall(r"^    =(UF_[A-Z_]+\(.*\))$", README, re.M))
def test_the_formulas_of_the_tour_work(formula):
    name, _, inside = formula[:-1].partition("(")
    cells = [_cell(a.strip()) for a in re.findall(r'("[^"]*"|[^,]*)(?:,|$)', inside)][:-1]
    result = call(name, cells)
    assert isinstance(result, (float, str, list)), (formula, getattr(result, "reason", ""))


def _cell(text: str):
    if text.startswith('"'):
        return text.strip('"')
    return float(text) if text else None


def test_the_commands_stand_alone_on_their_lines():
    commands = re.findall(r"^python3 -m venv .*$", README, re.M)
    assert len(commands) == 2 and commands[0].endswith("uffuncs demo") and commands[1].endswith("pytest")
    assert "LICENSE" not in README


def test_the_table_of_the_demo_is_the_workbook_s():
    from uffuncs.demo import key_results

    path = Path(__file__).parents[1] / "workbooks_demo" / "plant_design.xlsx"
    for label, value, unit in key_results(path).rows:
        assert re.search(rf"│ {re.escape(label)} +│ +{re.escape(value)} │ {re.escape(unit)} +│", README), (label, value, unit)
