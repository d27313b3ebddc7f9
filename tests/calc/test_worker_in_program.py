"""The worker in the real program: killed in mid-run, hanging, without a Python, ended with the program."""

from __future__ import annotations

import json
import os
import signal
import threading
import time
from contextlib import contextmanager
from pathlib import Path

import pytest
from calc_session import Session, is_alive, settings
from misbehaving import Misbehaving

from uffuncs.calc.inside.configuration import IN_PROCESS, WORKER

CELLS = 3000
NUM, VALUE, NAME = 503, 519, 525

linux = pytest.mark.skipif(
    not Path("/proc/self/task").is_dir(), reason="looks at processes as Linux shows them"
)


@contextmanager
def program(office, folder, found: dict | None = None, **more):
    """A session with the settings given, and an empty sheet."""
    path = folder / "calc.json"
    if found is None:
        settings(folder, **more)
    else:
        path.write_text(json.dumps(found), encoding="utf-8")
    with Session(office, folder, path) as session:
        yield session, session.open().Sheets.getByIndex(0)


def entered(sheet, place: str, formula: str):
    cell = sheet.getCellRangeByName(place)
    cell.setFormula(formula)
    return cell


@linux
def test_killed_in_mid_run(office, tmp_path):
    with program(office, tmp_path, mode=WORKER) as (session, sheet):
        assert session.children() == []  # nothing is started before it is needed
        sheet.getCellRangeByName(f"A1:A{CELLS}").setDataArray(tuple((1 + r / CELLS,) for r in range(CELLS)))
        area = sheet.getCellRangeByName(f"B1:B{CELLS}")
        area.setFormulaArray(tuple((f"=UF_FLUX_DARCY(A{r + 1};1;5E12)",) for r in range(CELLS)))
        document = next(iter(session.desktop.Components))
        document.calculateAll()
        first = session.children()
        killing = threading.Timer(0.05, os.kill, (first[0], signal.SIGKILL))
        killing.start()
        document.calculateAll()
        killing.join()
        assert [row[0] for row in area.getDataArray()] == [
            pytest.approx(72 * (1 + r / CELLS)) for r in range(CELLS)
        ]
        second = session.children()
        assert len(first) == len(second) == 1 and first != second
    deadline = time.monotonic() + 20
    while is_alive(second[0]) and time.monotonic() < deadline:
        time.sleep(0.05)
    assert not is_alive(second[0])


@linux
def test_two_documents_share_one_worker(office, tmp_path):
    with program(office, tmp_path, mode=WORKER) as (session, sheet):
        other = session.open().Sheets.getByIndex(0)
        for n in range(1, 6):
            assert entered(sheet, "A1", f"=UF_FLUX_DARCY({n};1;5E12)").Value == pytest.approx(72 * n)
            assert entered(other, "A1", f"=UF_FLUX_DARCY({n};2;5E12)").Value == pytest.approx(36 * n)
        assert len(session.children()) == 1


@linux
def test_program_killed_leaves_no_worker(office, tmp_path):
    with program(office, tmp_path, mode=WORKER) as (session, sheet):
        assert entered(sheet, "A1", "=UF_VERSION()").String
        (worker,) = session.children()
        session.process.kill()
        session.process.wait()
    deadline = time.monotonic() + 20
    while is_alive(worker) and time.monotonic() < deadline:
        time.sleep(0.05)
    assert not is_alive(worker)


@pytest.mark.parametrize("mode, how", [(WORKER, "block"), (IN_PROCESS, "spin")])
def test_a_call_that_hangs(office, tmp_path, mode, how):
    stand_in = Misbehaving(tmp_path)
    with program(office, tmp_path, stand_in.settings(mode=mode)) as (_, sheet):
        assert entered(sheet, "A1", "=UF_VERSION()").String == "well"
        stand_in.shall(how)
        started = time.monotonic()
        assert entered(sheet, "A2", "=UF_VERSION()").getError() == NUM
        assert time.monotonic() - started < 20
        stand_in.shall("")
        assert entered(sheet, "A3", "=UF_VERSION()").String == "well"
        assert entered(sheet, "A4", "=UF_FLUX_DARCY(1;1;5E12)").Value == pytest.approx(72)


def test_a_call_that_kills_its_worker(office, tmp_path):
    stand_in = Misbehaving(tmp_path)
    with program(office, tmp_path, stand_in.settings(mode=WORKER)) as (_, sheet):
        stand_in.shall("die")
        assert entered(sheet, "A1", "=UF_VERSION()").getError() == VALUE
        assert entered(sheet, "A2", "=UF_FLUX_DARCY(1;1;5E12)").Value == pytest.approx(72)


@pytest.mark.parametrize(
    "found",
    [
        {"python": "/nowhere/bin/python", "paths": ["/nowhere/lib"]},
        {},
    ],
)
def test_without_a_python_the_program_lives(office, tmp_path, found):
    with program(office, tmp_path, found) as (_, sheet):
        assert entered(sheet, "A1", "=UF_FLUX_DARCY(1;1;5E12)").getError() == NAME
        assert "run: uffuncs install calc" in entered(sheet, "A2", '=UF_WHY("UF_FLUX_DARCY";1;1;5E12)').String
        assert entered(sheet, "A3", "=1+1").Value == 2
    assert "run: uffuncs install calc" in (tmp_path / "calc_problem.txt").read_text(encoding="utf-8")
